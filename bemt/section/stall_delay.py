"""Laws of stall delay: rotation keeps the flow attached near the root. Interchangeable pure functions."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

_FADE = (np.radians(30.0), np.radians(50.0))
_TIP_FADE = (0.75, 0.85)


def snel(c_over_r: FloatArray, r_over_R: FloatArray) -> FloatArray:
    """Share of the lift lost to separation that rotation gives back, after Snel and others.

    Parameters
    ----------
    c_over_r : numpy.ndarray, shape (n,)
        Chord over local radius.
    r_over_R : numpy.ndarray, shape (n,)
        Local over tip radius.

    Returns
    -------
    numpy.ndarray, shape (n,)
        3 (c/r)^2, no more than 1, faded to 0 between 0.75 and 0.85 R.

    Notes
    -----
    Fitted to wind turbines. The cap, the fade towards the tip and the use at half strength are this project's.

    References
    ----------
    H. Snel, R. Houwink, J. Bosschers, "Sectional prediction of lift coefficients on rotating wind turbine blades in
    stall", ECN-C-93-052, 1994 (factor from memory).
    """
    fade = np.clip((_TIP_FADE[1] - r_over_R) / (_TIP_FADE[1] - _TIP_FADE[0]), 0.0, 1.0)
    return np.minimum(3.0 * c_over_r**2, 1.0) * fade


def no_delay(c_over_r: FloatArray, r_over_R: FloatArray) -> FloatArray:
    """No stall delay: two-dimensional polars as they are.

    Parameters
    ----------
    c_over_r, r_over_R : numpy.ndarray, shape (n,)
        As for `snel`.

    Returns
    -------
    numpy.ndarray, shape (n,)
        Zeros.
    """
    return np.zeros(np.broadcast_shapes(np.shape(c_over_r), np.shape(r_over_R)))


LAWS: dict[str, Callable[[FloatArray, FloatArray], FloatArray]] = {"snel": snel, "none": no_delay}
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
    fade = np.clip((_FADE[1] - alpha) / (_FADE[1] - _FADE[0]), 0.0, 1.0)
    from_zero = alpha - zero_lift[..., None]
    missing = np.maximum(slope[..., None] * np.sin(from_zero) - lift, 0.0)
    return np.where(from_zero > 0, lift + share[..., None] * fade * missing, lift)
