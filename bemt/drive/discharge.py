"""How long a battery lasts: the discharge integrated over the charge that is left."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from bemt.drive.battery import OPEN_CIRCUIT_VOLTAGE, Battery, cell_voltage, charge_at_voltage
from bemt.drive.circuit import battery_current_at, duty_for, lowest_open_circuit_voltage
from bemt.drive.loads import RPM_PER_RAD_S
from bemt.drive.roots import FloatArray
from bemt.errors import InputError

if TYPE_CHECKING:
    from bemt.drive.equilibrium import Drive, OperatingPoints

# Gauss-Legendre nodes between two nodes of the open-circuit curve, where the current over the charge is smooth.
_NODES = 6
_NOTHING = 1e-9  # share of the capacity that is lost in the rounding of a point at its limit


def hold_time(drive: Drive, points: OperatingPoints, battery: Battery) -> FloatArray:
    """Return the time for which operating points can be held while the battery empties.

    Parameters
    ----------
    drive : Drive
        Motor and controller.
    points : OperatingPoints
        Any shape; current and speed of the motor are held by a duty that rises as the voltage falls.
    battery : Battery
        From its charge left to what has to stay in it.

    Returns
    -------
    numpy.ndarray
        Time [s], shape of the points; it ends early where the duty reaches that of full stick or the battery its
        largest power. Infinite where nothing is drawn, NaN where there is no point.

    Notes
    -----
    The time is the integral of capacity/Ib over the charge left, piece by piece between the nodes of the open-circuit
    curve. Where the motor is not driven the duty plays no part, and the battery current stays that of the point.
    """
    current, shape = points.motor_current.ravel(), points.motor_current.shape
    speed = points.rpm.ravel() / RPM_PER_RAD_S * drive.motor.gear_ratio
    held = np.full(current.shape, np.nan)

    driven = np.flatnonzero(current > 0.0)
    lowest = lowest_open_circuit_voltage(drive.motor, drive.controller, battery, current[driven], speed[driven])
    until = np.maximum(charge_at_voltage(battery.chemistry, lowest / battery.cells_in_series), battery.lowest_charge)

    def drawn(charge: FloatArray) -> FloatArray:
        open_circuit = battery.cells_in_series * cell_voltage(battery.chemistry, charge)
        here = (slice(None), *[np.newaxis] * (charge.ndim - 1))
        motor_current, motor_speed = current[driven][here], speed[driven][here]
        duty = duty_for(drive.motor, drive.controller, battery, motor_current, motor_speed, open_circuit)
        return battery_current_at(drive.motor, drive.controller, duty, motor_current, motor_speed)

    held[driven] = _time(battery, until, drawn)
    idle = np.flatnonzero(current <= 0.0)
    held[idle] = _over(battery.usable_charge, points.battery_current.ravel()[idle])
    return held.reshape(shape)


def drain_time_at_power(battery: Battery, power: ArrayLike) -> FloatArray:
    """Return the time for which a battery gives a constant power.

    Parameters
    ----------
    battery : Battery
        From its charge left to what has to stay in it.
    power : array_like
        At the terminals [W], not negative.

    Returns
    -------
    numpy.ndarray
        Time [s], shape of `power`; it ends early where the largest power Voc^2/(4 R) has fallen to this one. Infinite
        where no power is asked for.

    Raises
    ------
    InputError
        If a power is negative.

    Notes
    -----
    The current is (Voc - sqrt(Voc^2 - 4 R P))/(2 R).
    """
    asked = np.asarray(power, dtype=np.float64)
    if np.any(asked < 0.0):
        raise InputError("power", f"{np.nanmin(asked):g} W must not be negative")
    flat = asked.ravel()
    lowest = np.sqrt(4.0 * battery.resistance * flat) / battery.cells_in_series
    until = np.maximum(charge_at_voltage(battery.chemistry, lowest), battery.lowest_charge)

    def drawn(charge: FloatArray) -> FloatArray:
        voltage = battery.cells_in_series * cell_voltage(battery.chemistry, charge)
        here = flat[(slice(None), *[np.newaxis] * (charge.ndim - 1))]
        root = np.sqrt(np.maximum(voltage**2 - 4.0 * battery.resistance * here, 0.0))
        return 2.0 * here / (voltage + root)

    return _time(battery, until, drawn).reshape(asked.shape)


def drain_time_at_throttle(drive: Drive, airspeed: ArrayLike, throttle: ArrayLike) -> FloatArray:
    """Return the time for which a battery lasts with the stick held still, the propeller slowing down on the way.

    Parameters
    ----------
    drive : Drive
        Its battery empties from its charge left to what has to stay in it.
    airspeed : array_like
        Of the aircraft [m/s], held.
    throttle : array_like
        Stick, 0 to 1; broadcast against `airspeed`.

    Returns
    -------
    numpy.ndarray
        Time [s], broadcast shape; infinite where nothing is drawn, NaN where there is no equilibrium on the way.

    Raises
    ------
    InputError
        If an airspeed is negative or a throttle outside 0 to 1.
    """
    air_axis, stick = np.broadcast_arrays(np.asarray(airspeed, np.float64), np.asarray(throttle, np.float64))

    def drawn(charge: FloatArray) -> FloatArray:
        voltage = drive.battery.cells_in_series * cell_voltage(drive.battery.chemistry, charge)
        here = (slice(None), np.newaxis, np.newaxis)
        return drive.at_throttle(air_axis.ravel()[here], stick.ravel()[here], voltage).battery_current

    return _time(drive.battery, np.array([drive.battery.lowest_charge]), drawn).reshape(air_axis.shape)


def _time(battery: Battery, until: FloatArray, drawn: Callable[[FloatArray], FloatArray]) -> FloatArray:
    """Integrate capacity over current from the charge left down to a charge for each point.

    The function takes charges (n, pieces, nodes) and returns the battery current there.
    """
    end = np.where(until < battery.charge_left - _NOTHING, until, battery.charge_left)[:, np.newaxis]
    nodes = np.asarray(OPEN_CIRCUIT_VOLTAGE[battery.chemistry][0])
    inside = nodes[(nodes > end.min(initial=1.0)) & (nodes < battery.charge_left)]
    edges = np.clip(np.concatenate([[0.0], inside, [battery.charge_left]]), end, battery.charge_left)
    low, width = edges[:, :-1, np.newaxis], np.diff(edges, axis=1)[..., np.newaxis]
    x, weight = np.polynomial.legendre.leggauss(_NODES)
    # Steps in the root of the charge: at its largest power the current of a battery has the slope of a square root.
    share = 0.5 * (x + 1.0)
    current = drawn(low + width * share**2)
    pieces = np.where(width > 0.0, _over(battery.capacity * width * share * weight, current), 0.0)
    return np.where(np.isnan(until), np.nan, pieces.sum(axis=(1, 2)))


def _over(charge: ArrayLike, current: FloatArray) -> FloatArray:
    """Return the time a charge lasts; without end where nothing is drawn."""
    draws = ~(current <= 0.0)
    return np.where(draws, charge, math.inf) / np.where(draws, current, 1.0)
