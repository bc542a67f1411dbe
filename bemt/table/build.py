"""Building the coefficient table of a propeller, and the look-up table inside it."""

from __future__ import annotations

import math
import os
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.blade.geometry import Propeller
from bemt.quantities.dataset import build_dataset
from bemt.quantities.registry import LOOKUP, RADIAL, TABLE
from bemt.rotor import kernels
from bemt.rotor.elements import BladeElements, blade_elements
from bemt.rotor.model import Model
from bemt.rotor.solution import RotorSolution, solve
from bemt.table.coefficients import efficiency, figure_of_merit
from bemt.table.grid import Grid
from bemt.table.lookup import REFERENCE_RADIUS, Lookup
from bemt.table.validity import divergence_at_lift, grade

if TYPE_CHECKING:
    import xarray as xr

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

_SCAN_NODES = 49
_ZOOM_NODES = 9
_ZERO_ZOOMS, _PEAK_ZOOMS = 3, 2

_ANGLES = ("inflow_angle", "angle_of_attack")
_LOADINGS = ("thrust_loading", "torque_loading")


@dataclass(frozen=True, eq=False)
class TableResult:
    """A coefficient table as plain arrays, by the names of the registry.

    Parameters
    ----------
    rpm : numpy.ndarray, shape (n_rpm,)
        Revolutions per minute.
    advance_ratio : numpy.ndarray, shape (n_j,)
        V/(nD).
    values : mapping of str to numpy.ndarray
        Coefficients, shares, grades and status over (rpm, advance_ratio); figure of merit, zero-thrust advance ratio
        and peak efficiency over rpm; with a radial table also what each element does, angles in degrees.
    lookup : Lookup or None
        Serves any airspeed, rpm and density.
    r_over_R : numpy.ndarray, shape (n_elements,), or None
        Of the radial table.
    notes : tuple of str
        What a reader should know, in words.
    """

    rpm: FloatArray
    advance_ratio: FloatArray
    values: Mapping[str, NDArray[Any]]
    lookup: Lookup | None
    r_over_R: FloatArray | None = None
    notes: tuple[str, ...] = ()

    def to_dataset(self, attrs: Mapping[str, Any]) -> xr.Dataset:
        """Label the arrays.

        Parameters
        ----------
        attrs : mapping
            Attributes of the dataset; notes of the table are added to any there.

        Returns
        -------
        xarray.Dataset
            Its `.propeller` answers look-ups.
        """
        import bemt.table.accessor  # noqa: F401 - registers `.propeller`

        lookup_values, lookup_axes, lookup_attrs = self.lookup.variables() if self.lookup else ({}, {}, {})
        coordinates = {"rpm": self.rpm, "advance_ratio": self.advance_ratio, **lookup_axes}
        if self.r_over_R is not None:
            coordinates["r_over_R"] = self.r_over_R
        notes = "\n".join(part for part in (str(attrs.get("notes", "")), *self.notes) if part)
        merged = {**lookup_attrs, **attrs, **({"notes": notes} if notes else {})}
        return build_dataset(TABLE + RADIAL + LOOKUP, {**self.values, **lookup_values}, coordinates, merged)


