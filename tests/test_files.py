"""Files are read back with libraries that know nothing of ours: netCDF4, the csv module, numpy."""

from __future__ import annotations

import csv
import os
from dataclasses import replace
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import shipped
import synthetic
import xarray as xr

import bemt
from bemt.errors import InputError, RunError
from bemt.files import check_data_target, read, write
from bemt.files.text import coefficient_text, envelope_text, unconverged
from bemt.quantities.dataset import build_dataset
from bemt.quantities.registry import ENVELOPE, ENVELOPE_WITHOUT_MOTOR, LOOKUP, RADIAL, TABLE, TRUST_REASONS, by_name
from bemt.table.grid import Grid


def leftovers(folder: Path, *expected: str) -> list[str]:
    return sorted(set(os.listdir(folder)) - set(expected))


def test_netcdf_holds_every_number_and_the_registrys_words(tmp_path: Path) -> None:
    table = synthetic.coefficient_table(radial=True)
    (path,) = write(table, tmp_path / "table.nc", history="table case.toml")
    known = by_name(TABLE + RADIAL + LOOKUP)
    with netCDF4.Dataset(path) as file:
        assert file.data_model == "NETCDF4"
        file.set_auto_mask(False)
        for name, variable in table.data_vars.items():
            stored = file.variables[name]
            assert stored.dimensions == known[name].dimensions
            assert stored.units == known[name].units
            assert stored.long_name == known[name].long_name
            np.testing.assert_array_equal(stored[:], variable.values)
        assert file.title == synthetic.ATTRS["title"]
        assert file.Conventions.startswith("CF-")
        assert "J = V/(nD)" in file.definitions
        assert file.source.startswith("bemt ")
        assert file.history.endswith("table case.toml")
        assert len(file.history.splitlines()) == 1
    assert leftovers(tmp_path, "table.nc") == []


def test_flags_have_the_type_of_their_variable_as_cf_asks(tmp_path: Path) -> None:
    # CF conventions 3.5: flag_values and flag_masks have the type of the variable; one meaning for each.
    table = synthetic.coefficient_table()
    table["status"] = table["status"].astype(np.int64)
    (path,) = write(table, tmp_path / "table.nc")
    with netCDF4.Dataset(path) as file:
        for name, attribute in (("status", "flag_values"), ("trust", "flag_values"), ("trust_reasons", "flag_masks")):
            variable = file.variables[name]
            codes = variable.getncattr(attribute)
            assert codes.dtype == variable.dtype
            assert len(variable.flag_meanings.split()) == codes.size
        for coordinate in ("rpm", "advance_ratio"):
            assert "_FillValue" not in file.variables[coordinate].ncattrs()


def test_envelope_goes_through_netcdf_and_back(tmp_path: Path) -> None:
    run = synthetic.envelope()
    write(run, tmp_path / "run.nc")
    back = read(tmp_path / "run.nc")
    assert set(back.variables) == set(run.variables)
    for name, variable in run.variables.items():
        np.testing.assert_array_equal(back[name].values.astype(variable.dtype), variable.values)
        assert back[name].attrs["long_name"] == variable.attrs["long_name"]
    # Its units are "s": a reader that decodes times would turn it into a duration.
    assert back["endurance"].dtype.kind == "f"


def test_history_grows_by_one_line_each_time(tmp_path: Path) -> None:
    write(synthetic.coefficient_table(), tmp_path / "a.nc", history="first")
    write(read(tmp_path / "a.nc"), tmp_path / "b.nc", history="second")
    lines = read(tmp_path / "b.nc").attrs["history"].splitlines()
    assert [line.rsplit(" ", 1)[1] for line in lines] == ["first", "second"]


def test_same_result_same_bytes(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "1700000000")  # 2023-11-14T22:13:20Z
    for name in ("a.nc", "b.nc"):
        write(synthetic.coefficient_table(), tmp_path / name)
    assert (tmp_path / "a.nc").read_bytes() == (tmp_path / "b.nc").read_bytes()
    assert read(tmp_path / "a.nc").attrs["history"].startswith("2023-11-14T22:13:20Z")


