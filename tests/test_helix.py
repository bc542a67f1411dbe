"""Helical vortices against the law of Biot and Savart, and the lifting line against momentum theory."""

from __future__ import annotations

import numpy as np
import pytest
import shipped
from scipy.integrate import quad_vec

from bemt.rotor import kernels as k
from bemt.rotor.elements import BladeElements, blade_elements, cosine_spaced, element_bounds
from bemt.rotor.end_loss import loss_tables
from bemt.rotor.helical_vortex import closed_form, refined
from bemt.rotor.lifting_line import LEAST_WAKE_RADIUS, outside_inflow_law, solve_helix, wake_radius
from bemt.rotor.solution import RotorSolution, solve
from bemt.section.full_circle import ANGLES
from bemt.section.post_stall import plate_law

OMEGA, TIP_RADIUS, ROOT = 200.0 * np.pi, 0.15, 0.15
VISCOSITY, SOUND = 1.5e-5, 1e4


def biot_savart(blades: int, radius: float, vortex: float, pitch: float) -> np.ndarray:
    """Axial and tangential velocity by unit vortices, integrated over 60 turns, with the mean of the rest."""
    phase = 2.0 * np.pi * np.arange(blades) / blades
    end = 2.0 * np.pi * 60 + 0.5 * np.pi

    def element(turn: float) -> np.ndarray:
        cosine, sine = np.cos(turn + phase), np.sin(turn + phase)
        tangent = np.array([-vortex * sine, vortex * cosine, np.full(blades, pitch)])
        to_point = np.array([radius - vortex * cosine, -vortex * sine, np.full(blades, -pitch * turn)])
        cross = np.cross(tangent, to_point, axis=0) / (4.0 * np.pi * (to_point**2).sum(axis=0) ** 1.5)
        return cross[[2, 1]].sum(axis=1)

    near = abs(radius - vortex) / np.hypot(vortex, pitch) * np.array([0.5, 1.0, 2.0, 4.0])
    breaks = np.unique(np.concatenate([near[near < 3.0], np.pi * np.arange(1, 121)]))
    total = quad_vec(element, 0.0, end, points=breaks, epsabs=1e-8, epsrel=1e-8, limit=4000)[0]
    return total + blades / (8.0 * np.pi * end**2) * np.array([vortex**2 / pitch**3, radius / pitch**2])


@pytest.mark.parametrize(("blades", "bound"), [(1, 1.3e-2), (2, 3e-3), (3, 1e-3), (6, 1e-4)])
def test_helices_induce_what_biot_and_savart_say(blades: int, bound: float) -> None:
    places = [
        (pitch, vortex, vortex * ratio)
        for pitch, vortex in ((0.1, 1.0), (0.3, 1.0), (0.8, 0.5), (2.0, 1.0))
        for ratio in (0.4, 0.95, 1.05, 1.8)
    ]
    errors = np.zeros(2)
    for pitch, vortex, radius in places:
        scale = 4.0 * np.pi / blades * np.array([pitch, radius])
        wanted = biot_savart(blades, radius, vortex, pitch) * scale
        for number, law in enumerate((closed_form, refined)):
            found = np.array(law(blades, radius, vortex, pitch)) * scale
            errors[number] = max(errors[number], (np.abs(found - wanted) / np.maximum(1.0, np.abs(wanted))).max())
    print(f"\n{blades} blades: closed form {errors[0]:.1e}, refined {errors[1]:.1e}")
    assert errors[0] < bound
    assert errors[1] < 1e-5


def test_many_helices_are_a_cylinder_and_one_on_the_axis_is_a_line() -> None:
    """Inside a cylinder of helices the flow is axial, B Gamma / (4 pi p) at its end; outside it goes around."""
    for law in (closed_form, refined):
        axial, around = law(500, np.array([0.5, 1.5]), 1.0, 0.2)
        assert axial * 4.0 * np.pi * 0.2 / 500 == pytest.approx([1.0, 0.0], abs=1e-9)
        assert around * 4.0 * np.pi * np.array([0.5, 1.5]) / 500 == pytest.approx([0.0, 1.0], abs=1e-9)
        axial, around = law(3, 0.7, 0.0, 0.2)
        assert axial == 0.0
        assert around * 4.0 * np.pi * 0.7 / 3 == pytest.approx(1.0, rel=1e-12)


