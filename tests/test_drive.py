"""Motor, controller, battery and their equilibrium against closed forms, a general-purpose root finder and energy."""

from __future__ import annotations

import math
import timeit
from dataclasses import dataclass, replace

import numpy as np
import pytest
import shipped
from analytic_propeller import AnalyticPropeller
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq, minimize_scalar
from scipy.optimize.elementwise import find_root

from bemt.air import standard_air
from bemt.drive import (
    BarePropeller,
    Battery,
    Controller,
    Drive,
    Motor,
    cell_voltage,
    charge_at_voltage,
    duty_for,
    no_load_current_at,
    no_load_speed,
    peak_efficiency,
    peak_efficiency_current,
    solve_circuit,
    speed_constant_from_rpm,
    stall_torque,
)
from bemt.drive.roots import bracketed_root
from bemt.errors import InputError
from bemt.table.build_lookup import build_lookup

AIR = standard_air()
KV = speed_constant_from_rpm(690.0)
MOTOR = Motor(speed_constant=KV, winding_resistance=0.041, no_load=((10.0, 0.9),))
CONTROLLER = Controller(on_resistance=0.003, idle_current=0.04, switching_frequency=24e3, switching_time=60e-9)
BATTERY = Battery(cells_in_series=4, cell_resistance=0.0024, capacity=18_000.0, discharge_multiple=25.0)
PROPELLER = AnalyticPropeller()
DRIVE = Drive(PROPELLER, MOTOR, BATTERY, CONTROLLER, AIR)

# Every loss at once: a warm winding, ripple, diodes, a cold battery, two motors.
LOSSY_MOTOR = replace(MOTOR, count=2, winding_temperature=353.15, winding_inductance=15e-6)
LOSSY_CONTROLLER = replace(CONTROLLER, diode_voltage=0.7)
COLD_BATTERY = replace(BATTERY, cells_in_parallel=2, capacity=36_000.0, temperature=278.15)

AIRSPEED = np.linspace(0.0, 45.0, 31)[:, np.newaxis]
THROTTLE = np.linspace(0.0, 1.0, 21)


# --- motor ---------------------------------------------------------------------------------------------------------


def test_torque_constant_is_the_inverse_of_the_speed_constant():
    # Kt = 60/(2 pi Kv) with Kv in rpm/V: the two constants of a direct-current machine are one.
    assert MOTOR.torque_constant == pytest.approx(60.0 / (2.0 * math.pi * 690.0), rel=1e-14)


def test_unloaded_speed_of_a_common_motor():
    # Common practice, no source: 1000 rpm/V on 10 V turns about 10 000 rpm unloaded, a little less.
    motor = Motor(speed_constant_from_rpm(1000.0), 0.05, ((10.0, 1.0),))
    rpm = float(no_load_speed(motor, 10.0)) * 30.0 / math.pi
    assert 9_500.0 < rpm < 10_000.0


def test_peak_efficiency_example():
    # Textbook motor of constant R and I0 at 11.1 V, 0.05 ohm, 1.2 A: worked by hand, 16.32 A and 0.8584.
    motor = Motor(KV, 0.05, ((11.1, 1.2),))
    assert float(peak_efficiency_current(motor, 11.1)) == pytest.approx(16.32, abs=0.005)
    assert float(peak_efficiency(motor, 11.1)) == pytest.approx(0.8584, abs=5e-5)


def test_peak_efficiency_is_the_largest_the_motor_equations_give():
    def efficiency(current: float) -> float:
        speed = KV * (11.1 - current * MOTOR.winding_resistance)
        return float(MOTOR.torque(current, speed)) * speed / (11.1 * current)

    best = minimize_scalar(lambda current: -efficiency(current), bounds=(2.0, 100.0), options={"xatol": 1e-9})
    assert float(peak_efficiency(MOTOR, 11.1)) == pytest.approx(-best.fun, rel=1e-12)
    assert float(peak_efficiency_current(MOTOR, 11.1)) == pytest.approx(best.x, rel=1e-5)


def test_shaft_power_is_largest_half_way_to_the_stall_current():
    # dP/dI = 0 of (V - I R)(I - I0).
    def power(current: float) -> float:
        speed = KV * (11.1 - current * MOTOR.winding_resistance)
        return float(MOTOR.torque(current, speed)) * speed

    best = minimize_scalar(lambda current: -power(current), bounds=(1.0, 270.0), options={"xatol": 1e-9})
    assert best.x == pytest.approx((11.1 / MOTOR.winding_resistance + 0.9) / 2.0, rel=1e-6)


def test_ends_of_the_torque_line():
    assert float(no_load_speed(MOTOR, 12.0)) == pytest.approx(KV * (12.0 - 0.9 * 0.041), rel=1e-14)
    assert float(stall_torque(MOTOR, 12.0)) == pytest.approx((12.0 / 0.041 - 0.9) / KV, rel=1e-14)


@pytest.mark.parametrize(
    "readings",
    [((10.0, 0.9),), ((7.0, 0.7), (14.0, 1.1)), ((14.0, 1.3), (7.0, 0.5), (10.0, 0.8)), ((6.0, 0.4), (12.0, 1.6))],
)
def test_no_load_readings_are_reproduced_exactly(readings):
    motor = replace(MOTOR, no_load=readings)
    for voltage, current in readings:
        speed = float(no_load_speed(motor, voltage))
        assert speed == pytest.approx(KV * (voltage - current * motor.winding_resistance), rel=1e-14)
        assert float(motor.no_load_current(speed)) == pytest.approx(current, rel=1e-13)
        # Running free: the whole current overcomes the motor's own drag, at the voltage that was read.
        assert float(motor.torque(current, speed)) == pytest.approx(0.0, abs=1e-14)
        stiff = replace(BATTERY, cell_resistance=0.0)
        free = solve_circuit(motor, Controller(), stiff, voltage / stiff.open_circuit_voltage, speed)
        assert float(free.motor_current) == pytest.approx(current, rel=1e-11)


