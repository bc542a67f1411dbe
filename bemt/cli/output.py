"""What the commands that compute have in common: where results go, and what is said beside them on stderr."""

from __future__ import annotations

import shlex
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, TypeVar

import click

from bemt.errors import InputError

if TYPE_CHECKING:
    import xarray as xr
    from matplotlib.figure import Figure

_Command = TypeVar("_Command", bound=Callable[..., Any])

CAUTION_PROPELLER = (
    "Never stand in the plane of a turning propeller. The rpm limit printed on it overrules every number here."
)
CAUTION_POWER = (
    "Lithium cells drawn beyond their current burn: stay inside the limits of battery, controller and motor."
)
CAUTION_RULES = "Where and how you may fly is a matter of your local rules."


def case_argument(command: _Command) -> _Command:
    """Add the argument CASE to a command.

    Parameters
    ----------
    command : callable
        The function behind the command.

    Returns
    -------
    callable
        The same.
    """
    return click.argument("case", type=click.Path(exists=True, dir_okay=False, allow_dash=True))(command)


def output_options(command: _Command) -> _Command:
    """Add the options that say where results go.

    Parameters
    ----------
    command : callable
        The function behind the command.

    Returns
    -------
    callable
        The same.
    """
    for option in (
        click.option("--strict", is_flag=True, help="Exit with 4 if some points did not converge."),
        click.option("--figure", metavar="FILE", help="Draw a figure: .svg, .png or .pdf."),
        click.option(
            "-o", "--output", "outputs", metavar="FILE", multiple=True, help="Write .nc or .csv; may be repeated."
        ),
    ):
        command = option(command)
    return command


def check_targets(outputs: Sequence[str], figure: str | None) -> None:
    """Refuse names that cannot be written before time goes into computing.

    Parameters
    ----------
    outputs : sequence of str
        Data files.
    figure : str, optional
        Figure file.

    Raises
    ------
    click.BadParameter
        If no format belongs to an ending.
    RunError
        If a place cannot be written to.
    """
    from bemt.figures import check_figure_target
    from bemt.files import check_data_target

    for targets, check, option in ((outputs, check_data_target, "-o"), ([figure], check_figure_target, "--figure")):
        for target in targets:
            if target is None:
                continue
            try:
                check(target)
            except InputError as error:
                raise click.BadParameter(error.message, param_hint=option) from error


def say(text: str) -> None:
    """Talk to the user on stderr; stdout is for data.

    Parameters
    ----------
    text : str
        A line or more.
    """
    click.echo(text, err=True)


def say_notes(dataset: xr.Dataset) -> None:
    """Tell what was assumed and what was found on the way.

    Parameters
    ----------
    dataset : xarray.Dataset
        A result; its attribute `notes` has one note a line.
    """
    for note in str(dataset.attrs.get("notes", "")).splitlines():
        say(f"Note: {note}")


def deliver(
    dataset: xr.Dataset,
    outputs: Sequence[str],
    figure: str | None,
    *,
    text: Callable[[xr.Dataset], str],
    draw: Callable[[xr.Dataset], Figure],
    strict: bool,
) -> None:
    """Write a result where it is wanted, or print it in short, and leave with the fitting exit code.

    Parameters
    ----------
    dataset : xarray.Dataset
        The result.
    outputs : sequence of str
        Data files; with none the result is printed.
    figure : str, optional
        Figure file.
    text : callable
        Makes the printed table.
    draw : callable
        Makes the figure.
    strict : bool
        Whether points that did not converge change the exit code.
    """
    from bemt.files import write
    from bemt.files.text import unconverged

    context = click.get_current_context()
    run = f"{context.info_name} {shlex.quote(context.params['case'])}"
    written: list[Path] = []
    for target in outputs:
        written += write(dataset, target, history=run)
    if figure is not None:
        from bemt.figures.style import save

        save(draw(dataset), figure)
        written.append(Path(figure))
    if not outputs:
        click.echo(text(dataset))
    if written:
        say("Wrote " + ", ".join(str(path) for path in written) + ".")
    failed = unconverged(dataset)
    if failed:
        say(f"{failed} of {dataset['status'].size} points did not converge; their status says so.")
        if strict:
            context.exit(4)
