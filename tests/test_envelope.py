"""The envelope against closed forms of level flight, a general-purpose root finder and the registry."""

from __future__ import annotations

import math
import re
from dataclasses import replace

import numpy as np
import pytest
import shipped
from analytic_propeller import AnalyticPropeller
from scipy.integrate import quad, simpson
from scipy.optimize import brentq

import bemt
from bemt.air import standard_air
from bemt.drive import Battery, Controller, Drive, Motor, speed_constant_from_rpm
from bemt.drive.battery import OPEN_CIRCUIT_VOLTAGE
from bemt.errors import InputError
from bemt.flight import (
    Airframe,
    Installation,
    Limits,
    build_envelope,
    default_airspeed,
    default_throttle,
    describe_limits,
)
from bemt.quantities.registry import (
    ENVELOPE,
    ENVELOPE_WITHOUT_MOTOR,
    TRUST_FAIR,
    TRUST_GOOD,
    TRUST_NOT_RUN,
    TRUST_REASONS,
    by_name,
)

AIR = standard_air(120.0)
PROPELLER = AnalyticPropeller()
MOTOR = Motor(speed_constant_from_rpm(690.0), 0.041, ((10.0, 0.9),), current_limit=42.0)
CONTROLLER = Controller(on_resistance=0.003, current_limit=50.0, idle_current=0.04)
BATTERY = Battery(cells_in_series=4, cell_resistance=0.0024, capacity=18_000.0, discharge_multiple=25.0)
AIRFRAME = Airframe(mass=3.1, wing_area=0.52, cd0=0.034, k=0.052, cl_max=1.3, cruise_speed=16.0)
INSTALLATION = Installation(inflow_factor=0.97, thrust_factor=0.98)
PARTS = {
    "motor": MOTOR,
    "controller": CONTROLLER,
    "battery": BATTERY,
    "airframe": AIRFRAME,
    "installation": INSTALLATION,
    "rpm_limit": 9500.0,
}
AXES = {"airspeed": np.linspace(0.0, 36.0, 37), "throttle": np.linspace(0.1, 1.0, 10)}
DRIVE = Drive(PROPELLER, MOTOR, BATTERY, CONTROLLER, AIR, 0.97, 0.98)


@pytest.fixture(scope="module")
def envelope():
    return build_envelope(PROPELLER, AIR, **PARTS, **AXES)


def _full_surplus(airspeed: float) -> float:
    thrust = float(DRIVE.at_throttle(airspeed, 1.0).thrust)
    return 0.98 * thrust - float(AIRFRAME.drag(airspeed, AIR.density))


# --- airframe ------------------------------------------------------------------------------------------------------


def test_least_drag_of_a_parabolic_polar():
    # Any textbook of aircraft performance, e.g. Anderson, Aircraft Performance and Design: D_min = 2 m g sqrt(k cd0)
    # at V = sqrt(2 m g/(rho S)) (k/cd0)^(1/4).
    weight = 3.1 * 9.80665
    speed = math.sqrt(2.0 * weight / (AIR.density * 0.52)) * (0.052 / 0.034) ** 0.25
    airspeed = speed + np.linspace(-0.5, 0.5, 1001)
    drag = AIRFRAME.drag(airspeed, AIR.density)
    assert drag.min() == pytest.approx(2.0 * weight * math.sqrt(0.052 * 0.034), rel=1e-9)
    assert airspeed[np.argmin(drag)] == pytest.approx(speed, abs=1e-3)


def test_no_drag_of_level_flight_below_the_stall_speed():
    # At the stall speed the lift coefficient is the largest: q S cl_max = m g.
    stall = AIRFRAME.stall_speed(AIR.density)
    assert 0.5 * AIR.density * stall**2 * 0.52 * 1.3 == pytest.approx(3.1 * 9.80665, rel=1e-14)
    drag = AIRFRAME.drag(np.array([0.0, 0.999 * stall, stall]), AIR.density)
    np.testing.assert_array_equal(np.isnan(drag), [True, True, False])
    assert replace(AIRFRAME, cl_max=None).stall_speed(AIR.density) is None


def test_drag_table():
    airframe = Airframe(mass=3.1, drag_table=((9.0, 3.0), (12.0, 2.6), (20.0, 4.6)))
    np.testing.assert_allclose(airframe.drag([9.0, 10.5, 16.0, 20.0], 1.0), [3.0, 2.8, 3.6, 4.6])
    assert np.isnan(airframe.drag([8.9, 20.1], 1.0)).all()


# --- shape ---------------------------------------------------------------------------------------------------------