def test_no_load_current_agrees_over_speed_and_voltage():
    motor = replace(MOTOR, no_load=((7.0, 0.5), (10.0, 0.8), (14.0, 1.3)))
    voltage = np.linspace(2.0, 20.0, 37)
    by_voltage = no_load_current_at(motor, voltage)
    np.testing.assert_allclose(motor.no_load_current(no_load_speed(motor, voltage)), by_voltage, rtol=1e-12, atol=1e-14)


def test_a_warm_motor_is_one_of_more_resistance():
    # IEC 60028: copper's resistance grows by 0.393 % of that at 20 degrees Celsius for each kelvin.
    warm = replace(MOTOR, no_load=((7.0, 0.5), (10.0, 0.8), (14.0, 1.3)), winding_temperature=273.15 + 95.0)
    assert warm.resistance == pytest.approx(0.041 * (1.0 + 0.00393 * 75.0), rel=1e-14)
    voltage = np.linspace(6.0, 20.0, 29)
    speed = no_load_speed(warm, voltage)
    # The drag is that of the readings at the same speed, taken on a cold motor; the voltage is that of the warm one.
    cold = replace(warm, winding_temperature=293.15)
    np.testing.assert_allclose(warm.no_load_current(speed), cold.no_load_current(speed), rtol=1e-14)
    np.testing.assert_allclose(speed / KV + warm.no_load_current(speed) * warm.resistance, voltage, rtol=1e-13)
    assert float(stall_torque(warm, 12.0)) == pytest.approx(
        (12.0 / warm.resistance - float(warm.no_load_current(0.0))) / KV, rel=1e-14
    )
    other = replace(MOTOR, winding_resistance=0.041 * (1.0 + 0.00393 * 75.0))
    ours = Drive(PROPELLER, replace(MOTOR, winding_temperature=273.15 + 95.0), BATTERY, CONTROLLER, AIR)
    theirs = replace(ours, motor=other)
    for name in ("rpm", "motor_current", "battery_current", "motor_efficiency"):
        np.testing.assert_allclose(
            getattr(ours.at_throttle(AIRSPEED, THROTTLE), name),
            getattr(theirs.at_throttle(AIRSPEED, THROTTLE), name),
            rtol=1e-9,
            atol=1e-10,
        )


def test_no_load_current_never_turns_into_a_gain():
    steep = replace(MOTOR, no_load=((8.0, 0.2), (10.0, 0.9)))
    assert float(steep.no_load_current(0.0)) == 0.0


def test_winding_temperature_is_the_fixed_point_of_its_own_resistance():
    motor = replace(MOTOR, thermal_resistance=2.1)
    temperature = 20.0
    for _ in range(200):
        resistance = 0.041 * (1.0 + 0.00393 * (temperature - 20.0))
        temperature = 15.0 + 2.1 * (20.0**2 * resistance + 0.9 * 500.0 / KV)
    assert float(motor.steady_temperature(20.0, 500.0, 288.15)) == pytest.approx(temperature, rel=1e-12)
    assert np.isinf(motor.steady_temperature(60.0, 500.0, 288.15))
    assert np.isnan(MOTOR.steady_temperature(20.0, 500.0, 288.15))


# --- battery and controller ----------------------------------------------------------------------------------------


def test_pack_of_cells():
    pack = Battery(
        cells_in_series=6,
        cells_in_parallel=2,
        cell_resistance=0.003,
        capacity=36_000.0,
        discharge_multiple=20.0,
        charge_left=0.5,
        usable_share=0.8,
    )
    assert pack.resistance == pytest.approx(6 * 0.003 / 2)
    assert pack.open_circuit_voltage == pytest.approx(6 * 3.84)
    assert pack.current_limit == pytest.approx(200.0)  # 20 times 10 A h per hour
    assert pack.usable_charge == pytest.approx(0.3 * 36_000.0)  # half is left, a fifth has to stay
    assert replace(pack, charge_left=0.1).usable_charge == 0.0


def test_cell_voltages():
    # Common practice, no source: a lithium-polymer cell is full at 4.20 V and nearly flat around 3.7 to 3.8 V.
    assert float(cell_voltage("lithium-polymer", 1.0)) == 4.20
    assert 3.7 < float(cell_voltage("lithium-polymer", 0.3)) < 3.8
    for chemistry in ("lithium-polymer", "lithium-ion"):
        assert np.all(np.diff(cell_voltage(chemistry, np.linspace(0.0, 1.0, 101))) > 0.0)


def test_pack_at_constant_power():
    # I = (Voc - sqrt(Voc^2 - 4 R P))/(2 R), the closed form of a source behind a resistance.
    points = DRIVE.at_throttle(0.0, THROTTLE[1:])
    voltage, resistance = BATTERY.open_circuit_voltage, BATTERY.resistance
    current = (voltage - np.sqrt(voltage**2 - 4.0 * resistance * points.battery_power)) / (2.0 * resistance)
    np.testing.assert_allclose(points.battery_current, current, rtol=1e-10)


def test_largest_power_of_a_battery():
    # P = Vb Ib is largest at Ib = Voc/(2 R), and is Voc^2/(4 R) there.
    pack = replace(BATTERY, cell_resistance=0.02, charge_left=0.7)
    voltage, resistance = 4.0 * 3.95, 0.08
    best = minimize_scalar(lambda current: -current * (voltage - current * resistance), bounds=(0.0, 200.0))
    assert pack.largest_power == pytest.approx(-best.fun, rel=1e-10)
    assert replace(pack, cell_resistance=0.0).largest_power == math.inf
    # The drive comes near it where it is bound by its battery, and never beyond.
    motor = replace(MOTOR, speed_constant=2.0 * KV, winding_resistance=0.005)
    drawn = (
        Drive(PROPELLER, motor, pack, Controller(), AIR).at_throttle(0.0, np.linspace(0.05, 1.0, 2001)).battery_power
    )
    assert 0.999 * pack.largest_power < drawn.max() <= pack.largest_power


def test_a_battery_resists_more_in_the_cold():
    # From memory: twice the resistance at the freezing point of water. Arrhenius's law is straight over 1/T.
    assert replace(BATTERY, temperature=273.15).resistance == pytest.approx(2.0 * BATTERY.resistance, rel=1e-3)
    inverse = np.linspace(1.0 / 313.15, 1.0 / 253.15, 9)
    logs = [math.log(replace(BATTERY, temperature=1.0 / value).resistance) for value in inverse]
    np.testing.assert_allclose(np.diff(logs, 2), 0.0, atol=1e-13)
    assert np.all(np.diff(logs) > 0.0)