def blade(
    blades: int, pitch_over_diameter: float, law: str = "prandtl", chord_share: float = 1.0, n: int = 40
) -> BladeElements:
    """A generic small blade of constant pitch with rounded tips.

    Section: zero lift at -4 deg, slope 5.7/rad, largest lift 1.1, drag 0.02, stalling softly; beyond 25 deg a plate.
    """
    x, width = cosine_spaced(ROOT, n)
    chord = (0.05 + 0.55 * x * (1.0 - x)) * chord_share
    from_zero = ANGLES + np.radians(4.0)
    attached = np.clip(5.7 * from_zero, -1.1, 1.1)
    separated = 1.0 / (1.0 + np.exp(-(np.abs(from_zero) - np.radians(25.0)) / np.radians(3.0)))
    plate_lift, plate_drag = plate_law(ANGLES, 1.8, 0.02)
    lift = (1.0 - separated) * attached + separated * plate_lift
    drag = 0.02 + 0.1 * np.maximum(np.abs(from_zero) - 1.1 / 5.7, 0.0)
    log_drag = (1.0 - separated) * np.log(drag) + separated * np.log(plate_drag)
    lift[0], log_drag[0] = lift[-1], log_drag[-1]
    polars = np.broadcast_to(np.stack([lift, log_drag], axis=-1), (1, 2, ANGLES.size, 2)).copy()
    stall = np.zeros((4, 1, 2))
    stall[[0, 2]], stall[[1, 3]] = -np.radians(4.0) - 1.1 / 5.7, -np.radians(4.0) + 1.1 / 5.7
    loss = loss_tables(law, ("tip", "root"), blades, x, ROOT)
    columns = np.zeros((n, k.E_COLUMNS))
    columns[:, k.E_RADIUS], columns[:, k.E_WIDTH] = x * TIP_RADIUS, width * TIP_RADIUS
    columns[:, k.E_CHORD], columns[:, k.E_TWIST] = chord * TIP_RADIUS, np.arctan(pitch_over_diameter / np.pi / x)
    columns[:, k.E_SOLIDITY] = blades * chord / (2.0 * np.pi * x)
    columns[:, k.E_TIP] = np.sqrt(0.5 * blades * (1.0 - x) / x)
    columns[:, k.E_ROOT], columns[:, k.E_LOSS_SCALE] = loss.root_scale, loss.tip_scale
    columns[:, k.E_LOSS] = loss.table_index
    columns[:, k.E_DIVERGENCE], columns[:, k.E_TABLE_BETA], columns[:, k.E_MACH_HIGH] = 10.0, 1.0, 10.0
    columns[:, k.E_LN_RE_HIGH] = 30.0
    columns[:, k.E_POLAR] = np.arange(n)
    return BladeElements(
        blades=blades,
        tip_radius=TIP_RADIUS,
        chord_75=0.153 * TIP_RADIUS * chord_share,
        r_over_R=x,
        columns=columns,
        polars=np.repeat(polars, n, axis=0),
        bounds=np.repeat(element_bounds(polars, stall), n, axis=0),
        ln_reynolds=np.log([1e4, 1e6]),
        loss=loss.tables,
    )


def at(advance_ratio: float | np.ndarray) -> tuple[np.ndarray, np.ndarray, float, float]:
    airspeed = np.atleast_1d(advance_ratio) * OMEGA / (2.0 * np.pi) * 2.0 * TIP_RADIUS
    return airspeed, np.full(airspeed.shape, OMEGA), VISCOSITY, SOUND


def change(of: RotorSolution, against: RotorSolution) -> np.ndarray:
    """Per cent of thrust and torque."""
    return 100.0 * np.array(
        [
            of.thrust_per_density / against.thrust_per_density - 1.0,
            of.torque_per_density / against.torque_per_density - 1.0,
        ]
    )


# Computed apart from this program with the same theories, 60 stations, for a blade of this section and pitch whose
# chord is not known: blades, P/D, J; Goldstein's factor less Prandtl's, lifting line less Prandtl's, in CT and CP [%].
INFLOW_MODELS = [
    (2, 0.5, 0.35, -1.2, -0.6, 0.6, 0.4),
    (2, 0.5, 0.50, -1.8, -1.2, 0.1, 0.2),
    (2, 0.8, 0.60, -2.1, -1.2, -1.4, -0.9),
    (2, 0.8, 0.80, -3.5, -2.5, -2.8, -1.9),
    (2, 1.2, 1.00, -3.9, -2.7, -3.6, -2.5),
    (2, 1.2, 1.20, -5.3, -4.1, -5.1, -3.9),
    (3, 0.8, 0.80, -2.1, -1.5, -0.9, -0.5),
    (3, 1.2, 1.20, -3.4, -2.6, -2.9, -2.2),
]


