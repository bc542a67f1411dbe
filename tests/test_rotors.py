"""Rotors standing still: the solution against the closed form of momentum theory, and beside a measured rotor.

M. Knight, R.A. Hefner, NACA TN-626, 1937: untwisted blades with the report's own section law. F.X. Caradonna, C. Tung,
NASA TM-81232, 1981: values from memory, reported and not demanded.
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from test_docs import script

validation = script("make_validation")


@pytest.mark.parametrize("blades", validation.KNIGHT_HEFNER_BLADES)
@pytest.mark.parametrize("degrees", [2.0, 4.0, 8.0])
def test_without_drag_the_solution_is_the_closed_form_of_small_angles(blades: int, degrees: float) -> None:
    collective, almost_none = math.radians(degrees), 1e-6
    elements = validation.knight_hefner(blades, collective, drag_share=almost_none)
    closed = validation.knight_hefner_closed(elements, collective, drag_share=almost_none)
    # What is left are squares of inflow angles of up to 6 deg, and the swirl that lift makes: below 1 %.
    assert validation.knight_hefner_computed(elements) == pytest.approx(closed, rel=0.01)


@pytest.mark.parametrize("blades", validation.KNIGHT_HEFNER_BLADES)
@pytest.mark.parametrize("degrees", [4.0, 8.0, 12.0])
def test_with_the_drag_of_the_report_the_closed_form_needs_the_swirl(blades: int, degrees: float) -> None:
    collective = math.radians(degrees)
    elements = validation.knight_hefner(blades, collective)
    computed = np.array(validation.knight_hefner_computed(elements))
    with_swirl = np.array(validation.knight_hefner_closed(elements, collective, swirl=True))
    without = np.array(validation.knight_hefner_closed(elements, collective))
    print(f"{blades} blades, {degrees:g} deg: thrust and torque less closed form {computed / with_swirl - 1.0}")
    assert computed == pytest.approx(with_swirl, rel=0.01)
    # Left out, the swirl of the drag alone is up to 3 % of the thrust: the two must differ, and in this direction.
    assert (computed < without).all()
    assert computed == pytest.approx(without, rel=0.03)


def test_end_loss_takes_some_per_cent_of_the_thrust_and_more_from_few_blades() -> None:
    collective = math.radians(8.0)
    lost = []
    for blades in validation.KNIGHT_HEFNER_BLADES:
        free, _ = validation.knight_hefner_computed(validation.knight_hefner(blades, collective))
        real, _ = validation.knight_hefner_computed(validation.knight_hefner(blades, collective, "prandtl"))
        lost.append(1.0 - real / free)
    # Common practice, no source: a tip loss of a few per cent of the radius at these solidities.
    assert 0.02 < min(lost)
    assert max(lost) < 0.10


def test_the_hovering_rotor_is_reported() -> None:
    rows = [row for row in validation.rotor_rows() if row.rotor == "Caradonna and Tung"]
    for row in rows:
        print(f"{row.rotor}, {row.point}: measured {row.reference:.5f}, computed {row.computed:.5f}, {row.error:+.0%}")
    assert len(rows) == 4
    # Momentum theory leaves out the vortex of the blade before, so it gives too much; a smaller value would be an
    # error of ours. How much too much is no gate.
    assert all(row.error > 0.0 for row in rows)