def test_throttle_map_and_its_inverse():
    controller = Controller(throttle_map=((0.0, 0.0), (0.1, 0.0), (0.6, 0.4), (0.7, 0.4), (0.9, 0.95), (1.0, 0.95)))
    np.testing.assert_allclose(controller.duty([0.0, 0.05, 0.35, 0.65, 0.8, 1.0]), [0.0, 0.0, 0.2, 0.4, 0.675, 0.95])
    np.testing.assert_allclose(controller.throttle([0.0, 0.2, 0.4, 0.675, 0.95]), [0.0, 0.35, 0.6, 0.8, 0.9])
    assert np.isnan(controller.throttle([0.96, -0.01, np.nan])).all()
    duty = np.linspace(0.0, 0.95, 77)
    np.testing.assert_allclose(controller.duty(controller.throttle(duty)), duty, atol=1e-15)


@settings(deadline=None, max_examples=200)
@given(
    duty=st.one_of(st.just(0.0), st.just(1.0), st.floats(0.01, 0.99)),
    speed=st.floats(0.0, 4000.0),
    count=st.integers(1, 8),
    resistance=st.floats(0.005, 0.5),
    on_resistance=st.floats(0.0, 0.05),
    cell_resistance=st.floats(0.0, 0.01),
    idle=st.floats(0.0, 0.2),
    unpowered=st.sampled_from(["freewheel", "regenerate", "brake"]),
    inductance=st.one_of(st.none(), st.floats(1e-6, 1e-3)),
    diode=st.one_of(st.just(0.0), st.floats(0.3, 1.2)),
)
def test_circuit_equations_close(
    duty, speed, count, resistance, on_resistance, cell_resistance, idle, unpowered, inductance, diode
):
    motor = Motor(KV, resistance, ((20.0, 0.5),), count=count, winding_inductance=inductance)
    diode = 0.0 if unpowered == "regenerate" else diode
    controller = Controller(on_resistance, None, idle, unpowered, 24e3, 400e-9, diode)
    battery = Battery(4, cell_resistance, 18_000.0)
    found = solve_circuit(motor, controller, battery, duty, speed)
    current, voltage = float(found.motor_current), float(found.battery_voltage)
    switching = 0.5 * 400e-9 * 24e3 * abs(current) if 0.0 < duty < 1.0 else 0.0
    swing = 0.0
    if inductance is not None and current != 0.0:
        swing = voltage * duty * (1.0 - duty) / (inductance * 24e3)
    assert float(found.ripple_current) == pytest.approx(swing, rel=1e-12)
    assert float(found.rms_current) == pytest.approx(math.sqrt(current**2 + swing**2 / 12.0), rel=1e-12)
    switching += (resistance + on_resistance) * swing**2 / 12.0 / voltage
    freewheels = (1.0 - duty) * diode if duty > 0.0 else 0.0

    assert float(found.motor_voltage) == pytest.approx(speed / KV + current * resistance, abs=1e-10)
    assert float(found.battery_current) == pytest.approx(count * (duty * current + switching + idle), abs=1e-10)
    assert voltage == pytest.approx(
        battery.open_circuit_voltage - float(found.battery_current) * battery.resistance, abs=1e-10
    )
    blocked = unpowered == "freewheel" or (unpowered == "brake" and duty > 0.0)
    if blocked and current == 0.0:
        # Nothing flows, so the back-EMF must be at least what the controller offers, the ripple of a current included.
        ripple = 0.0 if inductance is None else (duty * (1.0 - duty) / (inductance * 24e3)) ** 2 / 12.0
        sags = 1.0 + count * battery.resistance * (resistance + on_resistance) * ripple
        assert speed / KV >= duty * voltage / sags - freewheels - 1e-10
    else:
        assert float(found.motor_voltage) == pytest.approx(
            duty * voltage - freewheels - current * on_resistance, abs=1e-10
        )
        assert current >= 0.0 or not blocked


@pytest.mark.parametrize("diode", [0.0, 0.8])
@pytest.mark.parametrize("inductance", [None, 1.0, 20e-6, 2e-6])
def test_duty_for_a_current_is_the_inverse_of_the_circuit(diode, inductance):
    duty, speed = np.meshgrid(np.linspace(0.05, 0.99, 20), np.linspace(0.0, 150.0, 7))
    motor, controller = replace(MOTOR, count=3, winding_inductance=inductance), replace(CONTROLLER, diode_voltage=diode)
    current = solve_circuit(motor, controller, BATTERY, duty, speed).motor_current
    driven = current > 0.0
    assert driven.sum() > 100
    found = duty_for(motor, controller, BATTERY, current, speed)
    np.testing.assert_allclose(found[driven], duty[driven], rtol=1e-11)


