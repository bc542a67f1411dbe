"""Laws of stall delay: rotation keeps the flow attached near the root. Interchangeable pure functions.

Every law was fitted to wind turbines; how each does on measured propellers is in docs/validation.md.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from bemt.section.laws import Law

FloatArray = NDArray[np.float64]

_FADE = (np.radians(30.0), np.radians(50.0))
_TIP_FADE = (0.75, 0.85)
_WIDEST_CHORD = 0.6  # over the local radius, in Du and Selig's law

StallDelayFunction = Callable[[FloatArray, FloatArray], tuple[FloatArray, FloatArray]]


def snel(c_over_r: FloatArray, r_over_R: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Share of the lift lost to separation that rotation gives back, after Snel and others; drag is unchanged.

    Parameters
    ----------
    c_over_r : numpy.ndarray, shape (n,)
        Chord over local radius.
    r_over_R : numpy.ndarray, shape (n,)
        Local over tip radius.

    Returns
    -------
    lift_share : numpy.ndarray, shape (n,)
        3 (c/r)^2, no more than 1, faded to 0 between 0.75 and 0.85 R.
    drag_share : numpy.ndarray, shape (n,)
        Zeros.

    Notes
    -----
    Fitted to wind turbines. The cap, the fade towards the tip and the use at half strength are this project's.

    References
    ----------
    H. Snel, R. Houwink, J. Bosschers, "Sectional prediction of lift coefficients on rotating wind turbine blades in
    stall", ECN-C-93-052, 1994 (factor from memory).
    """
    fade = np.clip((_TIP_FADE[1] - r_over_R) / (_TIP_FADE[1] - _TIP_FADE[0]), 0.0, 1.0)
    lift_share = np.minimum(3.0 * c_over_r**2, 1.0) * fade
    return lift_share, np.zeros_like(lift_share)


