"""The case layer: units, places of keys, data files, defaults, and the plain objects they turn into."""

from __future__ import annotations

import contextlib
import io
import json
import math
import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from case_files import BLADE, CASE, DRIVE, line_of, polars, write_case
from hypothesis import given
from hypothesis import strategies as st

from bemt.air import standard_air
from bemt.case import load_case
from bemt.case import units as u
from bemt.case.complaints import Complaints
from bemt.case.defaults import default_advance_ratio_end
from bemt.case.lines import KeyLines
from bemt.case.models import CaseFile
from bemt.case.pitch import chord_line_angle, pitch_over_diameter
from bemt.case.tables import read_polars, read_stations
from bemt.errors import CaseError

CASES = Path(__file__).parents[1] / "cases"


def complaints_of(path: Path) -> list[str]:
    with pytest.raises(CaseError) as caught:
        load_case(path)
    return [f"{c.line}: {c.field}: {c.message}" for c in caught.value.complaints]


# --- units -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "kind", "expected"),
    [
        # Exact by definition: inch 25.4 mm, foot 12 in, nautical mile 1852 m, mile 5280 ft, pound 0.45359237 kg
        # (international yard and pound agreement, 1959; BIPM, The International System of Units).
        ("12.5 in", u.LENGTH, 0.3175),
        ("12.5in", u.LENGTH, 0.3175),
        ("1e2 mm", u.LENGTH, 0.1),
        ("-30 ft", u.LENGTH, -9.144),
        ("1 knot", u.SPEED, 1852 / 3600),
        ("60 mph", u.SPEED, 60 * 1609.344 / 3600),
        ("36 km/h", u.SPEED, 10.0),
        ("2 lb", u.MASS, 0.90718474),
        ("5200 cm^2", u.AREA, 0.52),
        ("690 rpm/V", u.SPEED_CONSTANT, 690 * 2 * math.pi / 60),
        ("100 rad/s/V", u.SPEED_CONSTANT, 100.0),
        ("9500 rpm", u.ROTATION, 9500.0),
        ("100 rev/s", u.ROTATION, 6000.0),
        ("100 rad/s", u.ROTATION, 100 * 30 / math.pi),
        ("24 kHz", u.FREQUENCY, 24e3),
        ("60 ns", u.TIME, 60e-9),
        ("41 mohm", u.RESISTANCE, 0.041),
        ("41 mΩ", u.RESISTANCE, 0.041),
        ("5 A*h", u.CHARGE, 18e3),
        ("5000 mAh", u.CHARGE, 18e3),
        ("12 degC", u.TEMPERATURE, 285.15),
        ("59 degF", u.TEMPERATURE, 288.15),
        ("-3 K", u.TEMPERATURE_DIFFERENCE, -3.0),
        ("-3 degC", u.TEMPERATURE_DIFFERENCE, -3.0),
        ("9 degF", u.TEMPERATURE_DIFFERENCE, 5.0),
        ("1002 hPa", u.PRESSURE, 100200.0),
        ("1 degree", u.ANGLE, math.pi / 180),
        ("2.1 K/W", u.THERMAL_RESISTANCE, 2.1),
        ("1.8e-5 Pa*s", u.VISCOSITY, 1.8e-5),
    ],
)
def test_quantities_become_si(text: str, kind: u.Kind, expected: float) -> None:
    assert u.parse_quantity(text, kind) == pytest.approx(expected, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "kind", "words"),
    [
        ("12.5", u.LENGTH, "no unit; units that fit: mm"),
        ("12,5 in", u.LENGTH, "decimal mark is a point"),
        ("in", u.LENGTH, "not a number with a unit"),
        ("3 inn", u.LENGTH, "did you mean 'in'"),
        ("3 kg", u.LENGTH, "does not measure a length"),
        ("nan m", u.LENGTH, "not a finite number"),
        ("inf m", u.LENGTH, "not a finite number"),
        ("1e400 m", u.LENGTH, "not a finite number"),
        ("1 m 2", u.LENGTH, "not a unit"),
        ("1 m**9**9**9", u.LENGTH, "not a unit"),
        ("12 C", u.TEMPERATURE, "coulomb"),
        ("5 A", u.CHARGE, "that is a current"),
        ("100 Hz", u.ROTATION, "revolutions or radians"),
        ("690 Hz/V", u.SPEED_CONSTANT, "revolutions or radians"),
        ("3000 rpm", u.FREQUENCY, "does not measure a frequency"),
        ("5 percent", u.ANGLE, "does not measure an angle"),
    ],
)
def test_what_is_no_quantity_is_told_what_would_fit(text: str, kind: u.Kind, words: str) -> None:
    with pytest.raises(ValueError, match=words):
        u.parse_quantity(text, kind)


