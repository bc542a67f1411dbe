"""Reading measured points of a propeller: a thrust stand, a wind tunnel, a log of telemetry."""

from __future__ import annotations

import math
import os
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air, standard_air
from bemt.case.complaints import Complaints
from bemt.case.tables import UNCERTAINTY, Column, Sheet, read_sheet
from bemt.case.units import (
    CURRENT,
    DENSITY,
    FORCE,
    POWER,
    PRESSURE,
    SPEED,
    TEMPERATURE,
    TORQUE,
    VOLTAGE,
)
from bemt.errors import CaseError, InputError
from bemt.quantities.checks import require_positive

FloatArray = NDArray[np.float64]

# Pure ratios come first: thrust_coefficient is no thrust in a unit "coefficient".
_COLUMNS = (
    Column("rpm"),
    Column("electrical_rpm"),
    Column("pole_pairs"),
    Column("advance_ratio"),
    Column("thrust_coefficient"),
    Column("power_coefficient"),
    Column("efficiency"),
    Column("duty"),
    Column("airspeed", SPEED),
    Column("thrust", FORCE),
    Column("torque", TORQUE),
    Column("shaft_power", POWER),
    Column("voltage", VOLTAGE),
    Column("current", CURRENT),
    Column("electric_power", POWER),
    Column("air_density", DENSITY),
    Column("temperature", TEMPERATURE),
    Column("pressure", PRESSURE),
)
_SPELLING = {column.name: column.spelling for column in _COLUMNS}

_EITHER = (
    ("rpm", "electrical_rpm"),
    ("airspeed", "advance_ratio"),
    ("thrust", "thrust_coefficient"),
    ("torque", "shaft_power", "power_coefficient"),
    ("air_density", "temperature"),
    ("air_density", "pressure"),
)
"""Columns that say the same thing, of which a file has one."""

_TOGETHER = (("electrical_rpm", "pole_pairs"), ("temperature", "pressure"))
"""Columns of no use without each other."""

_POSITIVE = ("rpm", "electrical_rpm", "air_density", "pressure")
_NOT_NEGATIVE = ("airspeed", "advance_ratio", "voltage")

_ALWAYS = ("rpm", "airspeed", "density", "viscosity", "speed_of_sound")

MEASURED = ("thrust", "torque", "voltage", "current", "duty", "electric_power")
"""Fields of `Readings` that are there only where a file has them."""

NO_AIR = "no air is given with the readings (air_density_kg_m3, or temperature_degC and pressure_hPa): {air} serves"
EFFICIENCY_UNUSED = "the column efficiency is passed over: it follows from advance ratio, thrust and power"


