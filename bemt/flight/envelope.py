"""The envelope: operating points over airspeed and throttle, level flight, and the points asked for by name."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, fields, replace
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.air import Air
from bemt.drive import BarePropeller, Battery, Controller, Drive, Motor, OperatingPoints
from bemt.drive.discharge import drain_time_at_throttle
from bemt.drive.loads import PropellerLoads
from bemt.drive.roots import FloatArray
from bemt.errors import InputError
from bemt.flight.airframe import Airframe, Installation, Multirotor
from bemt.flight.decisions import describe_flight
from bemt.flight.hover import UprightFlight, figure_of_merit
from bemt.flight.level import (
    LevelFlight,
    Points,
    Source,
    ends_at_full_throttle,
    endurance,
    last_fall,
    pitch_speed,
    place_of_largest,
    staying_power,
)
from bemt.flight.limits import Limits, describe_first_limit, describe_limits
from bemt.flight.unpowered import unpowered_drag
from bemt.quantities.checks import ascending_axis, require_positive
from bemt.quantities.dataset import build_dataset
from bemt.quantities.registry import (
    ENVELOPE,
    ENVELOPE_HOVER,
    ENVELOPE_HOVER_WITHOUT_MOTOR,
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
HOVER_POINTS = ("static", "hover", "best_climb")
_AT_FULL = ("static", "best_climb", "top_speed")

_DEFAULT_AIRSPEEDS = 61
_DEFAULT_THROTTLES = 19
_DEFAULT_RPMS = 19
_LIMIT_THROTTLES = 41
_ABOVE_TOP_SPEED = 1.1

# Axes and helpers of the points, which are no results of their own.
_RESULT_NAMES = {field.name for field in fields(OperatingPoints)} - {"airspeed", "throttle", "duty"}

Values = dict[str, NDArray[Any]]
Steady = LevelFlight | UprightFlight


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
    decisions : tuple of str
        What a builder decides by, in words.
    hovers : bool
        Whether the airframe has no wing: the airspeed is then that of climbing straight up.
    """

    airspeed: FloatArray
    throttle: FloatArray | None
    rpm: FloatArray | None
    values: Mapping[str, NDArray[Any]]
    points: tuple[str, ...]
    notes: tuple[str, ...]
    decisions: tuple[str, ...] = ()
    hovers: bool = False

    def to_dataset(self, attrs: Mapping[str, Any]) -> xr.Dataset:
        """Label the arrays.

        Parameters
        ----------
        attrs : mapping
            Attributes of the dataset; notes of the envelope are added to any there, and `decisions`.

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
        if self.hovers:
            group = ENVELOPE_HOVER if self.rpm is None else ENVELOPE_HOVER_WITHOUT_MOTOR
        else:
            group = ENVELOPE if self.rpm is None else ENVELOPE_WITHOUT_MOTOR
        notes = "\n".join(part for part in (str(attrs.get("notes", "")), *self.notes) if part)
        axes = {"V": self.airspeed} | {
            name: axis for name, axis in (("throttle", self.throttle), ("rpm", self.rpm)) if axis is not None
        }
        trust = "\n".join(trust_in_words(self.values["trust"], self.values["trust_reasons"], axes))
        said = {"notes": notes, "decisions": "\n".join(self.decisions)}
        merged = {**attrs, "trust": trust, **{name: words for name, words in said.items() if words}}
        return build_dataset(group, self.values, coordinates, merged)


def build_envelope(
    lookup: PropellerLoads,
    air: Air,
    *,
    motor: Motor | None = None,
    controller: Controller | None = None,
    battery: Battery | None = None,
    airframe: Airframe | Multirotor | None = None,
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
    airframe : Airframe or Multirotor, optional
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
    For a multirotor the airspeed is that of climbing straight up, `level_*` the steady climb at it, hovering at 0;
    without a motor one propeller carries the whole mass.
    """
    if rpm_limit is not None:
        require_positive("rpm_limit", rpm_limit, "rpm")
    fitted = installation or Installation()
    source = _source(lookup, air, motor, controller, battery, fitted, rpm, rpm_limit)
    limits = Limits.of(source, rpm_limit) if isinstance(source, Drive) else Limits(rpm=rpm_limit)
    steady = _steady(source, airframe, air, fitted)
    fastest, end = (math.nan, math.nan) if steady is None else steady.fastest()
    airspeed_axis = _default_axis(source, end) if airspeed is None else ascending_axis("airspeed", airspeed)

    grid: Points
    throttle_axis, rpm_axis = None, None
    if isinstance(source, Drive):
        throttle_axis = default_throttle() if throttle is None else ascending_axis("throttle", throttle)
        settings = throttle_axis
        grid = source.at_throttle(airspeed_axis[:, np.newaxis], settings)
        values = _named(grid, _RESULT_NAMES) | limits.margins(grid)
    else:
        rpm_axis = _rpm_axis(rpm, rpm_limit)
        settings = rpm_axis
        grid = source.at_rpm(airspeed_axis[:, np.newaxis], settings)
        values = _named(grid, _RESULT_NAMES - {"rpm"})
    notes = _grid_notes(grid)

    if not isinstance(steady, UprightFlight):
        values |= unpowered_drag(source, airspeed_axis)
    if steady is not None:
        held = steady.at(airspeed_axis)
        values |= _steady_values(steady, held, airspeed_axis, limits)
        if isinstance(steady, LevelFlight):
            values["climb_rate"] = steady.climb_rate(airspeed_axis)
        else:
            values["climb_rate"] = steady.climb_rate(settings)
        notes += _flight_notes(steady, fastest, end)
        notes += _endurance_notes(steady, held)
    names, points, point_notes = _named_points(source, steady, fastest, end)
    values |= _point_table(source, steady, names, points, limits)
    notes += point_notes

    decisions = [] if steady is None else list(describe_flight(steady, points, names))
    if throttle_axis is not None:
        decisions += _first_limit(source, steady, end, limits)
        notes += describe_limits(limits, airspeed_axis, throttle_axis, values)
    if isinstance(source, Drive):
        notes += _winding_notes(source, values, names)
    hovers = isinstance(steady, UprightFlight)
    return EnvelopeResult(airspeed_axis, throttle_axis, rpm_axis, values, names, tuple(notes), tuple(decisions), hovers)


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
    airframe: Airframe | Multirotor | None = None,
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
        From 0 to a tenth above the top speed or the fastest climb, or, where there is none, above the airspeed of zero
        thrust at full throttle; the end is a whole number of m/s.

    Raises
    ------
    InputError
        As `build_envelope`.
    """
    fitted = installation or Installation()
    source = _source(lookup, air, motor, controller, battery, fitted, rpm, rpm_limit)
    steady = _steady(source, airframe, air, fitted)
    return _default_axis(source, math.nan if steady is None else steady.fastest()[1])


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


def _steady(
    source: Source, airframe: Airframe | Multirotor | None, air: Air, installation: Installation
) -> Steady | None:
    if airframe is None:
        return None
    if isinstance(airframe, Multirotor):
        return UprightFlight(source, airframe, installation.thrust_factor)
    return LevelFlight(source, airframe, air.density, installation.thrust_factor)


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


def _steady_values(steady: Steady, points: Points, airspeed: FloatArray, limits: Limits) -> Values:
    values = _flying(points, limits, "level_")
    values["drag"] = steady.drag(airspeed)
    values["required_thrust"] = steady.required_thrust(airspeed)
    if isinstance(points, OperatingPoints):
        values["level_throttle"] = points.throttle
        values["endurance"] = endurance(steady.source, points)
        if isinstance(steady, LevelFlight):
            values["range"] = values["endurance"] * airspeed
    return values


def _flying(points: Points, limits: Limits, prefix: str) -> Values:
    """Return points that need not exist: where there is none, status and trust say "not run"."""
    values = _named(points, _RESULT_NAMES, prefix)
    for name, blank in (("status", STATUS_NOT_RUN), ("trust", TRUST_NOT_RUN), ("trust_reasons", 0)):
        values[prefix + name] = np.where(np.isnan(points.rpm), blank, getattr(points, name)).astype(np.int16)
    return values | {prefix + name: margin for name, margin in limits.margins(points).items()}


def _named_points(
    source: Source, steady: Steady | None, fastest: float, end: float
) -> tuple[tuple[str, ...], Points, list[str]]:
    """Return the names, the points, and what is to be said of those that are not as asked for."""
    notes: list[str] = []
    if steady is None:
        return POINTS[:1], source.at_full(np.zeros(1)), notes
    names: tuple[str, ...]
    if isinstance(steady, UprightFlight):
        names, speeds = HOVER_POINTS, {"static": 0.0, "hover": 0.0, "best_climb": fastest}
    else:
        slow, far, climb = _outstanding_airspeeds(steady, end)
        cruise = far if steady.airframe.cruise_speed is None else steady.airframe.cruise_speed
        names, speeds = POINTS, dict(zip(POINTS, (0.0, cruise, slow, far, climb, fastest), strict=True))
    airspeed = np.array([speeds[name] for name in names])
    full = [k for k, name in enumerate(names) if name in _AT_FULL]
    held = [k for k, name in enumerate(names) if name not in _AT_FULL]
    points = _merge(airspeed.size, (held, steady.at(airspeed[held])), (full, _at_known(source, airspeed[full])))
    points = replace(points, airspeed=airspeed)
    if isinstance(steady, LevelFlight):
        if steady.airframe.cruise_speed is None and np.isfinite(cruise):
            notes.append(f"no cruise speed given: the point cruise is that of best range, {cruise:.1f} m/s")
        elif np.isnan(points.rpm[names.index("cruise")]) and np.isfinite(cruise):
            notes.append(f"no level flight at the cruise speed of {cruise:.1f} m/s")
    return names, points, notes


def _outstanding_airspeeds(flight: LevelFlight, end: float) -> tuple[float, float, float]:
    """Return the airspeeds of best endurance, best range and best climb [m/s], NaN without level flight."""
    if math.isnan(end):
        return math.nan, math.nan, math.nan
    axis = flight.axis_of_flight(end)
    staying = staying_power(flight.source, flight.at(axis))
    climb_rate = flight.climb_rate(axis)
    return (
        place_of_largest(axis, staying),
        place_of_largest(axis, axis * staying),
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
    source: Source, steady: Steady | None, names: tuple[str, ...], points: Points, limits: Limits
) -> Values:
    values = _flying(points, limits, "point_")
    airspeed = points.airspeed
    at_full = np.isin(names, _AT_FULL)
    values["point_airspeed"] = airspeed
    if isinstance(source, Drive) and isinstance(points, OperatingPoints):
        values["point_throttle"] = points.throttle
        values["point_drain_time"] = np.full(airspeed.shape, np.nan)
        there = at_full & np.isfinite(airspeed)
        values["point_drain_time"][there] = drain_time_at_throttle(source, airspeed[there], 1.0)
        if steady is not None:
            values["point_endurance"] = np.where(at_full, np.nan, endurance(source, points))
    if steady is None:
        return values
    values["point_thrust_to_weight"] = steady.thrust_factor * points.thrust / steady.airframe.weight
    values["point_climb_rate"] = np.full(airspeed.shape, np.nan)
    climb = names.index("best_climb")
    if isinstance(steady, LevelFlight):
        if "point_endurance" in values:
            values["point_range"] = values["point_endurance"] * airspeed
        if np.isfinite(airspeed[climb]):
            values["point_climb_rate"][climb] = steady.climb_rate(airspeed[climb : climb + 1])[0]
    else:
        values["point_climb_rate"][climb] = airspeed[climb]
        air = source.air or source.propeller.air
        values["point_figure_of_merit"] = figure_of_merit(points, source.count, source.propeller.diameter, air.density)
    return values


def _first_limit(source: Source, steady: Steady | None, end: float, limits: Limits) -> list[str]:
    """Say which limit is passed first; on axes of its own, as the named points."""
    if not isinstance(source, Drive):
        return []
    standing = source.at_throttle(0.0, np.linspace(0.0, 1.0, _LIMIT_THROTTLES))
    if steady is None or math.isnan(end):
        return [describe_first_limit(limits, standing)]
    upright = isinstance(steady, UprightFlight)
    held = steady.at(steady.axis_of_flight(end))
    assert isinstance(held, OperatingPoints)  # of a drive
    return [describe_first_limit(limits, standing, held, "hover and climb" if upright else "level flight")]


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


def _flight_notes(steady: Steady, fastest: float, end: float) -> list[str]:
    notes = []
    if isinstance(steady, UprightFlight):
        if not isinstance(steady.source, Drive):
            notes.append("no motor in the case, so one propeller carries the whole mass: give its share as the mass")
        if math.isnan(end):
            notes.append("it does not hover: weight exceeds the thrust at full throttle")
        elif math.isnan(fastest):
            notes.append(f"fastest climb not known: it still climbs at {end:.1f} m/s, where a table ends")
        if steady.airframe.drag_table is None and not math.isnan(end):
            notes.append("climb rates are without the drag of the airframe: upper ends")
        return notes
    stall = steady.airframe.stall_speed(steady.density)
    if stall is not None:
        notes.append(f"no level flight below the stall speed of {stall:.1f} m/s")
    if math.isnan(end):
        notes.append("no level flight: the drag exceeds the thrust at full throttle at every airspeed")
    elif math.isnan(fastest):
        notes.append(
            f"top speed not known: thrust exceeds drag up to {end:.1f} m/s, "
            "where the table of the drag or of the propeller ends"
        )
    return notes


def _endurance_notes(steady: Steady, held: Points) -> list[str]:
    """Say where the falling voltage ends the flight before the charge does."""
    short = held.airspeed[ends_at_full_throttle(steady.source, held)]
    if short.size == 0:
        return []
    what = "level flight" if isinstance(steady, LevelFlight) else "climb"
    where = f"at {short[0]:.1f} m/s" if short.size == 1 else f"between {short[0]:.1f} and {short[-1]:.1f} m/s"
    return [f"{what} {where} ends before the usable charge: full throttle no longer holds it at the falling voltage"]


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
