"""Results as pictures: SVG, PNG or PDF, chosen by the ending of the name."""

from __future__ import annotations

from pathlib import Path

from bemt.errors import InputError
from bemt.files.atomic import check_target

__all__ = ["FIGURE_ENDINGS", "check_figure_target"]

FIGURE_ENDINGS = (".svg", ".png", ".pdf")


def check_figure_target(path: str | Path) -> None:
    """Find out whether a figure can be written under a name, before anything is computed.

    Parameters
    ----------
    path : str or pathlib.Path
        The file that is to be written.

    Raises
    ------
    InputError
        If no format belongs to the ending.
    RunError
        If the place cannot be written to.
    """
    ending = Path(path).suffix
    if ending.lower() not in FIGURE_ENDINGS:
        what = f"the ending {ending!r} stands for no figure" if ending else "a figure needs an ending"
        raise InputError("", f"{path}: {what}; those that do: {', '.join(FIGURE_ENDINGS)}")
    check_target(path)