def test_every_name_and_shape_is_the_registrys(envelope):
    known = by_name(ENVELOPE)
    assert set(envelope.values) == set(known)
    sizes = {"airspeed": 37, "throttle": 10, "point": 6}
    for name, array in envelope.values.items():
        assert array.shape == tuple(sizes[dimension] for dimension in known[name].dimensions), name
    labelled = envelope.to_dataset({"title": "test"})
    assert labelled["level_rpm"].attrs["units"] == "rpm"
    assert float(labelled["thrust"].sel(airspeed=10.0, throttle=1.0)) == envelope.values["thrust"][10, -1]
    assert list(labelled["point"].values) == [
        "static",
        "cruise",
        "best_endurance",
        "best_range",
        "best_climb",
        "top_speed",
    ]
    assert "stall speed" in labelled.attrs["notes"]


def test_the_grid_is_the_drives(envelope):
    points = DRIVE.at_throttle(AXES["airspeed"][:, np.newaxis], AXES["throttle"])
    for name in ("rpm", "thrust", "battery_current", "overall_efficiency"):
        np.testing.assert_array_equal(envelope.values[name], getattr(points, name))


# --- level flight --------------------------------------------------------------------------------------------------


def test_thrust_equals_drag_on_the_level_line(envelope):
    level = envelope.values
    flies = np.isfinite(level["level_rpm"])
    stall = AIRFRAME.stall_speed(AIR.density)
    np.testing.assert_array_equal(flies, (AXES["airspeed"] >= stall) & (AXES["airspeed"] <= _top_speed()))
    pressure = 0.5 * AIR.density * AXES["airspeed"][flies] ** 2
    lift_coefficient = 3.1 * 9.80665 / (pressure * 0.52)
    drag = pressure * 0.52 * (0.034 + 0.052 * lift_coefficient**2)
    np.testing.assert_allclose(level["drag"][flies], drag, rtol=1e-12)
    np.testing.assert_allclose(0.98 * level["level_thrust"][flies], drag, rtol=1e-11)
    loads = PROPELLER.loads(0.97 * AXES["airspeed"][flies], level["level_rpm"][flies], AIR)
    np.testing.assert_allclose(level["level_thrust"][flies], loads.thrust, rtol=1e-12)
    assert np.all(level["level_status"][flies] == 1)
    assert np.all(level["level_status"][~flies] == 0)


def test_the_level_throttle_gives_the_level_point(envelope):
    level = envelope.values
    flies = np.isfinite(level["level_rpm"])
    assert np.all((level["level_throttle"][flies] > 0.0) & (level["level_throttle"][flies] <= 1.0))
    points = DRIVE.at_throttle(AXES["airspeed"][flies], level["level_throttle"][flies])
    for name in ("rpm", "thrust", "motor_current", "battery_current", "overall_efficiency"):
        np.testing.assert_allclose(getattr(points, name), level[f"level_{name}"][flies], rtol=1e-9, err_msg=name)


def _discharge(current: float, rpm: float) -> float:
    """Time a motor state is held, by a general-purpose integrator on the circuit written out here."""
    shares, volts = OPEN_CIRCUIT_VOLTAGE["lithium-polymer"]
    speed = rpm * math.pi / 30.0
    leads = speed / MOTOR.speed_constant + current * (0.041 + 0.003)
    resistance = 4 * 0.0024

    def duty(charge: float) -> float:
        # d (Voc - (d I + 0.04) Rb) = leads: the smaller root.
        linear = 4.0 * float(np.interp(charge, shares, volts)) - 0.04 * resistance
        return (linear - math.sqrt(linear**2 - 4.0 * resistance * current * leads)) / (2.0 * resistance * current)

    end = 0.2 if duty(0.2) <= 1.0 else brentq(lambda charge: duty(charge) - 1.0, 0.2, 1.0)
    inside = [share for share in shares if end < share < 1.0]
    found, _ = quad(
        lambda charge: 18_000.0 / (duty(charge) * current + 0.04), end, 1.0, points=inside, limit=200, epsrel=1e-11
    )
    return found


def test_endurance_is_the_discharge_integrated(envelope):
    level = envelope.values
    flies = np.isfinite(level["level_rpm"])
    expected = [
        _discharge(current, rpm)
        for current, rpm in zip(level["level_motor_current"][flies], level["level_rpm"][flies], strict=True)
    ]
    np.testing.assert_allclose(level["endurance"][flies], expected, rtol=1e-7)
    np.testing.assert_allclose(level["range"], level["endurance"] * AXES["airspeed"])
    assert np.isnan(level["endurance"][~flies]).all()
    # Four fifths of 5 A h over the first current is the upper end.
    single = 4.0 * 3600.0 / level["level_battery_current"][flies]
    assert np.all(level["endurance"][flies] < single)


def test_where_full_throttle_ends_the_flight_is_said(envelope):
    level = envelope.values
    shares, volts = OPEN_CIRCUIT_VOLTAGE["lithium-polymer"]
    current, speed = level["level_motor_current"], level["level_rpm"] * math.pi / 30.0
    # At full duty Voc = w/Kv + I (R + Ron) + (I + I_idle) Rb.
    needed = speed / MOTOR.speed_constant + current * 0.044 + (current + 0.04) * 4 * 0.0024
    short = AXES["airspeed"][needed > 4.0 * np.interp(0.2, shares, volts)]
    (note,) = [note for note in envelope.notes if "full throttle no longer holds it" in note]
    assert 2 <= short.size < 10
    assert f"between {short[0]:.1f} and {short[-1]:.1f} m/s" in note


