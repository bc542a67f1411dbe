"""Descent: its curve against published points, continuity with standing still, and that nothing of it looks certain."""

from __future__ import annotations

import math
from dataclasses import replace
from functools import lru_cache

import numpy as np
import pytest
import shipped
from matplotlib.backends.backend_agg import FigureCanvasAgg
from scipy.optimize import brentq

from bemt.errors import InputError
from bemt.figures.coefficients import coefficient_figure
from bemt.files.text import coefficient_text
from bemt.quantities.registry import STATUS_NOT_CONVERGED, STATUS_REVERSED_FLOW, TRUST_POOR, TRUST_REASONS
from bemt.rotor import kernels as k
from bemt.rotor.descent import mean_induced_velocity, solve_descent
from bemt.rotor.element_polars import coefficients
from bemt.rotor.elements import BladeElements, blade_elements
from bemt.rotor.solution import RotorSolution, solve
from bemt.table.build import TableResult, build_table
from bemt.table.grid import Grid


@lru_cache
def blade(name: str) -> BladeElements:
    case = shipped.case(name)
    return blade_elements(case.propeller, case.model)


def at(name: str, rpm: float, advance_ratio: np.ndarray, *, radial: bool = False) -> RotorSolution:
    case = shipped.case(name)
    turns = np.full(advance_ratio.size, rpm / 60.0)
    return solve_descent(
        blade(name),
        advance_ratio * turns * case.propeller.diameter,
        2.0 * math.pi * turns,
        case.air.kinematic_viscosity,
        case.air.speed_of_sound,
        radial=radial,
    )


def test_mean_induced_velocity_meets_momentum_theory_on_both_sides() -> None:
    # w (V + w) = 1 ahead, -w (V + w) = 1 from behind: W.J.M. Rankine, R.E. Froude; in units of the ideal velocity.
    climb = np.array([0.0, 0.5, 3.0])
    w = mean_induced_velocity(climb)
    np.testing.assert_allclose(w * (climb + w), 1.0, rtol=1e-12)
    fast = np.array([-2.0, -2.5, -6.0, -1e4])
    w = mean_induced_velocity(fast)
    np.testing.assert_allclose(-w * (fast + w), 1.0, rtol=1e-7)
    # The measured curve starts at standing still and meets the windmill brake to 3 %; its top is 2.1 near -1.6.
    assert mean_induced_velocity(-1e-9) == pytest.approx(1.0, abs=1e-8)
    assert mean_induced_velocity(-2.0 + 1e-9) == pytest.approx(1.026, abs=1e-3)
    curve = mean_induced_velocity(np.linspace(-2.0, 0.0, 401))
    assert curve.max() == pytest.approx(2.1, abs=0.05)


@pytest.mark.parametrize("name", shipped.CASES)
@pytest.mark.parametrize("rpm", [3000.0, 6000.0])
def test_it_starts_from_standing_still(name: str, rpm: float) -> None:
    case = shipped.case(name)
    static = solve(blade(name), 0.0, 2.0 * math.pi * rpm / 60.0, case.air.kinematic_viscosity, case.air.speed_of_sound)
    found = at(name, rpm, np.array([-1e-6, -0.01]))
    for key in ("thrust_per_density", "torque_per_density"):
        gap = getattr(found, key) / getattr(static, key) - 1.0
        print(f"{name} {rpm:g}: {key} {gap[0]:+.1e} just below standing still, {gap[1]:+.2%} at J = -0.01")
        assert abs(gap[0]) < 1e-4
        assert abs(gap[1]) < 0.02


def test_the_mean_inflow_is_that_of_the_curve_and_the_least_one() -> None:
    # One point written apart: scale the static induced velocities, add up the forces of the radial solution by hand.
    name, rpm, ratio = "sandpiper", 5000.0, np.array([-0.2])
    case = shipped.case(name)
    found = at(name, rpm, ratio, radial=True)
    static = solve(
        blade(name),
        0.0,
        2.0 * math.pi * rpm / 60.0,
        case.air.kinematic_viscosity,
        case.air.speed_of_sound,
        radial=True,
    )
    assert found.radial is not None
    assert static.radial is not None
    factor = found.radial["axial_induced_velocity"][0] / static.radial["axial_induced_velocity"][0]
    np.testing.assert_allclose(factor, factor[0], rtol=1e-9)
    twice_area = 2.0 * math.pi * blade(name).tip_radius ** 2
    ideal = math.sqrt(found.thrust_per_density.item() / twice_area)
    airspeed = ratio[0] * rpm / 60.0 * case.propeller.diameter
    mean = ideal * float(mean_induced_velocity(airspeed / ideal))
    assert factor[0] * math.sqrt(static.thrust_per_density.item() / twice_area) == pytest.approx(mean, rel=1e-6)


