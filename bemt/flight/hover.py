"""Hovering and climbing straight up on propellers alone."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from bemt.drive import Drive
from bemt.drive.roots import FloatArray, IndexArray, bracketed_root
from bemt.flight.airframe import Multirotor
from bemt.flight.level import Points, Source, last_fall, pitch_speed

_NODES = 41


@dataclass(frozen=True, eq=False)
class UprightFlight:
    """A multirotor on its drive, or on a propeller whose drive is not known; the weight is shared evenly.

    Parameters
    ----------
    source : Drive or BarePropeller
        What gives the thrust.
    airframe : Multirotor
        What needs it.
    thrust_factor : float
        Share of the propellers' thrust that reaches the airframe.
    """

    source: Source
    airframe: Multirotor
    thrust_factor: float

    def drag(self, airspeed: FloatArray) -> FloatArray:
        """Return the drag of the climb [N].

        Parameters
        ----------
        airspeed : numpy.ndarray
            Speed of the climb [m/s].

        Returns
        -------
        numpy.ndarray
            Shape of `airspeed`, NaN where it is not known.
        """
        return self.airframe.drag(airspeed)

    def required_thrust(self, airspeed: FloatArray) -> FloatArray:
        """Return the thrust of all propellers that hovering or a steady climb needs [N].

        Parameters
        ----------
        airspeed : numpy.ndarray
            Speed of the climb [m/s].

        Returns
        -------
        numpy.ndarray
            Weight and drag over the thrust factor, shape of `airspeed`.
        """
        found: FloatArray = (self.airframe.weight + self.drag(airspeed)) / self.thrust_factor
        return found

    def at(self, airspeed: FloatArray) -> Points:
        """Return the points of steady climb; hovering at no airspeed.

        Parameters
        ----------
        airspeed : numpy.ndarray
            Speed of the climb [m/s].

        Returns
        -------
        OperatingPoints or ShaftPoints
            Shape of `airspeed`; NaN where the drive does not reach the thrust.
        """
        return self.source.at_thrust(airspeed, self.required_thrust(airspeed))

    def fastest(self) -> tuple[float, float]:
        """Return the fastest steady climb at full throttle, or at the highest rpm.

        Returns
        -------
        climb_rate : float
            Largest airspeed at which full thrust still equals weight and drag [m/s]; NaN where it does not lift off, or
            where the climb is faster than a table reaches.
        end : float
            The same, or the end of the drag table or of the propeller's table where that comes first; NaN where it does
            not lift off.
        """

        def surplus(airspeed: FloatArray) -> FloatArray:
            return self.source.at_full(airspeed).thrust - self.required_thrust(airspeed)

        return last_fall(surplus, 0.0, pitch_speed(self.source), self.airframe.fastest)

    def axis_of_flight(self, end: float) -> FloatArray:
        """Return climb speeds from hovering to an end.

        Parameters
        ----------
        end : float
            [m/s].

        Returns
        -------
        numpy.ndarray, shape (n,)
            Evenly spaced [m/s].
        """
        return np.linspace(0.0, end, _NODES)

    def climb_rate(self, setting: FloatArray) -> FloatArray:
        """Return the steady climb at each throttle, or at each rpm where the drive is not known.

        Parameters
        ----------
        setting : numpy.ndarray, shape (n,)
            Throttle, 0 to 1, or rpm.

        Returns
        -------
        numpy.ndarray, shape (n,)
            [m/s]; NaN where it sinks, and where the climb is faster than a table reaches.
        """
        fastest, end = self.fastest()
        if math.isnan(end):
            return np.full(setting.shape, np.nan)

        def surplus(airspeed: FloatArray, index: IndexArray) -> FloatArray:
            return self._at_setting(airspeed, setting[index]).thrust - self.required_thrust(airspeed)

        every = np.arange(setting.size)
        low, high = np.zeros(setting.shape), np.full(setting.shape, end)
        found = bracketed_root(surplus, low, high, surplus(low, every), surplus(high, every))
        full = 1.0 if isinstance(self.source, Drive) else self.source.highest_rpm
        return np.where(setting == full, fastest, found)

    def _at_setting(self, airspeed: FloatArray, setting: FloatArray) -> Points:
        if isinstance(self.source, Drive):
            return self.source.at_throttle(airspeed, setting)
        return self.source.at_rpm(airspeed, setting)


def figure_of_merit(points: Points, count: int, diameter: float, density: float) -> FloatArray:
    """Return the ideal power of the thrust over the shaft power, of rotors standing in still air.

    Parameters
    ----------
    points : OperatingPoints or ShaftPoints
        Thrust of all rotors, shaft power of one.
    count : int
        Number of rotors.
    diameter : float
        Of one rotor [m].
    density : float
        Of the air [kg/m3].

    Returns
    -------
    numpy.ndarray
        T sqrt(T/(2 rho A))/P with T of one rotor and A its disk; NaN in moving air, and unless T >= 0 and P > 0.

    References
    ----------
    Momentum theory of any textbook of rotary-wing aircraft, e.g. J. G. Leishman, Principles of Helicopter Aerodynamics.
    """
    thrust, power = points.thrust / count, points.shaft_power
    meant = (points.airspeed == 0.0) & (thrust >= 0.0) & (power > 0.0)
    ideal = np.where(meant, thrust, np.nan) ** 1.5 / math.sqrt(2.0 * density * math.pi * (0.5 * diameter) ** 2)
    found: FloatArray = ideal / np.where(meant, power, 1.0)
    return found