@given(st.floats(-1e12, 1e12), st.sampled_from(["m", "mm", "in", "ft"]))
def test_any_number_survives_being_written(value: float, unit: str) -> None:
    metres = {"m": 1.0, "mm": 1e-3, "in": 0.0254, "ft": 0.3048}[unit]
    assert u.parse_quantity(f"{value!r} {unit}", u.LENGTH) == pytest.approx(value * metres, rel=1e-12, abs=1e-300)


@given(st.text(max_size=20))
def test_any_text_is_a_quantity_or_a_value_error(text: str) -> None:
    with contextlib.suppress(ValueError):
        assert math.isfinite(u.parse_quantity(text, u.LENGTH))


# --- places of keys --------------------------------------------------------------------------------------------------

TANGLED = '''\
# [not.a.table]
title = "a # [x] \\" ]"          # a comment with = and [
fruit."red apple".'from' = 3
[[section]]
from = 0.0
inner = { y = 1, z = { q = [1,
  2, # two ]
  3 ] }, "odd key" = 'x' }
[section.deep]
k = 1
[[section.deep.list]]
a = 1
[[section.deep.list]]
a = 2
[[section]]
text = """
[not]
key = 1 """
raw = \'\'\'
]]\'\'\'
quoted = """""two quotes"""""
numbers = [ # a comment
  1, 2,
  [3,
   4],
  "]", { b = 5 },
]
empty = [ ]
none = {}
when = 1979-05-27 07:32:00 # a date with a space
[ spaced . "out" ]
  last = true'''


def paths_of(value: Any, path: tuple[str | int, ...] = ()) -> set[tuple[str | int, ...]]:
    """Every path of a parsed document, as the standard parser sees it."""
    children: list[tuple[str | int, Any]] = []
    if isinstance(value, dict):
        children = list(value.items())
    elif isinstance(value, list):
        children = list(enumerate(value))
    found = {path} if path else set()
    return found.union(*(paths_of(child, (*path, key)) for key, child in children))


@pytest.mark.parametrize("text", [TANGLED, "", "# nothing", CASE, (CASES / "sandpiper.toml").read_text()])
def test_every_key_the_standard_parser_sees_has_a_line(text: str) -> None:
    assert set(KeyLines(text).lines) == paths_of(tomllib.loads(text))


@pytest.mark.parametrize(
    ("path", "written"),
    [
        (("title",), "title ="),
        (("fruit", "red apple", "from"), "red apple"),
        (("section", 0), "[[section]]"),
        (("section", 0, "from"), "from = 0.0"),
        (("section", 0, "inner", "z", "q", 1), "  2, # two"),
        (("section", 0, "inner", "odd key"), "odd key"),
        (("section", 0, "deep", "k"), "k = 1"),
        (("section", 0, "deep", "list", 1, "a"), "a = 2"),
        (("section", 1, "text"), "text ="),
        (("section", 1, "quoted"), "quoted ="),
        (("section", 1, "numbers", 2, 1), "   4],"),
        (("section", 1, "numbers", 4, "b"), "b = 5"),
        (("section", 1, "when"), "when ="),
        (("spaced", "out", "last"), "last = true"),
    ],
)
def test_lines_of_keys(path: tuple[str | int, ...], written: str) -> None:
    assert KeyLines(TANGLED).of(path) == line_of(TANGLED, written)