def test_forces_in_descent_against_scipy() -> None:
    # The balance between elements and curve written apart, and its root by scipy.
    name, rpm = "nr640_9in", 5000.0
    case = shipped.case(name)
    omega, diameter = 2.0 * math.pi * rpm / 60.0, case.propeller.diameter
    airspeed = -0.15 * rpm / 60.0 * diameter
    twice_area = 2.0 * math.pi * blade(name).tip_radius ** 2
    air = (case.air.kinematic_viscosity, case.air.speed_of_sound)
    static = solve(blade(name), 0.0, omega, *air)
    hover = math.sqrt(static.thrust_per_density.item() / twice_area)

    columns = blade(name).columns
    shape = solve(blade(name), 0.0, omega, *air, radial=True).radial
    assert shape is not None

    def thrust(factor: float) -> float:
        axial = airspeed + factor * shape["axial_induced_velocity"][0]
        around = omega * columns[:, k.E_RADIUS] - factor * shape["tangential_induced_velocity"][0]
        speed, inflow = np.hypot(axial, around), np.arctan2(axial, around)
        chord = columns[:, k.E_CHORD]
        cl, cd = coefficients(
            blade(name), columns[:, k.E_TWIST] - inflow, np.log(speed * chord / air[0]), speed / air[1]
        )
        normal = cl * np.cos(inflow) - cd * np.sin(inflow)
        return float((0.5 * blade(name).blades * chord * speed**2 * normal) @ columns[:, k.E_WIDTH])

    def wanting(factor: float) -> float:
        ideal = math.sqrt(thrust(factor) / twice_area)
        return ideal * float(mean_induced_velocity(airspeed / ideal)) - factor * hover

    factor = brentq(wanting, 0.5, 3.0, xtol=1e-12)
    found = at(name, rpm, np.array([-0.15]))
    assert found.thrust_per_density.item() == pytest.approx(thrust(factor), rel=1e-6)


# --- the table -------------------------------------------------------------------------------------------------------


@lru_cache
def table() -> TableResult:
    case = shipped.case("sandpiper")
    grid = Grid(np.linspace(-0.6, 0.6, 13), np.array([4000.0, 8000.0]))
    return build_table(case.propeller, case.air, case.model, grid, radial=True, lookup=False)


def test_descent_is_never_certain_and_has_no_efficiency() -> None:
    values, down = table().values, table().advance_ratio < 0.0
    bit = next(bit for bit, word in TRUST_REASONS.items() if word == "descent")
    assert (values["trust"][:, down] == TRUST_POOR).all()
    assert ((values["trust_reasons"][:, down] & bit) != 0).all()
    assert ((values["trust_reasons"][:, ~down] & bit) == 0).all()
    assert (values["status"][:, down] == STATUS_REVERSED_FLOW).all()
    assert np.isnan(values["efficiency"][:, down]).all()
    assert np.isfinite(values["thrust_coefficient"]).all()
    assert any("descent" in note for note in table().notes)
    # Landmarks are those of forward flight.
    case = shipped.case("sandpiper")
    ahead = build_table(
        case.propeller, case.air, case.model, Grid(np.linspace(0.0, 0.6, 7), table().rpm), lookup=False
    ).values
    for key in ("static_figure_of_merit", "zero_thrust_advance_ratio", "peak_efficiency"):
        np.testing.assert_allclose(values[key], ahead[key], rtol=1e-12)
    np.testing.assert_allclose(values["thrust_coefficient"][:, 6:], ahead["thrust_coefficient"], rtol=1e-12)


def test_figure_and_text_say_descent() -> None:
    dataset = table().to_dataset({"title": "t"})
    said = " ".join(coefficient_text(dataset).split())
    assert "descent, a mean-inflow estimate at 12 (J -0.6 to -0.1)" in said
    figure = coefficient_figure(dataset)
    FigureCanvasAgg(figure).draw()
    texts = " ".join(text.get_text() for text in figure.texts)
    assert "Trust poor at 12 points: descent, a mean-inflow estimate" in texts
    labels = [text.get_text() for legend in figure.legends for text in legend.get_texts()]
    assert "descent, estimated" in labels


def test_a_blade_that_does_not_pull_has_no_estimate() -> None:
    columns = blade("sandpiper").columns.copy()
    columns[:, k.E_TWIST] -= math.radians(45.0)
    found = solve_descent(replace(blade("sandpiper"), columns=columns), -3.0, 500.0, 1.5e-5, 340.0)
    assert found.status.item() == STATUS_NOT_CONVERGED
    assert np.isnan(found.thrust_per_density).all()


@pytest.mark.parametrize(("airspeed", "omega"), [(1.0, 500.0), (-1.0, 0.0), (math.nan, 500.0)])
def test_what_it_refuses(airspeed: float, omega: float) -> None:
    with pytest.raises(InputError):
        solve_descent(blade("sandpiper"), airspeed, omega, 1.5e-5, 340.0)
