"""Measured points: every way of writing one down means the same, and what is wrong is named with its place."""

from __future__ import annotations

import math
from dataclasses import fields
from pathlib import Path

import numpy as np
import pytest

from bemt.air import standard_air
from bemt.case.readings import Readings, load_readings
from bemt.errors import CaseError, InputError

DIAMETER = 0.25
AIR = standard_air()
GAS_CONSTANT = 287.05287  # J/(kg K), ISO 2533
GRAVITY = 9.80665

PLAIN = """\
rpm,airspeed_m_s,thrust_N,torque_Nm,air_density_kg_m3
6000,0,4.0,0.06,1.20
6000,10,2.5,0.05,1.21
"""


def read(folder: Path, text: str) -> Readings:
    path = folder / "readings.csv"
    path.write_text(text, encoding="utf-8")
    return load_readings(path, diameter=DIAMETER, air=AIR)


def rewritten(header: str, *scales: list[float]) -> str:
    """PLAIN with other columns; scales hold the factor of each cell of a row."""
    rows = [np.array([float(cell) for cell in line.split(",")]) for line in PLAIN.splitlines()[1:]]
    return "\n".join(
        [header, *(",".join(repr(float(v)) for v in row * s) for row, s in zip(rows, scales, strict=True))]
    )


def coefficient_scales(density: float) -> list[float]:
    n = 100.0
    return [
        1.0,
        1.0 / (n * DIAMETER),
        1.0 / (density * n**2 * DIAMETER**4),
        2.0 * math.pi / (density * n**2 * DIAMETER**5),
        1.0,
    ]


OTHER_WORDS = {
    "coefficients": rewritten(
        "rpm,advance_ratio,thrust_coefficient,power_coefficient,air_density_kg_m3",
        coefficient_scales(1.20),
        coefficient_scales(1.21),
    ),
    "a thrust stand's units": rewritten(
        "rpm,airspeed_km_h,thrust_gf,shaft_power_W,air_density_kg_m3",
        *[[1.0, 3.6, 1e3 / GRAVITY, 200.0 * math.pi, 1.0]] * 2,
    ),
    "telemetry": "electrical_rpm,pole_pairs,airspeed_m_s,thrust_N,torque_Nm,air_density_kg_m3\n"
    "42000,7,0,4.0,0.06,1.20\n42000,7,10,2.5,0.05,1.21\n",
}


@pytest.mark.parametrize("name", OTHER_WORDS)
def test_every_way_of_writing_a_point_means_the_same(name: str, tmp_path: Path) -> None:
    plain, other = read(tmp_path, PLAIN), read(tmp_path, OTHER_WORDS[name])
    for field in ("rpm", "airspeed", "thrust", "torque", "density", "viscosity", "speed_of_sound"):
        assert getattr(other, field) == pytest.approx(getattr(plain, field), rel=1e-12), field
    assert plain.thrust == pytest.approx([4.0, 2.5])
    assert plain.torque == pytest.approx([0.06, 0.05])
    assert plain.notes == ()


def test_temperature_and_pressure_make_the_air_of_each_row(tmp_path: Path) -> None:
    readings = read(tmp_path, "rpm,thrust_N,temperature_degC,pressure_hPa,temperature_degC_u,pressure_hPa_u\n"
                              "6000,4,20,1000,1,0\n6000,4,-10,900,0,9\n")  # fmt: skip
    # Ideal gas law for dry air, ISO 2533; the relative uncertainties of a quotient add in squares.
    assert readings.density == pytest.approx([1e5 / (GAS_CONSTANT * 293.15), 9e4 / (GAS_CONSTANT * 263.15)])
    assert readings.speed_of_sound == pytest.approx([math.sqrt(1.4 * GAS_CONSTANT * t) for t in (293.15, 263.15)])
    assert readings.uncertainties["density"] == pytest.approx(readings.density * [1.0 / 293.15, 0.01])