def test_a_missing_key_has_the_line_of_its_table() -> None:
    lines = KeyLines(TANGLED)
    assert lines.of(("section", 0, "deep", "missing")) == line_of(TANGLED, "[section.deep]")
    assert lines.of(("nowhere", "at all")) is None


_scalars = st.one_of(st.integers(), st.booleans(), st.text("ab#[]{}=,.'\\\" \n", max_size=8))
_values = st.recursive(
    _scalars,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text("ab.# ", max_size=3), inner, max_size=3),
)


def written_as_toml(value: Any) -> str:
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{json.dumps(key)} = {written_as_toml(inner)}" for key, inner in value.items()) + " }"
    if isinstance(value, list):
        return "[\n" + "".join(f" {written_as_toml(inner)}, # ]\n" for inner in value) + "]"
    return json.dumps(value)


@given(st.dictionaries(st.text("abc", min_size=1, max_size=3), _values, max_size=4))
def test_lines_of_any_document(document: dict[str, Any]) -> None:
    text = "".join(f"{key} = {written_as_toml(value)}\n" for key, value in document.items())
    assert tomllib.loads(text) == document
    assert set(KeyLines(text).lines) == paths_of(document)


# --- the shipped cases -----------------------------------------------------------------------------------------------


def test_the_demo_case_in_si() -> None:
    case = load_case(CASES / "sandpiper.toml")
    assert case.propeller.diameter == pytest.approx(13.2 * 0.0254)
    assert case.propeller.hub_diameter == 0.028
    assert case.propeller.rpm_limit == 9500
    assert case.propeller.stations.r_over_R[0] == pytest.approx(22.0 / (13.2 * 12.7))
    assert case.air == standard_air(120.0, temperature=285.15)
    assert case.motor is not None
    assert case.motor.speed_constant == pytest.approx(690 * math.pi / 30)
    assert case.motor.no_load == ((10.0, 0.9),)
    assert case.controller is not None
    assert case.controller.switching_time == pytest.approx(60e-9)
    assert case.battery is not None
    assert case.battery.capacity == pytest.approx(18e3)
    assert case.airframe is not None
    assert (case.airframe.cd0, case.airframe.k) == (0.034, 0.052)
    assert case.installation is not None
    assert case.installation.thrust_factor == 0.98
    assert case.envelope_airspeed is None
    assert case.notes == ()
    assert "13.2 x 7" in case.title


def test_the_demo_blade_has_the_pitch_of_its_name() -> None:
    propeller = load_case(CASES / "sandpiper.toml").propeller
    assert pitch_over_diameter(propeller) * propeller.diameter == pytest.approx(7 * 0.0254, rel=0.03)


def test_the_published_blade_has_its_published_geometry() -> None:
    # UIUC Propeller Data Site, volume 2: NR640, 9 in, 15 deg setting; the station at 0.75 R.
    case = load_case(CASES / "nr640_9in.toml")
    stations = case.propeller.stations
    here = int(np.flatnonzero(stations.r_over_R == 0.75)[0])
    assert stations.c_over_R[here] == 0.1237
    assert math.degrees(stations.twist[here]) == pytest.approx(16.359)
    assert stations.t_over_c is not None
    assert stations.t_over_c[0] == 0.36
    assert case.motor is None
    assert case.grid.rpm.tolist() == [3000, 4000, 5000, 6000]
    assert case.grid.advance_ratio[-1] == 0.75


# --- air -------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        ("", standard_air()),
        ('altitude = "2000 ft"', standard_air(609.6)),
        ('altitude = "300 m"\ntemperature_offset = "-3 K"', standard_air(300.0, temperature_offset=-3.0)),
        ('temperature = "30 degC"\npressure = "990 hPa"', standard_air(temperature=303.15, pressure=99e3)),
    ],
)
def test_states_of_the_air(tmp_path: Path, written: str, expected: Any) -> None:
    air = load_case(write_case(tmp_path, CASE + "[air]\n" + written)).air
    assert air.density == pytest.approx(expected.density, rel=1e-12)
    assert air.viscosity == pytest.approx(expected.viscosity, rel=1e-12)