@pytest.mark.parametrize("duty", [0.2, 0.5, 0.85])
@pytest.mark.parametrize("diode", [0.0, 0.7])
def test_the_averages_are_those_of_the_switched_current(duty, diode):
    # The current of resistance, inductance and back-EMF under pulses, in its periodic state: an exponential towards
    # each of two levels. Straight ramps are its limit; here a period is 1/60 of the time constant.
    inductance, frequency, emf_share, voltage = 44e-6, 60e3, 0.9, 16.0
    total = 0.041 + 0.003
    emf = emf_share * (duty * voltage - (1.0 - duty) * diode)
    on, off = (voltage - emf) / total, (-diode - emf) / total
    period, rate = 1.0 / frequency, total / inductance
    decay_on, decay_off = math.exp(-rate * duty * period), math.exp(-rate * (1.0 - duty) * period)
    # lowest -> highest while on, highest -> lowest while off
    lowest = (off * (1.0 - decay_off) + on * (1.0 - decay_on) * decay_off) / (1.0 - decay_on * decay_off)
    highest = on + (lowest - on) * decay_on
    assert lowest > 0.0
    nodes, weights = np.polynomial.legendre.leggauss(40)
    share, weights = 0.5 * (nodes + 1.0), 0.5 * weights
    while_on = on + (lowest - on) * np.exp(-rate * duty * period * share)
    while_off = off + (highest - off) * np.exp(-rate * (1.0 - duty) * period * share)
    mean = duty * weights @ while_on + (1.0 - duty) * weights @ while_off
    mean_square = duty * weights @ while_on**2 + (1.0 - duty) * weights @ while_off**2
    drawn = duty * weights @ while_on

    motor = Motor(KV, 0.041, ((10.0, 0.9),), winding_inductance=inductance)
    controller = Controller(on_resistance=0.003, switching_frequency=frequency, diode_voltage=diode)
    full = Battery(4, 0.0, 18_000.0)
    battery = replace(full, charge_left=float(charge_at_voltage("lithium-polymer", voltage / 4.0)))
    found = solve_circuit(motor, controller, battery, duty, emf * KV)
    assert float(found.motor_current) == pytest.approx(mean, rel=1e-9)
    # What a diode adds to the swing is left out of the model.
    left_out = 1.0 + diode / voltage
    assert left_out * float(found.ripple_current) == pytest.approx(highest - lowest, rel=1e-3)
    swing_square = float(found.rms_current) ** 2 - float(found.motor_current) ** 2
    assert left_out**2 * swing_square == pytest.approx(mean_square - mean**2, rel=2e-3)
    if diode == 0.0:
        ripple = float(found.battery_current) - duty * float(found.motor_current)
        assert ripple == pytest.approx(drawn - duty * mean, rel=5e-3)


def test_no_duty_gives_more_power_than_the_battery_has():
    weak = replace(BATTERY, cell_resistance=0.05)  # at most Voc^2/(4 R) = 353 W
    assert np.isnan(duty_for(MOTOR, Controller(), weak, 60.0, 600.0))
    assert np.isnan(duty_for(MOTOR, Controller(), BATTERY, -1.0, 600.0))


# --- root finder ---------------------------------------------------------------------------------------------------


def test_roots_agree_with_a_general_purpose_library():
    shape = np.linspace(0.2, 9.0, 400)

    def curve(x, a):
        return x**3 + a * x - 2.0 + np.exp(0.2 * a * x) - 0.1 * np.sin(x)

    low, high = np.full(shape.size, -1.0), np.full(shape.size, 6.0)
    ours = bracketed_root(lambda x, i: curve(x, shape[i]), low, high, curve(low, shape), curve(high, shape))
    theirs = find_root(curve, (low, high), args=(shape,)).x
    np.testing.assert_allclose(ours, theirs, rtol=1e-14, atol=1e-15)


def test_roots_at_an_end_without_a_bracket_and_of_a_jump():
    low, high = np.zeros(4), np.ones(4)

    def function(x, index):
        return np.choose(index, [x - 0.25, x + 1.0, np.where(x < 0.7, -1.0, 1.0), np.where(x < 0.4, x - 0.5, np.nan)])

    at_low, at_high = np.array([-0.25, 1.0, -1.0, -0.5]), np.array([0.75, 2.0, 1.0, 0.5])
    found = bracketed_root(function, low, high, at_low, at_high)
    assert found[0] == pytest.approx(0.25, rel=1e-15)
    assert np.isnan(found[1])
    assert found[2] == pytest.approx(0.7, rel=1e-15)
    assert np.isnan(found[3])
    assert bracketed_root(function, low[:1], high[:1], np.zeros(1), np.ones(1))[0] == 0.0


# --- equilibrium ---------------------------------------------------------------------------------------------------


def test_equilibrium_of_constant_power_coefficient():
    # C w^2 + b w - k = 0 with C = CP rho D^5/(2 pi)^3, b = 1/(Kv^2 Re), k = (d Voc/Re - I0)/Kv.
    propeller = AnalyticPropeller(power=(0.042, 0.0, 0.0))
    controller = Controller(on_resistance=0.003)
    drive = Drive(propeller, MOTOR, BATTERY, controller, AIR)
    duty = np.linspace(0.1, 1.0, 19)
    total = 0.041 + 0.003 + duty**2 * BATTERY.resistance
    c = 0.042 * AIR.density * propeller.diameter**5 / (2.0 * math.pi) ** 3
    b = 1.0 / (KV**2 * total)
    k = (duty * BATTERY.open_circuit_voltage / total - 0.9) / KV
    speed = (-b + np.sqrt(b**2 + 4.0 * c * k)) / (2.0 * c)
    np.testing.assert_allclose(drive.at_throttle(0.0, duty).rpm, speed * 30.0 / math.pi, rtol=1e-12)