def build_table(
    propeller: Propeller, air: Air, model: Model, grid: Grid, *, radial: bool = False, lookup: bool = True
) -> TableResult:
    """Solve a propeller over a grid of rpm and advance ratio, and over all of its look-up table.

    Parameters
    ----------
    propeller : Propeller
    air : Air
        Of every point of the grid.
    model : Model
    grid : Grid
        Points that are solved, not interpolated.
    radial : bool
        Also keep what each blade element does at the points of the grid.
    lookup : bool
        Also solve the look-up table, which takes most of the time.

    Returns
    -------
    TableResult

    Raises
    ------
    InputError
        If the propeller and its section data do not fit each other.
    """
    elements = blade_elements(propeller, model)
    rpm, advance_ratio = np.broadcast_arrays(grid.rpm[:, None], grid.advance_ratio)
    points = _Points.solve(elements, propeller.diameter, air, rpm, advance_ratio, radial=radial)
    solution = points.solution
    tip_mach = np.hypot(points.airspeed, math.pi * rpm / 60.0 * propeller.diameter) / air.speed_of_sound
    trust, reasons = grade(
        solution.status.reshape(rpm.shape),
        solution.stalled_share.reshape(rpm.shape),
        solution.outside_polar_share.reshape(rpm.shape),
        solution.low_reynolds_share.reshape(rpm.shape),
        tip_mach - _tip_divergence(elements),
        section_guessed=propeller.section_guessed,
    )
    speed_75 = np.hypot(points.airspeed, REFERENCE_RADIUS * math.pi * rpm / 60.0 * propeller.diameter)
    values: dict[str, NDArray[Any]] = {
        "thrust_coefficient": points.thrust_coefficient,
        "torque_coefficient": points.power_coefficient / (2.0 * math.pi),
        "power_coefficient": points.power_coefficient,
        "efficiency": efficiency(advance_ratio, points.thrust_coefficient, points.power_coefficient),
        "reference_reynolds": speed_75 * elements.chord_75 / air.kinematic_viscosity,
        "helical_tip_mach": tip_mach,
        "stalled_share": solution.stalled_share.reshape(rpm.shape),
        "outside_polar_share": solution.outside_polar_share.reshape(rpm.shape),
        "low_reynolds_share": solution.low_reynolds_share.reshape(rpm.shape),
        "trust": trust,
        "trust_reasons": reasons,
        "status": solution.status.reshape(rpm.shape),
        **_landmarks(elements, propeller.diameter, air, grid.rpm),
    }
    if solution.radial is not None:
        shape = (*rpm.shape, elements.r_over_R.size)
        for quantity in RADIAL:
            name = quantity.name
            along = solution.radial[name].reshape(shape)
            if name in _ANGLES:
                along = np.degrees(along)
            elif name in _LOADINGS:
                along = along * air.density
            values[name] = along
    return TableResult(
        rpm=grid.rpm,
        advance_ratio=grid.advance_ratio,
        values=values,
        lookup=_solve_lookup(elements, propeller, air) if lookup else None,
        r_over_R=elements.r_over_R if radial else None,
        notes=_notes(elements),
    )


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
        If the propeller and its section data do not fit each other.
    """
    return _solve_lookup(blade_elements(propeller, model), propeller, air)


def references(model: Model) -> str:
    """Return the published methods behind a table, one a line.

    Parameters
    ----------
    model : Model

    Returns
    -------
    str
    """
    used = [_MOMENTUM, _ONE_UNKNOWN, _WINDMILL, _DRAG_RISE]
    if model.end_loss == "prandtl":
        used.append(_END_LOSS)
    if model.stall_delay == "snel" and model.stall_strength > 0.0:
        used.append(_STALL_DELAY)
    return "\n".join(used)


_MOMENTUM = (
    "Blade elements and annular momentum: H. Glauert, Airplane Propellers, in W.F. Durand (ed.), "
    "Aerodynamic Theory IV, 1935"
)
_ONE_UNKNOWN = (
    "In one unknown after S.A. Stahlhut, J.G. Leishman, Aerodynamic Design Optimization of Proprotors for "
    "Convertible-Rotor Concepts, AHS Annual Forum 68, 2012"
)
_WINDMILL = "Heavily loaded windmill: M.L. Buhl, NREL/TP-500-36834, 2005"
_DRAG_RISE = "Drag divergence: Korn's relation, in W.H. Mason, Configuration Aerodynamics"
_END_LOSS = "End loss: L. Prandtl, appendix to A. Betz, Schraubenpropeller mit geringstem Energieverlust, 1919"
_STALL_DELAY = (
    "Stall delay: H. Snel, R. Houwink, J. Bosschers, Sectional prediction of lift coefficients on rotating "
    "wind turbine blades in stall, ECN-C-93-052, 1994"
)


@dataclass(frozen=True, eq=False)
class _Points:
    """Points solved directly, and their coefficients in the shape asked for."""

    airspeed: FloatArray
    thrust_coefficient: FloatArray
    power_coefficient: FloatArray
    solution: RotorSolution

    @classmethod
    def solve(
        cls,
        elements: BladeElements,
        diameter: float,
        air: Air,
        rpm: FloatArray,
        advance_ratio: FloatArray,
        *,
        radial: bool = False,
    ) -> _Points:
        """Solve points at one air; rpm and advance ratio have one shape, neighbours along the last axis."""
        turns = rpm / 60.0
        airspeed = advance_ratio * turns * diameter
        solution = solve(
            elements,
            airspeed.ravel(),
            2.0 * math.pi * turns.ravel(),
            air.kinematic_viscosity,
            air.speed_of_sound,
            radial=radial,
        )
        scale = turns**2 * diameter**4
        return cls(
            airspeed=airspeed,
            thrust_coefficient=solution.thrust_per_density.reshape(rpm.shape) / scale,
            power_coefficient=2.0 * math.pi * solution.torque_per_density.reshape(rpm.shape) / (scale * diameter),
            solution=solution,
        )


# From advance ratios, shape (n_rpm, n), to the points solved there.
_Solver = Callable[[FloatArray], _Points]


def _tip_divergence(elements: BladeElements) -> float:
    return divergence_at_lift(float(elements.columns[-1, kernels.E_DIVERGENCE]))


def _solve_lookup(elements: BladeElements, propeller: Propeller, air: Air) -> Lookup:
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
        stalled_share=solution.stalled_share.reshape(shape),
        outside_polar_share=solution.outside_polar_share.reshape(shape),
        low_reynolds_share=solution.low_reynolds_share.reshape(shape),
        status=solution.status.reshape(shape),
        diameter=propeller.diameter,
        chord_75=elements.chord_75,
        air=air,
        tip_divergence_mach=_tip_divergence(elements),
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


def _landmarks(elements: BladeElements, diameter: float, air: Air, rpm: FloatArray) -> dict[str, FloatArray]:
    """Return figure of merit, zero-thrust advance ratio and peak efficiency over rpm, each refined by solving."""

    def at(advance_ratio: FloatArray) -> _Points:
        speed, ratio = np.broadcast_arrays(rpm[:, None], advance_ratio)
        return _Points.solve(elements, diameter, air, speed, ratio)

    ratio = np.broadcast_to(np.linspace(0.0, _end_of_thrust(elements), _SCAN_NODES), (rpm.size, _SCAN_NODES))
    scan = at(ratio)
    ct, cp = scan.thrust_coefficient, scan.power_coefficient
    peak, peak_ratio = _peak_efficiency(at, ratio, efficiency(ratio, ct, cp))
    return {
        "static_figure_of_merit": figure_of_merit(ct[:, 0], cp[:, 0]),
        "zero_thrust_advance_ratio": _zero_thrust(at, ratio, ct),
        "peak_efficiency": peak,
        "peak_efficiency_advance_ratio": peak_ratio,
    }


def _end_of_thrust(elements: BladeElements) -> float:
    """Advance ratio beyond which no element of the blade can pull: none lifts at 15 deg below its chord line."""
    steepest = np.clip(elements.columns[:, kernels.E_TWIST] + math.radians(15.0), 0.0, math.radians(80.0))
    return max(float((math.pi * elements.r_over_R * np.tan(steepest)).max()), 0.1)


def _zero_thrust(at: _Solver, ratio: FloatArray, ct: FloatArray) -> FloatArray:
    rows = np.arange(ratio.shape[0])
    for zoom in range(_ZERO_ZOOMS + 1):
        falls = (ct[:, :-1] > 0.0) & (ct[:, 1:] <= 0.0)
        cell = np.argmax(falls, axis=1)
        if zoom == 0:
            found = falls.any(axis=1)
        low, high = ratio[rows, cell], ratio[rows, cell + 1]
        if zoom < _ZERO_ZOOMS:
            ratio = np.linspace(low, high, _ZOOM_NODES, axis=1)
            ct = at(ratio).thrust_coefficient
    above, below = ct[rows, cell], ct[rows, cell + 1]
    with np.errstate(invalid="ignore", divide="ignore"):
        root: FloatArray = np.where(found, low + (high - low) * above / (above - below), np.nan)
    return root


def _peak_efficiency(at: _Solver, ratio: FloatArray, eta: FloatArray) -> tuple[FloatArray, FloatArray]:
    rows = np.arange(ratio.shape[0])
    exists = np.isfinite(eta).any(axis=1)
    for zoom in range(_PEAK_ZOOMS + 1):
        top = np.argmax(np.where(np.isfinite(eta), eta, -1.0), axis=1)
        before, after = np.maximum(top - 1, 0), np.minimum(top + 1, ratio.shape[1] - 1)
        if zoom < _PEAK_ZOOMS:
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


def _notes(elements: BladeElements) -> tuple[str, ...]:
    share = elements.outside_share
    if share == 0.0:
        return ()
    said = f"thickness or camber leaves its section data over {100.0 * share:.2g} % of the span (weighted by r^2 chord)"
    return (f"{said}; the nearest section serves there",)
