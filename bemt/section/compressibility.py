"""Compressibility of a section whose polars were made at one Mach number."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

KORN_KAPPA = 0.87
"""Korn's technology factor for conventional sections (W.H. Mason, Configuration Aerodynamics)."""

LOWEST_DIVERGENCE = 0.3
CRITICAL_BELOW_DIVERGENCE = 0.10772173450159418  # (0.1/80)^(1/3)
"""By how much Lock's critical Mach number, where the drag rise begins, lies below that of drag divergence."""

_HIGHEST_RISE = 0.5
_LIFT_COUNTED = 2.0
_FADE = (np.radians(30.0), np.radians(50.0))
_ROUNDS = 6


def divergence_mach(without_lift: FloatArray, lift: FloatArray) -> FloatArray:
    """Drag-divergence Mach number after Korn: kappa - t/c - |cl|/10.

    Parameters
    ----------
    without_lift : numpy.ndarray
        kappa - t/c.
    lift : numpy.ndarray
        Lift coefficient; counted up to 2. Both broadcast.

    Returns
    -------
    numpy.ndarray
        No less than 0.3.

    References
    ----------
    W.H. Mason, Configuration Aerodynamics.
    """
    found: FloatArray = np.maximum(without_lift - 0.1 * np.minimum(np.abs(lift), _LIFT_COUNTED), LOWEST_DIVERGENCE)
    return found


def compressed(
    alpha: FloatArray,
    lift: FloatArray,
    drag: FloatArray,
    mach: FloatArray | float,
    *,
    divergence: FloatArray,
    table_beta: FloatArray | float,
) -> tuple[FloatArray, FloatArray]:
    """Bring lift and drag coefficients to a Mach number.

    Lift grows by Prandtl and Glauert's factor, from that of the polars' own Mach number on; the Mach number in it is
    held at drag divergence, and it fades out between 30 and 50 deg of incidence. Drag rises by Lock's 20 (M - Mcr)^4,
    no more than 0.5.

    Parameters
    ----------
    alpha : numpy.ndarray
        Angle of attack [rad], any. All arguments broadcast.
    lift, drag : numpy.ndarray
        Section coefficients of the polars.
    mach : float or numpy.ndarray
        Mach number of the flow.
    divergence : numpy.ndarray
        Drag-divergence Mach number without lift.
    table_beta : float or numpy.ndarray
        sqrt(1 - M^2) at the Mach number of the polars.

    Returns
    -------
    lift, drag : numpy.ndarray

    Notes
    -----
    Against NACA Report 832 the slope of lift is met within 4 % up to Mach 0.65 (docs/sections.md). Above divergence a
    real section's lift collapses, which is not modelled: the flow there counts as beyond its data.

    References
    ----------
    H. Glauert, Proc. R. Soc. A 118, 1928 (factor); W.H. Mason, Configuration Aerodynamics (Korn's relation and Lock's
    drag rise).
    """
    # The factor is taken at the lift it leaves: it settles in a few rounds.
    away = np.abs(np.remainder(alpha + np.pi, 2.0 * np.pi) - np.pi)
    fade = np.clip((_FADE[1] - away) / (_FADE[1] - _FADE[0]), 0.0, 1.0)
    diverging = divergence_mach(divergence, lift)
    found = lift
    for _ in range(_ROUNDS):
        factor = np.maximum(table_beta / np.sqrt(1.0 - np.minimum(mach, diverging) ** 2), 1.0)
        found = lift * (1.0 + (factor - 1.0) * fade)
        diverging = divergence_mach(divergence, found)
    above = np.maximum(mach - (diverging - CRITICAL_BELOW_DIVERGENCE), 0.0)
    return found, drag + np.minimum(20.0 * above**4, _HIGHEST_RISE)
