"""The plain-Python face of the kernels: operating points in, forces and validity out."""

from __future__ import annotations

from collections.abc import Mapping
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.rotor import kernels as k
from bemt.rotor.elements import BladeElements

FloatArray = NDArray[np.float64]

_BLOCK = 1024  # points solved at a time: bounds the memory, and is what threads share
_RADIAL_NAMES = (
    "inflow_angle",
    "angle_of_attack",
    "section_lift_coefficient",
    "section_drag_coefficient",
    "axial_induced_velocity",
    "tangential_induced_velocity",
    "thrust_loading",
    "torque_loading",
    "speed",
    "end_loss",
    "high_induction",
    "status",
    "evaluations",
)


@dataclass(frozen=True, eq=False)
class RotorSolution:
    """Forces of a whole propeller at a list of points.

    Parameters
    ----------
    thrust_per_density : numpy.ndarray, shape (n,)
        T/rho [m4/s2]; NaN where an element did not converge.
    torque_per_density : numpy.ndarray, shape (n,)
        Q/rho [m5/s2].
    stalled_share, outside_polar_share, low_reynolds_share, above_divergence_share : numpy.ndarray, shape (n,)
        Shares of the span weighted by r^2 chord.
    status : numpy.ndarray of int16, shape (n,)
        Worst status of the elements.
    radial : mapping of str to numpy.ndarray, shape (n, n_elements), optional
        What each element does, by the registry's names, angles in radians and loadings per unit density; also
        `speed` [m/s], `end_loss`, `high_induction` (NaN but on Buhl's branch), `status` and `evaluations`.
    """

    thrust_per_density: FloatArray
    torque_per_density: FloatArray
    stalled_share: FloatArray
    outside_polar_share: FloatArray
    low_reynolds_share: FloatArray
    above_divergence_share: FloatArray
    status: NDArray[np.int16]
    radial: Mapping[str, FloatArray] | None = None


def solve(
    elements: BladeElements,
    airspeed: ArrayLike,
    angular_speed: ArrayLike,
    kinematic_viscosity: ArrayLike,
    speed_of_sound: ArrayLike,
    *,
    radial: bool = False,
    workers: int = 1,
) -> RotorSolution:
    """Solve the blade-element momentum equations at a list of operating points.

    Parameters
    ----------
    elements : BladeElements
        The blade.
    airspeed : array_like, shape (n,)
        Along the shaft, at the disk without the propeller [m/s], not negative.
    angular_speed : array_like, shape (n,)
        [rad/s], not negative; not 0 together with the airspeed.
    kinematic_viscosity, speed_of_sound : array_like, shape (n,)
        [m2/s], [m/s].
    radial : bool
        Keep what each element does.
    workers : int
        Threads that share the points; the result is the same to the last bit.

    Returns
    -------
    RotorSolution

    Raises
    ------
    InputError
        If a value is out of range or not finite.
    """
    given = [
        np.asarray(value, dtype=np.float64) for value in (airspeed, angular_speed, kinematic_viscosity, speed_of_sound)
    ]
    points = np.empty((max(value.size for value in given), k.P_COLUMNS))
    for column, value in enumerate(given):
        points[:, column] = 1.0 / value if column in (k.P_INVERSE_VISCOSITY, k.P_INVERSE_SOUND) else value
    if not 0.0 <= points.min() <= points.max() < np.inf:
        raise InputError("operating point", "airspeed, rotational speed and air must be finite and not negative")
    if (points[:, k.P_AIRSPEED] + points[:, k.P_OMEGA] <= 0).any():
        raise InputError("operating point", "neither airspeed nor rotation: nothing to solve")
    blocks = [points[start : start + _BLOCK] for start in range(0, points.shape[0], _BLOCK)]
    if workers > 1 and len(blocks) > 1:
        with ThreadPoolExecutor(workers) as pool:
            parts = list(pool.map(lambda block: _add_up(block, elements, radial), blocks))
    else:
        parts = [_add_up(block, elements, radial) for block in blocks]
    if len(parts) == 1:
        return parts[0]
    joined = {
        name: np.concatenate([getattr(part, name) for part in parts])
        for name in (
            "thrust_per_density",
            "torque_per_density",
            "stalled_share",
            "outside_polar_share",
            "low_reynolds_share",
            "above_divergence_share",
            "status",
        )
    }
    along = None
    if radial:
        along = {name: np.concatenate([part.radial[name] for part in parts if part.radial]) for name in _RADIAL_NAMES}
    return RotorSolution(**joined, radial=along)