@dataclass(frozen=True, eq=False)
class Readings:
    """Steady points of a propeller as measured, in SI units.

    Parameters
    ----------
    source : str
        File or files they come from.
    rpm : numpy.ndarray, shape (n,)
        Of the propeller, more than 0.
    airspeed : numpy.ndarray, shape (n,)
        [m/s], 0 standing still.
    density, viscosity, speed_of_sound : numpy.ndarray, shape (n,)
        Of the air of each point [kg/m3], [Pa s], [m/s].
    thrust : numpy.ndarray, shape (n,), optional
        [N]; NaN in the rows of a file that has none.
    torque : numpy.ndarray, shape (n,), optional
        Of the shaft [N m]; NaN likewise.
    voltage, current, electric_power : numpy.ndarray, shape (n,), optional
        Of the supply [V], [A], [W]; NaN likewise.
    duty : numpy.ndarray, shape (n,), optional
        Of the controller, 0 to 1; NaN likewise.
    uncertainties : mapping of str to numpy.ndarray, shape (n,)
        Standard uncertainties by the names of the fields above, in their units; NaN likewise.
    notes : tuple of str
        What a user must be told: air that was taken from elsewhere, columns passed over.
    places : tuple of str, length n or 0
        File and line of each reading, where they come from a file.

    Raises
    ------
    InputError
        If there is no point, shapes differ, or a value is out of its range.
    """

    source: str
    rpm: FloatArray
    airspeed: FloatArray
    density: FloatArray
    viscosity: FloatArray
    speed_of_sound: FloatArray
    thrust: FloatArray | None = None
    torque: FloatArray | None = None
    voltage: FloatArray | None = None
    current: FloatArray | None = None
    electric_power: FloatArray | None = None
    duty: FloatArray | None = None
    uncertainties: Mapping[str, FloatArray] = field(default_factory=dict)
    notes: tuple[str, ...] = ()
    places: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if np.ndim(self.rpm) != 1 or np.size(self.rpm) == 0:
            raise InputError("rpm", "at least one reading is needed")
        for name in (*_ALWAYS, *MEASURED):
            value = getattr(self, name)
            if value is None:
                continue
            array = np.ascontiguousarray(value, dtype=np.float64)
            if array.shape != np.shape(self.rpm):
                raise InputError(name, f"shape {array.shape} does not fit {np.size(self.rpm)} readings")
            object.__setattr__(self, name, array)
        for name in ("rpm", "density", "viscosity", "speed_of_sound"):
            if not ((getattr(self, name) > 0.0) & np.isfinite(getattr(self, name))).all():
                raise InputError(name, "must be more than 0 in every reading")
        if not ((self.airspeed >= 0.0) & np.isfinite(self.airspeed)).all():
            raise InputError("airspeed", "must not be negative")
        if len(self.places) not in (0, np.size(self.rpm)):
            raise InputError("places", f"{len(self.places)} places do not fit {np.size(self.rpm)} readings")

    @property
    def turns(self) -> FloatArray:
        """Revolutions per second [rev/s], shape (n,)."""
        return self.rpm / 60.0

    def only(self, rows: NDArray[np.bool_]) -> Readings:
        """Keep some of the readings.

        Parameters
        ----------
        rows : numpy.ndarray of bool, shape (n,)
            Those to keep, at least one.

        Returns
        -------
        Readings
        """
        kept = {name: getattr(self, name)[rows] for name in _ALWAYS}
        kept |= {name: getattr(self, name)[rows] for name in MEASURED if getattr(self, name) is not None}
        spreads = {name: values[rows] for name, values in self.uncertainties.items()}
        places = tuple(place for place, keep in zip(self.places, rows, strict=False) if keep)
        return replace(self, **kept, uncertainties=spreads, places=places)

    @classmethod
    def joined(cls, parts: Sequence[Readings]) -> Readings:
        """Put the readings of several files together, in their order.

        Parameters
        ----------
        parts : sequence of Readings
            At least one.

        Returns
        -------
        Readings
            What only some of them have is NaN in the rows of the others.
        """
        if len(parts) == 1:
            return parts[0]

        def column(values: Sequence[FloatArray | None]) -> FloatArray | None:
            if all(value is None for value in values):
                return None
            return np.concatenate(
                [
                    np.full(part.rpm.size, np.nan) if value is None else value
                    for part, value in zip(parts, values, strict=True)
                ]
            )

        uncertain = dict.fromkeys(name for part in parts for name in part.uncertainties)
        spreads = {name: column([part.uncertainties.get(name) for part in parts]) for name in uncertain}
        values: dict[str, Any] = {
            **{name: np.concatenate([getattr(part, name) for part in parts]) for name in _ALWAYS},
            **{name: column([getattr(part, name) for part in parts]) for name in MEASURED},
        }
        return cls(
            source=", ".join(part.source for part in parts),
            uncertainties={name: value for name, value in spreads.items() if value is not None},
            notes=tuple(dict.fromkeys(note for part in parts for note in part.notes)),
            places=tuple(place for part in parts for place in part.places) if all(p.places for p in parts) else (),
            **values,
        )


def load_readings(path: str | os.PathLike[str], *, diameter: float, air: Air) -> Readings:
    """Read a CSV file of measured points.

    Parameters
    ----------
    path : str or path-like
        One row a steady point. Columns: `rpm`, or `electrical_rpm` with `pole_pairs`; `airspeed_m_s` or
        `advance_ratio`, neither standing still; `thrust_N` or `thrust_coefficient`; `torque_Nm`, `shaft_power_W` or
        `power_coefficient`; `voltage_V`, `current_A`, `duty`, `electric_power_W`; `air_density_kg_m3`, or
        `temperature_degC` with `pressure_hPa`. Other units of the same quantity serve as well (`thrust_gf`).
        `<name>_u` is the standard uncertainty of `<name>`.
    diameter : float
        Of the propeller that was measured [m]; coefficients and advance ratios need it.
    air : Air
        Serves where the file says nothing of the air, and for viscosity and speed of sound where it gives a density
        alone.

    Returns
    -------
    Readings

    Raises
    ------
    CaseError
        With everything that is wrong in the file.
    InputError
        If the diameter is not above zero.
    """
    require_positive("diameter", diameter, "m")
    complaints = Complaints()
    file = os.fspath(path)
    sheet = read_sheet(Path(path), file, _COLUMNS, complaints, uncertainties=True)
    if sheet is not None:
        _check_columns(sheet, complaints)
        _check_cells(sheet, complaints)
        if not len(complaints):
            found = _to_si(sheet, diameter, air, complaints)
            if found is not None and not len(complaints):
                return found
    complaints.raise_any()
    raise CaseError([])


def _check_columns(sheet: Sheet, complaints: Complaints) -> None:
    """Complain about columns that contradict each other, lack another, or are missing."""
    there = sheet.headers

    def complain(name: str, message: str) -> None:
        complaints.add(sheet.file, sheet.header_line, there.get(name, name), message)

    if "rpm" not in there and "electrical_rpm" not in there:
        complain("rpm", "this column is missing; needed: rpm, or electrical_rpm with pole_pairs")
    for names in _EITHER:
        given = [name for name in names if name in there]
        for extra in given[1:]:
            complain(extra, f"says the same as {there[given[0]]}; give each quantity once")
    for one, other in _TOGETHER:
        for name, missing in ((one, other), (other, one)):
            if name in there and missing not in there:
                complain(name, f"needs a column {_SPELLING[missing]} beside it")
    if not any(name in there for name in ("thrust_coefficient", "power_coefficient", "shaft_power", *MEASURED)):
        complain("thrust", "nothing measured is in this file; give a thrust, a torque or a power")
    for name in there:
        owner = name.removesuffix(UNCERTAINTY)
        if owner != name and owner not in there:
            complain(name, f"is the uncertainty of a column {_SPELLING[owner]}, which is not there")
        elif owner != name and owner in ("pole_pairs", "efficiency"):
            complain(name, f"an uncertainty of {owner} has no use here")


