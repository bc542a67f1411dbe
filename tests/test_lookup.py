"""Look-ups against closed forms, the solver itself and similarity."""

from __future__ import annotations

import warnings
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shipped
import xarray as xr

from bemt import files
from bemt.air import Air, standard_air
from bemt.errors import InputError
from bemt.quantities.registry import (
    ENVELOPE,
    LOOKUP,
    SHARES,
    STATUS_CONVERGED,
    STATUS_NOT_CONVERGED,
    STATUS_NOT_RUN,
    STATUS_REVERSED_FLOW,
    STATUS_SEVERAL_ROOTS,
    TRUST_NOT_RUN,
    by_name,
)
from bemt.rotor.elements import blade_elements
from bemt.rotor.solution import solve
from bemt.table.accessor import POINT_DIMENSION, LookupWarning
from bemt.table.lookup import Lookup

AIR = Air(density=1.2, viscosity=1.8e-5, speed_of_sound=340.0)


def closed_form(**changes: Any) -> Lookup:
    """A table of functions that its interpolation reproduces: lines in helix angle, ln Re and Mach number squared."""
    mach, reynolds = np.array([0.0, 0.3, 0.5]), np.geomspace(1e4, 1e6, 5)
    helix = np.radians([0.0, 10.0, 20.0, 45.0, 90.0])
    m, re, angle = np.meshgrid(mach, reynolds, helix, indexing="ij")
    values: dict[str, Any] = {
        "mach": mach,
        "reynolds": reynolds,
        "helix_angle": helix,
        "thrust": (1.0 + m**2) * np.log(re) * (0.01 - 0.02 * angle),
        "torque": (1.0 + 0.5 * m**2) / 1e3 * (12.0 - 0.5 * np.log(re)) * (1.0 - angle),
        "stalled_share": np.clip(angle / 2.0, 0.0, 1.0),
        "outside_polar_share": np.zeros(m.shape),
        "low_reynolds_share": np.where(re < 6e4, 1.0, 0.0),
        "above_divergence_share": np.broadcast_to(m**2, m.shape),
        "status": np.ones(m.shape, dtype=np.int16),
        "diameter": 0.3,
        "chord_75": 0.03,
        "air": AIR,
    }
    return Lookup(**{**values, **changes})


def expected(airspeed: np.ndarray, rpm: np.ndarray, air: Air) -> tuple[np.ndarray, np.ndarray]:
    turning = 0.75 * np.pi * rpm / 60.0 * 0.3
    speed = np.hypot(airspeed, turning)
    m, ln_re = speed / air.speed_of_sound, np.log(air.density * speed * 0.03 / air.viscosity)
    angle = np.arctan2(airspeed, turning)
    thrust = (1.0 + m**2) * ln_re * (0.01 - 0.02 * angle) * air.density * speed**2 * 0.3**2
    torque = (1.0 + 0.5 * m**2) / 1e3 * (12.0 - 0.5 * ln_re) * (1.0 - angle) * air.density * speed**2 * 0.3**3
    return thrust, torque


@pytest.mark.parametrize("air", [AIR, Air(0.7, 1.5e-5, 300.0)])
def test_closed_form_is_reproduced(air: Air) -> None:
    rng = np.random.default_rng(7)
    airspeed, rpm = rng.uniform(0.0, 60.0, 300), rng.uniform(1500.0, 9000.0, 300)
    loads = closed_form().loads(airspeed, rpm, air)
    thrust, torque = expected(airspeed, rpm, air)
    np.testing.assert_allclose(loads.thrust, thrust, rtol=1e-12, atol=1e-12)
    np.testing.assert_allclose(loads.torque, torque, rtol=1e-12, atol=1e-12)
    np.testing.assert_allclose(
        loads.stalled_share, np.arctan2(airspeed, 0.75 * np.pi * rpm / 60.0 * 0.3) / 2.0, rtol=1e-12
    )
    assert (loads.status == STATUS_CONVERGED).all()


def test_shapes_broadcast() -> None:
    lookup = closed_form()
    loads = lookup.loads(np.array([[5.0], [10.0]]), np.array([3000.0, 4000.0, 5000.0]))
    assert {array.shape for array in loads} == {(2, 3)}
    assert loads.thrust[1, 2] == lookup.loads(10.0, 5000.0).thrust
    assert lookup.loads(10.0, 5000.0).thrust.shape == ()
    many = lookup.evaluate(10.0, 5000.0, np.array([1.0, 1.2]), 1.8e-5, 340.0)
    assert many.thrust[1] == pytest.approx(lookup.loads(10.0, 5000.0).thrust.item(), rel=1e-14)


