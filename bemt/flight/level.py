"""Level flight and climb of an airframe on its drive, and the airspeeds that stand out."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from bemt.drive import BarePropeller, Drive, OperatingPoints, ShaftPoints
from bemt.drive.circuit import duty_for
from bemt.drive.discharge import hold_time
from bemt.drive.loads import RPM_PER_RAD_S
from bemt.drive.roots import FloatArray, bracketed_root
from bemt.flight.airframe import Airframe

Source = Drive | BarePropeller
Points = OperatingPoints | ShaftPoints

_SEARCH_NODES = 31
_PEAK_NODES = 81
_WIDENING = 1.5
_MOST_WIDENINGS = 8


@dataclass(frozen=True, eq=False)
class LevelFlight:
    """An airframe pulled by a drive, or by a propeller whose drive is not known.

    Parameters
    ----------
    source : Drive or BarePropeller
        What gives the thrust.
    airframe : Airframe
        What needs it.
    density : float
        Of the air [kg/m3].
    thrust_factor : float
        Share of the propellers' thrust that reaches the airframe.
    """

    source: Source
    airframe: Airframe
    density: float
    thrust_factor: float

    def drag(self, airspeed: FloatArray) -> FloatArray:
        """Return the drag in level flight [N], NaN where there is none.

        Parameters
        ----------
        airspeed : numpy.ndarray
            [m/s].

        Returns
        -------
        numpy.ndarray
            Shape of `airspeed`.
        """
        return self.airframe.drag(airspeed, self.density)

    def at(self, airspeed: FloatArray) -> Points:
        """Return the points at which thrust equals drag.

        Parameters
        ----------
        airspeed : numpy.ndarray
            [m/s].

        Returns
        -------
        OperatingPoints or ShaftPoints
            Shape of `airspeed`; NaN where there is no level flight.
        """
        return self.source.at_thrust(airspeed, self.required_thrust(airspeed))

    def required_thrust(self, airspeed: FloatArray) -> FloatArray:
        """Return the thrust of all propellers that level flight needs [N].

        Parameters
        ----------
        airspeed : numpy.ndarray
            [m/s].

        Returns
        -------
        numpy.ndarray
            Drag over the thrust factor, shape of `airspeed`.
        """
        found: FloatArray = self.drag(airspeed) / self.thrust_factor
        return found

    def surplus(self, airspeed: FloatArray) -> FloatArray:
        """Return thrust less drag at full throttle, or at the highest rpm [N].

        Parameters
        ----------
        airspeed : numpy.ndarray
            [m/s].

        Returns
        -------
        numpy.ndarray
            Shape of `airspeed`.
        """
        return self.thrust_factor * self.source.at_full(airspeed).thrust - self.drag(airspeed)

    def climb_rate(self, airspeed: FloatArray) -> FloatArray:
        """Return the steady rate of climb at full throttle, or at the highest rpm [m/s].

        Parameters
        ----------
        airspeed : numpy.ndarray
            [m/s].

        Returns
        -------
        numpy.ndarray
            (T - D) V/(m g) with the drag of level flight, which holds for climb angles up to some 20 degrees; negative
            where the aircraft sinks.
        """
        found: FloatArray = self.surplus(airspeed) * airspeed / self.airframe.weight
        return found

    def fastest(self) -> tuple[float, float]:
        """Return the top speed and the end of level flight.

        Returns
        -------
        top_speed : float
            Largest airspeed at which full thrust still equals the drag [m/s]; NaN where it is not reached or not known.
        end : float
            The same, or the end of the drag table or of the propeller's table where that comes first; NaN where there
            is no level flight at all.
        """
        slowest = self.airframe.slowest(self.density)
        return last_fall(self.surplus, slowest, max(pitch_speed(self.source), 1.5 * slowest), self.airframe.fastest)

    def axis_of_flight(self, end: float) -> FloatArray:
        """Return airspeeds from the slowest level flight to an end.

        Parameters
        ----------
        end : float
            [m/s].

        Returns
        -------
        numpy.ndarray, shape (n,)
            Evenly spaced [m/s].
        """
        slowest = self.airframe.slowest(self.density)
        if slowest > 0.0:
            return np.linspace(slowest, end, _PEAK_NODES)
        return np.linspace(0.0, end, _PEAK_NODES + 1)[1:]


def endurance(source: Source, points: Points) -> FloatArray:
    """Return the time for which points can be held on the usable charge.

    Parameters
    ----------
    source : Drive or BarePropeller
        What gives the thrust.
    points : OperatingPoints or ShaftPoints
        Steady flight on it.

    Returns
    -------
    numpy.ndarray
        The discharge integrated [s], with motor current and rpm held while the voltage falls and the duty rises; it
        ends before the charge where full duty no longer holds them. NaN without a battery and where there is no point.
    """
    if not isinstance(source, Drive) or not isinstance(points, OperatingPoints):
        return np.full(points.rpm.shape, np.nan)
    return hold_time(source, points, source.battery)


def ends_at_full_throttle(source: Source, points: Points) -> NDArray[np.bool_]:
    """Say which points the falling voltage ends before the usable charge is gone.

    Parameters
    ----------
    source : Drive or BarePropeller
        What gives the thrust.
    points : OperatingPoints or ShaftPoints
        Steady flight on it.

    Returns
    -------
    numpy.ndarray of bool
        True where the duty that holds the point at the end of the usable charge is more than the controller gives.
    """
    if not isinstance(source, Drive) or not isinstance(points, OperatingPoints):
        return np.zeros(points.rpm.shape, dtype=bool)
    empty = replace(source.battery, charge_left=min(source.battery.lowest_charge, source.battery.charge_left))
    speed = points.rpm / RPM_PER_RAD_S * source.motor.gear_ratio
    duty = duty_for(source.motor, source.controller, empty, points.motor_current, speed)
    return np.isfinite(points.rpm) & ~(duty <= source.controller.full_duty)


def staying_power(source: Source, points: Points) -> FloatArray:
    """Return what is largest where flying costs least per time.

    Parameters
    ----------
    source : Drive or BarePropeller
        What gives the thrust.
    points : OperatingPoints or ShaftPoints
        Steady flight on it.

    Returns
    -------
    numpy.ndarray
        Endurance [s]; without a battery, or with no charge to use, the inverse of the shaft power [1/W] or of the
        battery current [1/A]. NaN where nothing is drawn.
    """
    if isinstance(source, Drive) and source.battery.usable_charge > 0.0:
        return endurance(source, points)
    drawn = points.battery_current if isinstance(points, OperatingPoints) else points.shaft_power
    return 1.0 / np.where(drawn > 0.0, drawn, np.nan)


def pitch_speed(source: Source) -> float:
    """Return an airspeed of the order of the fastest a propeller can pull: one diameter a turn.

    Parameters
    ----------
    source : Drive or BarePropeller
        Gives the fastest rotation and the diameter.

    Returns
    -------
    float
        [m/s].
    """
    return source.no_load_speed * RPM_PER_RAD_S / 60.0 * source.propeller.diameter


def last_fall(
    function: Callable[[FloatArray], FloatArray], low: float, guess: float, limit: float = math.inf
) -> tuple[float, float]:
    """Return the last airspeed at which a function falls through zero.

    Parameters
    ----------
    function : callable
        Takes airspeeds (n,) [m/s], returns values (n,), NaN where unknown.
    low : float
        Start of the search [m/s].
    guess : float
        First end of the search [m/s]; widened while the function is still positive there.
    limit : float
        Farthest end of the search [m/s].

    Returns
    -------
    root : float
        [m/s]; NaN where the function does not fall through zero.
    end : float
        The same, or the last airspeed at which the function is known and not negative; NaN where it is nowhere so.
    """
    reach = guess
    for _ in range(_MOST_WIDENINGS):
        axis = np.linspace(low, min(reach, limit), _SEARCH_NODES)
        values = function(axis)
        if not values[-1] >= 0.0 or reach >= limit:
            break
        reach *= _WIDENING
    positive = np.flatnonzero(values >= 0.0)
    if positive.size == 0:
        return math.nan, math.nan
    last = positive[-1]
    if last == axis.size - 1 or np.isnan(values[last + 1]):
        return math.nan, float(axis[last])
    root = bracketed_root(
        lambda airspeed, _: function(airspeed),
        axis[last : last + 1],
        axis[last + 1 : last + 2],
        values[last : last + 1],
        values[last + 1 : last + 2],
    )
    return float(root[0]), float(root[0])


def place_of_largest(axis: FloatArray, values: FloatArray) -> float:
    """Return where a sampled function is largest, by the parabola through the highest sample and its neighbours.

    Parameters
    ----------
    axis : numpy.ndarray, shape (n,)
        Evenly spaced.
    values : numpy.ndarray, shape (n,)
        NaN where unknown.

    Returns
    -------
    float
        Position; the sample itself at an end of the known values; NaN where none is known.
    """
    if np.all(np.isnan(values)):
        return math.nan
    top = int(np.nanargmax(values))
    if top in (0, axis.size - 1) or np.isnan(values[top - 1] + values[top + 1]):
        return float(axis[top])
    before, at, after = values[top - 1 : top + 2]
    curvature = before - 2.0 * at + after
    shift = 0.0 if curvature == 0.0 else 0.5 * (before - after) / curvature
    return float(axis[top] + shift * (axis[top + 1] - axis[top]))