def test_time_at_full_throttle(envelope):
    charge = np.linspace(0.2, 1.0, 801)
    for name in ("static", "best_climb", "top_speed"):
        airspeed = _point(envelope, name, "airspeed")
        drawn = [
            float(replace(DRIVE, battery=replace(BATTERY, charge_left=s)).at_throttle(airspeed, 1.0).battery_current)
            for s in charge
        ]
        assert _point(envelope, name, "drain_time") == pytest.approx(
            simpson(18_000.0 / np.array(drawn), x=charge), rel=1e-6
        )
        assert math.isnan(_point(envelope, name, "endurance"))
    assert math.isnan(_point(envelope, "cruise", "drain_time"))


def test_climb_rate_is_excess_power_over_weight(envelope):
    thrust = 0.98 * envelope.values["thrust"][:, -1]
    power = (thrust - envelope.values["drag"]) * AXES["airspeed"]
    np.testing.assert_allclose(envelope.values["climb_rate"], power / (3.1 * 9.80665), rtol=1e-12)


# --- named points --------------------------------------------------------------------------------------------------


def _top_speed() -> float:
    return brentq(_full_surplus, 20.0, 60.0, xtol=1e-12)


def _point(envelope, name: str, quantity: str) -> float:
    return float(envelope.values[f"point_{quantity}"][envelope.points.index(name)])


def test_static_and_top_speed(envelope):
    still = DRIVE.at_throttle(0.0, 1.0)
    assert _point(envelope, "static", "thrust") == pytest.approx(float(still.thrust), rel=1e-12)
    assert _point(envelope, "static", "airspeed") == 0.0
    assert math.isnan(_point(envelope, "static", "endurance"))
    top = _top_speed()
    assert _point(envelope, "top_speed", "airspeed") == pytest.approx(top, rel=1e-10)
    assert _point(envelope, "top_speed", "throttle") == 1.0
    assert 0.98 * _point(envelope, "top_speed", "thrust") == pytest.approx(
        float(AIRFRAME.drag(top, AIR.density)), rel=1e-9
    )


def test_cruise(envelope):
    assert _point(envelope, "cruise", "airspeed") == 16.0
    at_16 = envelope.values["level_battery_power"][16]
    assert _point(envelope, "cruise", "battery_power") == pytest.approx(at_16, rel=1e-10)
    free = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": replace(AIRFRAME, cruise_speed=None)}), **AXES)
    assert _point(free, "cruise", "airspeed") == _point(free, "best_range", "airspeed")
    slow = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": replace(AIRFRAME, cruise_speed=5.0)}), **AXES)
    assert math.isnan(_point(slow, "cruise", "rpm"))
    assert any("cruise speed of 5.0 m/s" in note for note in slow.notes)


def test_best_points_are_the_best_of_a_fine_sampling(envelope):
    airspeed = np.linspace(AIRFRAME.stall_speed(AIR.density), _top_speed(), 4001)
    fine = build_envelope(PROPELLER, AIR, **PARTS, airspeed=airspeed, throttle=[1.0]).values
    for name, quantity in (("best_endurance", "endurance"), ("best_range", "range"), ("best_climb", "climb_rate")):
        best = np.nanmax(fine[quantity])
        assert _point(envelope, name, quantity) == pytest.approx(best, rel=1e-6), name
        where = airspeed[np.nanargmax(fine[quantity])]
        assert _point(envelope, name, "airspeed") == pytest.approx(where, abs=0.03), name


def test_named_points_do_not_depend_on_the_axes(envelope):
    other = build_envelope(PROPELLER, AIR, **PARTS, airspeed=[3.0, 5.0], throttle=[0.4])
    for name, array in envelope.values.items():
        if name.startswith("point_"):
            np.testing.assert_array_equal(other.values[name], array, err_msg=name)


