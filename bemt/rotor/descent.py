"""Descent and backward flight: an estimate from the mean inflow, where momentum theory has no answer."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.quantities.registry import STATUS_NOT_CONVERGED, STATUS_REVERSED_FLOW
from bemt.rotor import kernels as k
from bemt.rotor.element_polars import section_forces
from bemt.rotor.elements import BladeElements
from bemt.rotor.solution import RotorSolution, solve

FloatArray = NDArray[np.float64]

_BLOCK = 64  # points solved together
_SCAN = 48
_HALVINGS = 40


def mean_induced_velocity(descent: ArrayLike) -> FloatArray:
    """Return the mean induced velocity of a rotor that moves along its axis against its thrust.

    Parameters
    ----------
    descent : array_like
        Axial speed over sqrt(T/(2 rho A)), the ideal induced velocity standing still; negative in descent.

    Returns
    -------
    numpy.ndarray
        Mean induced velocity over the same. Momentum theory from 0 up, and below -2 where the stream passes the disk
        from behind everywhere; between them, where the rotor recirculates its own wake, the quartic through
        measurements of J.G. Leishman, Principles of Helicopter Aerodynamics, 2nd ed. 2006 (from memory), with its
        factor at standing still taken as 1 for continuity. At -2 it ends 0.026 above the other branch.
    """
    x = np.asarray(descent, dtype=np.float64)
    inside = np.clip(x, -2.0, 0.0)
    measured = 1.0 + inside * (-1.125 + inside * (-1.372 + inside * (-1.718 - 0.655 * inside)))
    ahead = np.sqrt(0.25 * x**2 + 1.0) - 0.5 * x
    # The small root of w^2 + x w + 1 = 0, written without the difference of two large numbers.
    through = 1.0 / (np.sqrt(np.maximum(0.25 * x**2 - 1.0, 0.0)) + 0.5 * np.abs(x) + (x > -2.0))
    found: FloatArray = np.where(x >= 0.0, ahead, np.where(x > -2.0, measured, through))
    return found


def solve_descent(
    elements: BladeElements,
    airspeed: ArrayLike,
    angular_speed: ArrayLike,
    kinematic_viscosity: ArrayLike,
    speed_of_sound: ArrayLike,
    *,
    radial: bool = False,
) -> RotorSolution:
    """Estimate a propeller that the air meets from behind.

    Parameters
    ----------
    elements : BladeElements
        The blade.
    airspeed : array_like, shape (n,)
        Along the shaft [m/s], zero or negative.
    angular_speed : array_like, shape (n,)
        [rad/s], above zero.
    kinematic_viscosity, speed_of_sound : array_like, shape (n,)
        [m2/s], [m/s].
    radial : bool
        Keep what each element does.

    Returns
    -------
    RotorSolution
        Status "flow reversed" at every point, or "not converged" with NaN where the blade does not pull standing still.

    Raises
    ------
    InputError
        If a value is out of range or not finite.

    Notes
    -----
    The induced velocities of the blade's own static solution, axial and swirl, are scaled by one factor, for which the
    mean induced velocity is that of `mean_induced_velocity` at the thrust the elements then have. At no airspeed the
    factor is 1 and the solution the static one. Of several factors the least is taken: the first at which, from no
    induction up, the elements no longer ask for more. The flow in descent is unsteady and the measured curve is that of
    helicopter rotors of little twist: a figure from here is a direction, not a result.
    """
    given = np.broadcast_arrays(
        *(
            np.atleast_1d(np.asarray(value, dtype=np.float64))
            for value in (airspeed, angular_speed, kinematic_viscosity, speed_of_sound)
        )
    )
    if not all(np.isfinite(value).all() for value in given) or (given[0] > 0.0).any() or not (given[1] > 0.0).all():
        raise InputError("operating point", "descent needs a turning propeller and an airspeed of zero or below")
    parts = []
    for start in range(0, given[0].size, _BLOCK):
        v, omega, nu, sound = (value[start : start + _BLOCK] for value in given)
        parts.append(_solve_block(elements, v, omega, nu, sound, radial))
    names = [name for name in vars(parts[0]) if name != "radial"]
    along = None
    if radial:
        columns = parts[0].radial or {}
        along = {name: np.concatenate([part.radial[name] for part in parts if part.radial]) for name in columns}
    return RotorSolution(
        **{name: np.concatenate([getattr(part, name) for part in parts]) for name in names}, radial=along
    )


def _solve_block(
    elements: BladeElements,
    airspeed: FloatArray,
    omega: FloatArray,
    nu: FloatArray,
    sound: FloatArray,
    radial: bool,
) -> RotorSolution:
    columns = elements.columns
    radius, width = columns[:, k.E_RADIUS], columns[:, k.E_WIDTH]
    static = solve(elements, np.zeros_like(airspeed), omega, nu, sound, radial=True)
    assert static.radial is not None
    axial_shape, swirl_shape = static.radial["axial_induced_velocity"], static.radial["tangential_induced_velocity"]
    twice_area = 2.0 * math.pi * elements.tip_radius**2
    hover = np.sqrt(np.maximum(static.thrust_per_density, 0.0) / twice_area)
    pulls = hover > 0.0

    def loadings(factor: FloatArray) -> dict[str, FloatArray]:
        """Return what the elements do at a factor a point."""
        axial = airspeed[:, None] + factor[:, None] * axial_shape
        around = omega[:, None] * radius - factor[:, None] * swirl_shape
        speed = np.hypot(axial, around)
        inflow = np.arctan2(axial, around)
        alpha = columns[:, k.E_TWIST] - inflow
        section = section_forces(
            elements, alpha, np.log(speed * columns[:, k.E_CHORD] / nu[:, None]), speed / sound[:, None]
        )
        chord = 0.5 * elements.blades * columns[:, k.E_CHORD] * speed
        return {
            "inflow_angle": inflow,
            "angle_of_attack": alpha,
            "section_lift_coefficient": section.lift,
            "section_drag_coefficient": section.drag,
            "axial_induced_velocity": factor[:, None] * axial_shape,
            "tangential_induced_velocity": factor[:, None] * swirl_shape,
            "thrust_loading": chord * (section.lift * around - section.drag * axial),
            "torque_loading": radius * chord * (section.lift * axial + section.drag * around),
            "stalled": section.stalled.astype(np.float64),
            "outside": np.maximum(section.outside, columns[:, k.E_OUTSIDE]),
            "low_reynolds": section.low_reynolds.astype(np.float64),
            "diverged": section.diverged.astype(np.float64),
        }

    def wanting(factor: FloatArray) -> FloatArray:
        """Return how far the curve's induced velocity exceeds the one assumed [m/s]."""
        thrust = loadings(factor)["thrust_loading"] @ width
        ideal = np.sqrt(np.maximum(thrust, 0.0) / twice_area)
        asked = ideal * mean_induced_velocity(airspeed / np.where(ideal > 0.0, ideal, 1.0))
        return np.where(ideal > 0.0, asked, 0.0) - factor * hover

    # No induction leaves it wanting. The curve asks for no more than 2.1 times the ideal velocity, which grows with the
    # speed of the elements.
    tip = np.hypot(airspeed, omega * elements.tip_radius)
    low, high = np.zeros_like(airspeed), np.zeros_like(airspeed)
    found = np.zeros(airspeed.shape, dtype=bool)
    reach = np.where(pulls, 2.0 * tip / np.where(pulls, hover, 1.0), 1.0)
    before = low
    for share in 1.0 - np.cos(np.linspace(0.0, 0.5 * math.pi, _SCAN))[1:]:
        trial = share * reach
        turned = ~found & (wanting(trial) <= 0.0)
        low, high = np.where(turned, before, low), np.where(turned, trial, high)
        found |= turned
        before = trial
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        short = wanting(middle) > 0.0
        low, high = np.where(short, middle, low), np.where(short, high, middle)
    factor = np.where(airspeed == 0.0, 1.0, 0.5 * (low + high))

    state = loadings(factor)
    known = np.where(found & pulls, 1.0, np.nan)
    weight = elements.span_weight
    names = [name for name in state if name not in ("stalled", "outside", "low_reynolds", "diverged")]
    return RotorSolution(
        thrust_per_density=known * (state["thrust_loading"] @ width),
        torque_per_density=known * (state["torque_loading"] @ width),
        stalled_share=state["stalled"] @ weight,
        outside_polar_share=state["outside"] @ weight,
        low_reynolds_share=state["low_reynolds"] @ weight,
        above_divergence_share=state["diverged"] @ weight,
        status=np.where(np.isnan(known), STATUS_NOT_CONVERGED, STATUS_REVERSED_FLOW).astype(np.int16),
        radial={name: known[:, None] * state[name] for name in names} if radial else None,
    )