@pytest.mark.parametrize("unpowered", ["freewheel", "regenerate", "brake"])
@pytest.mark.parametrize("every_loss", [False, True], ids=["plain", "every loss"])
def test_equations_close_at_every_point(unpowered, every_loss):
    # 120 airspeeds from standing still to far beyond the windmill, 60 throttles: driven, freewheeling, regenerating.
    motor, battery = (LOSSY_MOTOR, COLD_BATTERY) if every_loss else (MOTOR, BATTERY)
    diode = 0.7 if every_loss and unpowered != "regenerate" else 0.0
    controller = replace(CONTROLLER, unpowered=unpowered, diode_voltage=diode)
    airspeed, throttle = np.linspace(0.0, 45.0, 120)[:, np.newaxis], np.linspace(0.0, 1.0, 60)
    points = Drive(PROPELLER, motor, battery, controller, AIR).at_throttle(airspeed, throttle)
    assert points.rpm.shape == (120, 60)
    assert np.all(points.status == 1)
    speed, current, duty = points.rpm * math.pi / 30.0, points.motor_current, points.duty
    turns = points.rpm > 0.0
    assert turns.mean() > 0.9
    assert (current > 0.0).sum() > 2000
    assert (points.torque < 0.0).sum() > 300  # the wind drives the propeller at many of these
    assert ((current < 0.0).sum() > 300) == (unpowered == "regenerate")

    # Everything below from the reported numbers.
    resistance = 0.041 * (1.0 + 0.00393 * 60.0) if every_loss else 0.041
    chops = (duty > 0.0) & (duty < 1.0)
    swing = np.zeros(points.rpm.shape)
    if every_loss:
        swing = np.where(current != 0.0, points.battery_voltage * duty * (1.0 - duty) / (15e-6 * 24e3), 0.0)
    pack = battery.cells_in_series * battery.cell_resistance / battery.cells_in_parallel
    pack *= math.exp(2775.0 * (1.0 / 278.15 - 1.0 / 293.15)) if every_loss else 1.0

    loads = PROPELLER.loads(airspeed, points.rpm, AIR)
    np.testing.assert_allclose(points.torque, loads.torque, rtol=1e-14, atol=1e-14)
    np.testing.assert_allclose((current - 0.9)[turns] / KV, points.torque[turns], rtol=1e-10, atol=1e-10)
    np.testing.assert_allclose(points.motor_voltage, speed / KV + current * resistance, rtol=1e-10, atol=1e-10)
    np.testing.assert_allclose(
        points.battery_voltage, battery.open_circuit_voltage - points.battery_current * pack, rtol=1e-10
    )
    flows = current != 0.0
    offered = duty * points.battery_voltage - np.where(chops, (1.0 - duty) * diode, 0.0) - current * 0.003
    np.testing.assert_allclose(points.motor_voltage[flows], offered[flows], rtol=1e-10, atol=1e-10)

    # Power: the battery's is the shaft's and every loss. Where nothing turns the motor holds the propeller for nothing.
    heat = (resistance + 0.003) * (current**2 + swing**2 / 12.0)
    drawn = points.battery_voltage * (0.04 + np.where(chops, 0.5 * 60e-9 * 24e3, 0.0) * np.abs(current))
    freewheels = np.where(chops, (1.0 - duty) * diode, 0.0) * current
    spent = motor.count * (points.shaft_power + heat + 0.9 * speed / KV + drawn + freewheels)
    np.testing.assert_allclose(points.battery_power, spent, rtol=1e-10, atol=1e-10 * np.abs(spent).max())
    if every_loss:
        assert (motor.count * swing**2 / 12.0 * resistance).max() > 1.0  # the new losses are no rounding
        in_motor = points.motor_voltage * current + resistance * swing**2 / 12.0
        known = np.isfinite(points.motor_efficiency)
        np.testing.assert_allclose((points.motor_efficiency * in_motor)[known], points.shaft_power[known], rtol=1e-10)


def test_the_battery_gives_less_current_than_the_motor_takes_at_part_throttle():
    # A controller that loses nothing is a transformer: Vb Ib = Vm I, and Ib = d I.
    ideal = Drive(PROPELLER, MOTOR, BATTERY, Controller(), AIR).at_throttle(0.0, THROTTLE[1:])
    np.testing.assert_allclose(ideal.battery_current, ideal.duty * ideal.motor_current, rtol=1e-12)
    np.testing.assert_allclose(ideal.battery_power, ideal.motor_voltage * ideal.motor_current, rtol=1e-12)
    half = DRIVE.at_throttle(0.0, 0.5)
    assert 0.5 * float(half.motor_current) < float(half.battery_current) < 0.6 * float(half.motor_current)
    full = DRIVE.at_throttle(0.0, 1.0)
    assert float(full.battery_current) == pytest.approx(float(full.motor_current) + 0.04, rel=1e-12)


def test_ripple_heats_the_winding():
    motor = replace(MOTOR, thermal_resistance=0.9)
    rippled = replace(motor, winding_inductance=15e-6)
    plain, more = (Drive(PROPELLER, m, BATTERY, CONTROLLER, AIR).at_throttle(0.0, 0.5) for m in (motor, rippled))
    swing = float(more.battery_voltage) * 0.25 / (15e-6 * 24e3)
    mean_square = float(more.motor_current) ** 2 + swing**2 / 12.0
    speed = float(more.rpm) * math.pi / 30.0
    expected = float(motor.steady_temperature(math.sqrt(mean_square), speed, AIR.temperature))
    assert float(more.winding_temperature) == pytest.approx(expected, rel=1e-12)
    assert expected > float(plain.winding_temperature) + 0.3  # 0.9 K/W times 41 mohm times 11.4 A squared over 12


def test_a_higher_speed_constant_wants_a_smaller_propeller_for_the_same_current():
    # Common practice, no source; here found: the diameter that draws 25 A at full throttle, standing still.
    diameters = []
    for rpm_per_volt in range(500, 1201, 100):
        motor = replace(MOTOR, speed_constant=speed_constant_from_rpm(rpm_per_volt))

        def excess(diameter: float, motor: Motor = motor) -> float:
            drive = Drive(AnalyticPropeller(diameter=diameter), motor, BATTERY, CONTROLLER, AIR)
            return float(drive.at_throttle(0.0, 1.0).motor_current) - 25.0

        diameters.append(brentq(excess, 0.05, 1.0, rtol=1e-10))
    assert np.all(np.diff(diameters) < 0.0)
    # Closed form: the current fixes back-EMF and torque; torque (I - I0)/Kv over speed squared goes as Kv^-3 = D^5.
    np.testing.assert_allclose(diameters, diameters[0] * (np.arange(500, 1201, 100) / 500.0) ** -0.6, rtol=1e-8)


def test_a_propeller_needs_at_least_the_ideal_power():
    # Momentum theory: T^1.5/sqrt(2 rho A); 10 N on a disk of 10 in need 90 W.
    case = shipped.case("sandpiper")
    propeller = replace(case.propeller, diameter=0.254)
    air = standard_air()
    ideal = 10.0**1.5 / math.sqrt(2.0 * air.density * math.pi * 0.127**2)
    assert ideal == pytest.approx(90.0, abs=0.5)
    bare = BarePropeller(build_lookup(propeller, air, case.model), 20_000.0, air)
    point = bare.at_thrust(0.0, 10.0)
    assert float(point.thrust) == pytest.approx(10.0, rel=1e-10)
    # Common practice, no source: such a propeller reaches some 0.5 to 0.75 of it standing still.
    assert 0.45 < ideal / float(point.shaft_power) < 0.8


