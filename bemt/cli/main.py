"""The program `bemt`: its commands, loaded when they are asked for, and how every one of them ends."""

from __future__ import annotations

import importlib
import os
from typing import Any

import click

from bemt.errors import BemtError
from bemt.version import __version__

COMMANDS = ("start", "check", "table", "envelope", "compare", "calibrate")
"""Each stands in the module of its name, as `command`."""


class CommandGroup(click.Group):
    """Imports a command's module when it is asked for, and turns what went wrong into messages and exit codes."""

    def list_commands(self, ctx: click.Context) -> list[str]:  # noqa: ARG002
        """Return the names in the order of a user's work.

        Parameters
        ----------
        ctx : click.Context

        Returns
        -------
        list of str
        """
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:  # noqa: ARG002
        """Import a command.

        Parameters
        ----------
        ctx : click.Context
        cmd_name : str
            As typed.

        Returns
        -------
        click.Command or None
            None where there is no such command.
        """
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = importlib.import_module(f"bemt.cli.{cmd_name}").command
        return command

    def invoke(self, ctx: click.Context) -> Any:
        """Run the command; a mistake the user can mend ends in words and an exit code, not in a traceback.

        Parameters
        ----------
        ctx : click.Context

        Returns
        -------
        object
            Whatever the command returned.
        """
        try:
            return super().invoke(ctx)
        except BemtError as error:
            click.echo(str(error), err=True)
            ctx.exit(error.exit_code)
        except BrokenPipeError:
            raise  # a closed pipe is click's to handle
        except OSError as error:
            place = f"{error.filename}: " if error.filename else ""
            click.echo(f"{place}{error.strerror or error}", err=True)
            ctx.exit(1)


@click.group(cls=CommandGroup, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="bemt", message="%(prog)s %(version)s")
@click.pass_context
def main(ctx: click.Context) -> None:
    """Compute what a propeller does that nobody has measured.

    From a measured or drawn blade to coefficients, and on to what it does on a motor, battery and airframe. Begin with
    "bemt start DIR", which writes a case that runs as it is.

    Exit codes: 0 done; 1 the run failed; 2 wrong usage; 3 the case or a data file is wrong; 4 some points did not
    converge and --strict was given.
    """
    if os.environ.get("NO_COLOR"):
        ctx.color = False


if __name__ == "__main__":
    main()
