"""The shipped polar families: one section shape over thickness and camber, computed beforehand."""

from __future__ import annotations

import difflib
import json
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.section.polar import PolarTable

Floats = NDArray[np.float64]

_DATA_PACKAGE = "airfoils_demo"
_CAMBER_TOLERANCE = 0.01  # of a measured camber, where the family's own follows the thickness


@dataclass(frozen=True, eq=False)
class Family:
    """Polars of one kind of section over thickness, camber, Reynolds number and angle of attack.

    Parameters
    ----------
    name, description : str
        What the case file calls it, and what it is.
    thickness : ndarray, shape (n_t,)
        Thickness nodes as shares of the chord, ascending.
    camber : ndarray, shape (n_c,)
        Camber nodes as shares of the chord, ascending. A single node: the camber follows the thickness, and the node
        is the camber at `default_thickness`.
    alpha : ndarray, shape (n_alpha,)
        Angle of attack of the chord line [rad], ascending.
    reynolds : ndarray, shape (n_re,)
        Reynolds number of the chord, ascending.
    lift, drag, moment : ndarray, shape (n_t, n_c, n_re, n_alpha)
        Section coefficients; the moment about the quarter chord, nose-up positive.
    face_angle : ndarray, shape (n_t, n_c)
        By how much the chord line is steeper than the flat face [rad].
    reynolds_trusted_from : float
        Rows below are extrapolated.
    source : str
        How the polars were computed.
    default_thickness, default_camber : float
        Of the member that serves where nothing was measured.
    """

    name: str
    description: str
    thickness: Floats
    camber: Floats
    alpha: Floats
    reynolds: Floats
    lift: Floats
    drag: Floats
    moment: Floats
    face_angle: Floats
    reynolds_trusted_from: float
    source: str
    default_thickness: float
    default_camber: float

    @property
    def camber_follows_thickness(self) -> bool:
        """Whether the thickness alone names a member."""
        return self.camber.size == 1

    def own_camber(self, t_over_c: float) -> float:
        """Return the camber of the member of this thickness where none was asked for.

        Parameters
        ----------
        t_over_c : float
            Thickness as a share of the chord.

        Returns
        -------
        float
            `default_camber`, or the camber that goes with the thickness.
        """
        if self.camber_follows_thickness:
            return self.default_camber * t_over_c / self.default_thickness
        return self.default_camber

    def at(self, t_over_c: float | None = None, camber: float | None = None) -> PolarTable:
        """Return the polars of one member.

        Between nodes lift, moment and the logarithm of drag vary linearly with thickness and camber; outside the
        nodes the nearest member serves (`covers` tells).

        Parameters
        ----------
        t_over_c, camber : float, optional
            Shares of the chord; the family's defaults where missing. `camber` has no effect where the camber follows
            the thickness.

        Returns
        -------
        PolarTable
            Over the family's Reynolds numbers and angles.

        Raises
        ------
        InputError
            If a value is not a finite number.
        """
        thickness = np.array([self.default_thickness if t_over_c is None else t_over_c], dtype=np.float64)
        cambers = None if camber is None else np.array([camber], dtype=np.float64)
        corners, weights = self._corners(thickness, cambers)
        lift, ln_drag, moment = (
            _blend(values, corners, weights)[0] for values in (self.lift, np.log(self.drag), self.moment)
        )
        return PolarTable(
            alpha=self.alpha,
            reynolds=self.reynolds,
            lift=lift,
            drag=np.exp(ln_drag),
            moment=moment,
            source=self.source,
            reynolds_trusted_from=self.reynolds_trusted_from,
            t_over_c=float(np.clip(thickness[0], self.thickness[0], self.thickness[-1])),
        )

    def at_many(self, t_over_c: ArrayLike, camber: ArrayLike | None = None) -> tuple[Floats, Floats]:
        """Return lift and drag of many members at once.

        Parameters
        ----------
        t_over_c, camber : array_like, shape (n,)
            As for `at`.

        Returns
        -------
        lift, drag : ndarray, shape (n, n_re, n_alpha)
            Section coefficients, interpolated as by `at`.

        Raises
        ------
        InputError
            If a value is not a finite number.
        """
        corners, weights = self._corners(t_over_c, camber)
        return _blend(self.lift, corners, weights), np.exp(_blend(np.log(self.drag), corners, weights))

    def covers(self, t_over_c: float, camber: float | None = None) -> bool:
        """Return whether the family was made for this thickness and camber.

        Where the camber follows the thickness, a camber that differs from the family's own by more than 1 % of the
        chord is outside.

        Parameters
        ----------
        t_over_c, camber : float
            Shares of the chord; no camber: the family's own.

        Returns
        -------
        bool
            False where the nearest member serves instead.
        """
        tiny = 1e-9
        if not self.thickness[0] - tiny <= t_over_c <= self.thickness[-1] + tiny:
            return False
        if camber is None:
            return True
        if self.camber_follows_thickness:
            return abs(camber - self.own_camber(t_over_c)) <= _CAMBER_TOLERANCE
        return bool(self.camber[0] - tiny <= camber <= self.camber[-1] + tiny)

    def flat_face_angle(self, t_over_c: ArrayLike, camber: ArrayLike | None = None) -> Floats:
        """Return by how much the chord line is steeper than a straight edge laid on the lower face.

        chord-line angle = flat-face angle + this angle: positive where the face lies flatter than the chord line, as
        on Clark Y; 0 for symmetric sections. The edge is pressed on under the thickest part of the section and rests
        on the two points of the lower side that enclose it, or touches a face that bulges.

        Parameters
        ----------
        t_over_c, camber : array_like
            As for `at`, broadcast against each other.

        Returns
        -------
        ndarray
            Angle [rad], of the shape of the broadcast arguments.
        """
        thickness, cambers = self._broadcast(t_over_c, camber)
        corners, weights = self._corners(thickness.ravel(), cambers.ravel())
        return _blend(self.face_angle, corners, weights).reshape(thickness.shape)

    def zero_lift_angle(self, t_over_c: ArrayLike, camber: ArrayLike | None, reynolds: ArrayLike) -> Floats:
        """Return the angle of attack at which lift vanishes.

        A section may carry no lift at several angles at a low Reynolds number, stalled at some of them; the one with
        the least drag is taken.

        Parameters
        ----------
        t_over_c, camber : array_like
            As for `at`.
        reynolds : array_like
            Reynolds number of the chord, held inside the family's range; all three broadcast against each other.

        Returns
        -------
        ndarray
            Angle of the chord line [rad], of the shape of the broadcast arguments.
        """
        thickness, cambers = self._broadcast(t_over_c, camber)
        thickness, cambers, wanted = np.broadcast_arrays(thickness, cambers, np.asarray(reynolds, dtype=np.float64))
        lift, drag = self.at_many(thickness.ravel(), cambers.ravel())
        place = np.interp(np.log(wanted.ravel()), np.log(self.reynolds), np.arange(self.reynolds.size))
        row = np.minimum(place.astype(int), self.reynolds.size - 2)
        share = (place - row)[:, np.newaxis]
        members = np.arange(len(lift))
        lift, ln_drag = (
            (1.0 - share) * values[members, row] + share * values[members, row + 1] for values in (lift, np.log(drag))
        )
        angles = [self._zero_crossing(*polar) for polar in zip(lift, ln_drag, strict=True)]
        return np.array(angles, dtype=np.float64).reshape(thickness.shape)

    def _zero_crossing(self, lift: Floats, ln_drag: Floats) -> float:
        """Return the angle at which lift changes its sign, the one with the least drag."""
        before = np.flatnonzero(np.signbit(lift[:-1]) != np.signbit(lift[1:]))
        share = lift[before] / (lift[before] - lift[before + 1])
        drag_there = ln_drag[before] + share * (ln_drag[before + 1] - ln_drag[before])
        least = drag_there.argmin()
        low, high = self.alpha[before[least]], self.alpha[before[least] + 1]
        return float(low + share[least] * (high - low))

    def _broadcast(self, t_over_c: ArrayLike, camber: ArrayLike | None) -> tuple[Floats, Floats]:
        thickness = np.asarray(t_over_c, dtype=np.float64)
        cambers = np.asarray(self.default_camber if camber is None else camber, dtype=np.float64)
        thickness, cambers = np.broadcast_arrays(thickness, cambers)
        return thickness, cambers

    def _corners(
        self, t_over_c: ArrayLike, camber: ArrayLike | None
    ) -> tuple[tuple[NDArray[np.intp], NDArray[np.intp]], Floats]:
        """Return the four nodes round each wanted member, index arrays of shape (n, 4), and their weights."""
        thickness, cambers = self._broadcast(t_over_c, camber)
        for field, values in (("t_over_c", thickness), ("camber", cambers)):
            if not np.isfinite(values).all():
                raise InputError(field, "must be a finite number")
        t_low, t_high, t_share = _bracket(self.thickness, thickness)
        c_low, c_high, c_share = _bracket(self.camber, cambers)
        indices = (
            np.stack((t_low, t_high, t_low, t_high), axis=-1),
            np.stack((c_low, c_low, c_high, c_high), axis=-1),
        )
        weights = np.stack(
            (
                (1.0 - t_share) * (1.0 - c_share),
                t_share * (1.0 - c_share),
                (1.0 - t_share) * c_share,
                t_share * c_share,
            ),
            axis=-1,
        )
        return indices, weights