def test_best_range_and_endurance_of_a_constant_efficiency():
    # With one overall efficiency at every speed an electric aircraft flies farthest at least drag, and longest at least
    # power, a factor 3^(1/4) slower, where the drag is 2/sqrt(3) of the least (e.g. Traub, Journal of Aircraft 48,
    # 2011). CP = J CT/0.8 makes the propeller's efficiency 0.8 throughout; the drive has next to no losses.
    propeller = AnalyticPropeller(diameter=0.6, thrust=(0.1, -0.06, 0.0), power=(0.0, 0.1 / 0.8, -0.06 / 0.8))
    motor = Motor(speed_constant_from_rpm(400.0), 1e-7, ((10.0, 0.0),))
    battery = replace(BATTERY, cell_resistance=0.0)
    airframe = replace(AIRFRAME, cl_max=2.0, cruise_speed=None)
    found = build_envelope(propeller, AIR, motor=motor, battery=battery, airframe=airframe, airspeed=[0.0, 10.0])

    weight = 3.1 * 9.80665
    least_drag = 2.0 * weight * math.sqrt(0.034 * 0.052)
    speed = math.sqrt(2.0 * weight / (AIR.density * 0.52)) * (0.052 / 0.034) ** 0.25
    # Without loss in the drive the power stays the same, so the charge gives its energy: the open-circuit voltage over
    # the charge from a fifth to all of it, straight lines between its nodes.
    shares, volts = np.array(OPEN_CIRCUIT_VOLTAGE["lithium-polymer"])
    energy = 0.8 * battery.capacity * 4.0 * np.trapezoid(volts[shares >= 0.2], shares[shares >= 0.2])
    assert _point(found, "best_range", "overall_efficiency") == pytest.approx(0.8, rel=1e-6)
    assert _point(found, "best_range", "range") == pytest.approx(energy / least_drag, rel=1e-5)
    assert _point(found, "best_range", "airspeed") == pytest.approx(speed, rel=2e-3)
    slower = speed / 3.0**0.25
    assert _point(found, "best_endurance", "airspeed") == pytest.approx(slower, rel=2e-3)
    assert _point(found, "best_endurance", "endurance") == pytest.approx(
        energy / (2.0 / math.sqrt(3.0) * least_drag * slower), rel=1e-5
    )


def test_too_heavy_to_fly():
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": replace(AIRFRAME, mass=60.0)}), **AXES)
    for name in ("level_rpm", "endurance", "range"):
        assert np.isnan(found.values[name]).all()
    assert np.isfinite(_point(found, "static", "thrust"))
    assert math.isnan(_point(found, "best_climb", "airspeed"))
    assert any(note.startswith("no level flight:") for note in found.notes)


def test_drag_table_that_ends_before_the_top_speed():
    airframe = Airframe(mass=3.1, drag_table=((9.0, 3.0), (12.0, 2.6), (20.0, 4.6)))
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": airframe}), **AXES)
    assert math.isnan(_point(found, "top_speed", "airspeed"))
    assert any(note.startswith("top speed not known: thrust exceeds drag up to 20.0 m/s") for note in found.notes)
    assert 9.0 <= _point(found, "best_range", "airspeed") <= 20.0


# --- parts left out ------------------------------------------------------------------------------------------------


def test_without_an_airframe(envelope):
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": None}), **AXES)
    assert found.points == ("static",)
    assert not any(name.startswith("level_") for name in found.values)
    np.testing.assert_array_equal(found.values["thrust"], envelope.values["thrust"])
    assert found.to_dataset({}).sizes["point"] == 1


def test_without_a_motor():
    rpm = np.array([3000.0, 6000.0, 9000.0])
    parts = {"airframe": AIRFRAME, "installation": INSTALLATION, "rpm_limit": 9500.0}
    found = build_envelope(PROPELLER, AIR, **parts, airspeed=AXES["airspeed"], rpm=rpm)
    known = by_name(ENVELOPE_WITHOUT_MOTOR)
    assert set(found.values) == set(known)
    sizes = {"airspeed": 37, "rpm": 3, "point": 6}
    for name, array in found.values.items():
        assert array.shape == tuple(sizes[dimension] for dimension in known[name].dimensions), name
    assert found.throttle is None
    loads = PROPELLER.loads(0.97 * AXES["airspeed"][:, np.newaxis], rpm, AIR)
    np.testing.assert_allclose(found.values["shaft_power"], loads.torque * rpm * math.pi / 30.0, rtol=1e-12)
    flies = np.isfinite(found.values["level_rpm"])
    assert flies.sum() > 10
    np.testing.assert_allclose(0.98 * found.values["level_thrust"][flies], found.values["drag"][flies], rtol=1e-11)
    np.testing.assert_allclose(found.values["level_rpm_margin"], 9500.0 - found.values["level_rpm"])
    assert _point(found, "static", "rpm") == pytest.approx(9000.0, rel=1e-14)
    power = found.values["level_shaft_power"]
    assert _point(found, "best_endurance", "shaft_power") <= np.nanmin(power)
    assert found.to_dataset({}).sizes["rpm"] == 3


def test_without_a_controller_the_controller_is_ideal():
    found = build_envelope(PROPELLER, AIR, motor=MOTOR, battery=BATTERY, airframe=AIRFRAME, **AXES)
    known = found.values["controller_efficiency"][np.isfinite(found.values["controller_efficiency"])]
    np.testing.assert_allclose(known, 1.0, rtol=1e-12)
    assert np.isnan(found.values["controller_current_margin"]).all()
    assert np.isnan(found.values["rpm_margin"]).all()


