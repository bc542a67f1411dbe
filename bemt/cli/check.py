"""`bemt check`: judge a case without running it."""

from __future__ import annotations

import click

from bemt.cli.output import CAUTION_POWER, CAUTION_PROPELLER, CAUTION_RULES, case_argument, say


@click.command("check")
@case_argument
def command(case: str) -> None:
    """Judge a case without running it.

    Lists everything that is wrong with the case and the files it names; where nothing is, tells in plain words what
    is in it and which commands it is ready for. CASE may be - for standard input.
    """
    from bemt.case import load_case
    from bemt.case.describe import describe

    loaded = load_case(case)
    click.echo(describe(loaded))
    for note in loaded.notes:
        say(f"Note: {note}")
    say(CAUTION_PROPELLER)
    if loaded.propeller.rpm_limit is None:
        say("This case names no rpm_limit: look for the limit on the propeller, and give it.")
    if loaded.battery is not None:
        say(CAUTION_POWER)
    if loaded.airframe is not None:
        say(CAUTION_RULES)