def test_a_whole_grid_is_a_hundred_times_as_fast_as_one_root_a_point():
    case = shipped.case("sandpiper")
    drive = Drive(build_lookup(case.propeller, case.air, case.model), case.motor, case.battery, case.controller, AIR)
    airspeed, throttle = np.linspace(0.0, 30.0, 120)[:, np.newaxis], np.linspace(1.0 / 60.0, 1.0, 60)

    def one(speed: float, stick: float) -> float:
        total = 0.041 + 0.003 + stick * (stick + 0.5 * 60e-9 * 24e3) * 0.0096
        voltage = stick * (16.8 - 0.04 * 0.0096)

        def surplus(turning: float) -> float:
            offered = (max((voltage - turning / KV) / total, 0.0) - 0.9) / KV
            return offered - float(drive.propeller.loads(speed, turning * 30.0 / math.pi, air=AIR).torque)

        return float(brentq(surplus, 1e-6, 1500.0, xtol=1e-10)) * 30.0 / math.pi

    grid = drive.at_throttle(airspeed, throttle)
    took = min(timeit.repeat(lambda: drive.at_throttle(airspeed, throttle), number=1, repeat=5)) / 7200
    places = [(i, j) for i in (0, 25, 50) for j in (30, 45, 58)]
    for i, j in places:
        assert one(float(airspeed[i, 0]), float(throttle[j])) == pytest.approx(float(grid.rpm[i, j]), rel=1e-10)
    singly = min(
        timeit.repeat(lambda: [one(float(airspeed[i, 0]), float(throttle[j])) for i, j in places], number=1, repeat=3)
    ) / len(places)
    print(f"grid of 7200 points {took * 7200e3:.1f} ms, {singly / took:.0f} times as fast as one root a point")
    assert singly > 100.0 * took


@pytest.mark.parametrize(("airspeed", "throttle"), [(0.0, 0.3), (12.0, 0.5), (20.0, 1.0), (30.0, 0.05), (40.0, 0.0)])
@pytest.mark.parametrize("unpowered", ["freewheel", "regenerate", "brake"])
def test_equilibrium_agrees_with_a_general_purpose_root(airspeed, throttle, unpowered):
    controller = Controller(on_resistance=0.003, unpowered=unpowered)

    def surplus(speed: float) -> float:
        drive = throttle * BATTERY.open_circuit_voltage - speed / KV
        current = drive / (0.041 + 0.003 + throttle**2 * BATTERY.resistance)
        if unpowered == "freewheel" or (unpowered == "brake" and throttle > 0.0):
            current = max(current, 0.0)
        taken = float(PROPELLER.loads(airspeed, speed * 30.0 / math.pi, AIR).torque)
        return (current - 0.9) / KV - taken

    expected = brentq(surplus, 1e-9, 5000.0, xtol=1e-13, rtol=1e-14)
    found = Drive(PROPELLER, MOTOR, BATTERY, controller, AIR).at_throttle(airspeed, throttle)
    assert float(found.rpm) == pytest.approx(expected * 30.0 / math.pi, rel=1e-11)


def test_one_call_and_many_agree():
    grid = DRIVE.at_throttle(AIRSPEED, THROTTLE)
    for i, j in ((0, 0), (3, 12), (17, 2), (30, 20)):
        single = DRIVE.at_throttle(float(AIRSPEED[i, 0]), float(THROTTLE[j]))
        assert float(single.rpm) == pytest.approx(float(grid.rpm[i, j]), rel=1e-13, abs=1e-12)
        assert single.rpm.shape == ()


def test_rpm_rises_with_the_stick_and_with_the_wind():
    rpm = DRIVE.at_throttle(AIRSPEED, THROTTLE).rpm
    assert np.all(np.diff(rpm, axis=1) >= -1e-9)
    # In slow air this propeller's power coefficient still rises with J; once it falls, the wind unloads the motor.
    assert np.all(np.diff(rpm[5:, -1]) > 0.0)


@pytest.mark.parametrize(
    "drive", [DRIVE, Drive(PROPELLER, LOSSY_MOTOR, COLD_BATTERY, LOSSY_CONTROLLER, AIR)], ids=["plain", "every loss"]
)
def test_efficiencies_multiply_to_the_overall_one(drive):
    points = drive.at_throttle(AIRSPEED, THROTTLE)
    chain = (
        points.propeller_efficiency * points.motor_efficiency * points.controller_efficiency * points.battery_efficiency
    )
    np.testing.assert_allclose(points.overall_efficiency, chain, rtol=1e-12)
    assert np.isfinite(chain).sum() > 100
    propels = (points.thrust >= 0.0) & (points.shaft_power > 0.0)
    np.testing.assert_array_equal(np.isfinite(points.propeller_efficiency), propels)
    assert np.all(points.propeller_efficiency[0][propels[0]] == 0.0)
    for efficiency in (points.motor_efficiency, points.controller_efficiency, points.battery_efficiency):
        known = efficiency[np.isfinite(efficiency)]
        assert np.all((known >= 0.0) & (known <= 1.0))


def test_standing_still():
    points = DRIVE.at_throttle([0.0, 1.0, 20.0], 0.0)
    # At rest in still air, and in a breath of wind that does not overcome the motor's own drag.
    assert points.rpm[0] == points.rpm[1] == 0.0
    assert points.thrust[0] == points.torque[0] == 0.0
    assert points.thrust[1] < 0.0
    assert points.torque[1] < 0.0
    assert points.rpm[2] > 0.0
    np.testing.assert_allclose(points.battery_current, 0.04)
    assert np.isnan(points.propeller_efficiency).all()


def test_glide_at_no_throttle():
    def glide(unpowered: str):
        return Drive(PROPELLER, MOTOR, BATTERY, Controller(unpowered=unpowered), AIR).at_throttle(25.0, 0.0)

    free, back, brake = glide("freewheel"), glide("regenerate"), glide("brake")
    assert float(free.motor_current) == 0.0
    # Freewheeling the wind turns only the motor's own drag: the propeller gives up torque 0.9 A/Kv.
    assert float(free.torque) == pytest.approx(-0.9 / KV, rel=1e-12)
    assert float(free.motor_voltage) == pytest.approx(float(free.rpm) * math.pi / 30.0 / KV, rel=1e-12)
    # At duty zero regeneration shorts the leads as a brake does; nothing reaches the battery.
    assert float(brake.rpm) == float(back.rpm) < 0.3 * float(free.rpm)
    assert float(brake.motor_voltage) == pytest.approx(0.0, abs=1e-10)
    assert float(brake.motor_current) < 0.0


