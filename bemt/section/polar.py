"""Tabulated section data: lift, drag and moment coefficients over angle of attack, Reynolds and Mach number."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.errors import InputError

FloatArray = NDArray[np.float64]

NARROWEST_ALPHA_DEG = (-4.0, 12.0)
"""Range of angle of attack that a table must cover: less has neither a zero-lift angle nor a stall."""


@dataclass(frozen=True, eq=False)
class PolarTable:
    """Polars of one section shape.

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n_alpha,)
        Angle of attack of the chord line [rad], ascending.
    reynolds : numpy.ndarray, shape (n_re,)
        Reynolds numbers of the chord, ascending; at least two.
    lift, drag : numpy.ndarray, shape (n_re, n_alpha), or (n_mach, n_re, n_alpha)
        Section coefficients.
    source : str
        Where the data come from, in words.
    moment : numpy.ndarray, shape of `lift`, optional
        Moment coefficient about the quarter chord, nose up positive.
    mach : float or numpy.ndarray, shape (n_mach,)
        Mach number at which the data hold; or several, ascending, at least two.
    reynolds_trusted_from : float
        Rows below this Reynolds number are extrapolated.
    t_over_c : float, optional
        Thickness as a share of the chord, where known.

    Raises
    ------
    InputError
        If the arrays do not fit, are not finite or not ascending, if a drag is not positive, if a Mach number does not
        lie between 0 and 1, if there are fewer than two Reynolds numbers, or if the angles do not reach from
        `NARROWEST_ALPHA_DEG[0]` to `NARROWEST_ALPHA_DEG[1]`.
    """

    alpha: FloatArray
    reynolds: FloatArray
    lift: FloatArray
    drag: FloatArray
    source: str
    moment: FloatArray | None = None
    mach: float | FloatArray = 0.0
    reynolds_trusted_from: float = 0.0
    t_over_c: float | None = None

    def __post_init__(self) -> None:
        for name in ("alpha", "reynolds", "lift", "drag", "moment"):
            value = getattr(self, name)
            if value is not None:
                array = np.ascontiguousarray(value, dtype=np.float64)
                if not np.isfinite(array).all():
                    raise InputError(name, "every value must be a finite number")
                object.__setattr__(self, name, array)
        if self.reynolds.ndim != 1 or self.reynolds.size < 2:
            raise InputError(
                "reynolds", f"{self.reynolds.size} Reynolds number; at least two are needed to interpolate between"
            )
        if (self.reynolds <= 0).any() or (np.diff(self.reynolds) <= 0).any():
            raise InputError("reynolds", "Reynolds numbers must be positive and ascending")
        if self.alpha.ndim != 1 or self.alpha.size < 4 or (np.diff(self.alpha) <= 0).any():
            raise InputError("alpha", "at least four angles of attack are needed, ascending")
        low, high = np.degrees(self.alpha[[0, -1]])
        if low > NARROWEST_ALPHA_DEG[0] + 1e-9 or high < NARROWEST_ALPHA_DEG[1] - 1e-9:
            raise InputError(
                "alpha_deg",
                f"angles reach from {low:g} to {high:g} deg; they must reach at least from "
                f"{NARROWEST_ALPHA_DEG[0]:g} to {NARROWEST_ALPHA_DEG[1]:g} deg, past the stall",
            )
        mach = np.asarray(self.mach, dtype=np.float64)
        if not ((mach >= 0.0) & (mach < 1.0)).all():
            raise InputError("mach", f"{self.mach}; the Mach numbers of a polar lie between 0 and 1")
        if mach.ndim > 0 and (mach.ndim > 1 or mach.size < 2 or (np.diff(mach) <= 0.0).any()):
            raise InputError("mach", "an axis of Mach numbers has at least two, ascending")
        object.__setattr__(self, "mach", float(mach) if mach.ndim == 0 else mach)
        shape = (*mach.shape, self.reynolds.size, self.alpha.size)
        for name in ("lift", "drag", "moment"):
            value = getattr(self, name)
            if value is not None and value.shape != shape:
                axes = "Mach numbers by Reynolds numbers by angles" if mach.ndim else "Reynolds numbers by angles"
                raise InputError(name, f"shape {value.shape} does not fit {axes} {shape}")
        if (self.drag <= 0).any():
            raise InputError("drag", f"smallest drag coefficient is {self.drag.min():g}; drag must be positive")

    @property
    def mach_numbers(self) -> FloatArray:
        """Mach numbers of the data, shape (n_mach,); one where the table has no axis of them."""
        return np.atleast_1d(np.asarray(self.mach, dtype=np.float64))
