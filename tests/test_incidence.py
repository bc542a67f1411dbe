"""The disk at incidence against the axial solution, closed forms, momentum, symmetry and scipy's root finder."""

from __future__ import annotations

import csv
import math
from dataclasses import replace
from functools import lru_cache
from pathlib import Path

import numpy as np
import pytest
import shipped
from scipy.optimize import fsolve

from bemt.errors import InputError
from bemt.files import read, write
from bemt.files.text import coefficient_text
from bemt.quantities.registry import (
    INCIDENCE,
    STATUS_CONVERGED,
    STATUS_NOT_CONVERGED,
    TABLE,
    TABLE_AT_INCIDENCE,
    TRUST_GOOD,
    TRUST_REASONS,
)
from bemt.rotor import kernels as k
from bemt.rotor.elements import BladeElements, blade_elements, cosine_spaced, element_bounds
from bemt.rotor.incidence import IncidenceSolution, drees, pitt_peters, solve_incidence
from bemt.rotor.solution import solve
from bemt.section.full_circle import ANGLES
from bemt.table.build import TableResult, build_table
from bemt.table.grid import Grid

NO_LOSS = 1e6
SLOPE, DRAG = 5.7, 0.02


def plain_blade(
    lift: np.ndarray, drag: float, *, root: float = 0.15, blades: int = 2, count: int = 24
) -> BladeElements:
    """Constant chord, twist of a 0.8 pitch over diameter, one section at every Reynolds number, no end loss."""
    radius, blades, count = 0.2, 2, 24
    x, width = cosine_spaced(root, count)
    columns = np.zeros((count, k.E_COLUMNS))
    columns[:, k.E_RADIUS], columns[:, k.E_WIDTH] = x * radius, width * radius
    columns[:, k.E_CHORD], columns[:, k.E_TWIST] = 0.02, np.arctan(0.8 / (math.pi * x))
    columns[:, k.E_SOLIDITY] = blades * 0.02 / (2.0 * math.pi * x * radius)
    columns[:, k.E_TIP] = columns[:, k.E_LOSS_SCALE] = columns[:, k.E_ROOT] = NO_LOSS
    columns[:, k.E_DIVERGENCE], columns[:, k.E_TABLE_BETA] = 0.75, 1.0
    columns[:, k.E_LN_RE_LOW], columns[:, k.E_LN_RE_HIGH] = np.log([1e3, 1e8])
    columns[:, k.E_MACH_HIGH] = np.inf
    columns[:, k.E_POLAR] = np.arange(count)
    rows = np.stack([lift, np.full(ANGLES.size, math.log(drag))], axis=-1)
    polars = np.ascontiguousarray(np.broadcast_to(rows, (count, 2, ANGLES.size, 2)))
    stall = np.empty((4, count, 2))
    stall[[0, 2]], stall[[1, 3]] = -0.4, 0.4
    return BladeElements(
        blades=blades,
        tip_radius=radius,
        chord_75=0.02,
        r_over_R=x,
        columns=columns,
        polars=polars,
        bounds=element_bounds(polars, stall),
        ln_reynolds=np.log([1e4, 1e6]),
    )


@lru_cache
def shipped_blade(name: str = "sandpiper") -> BladeElements:
    case = shipped.case(name)
    return blade_elements(case.propeller, case.model)


def at(name: str, rpm: float, advance_ratio: np.ndarray, degrees: float, **options: object) -> IncidenceSolution:
    case = shipped.case(name)
    turns = np.full(np.shape(advance_ratio), rpm / 60.0)
    return solve_incidence(
        shipped_blade(name),
        advance_ratio * turns * case.propeller.diameter,
        2.0 * math.pi * turns,
        math.radians(degrees),
        case.air.kinematic_viscosity,
        case.air.speed_of_sound,
        **options,  # type: ignore[arg-type]
    )


