"""Checks of input values: each raises `InputError` with the name of the field, the value found and what would fit."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from bemt.errors import InputError


def require_finite(field: str, value: float, unit: str = "") -> None:
    """Raise unless the value is a finite number.

    Parameters
    ----------
    field : str
        Name of the field in messages.
    value : float
        Value to judge.
    unit : str
        Unit named in the message.

    Raises
    ------
    InputError
        If the value is not a finite number.
    """
    if isinstance(value, bool) or not isinstance(value, (int, float, np.integer, np.floating)):
        raise InputError(field, f"{value!r} is not a number")
    if not math.isfinite(value):
        raise InputError(field, f"{_with_unit(value, unit)} is not a finite number")


def require_positive(field: str, value: float, unit: str = "") -> None:
    """Raise unless the value is finite and above zero.

    Parameters
    ----------
    field : str
        Name of the field in messages.
    value : float
        Value to judge.
    unit : str
        Unit named in the message.

    Raises
    ------
    InputError
        If the value is not finite or not above zero.
    """
    require_finite(field, value, unit)
    if value <= 0.0:
        raise InputError(field, f"{_with_unit(value, unit)} must be above zero")


def require_not_negative(field: str, value: float, unit: str = "") -> None:
    """Raise unless the value is finite and zero or more.

    Parameters
    ----------
    field : str
        Name of the field in messages.
    value : float
        Value to judge.
    unit : str
        Unit named in the message.

    Raises
    ------
    InputError
        If the value is not finite or is below zero.
    """
    require_finite(field, value, unit)
    if value < 0.0:
        raise InputError(field, f"{_with_unit(value, unit)} must not be negative")


def require_share(field: str, value: float) -> None:
    """Raise unless the value lies from 0 to 1.

    Parameters
    ----------
    field : str
        Name of the field in messages.
    value : float
        Value to judge.

    Raises
    ------
    InputError
        If the value is not finite or lies outside 0 to 1.
    """
    require_finite(field, value)
    if not 0.0 <= value <= 1.0:
        raise InputError(field, f"{value:g} must lie from 0 to 1")


def require_count(field: str, value: int) -> None:
    """Raise unless the value is a whole number of at least one.

    Parameters
    ----------
    field : str
        Name of the field in messages.
    value : int
        Value to judge.

    Raises
    ------
    InputError
        If the value is not a whole number of at least one.
    """
    if isinstance(value, bool) or not isinstance(value, (int, np.integer)) or value < 1:
        raise InputError(field, f"{value!r} must be a whole number of at least 1")


def require_one_of(field: str, value: str, allowed: Sequence[str]) -> None:
    """Raise unless the value is one of the allowed words.

    Parameters
    ----------
    field : str
        Name of the field in messages.
    value : str
        Value to judge.
    allowed : sequence of str
        Words that fit.

    Raises
    ------
    InputError
        If the value is none of the allowed words.
    """
    if value not in allowed:
        raise InputError(field, f"{value!r} is not one of " + ", ".join(repr(word) for word in allowed))


def ascending_axis(field: str, values: Any) -> NDArray[np.float64]:
    """Return the values as a one-dimensional, strictly ascending axis of finite numbers that starts at zero or above.

    Parameters
    ----------
    field : str
        Name of the field in messages.
    values : array_like
        Values of the axis, shape (n,).

    Returns
    -------
    numpy.ndarray
        Float64 copy, shape (n,).

    Raises
    ------
    InputError
        If the values are no such axis.
    """
    axis = np.array(values, dtype=np.float64)
    if axis.ndim != 1 or axis.size == 0:
        raise InputError(field, f"needs a list of numbers, not an array of shape {axis.shape}")
    if not np.all(np.isfinite(axis)):
        raise InputError(field, "holds a value that is not a finite number")
    if axis[0] < 0.0:
        raise InputError(field, f"{axis[0]:g} must not be negative")
    if np.any(np.diff(axis) <= 0.0):
        raise InputError(field, "must rise strictly from value to value")
    return axis


def _with_unit(value: float, unit: str) -> str:
    return f"{value:g} {unit}".rstrip()
