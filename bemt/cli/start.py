"""`bemt start`: a starter case that runs as it is."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path

import click

from bemt.cli.output import CAUTION_PROPELLER

STARTER_FILES = ("case.toml", "blade.csv")


@click.command("start")
@click.argument("directory", metavar="DIR", type=click.Path(file_okay=False))
def command(directory: str) -> None:
    """Write a starter case that runs as it is.

    DIR is made where it is not there; files that are there already are never overwritten.
    """
    folder = Path(directory)
    present = [name for name in STARTER_FILES if (folder / name).exists() or (folder / name).is_symlink()]
    if present:
        raise click.UsageError(f"{folder / present[0]} is there already; nothing was written. Name another folder.")
    write_starter(folder)
    case = click.format_filename(folder / STARTER_FILES[0])
    click.echo(
        f"Wrote {' and '.join(str(folder / name) for name in STARTER_FILES)}: an invented propeller and aircraft, to "
        f"put your own in their place.\nNext: bemt check {case}, then bemt table {case}, then bemt envelope {case}.\n"
        f"Before you run a real one: {CAUTION_PROPELLER}",
        err=True,
    )


def write_starter(folder: Path) -> None:
    """Write the starter case, all of it or nothing.

    Parameters
    ----------
    folder : pathlib.Path
        Made where it is not there.

    Raises
    ------
    OSError
        If the folder or a file cannot be written, or a file is there already; nothing new is left behind.
    """
    made = [parent for parent in (folder, *folder.parents) if not parent.exists()]
    written: list[Path] = []
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name in STARTER_FILES:
            content = files("bemt.cli").joinpath("starter", name).read_bytes()
            with (folder / name).open("xb") as stream:
                written.append(folder / name)
                stream.write(content)
    except BaseException:
        for path in written:
            path.unlink(missing_ok=True)
        for parent in made:
            if parent.exists():
                parent.rmdir()
        raise
