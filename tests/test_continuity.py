"""Coefficients are continuous in advance ratio and rpm where the polars are smooth, and folds are flagged where not."""

from __future__ import annotations

import numpy as np
import pytest
import random_elements as make

from bemt.air import standard_air
from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.rotor.elements import blade_elements
from bemt.rotor.model import Model
from bemt.rotor.solution import solve
from bemt.section.full_circle import ANGLES
from bemt.section.polar import PolarTable

DIAMETER = 0.3


def propeller(stall_width_deg: float) -> Propeller:
    """Two blades of 6 in pitch with a section given by formula; the stall takes about `stall_width_deg`."""
    reynolds = np.array([2e4, 5e4, 1e5, 2e5, 5e5, 1e6])
    lift, drag = [], []
    for number in reynolds:
        scale = np.log(number / 1e5)
        zero = np.radians(-3.0 - 0.2 * scale)
        stall = np.radians(12.0 + scale)
        width = np.radians(stall_width_deg)
        separated = 0.5 * (1 + np.tanh((np.abs(ANGLES - zero) - stall) / (2 * width)))
        plate = 0.9 * np.sin(2 * ANGLES)
        lift.append((1 - separated) * 5.6 * np.sin(ANGLES - zero) + separated * plate)
        attached = 0.015 * (number / 1e5) ** -0.5 + 0.2 * (ANGLES - zero) ** 2
        drag.append(np.exp((1 - separated) * np.log(attached) + separated * np.log(0.05 + 1.8 * np.sin(ANGLES) ** 2)))
    table = PolarTable(ANGLES, reynolds, np.array(lift), np.array(drag), "a formula", t_over_c=0.1)
    x = np.linspace(0.15, 1.0, 18)
    twist = np.arctan(0.1524 / (np.pi * DIAMETER * x))
    chord = 0.18 * (1 - 0.6 * ((x - 0.35) / 0.65) ** 2)
    return Propeller(2, DIAMETER, Stations(x, chord, twist), (SectionSpan(polars=table),))


def coefficients(blade, ratio, rpm):
    air = standard_air()
    n = rpm / 60
    got = solve(blade, ratio * n * DIAMETER, 2 * np.pi * n, air.kinematic_viscosity, air.speed_of_sound)
    scale = np.asarray(n) ** 2 * DIAMETER**4
    return got.thrust_per_density / scale, 2 * np.pi * got.torque_per_density / scale / DIAMETER, got.status


def largest_step(values):
    return float(np.abs(np.diff(values)).max())


@pytest.mark.parametrize("axis", ["advance ratio", "rpm"])
def test_no_step_that_halving_the_interval_would_not_halve(axis: str) -> None:
    blade = blade_elements(propeller(4.0), Model())
    steps = []
    for count in (401, 801, 1601):
        if axis == "advance ratio":
            thrust, power, status = coefficients(blade, np.linspace(0.0, 2.0, count), np.full(count, 6000.0))
        else:
            thrust, power, status = coefficients(blade, np.full(count, 0.35), np.geomspace(1500, 14000, count))
        assert (status == 1).all()
        steps.append((largest_step(thrust), largest_step(power)))
    ratios = np.array(steps)[1:] / np.array(steps)[:-1]
    print(f"\n{axis}: largest steps {steps}, ratios on halving {ratios.round(3).tolist()}")
    assert (ratios < 0.56).all()


def test_folds_of_a_sharp_stall_are_flagged() -> None:
    """Where CT jumps between two neighbours, one of them says that the stall offers several roots."""
    count = 6001
    blade = blade_elements(propeller(0.25), Model(stall_delay="none"))
    ratio = np.linspace(0.0, 0.6, count)
    thrust, _, status = coefficients(blade, ratio, np.full(count, 6000.0))
    steps = np.abs(np.diff(thrust))
    jumps = np.flatnonzero(steps > 12 * np.median(steps))
    flagged = (status[jumps] == 2) | (status[jumps + 1] == 2)
    print(f"\n{jumps.size} jumps, {int(flagged.sum())} of them flagged")
    assert jumps.size > 5, "a stall this sharp folds"
    assert flagged.all()


def test_random_points_hold_nothing_over_from_call_to_call() -> None:
    rng = np.random.default_rng(2)
    polars, bounds = make.polar_set(True, rng, 3)
    columns = make.elements(rng, 40, 2, 3)
    points = np.tile([3.0, 200.0, 7e4, 1 / 340.0], (7, 1))
    first = make.solve(points, columns, polars, bounds, 2)
    second = make.solve(points, columns, polars, bounds, 2)
    for name, values in first.items():
        assert np.array_equal(values, second[name], equal_nan=True), name
        assert np.array_equal(values[0], values[-1], equal_nan=True), name