def test_without_air_the_air_of_the_case_serves_and_a_note_says_so(tmp_path: Path) -> None:
    readings = read(tmp_path, "rpm,thrust_N\n6000,4\n")
    assert readings.density == pytest.approx([AIR.density])
    assert readings.airspeed == pytest.approx([0.0])
    assert readings.torque is None
    (note,) = readings.notes
    assert "1.225 kg/m3" in note


def test_uncertainties_follow_their_column_into_si(tmp_path: Path) -> None:
    readings = read(
        tmp_path,
        "rpm,thrust_gf,thrust_gf_u,power_coefficient,power_coefficient_u,advance_ratio,advance_ratio_u,"
        "air_density_kg_m3\n6000,100,5,0.05,0.001,0.4,0.01,1.2\n",
    )
    head = 1.2 * 100.0**2 * DIAMETER**5 / (2.0 * math.pi)
    assert readings.uncertainties["thrust"] == pytest.approx([0.005 * GRAVITY])
    assert readings.uncertainties["torque"] == pytest.approx([0.001 * head])
    assert readings.uncertainties["airspeed"] == pytest.approx([0.01 * 100.0 * DIAMETER])


def test_supply_side_columns_are_kept(tmp_path: Path) -> None:
    readings = read(tmp_path, "rpm,voltage_V,current_mA,duty,electric_power_kW\n6000,16,2500,0.5,0.04\n")
    found = [readings.voltage, readings.current, readings.duty, readings.electric_power]
    assert found == [pytest.approx([value]) for value in (16.0, 2.5, 0.5, 40.0)]


def test_a_freely_spinning_propeller_is_a_row_without_torque(tmp_path: Path) -> None:
    assert read(tmp_path, "rpm,airspeed_m_s,torque_Nm\n3000,20,0\n").torque == pytest.approx([0.0])


def test_several_files_count_as_one(tmp_path: Path) -> None:
    still = read(tmp_path, "rpm,thrust_N\n6000,4\n")
    moving = read(tmp_path, "rpm,airspeed_m_s,torque_Nm,torque_Nm_u\n5000,8,0.05,0.001\n4000,9,0.04,0.001\n")
    both = Readings.joined([still, moving])
    assert both.rpm == pytest.approx([6000.0, 5000.0, 4000.0])
    assert both.thrust == pytest.approx([4.0, math.nan, math.nan], nan_ok=True)
    assert both.torque == pytest.approx([math.nan, 0.05, 0.04], nan_ok=True)
    assert both.uncertainties["torque"] == pytest.approx([math.nan, 0.001, 0.001], nan_ok=True)
    assert both.voltage is None
    assert len(both.notes) == 1
    last = both.only(both.rpm < 5500.0)
    assert last.rpm == pytest.approx([5000.0, 4000.0])
    assert last.torque == pytest.approx([0.05, 0.04])
    assert last.uncertainties["torque"] == pytest.approx([0.001, 0.001])
    assert {field.name for field in fields(both)} == {field.name for field in fields(still)}


