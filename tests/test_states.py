"""All states of a propeller in axial flow, in their order along the airspeed, and what takes trust away."""

from __future__ import annotations

import math

import numpy as np
import pytest
import shipped

from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.quantities.registry import TRUST_POOR, TRUST_REASONS
from bemt.rotor.model import Model
from bemt.table.build import build_table
from bemt.table.grid import Grid
from bemt.table.validity import trust_in_words


@pytest.mark.parametrize("name", shipped.CASES)
def test_from_standing_still_to_a_stopped_propeller(name: str) -> None:
    # H. Glauert, Airplane Propellers, 1935: propeller, zero thrust before zero torque, windmill, brake.
    case, lookup = shipped.case(name), shipped.table(name).propeller
    rpm, diameter = 5000.0, case.propeller.diameter
    ratio = np.linspace(0.0, 2.0, 801)
    found = lookup.at(airspeed=ratio * rpm / 60.0 * diameter, rpm=rpm)
    ct, cp = found["thrust_coefficient"].values, found["power_coefficient"].values
    no_thrust, no_torque = int(np.argmax(ct < 0.0)), int(np.argmax(cp < 0.0))
    assert 0 < no_thrust < no_torque
    static, propels = found.isel(operating_point=0), found.isel(operating_point=slice(1, no_thrust))
    assert float(static["thrust"]) > 0.0
    assert float(static["torque"]) > 0.0
    assert float(static["efficiency"]) == 0.0
    assert (propels["efficiency"] > 0.0).all()
    assert (propels["efficiency"] < 1.0).all()
    # Between zero thrust and zero torque it takes power and holds back; beyond, the wind turns it.
    braking = found.isel(operating_point=slice(no_thrust, no_torque))
    assert (braking["thrust"] < 0.0).all()
    assert (braking["torque"] >= 0.0).all()
    windmill = found.isel(operating_point=slice(no_torque, no_torque + 100))
    assert (windmill["thrust"] < 0.0).all()
    assert (windmill["shaft_power"] < 0.0).all()
    assert np.isnan(windmill["efficiency"]).all()

    # A stopped propeller is a bluff body: drag along the wind, less than that of its planform broadside (drag
    # coefficient of a plate near 2, S.F. Hoerner, Fluid-Dynamic Drag), and the wind would turn it forward.
    stopped = lookup.at(airspeed=15.0, rpm=0.0)
    stations = case.propeller.stations
    x = np.linspace(case.propeller.root, 1.0, 200)
    radius = diameter / 2.0
    chord, twist = (np.interp(x, stations.r_over_R, values) for values in (stations.c_over_R, stations.twist))
    planform = case.propeller.blades * np.trapezoid(chord * np.cos(twist), x) * radius**2
    drag = -float(stopped["thrust"]) / (0.5 * case.air.density * 15.0**2)
    assert 0.7 * planform < drag < 2.2 * planform
    assert float(stopped["torque"]) < 0.0
    assert math.isnan(float(stopped["thrust_coefficient"]))


def test_tips_beyond_drag_divergence_are_out_of_range() -> None:
    # A blade of constant thickness, turned from well below to well above its divergence Mach number.
    x = np.linspace(0.2, 1.0, 9)
    propeller = Propeller(
        blades=2,
        diameter=0.3,
        stations=Stations(x, np.full(9, 0.15), np.arctan(0.6 / (math.pi * x)), t_over_c=np.full(9, 0.12)),
        sections=(SectionSpan(family="four-digit", camber=0.02),),
    )
    case = shipped.case("sandpiper")
    tip_mach = np.array([0.5, 0.68, 0.72, 0.76, 0.85])
    rpm = tip_mach * case.air.speed_of_sound / (math.pi * 0.3) * 60.0
    values = build_table(propeller, case.air, Model(), Grid(np.zeros(1), rpm), lookup=False).values
    share = values["above_divergence_share"][:, 0]
    # Korn: 0.87 - 0.12 less a tenth of the lift coefficient; nobody is above it at a tip Mach number of 0.5.
    assert share[0] == 0.0
    assert (np.diff(share) >= 0.0).all()
    assert share[-1] > 0.3
    bit = next(bit for bit, word in TRUST_REASONS.items() if word == "high_mach")
    beyond = tip_mach - (0.87 - 0.12 - 0.05)
    np.testing.assert_array_equal((values["trust_reasons"][:, 0] & bit) != 0, (beyond > 0.0) | (share > 0.05))
    assert (values["trust"][beyond > 0.05] == TRUST_POOR).all()


def test_trust_in_words_counts_and_places() -> None:
    trust = np.array([[3, 3, 2], [1, 2, 0]])
    reasons = np.array([[0, 0, 4], [1 | 4, 4, 0]])
    said = trust_in_words(trust, reasons, {"rpm": [3000, 6000], "J": [0.0, 0.25, 0.5]})
    assert said == (
        "good at 2 of 5 points",
        "fair at 2 points: low Reynolds number at 2 (J 0.25 to 0.5)",
        "poor at 1 points: stalled at 1 (rpm 6000, J 0); low Reynolds number at 1 (rpm 6000, J 0)",
    )
