"""Wrong inputs end in one clear line each, with file, line and field, exit code 3, and nothing written."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest
from case_files import BLADE, CASE, DRIVE, line_of, polars, write_case
from click.testing import CliRunner

from bemt.cli.main import main

OWN_POLARS = CASE.replace('family = "flat-bottom"', 'polars = "p.csv"')


def without(text: str, column: int) -> str:
    return "\n".join(",".join(c for i, c in enumerate(line.split(",")) if i != column) for line in text.splitlines())


# Name: case, data files, file and line and field that must be named, words that must be there.
WRONG: dict[str, tuple[str, dict[str, str | bytes], str, int | None, str, str]] = {
    # The blade.
    "missing column": (CASE, {"blade.csv": without(BLADE, 2)}, "blade.csv", 1, "twist_deg", "column is missing"),
    "chord of zero": (CASE, {"blade.csv": BLADE.replace("100,24", "100,0")}, "blade.csv", 4, "chord_mm", "more than 0"),
    "unsorted radii": (CASE, {"blade.csv": BLADE.replace("100,", "55,")}, "blade.csv", 4, "radius_mm", "ascend"),
    "station twice": (CASE, {"blade.csv": BLADE.replace("100,", "60,")}, "blade.csv", 4, "radius_mm", "twice"),
    "radius beyond the tip": (
        CASE, {"blade.csv": BLADE.replace("150,", "155,")}, "blade.csv", 6, "radius_mm", "beyond",
    ),
    "twist beyond 90 deg": (CASE, {"blade.csv": BLADE.replace(",42,", ",-95,")}, "blade.csv", 2, "twist_deg", "90 deg"),
    "empty cell": (CASE, {"blade.csv": BLADE.replace("60,25,", "60,,")}, "blade.csv", 3, "chord_mm", "is empty"),
    "word for a number": (
        CASE, {"blade.csv": BLADE.replace("60,25,", "60,wide,")}, "blade.csv", 3, "chord_mm", "'wide'",
    ),
    "nan in a cell": (
        CASE, {"blade.csv": BLADE.replace("60,25,", "60,nan,")}, "blade.csv", 3, "chord_mm", "not a number",
    ),
    "row too short": (CASE, {"blade.csv": BLADE.replace("60,25,24,", "60,25,")}, "blade.csv", 3, "", "3 cells"),
    "unknown column": (
        CASE, {"blade.csv": BLADE.replace("chord_mm", "cord_mm")}, "blade.csv", 1, "cord_mm", "'chord_mm'",
    ),
    "column without unit": (
        CASE, {"blade.csv": BLADE.replace("chord_mm", "chord")}, "blade.csv", 1, "chord", "chord_mm",
    ),
    "column with a wrong unit": (
        CASE, {"blade.csv": BLADE.replace("chord_mm", "chord_kg")}, "blade.csv", 1, "chord_kg", "measure a length",
    ),
    "column twice": (CASE, {"blade.csv": BLADE.replace("t_over_c", "chord_cm")}, "blade.csv", 1, "chord_cm", "same"),
    "radius both ways": (
        CASE, {"blade.csv": BLADE.replace("t_over_c", "r_over_R")}, "blade.csv", 1, "radius_mm", "not both",
    ),
    "semicolons": (CASE, {"blade.csv": BLADE.replace(",", ";")}, "blade.csv", 1, "", "commas"),
    "only a header": (CASE, {"blade.csv": BLADE.splitlines()[0]}, "blade.csv", 1, "", "no rows"),
    "one station": (CASE, {"blade.csv": "\n".join(BLADE.splitlines()[:2])}, "blade.csv", 2, "", "at least two"),
    "empty data file": (CASE, {"blade.csv": "# nothing\n"}, "blade.csv", None, "", "is empty"),
    "data file not UTF-8": (CASE, {"blade.csv": b"radius_mm\n\xff\xfe"}, "blade.csv", 2, "", "UTF-8"),
    "data file not there": (
        CASE.replace("blade.csv", "blad.csv"), {}, "case.toml", 6, "propeller.stations", "no such file",
    ),
    # The polars.
    "one Reynolds number": (OWN_POLARS, {"p.csv": polars(reynolds=(1e5,))}, "p.csv", 2, "reynolds", "at least two"),
    "angles too narrow": (
        OWN_POLARS,
        {"p.csv": polars((5e4,)) + polars((2e5,), (-2, 0, 4, 8)).split("\n", 1)[1]},
        "p.csv", 9, "alpha_deg", "at least from -4 to 12 deg",
    ),
    "drag of zero": (
        OWN_POLARS, {"p.csv": polars() + "200000,18,1.0,0\n"}, "p.csv", 16, "cd", "more than 0",
    ),
    "point twice": (OWN_POLARS, {"p.csv": polars() + "50000,0,0.3,0.02\n"}, "p.csv", 16, "alpha_deg", "line 4 already"),
    "polars without drag": (OWN_POLARS, {"p.csv": without(polars(), 3)}, "p.csv", 1, "cd", "column is missing"),
    # Keys and values of the case.
    "unknown key": (CASE.replace("blades", "blads"), {}, "case.toml", 4, "propeller.blads", "did you mean 'blades'"),
    "unknown section": (CASE + "[moter]\n", {}, "case.toml", 15, "moter", "did you mean 'motor'"),
    "unit missing": (CASE.replace('"300 mm"', "300"), {}, "case.toml", 5, "propeller.diameter", "mm, cm, m, in, ft"),
    "unit of something else": (CASE.replace("300 mm", "300 g"), {}, "case.toml", 5, "propeller.diameter", "length"),
    "diameter of zero": (CASE.replace("300 mm", "0 mm"), {}, "case.toml", 5, "propeller.diameter", "more than 0"),
    "rpm of zero": (CASE.replace("[4000,", "[0,"), {}, "case.toml", 14, "grid.rpm[1]", "more than 0"),
    "rpm that falls": (CASE.replace("[4000,", "[9000,"), {}, "case.toml", 14, "grid.rpm", "ascend"),
    "rpm in Hz": (CASE.replace("= 10000", '= "160 Hz"'), {}, "case.toml", 7, "propeller.rpm_limit", "rev/s"),
    "descent at incidence": (
        CASE.replace("from = 0.0", "from = -0.1") + 'incidence = ["5 deg"]\n', {},
        "case.toml", 13, "grid.advance_ratio", "axial flow only",
    ),
    "half a blade": (
        CASE.replace("blades = 2", "blades = 2.5"), {}, "case.toml", 4, "propeller.blades", "whole number",
    ),
    "not a number": (CASE + "[model]\nstall_strength = nan\n", {}, "case.toml", 16, "model.stall_strength", "finite"),
    "hub as large as the propeller": (
        CASE.replace("rpm_limit", 'hub_diameter = "30 cm"\nrpm_limit'), {},
        "case.toml", 7, "propeller.hub_diameter", "hub",
    ),
    "no such family": (CASE.replace("flat-b", "flat_b"), {}, "case.toml", 10, "section[1].family", "did you mean"),
    "no section at the tip": (
        CASE.replace('"flat-bottom"', '"flat-bottom"\nto = 0.9'), {}, "case.toml", 11, "section[1].to", "tip",
    ),
    "no section at the root": (
        CASE.replace('"flat-bottom"', '"flat-bottom"\nfrom = 0.3'), {}, "case.toml", 11, "section[1].from", "root",
    ),
    "no propeller": ("title = 'x'\n", {}, "case.toml", None, "", "[propeller] is missing"),
    "no stations": (
        CASE.replace('stations = "blade.csv"\n', ""), {}, "case.toml", 3, "propeller.stations", "measured stations",
    ),
    "no stations, and a key of a similar name": (
        CASE.replace('stations = "blade.csv"', 'rotation = "left"'), {},
        "case.toml", 3, "propeller.stations", "measured stations",
    ),
    "stations misspelt": (
        CASE.replace("stations", "staitons"), {}, "case.toml", 6, "propeller.staitons", "did you mean 'stations'",
    ),
    "one pair of brackets": (
        CASE.replace("[[section]]", "[section]"), {}, "case.toml", 9, "section", "[[section]] with double brackets",
    ),
    "not TOML": (CASE.replace("blades = 2", "blades = two"), {}, "case.toml", 4, "", "not valid TOML"),
    "TOML that ends too early": (CASE + "rpm = [1, 2", {}, "case.toml", 15, "", "not valid TOML"),
    "flat face of an unknown shape": (
        OWN_POLARS.replace("rpm_limit", 'twist_reference = "flat face"\nrpm_limit'),
        {"p.csv": polars()}, "case.toml", 7, "propeller.twist_reference", "chord line",
    ),
    # The air.
    "air twice": (
        CASE + '[air]\ntemperature = "10 degC"\ntemperature_offset = "3 K"\n', {},
        "case.toml", 17, "air.temperature_offset", "one of the two",
    ),
    "half of the air": (CASE + '[air]\ndensity = "1.1 kg/m^3"\n', {}, "case.toml", 16, "air.density", "viscosity"),
    "air in space": (CASE + '[air]\naltitude = "50 km"\n', {}, "case.toml", 16, "air.altitude", "20000 m"),
    # The drive and the airframe.
    "motor without resistance": (
        CASE + DRIVE.replace('winding_resistance = "50 mohm"\n', ""), {},
        "case.toml", 15, "motor.winding_resistance", "between two leads",
    ),
    "motor that would not turn": (
        CASE + DRIVE.replace("50 mohm", "50 ohm"), {}, "case.toml", 18, "motor.no_load", "would not turn",
    ),
    "capacity as a current": (CASE + DRIVE.replace("A*h", "A"), {}, "case.toml", 22, "battery.capacity", "current"),
    "throttle map that falls": (
        CASE + DRIVE + "[controller]\nthrottle_map = [[0.0, 0.5], [1.0, 0.2]]\n", {},
        "case.toml", 25, "controller.throttle_map", "rise",
    ),
    "airframe without drag": (
        CASE + '[airframe]\nmass = "2 kg"\n', {}, "case.toml", 15, "airframe.drag", "cd0",
    ),
    "hovering with a wing": (
        CASE + '[airframe]\nmass = "2 kg"\nhover = true\nwing_area = "0.5 m^2"\n', {},
        "case.toml", 18, "airframe.wing_area", "hovering airframe has no wing",
    ),
    "hovering with a stall": (
        CASE + '[airframe]\nmass = "2 kg"\nhover = true\ncl_max = 1.2\n', {},
        "case.toml", 18, "airframe.cl_max", "hovering airframe has no wing",
    ),
    "hovering in cruise": (
        CASE + '[airframe]\nmass = "2 kg"\nhover = true\ncruise_speed = "12 m/s"\n', {},
        "case.toml", 18, "airframe.cruise_speed", "hovering airframe has no wing",
    ),
    "hovering with a polar": (
        CASE + '[airframe]\nmass = "2 kg"\nhover = true\ndrag = { cd0 = 0.03, k = 0.05 }\n', {},
        "case.toml", 18, "airframe.drag", "belong to a wing",
    ),
    "hovering without a mass": (
        CASE + "[airframe]\nhover = true\n", {}, "case.toml", 15, "airframe.mass", "missing",
    ),
    "drag while hovering": (
        CASE + '[airframe]\nmass = "2 kg"\nhover = true\ndrag = "d.csv"\n',
        {"d.csv": "airspeed_m_s,drag_N\n0,1\n5,2\n"}, "case.toml", 18, "airframe.drag", "begins above",
    ),
    # The models.
    "misspelt law": (
        CASE + '[model]\npost_stall = "virtena"\n', {}, "case.toml", 16, "model.post_stall", "viterna",
    ),
    # What this version does not do.
    "section by shape": (
        CASE.replace('family = "flat-bottom"', 'shape = "NACA 4412"'), {},
        "case.toml", 10, "section[1].shape", "not available",
    ),
    "label of a motor": (
        CASE + '[motor]\nspeed_constant = "900 rpm/V"\nlabel_only = true\nlabel = "28-14"\n', {},
        "case.toml", 18, "motor.label", "four digits",
    ),
    "stator without height": (
        CASE + '[motor]\nspeed_constant = "900 rpm/V"\nlabel_only = true\nlabel = "2800"\n', {},
        "case.toml", 18, "motor.label", "28 by 0 mm",
    ),
    "winding too hot": (
        CASE + '[motor]\nspeed_constant = "900 rpm/V"\nlabel_only = true\nwinding_temperature = "400 degC"\n', {},
        "case.toml", 18, "motor.winding_temperature", "400 degC",
    ),
    "inductance without frequency": (
        CASE + '[motor]\nspeed_constant = "900 rpm/V"\nlabel_only = true\nwinding_inductance = "25 uH"\n', {},
        "case.toml", 18, "motor.winding_inductance", "switching_frequency",
    ),
    "regeneration through diodes": (
        CASE + '[controller]\nunpowered = "regenerate"\ndiode_voltage = "0.7 V"\n', {},
        "case.toml", 17, "controller.diode_voltage", "regeneration",
    ),
    "frozen battery": (
        CASE + '[battery]\ncells_in_series = 4\ncapacity = "5 A*h"\ncell_resistance = "2 mohm"\n'
        'temperature = "-50 degC"\n', {},
        "case.toml", 19, "battery.temperature", "-50 degC",
    ),
    "a correction": (CASE + "[correction]\ndrag_scale = 1.1\n", {}, "case.toml", 15, "correction", "not available"),
}  # fmt: skip


@pytest.mark.parametrize("name", WRONG)
def test_one_clear_line(name: str, tmp_path: Path) -> None:
    case, files, file, line, field, words = WRONG[name]
    path = write_case(tmp_path, case, files)
    before = sorted(tmp_path.iterdir())
    done = CliRunner().invoke(main, ["table", str(path), "-o", str(tmp_path / "out.nc")])
    assert done.exit_code == 3, done.output
    assert done.stdout == ""
    (message,) = done.stderr.splitlines()
    place = str(tmp_path / file) + ("" if line is None else f":{line}")
    assert message.startswith(f"{place}: {field + ': ' if field else ''}"), message
    assert words in message
    assert sorted(tmp_path.iterdir()) == before


@pytest.mark.parametrize("command", ["check", "table", "envelope"])
def test_every_command_says_the_same(command: str, tmp_path: Path) -> None:
    path = write_case(tmp_path, CASE.replace("300 mm", "300"))
    done = CliRunner().invoke(main, [command, str(path)])
    assert done.exit_code == 3
    assert "propeller.diameter" in done.stderr
    assert len(done.stderr.splitlines()) == 1


def test_no_traceback_from_a_real_process(tmp_path: Path) -> None:
    path = write_case(tmp_path, CASE.replace("blades = 2", "blades = 0"))
    done = subprocess.run(
        [sys.executable, "-m", "bemt", "check", str(path)], capture_output=True, text=True, check=False
    )
    assert done.returncode == 3
    assert done.stdout == ""
    assert done.stderr == f"{path}:4: propeller.blades: 0 must be at least 1\n"


@pytest.mark.parametrize("command", ["check", "table", "envelope"])
def test_a_case_that_is_not_there_is_wrong_usage(command: str, tmp_path: Path) -> None:
    done = CliRunner().invoke(main, [command, str(tmp_path / "none.toml")])
    assert done.exit_code == 2
    assert "none.toml" in done.stderr


def test_a_case_that_cannot_be_read(tmp_path: Path) -> None:
    path = tmp_path / "case.toml"
    path.write_bytes(b'title = "M\xfchle"\n')
    done = CliRunner().invoke(main, ["table", str(path), "-o", str(tmp_path / "out.nc")])
    assert done.exit_code == 3
    assert done.stderr == f"{path}:1: is not UTF-8 text\n"
    assert not (tmp_path / "out.nc").exists()


def test_a_data_file_that_is_a_folder(tmp_path: Path) -> None:
    path = write_case(tmp_path, CASE.replace("blade.csv", "folder"))
    (tmp_path / "folder").mkdir()
    done = CliRunner().invoke(main, ["table", str(path)])
    assert done.exit_code == 3
    assert done.stderr == f"{tmp_path / 'folder'}: is a directory; a file is needed\n"


def test_a_data_file_nobody_may_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(self: Path) -> bytes:  # a test may run as root, whom no permission stops
        raise PermissionError(13, "Permission denied", str(self))

    path = write_case(tmp_path)
    read = Path.read_bytes
    monkeypatch.setattr(Path, "read_bytes", lambda self: refuse(self) if self.name == "blade.csv" else read(self))
    done = CliRunner().invoke(main, ["table", str(path)])
    assert done.exit_code == 3
    assert done.stderr == f"{tmp_path / 'blade.csv'}: cannot be read: Permission denied\n"


def test_lines_are_counted_in_files_with_any_line_ends(tmp_path: Path) -> None:
    text = CASE.replace("300 mm", "300")
    for ends in ("\r\n", "\n"):
        path = write_case(tmp_path, text.replace("\n", ends))
        done = CliRunner().invoke(main, ["check", str(path)])
        assert done.stderr.startswith(f"{path}:{line_of(text, 'diameter')}: propeller.diameter: ")
