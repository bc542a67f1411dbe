"""The envelope: operating points over airspeed and throttle, level flight, and the points asked for by name."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.air import Air
from bemt.drive import BarePropeller, Battery, Controller, Drive, Motor, OperatingPoints
from bemt.drive.loads import PropellerLoads
from bemt.drive.roots import FloatArray
from bemt.errors import InputError
from bemt.flight.airframe import Airframe, Installation
from bemt.flight.level import (
    LevelFlight,
    Points,
    Source,
    cost,
    endurance,
    last_fall,
    pitch_speed,
    place_of_largest,
)
from bemt.flight.limits import Limits, describe_limits
from bemt.quantities.checks import ascending_axis, require_positive
from bemt.quantities.dataset import build_dataset
from bemt.quantities.registry import (
    ENVELOPE,
    ENVELOPE_WITHOUT_MOTOR,
    STATUS_NOT_CONVERGED,
    STATUS_NOT_RUN,
    TRUST_NOT_RUN,
    WINDING_CEILING,
)
from bemt.table.validity import trust_in_words

if TYPE_CHECKING:
    import xarray as xr

POINTS = ("static", "cruise", "best_endurance", "best_range", "best_climb", "top_speed")

_DEFAULT_AIRSPEEDS = 61
_DEFAULT_THROTTLES = 19
_DEFAULT_RPMS = 19
_ABOVE_TOP_SPEED = 1.1

# Axes and helpers of the points, which are no results of their own.
_RESULT_NAMES = {field.name for field in fields(OperatingPoints)} - {"airspeed", "throttle", "duty"}

Values = dict[str, NDArray[Any]]


@dataclass(frozen=True, eq=False)
class EnvelopeResult:
    """An envelope as plain arrays, by the names of the registry.

    Parameters
    ----------
    airspeed : numpy.ndarray, shape (n_airspeed,)
        [m/s].
    throttle : numpy.ndarray, shape (n_throttle,), or None
        Stick, 0 to 1; None without a motor.
    rpm : numpy.ndarray, shape (n_rpm,), or None
        Second axis without a motor, otherwise None.
    values : mapping of str to numpy.ndarray
        Operating points over (airspeed, throttle) or (airspeed, rpm), `level_*`, drag, endurance, range and climb rate
        over airspeed where there is an airframe, `point_*` over the points.
    points : tuple of str
        Names of the points.
    notes : tuple of str
        What a reader should know, in words: limits that bind, points that could not be found.
    """

    airspeed: FloatArray
    throttle: FloatArray | None
    rpm: FloatArray | None
    values: Mapping[str, NDArray[Any]]
    points: tuple[str, ...]
    notes: tuple[str, ...]

    def to_dataset(self, attrs: Mapping[str, Any]) -> xr.Dataset:
        """Label the arrays.

        Parameters
        ----------
        attrs : mapping
            Attributes of the dataset; notes of the envelope are added to any there.

        Returns
        -------
        xarray.Dataset
        """
        coordinates: dict[str, NDArray[Any]] = {"airspeed": self.airspeed}
        if self.throttle is not None:
            coordinates["throttle"] = self.throttle
        if self.rpm is not None:
            coordinates["rpm"] = self.rpm
        coordinates["point"] = np.array(self.points)
        group = ENVELOPE if self.rpm is None else ENVELOPE_WITHOUT_MOTOR
        notes = "\n".join(part for part in (str(attrs.get("notes", "")), *self.notes) if part)
        axes = {"V": self.airspeed} | {
            name: axis for name, axis in (("throttle", self.throttle), ("rpm", self.rpm)) if axis is not None
        }
        trust = "\n".join(trust_in_words(self.values["trust"], self.values["trust_reasons"], axes))
        merged = {**attrs, "trust": trust, **({"notes": notes} if notes else {})}
        return build_dataset(group, self.values, coordinates, merged)


def build_envelope(
    lookup: PropellerLoads,
    air: Air,
    *,
    motor: Motor | None = None,
    controller: Controller | None = None,
    battery: Battery | None = None,
    airframe: Airframe | None = None,
    installation: Installation | None = None,
    rpm_limit: float | None = None,
    airspeed: ArrayLike | None = None,
    throttle: ArrayLike | None = None,
    rpm: ArrayLike | None = None,
) -> EnvelopeResult:
    """Find what a propeller does on a motor, controller, battery and airframe.

    Parameters
    ----------
    lookup : PropellerLoads
        Loads of one propeller at any airspeed and rpm.
    air : Air
        Air of all points.
    motor : Motor, optional
        Without one the envelope runs over airspeed and rpm and stops at shaft power.
    controller : Controller, optional
        Without one an ideal controller.
    battery : Battery, optional
        Needed with a motor.
    airframe : Airframe, optional
        Without one there is no level flight, and standing still is the only named point.
    installation : Installation, optional
        Without one a free propeller.
    rpm_limit : float, optional
        Printed on the propeller.
    airspeed : array_like, shape (n_airspeed,), optional
        Axis [m/s], ascending; default `default_airspeed`.
    throttle : array_like, shape (n_throttle,), optional
        Axis, 0 to 1, ascending; default `default_throttle`.
    rpm : array_like, shape (n_rpm,), optional
        Axis without a motor, above zero, ascending; default up to the rpm limit. The largest takes the place of full
        throttle.

    Returns
    -------
    EnvelopeResult
        NaN where there is no equilibrium, no level flight or no meaning; a winding temperature is infinite where it
        would rise without end.

    Raises
    ------
    InputError
        If an axis is no axis, a motor has no battery, or there is neither a motor nor an rpm axis nor an rpm limit.

    Notes
    -----
    The named points do not depend on the axes asked for: they are searched between the slowest level flight and the top
    speed and refined. Without a motor, best endurance and range are those of least shaft power, per time and distance.
    """
    if rpm_limit is not None:
        require_positive("rpm_limit", rpm_limit, "rpm")
    fitted = installation or Installation()
    source = _source(lookup, air, motor, controller, battery, fitted, rpm, rpm_limit)
    limits = Limits.of(source, rpm_limit) if isinstance(source, Drive) else Limits(rpm=rpm_limit)
    flight = None if airframe is None else LevelFlight(source, airframe, air.density, fitted.thrust_factor)
    top_speed, end = (math.nan, math.nan) if flight is None else flight.fastest()
    airspeed_axis = _default_axis(source, end) if airspeed is None else ascending_axis("airspeed", airspeed)

    grid: Points
    throttle_axis, rpm_axis = None, None
    if isinstance(source, Drive):
        throttle_axis = default_throttle() if throttle is None else ascending_axis("throttle", throttle)
        grid = source.at_throttle(airspeed_axis[:, np.newaxis], throttle_axis)
        values = _named(grid, _RESULT_NAMES) | limits.margins(grid)
    else:
        rpm_axis = _rpm_axis(rpm, rpm_limit)
        grid = source.at_rpm(airspeed_axis[:, np.newaxis], rpm_axis)
        values = _named(grid, _RESULT_NAMES - {"rpm"})
    notes = _grid_notes(grid)

    if flight is not None:
        values |= _level_values(flight, airspeed_axis, limits, battery)
        notes += _flight_notes(flight, top_speed, end)
    point_values, point_notes = _point_values(source, flight, top_speed, end, limits, battery)
    values |= point_values
    notes += point_notes
    if throttle_axis is not None:
        notes += describe_limits(limits, airspeed_axis, throttle_axis, values)
    points = POINTS if flight is not None else POINTS[:1]
    if isinstance(source, Drive):
        notes += _winding_notes(source, values, points)
    return EnvelopeResult(airspeed_axis, throttle_axis, rpm_axis, values, points, tuple(notes))


def default_throttle() -> FloatArray:
    """Return the throttle axis used where a case gives none.

    Returns
    -------
    numpy.ndarray, shape (19,)
        0.1 to 1.
    """
    return np.linspace(0.1, 1.0, _DEFAULT_THROTTLES)


def default_airspeed(
    lookup: PropellerLoads,
    air: Air,
    *,
    motor: Motor | None = None,
    controller: Controller | None = None,
    battery: Battery | None = None,
    airframe: Airframe | None = None,
    installation: Installation | None = None,
    rpm_limit: float | None = None,
    rpm: ArrayLike | None = None,
) -> FloatArray:
    """Return the airspeed axis used where a case gives none.

    Parameters
    ----------
    lookup, air, motor, controller, battery, airframe, installation, rpm_limit, rpm
        As for `build_envelope`.

    Returns
    -------
    numpy.ndarray, shape (61,)
        From 0 to a tenth above the top speed, or, where there is none, above the airspeed of zero thrust at full
        throttle; the end is a whole number of m/s.

    Raises
    ------
    InputError
        As `build_envelope`.
    """
    fitted = installation or Installation()
    source = _source(lookup, air, motor, controller, battery, fitted, rpm, rpm_limit)
    flight = None if airframe is None else LevelFlight(source, airframe, air.density, fitted.thrust_factor)
    return _default_axis(source, math.nan if flight is None else flight.fastest()[1])


def _default_axis(source: Source, end: float) -> FloatArray:
    if math.isnan(end):
        _, end = last_fall(lambda airspeed: source.at_full(airspeed).thrust, 0.0, pitch_speed(source))
    if math.isnan(end) or end == 0.0:
        end = pitch_speed(source)
    return np.linspace(0.0, math.ceil(_ABOVE_TOP_SPEED * end), _DEFAULT_AIRSPEEDS)


def _source(
    lookup: PropellerLoads,
    air: Air,
    motor: Motor | None,
    controller: Controller | None,
    battery: Battery | None,
    installation: Installation,
    rpm: ArrayLike | None,
    rpm_limit: float | None,
) -> Source:
    if motor is None:
        return BarePropeller(lookup, float(_rpm_axis(rpm, rpm_limit)[-1]), air, installation.inflow_factor)
    if battery is None:
        raise InputError("battery", "an envelope with a motor needs a battery")
    return Drive(
        lookup,
        motor,
        battery,
        controller or Controller(),
        air,
        installation.inflow_factor,
        installation.thrust_factor,
    )


def _rpm_axis(rpm: ArrayLike | None, rpm_limit: float | None) -> FloatArray:
    if rpm is None:
        if rpm_limit is None:
            raise InputError("rpm", "an envelope without a motor needs an rpm axis or the propeller's rpm limit")
        return np.linspace(0.1, 1.0, _DEFAULT_RPMS) * rpm_limit
    axis = ascending_axis("rpm", rpm)
    if axis[0] == 0.0:
        raise InputError("rpm", "an envelope without a motor needs a turning propeller: rpm above zero")
    return axis


def _named(points: Points, names: set[str], prefix: str = "") -> Values:
    return {prefix + field.name: getattr(points, field.name) for field in fields(points) if field.name in names}


def _level_values(flight: LevelFlight, airspeed: FloatArray, limits: Limits, battery: Battery | None) -> Values:
    points = flight.at(airspeed)
    values = _flying(points, limits, "level_")
    values["drag"] = flight.drag(airspeed)
    values["climb_rate"] = flight.climb_rate(airspeed)
    if isinstance(points, OperatingPoints):
        values["level_throttle"] = points.throttle
        values["endurance"] = endurance(points, battery)
        values["range"] = values["endurance"] * airspeed
    return values


def _flying(points: Points, limits: Limits, prefix: str) -> Values:
    """Return points that need not exist: where there is none, status and trust say "not run"."""
    values = _named(points, _RESULT_NAMES, prefix)
    for name, blank in (("status", STATUS_NOT_RUN), ("trust", TRUST_NOT_RUN), ("trust_reasons", 0)):
        values[prefix + name] = np.where(np.isnan(points.rpm), blank, getattr(points, name)).astype(np.int16)
    return values | {prefix + name: margin for name, margin in limits.margins(points).items()}


def _point_values(
    source: Source,
    flight: LevelFlight | None,
    top_speed: float,
    end: float,
    limits: Limits,
    battery: Battery | None,
) -> tuple[Values, list[str]]:
    if flight is None:
        standing = source.at_full(np.zeros(1))
        return _point_table(standing, np.zeros(1), limits, battery, np.full(1, np.nan), level=[]), []

    notes = []
    slow, far, climb = _outstanding_airspeeds(flight, end)
    cruise = far if flight.airframe.cruise_speed is None else flight.airframe.cruise_speed
    airspeed = np.array([0.0, cruise, slow, far, climb, top_speed])
    level_points = [POINTS.index(name) for name in ("cruise", "best_endurance", "best_range")]
    full_points = [POINTS.index(name) for name in ("static", "best_climb", "top_speed")]
    points = _merge(
        airspeed.size,
        (level_points, flight.at(airspeed[level_points])),
        (full_points, _at_known(source, airspeed[full_points])),
    )
    climbs = POINTS.index("best_climb")
    climb_rate = np.full(airspeed.size, np.nan)
    if np.isfinite(climb):
        climb_rate[climbs] = flight.climb_rate(airspeed[climbs : climbs + 1])[0]
    if flight.airframe.cruise_speed is None and np.isfinite(cruise):
        notes.append(f"no cruise speed given: the point cruise is that of best range, {cruise:.1f} m/s")
    elif np.isnan(points.rpm[1]) and np.isfinite(cruise):
        notes.append(f"no level flight at the cruise speed of {cruise:.1f} m/s")
    level = [*level_points, POINTS.index("top_speed")]
    return _point_table(points, airspeed, limits, battery, climb_rate, level=level), notes


def _outstanding_airspeeds(flight: LevelFlight, end: float) -> tuple[float, float, float]:
    """Return the airspeeds of best endurance, best range and best climb [m/s], NaN without level flight."""
    if math.isnan(end):
        return math.nan, math.nan, math.nan
    axis = flight.axis_of_flight(end)
    drawn = cost(flight.at(axis))
    climb_rate = flight.climb_rate(axis)
    return (
        place_of_largest(axis, -drawn),
        place_of_largest(axis, axis / drawn),
        place_of_largest(axis, np.where(climb_rate > 0.0, climb_rate, np.nan)),
    )


def _at_known(source: Source, airspeed: FloatArray) -> Points:
    """Return points at full throttle, NaN where the airspeed is missing."""
    known = np.flatnonzero(np.isfinite(airspeed))
    return _merge(airspeed.size, (list(known), source.at_full(airspeed[known])))


def _merge(size: int, *parts: tuple[list[int], Points]) -> Points:
    """Put points of several calls into one, each at its places; places never filled are NaN and "not run"."""
    kind = type(parts[0][1])
    merged: Values = {}
    for field in fields(kind):
        coded = getattr(parts[0][1], field.name).dtype.kind == "i"
        column = np.zeros(size, dtype=np.int16) if coded else np.full(size, np.nan)
        for places, points in parts:
            column[places] = getattr(points, field.name)
        merged[field.name] = column
    return kind(**merged)


def _point_table(
    points: Points,
    airspeed: FloatArray,
    limits: Limits,
    battery: Battery | None,
    climb_rate: FloatArray,
    level: list[int],
) -> Values:
    values = _flying(points, limits, "point_")
    values["point_airspeed"] = airspeed
    values["point_climb_rate"] = climb_rate
    if isinstance(points, OperatingPoints):
        is_level = np.isin(np.arange(airspeed.size), level)
        values["point_throttle"] = points.throttle
        values["point_endurance"] = np.where(is_level, endurance(points, battery), np.nan)
        values["point_range"] = values["point_endurance"] * airspeed
    return values


def _grid_notes(grid: Points) -> list[str]:
    notes = []
    missing = int(np.count_nonzero(grid.status == STATUS_NOT_CONVERGED))
    if missing:
        notes.append(
            f"{missing} of {grid.rpm.size} points: no equilibrium inside the propeller's table, values missing"
        )
    still = int(np.count_nonzero(grid.rpm == 0.0))
    if still:
        notes.append(f"the propeller stands still (rpm 0) at {still} of {grid.rpm.size} points")
    if isinstance(grid, OperatingPoints):
        beyond = int(np.count_nonzero((grid.motor_current == 0.0) & (grid.motor_voltage > grid.battery_voltage)))
        if beyond:
            notes.append(
                f"at {beyond} of {grid.rpm.size} points the wind drives the motor above the battery's voltage: "
                "the current its controller's diodes would then pass is left out"
            )
    return notes


def _flight_notes(flight: LevelFlight, top_speed: float, end: float) -> list[str]:
    notes = []
    stall = flight.airframe.stall_speed(flight.density)
    if stall is not None:
        notes.append(f"no level flight below the stall speed of {stall:.1f} m/s")
    if math.isnan(end):
        notes.append("no level flight: the drag exceeds the thrust at full throttle at every airspeed")
    elif math.isnan(top_speed):
        notes.append(
            f"top speed not known: thrust exceeds drag up to {end:.1f} m/s, "
            "where the table of the drag or of the propeller ends"
        )
    return notes


def _winding_notes(drive: Drive, values: Values, points: tuple[str, ...]) -> list[str]:
    """Say at which named points the winding gets too hot, and where its temperature is not known."""
    if not drive.models_winding:
        if drive.motor.thermal_resistance is None:
            return []
        return ["no winding temperature: it needs the temperature of the air, and the case gives a density instead"]
    temperature = values["point_winding_temperature"]
    named = [(name.replace("_", " "), float(value)) for name, value in zip(points, temperature, strict=True)]
    settles = [f"{value:.0f} degC ({name})" for name, value in named if WINDING_CEILING < value < math.inf]
    endless = [name for name, value in named if value == math.inf]
    words = []
    if settles:
        words.append(f"settles at {', '.join(settles)}")
    if endless:
        words.append(f"overheats without end ({', '.join(endless)})")
    if not words:
        return []
    stands = "enamel and magnets commonly stand 120 to 150 degC (common practice, no source)"
    return [f"held there, the winding {' and '.join(words)}; {stands}"]
