"""Compute the table of Goldstein's factor that `goldstein.py` reads: `python -m bemt.rotor.goldstein_data`.

Takes some minutes. The library never imports this module. The result does not depend on time, and on the machine only
in the last digits.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

from bemt.rotor.goldstein import DATA, LEAST_R_OVER_R, TABLED_BLADES, pitch_at, prandtl_factor
from bemt.rotor.helical_vortex import refined

FloatArray = NDArray[np.float64]

_PANELS = 240
_NODES = 33
_ENDLESS_PITCH = 1e4  # stands for an infinite one: what is left goes with its inverse square


def sheet_factor(blades: int, wake_pitch: float, panels: int = _PANELS) -> tuple[FloatArray, FloatArray]:
    """Solve the rigid helical sheets for the circulation that makes them move as one, as a lifting line sees them.

    The sheets reach the axis. Cosine-spaced vortices, control points in the middles of the spacing's angle; each row
    asks for the velocity normal to the sheet, half that of the far wake, w cos(beta)/2.

    Parameters
    ----------
    blades : int
        Number of sheets.
    wake_pitch : float
        Advance per radian over the tip radius, positive.
    panels : int
        Pieces of the span.

    Returns
    -------
    r_over_R, factor : numpy.ndarray, shape (panels,)
        Middles of the panels, and Goldstein's factor there.
    """
    edges = 0.5 * (1.0 - np.cos(np.linspace(0.0, np.pi, panels + 1)))
    middle = 0.5 * (1.0 - np.cos((np.arange(panels) + 0.5) * np.pi / panels))
    axial, tangential = refined(blades, middle[:, None], edges, wake_pitch)
    slant = np.hypot(middle, wake_pitch)
    cosine, sine = middle / slant, wake_pitch / slant
    normal = axial * cosine[:, None] - tangential * sine[:, None]
    # A panel's circulation leaves forward at its outer edge and backward at its inner one.
    circulation = np.linalg.solve(normal[:, 1:] - normal[:, :-1], 0.5 * cosine)
    return middle, blades * circulation / (2.0 * np.pi * wake_pitch) / cosine**2


def table() -> dict[str, NDArray[Any]]:
    """Return the arrays of the data file by name.

    Returns
    -------
    dict of str to numpy.ndarray
        `r_over_R` (n,), `wake_pitch` (m,) from 0 to infinity, and `ratio` (blades, n, m): Goldstein's factor over
        Prandtl's, times (r/R)^2.
    """
    angle = np.linspace(0.0, 0.5 * np.pi, _NODES)
    r_over_R = LEAST_R_OVER_R + (1.0 - LEAST_R_OVER_R) * np.sin(angle)
    wake_pitch = pitch_at(np.linspace(0.0, 1.0, _NODES))
    ratio = np.empty((TABLED_BLADES, _NODES, _NODES), dtype=np.float32)
    ratio[:, :, 0] = r_over_R**2
    for blades in range(1, TABLED_BLADES + 1):
        for column in range(1, _NODES):
            pitch = min(float(wake_pitch[column]), _ENDLESS_PITCH)
            ratio[blades - 1, :, column] = ratio_at(blades, pitch, r_over_R)
    return {"r_over_R": r_over_R, "wake_pitch": wake_pitch, "ratio": ratio}


def ratio_at(blades: int, wake_pitch: float, r_over_R: FloatArray) -> FloatArray:
    """Return one column of the table.

    Parameters
    ----------
    blades : int
    wake_pitch : float
        Finite and positive.
    r_over_R : numpy.ndarray, shape (n,)

    Returns
    -------
    numpy.ndarray, shape (n,)
        Goldstein's factor over Prandtl's, times (r/R)^2.
    """
    middle, factor = sheet_factor(blades, wake_pitch)
    sine = wake_pitch / np.hypot(middle, wake_pitch)
    found = factor / prandtl_factor(blades, middle, sine) * middle**2
    # Even at the tip in the angle whose sine is r/R: mirrored, so that the tip is inside.
    angle = np.arcsin(middle)
    curve = CubicSpline(np.concatenate([angle, np.pi - angle[::-1]]), np.concatenate([found, found[::-1]]))
    column: FloatArray = curve(np.arcsin(r_over_R))
    return column


if __name__ == "__main__":
    arrays = table()
    np.savez_compressed(Path(__file__).with_name(DATA), allow_pickle=False, **arrays)