def test_air_outright(tmp_path: Path) -> None:
    text = CASE + '[air]\ndensity = "1.1 kg/m^3"\nviscosity = "1.8e-5 Pa*s"\nspeed_of_sound = "335 m/s"\n'
    air = load_case(write_case(tmp_path, text)).air
    assert (air.density, air.viscosity, air.speed_of_sound, air.temperature) == (1.1, 1.8e-5, 335.0, None)


# --- blade and sections ----------------------------------------------------------------------------------------------


def test_units_of_a_blade_do_not_change_it(tmp_path: Path) -> None:
    lines = [line.split(",") for line in BLADE.splitlines()[1:]]
    inches = "radius_in,chord_cm,twist_rad,thickness_mm\n" + "".join(
        f"{float(r) / 25.4!r},{float(c) / 10!r},{math.radians(float(b))!r},{float(t) * float(c)!r}\n"
        for r, c, b, t in lines
    )
    ratios = "# measured\n\nr_over_R, c_over_R, twist_deg, t_over_c\n" + "".join(
        f"{float(r) / 150!r}, {float(c) / 150!r}, {b}, {t}\n" for r, c, b, t in lines
    )
    wanted = load_case(write_case(tmp_path)).propeller.stations
    for text in (inches, "\ufeff" + ratios, ratios.replace("\n", "\r\n")):
        found = load_case(write_case(tmp_path, files={"blade.csv": text})).propeller.stations
        for name in ("r_over_R", "c_over_R", "twist", "t_over_c"):
            np.testing.assert_allclose(getattr(found, name), getattr(wanted, name), rtol=1e-12)


def test_another_diameter_scales_the_measured_blade(tmp_path: Path) -> None:
    wanted = load_case(write_case(tmp_path)).propeller.stations
    text = CASE.replace('diameter = "300 mm"', 'diameter = "250 mm"\nmeasured_diameter = "300 mm"')
    case = load_case(write_case(tmp_path, text))
    np.testing.assert_array_equal(case.propeller.stations.r_over_R, wanted.r_over_R)
    np.testing.assert_array_equal(case.propeller.stations.c_over_R, wanted.c_over_R)
    assert case.propeller.diameter == 0.25
    assert any("scaled" in notice for notice in case.notices)


def test_the_rounding_of_a_ruler_at_the_tip_is_forgiven(tmp_path: Path) -> None:
    case = load_case(write_case(tmp_path, files={"blade.csv": BLADE.replace("150,8", "150.1,8")}))
    assert case.propeller.stations.r_over_R[-1] == 1.0


def test_a_blade_measured_short_of_the_tip_is_told(tmp_path: Path) -> None:
    case = load_case(write_case(tmp_path, files={"blade.csv": "\n".join(BLADE.splitlines()[:-1])}))
    assert any("held from there to the tip" in note for note in case.notes)


def test_an_unknown_section_is_a_guess_and_said(tmp_path: Path) -> None:
    text = CASE.replace('[[section]]\nfamily = "flat-bottom"\n', "")
    case = load_case(write_case(tmp_path, text))
    assert case.propeller.section_guessed
    (span,) = case.propeller.sections
    assert (span.family, span.camber, span.t_over_c) == ("four-digit", 0.04, 0.11)
    assert case.model.drag_scale == 1.2
    assert any("guess" in note and "as measured" in note for note in case.notes)
    # Thickness as measured, where it was.
    assert case.propeller.stations.t_over_c is not None
    bare = "\n".join(line.rsplit(",", 1)[0] for line in BLADE.splitlines())
    assert any("11 % thick" in note for note in load_case(write_case(tmp_path, text, {"blade.csv": bare})).notes)


def test_a_known_section_has_its_own_drag(tmp_path: Path) -> None:
    assert load_case(write_case(tmp_path)).model.drag_scale == 1.0
    assert load_case(write_case(tmp_path, CASE + "[model]\ndrag_scale = 1.5\n")).model.drag_scale == 1.5


