"""`bemt envelope`: what a propeller does on its motor, controller, battery and airframe."""

from __future__ import annotations

from typing import TYPE_CHECKING

import click

from bemt.cli.output import (
    CAUTION_POWER,
    CAUTION_PROPELLER,
    CAUTION_RULES,
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


def _text(run: xr.Dataset) -> str:
    from bemt.files.text import envelope_text

    return envelope_text(run)


def _figure(run: xr.Dataset) -> Figure:
    from bemt.figures.envelope import envelope_figure

    return envelope_figure(run)


@click.command("envelope")
@case_argument
@output_options
def command(case: str, outputs: tuple[str, ...], figure: str | None, strict: bool) -> None:
    """Compute what the propeller does on its motor, battery and airframe.

    Thrust, currents, rpm and power over airspeed and throttle, level flight or hover, and the points a builder asks
    for, with what he decides by in words. Without -o a short table goes to standard output. CASE may be - for standard
    input.
    """
    check_targets(outputs, figure)
    import bemt

    run = bemt.envelope(bemt.load(case))
    say_notes(run)
    say(CAUTION_PROPELLER)
    if "battery_current" in run:
        say(CAUTION_POWER)
    if "drag" in run:
        say(CAUTION_RULES)
    deliver(run, outputs, figure, text=_text, draw=_figure, strict=strict)
