"""Pitch of a blade, from the angle of its chord line."""

from __future__ import annotations

import math

import numpy as np

from bemt.blade.geometry import Propeller, SectionSpan
from bemt.interpolation import monotone_curve
from bemt.section.family import family

_REFERENCE_REYNOLDS = 1e5


def chord_line_angle(propeller: Propeller, r_over_R: float) -> float:
    """Return the angle of the chord line from the plane of rotation.

    Parameters
    ----------
    propeller : Propeller
        Its twist may belong to another line.
    r_over_R : float
        Where.

    Returns
    -------
    float
        [rad]. From a zero-lift line it is that at a Reynolds number of 100 000; from a flat face it needs a section
        family.
    """
    stations = propeller.stations
    at = np.array(r_over_R)
    twist = float(monotone_curve(stations.r_over_R, stations.twist, at))
    if stations.twist_reference == "chord line":
        return twist
    span = section_at(propeller, r_over_R)
    if span.family is None:
        return twist + (_zero_lift_of_polars(span) if stations.twist_reference == "zero lift" else 0.0)
    shipped = family(span.family)
    thickness, camber = section_of_station(propeller, r_over_R)
    if stations.twist_reference == "flat face":
        return twist + float(shipped.flat_face_angle(thickness, camber))
    return twist + float(shipped.zero_lift_angle(thickness, camber, _REFERENCE_REYNOLDS))


def section_at(propeller: Propeller, r_over_R: float) -> SectionSpan:
    """Return the section of a place on the blade.

    Parameters
    ----------
    propeller : Propeller
    r_over_R : float
        Where.

    Returns
    -------
    SectionSpan
    """
    for span in propeller.sections:
        if r_over_R < span.end:
            return span
    return propeller.sections[-1]


def section_of_station(propeller: Propeller, r_over_R: float) -> tuple[float, float | None]:
    """Return thickness and camber that a family is asked for at a place on the blade.

    Parameters
    ----------
    propeller : Propeller
        Its section there must be a family.
    r_over_R : float
        Where.

    Returns
    -------
    t_over_c : float
        As measured, or the default of the section or the family.
    camber : float or None
        As measured, or the default of the section; None for the family's own.

    Raises
    ------
    ValueError
        If the section there is no family.
    """
    span, stations, at = section_at(propeller, r_over_R), propeller.stations, np.array(r_over_R)
    if span.family is None:
        raise ValueError(f"the section at r/R = {r_over_R:g} is no family")
    thickness, camber = span.t_over_c, span.camber
    if stations.t_over_c is not None:
        thickness = float(monotone_curve(stations.r_over_R, stations.t_over_c, at))
    if stations.camber is not None:
        camber = float(monotone_curve(stations.r_over_R, stations.camber, at))
    return family(span.family).default_thickness if thickness is None else thickness, camber


def pitch_over_diameter(propeller: Propeller, r_over_R: float = 0.75) -> float:
    """Return the geometric pitch of the chord line over the diameter.

    Parameters
    ----------
    propeller : Propeller
    r_over_R : float
        Where; a pitch on a label is meant at 0.75.

    Returns
    -------
    float
        pi r/R tan(angle).
    """
    return math.pi * r_over_R * math.tan(chord_line_angle(propeller, r_over_R))


def _zero_lift_of_polars(span: SectionSpan) -> float:
    """Return the angle of zero lift of a table, where lift rises through zero nearest to no incidence [rad]."""
    table = span.polars
    assert table is not None  # a section has polars or a family
    row = int(np.argmin(np.abs(np.log(table.reynolds / _REFERENCE_REYNOLDS))))
    lift = table.lift[row]
    rises = np.flatnonzero((lift[:-1] <= 0.0) & (lift[1:] > 0.0))
    if rises.size == 0:
        return 0.0
    cell = rises[np.argmin(np.abs(table.alpha[rises]))]
    share = -lift[cell] / (lift[cell + 1] - lift[cell])
    return float(table.alpha[cell] + share * (table.alpha[cell + 1] - table.alpha[cell]))
