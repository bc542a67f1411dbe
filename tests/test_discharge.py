"""The discharge against closed forms and a general-purpose integrator."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from analytic_propeller import AnalyticPropeller
from scipy.integrate import solve_ivp

from bemt.air import standard_air
from bemt.drive import (
    CHEMISTRIES,
    Battery,
    Controller,
    Drive,
    Motor,
    OperatingPoints,
    cell_voltage,
    charge_at_voltage,
    drain_time_at_power,
    drain_time_at_throttle,
    duty_for,
    hold_time,
    solve_circuit,
    speed_constant_from_rpm,
)
from bemt.drive import battery as battery_module
from bemt.errors import InputError

AIR = standard_air()
KV = speed_constant_from_rpm(690.0)
MOTOR = Motor(speed_constant=KV, winding_resistance=0.041, no_load=((10.0, 0.9),))
CONTROLLER = Controller(on_resistance=0.003, idle_current=0.04, switching_frequency=24e3, switching_time=60e-9)
BATTERY = Battery(cells_in_series=4, cell_resistance=0.0024, capacity=18_000.0)
DRIVE = Drive(AnalyticPropeller(), MOTOR, BATTERY, CONTROLLER, AIR)
LOSSY = replace(
    DRIVE,
    motor=replace(MOTOR, count=2, winding_inductance=6e-6),
    controller=replace(CONTROLLER, diode_voltage=0.7),
)


@pytest.fixture
def constant_voltage(monkeypatch: pytest.MonkeyPatch) -> float:
    """Give every cell one voltage over its whole charge."""
    for chemistry in CHEMISTRIES:
        monkeypatch.setitem(battery_module.OPEN_CIRCUIT_VOLTAGE, chemistry, ((0.0, 0.4, 1.0), (3.8, 3.8, 3.8)))
    return 3.8


@pytest.mark.usefixtures("constant_voltage")
def test_a_constant_voltage_makes_the_time_charge_over_current():
    points = DRIVE.at_thrust([0.0, 8.0, 16.0], [6.0, 5.0, 3.0])
    assert np.isfinite(points.rpm).all()
    np.testing.assert_allclose(hold_time(DRIVE, points, BATTERY), 0.8 * 18_000.0 / points.battery_current, rtol=1e-12)
    # I = (Voc - sqrt(Voc^2 - 4 R P))/(2 R), the source behind a resistance.
    power, voltage, resistance = np.array([20.0, 200.0, 2000.0]), 4 * 3.8, 4 * 0.0024
    current = (voltage - np.sqrt(voltage**2 - 4.0 * resistance * power)) / (2.0 * resistance)
    np.testing.assert_allclose(drain_time_at_power(BATTERY, power), 0.8 * 18_000.0 / current, rtol=1e-12)
    at_throttle = DRIVE.at_throttle([0.0, 10.0], [0.5, 1.0])
    np.testing.assert_allclose(
        drain_time_at_throttle(DRIVE, [0.0, 10.0], [0.5, 1.0]), 14_400.0 / at_throttle.battery_current, rtol=1e-12
    )


def integrated(battery: Battery, current, end: float) -> float:
    """Time until the charge falls to a share, by a general-purpose integrator of ds/dt = -I/capacity.

    In pieces between the kinks of the curve, time over charge.
    """
    nodes = np.array(battery_module.OPEN_CIRCUIT_VOLTAGE[battery.chemistry][0])
    inside = nodes[(nodes > end) & (nodes < battery.charge_left)]
    total = 0.0
    for high, low in zip([battery.charge_left, *inside[::-1]], [*inside[::-1], end], strict=True):
        done = solve_ivp(lambda s, _: [-battery.capacity / current(s)], (high, low), [0.0], rtol=1e-11, atol=1e-9)
        total += done.y[0, -1]
    return total


@pytest.mark.parametrize("chemistry", CHEMISTRIES)
@pytest.mark.parametrize(("drive", "thrust"), [(DRIVE, 5.0), (LOSSY, 10.0)], ids=["plain", "two motors, more losses"])
def test_holding_a_point_agrees_with_a_general_purpose_integrator(chemistry, drive, thrust):
    battery = replace(BATTERY, chemistry=chemistry, charge_left=0.93, usable_share=0.85, temperature=278.15)
    drive = replace(drive, battery=battery)
    point = drive.at_thrust(12.0, thrust)
    current, speed = float(point.motor_current), float(point.rpm) * math.pi / 30.0

    def drawn(charge: float) -> float:
        here = replace(battery, charge_left=float(charge))
        duty = duty_for(drive.motor, drive.controller, here, current, speed)
        found = solve_circuit(drive.motor, drive.controller, here, duty, speed)
        assert float(found.motor_current) == pytest.approx(current, rel=1e-9)
        return float(found.battery_current)

    assert float(hold_time(drive, point, battery)) == pytest.approx(integrated(battery, drawn, 0.15), rel=1e-8)


@pytest.mark.parametrize("chemistry", CHEMISTRIES)
def test_constant_power_agrees_with_a_general_purpose_integrator(chemistry):
    battery = replace(BATTERY, chemistry=chemistry, charge_left=0.97)

    def drawn(charge: float) -> float:
        voltage = 4.0 * float(cell_voltage(chemistry, charge))
        return float(np.roots([4 * 0.0024, -voltage, 600.0]).min())

    assert float(drain_time_at_power(battery, 600.0)) == pytest.approx(integrated(battery, drawn, 0.2), rel=1e-8)


def test_a_battery_that_cannot_give_the_power_ends_early():
    # P_max = Voc^2/(4 R) falls with the charge: at 3.80 V a cell, 40 % left, four cells of 50 mohm give 288.8 W.
    weak = replace(BATTERY, cell_resistance=0.05)
    assert replace(weak, charge_left=0.4).largest_power == pytest.approx(288.8)

    def drawn(charge: float) -> float:
        voltage = 4.0 * float(cell_voltage("lithium-polymer", charge))
        return (voltage - math.sqrt(max(voltage**2 - 4.0 * 0.2 * 288.8, 0.0))) / 0.4

    # The slope of the current has no bound at the end, which costs the general-purpose integrator some digits.
    assert float(drain_time_at_power(weak, 288.8)) == pytest.approx(integrated(weak, drawn, 0.4), rel=1e-6)
    assert float(drain_time_at_power(weak, 1.001 * weak.largest_power)) == 0.0
    assert float(drain_time_at_power(weak, 0.0)) == math.inf
    assert np.isnan(drain_time_at_power(weak, math.nan))
    with pytest.raises(InputError, match="power"):
        drain_time_at_power(weak, [1.0, -1.0])


@pytest.mark.parametrize("drive", [DRIVE, LOSSY], ids=["plain", "two motors, more losses"])
def test_a_point_ends_where_the_duty_runs_out(drive):
    point = drive.at_thrust(5.0, 30.0 if drive is DRIVE else 54.0)
    assert 0.85 < float(point.duty) < 1.0
    current, speed = float(point.motor_current), float(point.rpm) * math.pi / 30.0

    def duty_at(charge: float) -> float:
        return float(duty_for(drive.motor, drive.controller, replace(BATTERY, charge_left=charge), current, speed))

    low, high = 0.0, 1.0
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (low, middle) if duty_at(middle) <= 1.0 else (middle, high)
    assert 0.25 < high < 0.95

    def drawn(charge: float) -> float:
        here = replace(BATTERY, charge_left=float(charge))
        found = solve_circuit(drive.motor, drive.controller, here, min(duty_at(float(charge)), 1.0 - 1e-15), speed)
        return float(found.battery_current)

    assert float(hold_time(drive, point, BATTERY)) == pytest.approx(integrated(BATTERY, drawn, high), rel=1e-7)


def test_a_point_ends_where_the_battery_gives_no_more_power():
    # A pack so weak, and a motor of so low a voltage, that the largest power comes long before full duty.
    weak = replace(BATTERY, cell_resistance=0.05)
    motor = replace(MOTOR, speed_constant=2.0 * KV, winding_resistance=0.01)
    drive = replace(DRIVE, motor=motor, battery=weak, controller=Controller())
    point = drive.at_thrust(0.0, 17.0)
    power = float(point.motor_current * point.motor_voltage)
    assert replace(weak, charge_left=0.3).largest_power < power < weak.largest_power
    # An ideal controller passes the power on: the drain is one of constant power.
    expected = float(drain_time_at_power(weak, power))
    assert float(hold_time(drive, point, weak)) == pytest.approx(expected, rel=1e-9)
    assert expected < 0.8 * 18_000.0 / float(point.battery_current)


def test_ends_of_the_range():
    grid = DRIVE.at_throttle(np.array([[0.0], [12.0], [30.0]]), [0.0, 0.4, 1.0])
    held = hold_time(DRIVE, grid, BATTERY)
    assert held.shape == (3, 3)
    np.testing.assert_allclose(held[:, 0], 0.8 * 18_000.0 / 0.04, rtol=1e-12)  # the idle current alone
    assert np.all(held[:2, 2] == 0.0)  # full throttle has no voltage to spare
    assert 0.0 < held[0, 1] < 0.8 * 18_000.0 / grid.battery_current[0, 1]
    no_idle = replace(DRIVE, controller=Controller())
    assert float(hold_time(no_idle, no_idle.at_throttle(10.0, 0.0), BATTERY)) == math.inf
    unreached = DRIVE.at_thrust(10.0, 500.0)
    assert np.isnan(hold_time(DRIVE, unreached, BATTERY))
    empty = replace(BATTERY, charge_left=0.2)
    assert float(hold_time(DRIVE, DRIVE.at_thrust(10.0, 3.0), empty)) == pytest.approx(0.0, abs=1e-6)


def test_draining_at_a_throttle_agrees_with_a_general_purpose_integrator():
    def drawn(charge: float) -> float:
        drive = replace(LOSSY, battery=replace(BATTERY, charge_left=float(charge)))
        return float(drive.at_throttle(9.0, 0.7).battery_current)

    expected = integrated(BATTERY, drawn, 0.2)
    assert float(drain_time_at_throttle(LOSSY, 9.0, 0.7)) == pytest.approx(expected, rel=1e-8)
    # The propeller slows down, so the pack lasts longer than its charge over the first current.
    assert expected > 0.8 * 18_000.0 / drawn(1.0)


@pytest.mark.parametrize("chemistry", CHEMISTRIES)
def test_charge_at_a_voltage_is_the_inverse_of_the_curve(chemistry):
    charge = np.linspace(0.0, 1.0, 77)
    np.testing.assert_allclose(charge_at_voltage(chemistry, cell_voltage(chemistry, charge)), charge, atol=1e-14)
    assert float(charge_at_voltage(chemistry, 1.0)) == 0.0
    assert float(charge_at_voltage(chemistry, 5.0)) == math.inf


def test_a_regenerating_point_takes_nothing_from_the_battery():
    back = replace(DRIVE, controller=Controller(unpowered="regenerate"))
    point: OperatingPoints = back.at_throttle(35.0, 0.3)
    assert float(point.battery_current) < 0.0
    assert float(hold_time(back, point, BATTERY)) == math.inf