@pytest.mark.parametrize("name", shipped.CASES)
@pytest.mark.parametrize("rpm", [3000.0, 9000.0])
def test_without_incidence_it_is_the_axial_solution(name: str, rpm: float) -> None:
    # From standing still to windmilling, where Buhl's relation serves at the root; another solver, other unknowns.
    ratio = np.linspace(0.0, 1.3, 27)
    case = shipped.case(name)
    diameter, n = case.propeller.diameter, rpm / 60.0
    axial = solve(
        shipped_blade(name),
        ratio * n * diameter,
        np.full(ratio.size, 2.0 * math.pi * n),
        case.air.kinematic_viscosity,
        case.air.speed_of_sound,
    )
    found = at(name, rpm, ratio, 0.0)
    for key in ("thrust_per_density", "torque_per_density"):
        wanted = getattr(axial, key)
        missed = np.abs(getattr(found, key) - wanted) / abs(wanted[0])
        assert missed[axial.status == STATUS_CONVERGED].max() < 1e-6, key
        # Where several roots make the axial solver search, its Reynolds number settles to 0.1 % of the speed.
        assert missed.max() < 5e-5, key
    for key in ("normal_force_per_density", "side_force_per_density"):
        assert np.abs(getattr(found, key)).max() < 1e-9 * axial.thrust_per_density[0]
    for key in ("pitching_moment_per_density", "yaw_moment_per_density"):
        assert np.abs(getattr(found, key)).max() < 1e-9 * axial.torque_per_density[0]
    np.testing.assert_allclose(found.stalled_share, axial.stalled_share, atol=1e-3)  # an element at the root
    np.testing.assert_allclose(found.above_divergence_share, axial.above_divergence_share, atol=1e-12)
    np.testing.assert_array_equal(found.status, axial.status)


def test_drag_alone_makes_the_closed_form_of_the_normal_force() -> None:
    # Edgewise, no lift, constant drag: H/(rho A (Omega R)^2) = sigma cd mu/4 and torque sigma cd (1 + mu^2)/8, with
    # sigma = Bc/(pi R); W. Johnson, Helicopter Theory (from memory). Blade from 0.15 R: the shares of r and r^3 inside
    # are left out. What little swirl and flow turning there is counts with the drag, squared.
    blade = plain_blade(np.zeros(ANGLES.size), DRAG)
    omega, mu = 500.0, 0.1
    tip_speed = omega * blade.tip_radius
    found = solve_incidence(blade, mu * tip_speed, omega, 0.5 * math.pi, 1.5e-5, 1e6)
    sigma = 2 * 0.02 / (math.pi * blade.tip_radius)
    disk = math.pi * blade.tip_radius**2 * tip_speed**2
    outer = 1.0 - 0.15**2
    force = found.normal_force_per_density.item()
    assert force == pytest.approx(sigma * DRAG * mu / 4.0 * outer * disk, rel=0.02)
    torque = sigma * DRAG * ((1.0 - 0.15**4) + mu**2 * outer) / 8.0 * disk * blade.tip_radius
    assert found.torque_per_density.item() == pytest.approx(torque, rel=0.02)
    assert abs(found.side_force_per_density.item()) < 0.02 * force