def test_default_axes(envelope):
    axis = default_airspeed(PROPELLER, AIR, **PARTS)
    assert axis[0] == 0.0
    assert axis.size == 61
    assert 1.1 * _top_speed() <= axis[-1] < 1.1 * _top_speed() + 1.0
    found = build_envelope(PROPELLER, AIR, **PARTS)
    np.testing.assert_array_equal(found.airspeed, axis)
    np.testing.assert_array_equal(found.throttle, default_throttle())
    np.testing.assert_allclose(default_throttle(), np.arange(2, 21) / 20.0)
    # Without an airframe: where the thrust at full throttle ends.
    free = default_airspeed(PROPELLER, AIR, **(PARTS | {"airframe": None}))
    zero = brentq(lambda airspeed: float(DRIVE.at_throttle(airspeed, 1.0).thrust), 10.0, 80.0)
    assert 1.1 * zero <= free[-1] < 1.1 * zero + 1.0


def test_a_weak_installation_costs_throttle(envelope):
    free = build_envelope(PROPELLER, AIR, **(PARTS | {"installation": None}), **AXES)
    worse = build_envelope(PROPELLER, AIR, **(PARTS | {"installation": Installation(1.0, 0.8)}), **AXES)
    flies = np.isfinite(worse.values["level_throttle"])
    assert flies.sum() > 10
    assert np.all(worse.values["level_throttle"][flies] > free.values["level_throttle"][flies])
    # Four fifths of the thrust arrive, so the propellers give five quarters of the drag.
    np.testing.assert_allclose(worse.values["level_thrust"][flies], 1.25 * free.values["drag"][flies], rtol=1e-11)


# --- without power -------------------------------------------------------------------------------------------------


def test_drag_of_unpowered_propellers(envelope):
    # CT = t0 + t1 J + t2 J^2: stopped only t2 V^2 remains; windmilling at the J where CP = p0 + p1 J + p2 J^2 is zero;
    # freewheeling where the propeller drives the no-load torque I0/Kv.
    disk = 0.97 * AXES["airspeed"]
    D, rho = PROPELLER.diameter, AIR.density
    (t0, t1, t2), (p0, p1, p2) = PROPELLER.thrust, PROPELLER.power
    values = envelope.values
    np.testing.assert_allclose(values["stopped_drag"], -t2 * rho * D**2 * disk**2, rtol=1e-12)
    J = (p1 + math.sqrt(p1**2 - 4.0 * p0 * p2)) / (-2.0 * p2)
    n = disk / (J * D)
    np.testing.assert_allclose(values["windmilling_rpm"], 60.0 * n, rtol=1e-10)
    np.testing.assert_allclose(
        values["windmilling_drag"], -(t0 + t1 * J + t2 * J**2) * rho * n**2 * D**4, rtol=1e-10, atol=1e-12
    )
    held = 0.9 / MOTOR.speed_constant
    for k, airspeed in enumerate(disk):

        def driven(n: float, airspeed: float = airspeed) -> float:
            torque = rho * D**3 * (p0 * n**2 * D**2 + p1 * n * D * airspeed + p2 * airspeed**2) / (2.0 * math.pi)
            return -torque - held

        turns = brentq(driven, 0.0, n[k]) if driven(0.0) > 0.0 else 0.0
        thrust = rho * D**2 * (t0 * turns**2 * D**2 + t1 * turns * D * airspeed + t2 * airspeed**2)
        assert values["freewheeling_rpm"][k] == pytest.approx(60.0 * turns, rel=1e-9, abs=1e-9)
        assert values["freewheeling_drag"][k] == pytest.approx(-thrust, rel=1e-9, abs=1e-9)
    # Friction slows the wheel between its two ends; at rest nothing drags, and a light wind does not turn the motor.
    assert values["freewheeling_rpm"][1] == 0.0
    turning = values["freewheeling_rpm"] > 0.0
    assert turning.sum() > 20
    assert np.all(values["freewheeling_rpm"][turning] < values["windmilling_rpm"][turning])
    for name in ("stopped_drag", "freewheeling_drag", "windmilling_drag"):
        assert values[name][0] == 0.0
        assert np.all(np.diff(values[name]) > 0.0)
    bare = build_envelope(PROPELLER, AIR, installation=INSTALLATION, airspeed=AXES["airspeed"], rpm=[9000.0])
    np.testing.assert_allclose(bare.values["windmilling_rpm"], values["windmilling_rpm"], rtol=1e-10)
    assert "freewheeling_drag" not in bare.values


# --- decisions -----------------------------------------------------------------------------------------------------


