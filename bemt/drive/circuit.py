"""The electrical circuit from the cells to the motor's leads, closed in one step at a given speed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from bemt.drive.battery import Battery
from bemt.drive.controller import Controller
from bemt.drive.motor import Motor
from bemt.drive.roots import FloatArray, IndexArray, bracketed_root


@dataclass(frozen=True, eq=False)
class Circuit:
    """Currents and voltages, arrays of one shape.

    Parameters
    ----------
    motor_current : numpy.ndarray
        Mean current of one motor [A]; negative where it generates.
    ripple_current : numpy.ndarray
        Its swing over a switching period, from peak to peak [A].
    motor_voltage : numpy.ndarray
        Mean voltage at the leads of one motor [V].
    battery_current : numpy.ndarray
        Of the pack [A]; negative where it is charged.
    battery_voltage : numpy.ndarray
        Of the pack under load [V].
    """

    motor_current: FloatArray
    ripple_current: FloatArray
    motor_voltage: FloatArray
    battery_current: FloatArray
    battery_voltage: FloatArray

    @property
    def rms_current(self) -> FloatArray:
        """Root mean square of the current of one motor, which heats its copper [A]."""
        found: FloatArray = np.sqrt(self.motor_current**2 + self.ripple_current**2 / 12.0)
        return found


def solve_circuit(
    motor: Motor,
    controller: Controller,
    battery: Battery,
    duty: ArrayLike,
    motor_speed: ArrayLike,
    open_circuit_voltage: ArrayLike | None = None,
) -> Circuit:
    """Return currents and voltages of the drive at a duty and motor speed.

    Parameters
    ----------
    motor : Motor
        All its motors turn alike and load one battery.
    controller : Controller
        One for each motor.
    battery : Battery
        Shared.
    duty : array_like
        0 to 1.
    motor_speed : array_like
        Angular speed before the gear [rad/s], not negative; broadcast against `duty`.
    open_circuit_voltage : array_like, optional
        Of the pack [V], of the shape that duty and speed broadcast to or less; default that of its charge left.

    Returns
    -------
    Circuit
        Where the controller lets no current back, the motor is open: no current, back-EMF at its leads.

    Notes
    -----
    With N motors, Vm = d Vb - (1 - d) Vd - I Ron = w/Kv + I R, Ib = N (d I + s |I| + I_idle + g Vb) and
    Vb = Voc - Ib Rb. Vd is the voltage of a freewheeling diode, none where the controller freewheels actively; s is the
    switching share, 1/2 t f; g Vb is what the ripple costs: the current swings by dI = Vb d (1 - d)/(L f), which adds
    (R + Ron) dI^2/12 to the loss of the copper and the switches, so that g = (R + Ron) (d (1 - d)/(L f))^2/12. Diode,
    switching and ripple act while the controller chops and current flows, not at duty 0 and 1.

    All this is linear at a given duty and speed, and with k = 1 + N Rb g
    I = (d (Voc - N I_idle Rb)/k - (1 - d) Vd - w/Kv) / (R + Ron + N Rb d (d +- s)/k), the sign that of the current.

    Left out: current that falls to zero within the period, which the swing makes possible at small mean currents where
    a diode freewheels. A motor driven so fast that its back-EMF exceeds the battery voltage would feed current back
    through the controller's diodes whatever the setting; that is not modelled.
    """
    duty, motor_speed = np.broadcast_arrays(np.asarray(duty, np.float64), np.asarray(motor_speed, np.float64))
    rest = battery.open_circuit_voltage if open_circuit_voltage is None else np.asarray(open_circuit_voltage)
    chops = (duty > 0.0) & (duty < 1.0)
    switching = np.where(chops, controller.switching_share, 0.0)
    back_emf = motor_speed * motor.torque_constant
    shared = motor.count * battery.resistance
    swing = _swing_per_volt(motor, controller, duty)
    conductance = _ripple_conductance(motor, controller, duty)
    relief = 1.0 / (1.0 + shared * conductance)
    drive = duty * (rest - shared * controller.idle_current) * relief - back_emf
    if controller.diode_voltage:
        drive = drive - np.where(chops, (1.0 - duty) * controller.diode_voltage, 0.0)
    resistance = (
        motor.resistance + controller.on_resistance + shared * relief * duty * (duty + np.copysign(switching, drive))
    )
    current = drive / resistance
    if controller.unpowered == "freewheel":
        current = np.maximum(current, 0.0)
    elif controller.unpowered == "brake":
        current = np.where(duty > 0.0, np.maximum(current, 0.0), current)
    flows = current != 0.0
    drawn = motor.count * (duty * current + switching * np.abs(current) + controller.idle_current)
    voltage = (rest - battery.resistance * drawn) * np.where(flows, relief, 1.0)
    return Circuit(
        motor_current=current,
        ripple_current=np.where(flows, swing * voltage, 0.0),
        motor_voltage=back_emf + current * motor.resistance,
        battery_current=drawn + motor.count * np.where(flows, conductance, 0.0) * voltage,
        battery_voltage=voltage,
    )


def duty_for(
    motor: Motor,
    controller: Controller,
    battery: Battery,
    motor_current: ArrayLike,
    motor_speed: ArrayLike,
    open_circuit_voltage: ArrayLike | None = None,
) -> FloatArray:
    """Return the duty that drives a current through a motor at a speed: the inverse of `solve_circuit`.

    Parameters
    ----------
    motor : Motor
        All its motors turn alike and load one battery.
    controller : Controller
        One for each motor.
    battery : Battery
        Shared.
    motor_current : array_like
        Of one motor [A], not negative.
    motor_speed : array_like
        Angular speed before the gear [rad/s], not negative; broadcast against `motor_current`.
    open_circuit_voltage : array_like, optional
        Of the pack [V], broadcast against the others; None: that of its charge left.

    Returns
    -------
    numpy.ndarray
        Duty; NaN for a negative current or where the battery cannot give the power. It may exceed 1: the caller judges
        what the controller can do.

    Notes
    -----
    N Rb I d^2 - (Voc + k Vd - N Rb (s I + I_idle)) d + k (w/Kv + I (R + Ron) + Vd) = 0 with the symbols of
    `solve_circuit`; the smaller root, at the higher voltage. Without ripple k is 1. With it k depends on d, and the
    root is searched between those of its smallest and largest value.
    """
    voltage = battery.open_circuit_voltage if open_circuit_voltage is None else open_circuit_voltage
    current, speed, voltage = np.broadcast_arrays(
        *(np.asarray(array, np.float64) for array in (motor_current, motor_speed, voltage))
    )
    needed = speed * motor.torque_constant + current * (motor.resistance + controller.on_resistance)
    needed = needed + controller.diode_voltage
    shared = motor.count * battery.resistance
    offered = voltage - shared * (controller.switching_share * current + controller.idle_current)
    largest = 1.0 + shared * float(_ripple_conductance(motor, controller, 0.5))
    possible = (current >= 0.0) & (offered > 0.0)
    lowest = _smaller_root(shared * current, np.where(possible, offered + controller.diode_voltage, np.nan), needed)
    if largest == 1.0:
        return lowest

    def surplus(duty: FloatArray, at: IndexArray) -> FloatArray:
        factor = 1.0 + shared * _ripple_conductance(motor, controller, duty)
        mean = needed.ravel()[at] - duty * controller.diode_voltage
        found: FloatArray = duty * (offered.ravel()[at] - shared * current.ravel()[at] * duty) - factor * mean
        return found

    highest = _smaller_root(shared * current, offered + largest * controller.diode_voltage, largest * needed)
    # Where the largest ripple leaves no root, the duty of the most power is the end of the rising branch.
    enclosed = np.isfinite(highest).ravel()
    with np.errstate(divide="ignore", invalid="ignore"):
        highest = np.where(np.isnan(highest), 0.5 * (offered + controller.diode_voltage) / (shared * current), highest)
    flat = np.arange(lowest.size)
    low, high = lowest.ravel(), highest.ravel()
    # The signs at the ends are known; rounding must not turn them where the ripple is next to nothing.
    at_low = np.minimum(surplus(low, flat), 0.0)
    at_high = surplus(high, flat)
    at_high = np.where(enclosed, np.maximum(at_high, 0.0), at_high)
    return bracketed_root(surplus, low, high, at_low, at_high).reshape(lowest.shape)


def battery_current_at(
    motor: Motor, controller: Controller, duty: ArrayLike, motor_current: ArrayLike, motor_speed: ArrayLike
) -> FloatArray:
    """Return the battery current of a motor state that the controller holds by its duty.

    Parameters
    ----------
    motor : Motor
        All its motors turn alike and load one battery.
    controller : Controller
        One for each motor.
    duty : array_like
        Above zero; taken as chopping, even at 1.
    motor_current : array_like
        Of one motor [A], above zero; broadcast against `duty`.
    motor_speed : array_like
        Angular speed before the gear [rad/s]; broadcast against `duty`.

    Returns
    -------
    numpy.ndarray
        Of the pack [A], by the relations of `solve_circuit`.
    """
    duty, current = np.asarray(duty, np.float64), np.asarray(motor_current, np.float64)
    voltage = _battery_voltage_at(motor, controller, duty, current, motor_speed)
    ripple = _ripple_conductance(motor, controller, duty) * voltage
    found: FloatArray = motor.count * ((duty + controller.switching_share) * current + controller.idle_current + ripple)
    return found


def lowest_open_circuit_voltage(
    motor: Motor, controller: Controller, battery: Battery, motor_current: ArrayLike, motor_speed: ArrayLike
) -> FloatArray:
    """Return the open-circuit voltage below which a motor state can no longer be held.

    Parameters
    ----------
    motor : Motor
        All its motors turn alike and load one battery.
    controller : Controller
        One for each motor.
    battery : Battery
        Its resistance counts, not its voltage.
    motor_current : array_like
        Of one motor [A], above zero.
    motor_speed : array_like
        Angular speed before the gear [rad/s]; broadcast against `motor_current`.

    Returns
    -------
    numpy.ndarray
        [V]; there the controller is at full duty, or the battery at its largest power where that comes first.
    """
    current, speed = np.broadcast_arrays(np.asarray(motor_current, np.float64), np.asarray(motor_speed, np.float64))
    shared = motor.count * battery.resistance
    needed = speed * motor.torque_constant + current * (motor.resistance + controller.on_resistance)
    # Ripple moves the duty of the most power, but next to nothing of the voltage, which is least there.
    with np.errstate(divide="ignore", invalid="ignore"):
        most_power = np.sqrt((needed + controller.diode_voltage) / (shared * current))
    duty = np.fmin(controller.full_duty, most_power)
    voltage = _battery_voltage_at(motor, controller, duty, current, speed)
    found: FloatArray = voltage + battery.resistance * battery_current_at(motor, controller, duty, current, speed)
    return found


def _battery_voltage_at(
    motor: Motor, controller: Controller, duty: FloatArray, current: FloatArray, speed: ArrayLike
) -> FloatArray:
    needed = np.asarray(speed) * motor.torque_constant + current * (motor.resistance + controller.on_resistance)
    found: FloatArray = (needed + (1.0 - duty) * controller.diode_voltage) / duty
    return found


def _smaller_root(square: FloatArray, linear: FloatArray, constant: FloatArray) -> FloatArray:
    """Return the smaller root of square x^2 - linear x + constant = 0, NaN where there is none."""
    discriminant = linear**2 - 4.0 * square * constant
    possible = (linear > 0.0) & (discriminant >= 0.0)
    root = np.sqrt(np.where(possible, discriminant, np.nan))
    found: FloatArray = 2.0 * constant / np.where(possible, linear + root, np.nan)
    return found


def _swing_per_volt(motor: Motor, controller: Controller, duty: FloatArray) -> FloatArray:
    """Return the swing of the motor current for each volt of the battery, d (1 - d)/(L f) [1/ohm]."""
    if motor.winding_inductance is None or controller.switching_frequency is None:
        return np.zeros(())
    found: FloatArray = np.maximum(duty * (1.0 - duty), 0.0)
    return found / (motor.winding_inductance * controller.switching_frequency)


def _ripple_conductance(motor: Motor, controller: Controller, duty: ArrayLike) -> FloatArray:
    """Return what the ripple of one motor draws from the battery for each of its volts, g [1/ohm]."""
    swing = _swing_per_volt(motor, controller, np.asarray(duty, np.float64))
    found: FloatArray = (motor.resistance + controller.on_resistance) * swing**2 / 12.0
    return found
