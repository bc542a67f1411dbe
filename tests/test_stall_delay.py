"""Laws of stall delay against their published equations, and what they may do to a polar."""

from __future__ import annotations

import numpy as np
import pytest

from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.rotor import kernels as k
from bemt.rotor.element_polars import coefficients
from bemt.rotor.elements import blade_elements
from bemt.rotor.model import Model
from bemt.section.full_circle import ANGLES
from bemt.section.stall_delay import LAWS, delayed_drag, delayed_lift, du_selig, snel

# c/r, r/R and the shares by the published equations, worked by hand: Du and Selig's of lift and drag with
# a = b = d = 1 and Lambda = 1, Snel's before cap and fade.
WORKED = (
    (0.6, 0.2, 0.8727, 0.5209, 1.08),
    (0.4, 0.3, 0.5724, 0.3579, 0.48),
    (0.15, 0.75, 0.0978, 0.0096, 0.0675),
    (0.08, 0.95, -0.0194, -0.0657, 0.0192),
)


@pytest.mark.parametrize(("c_over_r", "r_over_R", "lift", "drag", "snel_lift"), WORKED)
def test_shares_against_the_published_equations(
    c_over_r: float, r_over_R: float, lift: float, drag: float, snel_lift: float
) -> None:
    lift_share, drag_share = du_selig(np.array([c_over_r]), np.array([r_over_R]))
    assert lift_share[0] == pytest.approx(max(lift, 0.0), abs=6e-5)
    assert drag_share[0] == pytest.approx(max(drag, 0.0), abs=6e-5)
    lift_share, drag_share = snel(np.array([c_over_r]), np.array([r_over_R]))
    assert lift_share[0] == pytest.approx(min(snel_lift, 1.0) if r_over_R <= 0.75 else 0.0, abs=1e-12)
    assert drag_share[0] == 0.0


def test_du_selig_standing_still_stands_for_slow_flight() -> None:
    # At J = 0.6 the law gives 0.2869 and 0.1463 for c/r = 0.25 at half radius (worked by hand from the equations).
    lift_share, drag_share = du_selig(np.array([0.25]), np.array([0.5]))
    assert lift_share[0] == pytest.approx(0.2869, abs=0.005)
    assert drag_share[0] == pytest.approx(0.1463, abs=0.005)


@pytest.mark.parametrize("name", LAWS)
def test_shares_are_shares(name: str) -> None:
    c_over_r, r_over_R = np.meshgrid(np.linspace(0.02, 1.5, 40), np.linspace(0.08, 1.0, 40))
    for share in LAWS[name].function(c_over_r, r_over_R):
        assert share.shape == c_over_r.shape
        assert ((share >= 0.0) & (share <= 1.0)).all()


def test_lift_and_drag_move_towards_attached_flow_and_never_past_it() -> None:
    zero, slope, level = np.array([-0.05]), np.array([5.8]), np.array([0.012])
    attached = slope * np.sin(ANGLES - zero)
    lift = np.clip(attached, -0.9, 1.1)[None]
    drag = (level + 0.8 * np.maximum(np.abs(ANGLES) - 0.1, 0.0))[None]
    share = np.array([0.6])
    raised = delayed_lift(ANGLES, lift, zero, slope, share)
    lowered = np.exp(delayed_drag(ANGLES, np.log(drag), zero, np.log(level), share))
    full = (ANGLES > zero) & (np.degrees(ANGLES) <= 30.0)
    expected = lift + 0.6 * (attached - lift)
    assert raised[0, full] == pytest.approx(expected[0, full], rel=1e-12)
    assert lowered[0, full] == pytest.approx((drag - 0.6 * (drag - level))[0, full], rel=1e-12)
    elsewhere = (ANGLES < zero) | (np.degrees(ANGLES) >= 50.0)
    np.testing.assert_array_equal(raised[0, elsewhere], lift[0, elsewhere])
    np.testing.assert_allclose(lowered[0, elsewhere], drag[0, elsewhere], rtol=1e-14)
    assert (lowered >= level * (1.0 - 1e-12)).all()


def polars(stall_delay: str, strength: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Lift and drag of every element of a plain blade, at 18 deg of incidence and a Reynolds number of 100 000."""
    x = np.linspace(0.15, 1.0, 10)
    blade = Propeller(2, 0.25, Stations(x, 0.2 - 0.1 * x, 0.4 - 0.3 * x), (SectionSpan(family="four-digit"),))
    elements = blade_elements(blade, Model(stall_delay=stall_delay, stall_strength=strength))
    alpha = np.full(elements.r_over_R.size, np.radians(18.0))
    lift, drag = coefficients(elements, alpha, np.log(1e5) + 0.0 * alpha, 0.0 * alpha)
    return elements.columns[:, k.E_CHORD] / elements.columns[:, k.E_RADIUS], lift, drag


def test_strength_scales_lift_and_drag() -> None:
    c_over_r, lift, drag = polars("none", 1.0)
    _, half_lift, half_drag = polars("du-selig", 0.5)
    _, full_lift, full_drag = polars("du-selig", 1.0)
    assert full_lift - lift == pytest.approx(2.0 * (half_lift - lift), abs=1e-9)
    # Drag is tabled by its logarithm over half degrees: 18 deg is a node.
    assert full_drag - drag == pytest.approx(2.0 * (half_drag - drag), abs=1e-9)
    inner = c_over_r > 0.4
    assert (full_lift[inner] > lift[inner] + 0.2).all()
    assert (full_drag[inner] < 0.8 * drag[inner]).all()
    _, snel_lift, snel_drag = polars("snel", 1.0)
    assert (snel_lift[inner] > lift[inner]).all()
    np.testing.assert_array_equal(snel_drag, drag)