@pytest.mark.parametrize(("degrees", "ratio"), [(5.0, 0.4), (40.0, 0.5), (75.0, 0.2), (90.0, 0.3)])
def test_each_annulus_closes_its_two_equations(degrees: float, ratio: float) -> None:
    # The equations of the module written apart with a straight lift line, solved by scipy from another start.
    lift = SLOPE * np.sin(ANGLES)
    blade = plain_blade(lift, DRAG)
    omega, nu = 600.0, 1.5e-5
    airspeed = ratio * omega / (2.0 * math.pi) * 2.0 * blade.tip_radius
    found = solve_incidence(blade, airspeed, omega, math.radians(degrees), nu, 1e6, skew="none", radial=True)
    assert found.radial is not None
    through, across = airspeed * math.cos(math.radians(degrees)), airspeed * math.sin(math.radians(degrees))
    psi = np.linspace(0.0, 2.0 * math.pi, 72, endpoint=False)
    thrust = 0.0
    for index, radius in enumerate(blade.columns[:, k.E_RADIUS]):
        twist = blade.columns[index, k.E_TWIST]

        def forces(w: float, v: float, radius: float = radius, twist: float = twist) -> tuple[float, float]:
            axial, around = through + w, omega * radius - v + across * np.sin(psi)
            inflow = np.arctan2(axial, around)
            cl = np.interp(np.remainder(twist - inflow + np.pi, 2.0 * np.pi) - np.pi, ANGLES, lift)
            square = axial**2 + around**2
            normal = 0.02 * square * (cl * np.cos(inflow) - DRAG * np.sin(inflow))
            tangential = 0.02 * square * (cl * np.sin(inflow) + DRAG * np.cos(inflow))
            return float(normal.mean()), float(tangential.mean())

        def missed(unknown: np.ndarray, radius: float = radius) -> list[float]:
            normal, tangential = forces(*unknown)
            flux = 4.0 * math.pi * radius * math.hypot(across, through + unknown[0])
            return [normal - flux * unknown[0], tangential - flux * unknown[1]]

        w, v = fsolve(missed, [0.05 * omega * blade.tip_radius, 1.0], xtol=1e-12)
        assert found.radial["axial_induced_velocity"][0, index] == pytest.approx(w, rel=1e-4, abs=1e-4)
        assert found.radial["tangential_induced_velocity"][0, index] == pytest.approx(v, rel=1e-4, abs=1e-4)
        thrust += forces(w, v)[0] * blade.columns[index, k.E_WIDTH]
    assert found.thrust_per_density.item() == pytest.approx(thrust, rel=1e-4)


@pytest.mark.parametrize("degrees", [60.0, 90.0])
def test_the_whole_disk_obeys_glauert(degrees: float) -> None:
    # T = 2 rho A w sqrt((V sin i)^2 + (V cos i + w)^2) for a uniform w (H. Glauert, ARC R&M 1111, 1926). Loading is far
    # from uniform, which costs some per cent, and more of it near standing still, where it counts squared.
    blade = plain_blade(SLOPE * np.sin(ANGLES), DRAG, root=0.05)
    omega = 600.0
    ratio = np.array([0.2, 0.4, 0.6])
    airspeed = ratio * omega / (2.0 * math.pi) * 2.0 * blade.tip_radius
    found = solve_incidence(blade, airspeed, omega, math.radians(degrees), 1.5e-5, 1e6, radial=True)
    assert found.radial is not None
    area = 2.0 * math.pi * blade.columns[:, k.E_RADIUS] * blade.columns[:, k.E_WIDTH]
    mean = found.radial["axial_induced_velocity"] @ area / area.sum()
    through, across = airspeed * math.cos(math.radians(degrees)), airspeed * math.sin(math.radians(degrees))
    momentum = 2.0 * area.sum() * mean * np.hypot(across, through + mean)
    np.testing.assert_allclose(momentum, found.thrust_per_density, rtol=0.06)


def test_more_azimuths_change_nothing() -> None:
    coarse = at("sandpiper", 7000.0, np.array([0.2, 0.5]), 50.0)
    fine = at("sandpiper", 7000.0, np.array([0.2, 0.5]), 50.0, azimuths=72)
    for key in ("thrust_per_density", "torque_per_density", "normal_force_per_density", "yaw_moment_per_density"):
        np.testing.assert_allclose(getattr(coarse, key), getattr(fine, key), rtol=2e-3, err_msg=key)


