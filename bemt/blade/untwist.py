"""How far a blade turns under its own mass: an estimate that says from which rpm on a rigid blade is a poor picture."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from bemt.blade.geometry import Propeller
from bemt.interpolation import monotone_curve

FloatArray = NDArray[np.float64]

MOULDING_DENSITY = 1100.0
"""Of unfilled moulding plastic [kg/m3] (from memory)."""

MOULDING_SHEAR_MODULUS = 0.8e9
"""Of unfilled moulding plastic [Pa] (from memory)."""

WORTH_SAYING = math.radians(1.0)
"""A turn that changes thrust and power by several per cent [rad]."""

# A solid section with the thickness form of the four-digit sections: area k c t, second moments of area k c^3 t and
# k c t^3 about its own axes, and Saint-Venant's torsion constant of a thin section, the integral of thickness^3/3.
AREA, BROAD_MOMENT, THIN_MOMENT, TORSION = 0.685, 0.0378, 0.0394, 0.158

_REFERENCE_RADIUS = 0.75
_NODES = 400


class Untwist(NamedTuple):
    """How far the blade turns at 0.75 R [rad], nose-up positive; both parts grow with the square of the rpm.

    Parameters
    ----------
    flattening : float
        By the mass before and behind the blade axis, which centrifugal force draws into the plane of rotation: nose
        down.
    straightening : float
        By the tension along the twisted fibres, which takes twist out of the blade: nose up on a blade whose angle
        falls toward the tip.
    """

    flattening: float
    straightening: float


def centrifugal_untwist(
    propeller: Propeller,
    rpm: float,
    *,
    density: float = MOULDING_DENSITY,
    shear_modulus: float = MOULDING_SHEAR_MODULUS,
) -> Untwist | None:
    """Estimate how far a solid blade turns under its own centrifugal force.

    Parameters
    ----------
    propeller : Propeller
    rpm : float
        Revolutions per minute.
    density : float
        Of the blade's material [kg/m3].
    shear_modulus : float
        [Pa].

    Returns
    -------
    Untwist or None
        None where nobody says how thick the blade is.

    Notes
    -----
    Torsion of a slender pre-twisted bar under tension, J.C. Houbolt, G.W. Brooks, NACA Report 1346, 1958 (from memory),
    for small turns and without what is small then, the stiffening by tension and warping: with the tension T and the
    polar radius of gyration k of a section,

        G J dtheta/dr = -int_r^R rho_m Omega^2 (I_max - I_min) sin beta cos beta dr - T k^2 dbeta/dr.

    The aerodynamic moment, an axis of the blade off its sections' centroids and bending are left out. On a usual twist
    the second part is the larger one, so that the two nearly cancel or turn the blade nose-up; what is left is no
    better known than either of them.
    """
    stations = propeller.stations
    x = np.linspace(propeller.root, 1.0, _NODES)
    share = _thickness(propeller, x)
    if share is None:
        return None
    radius = 0.5 * propeller.diameter * x
    chord = 0.5 * propeller.diameter * monotone_curve(stations.r_over_R, stations.c_over_R, x)
    angle = monotone_curve(stations.r_over_R, stations.twist, x)
    thickness = share * chord
    broad, thin = BROAD_MOMENT * chord**3 * thickness, THIN_MOMENT * chord * thickness**3
    area, torsion = AREA * chord * thickness, TORSION * chord * thickness**3
    inertia = density * (rpm * math.pi / 30.0) ** 2
    flattening = _outboard(inertia * (broad - thin) * np.sin(angle) * np.cos(angle), radius)
    tension = _outboard(inertia * area * radius, radius)
    straightening = tension * (broad + thin) / area * np.gradient(angle, radius)
    stiffness = shear_modulus * torsion
    return Untwist(*(-_turned(moment / stiffness, radius, x) for moment in (flattening, straightening)))


def rigid_blade_note(propeller: Propeller, fastest: float) -> str | None:
    """Say that the blade is taken as rigid, where that may matter.

    Parameters
    ----------
    propeller : Propeller
    fastest : float
        Highest rpm that is asked for.

    Returns
    -------
    str or None
        None where a blade of unfilled moulding plastic would turn by less than `WORTH_SAYING` by either effect, or
        nobody says how thick it is.
    """
    turned = centrifugal_untwist(propeller, fastest)
    if turned is None or max(map(abs, turned)) <= WORTH_SAYING:
        return None
    down, up = (math.degrees(part) for part in turned)
    reached = fastest * math.sqrt(WORTH_SAYING / max(map(abs, turned)))
    return (
        "the blade is taken as rigid: one of unfilled moulding plastic would turn at 0.75 R by some "
        f"{down:+.1f} deg (its mass flattens it) and {up:+.1f} deg (tension straightens its twist) at {fastest:.0f} "
        f"rpm, by 1 deg from {reached:.0f} rpm on; a stiffer material (carbon, metal) keeps its twist much longer"
    )


def _thickness(propeller: Propeller, x: FloatArray) -> FloatArray | None:
    """Return thickness over chord where stations or sections name one all along the blade."""
    stations = propeller.stations
    if stations.t_over_c is not None:
        return monotone_curve(stations.r_over_R, stations.t_over_c, x)
    found = np.full(x.size, np.nan)
    for span in propeller.sections:
        known = span.t_over_c if span.polars is None or span.t_over_c is not None else span.polars.t_over_c
        if known is not None:
            found[(x >= span.start - 1e-9) & (x <= span.end + 1e-9)] = known
    return found if np.isfinite(found).all() else None


def _outboard(per_length: FloatArray, radius: FloatArray) -> FloatArray:
    """Integrate from each radius to the tip."""
    pieces = 0.5 * (per_length[1:] + per_length[:-1]) * np.diff(radius)
    return np.concatenate([np.cumsum(pieces[::-1])[::-1], [0.0]])


def _turned(rate: FloatArray, radius: FloatArray, x: FloatArray) -> float:
    """Integrate from the root to the reference radius."""
    pieces = 0.5 * (rate[1:] + rate[:-1]) * np.diff(radius)
    return float(np.interp(_REFERENCE_RADIUS, x, np.concatenate([[0.0], np.cumsum(pieces)])))