def test_regeneration_charges_the_battery():
    free = Drive(PROPELLER, MOTOR, BATTERY, Controller(), AIR).at_throttle(35.0, 0.3)
    back = Drive(PROPELLER, MOTOR, BATTERY, Controller(unpowered="regenerate"), AIR).at_throttle(35.0, 0.3)
    assert float(free.battery_current) == 0.0
    assert float(back.battery_current) < 0.0
    assert float(back.battery_voltage) > BATTERY.open_circuit_voltage
    assert float(back.rpm) < float(free.rpm)
    # What reaches the battery is what the wind gives less the losses.
    current, speed = float(back.motor_current), float(back.rpm) * math.pi / 30.0
    losses = current**2 * 0.041 + 0.9 * speed / KV
    assert float(back.battery_power) == pytest.approx(float(back.shaft_power) + losses, rel=1e-10)


@dataclass(frozen=True)
class HesitantPropeller(AnalyticPropeller):
    """Takes extra torque around 1500 rpm, as a blade may on its way out of stall."""

    def loads(self, airspeed, rpm, air=None):
        found = super().loads(airspeed, rpm, air)
        return replace(found, torque=found.torque + 0.3 * np.exp(-(((np.asarray(rpm) - 1500.0) / 300.0) ** 2)))


@pytest.mark.parametrize(
    ("propeller", "falling", "rising"),
    [
        # Gives no torque while stopped but windmills once it turns: standing still is an equilibrium too.
        (AnalyticPropeller(power=(0.042, -0.040, 0.0)), 1, 1),
        # Windmills slowly in its hesitation, or fast beyond it.
        (HesitantPropeller(), 2, 1),
    ],
)
def test_the_fastest_of_several_equilibria_is_taken(propeller, falling, rising):
    drive = Drive(propeller, MOTOR, BATTERY, Controller(), AIR)
    found = float(drive.at_throttle(20.0, 0.0).rpm)
    rpm = np.linspace(0.0, 8000.0, 400_001)
    surplus = -0.9 / KV - propeller.loads(20.0, rpm, AIR).torque
    falls = np.flatnonzero((surplus[:-1] > 0.0) & (surplus[1:] <= 0.0))
    rises = np.flatnonzero((surplus[:-1] < 0.0) & (surplus[1:] >= 0.0))
    assert (falls.size, rises.size) == (falling, rising)
    assert found == pytest.approx(rpm[falls[-1]], abs=0.05)


def test_a_gear_is_another_speed_constant():
    # A motor of three times the speed constant behind a lossless 3:1 gear is the motor without it, at the same R and
    # no-load reading: speed, torque, current alike at the propeller.
    geared = replace(MOTOR, speed_constant=3.0 * KV, gear_ratio=3.0)
    ours = Drive(PROPELLER, geared, BATTERY, CONTROLLER, AIR).at_throttle(AIRSPEED, THROTTLE)
    direct = DRIVE.at_throttle(AIRSPEED, THROTTLE)
    for name in ("rpm", "thrust", "torque", "shaft_power", "motor_current", "battery_current"):
        np.testing.assert_allclose(getattr(ours, name), getattr(direct, name), rtol=1e-9, atol=1e-9, err_msg=name)


def test_a_gear_loses_power_both_ways():
    geared = replace(MOTOR, speed_constant=3.0 * KV, gear_ratio=3.0, gear_efficiency=0.94)
    points = Drive(PROPELLER, geared, BATTERY, Controller(unpowered="regenerate"), AIR).at_throttle(AIRSPEED, THROTTLE)
    speed = 3.0 * points.rpm * math.pi / 30.0
    at_motor = geared.torque(points.motor_current, speed) * speed
    driven, windmills = points.shaft_power > 1e-6, (points.shaft_power < -1e-6)
    assert driven.any()
    assert windmills.any()
    np.testing.assert_allclose(points.shaft_power[driven], 0.94 * at_motor[driven], rtol=1e-8)
    np.testing.assert_allclose(at_motor[windmills], 0.94 * points.shaft_power[windmills], rtol=1e-8)


def test_several_motors_load_one_battery():
    # Two motors on a pack draw as two times one motor on a pack of twice the resistance.
    two = Drive(PROPELLER, replace(MOTOR, count=2), BATTERY, CONTROLLER, AIR).at_throttle(AIRSPEED, THROTTLE)
    stiff = replace(BATTERY, cell_resistance=2.0 * BATTERY.cell_resistance)
    one = Drive(PROPELLER, MOTOR, stiff, CONTROLLER, AIR).at_throttle(AIRSPEED, THROTTLE)
    for name in ("rpm", "torque", "motor_current", "battery_voltage"):
        np.testing.assert_allclose(getattr(two, name), getattr(one, name), rtol=1e-10, atol=1e-12, err_msg=name)
    for name in ("thrust", "battery_current", "battery_power"):
        np.testing.assert_allclose(getattr(two, name), 2.0 * getattr(one, name), rtol=1e-10, atol=1e-10, err_msg=name)


@pytest.mark.parametrize(
    ("motor", "controller"), [(replace(MOTOR, count=2), CONTROLLER), (LOSSY_MOTOR, LOSSY_CONTROLLER)]
)
def test_a_thrust_asked_for_is_an_equilibrium(motor, controller):
    airspeed = np.linspace(0.0, 30.0, 25)
    drive = Drive(PROPELLER, motor, BATTERY, controller, AIR, inflow_factor=0.97)
    points = drive.at_thrust(airspeed, 8.0)
    reached = np.isfinite(points.rpm)
    assert reached.sum() > 20
    np.testing.assert_allclose(points.thrust[reached], 8.0, rtol=1e-12)
    again = drive.at_throttle(airspeed[reached], points.throttle[reached])
    for name in ("rpm", "motor_current", "battery_current", "overall_efficiency"):
        np.testing.assert_allclose(getattr(again, name), getattr(points, name)[reached], rtol=1e-9, err_msg=name)
    assert np.isnan(drive.at_thrust(10.0, 500.0).rpm)
    assert np.isnan(drive.at_thrust(10.0, np.nan).rpm)