def _check_cells(sheet: Sheet, complaints: Complaints) -> None:
    for name, values in sheet.values.items():
        if name in _POSITIVE:
            sheet.complain_where(values <= 0.0, name, "must be more than 0", complaints)
        elif name in _NOT_NEGATIVE or name.endswith(UNCERTAINTY):
            sheet.complain_where(values < 0.0, name, "must not be negative", complaints)
    if "pole_pairs" in sheet.values:
        pairs = sheet.values["pole_pairs"]
        wrong = np.isfinite(pairs) & ((pairs < 1.0) | (pairs != np.round(pairs)))
        sheet.complain_where(wrong, "pole_pairs", "is no count of pole pairs: 1, 2, 3 ...", complaints)
    if "duty" in sheet.values:
        duty = sheet.values["duty"]
        sheet.complain_where((duty < 0.0) | (duty > 1.0), "duty", "is no share between 0 and 1", complaints)


def _to_si(sheet: Sheet, diameter: float, air: Air, complaints: Complaints) -> Readings | None:
    """Turn ratios into forces and speeds, with the air of each row."""
    values = sheet.values
    notes = [EFFICIENCY_UNUSED] if "efficiency" in values else []
    count = len(sheet.lines)
    density, viscosity, sound = (np.full(count, value) for value in (air.density, air.viscosity, air.speed_of_sound))
    spreads: dict[str, FloatArray] = {}
    if "air_density" in values:
        density = values["air_density"]
        if "air_density_u" in values:
            spreads["density"] = values["air_density_u"]
    elif "temperature" in values:
        states = _states(sheet, complaints)
        if states is None:
            return None
        density = np.array([state.density for state in states])
        viscosity = np.array([state.viscosity for state in states])
        sound = np.array([state.speed_of_sound for state in states])
        shares = [
            values[name + UNCERTAINTY] / values[name]
            for name in ("temperature", "pressure")
            if name + UNCERTAINTY in values
        ]
        if shares:  # by the gas law, the two being independent
            spreads["density"] = density * np.sqrt(np.sum(np.square(shares), axis=0))
    else:
        notes.append(NO_AIR.format(air=f"the case's air, {air.density:.4g} kg/m3,"))

    poles = values.get("pole_pairs", np.ones(count))
    rpm = values["rpm"] if "rpm" in values else values["electrical_rpm"] / poles
    turns = rpm / 60.0
    # What a column's value is times, to be the field of `Readings` that it stands for.
    factors: dict[str, tuple[str, FloatArray | float]] = {
        "rpm": ("rpm", 1.0),
        "electrical_rpm": ("rpm", 1.0 / poles),
        "airspeed": ("airspeed", 1.0),
        "advance_ratio": ("airspeed", turns * diameter),
        "thrust": ("thrust", 1.0),
        "thrust_coefficient": ("thrust", density * turns**2 * diameter**4),
        "torque": ("torque", 1.0),
        "shaft_power": ("torque", 1.0 / (2.0 * math.pi * turns)),
        "power_coefficient": ("torque", density * turns**2 * diameter**5 / (2.0 * math.pi)),
        **{name: (name, 1.0) for name in ("voltage", "current", "electric_power", "duty")},
    }
    measured: dict[str, FloatArray] = {}
    for name, (quantity, factor) in factors.items():
        if name in values:
            measured[quantity] = values[name] * factor
        if name + UNCERTAINTY in values:
            spreads[quantity] = values[name + UNCERTAINTY] * factor
    return Readings(
        source=sheet.file,
        rpm=measured.pop("rpm"),
        airspeed=measured.pop("airspeed", np.zeros(count)),
        density=density,
        viscosity=viscosity,
        speed_of_sound=sound,
        uncertainties=spreads,
        notes=tuple(notes),
        places=tuple(f"{sheet.file}:{line}" for line in sheet.lines),
        **measured,
    )


def _states(sheet: Sheet, complaints: Complaints) -> list[Air] | None:
    """Air of every row from its temperature and pressure; None where one is no weather."""
    before = len(complaints)
    states = []
    for row, line in enumerate(sheet.lines):
        temperature, pressure = (float(sheet.values[name][row]) for name in ("temperature", "pressure"))
        try:
            states.append(standard_air(temperature=temperature, pressure=pressure))
        except InputError as error:
            complaints.add(sheet.file, line, sheet.headers.get(error.field, error.field), error.message)
    return states if len(complaints) == before else None
