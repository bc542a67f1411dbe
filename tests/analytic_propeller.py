"""A propeller of two quadratic laws, valid from standing still to a stopped propeller in the wind.

CT = t0 + t1 J + t2 J^2 and CP = p0 + p1 J + p2 J^2, written over airspeed and rotation: both stay finite at rest.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from bemt.air import Air, standard_air


@dataclass(frozen=True, eq=False)
class AnalyticLoads:
    thrust: np.ndarray
    torque: np.ndarray
    stalled_share: np.ndarray
    outside_polar_share: np.ndarray
    low_reynolds_share: np.ndarray
    above_divergence_share: np.ndarray
    status: np.ndarray


@dataclass(frozen=True)
class AnalyticPropeller:
    diameter: float = 0.3353
    density: float = 1.225
    thrust: tuple[float, float, float] = (0.100, -0.060, -0.130)
    power: tuple[float, float, float] = (0.042, 0.020, -0.100)
    known_to_rpm: float = math.inf
    known_from_rpm: float = 0.0
    tip_divergence_mach: float = math.inf
    section_guessed: bool = False

    @property
    def air(self) -> Air:
        return standard_air()

    def loads(self, airspeed: Any, rpm: Any, air: Any = None) -> AnalyticLoads:
        airspeed, rpm = np.broadcast_arrays(np.asarray(airspeed, float), np.asarray(rpm, float))
        density = self.density if air is None else air.density
        turns, over_diameter = rpm / 60.0, airspeed / self.diameter
        parts = np.stack([turns**2, turns * over_diameter, over_diameter**2])
        known = (rpm <= self.known_to_rpm) & (rpm >= self.known_from_rpm)
        thrust = density * self.diameter**4 * np.tensordot(self.thrust, parts, 1)
        torque = density * self.diameter**5 / (2.0 * math.pi) * np.tensordot(self.power, parts, 1)
        share = np.where(known, 0.0, np.nan)
        return AnalyticLoads(
            np.where(known, thrust, np.nan), np.where(known, torque, np.nan), *[share] * 4, np.where(known, 1, 0)
        )
