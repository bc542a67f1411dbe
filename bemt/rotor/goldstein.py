"""Goldstein's factor: how much less circulation rigid helical vortex sheets carry than infinitely many would."""

from __future__ import annotations

from functools import lru_cache
from importlib.resources import files
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError

if TYPE_CHECKING:
    from scipy.interpolate import RectBivariateSpline

FloatArray = NDArray[np.float64]

DATA = "goldstein.npz"
"""The table beside this file, computed by `python -m bemt.rotor.goldstein_data`."""

TABLED_BLADES = 12
LEAST_R_OVER_R = 0.05

_PITCH_SCALE = 0.3


def span_coordinate(r_over_R: ArrayLike) -> FloatArray:
    """Return an angle in which the factor over Prandtl's is smooth, and even at the tip.

    Parameters
    ----------
    r_over_R : array_like
        Up to 1.

    Returns
    -------
    numpy.ndarray
        Up to pi/2 at the tip.
    """
    found: FloatArray = np.arcsin((np.asarray(r_over_R) - LEAST_R_OVER_R) / (1.0 - LEAST_R_OVER_R))
    return found


def pitch_coordinate(wake_pitch: ArrayLike) -> FloatArray:
    """Return a measure of the wake's pitch that stays finite.

    Parameters
    ----------
    wake_pitch : array_like
        Advance per radian over the tip radius, from 0 to infinity.

    Returns
    -------
    numpy.ndarray
        From 0 to 1.
    """
    with np.errstate(divide="ignore"):
        found: FloatArray = 1.0 / (1.0 + _PITCH_SCALE / np.asarray(wake_pitch, dtype=np.float64))
    return found


def pitch_at(coordinate: ArrayLike) -> FloatArray:
    """Return the wake pitch at a value of `pitch_coordinate`.

    Parameters
    ----------
    coordinate : array_like
        From 0 to 1.

    Returns
    -------
    numpy.ndarray
        From 0 to infinity.
    """
    coordinate = np.asarray(coordinate, dtype=np.float64)
    with np.errstate(divide="ignore"):
        found: FloatArray = _PITCH_SCALE * coordinate / (1.0 - coordinate)
    return found


def prandtl_factor(blades: int, r_over_R: ArrayLike, absolute_sine: ArrayLike) -> FloatArray:
    """Prandtl's factor for the tip, with the local helix angle.

    Parameters
    ----------
    blades : int
    r_over_R : array_like
        Positive, up to 1.
    absolute_sine : array_like
        |sin phi| of the local helix angle, not negative.

    Returns
    -------
    numpy.ndarray
        (2/pi) acos(exp(-(B/2) (R - r) / (r |sin phi|))).

    References
    ----------
    L. Prandtl, appendix to A. Betz, "Schraubenpropeller mit geringstem Energieverlust", 1919; H. Glauert in
    W.F. Durand (ed.), Aerodynamic Theory IV, 1935.
    """
    r_over_R = np.asarray(r_over_R, dtype=np.float64)
    sine = np.maximum(absolute_sine, 1e-300)
    found: FloatArray = 2.0 / np.pi * np.arccos(np.exp(-0.5 * blades * (1.0 - r_over_R) / r_over_R / sine))
    return found


def goldstein_factor(blades: int, r_over_R: ArrayLike, wake_pitch: ArrayLike) -> FloatArray:
    """Goldstein's factor K (1 + mu^2) / mu^2 with K = B Gamma / (2 pi w lambda R) and mu = r / (lambda R).

    Solved here for sheets that reach the axis, so it exceeds 1 inboard where the helix is steep: a rotating star of
    sheets carries the fluid between them along.

    Parameters
    ----------
    blades : int
        1 to 12.
    r_over_R : array_like
        From 0 to 1; below 0.05 the value at 0.05.
    wake_pitch : array_like
        lambda, advance of the sheets per radian over the tip radius, from 0 (factor 1) to infinity (the factor of
        straight sheets that rotate about their common edge).

    Returns
    -------
    numpy.ndarray
        The factor, within 0.1 % of the lattice's limit from 0.2 R outward, 0.5 % further in.

    Raises
    ------
    InputError
        If there are more blades than the table has.

    References
    ----------
    S. Goldstein, "On the vortex theory of screw propellers", Proceedings of the Royal Society A 123, 1929.
    """
    if not 1 <= blades <= TABLED_BLADES:
        raise InputError("blades", f"{blades}; Goldstein's factor is known for 1 to {TABLED_BLADES} blades")
    r_over_R = np.maximum(np.asarray(r_over_R, dtype=np.float64), LEAST_R_OVER_R)
    wake_pitch = np.asarray(wake_pitch, dtype=np.float64)
    sine = 1.0 / np.hypot(1.0, r_over_R / np.maximum(wake_pitch, 1e-300))
    ratio = _ratio(blades)(span_coordinate(r_over_R), pitch_coordinate(wake_pitch), grid=False) / r_over_R**2
    found: FloatArray = ratio * prandtl_factor(blades, r_over_R, sine)
    return found


@lru_cache(maxsize=TABLED_BLADES)
def _ratio(blades: int) -> RectBivariateSpline:
    from scipy.interpolate import RectBivariateSpline  # slow to import, and other laws need nothing of it

    with files("bemt.rotor").joinpath(DATA).open("rb") as stream, np.load(stream) as data:
        return RectBivariateSpline(
            span_coordinate(data["r_over_R"]),
            pitch_coordinate(data["wake_pitch"]),
            data["ratio"][blades - 1].astype(np.float64),
            s=0,
        )