def test_csv_gives_one_tidy_table_for_each_set_of_dimensions(tmp_path: Path) -> None:
    table = synthetic.coefficient_table(rpm=(3000.0, 6000.0), count=5, radial=True)
    paths = write(table, tmp_path / "table.csv")
    assert [path.name for path in paths] == ["table.csv", "table_rpm.csv", "table_radial.csv"]
    assert leftovers(tmp_path, *(path.name for path in paths)) == []

    with paths[0].open(newline="", encoding="utf-8") as stream:
        rows = list(csv.DictReader(stream))
    assert len(rows) == 2 * 5
    assert not any(name.startswith("lookup") for name in rows[0])
    for index, row in enumerate(rows):
        i, j = divmod(index, 5)
        assert float(row["rpm"]) == table["rpm"].values[i]
        assert float(row["advance_ratio"]) == table["advance_ratio"].values[j]
        # Text and back is exact, not nearly so.
        assert float(row["thrust_coefficient"]) == table["thrust_coefficient"].values[i, j]
        efficiency = table["efficiency"].values[i, j]
        assert row["efficiency"] == "" if np.isnan(efficiency) else float(row["efficiency"]) == efficiency
        assert row["status"] == "converged"
        bits = int(table["trust_reasons"].values[i, j])
        assert row["trust_reasons"].split() == [word for bit, word in TRUST_REASONS.items() if bits & bit]
    with paths[2].open(newline="", encoding="utf-8") as stream:
        radial = list(csv.DictReader(stream))
    assert len(radial) == 2 * 5 * 7
    assert float(radial[8]["thrust_loading"]) == table["thrust_loading"].values[0, 1, 1]


def test_csv_keeps_to_rfc_4180(tmp_path: Path) -> None:
    run = synthetic.envelope()
    paths = write(run, tmp_path / "run.csv")
    assert [path.name for path in paths] == ["run.csv", "run_level.csv", "run_points.csv"]
    for path in paths:
        raw = path.read_bytes()
        assert raw.endswith(b"\r\n")
        assert raw.count(b"\n") == raw.count(b"\r\n")
        counts = {len(row) for row in csv.reader(raw.decode("utf-8").splitlines(), strict=True)}
        assert len(counts) == 1
    level = np.genfromtxt(tmp_path / "run_level.csv", delimiter=",", names=True)
    np.testing.assert_array_equal(level["drag"], run["drag"].values)


def test_csv_rows_follow_dimensions_even_where_the_array_is_turned(tmp_path: Path) -> None:
    table = synthetic.coefficient_table(rpm=(3000.0, 6000.0), count=4)
    turned = table.transpose("advance_ratio", "rpm", ...)
    (path, *_) = write(turned, tmp_path / "turned.csv")
    with path.open(newline="", encoding="utf-8") as stream:
        for row in csv.DictReader(stream):
            at = table.sel(rpm=float(row["rpm"]), advance_ratio=float(row["advance_ratio"]))
            assert float(row["power_coefficient"]) == float(at["power_coefficient"])


