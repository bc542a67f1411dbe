"""The plain-Python face of the kernels: operating points in, forces and validity out."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.rotor import kernels as k
from bemt.rotor.elements import BladeElements

FloatArray = NDArray[np.float64]

RADIAL_COLUMNS = {
    "inflow_angle": k.L_INFLOW,
    "angle_of_attack": k.L_ALPHA,
    "section_lift_coefficient": k.L_LIFT,
    "section_drag_coefficient": k.L_DRAG,
    "axial_induced_velocity": k.L_AXIAL,
    "tangential_induced_velocity": k.L_SWIRL,
    "thrust_loading": k.L_THRUST,
    "torque_loading": k.L_TORQUE,
}
"""Columns of the radial results by the registry's names; angles in radians, loadings per unit density."""


@dataclass(frozen=True, eq=False)
class RotorSolution:
    """Forces of a whole propeller at a list of points.

    Parameters
    ----------
    thrust_per_density : numpy.ndarray, shape (n,)
        T/rho [m4/s2]; NaN where an element did not converge.
    torque_per_density : numpy.ndarray, shape (n,)
        Q/rho [m5/s2].
    stalled_share, outside_polar_share, low_reynolds_share : numpy.ndarray, shape (n,)
        Shares of the span weighted by r^2 chord.
    status : numpy.ndarray of int16, shape (n,)
        Worst status of the elements.
    radial : numpy.ndarray, shape (n, n_elements, kernels.L_COLUMNS), optional
        What each element does.
    """

    thrust_per_density: FloatArray
    torque_per_density: FloatArray
    stalled_share: FloatArray
    outside_polar_share: FloatArray
    low_reynolds_share: FloatArray
    status: NDArray[np.int16]
    radial: FloatArray | None = None


@lru_cache(maxsize=1)
def _loss_table() -> FloatArray:
    return k.loss_table()


def solve(
    elements: BladeElements,
    airspeed: ArrayLike,
    angular_speed: ArrayLike,
    kinematic_viscosity: ArrayLike,
    speed_of_sound: ArrayLike,
    *,
    radial: bool = False,
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

    Returns
    -------
    RotorSolution

    Raises
    ------
    InputError
        If a value is out of range or not finite.
    """
    columns = np.broadcast_arrays(
        *(np.atleast_1d(np.asarray(value, dtype=np.float64)) for value in (airspeed, angular_speed)),
        *(1.0 / np.atleast_1d(np.asarray(value, dtype=np.float64)) for value in (kinematic_viscosity, speed_of_sound)),
    )
    points = np.stack(columns, axis=-1)
    if not np.isfinite(points).all() or (points < 0).any():
        raise InputError("operating point", "airspeed, rotational speed and air must be finite and not negative")
    if (points[:, k.P_AIRSPEED] + points[:, k.P_OMEGA] <= 0).any():
        raise InputError("operating point", "neither airspeed nor rotation: nothing to solve")
    results = np.zeros((points.shape[0], k.R_COLUMNS))
    shape = (points.shape[0], elements.columns.shape[0], k.L_COLUMNS) if radial else (0, 0, 0)
    loading = np.zeros(shape)
    k.solve_points(
        points,
        elements.columns,
        elements.polars,
        elements.bounds,
        elements.ln_reynolds,
        _loss_table(),
        elements.blades,
        results,
        loading,
        np.empty(k.scratch_size(points.shape[0], elements.columns.shape[0])),
        np.empty(2 * k.LANES, dtype=np.int64),
    )
    return RotorSolution(
        thrust_per_density=results[:, k.R_THRUST],
        torque_per_density=results[:, k.R_TORQUE],
        stalled_share=results[:, k.R_STALLED],
        outside_polar_share=results[:, k.R_OUTSIDE],
        low_reynolds_share=results[:, k.R_LOW_RE],
        status=results[:, k.R_STATUS].astype(np.int16),
        radial=loading if radial else None,
    )
