"""Building the coefficient table of a propeller, and the look-up table inside it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.blade.geometry import Propeller
from bemt.blade.untwist import rigid_blade_note
from bemt.errors import InputError
from bemt.quantities.dataset import build_dataset
from bemt.quantities.registry import (
    LOOKUP,
    RADIAL,
    RADIAL_AT_INCIDENCE,
    SHARES,
    TABLE,
    TABLE_AT_INCIDENCE,
    Quantity,
)
from bemt.rotor.elements import BladeElements, blade_elements
from bemt.rotor.model import Model
from bemt.rotor.solution import solve
from bemt.table import references
from bemt.table.build_lookup import solve_lookup
from bemt.table.coefficients import efficiency
from bemt.table.grid import Grid
from bemt.table.landmarks import landmarks
from bemt.table.lookup import REFERENCE_RADIUS, Lookup
from bemt.table.points import Points
from bemt.table.validity import divergence_at_lift, grade, trust_in_words

if TYPE_CHECKING:
    import xarray as xr

FloatArray = NDArray[np.float64]

_MIRRORED = ("side_force_coefficient", "yaw_moment_coefficient")


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
        Coefficients, shares, grades and status over (rpm, advance_ratio), or over (rpm, advance_ratio, incidence);
        figure of merit, zero-thrust advance ratio and peak efficiency over rpm; with a radial table also what each
        element does, angles in degrees.
    lookup : Lookup or None
        Serves any airspeed, rpm and density.
    r_over_R : numpy.ndarray, shape (n_elements,), or None
        Of the radial table.
    incidence : numpy.ndarray, shape (n_incidence,), or None
        [rad], where the table runs over it.
    inflow : str
        Law of the induced velocity.
    notes : tuple of str
        What a reader should know, in words.
    """

    rpm: FloatArray
    advance_ratio: FloatArray
    values: Mapping[str, NDArray[Any]]
    lookup: Lookup | None
    r_over_R: FloatArray | None = None
    incidence: FloatArray | None = None
    inflow: str = "momentum"
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
        group: tuple[Quantity, ...] = TABLE + RADIAL
        if self.r_over_R is not None:
            coordinates["r_over_R"] = self.r_over_R
        axes = {"rpm": self.rpm, "J": self.advance_ratio}
        if self.incidence is not None:
            coordinates["incidence"] = axes["incidence"] = np.degrees(self.incidence)
            group = TABLE_AT_INCIDENCE + RADIAL_AT_INCIDENCE
        trust = "\n".join(trust_in_words(self.values["trust"], self.values["trust_reasons"], axes))
        notes = "\n".join(part for part in (str(attrs.get("notes", "")), *self.notes) if part)
        sources = [str(attrs.get("references", ""))]
        sources += [references.INCIDENCE, references.SKEW] if self.incidence is not None else []
        sources += [references.DESCENT] if (self.advance_ratio < 0.0).any() else []
        own = {"references": "\n".join(filter(None, sources)), "inflow": self.inflow, "trust": trust}
        merged = {**lookup_attrs, **attrs, **own, **({"notes": notes} if notes else {})}
        values = {quantity.name: self.values[quantity.name] for quantity in group if quantity.name in self.values}
        return build_dataset(group + LOOKUP, {**values, **lookup_values}, coordinates, merged)