def du_selig(c_over_r: FloatArray, r_over_R: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Shares of lift given back and of drag taken away by rotation, after Du and Selig.

        share = (1.6 (c/r)/0.1267 (1 - X)/(1 + X) - 1)/(2 pi),  X = (c/r)^(q R/(Lambda r))

    with q = 1 for lift and 1/2 for drag, and the law's a = b = d = 1. Lambda = Omega R/sqrt(V^2 + (Omega R)^2) is taken
    at 1, a propeller standing still, since polars are made before any solution: at J = 1 it is 0.953, which raises the
    share of lift by 0.019 (of 0.87) at c/r = 0.6 and r = 0.2 R, by 0.007 (of 0.28) at c/r = 0.25 and r = 0.5 R, and
    nowhere by more than 0.04.

    Parameters
    ----------
    c_over_r : numpy.ndarray, shape (n,)
        Chord over local radius.
    r_over_R : numpy.ndarray, shape (n,)
        Local over tip radius.

    Returns
    -------
    lift_share : numpy.ndarray, shape (n,)
        Of the lift lost to separation; 0 to 1.
    drag_share : numpy.ndarray, shape (n,)
        Of the drag above that at zero lift; 0 to 1.

    Notes
    -----
    Fitted to wind turbines, with chords below about half the radius. The published form turns at c/r of some 0.7 and
    vanishes before 1, which a propeller's root exceeds: here c/r counts up to 0.6. Outboard the form is negative, and
    held at 0.

    Two misprints circulate: the product written as (1.6 (c/r) a - X)/(0.1267 b + X), which is another formula, and
    Lambda with V^2 - (Omega R)^2, which has no value at V = Omega R.

    References
    ----------
    Z. Du, M.S. Selig, "A 3-D Stall-Delay Model for Horizontal Axis Wind Turbine Performance Prediction", AIAA 98-0021,
    1998.
    """
    c_over_r = np.minimum(c_over_r, _WIDEST_CHORD)

    def share(exponent: FloatArray) -> FloatArray:
        x = c_over_r**exponent
        held: FloatArray = np.clip((1.6 * c_over_r / 0.1267 * (1.0 - x) / (1.0 + x) - 1.0) / (2.0 * np.pi), 0.0, 1.0)
        return held

    return share(1.0 / r_over_R), share(0.5 / r_over_R)


def no_delay(c_over_r: FloatArray, r_over_R: FloatArray) -> tuple[FloatArray, FloatArray]:
    """No stall delay: two-dimensional polars as they are.

    Parameters
    ----------
    c_over_r, r_over_R : numpy.ndarray, shape (n,)
        As for `snel`.

    Returns
    -------
    lift_share, drag_share : numpy.ndarray, shape (n,)
        Zeros.
    """
    none = np.zeros(np.broadcast_shapes(np.shape(c_over_r), np.shape(r_over_R)))
    return none, none


LAWS: dict[str, Law[StallDelayFunction]] = {
    "snel": Law(
        snel,
        "H. Snel, R. Houwink, J. Bosschers, Sectional prediction of lift coefficients on rotating wind turbine blades "
        "in stall, ECN-C-93-052, 1994",
        "wind turbines; inner blade, to 0.8 R",
    ),
    "du-selig": Law(
        du_selig,
        "Z. Du, M.S. Selig, A 3-D Stall-Delay Model for Horizontal Axis Wind Turbine Performance Prediction, "
        "AIAA 98-0021, 1998",
        "wind turbines; chord up to 0.6 of the radius",
    ),
    "none": Law(no_delay, "", "two-dimensional polars"),
}
"""The laws by the name that a case gives them."""


def delayed_lift(
    alpha: FloatArray, lift: FloatArray, zero_lift: FloatArray, slope: FloatArray, share: FloatArray
) -> FloatArray:
    """Raise the lift beyond stall towards the potential-flow line.

    cl + share (cl_pot - cl) with cl_pot = slope sin(alpha - alpha_0), above the zero-lift angle only and never
    downward; full up to 30 deg and gone at 50 deg, where no boundary layer is left to be helped.

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n_alpha,)
        [rad].
    lift : numpy.ndarray, shape (..., n_alpha)
        Two-dimensional lift coefficient.
    zero_lift, slope, share : numpy.ndarray, shape (...)
        Zero-lift angle [rad], attached lift slope [1/rad] and share given back.

    Returns
    -------
    numpy.ndarray, shape (..., n_alpha)
    """
    from_zero = alpha - zero_lift[..., None]
    missing = np.maximum(slope[..., None] * np.sin(from_zero) - lift, 0.0)
    return np.where(from_zero > 0, lift + share[..., None] * _fade(alpha) * missing, lift)


def delayed_drag(
    alpha: FloatArray, log_drag: FloatArray, zero_lift: FloatArray, log_drag_at_zero_lift: FloatArray, share: FloatArray
) -> FloatArray:
    """Lower the drag towards that at zero lift.

    cd - share (cd - cd0) above the zero-lift angle, never upward, with the fade of `delayed_lift`.

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n_alpha,)
        [rad].
    log_drag : numpy.ndarray, shape (..., n_alpha)
        Logarithm of the two-dimensional drag coefficient.
    zero_lift, log_drag_at_zero_lift, share : numpy.ndarray, shape (...)
        Zero-lift angle [rad], logarithm of the drag coefficient there, and share of the drag above it that is taken
        away.

    Returns
    -------
    numpy.ndarray, shape (..., n_alpha)
        Logarithm of the drag coefficient.
    """
    from_zero = alpha - zero_lift[..., None]
    above = np.maximum(1.0 - np.exp(log_drag_at_zero_lift[..., None] - log_drag), 0.0)
    return np.where(from_zero > 0, log_drag + np.log1p(-share[..., None] * _fade(alpha) * above), log_drag)


def _fade(alpha: FloatArray) -> FloatArray:
    faded: FloatArray = np.clip((_FADE[1] - alpha) / (_FADE[1] - _FADE[0]), 0.0, 1.0)
    return faded
