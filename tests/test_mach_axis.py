"""Polars with a Mach axis of their own in the compiled solution."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shipped

from bemt.rotor import kernels as k
from bemt.rotor.element_polars import coefficients
from bemt.rotor.elements import BladeElements, blade_elements
from bemt.rotor.solution import RotorSolution, solve
from bemt.section.full_circle import ANGLES

RPM = np.array([4000.0, 9000.0, 16000.0, 24000.0])
ADVANCE_RATIO = np.array([0.0, 0.3, 0.6, 1.4])


def points(elements: BladeElements, sound: float) -> RotorSolution:
    n, ratio = (array.ravel() for array in np.meshgrid(RPM / 60.0, ADVANCE_RATIO))
    return solve(elements, ratio * n * 2.0 * elements.tip_radius, 2.0 * np.pi * n, 1.5e-5, sound, radial=True)


def with_axis(elements: BladeElements, mach: np.ndarray, *, compressible: bool) -> BladeElements:
    """Put the laws of compressibility, or none, into rows over Mach number."""
    rows, bounds = [], []
    for number in mach:
        for row, ln_re in enumerate(elements.ln_reynolds):
            if compressible:
                alpha = np.broadcast_to(ANGLES[:, None], (ANGLES.size, elements.r_over_R.size))
                lift, drag = coefficients(elements, alpha, np.full(alpha.shape, ln_re), np.full(alpha.shape, number))
                rows.append(np.stack([lift.T, np.log(drag).T], axis=-1))
            else:
                rows.append(elements.polars[:, row])
            bounds.append(elements.bounds[:, row])
    from bemt.rotor.elements import element_bounds

    polars = np.stack(rows, axis=1)
    known = np.stack(bounds, axis=1)
    stall = np.moveaxis(known[..., [k.B_STALL_LOW, k.B_STALL_HIGH, k.B_DATA_LOW, k.B_DATA_HIGH]], -1, 0)
    return replace(elements, polars=polars, bounds=element_bounds(polars, stall), mach=mach)


@pytest.fixture(scope="module")
def elements() -> BladeElements:
    case = shipped.case("nr640_9in")
    return blade_elements(case.propeller, replace(case.model, elements=16))


def test_rows_that_are_alike_change_nothing(elements: BladeElements) -> None:
    plain = points(elements, 1e9)
    found = points(with_axis(elements, np.array([0.0, 0.3, 0.9]), compressible=False), 340.0)
    scale = np.abs(plain.thrust_per_density).max()
    # Reynolds number and Mach number lag the local speed by at most 1e-5.
    np.testing.assert_allclose(found.thrust_per_density, plain.thrust_per_density, atol=1e-6 * scale)
    np.testing.assert_allclose(found.torque_per_density, plain.torque_per_density, rtol=1e-5)
    # Walking outward calls a fold by its name more often than proofs do.
    assert ((found.status <= 2) == (plain.status <= 2)).all()
    np.testing.assert_allclose(found.stalled_share, plain.stalled_share)


def test_a_fine_axis_is_the_laws_it_was_made_of(elements: BladeElements) -> None:
    laws = points(elements, 340.0)
    found = points(with_axis(elements, np.linspace(0.0, 0.96, 49), compressible=True), 340.0)
    # Linear between Mach numbers 0.02 apart: 0.02^2/8 times the second derivative of 1/sqrt(1 - M^2), below 10 up to
    # M 0.7, is 5e-4 of the lift at most. The fastest points lie beyond that, where drag rises.
    below = np.tile(RPM < 20000.0, ADVANCE_RATIO.size)
    ratio = found.thrust_per_density / laws.thrust_per_density
    driven = np.abs(laws.thrust_per_density) > 0.02 * np.abs(laws.thrust_per_density).max()
    assert (np.abs(ratio - 1.0)[below & driven] < 2e-3).all()
    assert (np.abs(ratio - 1.0)[driven] < 2e-2).all()
    np.testing.assert_allclose(found.above_divergence_share, laws.above_divergence_share, atol=0.15)
    assert found.above_divergence_share.max() > 0.05, "the fastest points were meant to reach drag divergence"


def test_the_range_of_the_axis_is_data(elements: BladeElements) -> None:
    columns = elements.columns.copy()
    columns[:, k.E_MACH_HIGH] = 0.5
    axis = with_axis(elements, np.array([0.0, 0.3, 0.5]), compressible=True)
    found = points(replace(axis, columns=columns), 340.0)
    within = points(axis, 340.0)
    tip_mach = RPM / 60.0 * np.pi * 2.0 * elements.tip_radius / 340.0
    fast = np.tile(tip_mach > 0.5, ADVANCE_RATIO.size)
    assert (found.outside_polar_share[fast] > within.outside_polar_share[fast] + 0.05).all()
    np.testing.assert_array_equal(found.outside_polar_share[~fast][:2], within.outside_polar_share[~fast][:2])