def test_small_angles_make_proportional_forces() -> None:
    # By symmetry thrust and torque are even in the angle, forces in the plane and moments odd (H.S. Ribner, NACA
    # Report 820, 1945, makes the normal force of small angles proportional to them).
    blade = plain_blade(SLOPE * np.sin(ANGLES), DRAG)
    omega = 600.0
    airspeed = np.array([0.3, 0.5]) * omega / (2.0 * math.pi) * 2.0 * blade.tip_radius
    axial, one, two = (
        solve_incidence(blade, airspeed, omega, math.radians(degrees), 1.5e-5, 1e6) for degrees in (0.0, 1.0, 2.0)
    )
    for key in ("normal_force_per_density", "yaw_moment_per_density"):
        np.testing.assert_allclose(getattr(two, key) / getattr(one, key), 2.0, rtol=0.01, err_msg=key)
    for key in ("thrust_per_density", "torque_per_density"):
        change = [getattr(solution, key) - getattr(axial, key) for solution in (one, two)]
        np.testing.assert_allclose(change[1] / change[0], 4.0, rtol=0.05, err_msg=key)
    assert (one.normal_force_per_density > 0.0).all()  # along the crossflow
    assert (one.yaw_moment_per_density < 0.0).all()  # the down-going blade, at the right, pulls more


def test_near_edgewise_thrust_holds_and_power_is_flat() -> None:
    # A. Kolaei, D. Barcelos, G. Bramesfeld, Int. J. Aerospace Engineering 2018, 2560370: a rotor 18 x 6.1 with its disk
    # 0 to 15 deg from edgewise has a CT flat or rising with advance and a nearly flat CP. A blade of that pitch here.
    x = np.linspace(0.15, 1.0, 12)
    case = shipped.case("sandpiper")
    propeller = replace(
        case.propeller,
        diameter=0.4572,
        hub_diameter=0.03,
        stations=replace(
            case.propeller.stations,
            r_over_R=x,
            c_over_R=np.interp(x, [0.15, 0.4, 1.0], [0.13, 0.17, 0.06]),
            twist=np.arctan(6.1 / 18.0 / (math.pi * x)) + math.radians(3.0),
            t_over_c=np.full(12, 0.1),
        ),
    )
    blade = blade_elements(propeller, case.model)
    n = 3500.0 / 60.0
    ratio = np.array([0.05, 0.1, 0.15, 0.2, 0.25])
    for degrees in (75.0, 82.5, 90.0):
        found = solve_incidence(
            blade,
            ratio * n * propeller.diameter,
            2.0 * math.pi * n,
            math.radians(degrees),
            case.air.kinematic_viscosity,
            case.air.speed_of_sound,
        )
        assert (np.diff(found.thrust_per_density) > -0.003 * found.thrust_per_density[0]).all()
        spread = np.ptp(found.torque_per_density) / found.torque_per_density[0]
        gain = found.thrust_per_density[-1] / found.thrust_per_density[0]
        print(f"{degrees:g} deg: CT x {gain:.3f}, CP within {spread:.1%}")
        assert spread < 0.12


def test_skew_laws_at_their_ends() -> None:
    flow = np.zeros(3)
    angle = np.array([0.0, 0.25, 0.5]) * math.pi
    along, across = pitt_peters(angle, flow)
    # Edgewise 15 pi/32 (Pitt and Peters 1981); without crossflow nothing leans.
    np.testing.assert_allclose(along, [0.0, 15.0 * math.pi / 32.0 * math.tan(math.pi / 8.0), 15.0 * math.pi / 32.0])
    assert (across == 0.0).all()
    along, across = drees(angle, np.array([0.0, 0.1, 0.1]))
    assert along[0] == across[0] == 0.0
    assert along[2] == pytest.approx(4.0 / 3.0 * (1.0 - 1.8 * 0.01))
    assert across[2] == pytest.approx(-0.2)
    # The laws lean the flow the same way, and thrust hardly knows which of them serves.
    found = [at("sandpiper", 7000.0, np.array([0.3]), 60.0, skew=law) for law in ("pitt-peters", "drees", "none")]
    thrust = [solution.thrust_per_density.item() for solution in found]
    assert max(thrust) - min(thrust) < 0.03 * thrust[0]
    with pytest.raises(InputError, match="one of pitt-peters"):
        at("sandpiper", 7000.0, np.array([0.3]), 60.0, skew="linear")