@pytest.mark.parametrize("row", INFLOW_MODELS, ids=lambda row: "B{} P/D {} J {}".format(*row[:3]))
def test_what_the_inflow_model_is_worth(row: tuple[float, ...]) -> None:
    """Chords a third narrower or wider move the figures by up to 1 point, square tips the line's by up to 1.2."""
    blades, pitch, advance_ratio = int(row[0]), row[1], row[2]
    plain = blade(blades, pitch)
    momentum = solve(plain, *at(advance_ratio))
    goldstein = change(solve(blade(blades, pitch, "goldstein"), *at(advance_ratio)), momentum).ravel()
    helix = solve_helix(plain, *at(advance_ratio))
    line = change(helix, momentum).ravel()
    print(f"\nGoldstein {goldstein.round(1)} ({row[3]}, {row[4]}), line {line.round(1)} ({row[5]}, {row[6]})")
    assert helix.status[0] == 1
    assert goldstein == pytest.approx(row[3:5], abs=1.5)
    assert line == pytest.approx(row[5:7], abs=1.5)


@pytest.mark.parametrize("law", ["prandtl", "goldstein"])
def test_the_compiled_solution_uses_the_law(law: str) -> None:
    """The factor along the blade is the law's at the angle found, times Prandtl's at the root."""
    from bemt.rotor.end_loss import LAWS, prandtl_root

    elements = blade(2, 1.2, law)
    radial = solve(elements, *at(np.array([0.0, 0.4, 1.0])), radial=True).radial
    assert radial is not None
    sine = np.abs(np.sin(radial["inflow_angle"]))
    x = np.broadcast_to(elements.r_over_R, sine.shape)
    wanted = LAWS[law](2, x, ROOT, sine) * prandtl_root(2, x, ROOT, sine)
    assert radial["end_loss"] == pytest.approx(wanted, abs=3e-4)


def test_the_line_closes_on_itself() -> None:
    """Induced velocities from the circulation of the result, anew with the better kernel, are those it reports."""
    elements = blade(3, 0.8)
    solution = solve_helix(elements, *at(0.7), radial=True)
    radial = {name: value[0] for name, value in (solution.radial or {}).items()}
    r, width = elements.columns[:, k.E_RADIUS], elements.columns[:, k.E_WIDTH]
    chord = elements.columns[:, k.E_CHORD]
    circulation = 0.5 * radial["speed"] * chord * radial["section_lift_coefficient"]
    edges = TIP_RADIUS * (ROOT + (1.0 - ROOT) * 0.5 * (1.0 - np.cos(np.linspace(0.0, np.pi, r.size + 1))))
    pitch = np.interp(edges, r, r * np.tan(radial["inflow_angle"]))
    axial, around = refined(3, r[:, None], edges, pitch)
    shed = -np.diff(circulation, prepend=0.0, append=0.0)
    assert axial @ shed == pytest.approx(radial["axial_induced_velocity"], rel=5e-3, abs=5e-3)
    assert -around @ shed == pytest.approx(radial["tangential_induced_velocity"], rel=5e-3, abs=5e-3)
    # Kutta and Joukowski: the pull of the bound vortices, less the drag along the flow.
    thrust = 3.0 * (
        circulation * (OMEGA * r - radial["tangential_induced_velocity"])
        - 0.5
        * radial["speed"]
        * chord
        * radial["section_drag_coefficient"]
        * radial["speed"]
        * np.sin(radial["inflow_angle"])
    )
    assert solution.thrust_per_density[0] == pytest.approx(thrust @ width, rel=1e-12)


def test_many_narrow_blades_are_momentum_without_end_loss() -> None:
    """The same total chord on ever more blades; what is left is the changing pitch of the wake along the span."""
    left = []
    for blades in (2, 8, 64):
        elements = blade(blades, 0.8, "none", chord_share=2.0 / blades, n=60)
        left.append(np.abs(change(solve_helix(elements, *at(0.8)), solve(elements, *at(0.8)))).max())
    print(f"\nper cent from momentum: {np.round(left, 2)}")
    assert left[0] > 5.0
    assert left[1] < 1.5
    assert left[2] < 1.0


def test_more_elements_change_nothing() -> None:
    coarse, fine = (solve_helix(blade(2, 0.8, n=n), *at(np.array([0.45, 0.6, 0.75]))) for n in (40, 80))
    assert np.abs(change(coarse, fine)).max() < 0.1


def test_points_do_not_depend_on_their_neighbours() -> None:
    elements, ratios = blade(2, 0.8), np.linspace(0.3, 0.8, 45)
    together = solve_helix(elements, *at(ratios))
    for i in (0, 20, 44):
        alone = solve_helix(elements, *at(ratios[i]))
        assert alone.thrust_per_density[0] == pytest.approx(together.thrust_per_density[i], rel=1e-9)


