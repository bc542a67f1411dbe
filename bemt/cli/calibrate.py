"""`bemt calibrate`: constants out of measured points, into a new case."""

from __future__ import annotations

import shlex

import click

from bemt.cli.output import CAUTION_POWER, CAUTION_PROPELLER, CAUTION_RULES, case_argument, say
from bemt.errors import InputError


@click.command("calibrate")
@case_argument
@click.argument(
    "measured", metavar="READINGS.csv...", nargs=-1, required=True, type=click.Path(exists=True, dir_okay=False)
)
@click.option(
    "--of",
    "part",
    type=click.Choice(["propeller", "motor"]),
    default="propeller",
    show_default=True,
    help="What is calibrated.",
)
@click.option(
    "--hold",
    type=click.Choice(["speed_constant", "winding_resistance", "no_load_current"]),
    multiple=True,
    help="Keep the case's value of a motor constant; may be repeated.",
)
@click.option("-o", "--output", metavar="NEWCASE", help="Write the case with the constants found: .toml.")
def command(case: str, measured: tuple[str, ...], part: str, hold: tuple[str, ...], output: str | None) -> None:
    """Find constants that measured points tell.

    Of a motor: speed constant, winding resistance and no-load current from rows of voltage, current, rpm, torque and
    duty, with their uncertainties and with what the rows cannot tell. The case itself is never changed. Several files
    count as one. CASE may be - for standard input.
    """
    if part == "propeller":
        raise click.BadParameter(
            "calibrating a propeller is not available in this version; use --of motor, or bemt compare to see what "
            "would serve",
            param_hint="--of",
        )
    import bemt
    from bemt.files.calibrate import calibration_text, check_new_case, notices, write_calibrated_case

    loaded = bemt.load(case)
    if output is not None:
        try:
            check_new_case(loaded, output)
        except InputError as error:
            raise click.BadParameter(error.message, param_hint="-o") from error
    fit = bemt.calibrate_motor(loaded, *measured, held=hold)
    for note in notices(fit):
        say(f"Note: {note}")
    click.echo(calibration_text(fit, title=loaded.title))
    if output is not None:
        write_calibrated_case(loaded, fit, output)
        say(f"Wrote {output}. Look at it with: bemt check {shlex.quote(output)}")
    for caution in (CAUTION_PROPELLER, CAUTION_POWER, CAUTION_RULES):
        say(caution)