def test_rest_has_no_loads() -> None:
    loads = closed_form().loads(0.0, 0.0)
    assert loads.thrust == 0.0
    assert loads.torque == 0.0
    assert loads.status == STATUS_CONVERGED


def test_slow_turning_keeps_the_lowest_coefficients_and_says_so() -> None:
    lookup = closed_form()
    slow = lookup.loads(0.0, np.array([100.0, 200.0]))
    assert slow.thrust[1] == pytest.approx(4.0 * slow.thrust[0], rel=1e-3)  # Mach number alone still moves it
    np.testing.assert_array_equal(slow.outside_polar_share, 1.0)
    assert (lookup.loads(0.0, 4000.0).outside_polar_share == 0.0).all()


@pytest.mark.parametrize(
    ("airspeed", "rpm", "air", "status"),
    [
        (-1.0, 4000.0, AIR, STATUS_REVERSED_FLOW),
        (10.0, -4000.0, AIR, STATUS_NOT_RUN),
        (0.0, 15000.0, AIR, STATUS_NOT_RUN),  # Mach number
        (0.0, 9000.0, Air(8.0, 1.8e-5, 340.0), STATUS_NOT_RUN),  # Reynolds number
        (np.nan, 4000.0, AIR, STATUS_NOT_RUN),
        (10.0, np.nan, AIR, STATUS_NOT_RUN),
    ],
)
def test_outside_is_missing_and_leaves_other_points_alone(airspeed: float, rpm: float, air: Air, status: int) -> None:
    lookup = closed_form()
    loads = lookup.loads(np.array([5.0, airspeed]), np.array([3000.0, rpm]), air)
    assert np.isnan(loads.thrust[1])
    assert np.isnan(loads.torque[1])
    assert loads.status[1] == status
    assert loads.thrust[0] == lookup.loads(5.0, 3000.0, air).thrust
    assert loads.status[0] == STATUS_CONVERGED


def test_a_node_that_did_not_converge_takes_its_own_cells_and_no_others() -> None:
    whole = closed_form()
    thrust, status = whole.thrust.copy(), whole.status.copy()
    thrust[0, 2, 2], status[0, 2, 2] = np.nan, STATUS_NOT_CONVERGED
    holed = closed_form(thrust=thrust, status=status)
    speed = float(whole.reynolds[2]) * 1.1 * AIR.viscosity / AIR.density / 0.03
    angle = np.radians([5.0, 15.0, 30.0, 60.0])
    airspeed, rpm = speed * np.sin(angle), speed * np.cos(angle) / (0.75 * np.pi * 0.3) * 60.0
    loads = holed.loads(airspeed, rpm)
    np.testing.assert_array_equal(np.isnan(loads.thrust), [False, True, True, False])
    np.testing.assert_array_equal(loads.status == STATUS_NOT_CONVERGED, [False, True, True, False])
    np.testing.assert_allclose(loads.thrust[[0, 3]], whole.loads(airspeed, rpm).thrust[[0, 3]], rtol=1e-12)


def test_status_is_the_worst_of_the_nodes_around() -> None:
    status = np.ones((3, 5, 5), dtype=np.int16)
    status[0, 2, 1] = STATUS_SEVERAL_ROOTS
    lookup = closed_form(status=status)
    speed = float(lookup.reynolds[2]) * 0.9 * AIR.viscosity / AIR.density / 0.03
    angle = np.radians([5.0, 15.0, 30.0])
    loads = lookup.loads(speed * np.sin(angle), speed * np.cos(angle) / (0.75 * np.pi * 0.3) * 60.0)
    np.testing.assert_array_equal(loads.status, [STATUS_SEVERAL_ROOTS, STATUS_SEVERAL_ROOTS, STATUS_CONVERGED])


def test_axes_and_arrays_must_fit() -> None:
    with pytest.raises(InputError, match="ascends"):
        closed_form(reynolds=np.geomspace(1e6, 1e4, 5))
    with pytest.raises(InputError, match="does not fit"):
        closed_form(thrust=np.zeros((3, 5, 4)))
    with pytest.raises(InputError, match="0 to 90"):
        closed_form(helix_angle=np.radians([0.0, 10.0, 20.0, 45.0, 80.0]))


