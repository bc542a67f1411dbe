"""How our figures look, and how they leave: one style, one way to save."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import matplotlib as mpl
import numpy as np
from matplotlib.figure import Figure

from bemt.errors import InputError
from bemt.figures import FIGURE_ENDINGS
from bemt.files.atomic import replacing

INK = "#1f2a30"
QUIET = "#5d6b73"
GRID = "#dfe5e8"
LIMIT = "#b3261e"

# Lightness falls evenly and hue turns from ochre over teal to indigo: told apart in grey print and by every kind of
# colour vision. Shapes tell the same lines apart a second time.
_RAMP = ((0.80, 0.58, 0.13), (0.44, 0.60, 0.30), (0.11, 0.55, 0.52), (0.13, 0.39, 0.60), (0.24, 0.17, 0.45))
MARKERS = ("o", "s", "^", "D", "v", "p", "P", "X", "<", ">")

_SETTINGS: Any = {
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],
    "font.size": 9.5,
    "axes.edgecolor": QUIET,
    "axes.labelcolor": INK,
    "axes.linewidth": 0.8,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.grid": True,
    "axes.axisbelow": True,
    "grid.color": GRID,
    "grid.linewidth": 0.7,
    "lines.solid_capstyle": "round",
    "lines.dash_capstyle": "butt",
    "text.color": INK,
    "xtick.color": QUIET,
    "ytick.color": QUIET,
    "xtick.labelcolor": INK,
    "ytick.labelcolor": INK,
    "legend.frameon": False,
    "savefig.dpi": 160,
    "svg.fonttype": "path",
    "svg.hashsalt": "bemt",
    "pdf.fonttype": 42,
}


@contextmanager
def our_style() -> Iterator[None]:
    """Draw with our settings and leave the caller's as they were."""
    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update(_SETTINGS)
        yield


def ramp(count: int) -> list[tuple[float, float, float]]:
    """Return colours for values in order.

    Parameters
    ----------
    count : int
        How many lines there are.

    Returns
    -------
    list of tuple of float
        Red, green and blue of each, from light to dark; the darkest where there is one line only.
    """
    places = np.linspace(0.0, 1.0, count) if count > 1 else np.array([1.0])
    knots = np.linspace(0.0, 1.0, len(_RAMP))
    channels = np.array(_RAMP)
    return [
        (float(r), float(g), float(b))
        for r, g, b in np.column_stack([np.interp(places, knots, channels[:, k]) for k in range(3)])
    ]


def spread(wanted: Sequence[float], gap: float, low: float, high: float) -> list[float]:
    """Move labels along one axis as little as needed so that none covers another.

    Parameters
    ----------
    wanted : sequence of float
        Where each label would stand.
    gap : float
        Smallest distance between two.
    low, high : float
        Where labels may stand; all fit where the gaps allow it.

    Returns
    -------
    list of float
        The places, in the order of `wanted`.
    """
    order = np.argsort(np.asarray(wanted, dtype=float), kind="stable")
    room = max(high - low, 0.0)
    step = min(gap, room / max(len(order) - 1, 1))
    # Least-squares places under a fixed order: take the offsets off, average what falls back, put them on again.
    blocks: list[list[float]] = []
    for k, index in enumerate(order):
        blocks.append([float(np.clip(wanted[int(index)], low, high)) - k * step, 1.0])
        while len(blocks) > 1 and blocks[-2][0] > blocks[-1][0]:
            value, weight = blocks.pop()
            before = blocks[-1]
            before[0] = (before[0] * before[1] + value * weight) / (before[1] + weight)
            before[1] += weight
    flat = [value for value, weight in blocks for _ in range(round(weight))]
    top = high - step * (len(order) - 1)
    places = [0.0] * len(order)
    for k, index in enumerate(order):
        places[int(index)] = min(max(flat[k], low), top) + k * step
    return places


def save(figure: Figure, path: str | Path) -> None:
    """Write a figure whole or not at all.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
        What is to be written.
    path : str or pathlib.Path
        Ending `.svg`, `.png` or `.pdf`.

    Raises
    ------
    InputError
        If no format belongs to the ending.
    RunError
        If the file cannot be written.
    """
    ending = Path(path).suffix.lower()
    if ending not in FIGURE_ENDINGS:
        raise InputError("", f"{path}: a figure ends in {', '.join(FIGURE_ENDINGS)}")
    # No date inside: the same numbers give the same file.
    undated = {".svg": {"Date": None}, ".pdf": {"CreationDate": None}, ".png": {}}[ending]
    with our_style(), replacing([path]) as (draft,):
        figure.savefig(draft, format=ending[1:], metadata=undated)