@pytest.mark.parametrize("name", ["table.nc", "table.csv"])
def test_a_failed_write_leaves_what_was_there(tmp_path: Path, name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    table = synthetic.coefficient_table()
    paths = write(table, tmp_path / name)
    before = {path: path.read_bytes() for path in paths}

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", full)
    with pytest.raises(RunError, match="No space left"):
        write(table.isel(rpm=slice(1)), tmp_path / name)
    assert {path: path.read_bytes() for path in paths} == before
    assert leftovers(tmp_path, *(path.name for path in paths)) == []


def test_an_error_half_way_leaves_nothing(tmp_path: Path) -> None:
    table = synthetic.coefficient_table().assign_attrs(case={"netCDF": "cannot hold a dict"})
    with pytest.raises(TypeError):
        write(table, tmp_path / "table.nc")
    assert leftovers(tmp_path) == []


def test_targets_that_cannot_be_files_are_refused_before_anything_is_computed(tmp_path: Path) -> None:
    with pytest.raises(RunError, match="there is no folder"):
        check_data_target(tmp_path / "missing" / "table.nc")
    (tmp_path / "folder.nc").mkdir()
    with pytest.raises(RunError, match="not a plain file"):
        check_data_target(tmp_path / "folder.nc")
    pipe = tmp_path / "pipe.csv"
    os.mkfifo(pipe)
    with pytest.raises(RunError, match="not a plain file"):
        check_data_target(pipe)
    assert pipe.is_fifo()


def test_a_link_is_written_through(tmp_path: Path) -> None:
    (tmp_path / "link.csv").symlink_to(tmp_path / "real.csv")
    (tmp_path / "real.csv").write_text("old", encoding="utf-8")
    write(synthetic.coefficient_table(), tmp_path / "link.csv")
    assert (tmp_path / "link.csv").is_symlink()
    assert (tmp_path / "real.csv").read_text(encoding="utf-8").startswith("rpm,advance_ratio,")


@pytest.mark.parametrize("name", ["table", "table.xlsx", "table.txt"])
def test_an_unknown_ending_is_answered_with_those_that_fit(tmp_path: Path, name: str) -> None:
    with pytest.raises(InputError, match=r"\.nc, \.csv"):
        write(synthetic.coefficient_table(), tmp_path / name)


def test_reading_what_is_no_netcdf_file(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no such file"):
        read(tmp_path / "none.nc")
    (tmp_path / "text.nc").write_text("rpm,thrust\n", encoding="utf-8")
    with pytest.raises(InputError, match="not a netCDF file"):
        read(tmp_path / "text.nc")


def test_printed_table_shows_the_numbers_of_the_dataset() -> None:
    table = synthetic.coefficient_table(rpm=(3000.0, 6000.0), count=5)
    text = coefficient_text(table)
    for i, rpm in enumerate(table["rpm"].values):
        block = text.split(f"{rpm:.0f} rpm:")[1].splitlines()
        assert block[0] == ""
        summary = next(line.split() for line in text.splitlines() if line.split()[:1] == [f"{rpm:.0f}"])
        still = table.isel(rpm=i, advance_ratio=0)
        assert summary[1:3] == [f"{float(still[name]):.4f}" for name in ("thrust_coefficient", "power_coefficient")]
        assert summary[3:] == [
            f"{float(table[name][i]):.3f}"
            for name in (
                "static_figure_of_merit",
                "zero_thrust_advance_ratio",
                "peak_efficiency",
                "peak_efficiency_advance_ratio",
            )
        ]
        for j in range(5):
            J, CT, CP, eta, grade, *_ = block[2 + j].split()
            here = table.isel(rpm=i, advance_ratio=j)
            assert J == f"{float(here['advance_ratio']):.3f}"
            assert CT == f"{float(here['thrust_coefficient']):.4f}"
            assert CP == f"{float(here['power_coefficient']):.4f}"
            assert eta == ("-" if np.isnan(here["efficiency"]) else f"{float(here['efficiency']):.3f}")
            assert grade in {"good", "fair", "poor"}
    assert "shown" not in text


def test_long_printed_tables_are_thinned_and_keep_both_ends() -> None:
    table = synthetic.coefficient_table(rpm=(3000.0,), count=101)
    lines = coefficient_text(table).splitlines()
    start = lines.index("3000 rpm:")
    rows = [line.split() for line in lines[start + 2 : lines.index("", start)]]
    assert len(rows) <= 17
    assert (rows[0][0], rows[-1][0]) == ("0.000", "1.100")
    assert any(f"{len(rows)} of 101 advance ratios shown" in line for line in lines)


def test_printed_envelope_marks_what_is_beyond_a_limit() -> None:
    run = synthetic.envelope()
    text = envelope_text(run)
    static = next(line for line in text.splitlines() if line.startswith("static"))
    assert float(run["point_motor_current"].values[0]) > 42.0
    assert f"{float(run['point_motor_current'].values[0]):.1f}!" in static
    assert "! beyond a limit" in text
    # Nothing is marked where the case sets no limits.
    assert "!" not in envelope_text(synthetic.envelope(limits=False))


def test_printed_envelope_shows_the_winding_and_the_trust() -> None:
    run = synthetic.envelope(winding=True)
    lines = envelope_text(run).splitlines()
    heads = lines[2].split()
    points = {line.split("  ")[0]: line for line in lines[4:10]}
    place = heads.index("winding")
    assert run["point_winding_temperature"].values[0] == np.inf
    assert "no end!" in points["static"]
    cruise = points["cruise"].split()[1:]
    assert cruise[place] == f"{float(run['point_winding_temperature'][1]):.0f}"
    assert {line.split()[-1] for line in points.values()} == {"good", "fair"}
    fair = [name.replace("_", " ") for name in run["point"].values[run["point_trust"].values == 2]]
    said = next(line for line in lines if line.startswith("Trust less than good: "))
    assert said.removeprefix("Trust less than good: ").rstrip(".").split("; ") == [
        f"{name} (low Reynolds number)" for name in fair
    ]
    assert any("marked above 120 degC" in line for line in lines)
    assert "winding" not in envelope_text(synthetic.envelope()).lower()


def test_a_point_that_does_not_exist_is_said_in_a_word() -> None:
    run = synthetic.envelope()
    for name in [str(name) for name in run.data_vars if str(name).startswith("point_")]:
        if run[name].dtype.kind == "f":
            run[name] = run[name].where(run["point"] != "best_climb")
    line = next(line for line in envelope_text(run).splitlines() if line.startswith("best climb"))
    assert line.split() == ["best", "climb", "none"]


def test_without_motor_and_airframe_every_rpm_is_printed_over_airspeed() -> None:
    # Linear thrust and a constant torque: what is printed can be worked out by hand.
    V, rpm = np.array([0.0, 5.0, 10.0, 15.0, 20.0]), np.array([3000.0, 6000.0])
    thrust = np.array([[4.0, 8.0], [2.0, 6.0], [-0.5, 4.0], [-2.0, 2.0], [-4.0, 1.0]])
    torque = np.full((5, 2), 0.125)
    values = {
        "thrust": thrust,
        "torque": torque,
        "shaft_power": torque * rpm * np.pi / 30,
        "trust": np.full((5, 2), 2, dtype=np.int16),
        "status": np.ones((5, 2), dtype=np.int16),
        "point_rpm": rpm[-1:],
        "point_thrust": thrust[0, -1:],
    }
    coordinates = {"airspeed": V, "rpm": rpm, "point": np.array(["static"])}
    text = envelope_text(build_dataset(ENVELOPE_WITHOUT_MOTOR, values, coordinates, {}))
    assert "static" not in text
    blocks = dict(zip((3000, 6000), text.split(" rpm:\n")[1:], strict=True))
    first = [line.split() for line in blocks[3000].split("\n\n")[0].splitlines()]
    assert first[0] == ["V", "thrust", "torque", "shaft", "trust"]
    # Up to one row beyond the last thrust; 0.125 N m at 3000 rpm are 39.3 W.
    assert first[2:] == [
        ["0.0", "4.00", "0.125", "39.3", "fair"],
        ["5.0", "2.00", "0.125", "39.3", "fair"],
        ["10.0", "-0.50", "0.125", "39.3", "fair"],
    ]
    second = [line.split() for line in blocks[6000].split("\n\n")[0].splitlines()]
    assert second[-1] == ["20.0", "1.00", "0.125", "78.5", "fair"]
    assert "Not all airspeeds shown" in text


def test_points_that_did_not_converge_are_counted() -> None:
    table = synthetic.coefficient_table()
    assert unconverged(table) == 0
    status = table["status"].values.copy()
    status[0, :3] = 4
    status[1, 0] = 2  # converged, of several roots
    assert unconverged(table.assign(status=xr.Variable(table["status"].dims, status))) == 3


def test_every_name_in_a_file_is_in_the_registry(tmp_path: Path) -> None:
    known = {*by_name(ENVELOPE), "airspeed", "throttle", "point"}
    for path in write(synthetic.envelope(), tmp_path / "run.csv"):
        header = path.read_text(encoding="utf-8").splitlines()[0]
        assert set(header.split(",")) <= known


def test_a_table_read_back_answers_look_ups_as_before(tmp_path: Path) -> None:
    case = bemt.load(Path(__file__).parent.parent / "cases" / "sandpiper.toml")
    grid = Grid(advance_ratio=np.array([0.0, 0.4]), rpm=np.array([6000.0]))
    table = bemt.coefficient_table(replace(case, grid=grid, model=replace(case.model, elements=8)))
    write(table, tmp_path / "table.nc")
    points = {"airspeed": [0.0, 8.0, 16.0, 20.0], "rpm": [6000.0, 6000.0, 6000.0, 0.0]}
    before, after = table.propeller.at(**points), read(tmp_path / "table.nc").propeller.at(**points)
    assert np.isfinite(before["thrust"]).all()
    xr.testing.assert_equal(after, before)
    # At a point of the grid the look-up interpolates what the table solved.
    solved = float(table["thrust_coefficient"].sel(advance_ratio=0.0)[0])
    assert float(after["thrust_coefficient"][0]) == pytest.approx(solved, rel=5e-3)


def test_printed_envelope_says_what_is_decided_by() -> None:
    lines = envelope_text(synthetic.envelope()).splitlines()
    assert "- Cruise at 16.0 m/s takes 49 % throttle, above the usual 30 to 40 % (common practice, no source)." in lines
    static = next(line for line in lines if line.startswith("static"))
    assert "4.7" in static.split()  # 280 s at full throttle
    assert all(len(line) <= 130 for line in lines)


def test_printed_envelope_of_what_hovers(tmp_path: Path) -> None:
    run = bemt.envelope(shipped.case("mudlark_hover"), table=shipped.table("mudlark_hover"))
    lines = envelope_text(run).splitlines()
    hover = next(line for line in lines if line.startswith("hover")).split()
    assert float(hover[1]) == 0.0
    assert f"{float(run['point_figure_of_merit'].sel(point='hover')):.2f}" in hover
    assert "Climbing straight up, hovering at 0 m/s:" in lines
    assert not any("range" in line for line in lines)
    assert {path.name for path in write(run, tmp_path / "run.csv")} == {
        "run.csv",
        "run_level.csv",
        "run_points.csv",
        "run_throttle.csv",
    }
