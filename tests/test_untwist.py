"""The turn of a blade under its own mass against closed forms of a uniform bar."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
import shipped
from scipy.integrate import quad

import bemt
from bemt.blade import untwist
from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.blade.untwist import centrifugal_untwist, rigid_blade_note

RPM, DENSITY, MODULUS = 8000.0, 1200.0, 1.0e9


def bar(root_angle: float, tip_angle: float, thickness: float | None = 0.1) -> Propeller:
    """A blade of 0.15 m radius and 15 mm chord whose angle runs straight from r/R = 0.2 to the tip."""
    x = np.linspace(0.2, 1.0, 5)
    return Propeller(
        blades=2,
        diameter=0.3,
        stations=Stations(
            r_over_R=x,
            c_over_R=np.full(5, 0.1),
            twist=np.interp(x, [0.2, 1.0], [root_angle, tip_angle]),
            t_over_c=None if thickness is None else np.full(5, thickness),
        ),
        sections=(SectionSpan(family="flat-bottom"),),
    )


def test_section_constants_are_those_of_the_four_digit_thickness() -> None:
    # I.H. Abbott, A.E. von Doenhoff, Theory of Wing Sections: the thickness form, integrated by scipy.
    def full(x: float) -> float:
        return 10.0 * (0.2969 * np.sqrt(x) - 0.126 * x - 0.3516 * x**2 + 0.2843 * x**3 - 0.1015 * x**4)

    area = quad(full, 0, 1)[0]
    middle = quad(lambda x: x * full(x), 0, 1)[0] / area
    assert untwist.AREA == pytest.approx(area, rel=2e-3)
    assert untwist.BROAD_MOMENT == pytest.approx(quad(lambda x: (x - middle) ** 2 * full(x), 0, 1)[0], rel=2e-3)
    assert untwist.THIN_MOMENT == pytest.approx(quad(lambda x: full(x) ** 3 / 12.0, 0, 1)[0], rel=2e-3)
    assert untwist.TORSION == pytest.approx(quad(lambda x: full(x) ** 3 / 3.0, 0, 1)[0], rel=3e-3)


def test_flattening_of_a_straight_bar() -> None:
    # A constant moment per length m gives the torque m (R - r) and the turn m/(GJ) ((R - r0)^2 - (R - r)^2)/2.
    angle = np.radians(20.0)
    found = centrifugal_untwist(bar(angle, angle), RPM, density=DENSITY, shear_modulus=MODULUS)
    assert found is not None
    chord, thickness = 0.015, 0.0015
    per_length = (
        DENSITY
        * (RPM * np.pi / 30.0) ** 2
        * (untwist.BROAD_MOMENT * chord**3 * thickness - untwist.THIN_MOMENT * chord * thickness**3)
        * 0.5
        * np.sin(2.0 * angle)
    )
    turn = per_length / (MODULUS * untwist.TORSION * chord * thickness**3) * (0.12**2 - 0.0375**2) / 2.0
    assert found.flattening == pytest.approx(-turn, rel=1e-4)
    assert found.straightening == pytest.approx(0.0, abs=1e-12)


def test_tension_takes_twist_out_of_a_bar() -> None:
    # Tension rho A Omega^2 (R^2 - r^2)/2 along fibres that turn at a constant rate; A k^2 is the polar moment.
    found = centrifugal_untwist(bar(0.5, 0.1), RPM, density=DENSITY, shear_modulus=MODULUS)
    assert found is not None
    chord, thickness = 0.015, 0.0015
    polar = untwist.BROAD_MOMENT * chord**3 * thickness + untwist.THIN_MOMENT * chord * thickness**3
    twist_rate = -0.4 / 0.12
    lengths = 0.15**2 * (0.1125 - 0.03) / 2.0 - (0.1125**3 - 0.03**3) / 6.0
    turn = -DENSITY * (RPM * np.pi / 30.0) ** 2 * polar * twist_rate * lengths
    turn /= MODULUS * untwist.TORSION * chord * thickness**3
    assert found.straightening == pytest.approx(turn, rel=1e-4)
    assert found.straightening > 0.0 > found.flattening


def test_the_note_names_the_rpm_from_which_a_degree_is_reached() -> None:
    said = rigid_blade_note(shipped.case("sandpiper").propeller, 9000.0)
    assert said is not None
    words = said.split()
    reached = float(words[words.index("from", words.index("rpm,")) + 1])
    turned = centrifugal_untwist(shipped.case("sandpiper").propeller, reached)
    assert turned is not None
    assert np.degrees(max(map(abs, turned))) == pytest.approx(1.0, rel=1e-3)
    assert rigid_blade_note(shipped.case("sandpiper").propeller, 0.98 * reached) is None


def test_a_blade_of_unknown_thickness_is_not_judged() -> None:
    blade = bar(0.5, 0.1, thickness=None)
    assert centrifugal_untwist(blade, RPM) is None
    assert rigid_blade_note(blade, 1e5) is None
    guessed = replace(blade, sections=(SectionSpan(family="four-digit", t_over_c=0.1, camber=0.04),))
    assert centrifugal_untwist(guessed, RPM) == pytest.approx(centrifugal_untwist(bar(0.5, 0.1), RPM))


def test_table_and_envelope_say_it() -> None:
    table = shipped.table("sandpiper")
    notes = table.attrs["notes"], bemt.envelope(shipped.case("sandpiper"), table=table).attrs["notes"]
    for note in notes:
        (said,) = [line for line in note.splitlines() if "taken as rigid" in line]
        assert "carbon, metal" in said
    assert "at 9000 rpm" in notes[0]
    assert "taken as rigid" not in shipped.table("nr640_9in").attrs.get("notes", "")
