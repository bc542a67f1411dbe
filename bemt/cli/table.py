"""`bemt table`: the coefficient table of a propeller."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from bemt.cli.output import (
    CAUTION_PROPELLER,
    case_argument,
    check_targets,
    deliver,
    output_options,
    say,
    say_notes,
)

if TYPE_CHECKING:
    import xarray as xr
    from matplotlib.figure import Figure


def _text(table: xr.Dataset) -> str:
    from bemt.files.text import coefficient_text

    return coefficient_text(table)


def _figure(table: xr.Dataset) -> Figure:
    from bemt.figures.coefficients import coefficient_figure

    return coefficient_figure(table)


@click.command("table")
@case_argument
@output_options
@click.option("--radial", is_flag=True, help="Also give the loading along the blade.")
def command(case: str, outputs: tuple[str, ...], figure: str | None, radial: bool, strict: bool) -> None:
    """Compute the coefficients of a propeller.

    CT, CP and efficiency over advance ratio and rpm, each point with a grade of trust; forces in the plane of the disk
    and moments too where the case asks for an incidence. Without -o a short table goes to standard output. CASE may
    be - for standard input.
    """
    check_targets(outputs, figure)
    import bemt

    # Only a netCDF file carries the look-up table, which takes longer than the rest together.
    lookup = any(output.lower().endswith(".nc") for output in outputs)
    table = bemt.coefficient_table(bemt.load(case), radial=radial, lookup=lookup)
    say_notes(table)
    say(CAUTION_PROPELLER)
    deliver(table, outputs, figure, text=_text, draw=_figure, strict=strict)