def test_pitch_of_a_true_helix(tmp_path: Path) -> None:
    # A blade of constant pitch p has tan(angle) = p/(2 pi r) at every radius.
    radii = [20, 50, 80, 112.5, 150]
    rows = [f"{r},20,{math.degrees(math.atan(180 / (2 * math.pi * r)))!r}" for r in radii]
    path = write_case(tmp_path, files={"blade.csv": "\n".join(["radius_mm,chord_mm,twist_deg", *rows])})
    propeller = load_case(path).propeller
    assert pitch_over_diameter(propeller) == pytest.approx(0.6, rel=1e-9)
    assert default_advance_ratio_end(propeller) == pytest.approx(0.75)


def test_twist_from_other_lines_is_brought_to_the_chord_line(tmp_path: Path) -> None:
    chord = chord_line_angle(load_case(write_case(tmp_path)).propeller, 0.75)
    face = CASE.replace("rpm_limit", 'twist_reference = "flat face"\nrpm_limit')
    # Clark Y, 11.7 % thick, has its flat face about 2.1 deg below the chord line (from memory).
    steeper = chord_line_angle(load_case(write_case(tmp_path, face)).propeller, 0.75) - chord
    assert math.degrees(steeper) == pytest.approx(2.1 * 0.105 / 0.117, abs=0.3)
    # The invented polars carry no lift at -3 deg, so the chord line lies 3 deg below the zero-lift line.
    zero = CASE.replace("rpm_limit", 'twist_reference = "zero lift"\nrpm_limit')
    zero = zero.replace('family = "flat-bottom"', 'polars = "p.csv"')
    flatter = chord_line_angle(load_case(write_case(tmp_path, zero, {"p.csv": polars()})).propeller, 0.75) - chord
    assert math.degrees(flatter) == pytest.approx(-3.0, abs=1e-9)


def test_polars_with_different_angles_meet_on_common_ones(tmp_path: Path) -> None:
    # The invented lift line is straight, so straight lines between rows return it exactly at any angle.
    coarse = polars(reynolds=(50e3,), alpha=(-8, -4, 2, 8, 12))
    fine = polars(reynolds=(200e3,), alpha=(-5, -1, 0, 5, 9, 14)).split("\n", 1)[1]
    (tmp_path / "p.csv").write_text(coarse + fine)
    found = Complaints()
    table = read_polars(tmp_path / "p.csv", "p.csv", found)
    assert len(found) == 0
    assert table is not None
    degrees = np.degrees(table.alpha)
    np.testing.assert_allclose(degrees, [-5, -4, -1, 0, 2, 5, 8, 9, 12], atol=1e-9)
    np.testing.assert_allclose(table.lift, np.broadcast_to(0.1 * degrees + 0.3, (2, 9)), atol=1e-12)
    assert table.reynolds.tolist() == [50e3, 200e3]


def test_rows_of_polars_in_any_order(tmp_path: Path) -> None:
    header, *rows = polars().splitlines()
    (tmp_path / "p.csv").write_text(polars())
    (tmp_path / "q.csv").write_text("\n".join([header, *rows[::-1]]))
    wanted, found = (read_polars(tmp_path / name, name, Complaints()) for name in ("p.csv", "q.csv"))
    assert wanted is not None
    assert found is not None
    np.testing.assert_array_equal(found.lift, wanted.lift)
    np.testing.assert_array_equal(found.drag, wanted.drag)


def test_sections_along_the_span(tmp_path: Path) -> None:
    text = CASE.replace(
        '[[section]]\nfamily = "flat-bottom"\n',
        '[[section]]\nfrom = 0.1\nto = 0.5\nfamily = "flat-bottom"\n'
        '[[section]]\nfrom = 0.5\nto = 1.0\npolars = "p.csv"\n',
    )
    inner, outer = load_case(write_case(tmp_path, text, {"p.csv": polars()})).propeller.sections
    assert (inner.start, inner.end, inner.family) == (0.1, 0.5, "flat-bottom")
    assert (outer.start, outer.end) == (0.5, 1.0)
    assert outer.polars is not None
    assert outer.polars.source == str(tmp_path / "p.csv")


