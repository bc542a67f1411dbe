"""Figure of merit, zero thrust and peak efficiency of a propeller, each refined by solving."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.rotor import kernels
from bemt.rotor.elements import BladeElements
from bemt.table.coefficients import efficiency, figure_of_merit
from bemt.table.points import Points

FloatArray = NDArray[np.float64]

_SCAN_NODES = 49
_ZOOM_NODES = 9
_ZERO_ZOOMS, _PEAK_ZOOMS = 3, 2

Solver = Callable[[FloatArray], Points]
"""From advance ratios, shape (n_rpm, n), to the points solved there."""


def landmarks(elements: BladeElements, diameter: float, air: Air, rpm: FloatArray) -> dict[str, FloatArray]:
    """Return figure of merit, zero-thrust advance ratio and peak efficiency over rpm, each refined by solving.

    Parameters
    ----------
    elements : BladeElements
    diameter : float
        [m].
    air : Air
    rpm : numpy.ndarray, shape (n_rpm,)

    Returns
    -------
    dict of str to numpy.ndarray, shape (n_rpm,)
        By the registry's names.
    """

    def at(advance_ratio: FloatArray) -> Points:
        speed, ratio = np.broadcast_arrays(rpm[:, None], advance_ratio)
        return Points.solve(elements, diameter, air, speed, ratio)

    ratio = np.broadcast_to(np.linspace(0.0, end_of_thrust(elements), _SCAN_NODES), (rpm.size, _SCAN_NODES))
    scan = at(ratio)
    ct, cp = scan.thrust_coefficient, scan.power_coefficient
    peak, peak_ratio = peak_efficiency(at, ratio, efficiency(ratio, ct, cp))
    return {
        "static_figure_of_merit": figure_of_merit(ct[:, 0], cp[:, 0]),
        "zero_thrust_advance_ratio": zero_thrust(at, ratio, ct),
        "peak_efficiency": peak,
        "peak_efficiency_advance_ratio": peak_ratio,
    }


def end_of_thrust(elements: BladeElements) -> float:
    """Return an advance ratio beyond which no element can pull: none lifts at 15 deg below its chord line.

    Parameters
    ----------
    elements : BladeElements

    Returns
    -------
    float
        At least 0.1.
    """
    steepest = np.clip(elements.columns[:, kernels.E_TWIST] + math.radians(15.0), 0.0, math.radians(80.0))
    return max(float((math.pi * elements.r_over_R * np.tan(steepest)).max()), 0.1)


def zero_thrust(at: Solver, ratio: FloatArray, ct: FloatArray, zooms: int = _ZERO_ZOOMS) -> FloatArray:
    """Return the first advance ratio at which thrust falls through zero.

    Parameters
    ----------
    at : Solver
    ratio, ct : numpy.ndarray, shape (n_rpm, n)
        Advance ratios scanned, and the thrust coefficients there.
    zooms : int
        How often the cell with the fall is solved more finely.

    Returns
    -------
    numpy.ndarray, shape (n_rpm,)
        Missing where there is none.
    """
    rows = np.arange(ratio.shape[0])
    for zoom in range(zooms + 1):
        falls = (ct[:, :-1] > 0.0) & (ct[:, 1:] <= 0.0)
        cell = np.argmax(falls, axis=1)
        if zoom == 0:
            found = falls.any(axis=1)
        low, high = ratio[rows, cell], ratio[rows, cell + 1]
        if zoom < zooms:
            ratio = np.linspace(low, high, _ZOOM_NODES, axis=1)
            ct = at(ratio).thrust_coefficient
    above, below = ct[rows, cell], ct[rows, cell + 1]
    with np.errstate(invalid="ignore", divide="ignore"):
        root: FloatArray = np.where(found, low + (high - low) * above / (above - below), np.nan)
    return root


def peak_efficiency(
    at: Solver, ratio: FloatArray, eta: FloatArray, zooms: int = _PEAK_ZOOMS
) -> tuple[FloatArray, FloatArray]:
    """Return the largest efficiency and its advance ratio.

    Parameters
    ----------
    at : Solver
    ratio, eta : numpy.ndarray, shape (n_rpm, n)
        Advance ratios scanned, and the efficiencies there; missing ones are left out.
    zooms : int
        How often the cells beside the largest are solved more finely.

    Returns
    -------
    peak, place : numpy.ndarray, shape (n_rpm,)
        Missing where there is none.
    """
    rows = np.arange(ratio.shape[0])
    exists = np.isfinite(eta).any(axis=1)
    for zoom in range(zooms + 1):
        top = np.argmax(np.where(np.isfinite(eta), eta, -1.0), axis=1)
        before, after = np.maximum(top - 1, 0), np.minimum(top + 1, ratio.shape[1] - 1)
        if zoom < zooms:
            ratio = np.linspace(ratio[rows, before], ratio[rows, after], _ZOOM_NODES, axis=1)
            points = at(ratio)
            eta = efficiency(ratio, points.thrust_coefficient, points.power_coefficient)
    place, best = ratio[rows, top], eta[rows, top]
    # The parabola through the best of the solved points and its two neighbours, where it has both.
    left, right = eta[rows, before], eta[rows, after]
    curvature = left - 2.0 * best + right
    fits = (before < top) & (top < after) & (curvature < 0.0)
    shift = np.where(fits, 0.5 * (left - right) / np.where(fits, curvature, 1.0), 0.0)
    step = ratio[:, 1] - ratio[:, 0]
    best = best - 0.25 * np.where(fits, left - right, 0.0) * shift
    return np.where(exists, best, np.nan), np.where(exists, place + shift * step, np.nan)
