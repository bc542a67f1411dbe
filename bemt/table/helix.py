"""The helix inflow over a grid: where it is to be trusted, how far it leads from momentum, and its landmarks."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.rotor.elements import BladeElements
from bemt.rotor.lifting_line import outside_inflow_law, solve_helix
from bemt.table.coefficients import efficiency
from bemt.table.landmarks import end_of_thrust, peak_efficiency, zero_thrust
from bemt.table.points import Points

__all__ = ["against_momentum", "helix_landmarks", "outside_law", "solve_helix"]

FloatArray = NDArray[np.float64]

_SCAN = (0.5, 1.2, 15)  # of the momentum solution's advance ratio of no thrust


def outside_law(elements: BladeElements, points: Points, turns_times_area: FloatArray) -> NDArray[np.bool_]:
    """Say where the helix inflow is not to be trusted.

    Parameters
    ----------
    elements : BladeElements
    points : Points
        Solved by it, shape (n_rpm, n_j).
    turns_times_area : numpy.ndarray, shape (n_rpm, n_j)
        n D^2 [m2/s].

    Returns
    -------
    numpy.ndarray of bool, shape (n_rpm, n_j)
    """
    thrust = points.thrust_coefficient * turns_times_area**2
    return outside_inflow_law(elements, points.airspeed.ravel(), thrust.ravel()).reshape(thrust.shape)


def against_momentum(points: Points, momentum: Points, trusted: NDArray[np.bool_]) -> str:
    """Say how far the helix inflow leads from the momentum solution of the same grid, where it is to be trusted.

    Parameters
    ----------
    points, momentum : Points
        Shape (n_rpm, n_j).
    trusted : numpy.ndarray of bool, shape (n_rpm, n_j)

    Returns
    -------
    str
        For a reader.
    """
    compared = trusted & np.isfinite(points.thrust_coefficient)
    if not compared.any():
        return "at no point of this grid is the helix inflow to be trusted: its wake contracts too much"
    parts = []
    for symbol, name in (("CT", "thrust_coefficient"), ("CP", "power_coefficient")):
        base = momentum.values[name]
        gap = 100.0 * (np.abs(points.values[name] - base) / np.abs(base).max(axis=1, keepdims=True))[compared]
        parts.append(f"{symbol} typically by {np.median(gap):.1f} % and at most by {gap.max():.1f} %")
    return (
        f"helix inflow: differs from the momentum solution of this grid in {' and in '.join(parts)} of the largest "
        f"value of its rpm, over the {int(compared.sum())} of {compared.size} points where it is to be trusted"
    )


def helix_landmarks(
    elements: BladeElements, diameter: float, air: Air, rpm: FloatArray, momentum: Mapping[str, NDArray[Any]]
) -> dict[str, FloatArray]:
    """Return the landmarks by the helix inflow: near those of the momentum solution, because it takes its time.

    Parameters
    ----------
    elements : BladeElements
    diameter : float
        [m].
    air : Air
    rpm : numpy.ndarray, shape (n_rpm,)
    momentum : mapping of str to numpy.ndarray
        Landmarks of the momentum solution.

    Returns
    -------
    dict of str to numpy.ndarray, shape (n_rpm,)
        By the registry's names; standing still it has no figure of merit.
    """

    def at(advance_ratio: FloatArray) -> Points:
        speed, ratio = np.broadcast_arrays(rpm[:, None], advance_ratio)
        return Points.solve(elements, diameter, air, speed, ratio, law=solve_helix)

    end = momentum["zero_thrust_advance_ratio"]
    end = np.where(np.isfinite(end), end, end_of_thrust(elements))
    ratio = end[:, None] * np.linspace(*_SCAN)
    scan = at(ratio)
    peak, peak_ratio = peak_efficiency(
        at, ratio, efficiency(ratio, scan.thrust_coefficient, scan.power_coefficient), zooms=1
    )
    return {
        "static_figure_of_merit": np.full(rpm.shape, np.nan),
        "zero_thrust_advance_ratio": zero_thrust(at, ratio, scan.thrust_coefficient, zooms=1),
        "peak_efficiency": peak,
        "peak_efficiency_advance_ratio": peak_ratio,
    }
