"""Laws of lift and drag of a section whose flow has separated, over the full circle. Interchangeable pure functions.

The drag at 90 deg is an input to every law. All were made for wind turbines or for bluff bodies; none was fitted to
rotating blades.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.section.laws import Law

FloatArray = NDArray[np.float64]

_AERODAS_LIFT_VANISHES = 92.0  # [deg]
_AERODAS_LIFT_SPAN = 51.0  # [deg] from there to the largest lift
_BEHIND_90 = -0.7  # of the lift in front: a common continuation, from memory


@dataclass(frozen=True, eq=False)
class SeparatedSection:
    """What a law needs to know of a section.

    Parameters
    ----------
    high_angle, high_lift, high_drag : numpy.ndarray, shape (...)
        Point past the stall at positive incidence from which on the law holds: angle [rad], more than 0 and less than
        half a right angle, and the section's own coefficients there.
    low_angle, low_lift, low_drag : numpy.ndarray, shape (...)
        The same at negative incidence; the angle is negative.
    edge_drag : numpy.ndarray, shape (...)
        Drag coefficient of the section edge on.
    t_over_c : numpy.ndarray, shape (...)
        Thickness as a share of the chord.
    """

    high_angle: FloatArray
    high_lift: FloatArray
    high_drag: FloatArray
    low_angle: FloatArray
    low_lift: FloatArray
    low_drag: FloatArray
    edge_drag: FloatArray
    t_over_c: FloatArray


PostStallFunction = Callable[[FloatArray, float, SeparatedSection], tuple[FloatArray, FloatArray]]


def plate_law(alpha: FloatArray, plate_drag: float, edge_friction: FloatArray | float) -> tuple[FloatArray, FloatArray]:
    """Lift and drag coefficient of a flat plate whose flow has separated.

    Normal force cn = cd90 (0.222 + 0.283)/(0.222 + 0.283/sin alpha), odd in alpha and mirrored about 90 deg; along the
    chord only friction.

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n,)
        [rad], within -pi to pi.
    plate_drag : float
        Drag coefficient at 90 deg; 1.80 was measured for all NACA 00xx sections (R.E. Sheldahl, P.C. Klimas,
        SAND80-2114, 1981), published values run from 1.56 to 2.08.
    edge_friction : float or array, shape (..., 1)
        Drag coefficient of the section edge on.

    Returns
    -------
    lift, drag : numpy.ndarray, shape (..., n)

    References
    ----------
    S.F. Hoerner, Fluid-Dynamic Drag, 1965, and C. Lindenburg, ECN-C-03-025, 2003 (form of the normal force).
    """
    sine, cosine = np.sin(alpha), np.cos(alpha)
    away = np.abs(sine)
    normal = plate_drag * (0.222 + 0.283) * sine / (0.222 * away + 0.283)
    along = edge_friction * cosine
    return normal * cosine - along * sine, normal * sine + along * cosine


def plate(alpha: FloatArray, plate_drag: float, section: SeparatedSection) -> tuple[FloatArray, FloatArray]:
    """Lift and drag coefficient of a flat plate, see `plate_law`; knows of the section only its drag edge on.

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n,)
        [rad], within -pi to pi.
    plate_drag : float
        Drag coefficient at 90 deg.
    section : SeparatedSection

    Returns
    -------
    lift, drag : numpy.ndarray, shape (..., n)
    """
    return plate_law(alpha, plate_drag, section.edge_drag[..., None])


def viterna(alpha: FloatArray, plate_drag: float, section: SeparatedSection) -> tuple[FloatArray, FloatArray]:
    """Lift and drag coefficient after Viterna and Corrigan, matched where the section's data end.

    From the matching point (as, cls, cds) to 90 deg

        cl = (cd90/2) sin 2a + A2 cos^2 a / sin a,  A2 = (cls - cd90 sin as cos as) sin as / cos^2 as
        cd = cd90 sin^2 a + B2 cos a,               B2 = (cds - cd90 sin^2 as) / cos as

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n,)
        [rad], within -pi to pi.
    plate_drag : float
        Drag coefficient at 90 deg. The authors make it 1.11 + 0.018 times the aspect ratio, up to 2.01: that puts the
        blade's ends into the section, where this engine has models of their own.
    section : SeparatedSection

    Returns
    -------
    lift, drag : numpy.ndarray, shape (..., n)

    Notes
    -----
    Made for stall-regulated wind turbines, 0 to 90 deg. Beyond 90 deg drag is mirrored and lift is -0.7 of its mirror
    image (a common continuation, from memory); the last stretch to 180 deg runs straight to no lift. Negative
    incidence is matched at the section's own negative stall. A point before the stall must not be matched: the law
    then misses the largest lift.

    References
    ----------
    L.A. Viterna, R.D. Corrigan, "Fixed Pitch Rotor Performance of Large Horizontal Axis Wind Turbines", NASA Lewis
    Research Center, 1982.
    """

    def side(angle: FloatArray, start: FloatArray, lift: FloatArray, drag: FloatArray) -> tuple[FloatArray, FloatArray]:
        sine, cosine = np.sin(start), np.cos(start)
        a2 = (lift - plate_drag * sine * cosine) * sine / cosine**2
        b2 = (drag - plate_drag * sine**2) / cosine
        mirrored = np.minimum(angle, np.pi - angle)
        front = 0.5 * plate_drag * np.sin(2.0 * mirrored) + a2 * np.cos(mirrored) ** 2 / np.sin(mirrored)
        behind = np.where(angle > 0.5 * np.pi, _BEHIND_90, 1.0)
        return behind * front, plate_drag * np.sin(mirrored) ** 2 + b2 * np.cos(mirrored)

    return _both_sides(alpha, section, side)


def aerodas(alpha: FloatArray, plate_drag: float, section: SeparatedSection) -> tuple[FloatArray, FloatArray]:
    """Lift and drag coefficient after Spera's AERODAS, the part past the stall, for infinite aspect ratio.

    With the angle a in degrees, the largest lift CL = 1.190 (1 - (t/c)^2), R = 1.632 - CL and N = 1 + CL/R, from the
    matching point (as, cds) on

        cl = 0.032 (92 - a) - R ((92 - a)/51)^N, odd about 92 deg
        cd = cds + (cd90 - cds) sin(90 (a - as)/(90 - as))

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n,)
        [rad], within -pi to pi.
    plate_drag : float
        Drag coefficient at 90 deg, in place of the author's 2.300 exp(-(0.65 t/c)^0.9), which is 2.08 for 12 %.
    section : SeparatedSection

    Returns
    -------
    lift, drag : numpy.ndarray, shape (..., n)

    Notes
    -----
    Fitted to measured sections and blades of wind turbines, mostly 12 to 21 % thick (range from memory). Its lift does
    not know the section's own and begins near 8 deg: a section that stalls earlier than about 12 deg has a dip there.
    Held at no lift below; the last stretch to 180 deg runs straight to no lift.

    References
    ----------
    D.A. Spera, "Models of Lift and Drag Coefficients of Stalled and Unstalled Airfoils in Wind Turbines and Wind
    Tunnels", NASA/CR-2008-215434, 2008, reissued with errata in 2012, whose constants these are.
    """
    largest = 1.190 * (1.0 - section.t_over_c[..., None] ** 2)
    shortfall = 1.632 - largest
    power = 1.0 + largest / shortfall

    def side(angle: FloatArray, start: FloatArray, _: FloatArray, drag: FloatArray) -> tuple[FloatArray, FloatArray]:
        away = _AERODAS_LIFT_VANISHES - np.degrees(angle)
        size = 0.032 * np.abs(away) - shortfall * (np.abs(away) / _AERODAS_LIFT_SPAN) ** power
        lift = np.copysign(np.maximum(size, 0.0), away)
        quarter = np.sin(0.5 * np.pi * (angle - start) / (0.5 * np.pi - start))
        return lift, drag + (plate_drag - drag) * quarter

    return _both_sides(alpha, section, side)


LAWS: dict[str, Law[PostStallFunction]] = {
    "plate": Law(
        plate,
        "S.F. Hoerner, Fluid-Dynamic Drag, 1965; C. Lindenburg, ECN-C-03-025, 2003",
        "flat plates across the flow, any angle",
    ),
    "viterna": Law(
        viterna,
        "L.A. Viterna, R.D. Corrigan, Fixed Pitch Rotor Performance of Large Horizontal Axis Wind Turbines, NASA Lewis "
        "Research Center, 1982",
        "stalled wind turbines, from past the stall to 90 deg",
    ),
    "aerodas": Law(
        aerodas,
        "D.A. Spera, Models of Lift and Drag Coefficients of Stalled and Unstalled Airfoils in Wind Turbines and Wind "
        "Tunnels, NASA/CR-2008-215434, 2008 (errata 2012)",
        "sections of wind turbines, 12 to 21 % thick",
    ),
}
"""The laws by the name that a case gives them."""


def _both_sides(
    alpha: FloatArray,
    section: SeparatedSection,
    side: Callable[[FloatArray, FloatArray, FloatArray, FloatArray], tuple[FloatArray, FloatArray]],
) -> tuple[FloatArray, FloatArray]:
    """Lay a law of one stalled side, from its first angle to the mirror of that angle, over the full circle.

    Between the two sides lift and ln drag run straight; from the mirror to 180 deg lift runs straight to none and ln
    drag to that of the section edge on, so that both ends of the circle agree.
    """
    away = np.abs(alpha)
    ln_edge = np.log(section.edge_drag[..., None])

    def one(start: FloatArray, lift: FloatArray, drag: FloatArray) -> tuple[FloatArray, FloatArray]:
        start, lift, drag = start[..., None], lift[..., None], drag[..., None]
        law_lift, law_drag = side(np.clip(away, start, np.pi - start), start, lift, drag)
        kept = np.clip((np.pi - away) / start, 0.0, 1.0)
        return kept * law_lift, kept * np.log(law_drag) + (1.0 - kept) * ln_edge

    high_lift, ln_high_drag = one(section.high_angle, section.high_lift, section.high_drag)
    low_lift, ln_low_drag = one(-section.low_angle, -section.low_lift, section.low_drag)
    low, high = section.low_angle[..., None], section.high_angle[..., None]
    share = np.clip((alpha - low) / (high - low), 0.0, 1.0)
    return share * high_lift - (1.0 - share) * low_lift, np.exp(share * ln_high_drag + (1.0 - share) * ln_low_drag)
