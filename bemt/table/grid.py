"""The grid of a printed coefficient table."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from bemt.errors import InputError

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Grid:
    """Advance ratios, rotational speeds and incidences of a table.

    Parameters
    ----------
    advance_ratio : numpy.ndarray, shape (n_j,)
        V/(nD), ascending; negative in descent.
    rpm : numpy.ndarray, shape (n_rpm,)
        Revolutions per minute, ascending, positive.
    incidence : numpy.ndarray, shape (n_incidence,)
        Between flight path and shaft [rad], ascending, 0 to pi/2. Other than 0 not beside a negative advance ratio.

    Raises
    ------
    InputError
        If a value is out of range or order.
    """

    advance_ratio: FloatArray
    rpm: FloatArray
    incidence: FloatArray = field(default_factory=lambda: np.zeros(1))

    def __post_init__(self) -> None:
        for name in ("advance_ratio", "rpm", "incidence"):
            array = np.ascontiguousarray(np.atleast_1d(getattr(self, name)), dtype=np.float64)
            if array.ndim != 1 or array.size == 0 or not np.isfinite(array).all() or (np.diff(array) <= 0).any():
                raise InputError(name, "values must be finite numbers and ascend, each once")
            object.__setattr__(self, name, array)
        if (self.rpm <= 0).any():
            raise InputError("rpm", f"{self.rpm[0]:g}; a table needs a turning propeller")
        for angle in (self.incidence[0], self.incidence[-1]):
            if not -1e-9 <= angle <= 0.5 * math.pi + 1e-9:
                raise InputError(
                    "incidence",
                    f"{math.degrees(angle):g} deg; between flight path and shaft, from 0 (axial) to 90 deg (edgewise)",
                )
        object.__setattr__(self, "incidence", np.clip(self.incidence, 0.0, 0.5 * math.pi))
        if self.inclined and self.advance_ratio[0] < 0.0:
            raise InputError(
                "advance_ratio",
                f"{self.advance_ratio[0]:g}; backward flight is estimated in axial flow only, without incidence",
            )

    @property
    def inclined(self) -> bool:
        """Whether any other flow than the axial one is asked for, so that the table runs over incidence as well."""
        return self.incidence.size > 1 or bool(self.incidence[0] != 0.0)
