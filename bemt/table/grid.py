"""The grid of a printed coefficient table."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.errors import InputError

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Grid:
    """Advance ratios and rotational speeds of a table.

    Parameters
    ----------
    advance_ratio : numpy.ndarray, shape (n_j,)
        V/(nD), ascending, not negative.
    rpm : numpy.ndarray, shape (n_rpm,)
        Revolutions per minute, ascending, positive.

    Raises
    ------
    InputError
        If a value is out of range or order.
    """

    advance_ratio: FloatArray
    rpm: FloatArray

    def __post_init__(self) -> None:
        for name in ("advance_ratio", "rpm"):
            array = np.ascontiguousarray(np.atleast_1d(getattr(self, name)), dtype=np.float64)
            if array.ndim != 1 or array.size == 0 or not np.isfinite(array).all() or (np.diff(array) <= 0).any():
                raise InputError(name, "values must be finite numbers and ascend, each once")
            object.__setattr__(self, name, array)
        if (self.rpm <= 0).any():
            raise InputError("rpm", f"{self.rpm[0]:g}; a table needs a turning propeller")
        if (self.advance_ratio < 0).any():
            raise InputError("advance_ratio", f"{self.advance_ratio[0]:g}; backward flight is not covered")