def test_decisions_in_words(envelope):
    take_off, throttle, chain, drag, first = envelope.decisions
    static = 0.98 * _point(envelope, "static", "thrust") / (3.1 * 9.80665)
    assert _point(envelope, "static", "thrust_to_weight") == pytest.approx(static, rel=1e-12)
    assert f"standing still is {static:.2f} of the weight" in take_off
    lift_off = 1.2 * AIRFRAME.stall_speed(AIR.density)
    assert f"a climb of {_full_surplus(lift_off) * lift_off / (3.1 * 9.80665):.1f} m/s" in take_off
    stick = _point(envelope, "cruise", "throttle")
    assert throttle.startswith(f"cruise at 16.0 m/s takes {100 * stick:.0f} % throttle, above the usual 30 to 40 %")
    assert "common practice, no source" in throttle
    # The parts and what moves the aircraft make up what the cells give: open-circuit voltage times current.
    watts = [float(number) for number in re.findall(r"([\d.]+) W", chain)]
    cells, *lost, left = watts
    assert cells == pytest.approx(16.8 * _point(envelope, "cruise", "battery_current"), rel=5e-3)
    assert sum(lost) + left == pytest.approx(cells, rel=5e-3)
    assert left == pytest.approx(16.0 * float(AIRFRAME.drag(16.0, AIR.density)), rel=5e-3)
    shares = [float(number) / 100.0 for number in re.findall(r"\(([\d.]+) %\)", chain)]
    parts = ("battery", "controller", "motor", "propeller")
    for part, share in zip(parts, shares, strict=True):
        assert share == pytest.approx(_point(envelope, "cruise", f"{part}_efficiency"), abs=6e-4)
    assert chain.endswith(f"The {parts[int(np.argmax(lost))]} loses most")
    at_16 = {name: envelope.values[f"{name}_drag"][16] for name in ("stopped", "freewheeling", "windmilling")}
    assert f"held still {at_16['stopped']:.3g} N, freewheeling {at_16['freewheeling']:.3g} N at" in drag
    binds = brentq(lambda stick: float(DRIVE.at_throttle(0.0, stick).motor_current) - 42.0, 0.1, 1.0)
    assert f"standing still the motor's current (42 A) from throttle {binds:.2f}" in first
    assert envelope.to_dataset({}).attrs["decisions"].splitlines() == list(envelope.decisions)


def test_a_weak_drive_does_not_take_off():
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": replace(AIRFRAME, mass=60.0)}), **AXES)
    assert "gives no climb: it does not take off" in found.decisions[0]
    assert not any("cells give" in words for words in found.decisions)


def test_no_limits_no_word_of_what_burns_first():
    bare = {"motor": replace(MOTOR, current_limit=None), "battery": replace(BATTERY, discharge_multiple=None)}
    found = build_envelope(PROPELLER, AIR, **bare, airspeed=[0.0, 10.0])
    assert found.decisions == (
        "what burns first is not known: the case gives no limit of propeller, motor, controller or battery",
    )


# --- limits --------------------------------------------------------------------------------------------------------


def test_margins_are_limit_less_value(envelope):
    values = envelope.values
    np.testing.assert_allclose(values["rpm_margin"], 9500.0 - values["rpm"])
    np.testing.assert_allclose(values["motor_current_margin"], 42.0 - values["motor_current"])
    np.testing.assert_allclose(values["controller_current_margin"], 50.0 - values["motor_current"])
    np.testing.assert_allclose(values["battery_current_margin"], 125.0 - values["battery_current"])
    np.testing.assert_allclose(values["level_motor_current_margin"], 42.0 - values["level_motor_current"])
    np.testing.assert_allclose(values["point_rpm_margin"], 9500.0 - values["point_rpm"])


def test_limits_in_words():
    airspeed, throttle = np.array([0.0, 10.0, 20.0]), np.array([0.0, 0.5, 1.0])
    values = {
        "motor_current_margin": np.array([[40.0, 20.0, -20.0], [40.0, 25.0, -10.0], [40.0, 30.0, 10.0]]),
        "controller_current_margin": np.array([[50.0, 30.0, -10.0], [50.0, 35.0, 0.0], [50.0, 40.0, 20.0]]),
        "battery_current_margin": np.full((3, 3), 7.0),
        "rpm_margin": np.array([[5000.0, 3000.0, 100.0], [5000.0, 3000.0, 100.0], [5000.0, 3000.0, -300.0]]),
        "level_motor_current_margin": np.array([np.nan, 5.0, -5.0]),
    }
    motor = (
        "motor current, limit 42 A: exceeded standing still from throttle 0.75; at full throttle below 15.0 m/s; "
        "in level flight above 15.0 m/s"
    )
    found = describe_limits(Limits(9500.0, 42.0, 50.0, 125.0), airspeed, throttle, values)
    assert found == (
        motor,
        "controller current, limit 50 A: exceeded standing still from throttle 0.88; at full throttle below 10.0 m/s",
        "propeller rpm, limit 9500 rpm: exceeded at full throttle above 12.5 m/s",
        "battery current, limit 125 A: not reached, 7 A left at the closest point",
    )
    assert describe_limits(Limits(), airspeed, throttle, values) == ()


def test_limits_in_words_agree_with_a_root(envelope):
    binds = brentq(lambda stick: float(DRIVE.at_throttle(0.0, stick).motor_current) - 42.0, 0.1, 1.0)
    note = next(note for note in envelope.notes if note.startswith("motor current"))
    assert float(note.split("from throttle ")[1].split(";")[0]) == pytest.approx(binds, abs=0.01)