# --- the tables of the shipped cases ---------------------------------------------------------------------------------


@pytest.fixture(params=shipped.CASES)
def name(request: pytest.FixtureRequest) -> str:
    return str(request.param)


@pytest.fixture
def lookup(name: str) -> Lookup:
    return shipped.table(name).propeller.lookup


def direct(name: str, airspeed: Any, rpm: Any, air: Air) -> tuple[np.ndarray, np.ndarray]:
    """Thrust and torque straight from the solver [N], [N m]."""
    case = shipped.case(name)
    solution = solve(
        blade_elements(case.propeller, case.model),
        airspeed,
        np.asarray(rpm) * np.pi / 30.0,
        air.viscosity / air.density,
        air.speed_of_sound,
    )
    return air.density * solution.thrust_per_density, air.density * solution.torque_per_density


def test_nodes_are_the_solution(name: str, lookup: Lookup) -> None:
    # To what the solver leaves open: the Reynolds number lags the local speed by up to 1e-5, worth 1e-6 of the forces.
    rng = np.random.default_rng(3)
    for _ in range(20):
        m, re = rng.integers(1, 4), rng.integers(3, lookup.reynolds.size - 1)
        h = rng.integers(0, 40, 5)
        # The air in which this propeller has these Reynolds and Mach numbers at 60 m/s.
        air = Air(1.0, 60.0 * lookup.chord_75 / lookup.reynolds[re], 60.0 / lookup.mach[m])
        angle = lookup.helix_angle[h]
        airspeed = 60.0 * np.sin(angle)
        rpm = 60.0 * np.cos(angle) / (0.75 * np.pi * lookup.diameter) * 60.0
        loads = lookup.loads(airspeed, rpm, air)
        thrust, torque = direct(name, airspeed, rpm, air)
        known = ~np.isnan(loads.thrust)
        assert known.any()
        largest = np.nanmax(np.abs(lookup.thrust[m, re, :40])), np.nanmax(np.abs(lookup.torque[m, re, :40]))
        force = 60.0**2 * lookup.diameter**2
        np.testing.assert_allclose(loads.thrust[known], thrust[known], rtol=0.0, atol=1e-6 * force * largest[0])
        np.testing.assert_allclose(
            loads.torque[known], torque[known], rtol=0.0, atol=1e-6 * force * lookup.diameter * largest[1]
        )


def worst_errors(name: str, lookup: Lookup, air: Air, rpm_range: tuple[float, float]) -> tuple[float, float, float]:
    """Largest and rms error of thrust and torque as shares of the static value at the same rpm, and points missing."""
    rng = np.random.default_rng(11)
    ratio, rpm = np.sort(rng.uniform(0.0, 0.7, 600)), rng.uniform(*rpm_range, 600)
    airspeed = ratio * rpm / 60.0 * lookup.diameter
    loads = lookup.loads(airspeed, rpm, air)
    exact, static = direct(name, airspeed, rpm, air), direct(name, np.zeros(rpm.size), rpm, air)
    errors = np.array([(loads.thrust - exact[0]) / static[0], (loads.torque - exact[1]) / static[1]])
    return float(np.nanmax(np.abs(errors))), float(np.sqrt(np.nanmean(errors**2))), float(np.isnan(errors).mean())


@pytest.mark.parametrize(("density", "allowed"), [(None, 0.002), (0.7, 0.006)])
def test_between_nodes_it_is_close_to_the_solution(
    name: str, lookup: Lookup, density: float | None, allowed: float
) -> None:
    own = lookup.air
    air = own if density is None else Air(density, own.viscosity, own.speed_of_sound)
    worst, rms, missing = worst_errors(name, lookup, air, (3000.0, 6000.0) if name == "nr640_9in" else (3000.0, 9000.0))
    figures = f"{name}, {air.density:.3f} kg/m3: look-up off by {worst:.3%} at most, {rms:.3%} rms of the static value"
    print(figures)
    assert worst < allowed
    assert rms < 0.0008
    assert missing == 0.0


