"""The definitions of efficiency and figure of merit, and where they have a meaning."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def efficiency(advance_ratio: ArrayLike, thrust_coefficient: ArrayLike, power_coefficient: ArrayLike) -> FloatArray:
    """Return the efficiency of a propeller that propels.

    Parameters
    ----------
    advance_ratio, thrust_coefficient, power_coefficient : array_like
        J, CT and CP, broadcast against each other. At incidence CT of the force along the flight path.

    Returns
    -------
    numpy.ndarray
        J CT/CP; NaN unless J >= 0, CT >= 0 and CP > 0.
    """
    ct, cp = np.asarray(thrust_coefficient), np.asarray(power_coefficient)
    ratio = np.asarray(advance_ratio)
    propels = (ct >= 0.0) & (cp > 0.0) & (ratio >= 0.0)
    found: FloatArray = np.where(propels, ratio * ct, np.nan) / np.where(propels, cp, 1.0)
    return found


def figure_of_merit(thrust_coefficient: ArrayLike, power_coefficient: ArrayLike) -> FloatArray:
    """Return the ideal over the actual power of a propeller standing still.

    Parameters
    ----------
    thrust_coefficient, power_coefficient : array_like
        CT and CP at J = 0, broadcast against each other.

    Returns
    -------
    numpy.ndarray
        sqrt(2/pi) CT^1.5/CP; NaN unless CT > 0 and CP > 0.
    """
    ct, cp = np.asarray(thrust_coefficient), np.asarray(power_coefficient)
    pulls = (ct > 0.0) & (cp > 0.0)
    ideal = math.sqrt(2.0 / math.pi) * np.where(pulls, ct, np.nan) ** 1.5
    found: FloatArray = ideal / np.where(pulls, cp, 1.0)
    return found