def _add_up(points: FloatArray, elements: BladeElements, radial: bool) -> RotorSolution:
    state = solve_pairs(points, elements)
    weight = elements.span_weight
    outside = np.maximum(state[k.S_OUTSIDE], elements.columns[:, k.E_OUTSIDE])
    return RotorSolution(
        thrust_per_density=state[k.S_THRUST].sum(axis=-1),
        torque_per_density=state[k.S_TORQUE].sum(axis=-1),
        stalled_share=state[k.S_STALLED] @ weight,
        outside_polar_share=outside @ weight,
        low_reynolds_share=state[k.S_LOW_RE] @ weight,
        above_divergence_share=state[k.S_DIVERGED] @ weight,
        status=state[k.S_STATUS].max(axis=-1).astype(np.int16),
        radial=_radial(points, elements, state) if radial else None,
    )


def solve_pairs(points: FloatArray, elements: BladeElements) -> FloatArray:
    """Solve every element at every point; nothing is checked or added up.

    Parameters
    ----------
    points : numpy.ndarray, shape (n, kernels.P_COLUMNS)
        Contiguous.
    elements : BladeElements

    Returns
    -------
    numpy.ndarray, shape (kernels.S_ROWS, n, n_elements)
    """
    n_points, n_elements = points.shape[0], elements.columns.shape[0]
    state = np.empty((k.S_ROWS, n_points * n_elements))
    blade = (points, elements.columns, elements.polars, elements.bounds, elements.ln_reynolds)
    if elements.mach.size > 1:
        k.search_at_mach(
            *blade,
            elements.mach,
            elements.loss,
            elements.blades,
            state,
            np.empty((4, *elements.polars.shape[2:])),
            np.empty((4, k.B_COLUMNS)),
            np.empty(k.E_COLUMNS),
        )
        return state.reshape(k.S_ROWS, n_points, n_elements)
    common = (*blade, elements.loss, elements.blades, state)
    k.solve_lanes(
        *common,
        np.empty(k.scratch_size(n_points, n_elements)),
        np.empty(k.index_size(n_points, n_elements), dtype=np.int64),
    )
    if (state[k.S_STATUS] <= 0.0).any():
        k.prove_roots(*common)
        if (state[k.S_STATUS] <= 0.0).any():
            k.search_roots(*common)
    return state.reshape(k.S_ROWS, n_points, n_elements)


def _radial(points: FloatArray, elements: BladeElements, state: FloatArray) -> dict[str, FloatArray]:
    columns = elements.columns
    airspeed = points[:, k.P_AIRSPEED, None]
    turning = points[:, k.P_OMEGA, None] * columns[:, k.E_RADIUS]
    undisturbed = np.arctan2(airspeed, turning)
    inflow = undisturbed + state[k.S_PSI]
    speed = state[k.S_SPEED] * np.hypot(airspeed, turning)
    sine = np.sin(inflow)
    values = (
        inflow,
        columns[:, k.E_TWIST] - inflow,
        state[k.S_LIFT],
        state[k.S_DRAG],
        speed * sine - airspeed,
        turning - speed * np.cos(inflow),
        state[k.S_THRUST] / columns[:, k.E_WIDTH],
        state[k.S_TORQUE] / columns[:, k.E_WIDTH],
        speed,
        0.25 * state[k.S_X4] / np.maximum(np.abs(sine), 1e-300),
        state[k.S_INDUCTION],
        state[k.S_STATUS],
        state[k.S_EVALUATIONS],
    )
    return dict(zip(_RADIAL_NAMES, values, strict=True))