def test_another_density_matches_reynolds_and_mach_number(name: str, lookup: Lookup) -> None:
    rpm, airspeed = np.array([3500.0, 6000.0]), np.array([4.0, 12.0])
    own = lookup.air
    same = Air(0.5 * own.density, 0.5 * own.viscosity, own.speed_of_sound)  # equal Reynolds numbers
    thin = Air(0.5 * own.density, own.viscosity, own.speed_of_sound)
    at_home, matched, thinner = (lookup.loads(airspeed, rpm, air) for air in (own, same, thin))
    np.testing.assert_allclose(matched.thrust, 0.5 * at_home.thrust, rtol=1e-12)
    np.testing.assert_allclose(matched.torque, 0.5 * at_home.torque, rtol=1e-12)
    # Half the Reynolds number costs lift and adds drag: more than the density alone takes.
    assert (thinner.thrust < 0.999 * 0.5 * at_home.thrust).all()
    np.testing.assert_allclose(thinner.thrust, direct(name, airspeed, rpm, thin)[0], rtol=0.01)


def test_stopped_propeller_in_the_wind_is_the_limit_of_slow_turning(name: str, lookup: Lookup) -> None:
    stopped = lookup.loads(np.array([10.0, 20.0]), 0.0)
    assert (stopped.thrust < 0.0).all()
    assert np.isfinite(stopped.torque).all()
    thrust, torque = direct(name, np.array([10.0, 20.0]), np.zeros(2), lookup.air)
    np.testing.assert_allclose(stopped.thrust, thrust, rtol=0.01)
    np.testing.assert_allclose(stopped.torque, torque, rtol=0.01)
    slow = lookup.loads(20.0, 1e-3)
    assert slow.thrust == pytest.approx(stopped.thrust[1], rel=1e-4)


def test_smooth_over_airspeed(lookup: Lookup) -> None:
    # Slopes just below and above a node of the helix angle agree, at fixed U so that only the angle changes.
    speed, step = 60.0, 1e-6
    for node in (6, 12, 24):
        angle = lookup.helix_angle[node] + np.array([-2.0, -1.0, 0.0, 1.0, 2.0]) * step
        loads = lookup.loads(speed * np.sin(angle), speed * np.cos(angle) / (0.75 * np.pi * lookup.diameter) * 60.0)
        for force in (loads.thrust, loads.torque):
            slope = np.diff(force) / step
            assert slope[2] == pytest.approx(slope[1], rel=1e-3, abs=1e-4 * np.abs(force).max())


# --- the accessor ----------------------------------------------------------------------------------------------------


def test_a_point_by_name(name: str) -> None:
    table, case = shipped.table(name), shipped.case(name)
    point = table.propeller.at(airspeed=9.0, rpm=5000, density=1.2)
    n, diameter = 5000 / 60.0, case.propeller.diameter
    assert point["thrust"].shape == ()
    assert float(point["thrust"]) == pytest.approx(
        float(point["thrust_coefficient"]) * 1.2 * n**2 * diameter**4, rel=1e-12
    )
    assert float(point["shaft_power"]) == pytest.approx(
        float(point["power_coefficient"]) * 1.2 * n**3 * diameter**5, rel=1e-12
    )
    assert float(point["shaft_power"]) == pytest.approx(2.0 * np.pi * n * float(point["torque"]), rel=1e-12)
    assert float(point["advance_ratio"]) == pytest.approx(9.0 / (n * diameter), rel=1e-12)
    assert float(point["efficiency"]) == pytest.approx(
        float(point["thrust"]) * 9.0 / float(point["shaft_power"]), rel=1e-12
    )
    assert point["thrust"].attrs["units"] == by_name(ENVELOPE)["thrust"].units == "N"
    assert {"trust", "trust_reasons", "status", *SHARES} <= set(point.data_vars)


def test_at_the_air_of_the_table_it_agrees_with_the_printed_points(name: str) -> None:
    table, diameter = shipped.table(name), shipped.case(name).propeller.diameter
    printed = table.sel(rpm=5000).isel(advance_ratio=slice(0, None, 4))
    airspeed = printed["advance_ratio"] * 5000 / 60.0 * diameter
    found = table.propeller.at(airspeed, 5000)
    assert found["thrust"].dims == ("advance_ratio",)
    for key in ("thrust_coefficient", "power_coefficient"):
        assert np.abs(found[key] - printed[key]).max() < 0.003 * float(printed[key][0])
    np.testing.assert_allclose(found["helical_tip_mach"], printed["helical_tip_mach"], rtol=1e-12)
    np.testing.assert_allclose(found["reference_reynolds"], printed["reference_reynolds"], rtol=1e-12)