def build_table(
    propeller: Propeller, air: Air, model: Model, grid: Grid, *, radial: bool = False, lookup: bool = True
) -> TableResult:
    """Solve a propeller over a grid of rpm, advance ratio and incidence, and over all of its look-up table.

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
        Also solve the look-up table, which takes most of the time; it is of axial flow at every incidence. The helix
        inflow has none.

    Returns
    -------
    TableResult

    Raises
    ------
    InputError
        If the propeller and its section data do not fit each other, or the helix inflow is asked for incidence or
        descent.
    """
    helical = model.inflow == "helix"
    if helical and (grid.inclined or grid.advance_ratio[0] < 0.0):
        raise InputError(
            "model.inflow", '"helix" is of axial flow ahead: without incidence or descent, or with inflow = "momentum"'
        )
    elements = blade_elements(propeller, model)
    axes = (grid.rpm, grid.advance_ratio) + ((grid.incidence,) if grid.inclined else ())
    rpm, advance_ratio, *inclined = np.meshgrid(*axes, indexing="ij")
    incidence = inclined[0] if inclined else np.zeros_like(rpm)
    diameter = propeller.diameter
    notes = _notes(elements, propeller, grid)
    marks = landmarks(elements, diameter, air, grid.rpm)
    outside_inflow_law: NDArray[np.bool_] | bool = False
    if helical:
        from bemt.table import helix  # what it works with is slow to import

        points = Points.solve(elements, diameter, air, rpm, advance_ratio, law=helix.solve_helix, radial=radial)
        outside_inflow_law = helix.outside_law(elements, points, rpm / 60.0 * diameter**2)
        momentum = Points.solve(elements, diameter, air, rpm, advance_ratio)
        notes += (helix.against_momentum(points, momentum, ~outside_inflow_law),)
        marks |= helix.helix_landmarks(elements, diameter, air, grid.rpm, marks)
    else:
        points = Points.solve(elements, diameter, air, rpm, advance_ratio, incidence, law=solve, radial=radial)
    tip_speed = math.pi * rpm / 60.0 * diameter
    tip_mach = (
        np.hypot(points.airspeed * np.cos(incidence), tip_speed + points.airspeed * np.sin(incidence))
        / air.speed_of_sound
    )
    trust, reasons = grade(
        points.values["status"],
        {name: points.values[name] for name in SHARES},
        tip_mach - divergence_at_lift(elements.tip_divergence),
        section_guessed=propeller.section_guessed,
        descent=advance_ratio < 0.0,
        incidence=np.where(points.airspeed > 0.0, incidence, 0.0),
        outside_inflow_law=outside_inflow_law,
    )
    values: dict[str, NDArray[Any]] = {
        **points.values,
        "efficiency": efficiency(advance_ratio, _along_flight_path(points, incidence), points.power_coefficient),
        "reference_reynolds": np.hypot(points.airspeed, REFERENCE_RADIUS * tip_speed)
        * elements.chord_75
        / air.kinematic_viscosity,
        "helical_tip_mach": tip_mach,
        "trust": trust,
        "trust_reasons": reasons,
        **marks,
    }
    for name in _MIRRORED if grid.inclined and propeller.rotation == "left" else ():
        values[name] = 0.0 - values[name]  # without a minus before zero
    return TableResult(
        rpm=grid.rpm,
        advance_ratio=grid.advance_ratio,
        values=values,
        lookup=solve_lookup(elements, propeller, air) if lookup and not helical else None,
        r_over_R=elements.r_over_R if radial else None,
        incidence=grid.incidence if grid.inclined else None,
        inflow=model.inflow,
        notes=notes,
    )


def _along_flight_path(points: Points, incidence: FloatArray) -> FloatArray:
    """Coefficient of the force that propels: thrust less the drag of the normal force."""
    normal = points.values.get("normal_force_coefficient", 0.0)
    found: FloatArray = points.thrust_coefficient * np.cos(incidence) - normal * np.sin(incidence)
    return found


def _notes(elements: BladeElements, propeller: Propeller, grid: Grid) -> tuple[str, ...]:
    notes = []
    share = elements.outside_share
    if share > 0.0:
        notes.append(
            f"thickness or camber leaves its section data over {100.0 * share:.3g} % of the span (weighted by r^2 "
            "chord); the nearest section serves there"
        )
    rigid = rigid_blade_note(propeller, float(grid.rpm[-1]))
    if rigid is not None:
        notes.append(rigid)
    if grid.advance_ratio[0] < 0.0:
        notes.append(
            "advance ratios below 0 are descent: an estimate from the mean inflow of rotors in descent, to be read as "
            "a direction; the flow there is unsteady"
        )
    if grid.inclined:
        notes.append(
            "incidence is of the printed grid alone: zero thrust, peak efficiency, figure of merit, look-ups and the "
            "envelope are of axial flow"
        )
    return tuple(notes)
