"""Random blade elements and full-circle polars for the solver's tests: formulas, no data of any section."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from bemt.rotor import kernels as k
from bemt.rotor.elements import BladeElements, element_bounds
from bemt.rotor.solution import solve as rotor_solve
from bemt.section.full_circle import ANGLES
from bemt.section.post_stall import plate_law

FloatArray = NDArray[np.float64]

LN_REYNOLDS = np.log(np.array([2e4, 1e5, 1e6]))
TIP_RADIUS = 0.15
ROOT = 0.095


def polar_set(sharp: bool, rng: np.random.Generator, count: int) -> tuple[FloatArray, FloatArray]:
    """Polars (count, 3, n_alpha, 2) and their bounds; a sharp stall drops within about a degree."""
    polars = []
    for _ in range(count):
        zero = np.radians(rng.uniform(-6, 1))
        stall = np.radians(rng.uniform(8, 15))
        slope = rng.uniform(4.5, 6.3)
        rows = []
        for _ in range(3):
            width = np.radians(rng.uniform(0.1, 0.6) if sharp else rng.uniform(3, 5))
            moved_zero = zero + np.radians(rng.uniform(-0.5, 0.5))
            moved_stall = stall + np.radians(rng.uniform(-1, 1))
            separated = 0.5 * (1 + np.tanh((np.abs(ANGLES - moved_zero) - moved_stall) / (2 * width)))
            plate_lift, plate_drag = plate_law(ANGLES, 1.8, 0.02)
            lift = (1 - separated) * slope * np.sin(ANGLES - moved_zero) + separated * plate_lift
            attached = 0.008 + 0.02 * rng.random() + 0.3 * (ANGLES - moved_zero) ** 2
            log_drag = (1 - separated) * np.log(attached) + separated * np.log(plate_drag)
            lift[0] = lift[-1]
            log_drag[0] = log_drag[-1]
            rows.append(np.stack([lift, log_drag], axis=-1))
        polars.append(np.stack(rows))
    stacked = np.array(polars)
    stall_angles = np.zeros((4, count, 3))
    stall_angles[[0, 2]] = -0.3
    stall_angles[[1, 3]] = 0.25
    return stacked, element_bounds(stacked, stall_angles)


def elements(rng: np.random.Generator, count: int, blades: int, n_polars: int) -> FloatArray:
    """Element columns over the ranges that a blade may have and beyond."""
    x = rng.uniform(0.1, 0.999, count)
    chord = rng.uniform(0.02, 0.4, count)
    columns = np.zeros((count, k.E_COLUMNS))
    columns[:, k.E_RADIUS] = x * TIP_RADIUS
    columns[:, k.E_WIDTH] = 0.01
    columns[:, k.E_CHORD] = chord * TIP_RADIUS
    columns[:, k.E_TWIST] = np.radians(rng.uniform(-20, 75, count))
    columns[:, k.E_SOLIDITY] = blades * chord / (2 * np.pi * x)
    columns[:, k.E_TIP] = columns[:, k.E_LOSS_SCALE] = np.sqrt(0.5 * blades * (1 - x) / x)
    columns[:, k.E_MACH_HIGH] = np.inf
    columns[:, k.E_ROOT] = np.sqrt(0.5 * blades * (x - ROOT) / ROOT)
    columns[:, k.E_DIVERGENCE] = 0.75
    columns[:, k.E_TABLE_BETA] = 1.0
    columns[:, k.E_LN_RE_LOW] = LN_REYNOLDS[0]
    columns[:, k.E_LN_RE_HIGH] = LN_REYNOLDS[-1]
    columns[:, k.E_POLAR] = rng.integers(0, n_polars, count)
    return columns


def solve(
    points: FloatArray, columns: FloatArray, polars: FloatArray, bounds: FloatArray, blades: int
) -> dict[str, FloatArray]:
    """Radial results (n_points, n_elements) by name."""
    blade = BladeElements(
        blades=blades,
        tip_radius=TIP_RADIUS,
        chord_75=0.1 * TIP_RADIUS,
        r_over_R=columns[:, k.E_RADIUS] / TIP_RADIUS,
        columns=columns,
        polars=polars,
        bounds=bounds,
        ln_reynolds=LN_REYNOLDS,
    )
    with np.errstate(divide="ignore"):
        solution = rotor_solve(
            blade,
            points[:, k.P_AIRSPEED],
            points[:, k.P_OMEGA],
            1 / points[:, k.P_INVERSE_VISCOSITY],
            1 / points[:, k.P_INVERSE_SOUND],
            radial=True,
        )
    assert solution.radial is not None
    return dict(solution.radial)


def closure(
    points: FloatArray, columns: FloatArray, radial: Mapping[str, FloatArray]
) -> tuple[FloatArray, NDArray[np.bool_]]:
    """Disagreement of blade-element and momentum forces as a share of the section force, and where Buhl's law rules.

    Shapes (n_points, n_elements).
    """
    airspeed = points[:, None, k.P_AIRSPEED]
    turning = points[:, None, k.P_OMEGA] * columns[None, :, k.E_RADIUS]
    phi, speed, loss = radial["inflow_angle"], radial["speed"], radial["end_loss"]
    lift, drag = radial["section_lift_coefficient"], radial["section_drag_coefficient"]
    w, v = speed * np.sin(phi) - airspeed, turning - speed * np.cos(phi)
    # dT/dr and dQ/dr/r, both over 4 pi rho r: momentum of the annulus against the blade elements.
    half = 0.5 * columns[None, :, k.E_SOLIDITY] * speed**2
    thrust = half * (lift * np.cos(phi) - drag * np.sin(phi))
    torque = half * (lift * np.sin(phi) + drag * np.cos(phi))
    flow = np.abs(airspeed + w)
    momentum_thrust, momentum_torque = 2 * loss * w * flow, 2 * loss * v * flow
    # Buhl 2005, NREL/TP-500-36834: CT = 8/9 + (4F - 40/9) a + (50/9 - 4F) a^2 above a = 0.4.
    brake = np.isfinite(radial["high_induction"])
    a = -w / np.where(airspeed > 0, airspeed, 1.0)
    buhl = -0.5 * airspeed**2 * (8 / 9 + (4 * loss - 40 / 9) * a + (50 / 9 - 4 * loss) * a**2)
    momentum_thrust = np.where(brake, buhl, momentum_thrust)
    error = np.maximum(np.abs(thrust - momentum_thrust), np.abs(torque - momentum_torque))
    return error / (half * (np.abs(lift) + drag)), brake