def test_a_dive_beyond_the_battery_voltage_is_said():
    found = build_envelope(PROPELLER, AIR, **PARTS, airspeed=[0.0, 60.0], throttle=[0.1, 1.0])
    assert np.all(found.values["motor_voltage"][1] > found.values["battery_voltage"][1])
    assert any(note.startswith("at 2 of 4 points the wind drives the motor above the battery") for note in found.notes)


def test_a_winding_too_hot_is_marked_and_said_by_point():
    # From I^2 R and I0 w/Kv, resistance rising 0.393 % per K from 20 degrees (IEC 60028): the balance is solved here
    # by a general root finder, in the code in closed form.
    hot = replace(MOTOR, thermal_resistance=1.3)
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"motor": hot}), **AXES)
    ambient = AIR.temperature - 273.15

    def settled(name: str) -> float:
        current, rpm = _point(found, name, "motor_current"), _point(found, name, "rpm")

        def excess(temperature: float) -> float:
            copper = current**2 * 0.041 * (1.0 + 0.00393 * (temperature - 20.0))
            return ambient + 1.3 * (copper + 0.9 * rpm / 690.0) - temperature

        return math.inf if excess(1e5) > 0.0 else brentq(excess, -50.0, 1e5)

    for name in found.points:
        temperature = _point(found, name, "winding_temperature")
        assert temperature == pytest.approx(settled(name), rel=1e-9), name
        assert _point(found, name, "winding_temperature_margin") == pytest.approx(120.0 - temperature), name
    (note,) = [note for note in found.notes if note.startswith("held there, the winding")]
    for name in found.points:
        temperature = settled(name)
        words = name.replace("_", " ")
        assert (f"{temperature:.0f} degC ({words})" in note) == (120.0 < temperature < math.inf)
        assert (words in note) == (temperature > 120.0)
    assert any(120.0 < settled(name) < math.inf for name in found.points)
    assert "common practice, no source" in note
    assert any(note.startswith("winding temperature if held there, ceiling 120 degC: exceeded") for note in found.notes)


def test_a_winding_that_heats_up_without_end_is_infinite_and_said():
    hot = replace(MOTOR, thermal_resistance=2.6)
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"motor": hot}), **AXES)
    current = found.values["motor_current"]
    # It has no end where copper loss alone, growing 0.393 % per K, gains more per kelvin than one kelvin carries off.
    endless = 2.6 * current**2 * 0.041 * 0.00393 >= 1.0
    assert endless.any()
    np.testing.assert_array_equal(np.isinf(found.values["winding_temperature"]), endless)
    np.testing.assert_array_equal(found.values["winding_temperature_margin"] == -np.inf, endless)
    (note,) = [note for note in found.notes if note.startswith("held there, the winding")]
    assert "overheats without end (static" in note


def test_a_winding_whose_surroundings_are_not_known():
    outright = replace(AIR, temperature=None, pressure=None)
    hot = replace(MOTOR, thermal_resistance=1.3)
    found = build_envelope(PROPELLER, outright, **(PARTS | {"motor": hot}), **AXES)
    assert np.isnan(found.values["winding_temperature"]).all()
    assert any(note.startswith("no winding temperature: it needs the temperature of the air") for note in found.notes)


def test_cool_windings_are_not_spoken_of(envelope):
    assert not any("winding" in note for note in envelope.notes)
    cool = build_envelope(PROPELLER, AIR, **(PARTS | {"motor": replace(MOTOR, thermal_resistance=0.1)}), **AXES)
    assert not any(note.startswith("held there") for note in cool.notes)
    assert any("ceiling 120 degC: not reached" in note for note in cool.notes)


# --- trust ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("motor", [MOTOR, None])
def test_a_guessed_section_and_a_fast_tip_hold_the_grade(motor):
    axes = AXES if motor else {"airspeed": AXES["airspeed"], "rpm": [3000.0, 9000.0]}
    parts = PARTS | {"motor": motor}
    bits = {word: bit for bit, word in TRUST_REASONS.items()}
    plain = build_envelope(PROPELLER, AIR, **parts, **axes).values
    guessed = build_envelope(AnalyticPropeller(section_guessed=True), AIR, **parts, **axes).values
    fast = build_envelope(AnalyticPropeller(tip_divergence_mach=0.3), AIR, **parts, **axes).values
    for prefix in ("", "level_", "point_"):
        there = np.isfinite(plain[prefix + "thrust"])
        assert there.any()
        assert np.all(plain[prefix + "trust"][there] == TRUST_GOOD)
        assert np.all(plain[prefix + "trust"][~there] == TRUST_NOT_RUN)
        assert np.all(guessed[prefix + "trust"][there] == TRUST_FAIR)
        assert np.all(guessed[prefix + "trust_reasons"][there] == bits["section_guessed"])
    axis = np.broadcast_to(AXES["airspeed"][:, np.newaxis], fast["thrust"].shape)
    rpm = fast["rpm"] if motor else np.broadcast_to(axes["rpm"], fast["thrust"].shape)
    mach = np.hypot(0.97 * axis, math.pi * rpm / 60.0 * PROPELLER.diameter) / AIR.speed_of_sound
    np.testing.assert_array_equal(fast["trust_reasons"] == bits["high_mach"], mach > 0.3)
    assert 0 < np.count_nonzero(mach > 0.3) < mach.size