def test_points_outside_the_propellers_table_are_missing_and_flagged():
    drive = replace(DRIVE, propeller=AnalyticPropeller(known_to_rpm=7000.0, known_from_rpm=1000.0))
    points, whole = drive.at_throttle(AIRSPEED, THROTTLE), DRIVE.at_throttle(AIRSPEED, THROTTLE)
    outside = whole.rpm > 7000.0
    assert outside.any()
    assert np.isnan(points.rpm[outside]).all()
    assert np.all(points.status[outside] == 4)
    for name in ("thrust", "motor_current", "battery_current", "battery_efficiency", "winding_temperature"):
        assert np.isnan(getattr(points, name)[outside]).all(), name
    # Well inside the known range nothing changes.
    inside = (whole.rpm > 1500.0) & (whole.rpm < 6500.0)
    np.testing.assert_allclose(points.rpm[inside], whole.rpm[inside], rtol=1e-12)
    assert np.all(points.status[np.isfinite(points.rpm)] == 1)


def test_a_bare_propeller():
    bare = BarePropeller(PROPELLER, 9000.0, AIR)
    points = bare.at_rpm(AIRSPEED, [3000.0, 9000.0])
    loads = PROPELLER.loads(AIRSPEED, np.array([3000.0, 9000.0]), AIR)
    np.testing.assert_allclose(points.thrust, loads.thrust, rtol=1e-13, atol=1e-13)
    np.testing.assert_allclose(points.shaft_power, loads.torque * np.array([3000.0, 9000.0]) * math.pi / 30.0)
    asked = bare.at_thrust([5.0, 10.0, 10.0], [4.0, 4.0, 400.0])
    np.testing.assert_allclose(asked.thrust[:2], 4.0, rtol=1e-12)
    assert np.isnan(asked.rpm[2])


# --- bad input -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("part", "field", "change"),
    [
        (MOTOR, "speed_constant", {"speed_constant": 0.0}),
        (MOTOR, "speed_constant", {"speed_constant": math.nan}),
        (MOTOR, "winding_resistance", {"winding_resistance": -0.1}),
        (MOTOR, "winding_resistance", {"winding_resistance": "41 mohm"}),
        (MOTOR, "no_load", {"no_load": ()}),
        (MOTOR, "no_load", {"no_load": ((10.0,),)}),
        (MOTOR, "no_load", {"no_load": ((1.0, 30.0),)}),
        (MOTOR, "no_load", {"no_load": ((10.0, 0.9), (10.0, 1.0))}),
        (MOTOR, "no_load", {"no_load": ((8.0, 0.9), (8.1, 9.9))}),
        (MOTOR, "no_load.voltage", {"no_load": ((0.0, 0.9),)}),
        (MOTOR, "no_load.current", {"no_load": ((10.0, -0.9),)}),
        (MOTOR, "count", {"count": 0}),
        (MOTOR, "count", {"count": 1.5}),
        (MOTOR, "current_limit", {"current_limit": 0.0}),
        (MOTOR, "thermal_resistance", {"thermal_resistance": -1.0}),
        (MOTOR, "winding_temperature", {"winding_temperature": 60.0}),
        (MOTOR, "winding_temperature", {"winding_temperature": 600.0}),
        (MOTOR, "winding_inductance", {"winding_inductance": 0.0}),
        (MOTOR, "gear_ratio", {"gear_ratio": 0.0}),
        (MOTOR, "gear_efficiency", {"gear_efficiency": 1.01}),
        (CONTROLLER, "on_resistance", {"on_resistance": -1e-3}),
        (CONTROLLER, "current_limit", {"current_limit": math.inf}),
        (CONTROLLER, "idle_current", {"idle_current": -0.01}),
        (CONTROLLER, "unpowered", {"unpowered": "coast"}),
        (CONTROLLER, "switching_time", {"switching_time": 1.0}),
        (CONTROLLER, "diode_voltage", {"diode_voltage": -0.1}),
        (CONTROLLER, "diode_voltage", {"diode_voltage": 0.7, "unpowered": "regenerate"}),
        (CONTROLLER, "throttle_map", {"throttle_map": ((0.0, 0.0),)}),
        (CONTROLLER, "throttle_map", {"throttle_map": ((0.0, 0.0), (0.9, 1.0))}),
        (CONTROLLER, "throttle_map", {"throttle_map": ((0.0, 0.5), (0.5, 0.2), (1.0, 1.0))}),
        (CONTROLLER, "throttle_map", {"throttle_map": ((0.0, 0.0), (1.0, 1.2))}),
        (CONTROLLER, "throttle_map", {"throttle_map": ((0.0, 0.0), (1.0, 0.0))}),
        (BATTERY, "cells_in_series", {"cells_in_series": 0}),
        (BATTERY, "cells_in_parallel", {"cells_in_parallel": True}),
        (BATTERY, "chemistry", {"chemistry": "lead"}),
        (BATTERY, "capacity", {"capacity": 0.0}),
        (BATTERY, "cell_resistance", {"cell_resistance": -1.0}),
        (BATTERY, "discharge_multiple", {"discharge_multiple": 0.0}),
        (BATTERY, "charge_left", {"charge_left": 1.1}),
        (BATTERY, "usable_share", {"usable_share": -0.1}),
        (BATTERY, "temperature", {"temperature": 5.0}),
        (BATTERY, "temperature", {"temperature": 400.0}),
        (DRIVE, "inflow_factor", {"inflow_factor": 0.0}),
        (DRIVE, "thrust_factor", {"thrust_factor": math.nan}),
    ],
)
def test_bad_parts_name_the_field(part, field, change):
    with pytest.raises(InputError) as caught:
        replace(part, **change)
    assert caught.value.field == field


@pytest.mark.parametrize(
    ("field", "point"), [("airspeed", (-1.0, 0.5)), ("throttle", (5.0, 1.1)), ("throttle", (5.0, math.nan))]
)
def test_bad_points_name_the_field(field, point):
    with pytest.raises(InputError) as caught:
        DRIVE.at_throttle(*point)
    assert caught.value.field == field
