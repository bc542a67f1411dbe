"""The electrical circuit from the cells to the motor's leads, closed in one step at a given speed."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.drive.battery import Battery
from bemt.drive.controller import Controller
from bemt.drive.motor import Motor

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Circuit:
    """Currents and voltages, arrays of one shape.

    Parameters
    ----------
    motor_current : numpy.ndarray
        Of one motor [A]; negative where it generates.
    motor_voltage : numpy.ndarray
        Mean voltage at the leads of one motor [V].
    battery_current : numpy.ndarray
        Of the pack [A]; negative where it is charged.
    battery_voltage : numpy.ndarray
        Of the pack under load [V].
    """

    motor_current: FloatArray
    motor_voltage: FloatArray
    battery_current: FloatArray
    battery_voltage: FloatArray


def solve_circuit(
    motor: Motor, controller: Controller, battery: Battery, duty: ArrayLike, motor_speed: ArrayLike
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

    Returns
    -------
    Circuit
        Where the controller lets no current back, the motor is open: no current, back-EMF at its leads.

    Notes
    -----
    With N motors, Vm = d Vb - I Ron = w/Kv + I R, Ib = N (d I + s |I| + I_idle) and Vb = Voc - Ib Rb, the motor current
    is linear in what drives it: I = (d (Voc - N I_idle Rb) - w/Kv) / (R + Ron + N Rb d (d +- s)), s being the switching
    share (1/2 t f while the controller chops, none at duty 0 and 1) with the sign of the current.

    A motor driven so fast that its back-EMF exceeds the battery voltage would feed current back through the
    controller's diodes whatever the setting; that is not modelled.
    """
    duty, motor_speed = np.broadcast_arrays(np.asarray(duty, np.float64), np.asarray(motor_speed, np.float64))
    switching = _switching(controller, duty)
    back_emf = motor_speed * motor.torque_constant
    shared = motor.count * battery.resistance
    drive = duty * (battery.open_circuit_voltage - shared * controller.idle_current) - back_emf
    resistance = (
        motor.winding_resistance + controller.on_resistance + shared * duty * (duty + np.copysign(switching, drive))
    )
    current = drive / resistance
    if controller.unpowered == "freewheel":
        current = np.maximum(current, 0.0)
    elif controller.unpowered == "brake":
        current = np.where(duty > 0.0, np.maximum(current, 0.0), current)
    battery_current = motor.count * (duty * current + switching * np.abs(current) + controller.idle_current)
    return Circuit(
        motor_current=current,
        motor_voltage=back_emf + current * motor.winding_resistance,
        battery_current=battery_current,
        battery_voltage=battery.open_circuit_voltage - battery_current * battery.resistance,
    )


def duty_for(
    motor: Motor, controller: Controller, battery: Battery, motor_current: ArrayLike, motor_speed: ArrayLike
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

    Returns
    -------
    numpy.ndarray
        Duty; NaN for a negative current or where the battery cannot give the power. It may exceed 1: the caller judges
        what the controller can do.

    Notes
    -----
    N Rb I d^2 - (Voc - N Rb (s I + I_idle)) d + w/Kv + I (R + Ron) = 0; the smaller root, at the higher voltage.
    """
    current, speed = np.broadcast_arrays(np.asarray(motor_current, np.float64), np.asarray(motor_speed, np.float64))
    shared = motor.count * battery.resistance
    linear = battery.open_circuit_voltage - shared * (controller.switching_share * current + controller.idle_current)
    constant = speed * motor.torque_constant + current * (motor.winding_resistance + controller.on_resistance)
    discriminant = linear**2 - 4.0 * shared * current * constant
    possible = (current >= 0.0) & (linear > 0.0) & (discriminant >= 0.0)
    root = np.sqrt(np.where(possible, discriminant, np.nan))
    return 2.0 * constant / np.where(possible, linear + root, np.nan)


def _switching(controller: Controller, duty: FloatArray) -> FloatArray:
    """Return the switching share; it vanishes where the controller does not chop."""
    return np.where((duty > 0.0) & (duty < 1.0), controller.switching_share, 0.0)
