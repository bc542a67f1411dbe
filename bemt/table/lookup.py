"""Looking things up in the table of a propeller, from standing still to a stopped propeller in the wind.

The table runs over the helix angle at 0.75 R, atan2(V, 0.75 pi n D), and over the Reynolds and Mach number of the speed
U = sqrt(V^2 + (0.75 pi n D)^2) and the chord at 0.75 R. With forces as shares of U^2 nothing in it grows without
bounds, and air of any density is served by matching Reynolds and Mach number. This module needs no compiler: a table
read from a file is looked up without solving anything.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.air import Air
from bemt.errors import InputError
from bemt.interpolation import monotone_slopes
from bemt.quantities.registry import (
    SHARES,
    STATUS_CONVERGED,
    STATUS_NOT_CONVERGED,
    STATUS_NOT_RUN,
    STATUS_REVERSED_FLOW,
)

if TYPE_CHECKING:
    import xarray as xr

FloatArray = NDArray[np.float64]
StatusArray = NDArray[np.int16]

REFERENCE_RADIUS = 0.75
"""Radius over tip radius whose speed and chord make the reference Reynolds and Mach number."""

METHOD = (
    "cubic Hermite along the helix angle with the slopes of Fritsch and Butland 1984; "
    "linear in ln Re and in the square of the Mach number"
)
"""How values between the nodes are meant, for readers of a file."""

TABLES = ("thrust", "torque", *SHARES, "status")
"""Arrays of a look-up; in a dataset their names begin with `lookup_`."""

_SLOWEST_SQUARE = 1e-200  # keeps the logarithm of a Reynolds number finite at rest


class LookupLoads(NamedTuple):
    """Loads of one propeller, arrays of one shape.

    Parameters
    ----------
    thrust, torque : numpy.ndarray
        [N], [N m] taken from the shaft; NaN outside the table.
    stalled_share, outside_polar_share, low_reynolds_share, above_divergence_share : numpy.ndarray
        Shares of the span, weighted by r^2 chord; NaN outside the table.
    status : numpy.ndarray of int16
        Codes of the registry, the worst of the nodes around; "not run" outside the table.
    """

    thrust: FloatArray
    torque: FloatArray
    stalled_share: FloatArray
    outside_polar_share: FloatArray
    low_reynolds_share: FloatArray
    above_divergence_share: FloatArray
    status: StatusArray


@dataclass(frozen=True, eq=False)
class Lookup:
    """The table of one propeller.

    Parameters
    ----------
    mach : numpy.ndarray, shape (n_mach,)
        Reference Mach numbers, ascending; the speed sqrt(V^2 + (0.75 pi n D)^2) over that of sound.
    reynolds : numpy.ndarray, shape (n_re,)
        Reference Reynolds numbers, ascending.
    helix_angle : numpy.ndarray, shape (n_helix,)
        atan2(V, 0.75 pi n D) [rad], ascending.
    thrust, torque : numpy.ndarray, shape (n_mach, n_re, n_helix)
        T/(rho U^2 D^2) and Q/(rho U^2 D^3); NaN where the solution did not converge.
    stalled_share, outside_polar_share, low_reynolds_share, above_divergence_share : numpy.ndarray
        Shares of the span, shape (n_mach, n_re, n_helix).
    status : numpy.ndarray of int16, shape (n_mach, n_re, n_helix)
        Codes of the registry.
    diameter : float
        [m].
    chord_75 : float
        Chord at 0.75 R [m].
    air : Air
        Of look-ups that name no other.
    tip_divergence_mach : float
        Helical tip Mach number from which drag rises steeply.
    section_guessed : bool
        Whether the section is the default for an unknown one.

    Raises
    ------
    InputError
        If an axis has fewer than two nodes or does not ascend, or an array does not fit the axes.
    """

    mach: FloatArray
    reynolds: FloatArray
    helix_angle: FloatArray
    thrust: FloatArray
    torque: FloatArray
    stalled_share: FloatArray
    outside_polar_share: FloatArray
    low_reynolds_share: FloatArray
    above_divergence_share: FloatArray
    status: StatusArray
    diameter: float
    chord_75: float
    air: Air
    tip_divergence_mach: float = math.inf
    section_guessed: bool = False
    _cells: FloatArray = field(init=False, repr=False)
    _cell_status: StatusArray = field(init=False, repr=False)
    _ln_reynolds: FloatArray = field(init=False, repr=False)
    _mach_squared: FloatArray = field(init=False, repr=False)
    _corners: NDArray[np.intp] = field(init=False, repr=False)
    _most: tuple[float, float] = field(init=False, repr=False)
    _least: float = field(init=False, repr=False)

    def __post_init__(self) -> None:
        """Check the shapes and work out the cubic of every cell."""
        for name in ("mach", "reynolds", "helix_angle"):
            axis = getattr(self, name)
            if axis.ndim != 1 or axis.size < 2 or not (np.diff(axis) > 0.0).all():
                raise InputError(f"lookup_{name}", "an axis of a look-up table has two nodes or more and ascends")
        if self.mach[0] != 0.0 or abs(self.helix_angle[0]) > 1e-12 or abs(self.helix_angle[-1] - 0.5 * math.pi) > 1e-12:
            raise InputError("lookup", "Mach numbers start at 0 and helix angles reach from 0 to 90 deg")
        shape = (self.mach.size, self.reynolds.size, self.helix_angle.size)
        for name in TABLES:
            if getattr(self, name).shape != shape:
                raise InputError(f"lookup_{name}", f"shape {getattr(self, name).shape} does not fit the axes {shape}")
        unsolved = np.isnan(self.thrust) | np.isnan(self.torque)
        shares = np.stack([getattr(self, name) for name in SHARES], axis=-1)
        # Of each cell: thrust and torque in turn for every power of t, then the shares and their rises.
        forces = [_cubics(self.helix_angle, _bridged(self.helix_angle, array)) for array in (self.thrust, self.torque)]
        cubics = np.stack(forces, axis=-1).reshape(*forces[0].shape[:-1], 8)
        cells = np.concatenate([cubics, shares[:, :, :-1], np.diff(shares, axis=2)], axis=-1)
        per_row = self.helix_angle.size - 1
        corners = np.array([0, per_row, self.reynolds.size * per_row, (self.reynolds.size + 1) * per_row])
        mach_squared, ln_reynolds = self.mach**2, np.log(self.reynolds)
        rounding = 1e-12
        for name, value in (
            ("_cells", np.ascontiguousarray(cells.reshape(-1, cells.shape[-1]))),
            ("_cell_status", _worst_of_cells(np.where(unsolved, STATUS_NOT_CONVERGED, self.status).astype(np.int16))),
            ("_ln_reynolds", ln_reynolds),
            ("_mach_squared", mach_squared),
            ("_corners", corners[:, None]),
            ("_most", (mach_squared[-1] * (1.0 + rounding), ln_reynolds[-1] + rounding)),
            ("_least", ln_reynolds[0] - rounding),
        ):
            object.__setattr__(self, name, value)

    def loads(self, airspeed: ArrayLike, rpm: ArrayLike, air: Air | None = None) -> LookupLoads:
        """Return the loads of one propeller.

        Parameters
        ----------
        airspeed : array_like
            Of the air the disk meets, along the shaft [m/s].
        rpm : array_like
            Revolutions per minute, broadcast against `airspeed`.
        air : Air, optional
            Of all points; without one the table's own. Reynolds and Mach number are matched.

        Returns
        -------
        LookupLoads
            Broadcast shape. Zero at rest. Where everything moves more slowly than the table's lowest Reynolds number,
            the coefficients of that one hold, and the whole span counts as outside its polar data. NaN at negative
            airspeed or rpm and beyond the highest Reynolds or Mach number.
        """
        own = air or self.air
        v, n = np.asarray(airspeed, dtype=np.float64), np.asarray(rpm, dtype=np.float64)
        if v.shape != n.shape:
            v, n = np.broadcast_arrays(v, n)
        return self._evaluate(v, n, own.density, own.density / own.viscosity, 1.0 / own.speed_of_sound)

    def evaluate(
        self,
        airspeed: ArrayLike,
        rpm: ArrayLike,
        density: ArrayLike,
        viscosity: ArrayLike,
        speed_of_sound: ArrayLike,
    ) -> LookupLoads:
        """Return the loads of one propeller in air that may differ from point to point.

        Parameters
        ----------
        airspeed : array_like
            Along the shaft [m/s].
        rpm : array_like
            Revolutions per minute.
        density, viscosity, speed_of_sound : array_like
            [kg/m3], [Pa s] (dynamic), [m/s]; above zero.

        Returns
        -------
        LookupLoads
            As `loads`; all arguments are broadcast against each other.
        """
        v, n, rho, mu, sound = np.broadcast_arrays(
            *(np.asarray(x, dtype=np.float64) for x in (airspeed, rpm, density, viscosity, speed_of_sound))
        )
        return self._evaluate(v, n, rho.ravel(), (rho / mu).ravel(), 1.0 / sound.ravel())

    def _evaluate(
        self,
        airspeed: FloatArray,
        rpm: FloatArray,
        density: FloatArray | float,
        inverse_viscosity: FloatArray | float,
        inverse_sound: FloatArray | float,
    ) -> LookupLoads:
        """Look up points of one shape; the air is one for all or given for each in flat order.

        The drive asks for few points thousands of times, so what counts here is the number of array operations.
        """
        v, n = airspeed.ravel(), rpm.ravel()
        turning = n * (REFERENCE_RADIUS * math.pi * self.diameter / 60.0)
        square = v * v + turning * turning
        ln_re = np.log(np.sqrt(np.maximum(square, _SLOWEST_SQUARE)) * (self.chord_75 * inverse_viscosity))
        mach_squared = square * (inverse_sound * inverse_sound)
        known = (v >= 0.0) & (n >= 0.0) & (mach_squared <= self._most[0]) & (ln_re <= self._most[1])

        n_re, n_helix = self.reynolds.size, self.helix_angle.size
        helix_cell, t = _place(self.helix_angle, np.arctan2(v, turning))
        re_cell, up = _place(self._ln_reynolds, np.maximum(ln_re, self._ln_reynolds[0]))
        mach_cell, fast = _place(self._mach_squared, mach_squared)
        column = mach_cell * n_re
        column += re_cell
        cell = column * (n_helix - 1)
        cell += helix_cell
        weights = np.empty((4, v.size))
        np.multiply(fast, up, out=weights[3])
        np.subtract(fast, weights[3], out=weights[2])
        np.subtract(up, weights[3], out=weights[1])
        np.subtract(1.0 - fast, weights[1], out=weights[0])
        mixed = np.einsum("cp,cpk->kp", weights, self._cells.take(self._corners + cell, axis=0))
        status = self._cell_status.take(cell)

        # Cubics in t by Horner's rule: thrust, then torque; the shares are linear.
        forces = mixed[6:8]
        for k in (4, 2, 0):
            forces = forces * t + mixed[k : k + 2]
        shares = mixed[8 : 8 + len(SHARES)] + mixed[8 + len(SHARES) :] * t
        pressure = square * (density * self.diameter**2)
        forces *= pressure
        thrust, torque = forces[0], forces[1] * self.diameter

        known &= status != STATUS_NOT_CONVERGED
        if not known.all():
            lost = ~known
            thrust[lost] = torque[lost] = shares[:, lost] = np.nan
            outside = lost & (status != STATUS_NOT_CONVERGED)
            outside |= (
                (v < 0.0) | (n < 0.0) | np.isnan(square) | (mach_squared > self._most[0]) | (ln_re > self._most[1])
            )
            status[outside] = np.where(v[outside] < 0.0, STATUS_REVERSED_FLOW, STATUS_NOT_RUN)
        slow = ln_re < self._least
        if slow.any():
            shares[1, slow & known] = 1.0
            at_rest = square == 0.0
            thrust[at_rest] = torque[at_rest] = shares[:, at_rest] = 0.0
            status[at_rest] = STATUS_CONVERGED
        shape = airspeed.shape
        return LookupLoads(*(array.reshape(shape) for array in (thrust, torque, *shares, status)))

    def variables(self) -> tuple[dict[str, NDArray[Any]], dict[str, FloatArray], dict[str, Any]]:
        """Return what a dataset must hold for `from_dataset`.

        Returns
        -------
        values, coordinates : dict of str to numpy.ndarray
            By the names of the registry; helix angles in degrees.
        attrs : dict
            Numbers in SI units, and the method of interpolation in words.
        """
        return (
            {f"lookup_{name}": getattr(self, name) for name in TABLES},
            {
                "lookup_mach": self.mach,
                "lookup_reynolds": self.reynolds,
                "lookup_helix_angle": np.degrees(self.helix_angle),
            },
            {
                "diameter": self.diameter,
                "chord_75": self.chord_75,
                "air_density": self.air.density,
                "air_viscosity": self.air.viscosity,
                "air_speed_of_sound": self.air.speed_of_sound,
                "tip_divergence_mach": self.tip_divergence_mach,
                "section_guessed": int(self.section_guessed),
                "lookup_method": METHOD,
            },
        )

    @classmethod
    def from_dataset(cls, dataset: xr.Dataset) -> Lookup:
        """Take the look-up table out of a coefficient table, e.g. one read from a file.

        Parameters
        ----------
        dataset : xarray.Dataset
            With the look-up variables and the attributes of `variables`.

        Returns
        -------
        Lookup

        Raises
        ------
        InputError
            If the dataset has no look-up table, or is of an inflow law that has none.
        """
        if dataset.attrs.get("inflow", "momentum") != "momentum":
            raise no_lookup(str(dataset.attrs["inflow"]))
        names = [f"lookup_{name}" for name in TABLES]
        missing = [name for name in names if name not in dataset]
        missing += [name for name in _ATTRIBUTES if name not in dataset.attrs]
        if missing:
            raise InputError("table", f"holds no look-up table of a propeller: {', '.join(missing)} missing")
        order = ("lookup_mach", "lookup_reynolds", "lookup_helix_angle")
        tables = {name: dataset[f"lookup_{name}"].transpose(*order).values for name in TABLES}
        number = {name: float(dataset.attrs[name]) for name in _ATTRIBUTES}
        return cls(
            mach=np.asarray(dataset["lookup_mach"].values, dtype=np.float64),
            reynolds=np.asarray(dataset["lookup_reynolds"].values, dtype=np.float64),
            helix_angle=np.radians(np.asarray(dataset["lookup_helix_angle"].values, dtype=np.float64)),
            **{name: np.asarray(tables[name], dtype=np.float64) for name in TABLES[:-1]},
            status=np.asarray(tables["status"], dtype=np.int16),
            diameter=number["diameter"],
            chord_75=number["chord_75"],
            air=Air(number["air_density"], number["air_viscosity"], number["air_speed_of_sound"]),
            tip_divergence_mach=number["tip_divergence_mach"],
            section_guessed=bool(number["section_guessed"]),
        )


def no_lookup(inflow: str) -> InputError:
    """Return what to say where a look-up table is asked of an inflow law that has none.

    Parameters
    ----------
    inflow : str
        The law.

    Returns
    -------
    InputError
        To be raised.
    """
    return InputError(
        "model.inflow",
        f'"{inflow}" serves tables of moving air only: a look-up, and with it the envelope, has to reach from standing '
        'still to a stopped propeller; use inflow = "momentum"',
    )


_ATTRIBUTES = (
    "diameter",
    "chord_75",
    "air_density",
    "air_viscosity",
    "air_speed_of_sound",
    "tip_divergence_mach",
    "section_guessed",
)


def _place(nodes: FloatArray, at: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    """Return the cell of each position, and how far it lies in it: beyond 0 to 1 outside of the nodes."""
    cell = nodes[1:-1].searchsorted(at, side="right")
    left = nodes[cell]
    return cell, (at - left) / (nodes[cell + 1] - left)


def _bridged(x: FloatArray, y: FloatArray) -> FloatArray:
    """Bridge missing values along the last axis, for the slopes of their neighbours; their own cells stay unknown."""
    rows = y.reshape(-1, x.size).copy()
    for index in np.flatnonzero(np.isnan(rows).any(axis=1)):
        known = np.isfinite(rows[index])
        rows[index, ~known] = np.interp(x[~known], x[known], rows[index, known]) if known.any() else 0.0
    return rows.reshape(y.shape)


def _worst_of_cells(status: StatusArray) -> StatusArray:
    """Return the worst status of the eight nodes of each cell, laid out as the cells: rows that end a cell stay 0."""
    worst = np.zeros((*status.shape[:2], status.shape[2] - 1), dtype=np.int16)
    along = np.maximum(status[:, :, :-1], status[:, :, 1:])
    pairs = np.maximum(along[:, :-1], along[:, 1:])
    worst[:-1, :-1] = np.maximum(pairs[:-1], pairs[1:])
    return worst.ravel()


def _cubics(x: FloatArray, y: FloatArray) -> FloatArray:
    """Return the four coefficients of each cell's cubic in t from 0 to 1; shape (..., n - 1, 4)."""
    slopes = monotone_slopes(x, y)
    h = np.diff(x)
    left, right, rise = slopes[..., :-1] * h, slopes[..., 1:] * h, np.diff(y, axis=-1)
    return np.stack([y[..., :-1], left, 3.0 * rise - 2.0 * left - right, left + right - 2.0 * rise], axis=-1)