@pytest.mark.parametrize("where", ["grid", "level", "point"])
def test_the_grade_is_the_one_of_the_table(where):
    # The look-up of the table grades the same points by another road.
    run = bemt.envelope(shipped.case("sandpiper"), table=shipped.table("sandpiper"))
    prefix = "" if where == "grid" else where + "_"
    airspeed = run["point_airspeed" if where == "point" else "airspeed"].broadcast_like(run[prefix + "rpm"])
    there = (np.isfinite(run[prefix + "rpm"]) & (run[prefix + "rpm"] > 0.0)).values
    rpm = run[prefix + "rpm"].transpose(*airspeed.dims).values[there]
    asked = {"airspeed": 0.97 * airspeed.values[there], "rpm": rpm}
    expected = shipped.table("sandpiper").propeller.at(**asked)
    known = expected["trust"].values != TRUST_NOT_RUN  # slower than the table: graded poor here, left out there
    assert known.sum() > 0.5 * known.size
    for name in ("trust", "trust_reasons", "low_reynolds_share"):
        found = run[prefix + name].transpose(*airspeed.dims).values[there]
        np.testing.assert_allclose(found[known], expected[name].values[known], atol=1e-9, err_msg=name)


# --- bad input -----------------------------------------------------------------------------------------------------


def test_outside_the_propellers_table_is_flagged_and_does_not_stop_the_rest():
    small = AnalyticPropeller(known_to_rpm=7000.0, known_from_rpm=500.0)
    found = build_envelope(small, AIR, **PARTS, **AXES)
    missing = np.isnan(found.values["rpm"])
    assert missing.any()
    assert np.all(found.values["status"][missing] == 4)
    assert any("no equilibrium inside the propeller's table" in note for note in found.notes)
    whole = build_envelope(PROPELLER, AIR, **PARTS, **AXES).values
    slow = whole["level_rpm"] < 6000.0
    np.testing.assert_allclose(found.values["level_rpm"][slow], whole["level_rpm"][slow], rtol=1e-12)


@pytest.mark.parametrize(
    ("field", "change"),
    [
        ("battery", {"battery": None}),
        ("airspeed", {"airspeed": [0.0, 5.0, 4.0]}),
        ("airspeed", {"airspeed": [-1.0, 5.0]}),
        ("airspeed", {"airspeed": []}),
        ("airspeed", {"airspeed": [[0.0, 1.0]]}),
        ("airspeed", {"airspeed": [0.0, math.nan]}),
        ("throttle", {"throttle": [0.5, 1.1]}),
        ("throttle", {"throttle": [0.5, 0.5]}),
        ("rpm_limit", {"rpm_limit": 0.0}),
        ("rpm", {"motor": None, "rpm_limit": None}),
        ("rpm", {"motor": None, "rpm": [0.0, 3000.0]}),
    ],
)
def test_bad_requests_name_the_field(field, change):
    with pytest.raises(InputError) as caught:
        build_envelope(PROPELLER, AIR, **(PARTS | AXES | change))
    assert caught.value.field == field


@pytest.mark.parametrize(
    ("field", "change"),
    [
        ("mass", {"mass": 0.0}),
        ("wing_area", {"wing_area": -0.5}),
        ("wing_area", {"wing_area": None}),
        ("cd0", {"cd0": 0.0}),
        ("k", {"k": -0.01}),
        ("cl_max", {"cl_max": math.nan}),
        ("cruise_speed", {"cruise_speed": 0.0}),
        ("drag", {"cd0": None}),
        ("drag", {"drag_table": ((9.0, 3.0), (12.0, 2.6))}),
        ("drag", {"cd0": None, "k": None, "drag_table": ((9.0, 3.0),)}),
        ("drag.airspeed", {"cd0": None, "k": None, "drag_table": ((9.0, 3.0), (8.0, 2.6))}),
        ("drag.drag", {"cd0": None, "k": None, "drag_table": ((9.0, 0.0), (12.0, 2.6))}),
    ],
)
def test_bad_airframes_name_the_field(field, change):
    with pytest.raises(InputError) as caught:
        replace(AIRFRAME, **change)
    assert caught.value.field == field


@pytest.mark.parametrize("field", ["inflow_factor", "thrust_factor"])
def test_bad_installations_name_the_field(field):
    with pytest.raises(InputError) as caught:
        Installation(**{field: 0.0})
    assert caught.value.field == field