def test_airframe_by_a_table_of_drag(tmp_path: Path) -> None:
    text = CASE + '[airframe]\nmass = "2 kg"\ndrag = "drag.csv"\n'
    case = load_case(write_case(tmp_path, text, {"drag.csv": "airspeed_km_h,drag_N\n36,2\n72,5\n"}))
    assert case.airframe is not None
    assert case.airframe.drag_table == ((pytest.approx(10.0), 2.0), (pytest.approx(20.0), 5.0))


# --- grid ------------------------------------------------------------------------------------------------------------


def test_default_grid_reaches_past_the_pitch_and_to_the_limit(tmp_path: Path) -> None:
    text = CASE.partition("[grid]")[0]
    case = load_case(write_case(tmp_path, text))
    assert case.grid.advance_ratio.size == 45
    assert case.grid.advance_ratio[0] == 0.0
    ratio = case.grid.advance_ratio[-1] / pitch_over_diameter(case.propeller)
    assert 1.25 <= ratio < 1.25 + 0.05 / pitch_over_diameter(case.propeller)
    assert case.grid.rpm.tolist() == [2500, 5000, 7500, 10000]
    assert len(case.notices) == 2


def test_default_rpm_without_a_limit_is_a_tip_mach_number(tmp_path: Path) -> None:
    text = CASE.partition("[grid]")[0].replace("rpm_limit = 10000\n", "")
    case = load_case(write_case(tmp_path, text))
    rotation, forward = math.pi, case.grid.advance_ratio[-1]
    mach = case.grid.rpm[-1] / 60 * 0.3 * math.hypot(rotation, forward) / case.air.speed_of_sound
    assert 0.59 < mach <= 0.6
    (note,) = [note for note in case.notes if "default" in note]
    assert note == (f"rpm up to {case.grid.rpm[-1]:g} is a default (helical tip Mach number 0.6), no rpm_limit given")


def test_rpm_that_somebody_gave_are_no_default(tmp_path: Path) -> None:
    for text in (CASE.replace("rpm_limit = 10000\n", ""), CASE.partition("[grid]")[0]):
        assert not any("default (helical" in note for note in load_case(write_case(tmp_path, text)).notes)


def test_axes_as_lists_and_ranges(tmp_path: Path) -> None:
    grid = """[grid]
advance_ratio = [0, 0.2, 0.5]
rpm = { from = "50 rev/s", to = 6000, count = 4 }
incidence = ["0 deg", "0.5 rad"]
airspeed = { from = "0 m/s", to = "36 km/h", count = 3 }
throttle = [0.5, 1]
"""
    case = load_case(write_case(tmp_path, CASE.partition("[grid]")[0] + grid))
    assert case.grid.advance_ratio.tolist() == [0, 0.2, 0.5]
    np.testing.assert_allclose(case.grid.rpm, [3000, 4000, 5000, 6000])
    np.testing.assert_allclose(case.grid.incidence, [0, 0.5])
    assert case.envelope_airspeed is not None
    np.testing.assert_allclose(case.envelope_airspeed, [0, 5, 10])
    assert case.envelope_throttle is not None
    assert case.envelope_throttle.tolist() == [0.5, 1.0]


def test_rpm_beyond_the_limit_is_told(tmp_path: Path) -> None:
    case = load_case(write_case(tmp_path, CASE.replace("8000", "12000")))
    assert any("beyond the propeller's limit of 10000 rpm" in note for note in case.notes)


# --- what later commands will use ------------------------------------------------------------------------------------

LATER = """
[sweep]
"propeller.diameter" = ["12 in", "12.5 in"]
"blade.pitch_scale" = { from = 0.8, to = 1.2, count = 9 }
"blade.turn" = ["-1 deg", "0 deg"]
"motor.speed_constant" = ["600 rpm/V"]
"battery.cells_in_series" = [3, 4]
"model.drag_scale" = [1.0, 1.2]
[sweep.bounds]
"static.battery_current" = { max = "40 A" }
[sweep.keep]
table = false
quantities = ["static.thrust", "top_speed.airspeed"]

[uncertainty]
twist = "0.7 deg"
chord = "0.4 mm"
drag_scale = 0.25
zero_lift_angle = "1 deg"
stall_strength = 0.3
speed_constant = 0.02
twist_scatter = "0.5 deg"
"""


