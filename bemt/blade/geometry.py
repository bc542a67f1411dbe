"""The propeller as measured: stations along the blade, what section each part has, and its size."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.errors import InputError
from bemt.section.polar import PolarTable

FloatArray = NDArray[np.float64]

TWIST_REFERENCES = ("chord line", "flat face", "zero lift")


@dataclass(frozen=True, eq=False)
class Stations:
    """Measured stations of a blade, made dimensionless with its tip radius.

    Parameters
    ----------
    r_over_R : numpy.ndarray, shape (n,)
        Radius over tip radius, ascending, within (0, 1].
    c_over_R : numpy.ndarray, shape (n,)
        Chord over tip radius, positive.
    twist : numpy.ndarray, shape (n,)
        Angle from the plane of rotation of the line named by `twist_reference` [rad].
    t_over_c : numpy.ndarray, shape (n,), optional
        Thickness as a share of the chord.
    camber : numpy.ndarray, shape (n,), optional
        Largest camber as a share of the chord.
    twist_reference : {"chord line", "flat face", "zero lift"}
        The line that `twist` belongs to.

    Raises
    ------
    InputError
        If there are fewer than two stations, or a value is out of its range or order.
    """

    r_over_R: FloatArray
    c_over_R: FloatArray
    twist: FloatArray
    t_over_c: FloatArray | None = None
    camber: FloatArray | None = None
    twist_reference: str = "chord line"

    def __post_init__(self) -> None:
        size = np.size(self.r_over_R)
        for name in ("r_over_R", "c_over_R", "twist", "t_over_c", "camber"):
            value = getattr(self, name)
            if value is None:
                continue
            array = np.ascontiguousarray(value, dtype=np.float64)
            if array.shape != (size,):
                raise InputError(name, f"shape {array.shape} does not fit {size} stations")
            if not np.isfinite(array).all():
                raise InputError(name, "every value must be a finite number")
            object.__setattr__(self, name, array)
        if size < 2:
            raise InputError("r_over_R", f"{size} station; at least two are needed")
        if (np.diff(self.r_over_R) <= 0).any():
            raise InputError("r_over_R", "radii must ascend from root to tip, each once")
        if self.r_over_R[0] <= 0 or self.r_over_R[-1] > 1 + 1e-9:
            raise InputError("r_over_R", "radii must lie between the axis and the tip (0 < r/R <= 1)")
        if (self.c_over_R <= 0).any():
            raise InputError("c_over_R", "a chord must be positive")
        if (np.abs(self.twist) >= np.pi / 2).any():
            raise InputError("twist", "a blade angle must lie within 90 deg of the plane of rotation")
        if self.t_over_c is not None and ((self.t_over_c <= 0) | (self.t_over_c > 1)).any():
            raise InputError("t_over_c", "thickness is a share of the chord, between 0 and 1")
        if self.camber is not None and (np.abs(self.camber) > 0.5).any():
            raise InputError("camber", "camber is a share of the chord, within 0.5")
        if self.twist_reference not in TWIST_REFERENCES:
            raise InputError("twist_reference", f"{self.twist_reference!r}; one of {', '.join(TWIST_REFERENCES)}")


@dataclass(frozen=True, eq=False)
class SectionSpan:
    """What section a part of the blade has.

    Parameters
    ----------
    start, end : float
        Part of the span in r/R.
    polars : PolarTable, optional
        Measured or computed data of one shape, the same over the part.
    family : str, optional
        Name of a shipped family, which follows thickness and camber of each station.
    t_over_c, camber : float, optional
        Thickness and camber where the stations have none; a family's own default where this is missing too.

    Raises
    ------
    InputError
        Unless exactly one of `polars` and `family` is given and 0 <= start < end <= 1.
    """

    start: float = 0.0
    end: float = 1.0
    polars: PolarTable | None = None
    family: str | None = None
    t_over_c: float | None = None
    camber: float | None = None

    def __post_init__(self) -> None:
        if (self.polars is None) == (self.family is None):
            raise InputError("polars", "a section has either polars or a family")
        if not 0 <= self.start < self.end <= 1:
            raise InputError("from", f"{self.start:g} to {self.end:g}; a part of the span runs upward within 0 to 1")


@dataclass(frozen=True, eq=False)
class Propeller:
    """A propeller of which coefficients are wanted.

    Parameters
    ----------
    blades : int
        Number of blades, at least 1.
    diameter : float
        [m]. The stations scale with it.
    stations : Stations
        Blade geometry.
    sections : tuple of SectionSpan
        From root to tip, without gaps over the blade.
    hub_diameter : float
        [m], 0 where there is no hub.
    rpm_limit : float, optional
        As printed on the propeller [rpm].
    rotation : {"right", "left"}
        Seen from behind.
    section_guessed : bool
        Whether the section is the default for an unknown one.

    Raises
    ------
    InputError
        If a value is out of range or the sections leave a gap.
    """

    blades: int
    diameter: float
    stations: Stations
    sections: tuple[SectionSpan, ...]
    hub_diameter: float = 0.0
    rpm_limit: float | None = None
    rotation: str = "right"
    section_guessed: bool = False

    def __post_init__(self) -> None:
        if self.blades < 1:
            raise InputError("blades", f"{self.blades}; at least one blade is needed")
        if not 0 < self.diameter < np.inf:
            raise InputError("diameter", f"{self.diameter:g} m; a diameter must be positive")
        if not 0 <= self.hub_diameter < self.diameter:
            raise InputError(
                "hub_diameter",
                f"{self.hub_diameter:g} m; a hub must be smaller than the propeller of {self.diameter:g} m: are "
                "the units right?",
            )
        if self.root >= self.stations.r_over_R[-1]:
            raise InputError(
                "hub_diameter",
                f"the hub reaches to r/R = {self.root:.3f} and the last station stands at "
                f"{self.stations.r_over_R[-1]:.3f}: no blade is left; are the units of hub, stations and diameter "
                "right?",
            )
        if self.rpm_limit is not None and not self.rpm_limit > 0:
            raise InputError("rpm_limit", f"{self.rpm_limit:g}; a limit must be positive")
        if self.rotation not in ("right", "left"):
            raise InputError("rotation", f"{self.rotation!r}; one of right, left")
        if not self.sections:
            raise InputError("section", "at least one section is needed")
        if self.sections[0].start > self.root + 1e-9 or self.sections[-1].end < 1 - 1e-9:
            raise InputError("section", f"the sections must cover the blade from r/R = {self.root:.3f} to 1")
        for inner, outer in zip(self.sections, self.sections[1:], strict=False):
            if abs(inner.end - outer.start) > 1e-9:
                raise InputError("section", f"one part ends at {inner.end:g}, the next starts at {outer.start:g}")

    @property
    def root(self) -> float:
        """Root of the aerodynamic blade in r/R: the larger of hub radius and first station."""
        return max(self.hub_diameter / self.diameter, float(self.stations.r_over_R[0]))