def test_standing_still_has_no_incidence() -> None:
    edgewise, axial = at("sandpiper", 5000.0, np.zeros(1), 90.0), at("sandpiper", 5000.0, np.zeros(1), 0.0)
    assert edgewise.thrust_per_density.item() == pytest.approx(axial.thrust_per_density.item(), rel=1e-6)
    assert abs(edgewise.normal_force_per_density.item()) < 1e-9 * edgewise.thrust_per_density.item()


def test_it_converges_everywhere() -> None:
    rng = np.random.default_rng(11)
    ratio, degrees = rng.uniform(0.0, 3.0, 60), rng.uniform(0.0, 90.0, 60)
    case = shipped.case("sandpiper")
    omega = rng.uniform(100.0, 1000.0, 60)
    found = solve_incidence(
        shipped_blade(),
        ratio * omega / (2.0 * math.pi) * case.propeller.diameter,
        omega,
        np.radians(degrees),
        case.air.kinematic_viscosity,
        case.air.speed_of_sound,
    )
    assert (found.status != STATUS_NOT_CONVERGED).all()
    assert np.isfinite(found.thrust_per_density).all()


@pytest.mark.parametrize(
    ("changed", "field"),
    [({"airspeed": -1.0}, "operating point"), ({"omega": 0.0}, "operating point"), ({"angle": 1.7}, "incidence")],
)
def test_what_it_refuses(changed: dict[str, float], field: str) -> None:
    given = {"airspeed": 10.0, "omega": 500.0, "angle": 0.5} | changed
    with pytest.raises(InputError) as caught:
        solve_incidence(shipped_blade(), given["airspeed"], given["omega"], given["angle"], 1.5e-5, 340.0)
    assert caught.value.field == field


# --- the table -------------------------------------------------------------------------------------------------------

RATIOS, RPM, ANGLES_ASKED = np.array([0.0, 0.25, 0.5]), np.array([5000.0, 9000.0]), np.radians([0.0, 10.0, 60.0])


@lru_cache
def inclined(rotation: str = "right") -> TableResult:
    case = shipped.case("sandpiper")
    return build_table(
        replace(case.propeller, rotation=rotation),
        case.air,
        case.model,
        Grid(RATIOS, RPM, ANGLES_ASKED),
        radial=True,
        lookup=False,
    )


