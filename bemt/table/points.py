"""Operating points solved directly, by the law of their state: ahead, in descent, at incidence."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.quantities.registry import RADIAL, SHARES
from bemt.rotor.descent import solve_descent
from bemt.rotor.elements import BladeElements
from bemt.rotor.incidence import IncidenceSolution, solve_incidence
from bemt.rotor.solution import RotorSolution, solve

FloatArray = NDArray[np.float64]

# From forces and moments over density to coefficients, and which are moments.
_PER_DENSITY = {
    "thrust_per_density": ("thrust_coefficient", False),
    "torque_per_density": ("torque_coefficient", True),
    "normal_force_per_density": ("normal_force_coefficient", False),
    "side_force_per_density": ("side_force_coefficient", False),
    "pitching_moment_per_density": ("pitching_moment_coefficient", True),
    "yaw_moment_per_density": ("yaw_moment_coefficient", True),
}
_ANGLES = ("inflow_angle", "angle_of_attack")
_LOADINGS = ("thrust_loading", "torque_loading")

Law = Callable[..., RotorSolution]
"""Solutions of axial flow ahead, with the signature of `bemt.rotor.solution.solve`."""


@dataclass(frozen=True, eq=False)
class Points:
    """Points solved directly, and what they come to by the names of the registry, in the shape asked for.

    Parameters
    ----------
    airspeed : numpy.ndarray
        Along the flight path [m/s].
    values : dict of str to numpy.ndarray
        Coefficients, shares and status; along the blade in a last axis of their own.
    """

    airspeed: FloatArray
    values: dict[str, NDArray[Any]]

    @property
    def thrust_coefficient(self) -> FloatArray:
        """CT."""
        return self.values["thrust_coefficient"]

    @property
    def power_coefficient(self) -> FloatArray:
        """CP."""
        return self.values["power_coefficient"]

    @classmethod
    def solve(
        cls,
        elements: BladeElements,
        diameter: float,
        air: Air,
        rpm: FloatArray,
        advance_ratio: FloatArray,
        incidence: FloatArray | None = None,
        *,
        law: Law = solve,
        radial: bool = False,
    ) -> Points:
        """Solve points at one air, all of one shape, neighbours in axial flow along the last axis.

        Parameters
        ----------
        elements : BladeElements
        diameter : float
            [m].
        air : Air
        rpm, advance_ratio : numpy.ndarray
        incidence : numpy.ndarray, optional
            [rad].
        law : Law
            Of axial flow ahead.
        radial : bool
            Keep what each element does.

        Returns
        -------
        Points
        """
        turns = rpm / 60.0
        airspeed = advance_ratio * turns * diameter
        flat_airspeed, omega = airspeed.ravel(), 2.0 * math.pi * turns.ravel()
        inclined = np.zeros(omega.shape) if incidence is None else incidence.ravel()
        air_state = (air.kinematic_viscosity, air.speed_of_sound)
        found: dict[str, NDArray[Any]] = {}
        for where in (
            (inclined == 0.0) & (flat_airspeed >= 0.0),
            (inclined == 0.0) & (flat_airspeed < 0.0),
            inclined > 0.0,
        ):
            if not where.any():
                continue
            v, turning, angle = flat_airspeed[where], omega[where], inclined[where]
            part: RotorSolution | IncidenceSolution
            if angle[0] > 0.0:
                part = solve_incidence(elements, v, turning, angle, *air_state, radial=radial)
            elif v[0] < 0.0:
                part = solve_descent(elements, v, turning, *air_state, radial=radial)
            else:
                part = law(elements, v, turning, *air_state, radial=radial)
            for name, array in _of_registry(part, omega[where] / (2.0 * math.pi), diameter, air.density).items():
                # What only a disk at incidence has is 0 in axial flow.
                whole = found.setdefault(name, np.zeros((omega.size, *array.shape[1:]), dtype=array.dtype))
                whole[where] = array
        values = {name: array.reshape(*rpm.shape, *array.shape[1:]) for name, array in found.items()}
        return cls(airspeed=airspeed, values=values)


def _of_registry(
    part: RotorSolution | IncidenceSolution, turns: FloatArray, diameter: float, density: float
) -> dict[str, NDArray[Any]]:
    """Return a solution by the names of the registry: forces as coefficients, angles in degrees, loadings in N."""
    found: dict[str, NDArray[Any]] = {}
    force = turns**2 * diameter**4
    for name, array in vars(part).items():
        if name in _PER_DENSITY:
            coefficient, moment = _PER_DENSITY[name]
            found[coefficient] = array / (force * diameter if moment else force)
        elif name in (*SHARES, "status"):
            found[name] = array
    found["power_coefficient"] = 2.0 * math.pi * found["torque_coefficient"]
    if part.radial is not None:
        for quantity in RADIAL:
            along = part.radial[quantity.name]
            if quantity.name in _ANGLES:
                along = np.degrees(along)
            elif quantity.name in _LOADINGS:
                along = along * density
            found[quantity.name] = along
    return found
