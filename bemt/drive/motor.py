"""The brushless motor as a direct-current machine of three constants, and its textbook closed forms."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.quantities.checks import require_count, require_not_negative, require_positive

COPPER_TEMPERATURE_COEFFICIENT = 0.00393  # 1/K, of the resistance, referred to 20 degrees Celsius (IEC 60028)
RESISTANCE_TEMPERATURE = 293.15  # K, at which the winding resistance is stated
# K; copper's resistance is straight over temperature in between, and no enamel lasts above.
_COLDEST, _HOTTEST = 213.15, 573.15


@dataclass(frozen=True)
class Motor:
    """A motor by its speed constant, resistance and no-load readings.

    With current I, angular speed w and mean voltage V at the leads: V = w/Kv + I R, torque (I - I0(w))/Kv.

    Parameters
    ----------
    speed_constant : float
        Kv per volt of back-EMF [rad/s per V]; its inverse is the torque constant [N m/A].
    winding_resistance : float
        R between two leads at 20 degrees Celsius [ohm].
    no_load : tuple of (float, float)
        Readings of voltage [V] and current [A] of the motor running free; at least one. One reading makes the no-load
        current I0 constant, the textbook model; several make it piecewise linear over speed, continued straight beyond
        the readings but never below zero. Each reading is reproduced exactly.
    count : int
        Motors, each with its controller and propeller, on one battery.
    current_limit : float, optional
        Largest continuous current of one motor [A].
    thermal_resistance : float, optional
        Winding to air [K/W].
    winding_temperature : float
        At which the copper's resistance is taken for currents and voltages [K], -60 to 300 degrees Celsius.
    winding_inductance : float, optional
        Between two leads [H]; the ripple of the current needs it.
    gear_ratio : float
        Motor turns per propeller turn.
    gear_efficiency : float
        Share of the power the gear passes on, above 0 to 1.

    Raises
    ------
    InputError
        If a value is out of range, a no-load reading leaves no speed (I0 R >= V), or a higher voltage gives a lower
        speed.
    """

    speed_constant: float
    winding_resistance: float
    no_load: tuple[tuple[float, float], ...]
    count: int = 1
    current_limit: float | None = None
    thermal_resistance: float | None = None
    winding_temperature: float = RESISTANCE_TEMPERATURE
    winding_inductance: float | None = None
    gear_ratio: float = 1.0
    gear_efficiency: float = 1.0

    def __post_init__(self) -> None:
        """Refuse constants that describe no motor."""
        require_positive("speed_constant", self.speed_constant, "rad/s per V")
        require_positive("winding_resistance", self.winding_resistance, "ohm")
        require_count("count", self.count)
        for name, unit in (
            ("current_limit", "A"),
            ("thermal_resistance", "K/W"),
            ("winding_inductance", "H"),
        ):
            if getattr(self, name) is not None:
                require_positive(name, getattr(self, name), unit)
        require_positive("gear_ratio", self.gear_ratio)
        require_positive("gear_efficiency", self.gear_efficiency)
        if self.gear_efficiency > 1.0:
            raise InputError("gear_efficiency", f"{self.gear_efficiency:g} must not exceed 1")
        require_positive("winding_temperature", self.winding_temperature, "K")
        if not _COLDEST <= self.winding_temperature <= _HOTTEST:
            raise InputError(
                "winding_temperature",
                f"{self.winding_temperature - 273.15:.4g} degC is not that of a winding, -60 to 300 degC",
            )
        self._check_no_load()

    def _check_no_load(self) -> None:
        if len(self.no_load) == 0:
            raise InputError("no_load", "needs at least one reading of voltage and current")
        for reading in self.no_load:
            if len(reading) != 2:
                raise InputError("no_load", f"{reading!r} is not a pair of voltage and current")
            voltage, current = reading
            require_positive("no_load.voltage", voltage, "V")
            require_not_negative("no_load.current", current, "A")
            if current * self.winding_resistance >= voltage:
                raise InputError(
                    "no_load",
                    f"{current:g} A through {self.winding_resistance:g} ohm takes the whole {voltage:g} V: "
                    "the motor would not turn",
                )
        speeds = self._no_load_speeds()
        if np.any(np.diff(speeds) <= 0.0):
            raise InputError("no_load", "each higher voltage must turn the motor faster: V - I0 R must rise")

    def _readings(self) -> NDArray[np.float64]:
        return np.array(sorted(self.no_load), dtype=np.float64)

    def _no_load_voltages(self) -> NDArray[np.float64]:
        """Return the voltages that turn the motor at the speeds of its readings; they were read on a cold motor."""
        readings = self._readings()
        warmed: NDArray[np.float64] = readings[:, 0] + readings[:, 1] * (self.resistance - self.winding_resistance)
        return warmed

    def _no_load_speeds(self) -> NDArray[np.float64]:
        readings = self._readings()
        speeds: NDArray[np.float64] = self.speed_constant * (readings[:, 0] - readings[:, 1] * self.winding_resistance)
        return speeds

    @property
    def torque_constant(self) -> float:
        """Torque per current beyond the no-load current [N m/A], 1/Kv."""
        return 1.0 / self.speed_constant

    @property
    def resistance(self) -> float:
        """Resistance between two leads at the winding temperature, R20 (1 + a (T - T20)) [ohm]."""
        rise = COPPER_TEMPERATURE_COEFFICIENT * (self.winding_temperature - RESISTANCE_TEMPERATURE)
        return self.winding_resistance * (1.0 + rise)

    def no_load_current(self, speed: ArrayLike) -> NDArray[np.float64]:
        """Return the current that overcomes the motor's own drag.

        Parameters
        ----------
        speed : array_like
            Angular speed of the motor [rad/s], any shape.

        Returns
        -------
        numpy.ndarray
            Current [A], shape of `speed`, not negative.
        """
        return _straight_line_through(speed, self._no_load_speeds(), self._readings()[:, 1])

    def torque(self, current: ArrayLike, speed: ArrayLike) -> NDArray[np.float64]:
        """Return the torque at the motor's shaft while it turns forward.

        Parameters
        ----------
        current : array_like
            Motor current [A].
        speed : array_like
            Angular speed of the motor [rad/s]; broadcast against `current`.

        Returns
        -------
        numpy.ndarray
            Torque [N m]; negative where the shaft has to drive the motor.
        """
        found: NDArray[np.float64] = (np.asarray(current) - self.no_load_current(speed)) * self.torque_constant
        return found

    def propeller_torque(self, current: ArrayLike, speed: ArrayLike) -> NDArray[np.float64]:
        """Return the torque behind the gear, which loses power whichever way the power goes.

        Parameters
        ----------
        current : array_like
            Motor current [A].
        speed : array_like
            Angular speed of the motor, before the gear [rad/s]; broadcast against `current`.

        Returns
        -------
        numpy.ndarray
            Torque at the propeller's shaft [N m].
        """
        torque = self.gear_ratio * self.torque(current, speed)
        return np.where(torque > 0.0, torque * self.gear_efficiency, torque / self.gear_efficiency)

    def current_for(self, propeller_torque: ArrayLike, speed: ArrayLike) -> NDArray[np.float64]:
        """Return the motor current that gives a torque behind the gear: the inverse of `propeller_torque`.

        Parameters
        ----------
        propeller_torque : array_like
            Torque at the propeller's shaft [N m].
        speed : array_like
            Angular speed of the motor, before the gear [rad/s]; broadcast against `propeller_torque`.

        Returns
        -------
        numpy.ndarray
            Motor current [A].
        """
        torque = np.asarray(propeller_torque, dtype=np.float64) / self.gear_ratio
        torque = np.where(torque > 0.0, torque / self.gear_efficiency, torque * self.gear_efficiency)
        found: NDArray[np.float64] = torque * self.speed_constant + self.no_load_current(speed)
        return found

    def steady_temperature(self, current: ArrayLike, speed: ArrayLike, air_temperature: float) -> NDArray[np.float64]:
        """Return the steady temperature of the winding.

        The copper's resistance rises with the temperature it causes, which closes to
        T = (Ta + Rth (P0 + I^2 R (1 - 20 a))) / (1 - Rth I^2 R a) with P0 = I0 w/Kv. All losses are taken to pass
        through the winding's thermal resistance. The electrical solution keeps the resistance of `winding_temperature`.

        Parameters
        ----------
        current : array_like
            Motor current, the root of its mean square where it swings [A].
        speed : array_like
            Angular speed of the motor [rad/s]; broadcast against `current`.
        air_temperature : float
            [K].

        Returns
        -------
        numpy.ndarray
            Temperature [degree Celsius]; NaN where no thermal resistance is known, infinite where the winding runs
            away.
        """
        current, speed = np.broadcast_arrays(np.asarray(current, np.float64), np.asarray(speed, np.float64))
        if self.thermal_resistance is None:
            return np.full(current.shape, np.nan)
        own_drag = self.no_load_current(speed) * np.abs(speed) * self.torque_constant
        copper = current**2 * self.winding_resistance
        rise = self.thermal_resistance * copper * COPPER_TEMPERATURE_COEFFICIENT
        cold = copper * (1.0 - (RESISTANCE_TEMPERATURE - 273.15) * COPPER_TEMPERATURE_COEFFICIENT)
        source = air_temperature - 273.15 + self.thermal_resistance * (own_drag + cold)
        return np.where(rise >= 1.0, np.inf, source / np.where(rise >= 1.0, np.nan, 1.0 - rise))


def no_load_current_at(motor: Motor, voltage: ArrayLike) -> NDArray[np.float64]:
    """Return the current of the motor running free at a voltage.

    Parameters
    ----------
    motor : Motor
        Its readings are reproduced exactly.
    voltage : array_like
        Mean voltage at the leads [V].

    Returns
    -------
    numpy.ndarray
        Current [A]; where I0 is linear in speed it is linear in voltage too, so no search is needed.
    """
    return _straight_line_through(voltage, motor._no_load_voltages(), motor._readings()[:, 1])


def no_load_speed(motor: Motor, voltage: ArrayLike) -> NDArray[np.float64]:
    """Return the speed of the motor running free, Kv (V - I0 R).

    Parameters
    ----------
    motor : Motor
        Motor, before its gear.
    voltage : array_like
        Mean voltage at the leads [V].

    Returns
    -------
    numpy.ndarray
        Angular speed [rad/s], not below zero.

    References
    ----------
    The direct-current machine with constant flux of any textbook, e.g. Fitzgerald, Kingsley and Umans, Electric
    Machinery.
    """
    voltage = np.asarray(voltage, dtype=np.float64)
    back_emf = voltage - no_load_current_at(motor, voltage) * motor.resistance
    return np.maximum(motor.speed_constant * back_emf, 0.0)


def stall_torque(motor: Motor, voltage: ArrayLike) -> NDArray[np.float64]:
    """Return the torque of the motor held still, (V/R - I0)/Kv.

    Parameters
    ----------
    motor : Motor
        Motor, before its gear; I0 is that of standstill.
    voltage : array_like
        Mean voltage at the leads [V].

    Returns
    -------
    numpy.ndarray
        Torque [N m], not below zero.

    References
    ----------
    As for `no_load_speed`.
    """
    current = np.asarray(voltage, dtype=np.float64) / motor.resistance
    return np.maximum(motor.torque(current, 0.0), 0.0)


def peak_efficiency_current(motor: Motor, voltage: ArrayLike) -> NDArray[np.float64]:
    """Return the current of best motor efficiency, sqrt(I0 V/R).

    Parameters
    ----------
    motor : Motor
        Motor, before its gear; I0 is that of running free at this voltage, and taken as constant.
    voltage : array_like
        Mean voltage at the leads [V].

    Returns
    -------
    numpy.ndarray
        Current [A].

    Notes
    -----
    From d/dI of the efficiency (1 - I R/V)(1 - I0/I) at constant voltage.
    """
    voltage = np.asarray(voltage, dtype=np.float64)
    found: NDArray[np.float64] = np.sqrt(no_load_current_at(motor, voltage) * voltage / motor.resistance)
    return found


def peak_efficiency(motor: Motor, voltage: ArrayLike) -> NDArray[np.float64]:
    """Return the best efficiency of the motor at a voltage, (1 - sqrt(I0 R/V))^2.

    Parameters
    ----------
    motor : Motor
        Motor, before its gear; I0 is that of running free at this voltage, and taken as constant.
    voltage : array_like
        Mean voltage at the leads [V], above zero.

    Returns
    -------
    numpy.ndarray
        Shaft power over power at the leads.

    Notes
    -----
    The efficiency (1 - I R/V)(1 - I0/I) at the current of `peak_efficiency_current`.
    """
    voltage = np.asarray(voltage, dtype=np.float64)
    lost = np.sqrt(no_load_current_at(motor, voltage) * motor.resistance / voltage)
    found: NDArray[np.float64] = (1.0 - lost) ** 2
    return found


def speed_constant_from_rpm(rpm_per_volt: float) -> float:
    """Return a speed constant in SI.

    Parameters
    ----------
    rpm_per_volt : float
        Kv [rpm/V].

    Returns
    -------
    float
        Kv [rad/s per V].
    """
    return rpm_per_volt * math.pi / 30.0


def _straight_line_through(
    at: ArrayLike, nodes: NDArray[np.float64], values: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Interpolate between nodes, go on straight beyond them, stop at zero."""
    at = np.asarray(at, dtype=np.float64)
    if nodes.size == 1:
        return np.full(at.shape, values[0])
    segment = np.clip(np.searchsorted(nodes, at, side="right") - 1, 0, nodes.size - 2)
    slope = np.diff(values) / np.diff(nodes)
    found: NDArray[np.float64] = np.maximum(values[segment] + slope[segment] * (at - nodes[segment]), 0.0)
    return found