# Name: file, line and field that must be named, words that must be there.
WRONG: dict[str, tuple[str, int, str, str]] = {
    "misspelt ratio": ("rpm,thrust_coefficent\n6000,0.1\n", 1, "thrust_coefficent", "'thrust_coefficient'"),
    "misspelt quantity": ("rpm,trust_N\n6000,4\n", 1, "trust_N", "'thrust_N'"),
    "extra column": ("rpm,thrust_N,operator\n6000,4,5\n", 1, "operator", "unknown column"),
    "no unit": ("rpm,thrust\n6000,4\n", 1, "thrust", "thrust_N"),
    "wrong unit": ("rpm,torque_N\n6000,4\n", 1, "torque_N", "measure a torque"),
    "no rpm": ("thrust_N\n4\n", 1, "rpm", "missing"),
    "rpm twice": ("rpm,electrical_rpm,pole_pairs,thrust_N\n6000,42000,7,4\n", 1, "electrical_rpm", "same as rpm"),
    "thrust twice": ("rpm,thrust_N,thrust_gf\n6000,4,400\n", 1, "thrust_gf", "the same quantity"),
    "thrust as force and coefficient": (
        "rpm,thrust_N,thrust_coefficient\n6000,4,0.1\n", 1, "thrust_coefficient", "same as thrust_N",
    ),
    "torque and power": ("rpm,torque_Nm,shaft_power_W\n6000,1,2\n", 1, "shaft_power_W", "same as torque_Nm"),
    "speed twice": ("rpm,airspeed_m_s,advance_ratio,thrust_N\n6000,1,2,3\n", 1, "advance_ratio", "as airspeed_m_s"),
    "air twice": (
        "rpm,thrust_N,air_density_kg_m3,temperature_degC,pressure_hPa\n6000,4,1.2,20,1000\n", 1, "temperature_degC",
        "same as air_density_kg_m3",
    ),
    "pole pairs missing": ("electrical_rpm,thrust_N\n42000,4\n", 1, "electrical_rpm", "pole_pairs"),
    "pole pairs alone": ("rpm,pole_pairs,thrust_N\n6000,7,4\n", 1, "pole_pairs", "electrical_rpm"),
    "temperature alone": ("rpm,thrust_N,temperature_degC\n6000,4,20\n", 1, "temperature_degC", "pressure_hPa"),
    "half a pole pair": ("electrical_rpm,pole_pairs,thrust_N\n42000,3.5,4\n", 2, "pole_pairs", "count of pole pairs"),
    "uncertainty of nothing": ("rpm,thrust_N,torque_Nm_u\n6000,4,1\n", 1, "torque_Nm_u", "not there"),
    "negative uncertainty": ("rpm,thrust_N,thrust_N_u\n6000,4,-1\n", 2, "thrust_N_u", "negative"),
    "nothing measured": ("rpm,airspeed_m_s\n6000,4\n", 1, "thrust", "nothing measured"),
    "empty cell": ("rpm,airspeed_m_s,thrust_N\n6000,,4\n", 2, "airspeed_m_s", "is empty"),
    "rpm of zero": ("rpm,thrust_N\n0,4\n", 2, "rpm", "more than 0"),
    "backwards": ("rpm,airspeed_m_s,thrust_N\n6000,-1,4\n", 2, "airspeed_m_s", "negative"),
    "duty in per cent": ("rpm,thrust_N,duty\n6000,4,50\n", 2, "duty", "between 0 and 1"),
    "no weather": ("rpm,thrust_N,temperature_degC,pressure_hPa\n6000,4,400,1000\n", 2, "temperature_degC", "K"),
    "only a header": ("rpm,thrust_N\n", 1, "", "no rows"),
}  # fmt: skip


@pytest.mark.parametrize("name", WRONG)
def test_what_is_wrong_is_named_with_its_place(name: str, tmp_path: Path) -> None:
    text, line, field, words = WRONG[name]
    with pytest.raises(CaseError) as raised:
        read(tmp_path, text)
    assert raised.value.exit_code == 3
    complaint = next(c for c in raised.value.complaints if c.field == field)
    assert complaint.line == line
    assert complaint.file.endswith("readings.csv")
    assert words in complaint.message


def test_every_complaint_comes_at_once(tmp_path: Path) -> None:
    with pytest.raises(CaseError) as raised:
        read(tmp_path, "rpm,advance_ratio,thrust_N,thrust_coefficient\n-1,0.2,4,0.1\n6000,-0.1,4,x\n")
    places = [(complaint.line, complaint.field) for complaint in raised.value.complaints]
    assert places == [(1, "thrust_coefficient"), (2, "rpm"), (3, "thrust_coefficient"), (3, "advance_ratio")]


def test_a_file_that_is_not_there_is_said(tmp_path: Path) -> None:
    with pytest.raises(CaseError, match="no such file"):
        load_readings(tmp_path / "none.csv", diameter=DIAMETER, air=AIR)


def test_readings_made_in_python_are_checked() -> None:
    one = np.ones(1)
    with pytest.raises(InputError, match="rpm"):
        Readings("x", 0.0 * one, one, one, one, one)
    with pytest.raises(InputError, match="airspeed"):
        Readings("x", one, -one, one, one, one)
    with pytest.raises(InputError, match="shape"):
        Readings("x", one, one, one, one, one, thrust=np.ones(2))
