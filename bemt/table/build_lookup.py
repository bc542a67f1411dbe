"""Building the look-up table of a propeller: its nodes, and the solution there."""

from __future__ import annotations

import math
import os

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.blade.geometry import Propeller
from bemt.quantities.registry import SHARES
from bemt.rotor import kernels
from bemt.rotor.elements import BladeElements, blade_elements
from bemt.rotor.model import Model
from bemt.rotor.solution import RotorSolution, solve
from bemt.table.lookup import REFERENCE_RADIUS, Lookup, no_lookup
from bemt.table.validity import divergence_at_lift

FloatArray = NDArray[np.float64]

LOOKUP_MACH = np.array([0.0, 0.25, 0.4, 0.5, 0.6, 0.7])
"""At 0.75 R: standing still, 0.7 is a tip Mach number of 0.93, and sections of no thickness are beyond divergence."""

# Helix angles stand close from standing still to beyond the windmill's stall, some way above the blade angle, and far
# apart where the whole blade is broadside to the wind [deg].
_FINE_HELIX_STEP, _COARSE_HELIX_STEP, _FAR_HELIX_STEP = 0.5, 2.0, 5.0
_FINE_HELIX_ABOVE_BLADE, _COARSE_HELIX_SPAN = 15.0, 16.0
_FINE_HELIX_END = (20.0, 60.0)

_SLOWEST, _FASTEST = 0.01, LOOKUP_MACH[-1]  # speed at 0.75 R over that of sound
_DENSITY_MARGIN = 2.0

# Nodes over ln Re stand where the coefficients bend: so close that a straight line between two misses the curve by this
# share of the largest thrust and torque, and never closer or wider than the limits.
_REYNOLDS_TOLERANCE = 5e-4
_LN_REYNOLDS_STEP = (0.06, 0.5)
_LN_REYNOLDS_PROBE = 0.05
_PROBED_HELIX_ANGLES = 7


def build_lookup(propeller: Propeller, air: Air, model: Model) -> Lookup:
    """Solve a propeller over its look-up table alone.

    Parameters
    ----------
    propeller : Propeller
    air : Air
        Says which Reynolds numbers the table has to reach, with a margin for other densities.
    model : Model

    Returns
    -------
    Lookup

    Raises
    ------
    InputError
        If the propeller and its section data do not fit each other, or the inflow law has no look-up.
    """
    if model.inflow != "momentum":
        raise no_lookup(model.inflow)
    return solve_lookup(blade_elements(propeller, model), propeller, air)


def solve_lookup(elements: BladeElements, propeller: Propeller, air: Air) -> Lookup:
    """Solve a blade that is cut into elements already over its look-up table.

    Parameters
    ----------
    elements : BladeElements
        Of the propeller.
    propeller : Propeller
    air : Air
        As for `build_lookup`.

    Returns
    -------
    Lookup
    """
    at_sound = elements.chord_75 * air.speed_of_sound / air.kinematic_viscosity
    reynolds = _reynolds_nodes(elements, _SLOWEST * at_sound / _DENSITY_MARGIN, _FASTEST * at_sound * _DENSITY_MARGIN)
    helix_angle = _helix_nodes(elements)
    solution = _solve_similar(elements, LOOKUP_MACH[:, None, None], reynolds[:, None], helix_angle)
    shape = (LOOKUP_MACH.size, reynolds.size, helix_angle.size)
    square = propeller.diameter**2
    return Lookup(
        mach=LOOKUP_MACH,
        reynolds=reynolds,
        helix_angle=helix_angle,
        thrust=solution.thrust_per_density.reshape(shape) / square,
        torque=solution.torque_per_density.reshape(shape) / (square * propeller.diameter),
        **{name: getattr(solution, name).reshape(shape) for name in SHARES},
        status=solution.status.reshape(shape),
        diameter=propeller.diameter,
        chord_75=elements.chord_75,
        air=air,
        tip_divergence_mach=divergence_at_lift(elements.tip_divergence),
        section_guessed=propeller.section_guessed,
    )


def _solve_similar(
    elements: BladeElements, mach: FloatArray, reynolds: FloatArray, helix_angle: FloatArray
) -> RotorSolution:
    """Solve at reference Mach and Reynolds numbers and helix angles that broadcast, neighbours along the last axis.

    Only the ratios matter, so the reference speed is 1 m/s.
    """
    mach, reynolds, helix = (array.ravel() for array in np.broadcast_arrays(mach, reynolds, helix_angle))
    still = helix > 0.5 * math.pi - 1e-9
    return solve(
        elements,
        np.sin(helix),
        np.where(still, 0.0, np.cos(helix)) / (REFERENCE_RADIUS * elements.tip_radius),
        elements.chord_75 / reynolds,
        1.0 / np.maximum(mach, 1e-9),
        workers=min(os.cpu_count() or 1, 8),
    )


def _blade_angle(elements: BladeElements) -> float:
    """Chord-line angle at the reference radius [rad]."""
    return float(np.interp(REFERENCE_RADIUS, elements.r_over_R, elements.columns[:, kernels.E_TWIST]))


def _helix_nodes(elements: BladeElements) -> FloatArray:
    """Return helix angles from 0 to 90 deg [rad]."""
    fine_end = np.clip(np.ceil(np.degrees(_blade_angle(elements)) + _FINE_HELIX_ABOVE_BLADE), *_FINE_HELIX_END)
    coarse_end = fine_end + _COARSE_HELIX_SPAN
    far = 1 + math.ceil((90.0 - coarse_end) / _FAR_HELIX_STEP)
    parts = (
        np.arange(0.0, fine_end, _FINE_HELIX_STEP),
        np.arange(fine_end, coarse_end, _COARSE_HELIX_STEP),
        np.linspace(coarse_end, 90.0, far),
    )
    found: FloatArray = np.radians(np.concatenate(parts))
    return found


def _reynolds_nodes(elements: BladeElements, lowest: float, highest: float) -> FloatArray:
    """Return Reynolds numbers from lowest to highest, crowded where thrust and torque bend over ln Re.

    A chord misses a curve by h^2 |f''|/8 at most, so nodes spaced as |f''|^-0.5 share the error evenly.
    """
    count = 2 + math.ceil(math.log(highest / lowest) / _LN_REYNOLDS_PROBE)
    probe = np.geomspace(lowest, highest, count)
    step = math.log(highest / lowest) / (count - 1)
    helix = np.linspace(0.0, max(_blade_angle(elements), 0.0) + math.radians(5.0), _PROBED_HELIX_ANGLES)
    solution = _solve_similar(elements, np.zeros(1), probe, helix[:, None])
    bend = np.zeros(count)
    for force in (solution.thrust_per_density, solution.torque_per_density):
        curves = force.reshape(helix.size, count)
        curvature = np.diff(curves / np.nanmax(np.abs(curves)), 2, axis=1) / step**2
        bend[1:-1] = np.maximum(bend[1:-1], np.sqrt(np.mean(np.nan_to_num(curvature) ** 2, axis=0)))
    density = np.clip(
        np.sqrt(bend / (8.0 * _REYNOLDS_TOLERANCE)), 1.0 / _LN_REYNOLDS_STEP[1], 1.0 / _LN_REYNOLDS_STEP[0]
    )
    below = np.concatenate([[0.0], np.cumsum(step * 0.5 * (density[1:] + density[:-1]))])
    nodes = np.linspace(0.0, below[-1], 1 + max(1, math.ceil(below[-1])))
    found: FloatArray = np.exp(np.interp(nodes, below, np.log(probe)))
    return found