def test_sections_of_later_commands_are_checked_and_do_not_hinder(tmp_path: Path) -> None:
    case = load_case(write_case(tmp_path, CASE + DRIVE + LATER))
    assert [notice for notice in case.notices if "[sweep]" in notice or "[uncertainty]" in notice] == [
        "[sweep] is read and checked, and has no effect on the commands of this version",
        "[uncertainty] is read and checked, and has no effect on the commands of this version",
    ]


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('"12.5 in"]', '"12.5"]', "no unit"),
        ('"motor.speed_constant"', '"motor.kv"', "no number of the case has this name"),
        ("[3, 4]", "[3, 0]", "greater than or equal to 1"),
        ('"static.battery_current"', '"statc.battery_current"', "did you mean 'static'"),
        ('"static.thrust"', '"thrust"', "named point and a quantity"),
        ("count = 9", "number = 9", "unknown key"),
        ('twist = "0.7 deg"', 'twist = "0.7 mm"', "does not measure an angle"),
        ("speed_constant = 0.02", "speed_constant = -0.02", "must not be negative"),
        ("table = false", "tabel = false", "did you mean 'table'"),
    ],
)
def test_mistakes_in_sections_of_later_commands(tmp_path: Path, old: str, new: str, words: str) -> None:
    text = CASE + LATER.replace(old, new)
    found = complaints_of(write_case(tmp_path, text))
    assert any(words in line for line in found)
    assert all(line.startswith(f"{line_of(text, new)}: ") for line in found)


# --- the whole ------------------------------------------------------------------------------------------------------


def test_everything_wrong_comes_at_once(tmp_path: Path) -> None:
    text = (
        CASE.replace("blades = 2", "blades = 0\nbladse = 3")
        .replace('"flat-bottom"', '"flat-botom"')
        .replace("rpm = [4000, 8000]", "rpm = [4000, 0]")
        + DRIVE.replace('winding_resistance = "50 mohm"\n', "").replace('"2.2 A*h"', "2.2")
        + '[model]\ninflow = "helical"\nelements = 3\n'
    )
    found = complaints_of(write_case(tmp_path, text, {"blade.csv": BLADE.replace("100,24", "100,0")}))
    for field in (
        "propeller.blades",
        "propeller.bladse",
        "section[1].family",
        "grid.rpm[2]",
        "motor.winding_resistance",
        "battery.capacity",
        "model.inflow",
        "model.elements",
        "chord_mm",
    ):
        assert sum(f": {field}: " in line for line in found) == 1, field
    assert len(found) == 9


def test_a_case_from_standard_input_names_files_from_here(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_case(tmp_path)
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr("sys.stdin", io.TextIOWrapper(io.BytesIO(CASE.encode())))
    case = load_case("-")
    assert case.path == "-"
    assert case.propeller.stations.r_over_R.size == 5


def test_the_schema_can_be_written_as_json() -> None:
    schema = CaseFile.model_json_schema()
    assert json.loads(json.dumps(schema))["required"] == ["propeller"]
    diameter = schema["$defs"]["PropellerSection"]["properties"]["diameter"]
    assert diameter["type"] == "string"
    assert "1.5 mm" in diameter["examples"]
    start = schema["$defs"]["BladeSection"]["properties"]
    assert {"from", "to"} <= set(start)


def test_stations_carry_the_line_of_what_is_wrong(tmp_path: Path) -> None:
    found = Complaints()
    (tmp_path / "b.csv").write_text("# note\n\nradius_mm,chord_mm,twist_deg\n20,18,40\n\n# more\n15,18,100\n")
    assert read_stations(tmp_path / "b.csv", "b.csv", found) is None
    with pytest.raises(CaseError) as caught:
        found.raise_any()
    assert [(c.line, c.field) for c in caught.value.complaints] == [(7, "radius_mm"), (7, "twist_deg")]