def test_a_table_at_incidence_gains_the_axis() -> None:
    case = shipped.case("sandpiper")
    table = inclined().to_dataset({"title": "t"})
    axial = build_table(case.propeller, case.air, case.model, Grid(RATIOS, RPM), radial=True, lookup=False)
    plain = axial.to_dataset({})
    assert "incidence" not in plain.dims
    assert not any(quantity.name in plain for quantity in INCIDENCE)
    np.testing.assert_allclose(table["incidence"], [0.0, 10.0, 60.0])
    for quantity in TABLE_AT_INCIDENCE:
        assert table[quantity.name].dims == quantity.dimensions
    for quantity in TABLE:
        here = table[quantity.name]
        at_zero = here.sel(incidence=0.0) if "incidence" in here.dims else here
        np.testing.assert_array_equal(at_zero.values, plain[quantity.name].values, err_msg=quantity.name)
    assert table["thrust_loading"].dims == ("rpm", "advance_ratio", "incidence", "r_over_R")
    # Thrust is the sum of the loadings, at incidence too.
    _, width = cosine_spaced(case.propeller.root, case.model.elements)
    thrust = table["thrust_loading"].values @ (width * case.propeller.diameter / 2.0)
    n = RPM[:, None, None] / 60.0
    np.testing.assert_allclose(
        table["thrust_coefficient"].values, thrust / (case.air.density * n**2 * case.propeller.diameter**4), rtol=1e-9
    )
    ratio = RATIOS[:, None] * np.cos(ANGLES_ASKED)
    ct, cp = table["thrust_coefficient"].values, table["power_coefficient"].values
    # What propels is the force along the flight path; where that is a drag there is no efficiency.
    along = ct * np.cos(ANGLES_ASKED) - table["normal_force_coefficient"].values * np.sin(ANGLES_ASKED)
    expected = np.where(along >= 0.0, RATIOS[:, None] * along / cp, np.nan)
    np.testing.assert_allclose(table["efficiency"].values, expected, rtol=1e-9, atol=1e-15)
    advancing = math.pi * case.propeller.diameter * n * (1.0 + RATIOS[:, None] / math.pi * np.sin(ANGLES_ASKED))
    through = ratio * n * case.propeller.diameter
    mach = np.hypot(advancing, through) / case.air.speed_of_sound
    np.testing.assert_allclose(table["helical_tip_mach"].values, mach, rtol=1e-12)


def test_large_incidence_is_never_good_and_says_so() -> None:
    table = inclined()
    bit = next(bit for bit, word in TRUST_REASONS.items() if word == "large_incidence")
    moving = table.values["trust"][:, 1:]
    assert (moving[..., 2] < TRUST_GOOD).all()
    assert (moving[..., 1] == TRUST_GOOD).any()
    np.testing.assert_array_equal(
        (table.values["trust_reasons"] & bit) != 0,
        np.broadcast_to((RATIOS[:, None] > 0.0) & (ANGLES_ASKED > math.radians(15.0)), table.values["trust"].shape),
    )
    said = coefficient_text(table.to_dataset({}))
    assert "large incidence at 4 (J 0.25 to 0.5, incidence 60)" in " ".join(said.split())
    assert "9000 rpm, incidence 60 deg:" in said
    assert any("look-ups" in note and "axial flow" in note for note in table.notes)


def test_left_hand_propellers_are_the_mirror_image() -> None:
    right, left = inclined().values, inclined("left").values
    for quantity in TABLE_AT_INCIDENCE:
        mirrored = quantity.name in ("side_force_coefficient", "yaw_moment_coefficient")
        np.testing.assert_array_equal(
            left[quantity.name], -right[quantity.name] if mirrored else right[quantity.name], err_msg=quantity.name
        )
    assert np.abs(right["yaw_moment_coefficient"][:, 1:, 1:]).min() > 0.0


def test_files_carry_the_incidence(tmp_path: Path) -> None:
    table = inclined().to_dataset({"references": "none"})
    points, of_rpm, radial = write(table, tmp_path / "t.csv")
    assert (of_rpm.name, radial.name) == ("t_rpm.csv", "t_radial.csv")
    with points.open(newline="", encoding="utf-8") as stream:
        rows = list(csv.DictReader(stream))
    assert len(rows) == RPM.size * RATIOS.size * ANGLES_ASKED.size
    last = rows[-1]
    assert (last["rpm"], last["advance_ratio"]) == ("9000.0", "0.5")
    assert float(last["incidence"]) == pytest.approx(60.0)
    for quantity in INCIDENCE:
        assert float(last[quantity.name]) == table[quantity.name].values[-1, -1, -1]
    assert "large_incidence" in last["trust_reasons"].split()
    write(table, tmp_path / "t.nc")
    again = read(tmp_path / "t.nc")
    np.testing.assert_array_equal(again["yaw_moment_coefficient"], table["yaw_moment_coefficient"])
    assert again["incidence"].attrs["units"] == "degree"
    assert "fair at " in again.attrs["trust"]
    assert "Pitt" in again.attrs["references"]