@pytest.mark.parametrize(("blades", "pitch"), [(1, 0.8), (2, 0.5), (2, 1.2), (3, 0.8), (6, 1.0)])
def test_the_line_converges_wherever_it_is_meant_for(blades: int, pitch: float) -> None:
    """From standing still to a stopped propeller in the wind, partly stalled or not; elsewhere it says so."""
    elements = blade(blades, pitch)
    angle = np.radians(np.linspace(0.0, 90.0, 46))
    airspeed, omega = 40.0 * np.sin(angle), 40.0 * np.cos(angle) / (0.75 * TIP_RADIUS)
    omega[-1] = 0.0
    solution = solve_helix(elements, airspeed, omega, VISCOSITY, SOUND, radial=True)
    reached = solution.status != 4
    assert np.isin(solution.status, [1, 2, 3, 4]).all()
    assert np.isfinite(solution.thrust_per_density).tolist() == reached.tolist()
    assert np.isfinite(solution.torque_per_density).tolist() == reached.tolist()
    assert (solution.stalled_share[reached] >= 0.0).all()
    assert solution.radial is not None
    backward = (airspeed[:, None] + solution.radial["axial_induced_velocity"] < 0.0).any(axis=1)
    assert (solution.status[reached & backward] == 3).all()
    outside = outside_inflow_law(elements, airspeed, solution.thrust_per_density)
    assert outside[0], "standing still"
    thrusting = np.arange(angle.size) < np.flatnonzero(solution.thrust_per_density < 0.0)[0]
    lost = ~reached & thrusting
    start = solve(elements, airspeed, omega, VISCOSITY, SOUND)
    assert outside_inflow_law(elements, airspeed, start.thrust_per_density)[lost].all()
    assert reached[~thrusting].all()


def test_the_wake_that_momentum_leaves() -> None:
    """Far-wake radius: sqrt(1/2) standing still (Froude), 0.9 where w/V = 0.19/0.62 by continuity."""
    elements = blade(2, 0.8)
    area = np.pi * TIP_RADIUS**2
    assert wake_radius(elements, 0.0, 3.0) == pytest.approx(np.sqrt(0.5))
    V = np.array([20.0])
    for share, outside in ((0.30, False), (0.32, True), (0.0, False), (-0.05, False), (-0.4, True), (np.nan, True)):
        w = share * V
        thrust = 2.0 * area * w * (V + w)
        assert outside_inflow_law(elements, V, thrust).tolist() == [outside], share
    w = V * 0.19 / 0.62
    assert wake_radius(elements, V, 2.0 * area * w * (V + w)) == pytest.approx(LEAST_WAKE_RADIUS)
    assert wake_radius(elements, V, -area * V**2) == np.inf


def test_swirl_turns_with_the_blade_and_flow_follows_the_thrust() -> None:
    elements = blade(2, 0.8)
    solution = solve_helix(elements, *at(0.7), radial=True)
    assert solution.radial is not None
    axial, swirl, angle = (
        solution.radial[name][0, 18:31]
        for name in ("axial_induced_velocity", "tangential_induced_velocity", "inflow_angle")
    )
    assert (axial > 0.0).all()
    # Both are parts of one velocity at right angles to the flow, if the wake's pitch is even (Lerbs 1952).
    assert swirl / axial == pytest.approx(np.tan(angle), rel=0.1)


@pytest.mark.parametrize("name", shipped.CASES)
def test_real_blades_with_corners_in_their_polars(name: str) -> None:
    """200 points from the model's limit to beyond zero thrust: all converge, and lie near momentum."""
    case = shipped.case(name)
    elements = blade_elements(case.propeller, case.model)
    ratio, turns = (grid.ravel() for grid in np.meshgrid(np.linspace(0.3, 0.9, 40), np.linspace(40.0, 120.0, 5)))
    airspeed, omega = ratio * turns * case.propeller.diameter, 2.0 * np.pi * turns
    line = solve_helix(elements, airspeed, omega, VISCOSITY, 340.0)
    momentum = solve(elements, airspeed, omega, VISCOSITY, 340.0)
    inside = ~outside_inflow_law(elements, airspeed, momentum.thrust_per_density)
    assert inside.mean() > 0.9
    assert (line.status[inside] != 4).all()
    area_load = (turns * case.propeller.diameter**2) ** 2
    apart = np.abs(line.thrust_per_density - momentum.thrust_per_density) / area_load
    print(f"\n{name}: thrust coefficient apart by up to {apart[inside].max():.4f}")
    assert apart[inside].max() < 0.004
