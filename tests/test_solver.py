"""The solver against momentum itself, exact end values, closed forms and an independent oracle."""

from __future__ import annotations

import numpy as np
import pytest
import random_elements as make
from scipy.optimize import brentq

from bemt.rotor import kernels as k

STATUS_NAMES = {1: "converged", 2: "several roots", 3: "reversed flow", 4: "not converged"}


def random_batches(sharp: bool, count: int, seed: int):
    """Yield points, element columns, radial results, polars and blade count until `count` elements are solved."""
    rng = np.random.default_rng(seed)
    polars, bounds = make.polar_set(sharp, rng, 40)
    per_batch, n_points = 200, 10
    for _ in range(count // (per_batch * n_points)):
        blades = int(rng.integers(2, 7))
        columns = make.elements(rng, per_batch, blades, 40)
        tip_speed = 10 ** rng.uniform(0.5, 2.2, n_points)
        ratio = np.where(
            rng.random(n_points) < 0.1,
            0.0,
            np.where(rng.random(n_points) < 0.3, 10 ** rng.uniform(-3, 1, n_points), rng.uniform(0, 2, n_points)),
        )
        points = np.zeros((n_points, k.P_COLUMNS))
        points[:, k.P_AIRSPEED] = ratio * tip_speed
        points[:, k.P_OMEGA] = tip_speed / make.TIP_RADIUS
        points[:, k.P_INVERSE_VISCOSITY] = 7e4
        points[:, k.P_INVERSE_SOUND] = 1 / 340.0
        yield points, columns, make.solve(points, columns, polars, bounds, blades), polars, bounds, blades


@pytest.mark.parametrize("sharp", [False, True], ids=["smooth stall", "sharp stall"])
def test_random_elements_close_the_momentum_balance_or_say_why(sharp: bool) -> None:
    """100 000 elements each: blade-element and momentum forces agree to 1e-9 wherever the status is good."""
    counts = dict.fromkeys(STATUS_NAMES, 0)
    worst = 0.0
    braked = 0
    for points, columns, radial, _, _, _ in random_batches(sharp, 100_000, 1):
        status = radial["status"]
        for code in counts:
            counts[code] += int((status == code).sum())
        assert np.isin(status, list(STATUS_NAMES)).all(), "every element has a named outcome"
        good = status != 4
        for name in ("inflow_angle", "section_lift_coefficient", "section_drag_coefficient", "thrust_loading"):
            assert np.isfinite(radial[name][good]).all(), "no NaN with a good status"

        error, brake = make.closure(points, columns, radial)
        braked += int((brake & good).sum())
        worst = max(worst, float(error[good].max()))
        assert (radial["speed"][good] > 0).all()
    print(
        f"\n{'sharp' if sharp else 'smooth'} stall: "
        + ", ".join(f"{STATUS_NAMES[code]} {count}" for code, count in counts.items())
        + f"; on the high-induction branch {braked}; worst closure {worst:.1e}"
    )
    assert worst < 1e-9
    assert braked > 100, "the high-induction branch was met"
    assert counts[4] < 5e-4 * sum(counts.values())
    assert counts[2] > (100 if sharp else 0), "folds of a sharp stall are flagged"


def residual(psi, airspeed, turning, column, lift_of, drag_of, factor):
    """G(psi) written out anew from the blade-element and momentum equations, at the angle phi0 + psi."""
    phi0 = np.arctan2(airspeed, turning)
    alpha = (column[k.E_TWIST] - phi0 - psi + np.pi) % (2 * np.pi) - np.pi
    phi = phi0 + psi
    return column[k.E_SOLIDITY] * (lift_of(alpha) * np.cos(psi) - drag_of(alpha) * np.sin(psi)) - 4 * factor(
        phi
    ) * np.abs(np.sin(phi)) * np.sin(psi)


def prandtl(column, phi):
    """Prandtl's factor in its own form, by acos and exp."""
    s = max(abs(np.sin(phi)), 1e-15)
    tip = np.arccos(np.exp(-(column[k.E_TIP] ** 2) / s))
    root = np.arccos(np.exp(-(column[k.E_ROOT] ** 2) / s))
    return max((2 / np.pi) ** 2 * tip * root, 1e-4)


@pytest.mark.parametrize("sharp", [False, True], ids=["smooth stall", "sharp stall"])
def test_the_root_is_the_first_one_going_out(sharp: bool) -> None:
    """A dense scan and scipy's brentq on the residual written out anew find the same root, on the propeller side."""
    rng = np.random.default_rng(7)
    polars, bounds = make.polar_set(sharp, rng, 30)
    # One row of polars: with the Reynolds number out of the way the scan is exact.
    polars[:, 1] = polars[:, 2] = polars[:, 0]
    bounds[:, 1] = bounds[:, 2] = bounds[:, 0]
    columns = make.elements(rng, 60, 2, 30)
    points = np.zeros((6, k.P_COLUMNS))
    points[:, k.P_AIRSPEED] = [0.0, 1.0, 3.0, 6.0, 12.0, 25.0]
    points[:, k.P_OMEGA] = 20.0 / make.TIP_RADIUS
    points[:, k.P_INVERSE_VISCOSITY] = 7e4
    radial = make.solve(points, columns, polars, bounds, 2)
    angles = np.linspace(-np.pi, np.pi, polars.shape[2])
    compared = several = 0
    for p in range(points.shape[0]):
        for e in range(columns.shape[0]):
            table = polars[int(columns[e, k.E_POLAR]), 0]
            column = columns[e]
            airspeed, turning = points[p, k.P_AIRSPEED], points[p, k.P_OMEGA] * column[k.E_RADIUS]
            arguments = (
                airspeed,
                turning,
                column,
                lambda a, t=table: np.interp(a, angles, t[:, 0]),
                lambda a, t=table: np.exp(np.interp(a, angles, t[:, 1])),
                lambda phi, c=column: prandtl(c, phi),
            )
            phi0 = np.arctan2(airspeed, turning)
            psi = np.linspace(0.0, np.pi / 2, 2400)
            values = np.array([residual(x, *arguments) for x in psi])
            if values[0] <= 0:
                continue
            change = np.flatnonzero(np.sign(values[1:]) != np.sign(values[:-1]))
            assert change.size, "the bracket 0 to 90 deg cannot fail"
            root = brentq(residual, psi[change[0]], psi[change[0] + 1], args=arguments, xtol=1e-14)
            # The loss factor of the kernel is a table, right to 2e-10.
            assert radial["inflow_angle"][p, e] - phi0 == pytest.approx(root, abs=2e-8), (p, e, change.size)
            compared += 1
            if change.size > 1:
                several += 1
                assert radial["status"][p, e] in (2, 3)
    print(f"\n{compared} elements compared, {several} of them with several roots")
    assert compared > 150
    assert several > 0 or not sharp


def test_end_values_of_the_residual() -> None:
    """G at psi = 0 and at phi = 0, 90 and -90 deg is what the algebra says (R = W0 G there)."""
    rng = np.random.default_rng(3)
    polars, _ = make.polar_set(False, rng, 4)
    loss = k.loss_table()
    for _ in range(50):
        column = make.elements(rng, 1, 3, 4)[0]
        polar = polars[int(column[k.E_POLAR])]
        airspeed, turning = rng.uniform(0.1, 30), rng.uniform(1, 100)
        w0 = np.hypot(airspeed, turning)
        s0, c0, phi0 = airspeed / w0, turning / w0, np.arctan2(airspeed, turning)
        theta, sigma = column[k.E_TWIST], column[k.E_SOLIDITY]

        def section(alpha, polar=polar):
            wrapped = (alpha + np.pi) % (2 * np.pi) - np.pi
            return k._section(wrapped, polar, 0, 0.3, 1.0)[:2]

        def g(phi, column=column, polar=polar, s0=s0, c0=c0, theta=theta, phi0=phi0):
            return k._residual(phi - phi0, theta - phi0, s0, c0, column, polar, 0, 0.3, 1.0, 0.0, loss)[0]

        tip_loss = k._loss_factor(1.0, column[k.E_TIP], 0.0, column[k.E_ROOT], loss)[0]
        lift, drag = section(theta - phi0)
        assert g(phi0) == pytest.approx(sigma * lift, abs=1e-13)
        lift, drag = section(theta)
        assert w0 * g(0.0) == pytest.approx(sigma * (airspeed * drag + turning * lift), abs=1e-9 * w0)
        lift, drag = section(theta - np.pi / 2)
        expected = sigma * (airspeed * lift - turning * drag) - 4 * tip_loss * turning
        assert w0 * g(np.pi / 2) == pytest.approx(expected, abs=1e-11 * w0)
        lift, drag = section(theta + np.pi / 2)
        expected = sigma * (-airspeed * lift + turning * drag) + 4 * tip_loss * turning
        assert w0 * g(-np.pi / 2) == pytest.approx(expected, abs=1e-11 * w0)


def linear_section(slope: float) -> tuple[np.ndarray, np.ndarray]:
    """Lift in proportion to the angle and next to no drag, so that the small-angle closed form nearly holds."""
    angles = np.linspace(-np.pi, np.pi, 721)
    lift = slope * np.where(np.abs(angles) < 0.5, angles, 0.5 * np.sign(angles))
    lift[0] = lift[-1] = 0.0
    one = np.stack([lift, np.full(angles.size, np.log(1e-7))], axis=-1)
    polars = np.broadcast_to(one, (1, 3, *one.shape)).copy()
    stall = np.array([-0.5, 0.5, -0.5, 0.5])[:, None, None] * np.ones((4, 1, 3))
    from bemt.rotor.elements import element_bounds

    return polars, element_bounds(polars, stall)


@pytest.mark.parametrize(("solidity", "twist_deg"), [(0.05, 4.0), (0.1, 8.0), (0.02, 2.0)])
def test_static_untwisted_limit(solidity: float, twist_deg: float) -> None:
    """Hover, no loss: phi = (sigma a/8)(sqrt(1 + 16 theta/(sigma a)) - 1), J.G. Leishman, Helicopter Aerodynamics."""
    slope = 5.75
    polars, bounds = linear_section(slope)
    column = np.zeros((1, k.E_COLUMNS))
    column[0, [k.E_RADIUS, k.E_WIDTH, k.E_CHORD, k.E_TWIST, k.E_SOLIDITY]] = (
        0.1,
        0.01,
        0.02,
        np.radians(twist_deg),
        solidity,
    )
    column[0, [k.E_TIP, k.E_LOSS_SCALE, k.E_ROOT]] = 1e6
    column[0, k.E_MACH_HIGH] = np.inf
    column[0, k.E_TABLE_BETA] = 1.0
    point = np.array([[0.0, 200.0, 7e4, 0.0]])
    phi = make.solve(point, column, polars, bounds, 2)["inflow_angle"][0, 0]
    theta = np.radians(twist_deg)
    closed = solidity * slope / 8 * (np.sqrt(1 + 16 * theta / (solidity * slope)) - 1)
    print(f"\nsigma {solidity}, theta {twist_deg} deg: {np.degrees(phi):.4f} deg, closed form {np.degrees(closed):.4f}")
    assert phi == pytest.approx(closed, rel=5e-3)  # the closed form takes sines for angles


def test_points_do_not_depend_on_their_company() -> None:
    """Each point is solved by itself: order and number of the others change nothing, to the last bit."""
    for points, columns, radial, polars, bounds, blades in random_batches(True, 4000, 11):
        shuffled = np.random.default_rng(5).permutation(points.shape[0])
        again = make.solve(np.ascontiguousarray(points[shuffled]), columns, polars, bounds, blades)
        alone = make.solve(points[3:4].copy(), columns, polars, bounds, blades)
        for name, values in radial.items():
            if name != "evaluations":
                assert np.array_equal(again[name], values[shuffled], equal_nan=True), name
                assert np.array_equal(alone[name][0], values[3], equal_nan=True), name


def test_loss_table_against_its_formula() -> None:
    """Prandtl's factor as tabulated differs from acos and exp by less than the stated 2e-10."""
    table = k.loss_table()
    x = np.linspace(0, 6, 100_003)[1:]
    tabulated = np.array([k._end_loss(value, 1.0, 0.0, table)[0] for value in x[::40]])
    exact = 2 / np.pi * np.arccos(np.exp(-(x[::40] ** 2)))
    print(f"\nlargest error {np.abs(tabulated - exact).max():.1e}")
    assert np.abs(tabulated - exact).max() < 2e-10


def test_high_induction_joins_momentum_and_obeys_buhl() -> None:
    """Above a = 0.4 the solution satisfies Buhl's law to 1e-12 and joins 4 a F (1 - a) in value and slope."""
    for factor in (1.0, 0.7, 0.3):
        for kappa in np.geomspace(0.67, 50, 40):
            a = k._high_induction(kappa, factor)
            thrust = 4 * factor * kappa * (1 - a) ** 2  # blade-element thrust coefficient of the annulus
            buhl = 8 / 9 + (4 * factor - 40 / 9) * a + (50 / 9 - 4 * factor) * a**2
            assert thrust == pytest.approx(buhl, rel=1e-11)
            assert 0.4 <= a < 1
        below, above = k._high_induction(2 / 3 - 1e-7, factor), k._high_induction(2 / 3 + 1e-7, factor)
        assert above - below == pytest.approx(2e-7 / (1 + 2 / 3) ** 2, rel=1e-3)