def _bracket(nodes: Floats, values: Floats) -> tuple[NDArray[np.intp], NDArray[np.intp], Floats]:
    """Return the nodes below and above each value and its place between them, held inside the nodes."""
    place = np.interp(values, nodes, np.arange(nodes.size, dtype=np.float64))
    low = place.astype(np.intp)
    return low, np.minimum(low + 1, nodes.size - 1), place - low


def _blend(values: Floats, corners: tuple[NDArray[np.intp], NDArray[np.intp]], weights: Floats) -> Floats:
    blended: Floats = np.einsum("nk,nk...->n...", weights, values[corners])
    return blended


def family_names() -> tuple[str, ...]:
    """Return the names of the shipped families, in alphabetical order."""
    names = (entry.name for entry in files(_DATA_PACKAGE).iterdir())
    return tuple(sorted(name.removesuffix(".npz") for name in names if name.endswith(".npz")))


@cache
def family(name: str) -> Family:
    """Return a shipped family by its name; read once a process.

    Parameters
    ----------
    name : str
        One of `family_names()`.

    Returns
    -------
    Family
        Its arrays are shared and cannot be written to.

    Raises
    ------
    InputError
        If there is no such family.
    """
    names = family_names()
    if name not in names:
        close = difflib.get_close_matches(str(name).lower(), names, n=1, cutoff=0.5)
        hint = f" (did you mean {close[0]!r}?)" if close else ""
        listed = ", ".join(repr(known) for known in names)
        raise InputError("family", f"there is no family {name!r}{hint}; the shipped ones are {listed}")
    with files(_DATA_PACKAGE).joinpath(f"{name}.npz").open("rb") as stream, np.load(stream) as data:
        provenance = json.loads(str(data["provenance"]))
        lift_unit, ln_drag_unit, moment_unit = data["units"]
        arrays = {
            "thickness": data["thickness"],
            "camber": data["camber"],
            "alpha": np.radians(data["alpha_deg"]),
            "reynolds": data["reynolds"],
            "lift": data["lift"] * lift_unit,
            "drag": np.exp(data["ln_drag"] * ln_drag_unit),
            "moment": data["moment"] * moment_unit,
            "face_angle": data["flat_face_angle"],
        }
        trusted_from, default_thickness, default_camber = (
            float(data[key]) for key in ("reynolds_trusted_from", "default_thickness", "default_camber")
        )
    for array in arrays.values():
        array.setflags(write=False)
    source = (
        f"family {name!r} ({provenance['description']}): {provenance['method']} {provenance['method_version']}, "
        f"model {provenance['model_size']}, critical amplification {provenance['critical_amplification']:g}, "
        f"lift times {provenance['lift_share']:g}"
    )
    return Family(
        name=name,
        description=provenance["description"],
        source=source,
        reynolds_trusted_from=trusted_from,
        default_thickness=default_thickness,
        default_camber=default_camber,
        **arrays,
    )
