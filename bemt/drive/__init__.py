"""Drive: motor, controller and battery, and their equilibrium with a propeller."""

from __future__ import annotations

from bemt.drive.bare import BarePropeller, ShaftPoints
from bemt.drive.battery import CHEMISTRIES, Battery, cell_voltage, charge_at_voltage
from bemt.drive.circuit import Circuit, duty_for, solve_circuit
from bemt.drive.controller import UNPOWERED, Controller
from bemt.drive.discharge import drain_time_at_power, drain_time_at_throttle, hold_time
from bemt.drive.equilibrium import Drive, OperatingPoints
from bemt.drive.loads import Loads, PropellerLoads
from bemt.drive.motor import (
    Motor,
    no_load_current_at,
    no_load_speed,
    peak_efficiency,
    peak_efficiency_current,
    speed_constant_from_rpm,
    stall_torque,
)

__all__ = [
    "CHEMISTRIES",
    "UNPOWERED",
    "BarePropeller",
    "Battery",
    "Circuit",
    "Controller",
    "Drive",
    "Loads",
    "Motor",
    "OperatingPoints",
    "PropellerLoads",
    "ShaftPoints",
    "cell_voltage",
    "charge_at_voltage",
    "drain_time_at_power",
    "drain_time_at_throttle",
    "duty_for",
    "hold_time",
    "no_load_current_at",
    "no_load_speed",
    "peak_efficiency",
    "peak_efficiency_current",
    "solve_circuit",
    "speed_constant_from_rpm",
    "stall_torque",
]
