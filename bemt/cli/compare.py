"""`bemt compare`: a prediction beside measured points."""

from __future__ import annotations

import click

from bemt.cli.output import case_argument, check_targets, say


@click.command("compare")
@case_argument
@click.argument(
    "measured", metavar="MEASURED.csv...", nargs=-1, required=True, type=click.Path(exists=True, dir_okay=False)
)
@click.option("--strict", is_flag=True, help="Exit with 4 if some rows did not converge.")
@click.option("--figure", metavar="FILE", help="Draw a figure: .svg, .png or .pdf.")
@click.pass_context
def command(context: click.Context, case: str, measured: tuple[str, ...], figure: str | None, strict: bool) -> None:
    """Judge the prediction by measured points.

    Predicts every row at its own rpm, airspeed and air, and says how far off thrust, power and efficiency are, which
    constant blade angle would serve best, and what would be left then. Several files count as one. Nothing is changed:
    this command only reports. CASE may be - for standard input.
    """
    check_targets((), figure)
    import bemt
    from bemt.files.compare import comparison_text

    loaded = bemt.load(case)
    comparison = bemt.compare(loaded, *measured)
    for note in (*loaded.notes, *comparison.notes):
        say(f"Note: {note}")
    if figure is not None:
        from bemt.figures.compare import comparison_figure
        from bemt.figures.style import save

        save(comparison_figure(comparison, title=loaded.title), figure)
    click.echo(comparison_text(comparison, title=loaded.title))
    if figure is not None:
        say(f"Wrote {figure}.")
    if comparison.unconverged:
        say(f"{comparison.unconverged} of {comparison.moving.size} rows did not converge and are left out.")
        if strict:
            context.exit(4)
