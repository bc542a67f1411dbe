"""The coefficient table against the definitions, momentum theory's closed forms, similarity and a general optimiser."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
import shipped
import xarray as xr
from scipy.optimize import brentq, minimize_scalar

import bemt
from bemt.air import Air
from bemt.case.load import Case
from bemt.errors import InputError
from bemt.quantities.registry import (
    RADIAL,
    SHARES,
    STATUS_CONVERGED,
    STATUS_NOT_CONVERGED,
    STATUS_NOT_RUN,
    STATUS_REVERSED_FLOW,
    STATUS_SEVERAL_ROOTS,
    TABLE,
    TRUST_FAIR,
    TRUST_GOOD,
    TRUST_NOT_RUN,
    TRUST_POOR,
    TRUST_REASONS,
)
from bemt.rotor.elements import cosine_spaced
from bemt.table.build import build_table
from bemt.table.coefficients import efficiency, figure_of_merit
from bemt.table.grid import Grid
from bemt.table.validity import grade


@pytest.fixture(params=shipped.CASES)
def name(request: pytest.FixtureRequest) -> str:
    return str(request.param)


@pytest.fixture
def case(name: str) -> Case:
    return shipped.case(name)


@pytest.fixture
def table(name: str) -> xr.Dataset:
    return shipped.table(name)


def test_coefficients_are_forces_by_their_definitions(table: xr.Dataset, case: Case) -> None:
    # Thrust and torque are added up here from the loading along the blade, which is in newtons and metres.
    diameter, rho = case.propeller.diameter, case.air.density
    _, width = cosine_spaced(case.propeller.root, case.model.elements)
    dr = width * diameter / 2.0
    n = table["rpm"].values[:, None] / 60.0
    thrust, torque = (table[f"{force}_loading"].values @ dr for force in ("thrust", "torque"))
    np.testing.assert_allclose(table["thrust_coefficient"], thrust / (rho * n**2 * diameter**4), rtol=1e-10, atol=1e-12)
    np.testing.assert_allclose(table["torque_coefficient"], torque / (rho * n**2 * diameter**5), rtol=1e-10, atol=1e-12)
    power = torque * 2.0 * np.pi * n
    np.testing.assert_allclose(table["power_coefficient"], power / (rho * n**3 * diameter**5), rtol=1e-10, atol=1e-12)


def test_radial_results_are_one_flow(table: xr.Dataset, case: Case) -> None:
    # The inflow angle is that of the velocities, in degrees; lift and drag resolved along it give the loading.
    diameter, rho = case.propeller.diameter, case.air.density
    n = table["rpm"].values[:, None, None] / 60.0
    r = table["r_over_R"].values * diameter / 2.0
    axial = table["advance_ratio"].values[:, None] * n * diameter + table["axial_induced_velocity"].values
    around = 2.0 * np.pi * n * r - table["tangential_induced_velocity"].values
    phi = np.arctan2(axial, around)
    np.testing.assert_allclose(table["inflow_angle"].values, np.degrees(phi), atol=1e-7)
    blade_angle = table["inflow_angle"].values + table["angle_of_attack"].values
    np.testing.assert_allclose(blade_angle, np.broadcast_to(blade_angle[0, 0], blade_angle.shape), atol=1e-7)
    stations = case.propeller.stations
    inside = (table["r_over_R"].values > stations.r_over_R[0]) & (table["r_over_R"].values < stations.r_over_R[-1])
    measured = np.degrees(np.interp(table["r_over_R"].values, stations.r_over_R, stations.twist))
    # Both cases give chord-line angles; a straight line between stations comes within some tenths of a degree.
    assert np.abs(blade_angle[0, 0] - measured)[inside].max() < 0.6
    chord = np.interp(0.6, stations.r_over_R, stations.c_over_R) * diameter / 2.0
    middle = int(np.argmin(np.abs(table["r_over_R"].values - 0.6)))
    here = table.isel(r_over_R=middle)
    normal = here["section_lift_coefficient"].values * np.cos(phi[..., middle]) - here[
        "section_drag_coefficient"
    ].values * np.sin(phi[..., middle])
    pressure = 0.5 * rho * (axial**2 + around**2)[..., middle]
    np.testing.assert_allclose(
        here["thrust_loading"].values, pressure * case.propeller.blades * chord * normal, rtol=0.03, atol=0.02
    )


def test_no_propeller_beats_the_actuator_disk(table: xr.Dataset) -> None:
    # W.J.M. Rankine 1865, R.E. Froude 1889: efficiency of the ideal disk at the same thrust; standing still FM = 1.
    ct, ratio = table["thrust_coefficient"].values, table["advance_ratio"].values
    pulls = (ct > 1e-3) & (ratio > 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        ideal = 2.0 / (1.0 + np.sqrt(1.0 + 8.0 * ct / (np.pi * ratio**2)))
    assert pulls.sum() > 60
    assert (table["efficiency"].values[pulls] < ideal[pulls]).all()
    assert ((table["static_figure_of_merit"].values > 0.3) & (table["static_figure_of_merit"].values < 1.0)).all()


def test_figure_of_merit_is_the_one_of_helicopters(table: xr.Dataset, case: Case) -> None:
    # With T/(rho A (Omega R)^2) and P/(rho A (Omega R)^3), FM = ct^1.5/(sqrt(2) cp); W. Johnson, Helicopter Theory.
    diameter, rho = case.propeller.diameter, case.air.density
    n = table["rpm"].values / 60.0
    thrust = table["thrust_coefficient"].values[:, 0] * rho * n**2 * diameter**4
    power = table["power_coefficient"].values[:, 0] * rho * n**3 * diameter**5
    area, tip_speed = np.pi * diameter**2 / 4.0, np.pi * n * diameter
    ct, cp = thrust / (rho * area * tip_speed**2), power / (rho * area * tip_speed**3)
    np.testing.assert_allclose(table["static_figure_of_merit"], ct**1.5 / (np.sqrt(2.0) * cp), rtol=1e-8)


def test_similar_flow_gives_the_same_coefficients(case: Case) -> None:
    # Dimensional analysis: equal J, Reynolds and Mach number at another size, rpm, density, viscosity and sound.
    size, turns = 2.5, 0.7
    grid = Grid(np.linspace(0.0, 0.8, 9), np.array([3000.0, 6000.0]))
    air = Air(0.6, 0.6 * case.air.kinematic_viscosity * size**2 * turns, case.air.speed_of_sound * size * turns)
    one = build_table(case.propeller, case.air, case.model, grid)
    other = build_table(
        replace(
            case.propeller, diameter=size * case.propeller.diameter, hub_diameter=size * case.propeller.hub_diameter
        ),
        air,
        case.model,
        Grid(grid.advance_ratio, turns * grid.rpm),
    )
    for key in ("thrust_coefficient", "power_coefficient", "reference_reynolds", "helical_tip_mach", "peak_efficiency"):
        np.testing.assert_allclose(other.values[key], one.values[key], rtol=1e-9, atol=1e-9)
    np.testing.assert_array_equal(other.values["status"], one.values["status"])


def test_reynolds_and_mach_number_of_a_point(table: xr.Dataset, case: Case) -> None:
    diameter, air, stations = case.propeller.diameter, case.air, case.propeller.stations
    at = table.sel(rpm=5000).isel(advance_ratio=10)
    v = float(at["advance_ratio"]) * 5000 / 60 * diameter
    chord = np.interp(0.75, stations.r_over_R, stations.c_over_R) * diameter / 2.0
    reynolds = air.density * np.hypot(v, 0.75 * np.pi * 5000 / 60 * diameter) * chord / air.viscosity
    assert float(at["reference_reynolds"]) == pytest.approx(reynolds, rel=0.01)  # chord by a straight line here
    mach = np.hypot(v, np.pi * 5000 / 60 * diameter) / air.speed_of_sound
    assert float(at["helical_tip_mach"]) == pytest.approx(mach, rel=1e-12)


def test_landmarks_are_refined_by_solving(table: xr.Dataset, case: Case) -> None:
    # scipy's root finder and optimiser on the solver itself, one rpm at a time.
    def at(ratio: float, rpm: float) -> tuple[float, float]:
        ct, cp = shipped.coefficients(case.propeller, case.model, case.air, np.array([rpm]), np.array([ratio]))
        return float(ct[0]), float(cp[0])

    for index in (0, -1):
        row = table.isel(rpm=index)
        rpm = float(row["rpm"])
        zero = brentq(lambda ratio, rpm=rpm: at(ratio, rpm)[0], 0.3, 0.9, xtol=1e-10)
        assert float(row["zero_thrust_advance_ratio"]) == pytest.approx(zero, abs=1e-6)

        def loss(ratio: float, rpm: float = rpm) -> float:
            ct, cp = at(ratio, rpm)
            return -ratio * ct / cp

        best = minimize_scalar(loss, bounds=(0.3, zero), method="bounded", options={"xatol": 1e-5})
        assert float(row["peak_efficiency"]) == pytest.approx(-best.fun, abs=2e-5)
        assert float(row["peak_efficiency_advance_ratio"]) == pytest.approx(best.x, abs=4e-3)
        assert float(row["peak_efficiency"]) >= np.nanmax(row["efficiency"]) - 1e-6


def test_landmarks_need_no_help_from_the_printed_grid(case: Case, table: xr.Dataset) -> None:
    narrow = build_table(case.propeller, case.air, case.model, Grid(np.array([0.2, 0.25]), table["rpm"].values)).values
    for key in (
        "static_figure_of_merit",
        "zero_thrust_advance_ratio",
        "peak_efficiency",
        "peak_efficiency_advance_ratio",
    ):
        np.testing.assert_allclose(narrow[key], table[key], rtol=1e-12)


def test_printed_points_do_not_depend_on_their_neighbours(case: Case, table: xr.Dataset) -> None:
    one = build_table(
        case.propeller, case.air, case.model, Grid(table["advance_ratio"].values[7:8], np.array([5000.0]))
    )
    at = table.sel(rpm=5000).isel(advance_ratio=7)
    for key in ("thrust_coefficient", "power_coefficient"):
        assert one.values[key].item() == pytest.approx(float(at[key]), rel=1e-8)


@pytest.mark.parametrize("elements", [80])
def test_forty_elements_are_enough(name: str, case: Case, table: xr.Dataset, elements: int) -> None:
    worst = {}
    rpm, ratio = (a.ravel() for a in np.broadcast_arrays(table["rpm"].values[:, None], table["advance_ratio"].values))
    finer = shipped.coefficients(case.propeller, replace(case.model, elements=elements), case.air, rpm, ratio)
    for key, fine in zip(("thrust_coefficient", "power_coefficient"), finer, strict=True):
        change = fine.reshape(table[key].shape) - table[key].values
        worst[key] = float(np.abs(change / table[key].values[:, :1]).max())
    print(
        f"{name}: {case.model.elements} to {elements} elements changes CT by {worst['thrust_coefficient']:.3%} and CP "
        f"by {worst['power_coefficient']:.3%} of the static value at most"
    )
    assert max(worst.values()) < 0.003


def test_efficiency_and_figure_of_merit_only_where_they_mean_something() -> None:
    assert efficiency(0.0, 0.1, 0.05) == 0.0
    assert efficiency(0.5, 0.04, 0.03) == pytest.approx(2.0 / 3.0)
    assert efficiency(0.5, 0.0, 0.03) == 0.0
    for ct, cp in ((-0.01, 0.03), (0.04, 0.0), (0.04, -0.01), (-0.01, -0.02), (np.nan, np.nan)):
        assert np.isnan(efficiency(0.5, ct, cp))
    assert figure_of_merit(0.1, 0.05) == pytest.approx(np.sqrt(2.0 / np.pi) * 0.1**1.5 / 0.05)
    for ct, cp in ((0.0, 0.03), (-0.1, 0.03), (0.1, 0.0), (np.nan, 0.1)):
        assert np.isnan(figure_of_merit(ct, cp))


def test_efficiency_in_a_table(table: xr.Dataset) -> None:
    assert (table["efficiency"].values[:, 0] == 0.0).all()
    missing = (table["thrust_coefficient"] < 0.0) | (table["power_coefficient"] <= 0.0)
    assert missing.any()
    np.testing.assert_array_equal(np.isnan(table["efficiency"]), missing)


def test_every_variable_is_labelled_from_the_registry(table: xr.Dataset, case: Case) -> None:
    for quantity in TABLE + RADIAL:
        variable = table[quantity.name]
        assert variable.dims == quantity.dimensions
        assert variable.attrs["units"] == quantity.units
        assert variable.attrs["long_name"] == quantity.long_name
        assert np.isfinite(variable.values).any()
    assert table.attrs["title"] == case.title
    assert table.attrs["case"] == case.text
    assert "Glauert" in table.attrs["references"]
    assert table.attrs["diameter"] == case.propeller.diameter
    assert all(isinstance(value, (str, int, float)) for value in table.attrs.values())


def test_a_blade_beyond_its_section_data_is_told() -> None:
    # The inner stations of this research propeller are 36 % thick, more than any section of the family.
    assert "thickness or camber leaves its section data" in shipped.table("nr640_9in").attrs["notes"]


def named(reasons: Any) -> set[str]:
    return {word for bit, word in TRUST_REASONS.items() if int(reasons) & bit}


@pytest.mark.parametrize(
    ("status", "shares", "guessed", "expected", "reasons"),
    [
        (STATUS_CONVERGED, (0.0, 0.0, 0.0, 0.0, -0.2), False, TRUST_GOOD, set()),
        (STATUS_CONVERGED, (0.04, 0.04, 0.09, 0.0, 0.0), False, TRUST_GOOD, set()),
        (STATUS_CONVERGED, (0.2, 0.0, 0.0, 0.0, -0.2), False, TRUST_FAIR, {"stalled"}),
        (STATUS_CONVERGED, (0.5, 0.0, 0.0, 0.0, -0.2), False, TRUST_POOR, {"stalled"}),
        (STATUS_CONVERGED, (0.0, 0.2, 0.0, 0.0, -0.2), False, TRUST_FAIR, {"outside_polars"}),
        (STATUS_CONVERGED, (0.0, 0.5, 0.2, 0.0, -0.2), False, TRUST_POOR, {"outside_polars", "low_reynolds"}),
        (STATUS_CONVERGED, (0.0, 0.0, 1.0, 0.0, -0.2), False, TRUST_FAIR, {"low_reynolds"}),
        (STATUS_CONVERGED, (0.0, 0.0, 0.0, 0.0, 0.04), False, TRUST_FAIR, {"high_mach"}),
        (STATUS_CONVERGED, (0.0, 0.0, 0.0, 0.0, 0.06), False, TRUST_POOR, {"high_mach"}),
        (STATUS_CONVERGED, (0.0, 0.0, 0.0, 0.1, -0.1), False, TRUST_FAIR, {"high_mach"}),
        (STATUS_CONVERGED, (0.0, 0.0, 0.0, 0.3, -0.1), False, TRUST_POOR, {"high_mach"}),
        (STATUS_SEVERAL_ROOTS, (0.01, 0.0, 0.0, 0.0, -0.2), False, TRUST_GOOD, set()),
        (STATUS_SEVERAL_ROOTS, (0.1, 0.0, 0.0, 0.0, -0.2), False, TRUST_FAIR, {"stalled", "several_roots"}),
        (STATUS_REVERSED_FLOW, (0.0, 0.0, 0.0, 0.0, -0.2), False, TRUST_POOR, {"flow_reversed"}),
        (STATUS_NOT_CONVERGED, (0.0, 0.0, 0.0, 0.0, -0.2), False, TRUST_POOR, {"not_converged"}),
        (STATUS_CONVERGED, (0.0, 0.0, 0.0, 0.0, -0.2), True, TRUST_FAIR, {"section_guessed"}),
        (STATUS_NOT_RUN, (np.nan, np.nan, np.nan, 0.0, np.nan), True, TRUST_NOT_RUN, set()),
    ],
)
def test_grades(status: int, shares: tuple[float, ...], guessed: bool, expected: int, reasons: set[str]) -> None:
    trust, why = grade(status, dict(zip(SHARES, shares[:4], strict=True)), shares[4], section_guessed=guessed)
    assert trust == expected
    assert named(why) == reasons


def test_grades_broadcast_and_worst_counts() -> None:
    shares = dict.fromkeys(SHARES, 0.0) | {"stalled_share": np.array([0.0, 0.1, 0.6])}
    trust, why = grade(np.array([[1], [3]]), shares, -0.1)
    np.testing.assert_array_equal(trust, [[TRUST_GOOD, TRUST_FAIR, TRUST_POOR], [TRUST_POOR] * 3])
    assert named(why[1, 2]) == {"stalled", "flow_reversed"}


def test_a_guessed_section_is_never_good() -> None:
    case = shipped.case("sandpiper")
    grid = Grid(np.array([0.3]), np.array([7000.0]))
    known = build_table(case.propeller, case.air, case.model, grid).values
    guessed = build_table(replace(case.propeller, section_guessed=True), case.air, case.model, grid).values
    assert known["trust"].item() == TRUST_GOOD
    assert guessed["trust"].item() == TRUST_FAIR
    assert named(guessed["trust_reasons"].item()) == {"section_guessed"}


def test_envelope_takes_a_table_or_solves_its_own(case: Case, table: xr.Dataset) -> None:
    own, given = bemt.envelope(case), bemt.envelope(case, table=table)
    xr.testing.assert_allclose(own, given, rtol=1e-8, atol=1e-8)
    assert own.attrs == given.attrs
    assert own.attrs["title"] == case.title
    full = {"throttle": -1} if case.motor is not None else {"rpm": -1}
    # Standing still at full throttle: the table's own coefficients at the rpm of the drive.
    rpm = float(own["point_rpm"].sel(point="static")) if case.motor is not None else float(own["rpm"][-1])
    ct, _ = shipped.coefficients(case.propeller, case.model, case.air, np.array([rpm]), np.zeros(1))
    thrust = ct[0] * case.air.density * (rpm / 60.0) ** 2 * case.propeller.diameter**4
    assert float(own["thrust"].isel(airspeed=0, **full)) == pytest.approx(thrust, rel=3e-3)


def test_envelope_refuses_the_table_of_another_propeller() -> None:
    with pytest.raises(InputError, match="diameter"):
        bemt.envelope(shipped.case("sandpiper"), table=shipped.table("nr640_9in"))
