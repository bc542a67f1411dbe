"""Hovering and climbing straight up, against momentum theory and a general-purpose root finder."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
import shipped
from analytic_propeller import AnalyticPropeller
from scipy.optimize import brentq

import bemt
from bemt.air import standard_air
from bemt.drive import Battery, Controller, Drive, Motor, speed_constant_from_rpm
from bemt.drive.battery import OPEN_CIRCUIT_VOLTAGE
from bemt.errors import InputError
from bemt.flight import Installation, Multirotor, build_envelope
from bemt.quantities.registry import ENVELOPE_HOVER, ENVELOPE_HOVER_WITHOUT_MOTOR, by_name

AIR = standard_air(0.0)
PROPELLER = AnalyticPropeller(diameter=0.254, thrust=(0.110, -0.070, -0.130), power=(0.045, 0.020, -0.100))
MOTOR = Motor(speed_constant_from_rpm(700.0), 0.1, ((10.0, 0.5),), count=4, current_limit=9.0)
CONTROLLER = Controller(on_resistance=0.006, idle_current=0.03)
BATTERY = Battery(cells_in_series=4, cell_resistance=0.0026, capacity=21_600.0)
DRAG = ((5.0, 0.3), (10.0, 1.2), (40.0, 19.2))
CRAFT = Multirotor(mass=2.0, drag_table=DRAG)
PARTS = {
    "motor": MOTOR,
    "controller": CONTROLLER,
    "battery": BATTERY,
    "airframe": CRAFT,
    "installation": Installation(inflow_factor=1.0, thrust_factor=0.96),
}
AXES = {"airspeed": np.linspace(0.0, 18.0, 19), "throttle": np.linspace(0.1, 1.0, 10)}
DRIVE = Drive(PROPELLER, MOTOR, BATTERY, CONTROLLER, AIR, 1.0, 0.96)
WEIGHT = 2.0 * 9.80665


@pytest.fixture(scope="module")
def envelope():
    return build_envelope(PROPELLER, AIR, **PARTS, **AXES)


def _point(envelope, name: str, quantity: str) -> float:
    return float(envelope.values[f"point_{quantity}"][envelope.points.index(name)])


def _surplus(airspeed: float, throttle: float) -> float:
    drag = float(np.interp(airspeed, [0.0, *(row[0] for row in DRAG)], [0.0, *(row[1] for row in DRAG)]))
    return 0.96 * float(DRIVE.at_throttle(airspeed, throttle).thrust) - WEIGHT - drag


def test_every_name_and_shape_is_the_registrys(envelope):
    known = by_name(ENVELOPE_HOVER)
    assert set(envelope.values) == set(known)
    sizes = {"airspeed": 19, "throttle": 10, "point": 3}
    for name, array in envelope.values.items():
        assert array.shape == tuple(sizes[dimension] for dimension in known[name].dimensions), name
    labelled = envelope.to_dataset({})
    assert labelled["climb_rate"].dims == ("throttle",)
    assert list(labelled["point"].values) == ["static", "hover", "best_climb"]


def test_hover_by_similarity(envelope):
    # Thrust of one rotor rho n^2 D^4 CT gives the rpm, the rpm the power rho n^3 D^5 CP; the figure of merit of a rotor
    # in still air is sqrt(2/pi) CT^1.5/CP whatever its size.
    each = WEIGHT / 4 / 0.96
    n = math.sqrt(each / (AIR.density * 0.254**4 * 0.110))
    assert _point(envelope, "hover", "airspeed") == 0.0
    assert _point(envelope, "hover", "thrust") == pytest.approx(4 * each, rel=1e-11)
    assert _point(envelope, "hover", "rpm") == pytest.approx(60.0 * n, rel=1e-10)
    assert _point(envelope, "hover", "shaft_power") == pytest.approx(AIR.density * n**3 * 0.254**5 * 0.045, rel=1e-10)
    merit = math.sqrt(2.0 / math.pi) * 0.110**1.5 / 0.045
    for name in ("hover", "static"):
        assert _point(envelope, name, "figure_of_merit") == pytest.approx(merit, rel=1e-10)
    assert math.isnan(_point(envelope, "best_climb", "figure_of_merit"))
    assert _point(envelope, "hover", "thrust_to_weight") == pytest.approx(1.0, rel=1e-11)
    full = 0.96 * float(DRIVE.at_throttle(0.0, 1.0).thrust) / WEIGHT
    assert _point(envelope, "static", "thrust_to_weight") == pytest.approx(full, rel=1e-12)


def test_ten_newton_on_a_ten_inch_disk_need_ninety_watts():
    # Momentum theory: T sqrt(T/(2 rho A)) = 90 W at 1.225 kg/m3, and no rotor needs less. A rotor of figure of merit 1.
    ideal = AnalyticPropeller(
        diameter=0.254, thrust=(0.1, -0.05, -0.1), power=(0.1**1.5 * math.sqrt(2.0 / math.pi), 0, 0)
    )
    found = build_envelope(ideal, AIR, airframe=Multirotor(mass=10.0 / 9.80665), airspeed=[0.0, 5.0], rpm=[9000.0])
    area = math.pi * 0.127**2
    assert _point(found, "hover", "shaft_power") == pytest.approx(
        10.0 * math.sqrt(10.0 / (2 * AIR.density * area)), rel=1e-9
    )
    assert _point(found, "hover", "shaft_power") == pytest.approx(90.0, rel=0.01)
    assert _point(found, "hover", "figure_of_merit") == pytest.approx(1.0, rel=1e-9)


def test_the_hover_throttle_holds_the_weight(envelope):
    throttle = _point(envelope, "hover", "throttle")
    assert throttle == pytest.approx(brentq(lambda stick: _surplus(0.0, stick), 0.2, 1.0), rel=1e-9)
    points = DRIVE.at_throttle(0.0, throttle)
    for name in ("motor_current", "battery_current", "battery_power", "motor_efficiency"):
        assert _point(envelope, "hover", name) == pytest.approx(float(getattr(points, name)), rel=1e-9)


def test_fastest_climb(envelope):
    fastest = brentq(lambda airspeed: _surplus(airspeed, 1.0), 0.0, 40.0, xtol=1e-12)
    assert _point(envelope, "best_climb", "airspeed") == pytest.approx(fastest, rel=1e-10)
    assert _point(envelope, "best_climb", "climb_rate") == pytest.approx(fastest, rel=1e-10)
    assert _point(envelope, "best_climb", "throttle") == 1.0
    assert math.isnan(_point(envelope, "hover", "climb_rate"))
    climbs = np.isfinite(envelope.values["level_rpm"])
    np.testing.assert_array_equal(climbs, AXES["airspeed"] <= fastest)


def test_climb_over_throttle(envelope):
    climb_rate = envelope.values["climb_rate"]
    for stick, found in zip(AXES["throttle"], climb_rate, strict=True):
        if _surplus(0.0, stick) < 0.0:
            assert math.isnan(found)
        else:
            assert found == pytest.approx(brentq(lambda V, stick=stick: _surplus(V, stick), 0.0, 40.0), rel=1e-9)
    assert 2 < np.isfinite(climb_rate).sum() < 10


def test_steady_climb_needs_weight_and_drag(envelope):
    values = envelope.values
    drag = np.interp(AXES["airspeed"], [0.0, 5.0, 10.0, 40.0], [0.0, 0.3, 1.2, 19.2])
    np.testing.assert_allclose(values["drag"], drag)
    np.testing.assert_allclose(values["required_thrust"], (WEIGHT + drag) / 0.96)
    there = np.isfinite(values["level_rpm"])
    np.testing.assert_allclose(values["level_thrust"][there], values["required_thrust"][there], rtol=1e-11)
    again = DRIVE.at_throttle(AXES["airspeed"][there], values["level_throttle"][there])
    np.testing.assert_allclose(again.rpm, values["level_rpm"][there], rtol=1e-9)


def test_endurance_of_a_drive_without_losses():
    # The power is then that of the shafts whatever the voltage: usable energy over it, the open-circuit voltage
    # integrated over the charge from a fifth to all of it.
    motor = Motor(speed_constant_from_rpm(900.0), 1e-7, ((10.0, 0.0),), count=4)
    battery = replace(BATTERY, cell_resistance=0.0)
    found = build_envelope(PROPELLER, AIR, motor=motor, battery=battery, airframe=CRAFT, **AXES)
    shares, volts = np.array(OPEN_CIRCUIT_VOLTAGE["lithium-polymer"])
    energy = battery.capacity * 4.0 * np.trapezoid(volts[shares >= 0.2], shares[shares >= 0.2])
    power = 4.0 * _point(found, "hover", "shaft_power")
    assert _point(found, "hover", "endurance") == pytest.approx(energy / power, rel=1e-6)
    assert found.values["endurance"][0] == pytest.approx(energy / power, rel=1e-6)


def test_without_a_motor_one_propeller_carries_the_mass():
    rpm = np.array([4000.0, 7000.0, 9000.0])
    craft = Multirotor(mass=0.5)
    found = build_envelope(PROPELLER, AIR, airframe=craft, airspeed=AXES["airspeed"], rpm=rpm)
    known = by_name(ENVELOPE_HOVER_WITHOUT_MOTOR)
    assert set(found.values) == set(known)
    sizes = {"airspeed": 19, "rpm": 3, "point": 3}
    for name, array in found.values.items():
        assert array.shape == tuple(sizes[dimension] for dimension in known[name].dimensions), name
    weight = 0.5 * 9.80665
    n = math.sqrt(weight / (AIR.density * 0.254**4 * 0.110))
    assert _point(found, "hover", "rpm") == pytest.approx(60.0 * n, rel=1e-10)

    def surplus(airspeed: float, rpm: float) -> float:
        return float(PROPELLER.loads(airspeed, rpm, AIR).thrust) - weight

    for turns, climb in zip(rpm, found.values["climb_rate"], strict=True):
        if surplus(0.0, turns) < 0.0:
            assert math.isnan(climb)
        else:
            assert climb == pytest.approx(brentq(surplus, 0.0, 60.0, args=(turns,)), rel=1e-9)
    assert any("one propeller carries the whole mass" in note for note in found.notes)
    assert any("without the drag of the airframe" in note for note in found.notes)
    assert found.to_dataset({})["climb_rate"].dims == ("rpm",)


def test_too_heavy_to_lift():
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": replace(CRAFT, mass=20.0)}), **AXES)
    for name in ("level_rpm", "endurance", "climb_rate"):
        assert np.isnan(found.values[name]).all()
    assert math.isnan(_point(found, "hover", "rpm"))
    assert math.isnan(_point(found, "best_climb", "airspeed"))
    assert np.isfinite(_point(found, "static", "thrust"))
    assert any(note.startswith("it does not hover") for note in found.notes)
    assert found.decisions[0].startswith("it does not lift off: full thrust standing still is 0.")


def test_a_drag_table_that_ends_before_the_fastest_climb():
    found = build_envelope(PROPELLER, AIR, **(PARTS | {"airframe": replace(CRAFT, drag_table=DRAG[:2])}), **AXES)
    assert math.isnan(_point(found, "best_climb", "airspeed"))
    assert math.isnan(found.values["climb_rate"][-1])
    assert any(note.startswith("fastest climb not known: it still climbs at 10.0 m/s") for note in found.notes)


def test_decisions_in_words(envelope):
    lift, throttle, chain, first = envelope.decisions
    assert f"{_point(envelope, 'static', 'thrust_to_weight'):.2f} of the weight" in lift
    assert throttle == f"hover takes {100 * _point(envelope, 'hover', 'throttle'):.0f} % throttle"
    assert "The propeller loses most" in chain or "The motor loses most" in chain
    ideal = 4 * (WEIGHT / 4 / 0.96) ** 1.5 / math.sqrt(2 * AIR.density * math.pi * 0.127**2)
    assert f"{ideal:.3g} W is the least that this thrust takes" in chain
    binds = brentq(lambda stick: float(DRIVE.at_throttle(0.0, stick).motor_current) - 9.0, 0.1, 1.0)
    assert f"standing still the motor's current (9 A) from throttle {binds:.2f}" in first
    assert "in hover and climb" in first


def test_named_points_do_not_depend_on_the_axes(envelope):
    other = build_envelope(PROPELLER, AIR, **PARTS, airspeed=[3.0, 5.0], throttle=[0.4])
    for name, array in envelope.values.items():
        if name.startswith("point_"):
            np.testing.assert_array_equal(other.values[name], array, err_msg=name)


def test_the_shipped_craft():
    run = bemt.envelope(shipped.case("mudlark_hover"), table=shipped.table("mudlark_hover"))
    hover = run.sel(point="hover")
    assert float(hover["point_thrust"]) * 0.96 == pytest.approx(2.0 * 9.80665, rel=1e-9)
    # No rotor does better than momentum theory (figure of merit 1).
    assert 0.3 < float(hover["point_figure_of_merit"]) < 1.0
    assert 0.0 < float(hover["point_throttle"]) < 1.0
    sinks = np.isnan(run["climb_rate"].values)
    np.testing.assert_array_equal(sinks, run["throttle"].values < float(hover["point_throttle"]))
    assert "stopped_drag" not in run


@pytest.mark.parametrize(
    ("field", "change"),
    [
        ("mass", {"mass": 0.0}),
        ("drag", {"drag_table": ((5.0, 0.3),)}),
        ("drag.airspeed", {"drag_table": ((0.0, 0.3), (5.0, 0.6))}),
        ("drag.airspeed", {"drag_table": ((5.0, 0.3), (4.0, 0.6))}),
        ("drag.drag", {"drag_table": ((5.0, 0.0), (6.0, 0.6))}),
    ],
)
def test_bad_multirotors_name_the_field(field, change):
    with pytest.raises(InputError) as caught:
        replace(CRAFT, **change)
    assert caught.value.field == field