def test_lists_and_labelled_axes() -> None:
    at = shipped.table("sandpiper").propeller.at
    listed = at([5.0, 10.0, 15.0], 6000)
    assert listed["thrust"].dims == (POINT_DIMENSION,)
    speeds = xr.DataArray([5.0, 10.0, 15.0], dims="airspeed", coords={"airspeed": [5.0, 10.0, 15.0]})
    turns = xr.DataArray([5000.0, 6000.0], dims="rpm", coords={"rpm": [5000.0, 6000.0]})
    grid = at(speeds, turns)
    assert grid["thrust"].sizes == {"airspeed": 3, "rpm": 2}
    np.testing.assert_array_equal(grid["thrust"].sel(rpm=6000.0), listed["thrust"])
    thinner = at(10.0, 6000, density=xr.DataArray([1.2, 1.0], dims="air"))
    assert thinner["thrust"][0] > thinner["thrust"][1]
    with pytest.raises(InputError, match="rpm"):
        at(10.0, np.full((2, 2), 5000.0))
    with pytest.raises(InputError, match="density"):
        at(10.0, 6000, density=0.0)


@pytest.mark.parametrize(
    ("airspeed", "rpm", "why"),
    [
        (-2.0, 5000.0, "below zero"),
        (5.0, -5000.0, "below zero"),
        (5.0, np.nan, "not a number"),
        (0.0, 40.0, "lowest of the table"),
        (0.0, 40000.0, "highest of the table"),
    ],
)
def test_leaving_the_table_is_missing_and_said_once(airspeed: float, rpm: float, why: str) -> None:
    at = shipped.table("sandpiper").propeller.at
    with pytest.warns(LookupWarning, match=why) as said:
        found = at([10.0, airspeed, airspeed], [6000.0, rpm, rpm])
    assert len(said) == 1
    assert "2 of 3 points" in str(said[0].message)
    np.testing.assert_array_equal(np.isnan(found["thrust"]), [False, True, True])
    np.testing.assert_array_equal(np.isnan(found["thrust_coefficient"]), [False, True, True])
    assert int(found["status"][0]) in (STATUS_CONVERGED, STATUS_SEVERAL_ROOTS)
    if airspeed >= 0.0:
        assert (found["trust"][1:] == TRUST_NOT_RUN).all()


def test_inside_nothing_is_said() -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        found = shipped.table("sandpiper").propeller.at([0.0, 10.0, 12.0], [6000.0, 6000.0, 0.0])
    assert float(found["efficiency"][0]) == 0.0
    assert np.isfinite(found["thrust"]).all()
    assert np.isnan(found["thrust_coefficient"][2])  # not turning: no advance ratio


def test_a_table_read_from_a_file_answers_the_same(name: str, tmp_path: Path) -> None:
    table = shipped.table(name)
    files.write(table, tmp_path / "table.nc")
    back = files.read(tmp_path / "table.nc")
    for quantity in LOOKUP:
        assert back[quantity.name].dims == quantity.dimensions
    again = Lookup.from_dataset(back)
    airspeed, rpm = np.linspace(0.0, 15.0, 7), np.full(7, 5500.0)
    for air in (None, standard_air(2000.0)):
        for ours, theirs in zip(
            table.propeller.lookup.loads(airspeed, rpm, air), again.loads(airspeed, rpm, air), strict=True
        ):
            np.testing.assert_allclose(theirs, ours, rtol=1e-12, atol=1e-14)
    np.testing.assert_allclose(
        back.propeller.at(9.0, 5000)["thrust"], table.propeller.at(9.0, 5000)["thrust"], rtol=1e-12
    )


def test_a_dataset_without_a_table_is_refused() -> None:
    with pytest.raises(InputError, match="look-up"):
        Lookup.from_dataset(xr.Dataset({"thrust_coefficient": ("rpm", [0.1])}))
    bare = shipped.table("sandpiper").copy()
    del bare.attrs["air_density"]
    with pytest.raises(InputError, match="air_density"):
        Lookup.from_dataset(bare)
