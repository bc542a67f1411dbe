"""Level flight and climb of an airframe on its drive, and the airspeeds that stand out."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from bemt.drive import BarePropeller, Battery, Drive, OperatingPoints, ShaftPoints
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
        return self.source.at_thrust(airspeed, self.drag(airspeed) / self.thrust_factor)

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


def cost(points: Points) -> FloatArray:
    """Return what flying costs: battery current [A], or shaft power [W] where the drive is not known.

    Parameters
    ----------
    points : OperatingPoints or ShaftPoints
        Level flight.

    Returns
    -------
    numpy.ndarray
        Shape of the points; NaN where nothing is drawn.
    """
    drawn = points.battery_current if isinstance(points, OperatingPoints) else points.shaft_power
    return np.where(drawn > 0.0, drawn, np.nan)


def endurance(points: Points, battery: Battery | None) -> FloatArray:
    """Return the time aloft.

    Parameters
    ----------
    points : OperatingPoints or ShaftPoints
        Level flight.
    battery : Battery or None
        Battery of the drive.

    Returns
    -------
    numpy.ndarray
        Usable charge over the battery current of the charge left at the start [s]; NaN without a battery. The voltage
        falls and the current rises on the way, so this is the upper end: by some 5 to 8 % for a pack flown from full
        to a fifth.
    """
    if battery is None or not isinstance(points, OperatingPoints):
        return np.full(points.rpm.shape, np.nan)
    found: FloatArray = battery.usable_charge / cost(points)
    return found


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
