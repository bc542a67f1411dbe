"""`bemt table` and `bemt envelope` between the library and the user: what goes where, and the exit codes.

The library calls are replaced, so that these tests see the commands alone; the whole way is tested elsewhere.
"""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path

import netCDF4
import pytest
import synthetic
import xarray as xr
from click.testing import CliRunner, Result

import bemt
from bemt.cli.envelope import command as envelope_command
from bemt.cli.table import command as table_command
from bemt.errors import RunError
from bemt.quantities.registry import STATUS_NOT_CONVERGED

Run = Callable[..., Result]


@pytest.fixture
def calls(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """Replace the library and note what was called."""
    seen: list[str] = []

    def load(path: str) -> str:
        seen.append(f"load {path}")
        return "the case"

    def coefficient_table(case: str, *, radial: bool = False, lookup: bool = True) -> xr.Dataset:
        seen.append(f"table {case}, radial {radial}, lookup {lookup}")
        return synthetic.coefficient_table(radial=radial).assign_attrs(notes="the section was guessed")

    def envelope(case: str) -> xr.Dataset:
        seen.append(f"envelope {case}")
        return synthetic.envelope()

    for name, replacement in (("load", load), ("coefficient_table", coefficient_table), ("envelope", envelope)):
        monkeypatch.setattr(bemt, name, replacement, raising=False)
    return seen


@pytest.fixture
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> str:
    """Go to an empty folder with a case file in it."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "case.toml").touch()
    return "case.toml"


@pytest.mark.parametrize(("command", "headline"), [(table_command, "7000 rpm:"), (envelope_command, "Level flight:")])
def test_without_a_file_the_short_table_is_all_of_stdout(calls: list[str], case: str, command, headline: str) -> None:
    result = CliRunner().invoke(command, [case])
    assert result.exit_code == 0
    assert result.stdout.startswith(synthetic.ATTRS["title"])
    assert headline in result.stdout
    assert "plane of a turning propeller" in result.stderr
    assert "plane of a turning propeller" not in result.stdout
    assert ("Lithium cells" in result.stderr) == (command is envelope_command)
    assert calls[0] == "load case.toml"


def test_lithium_is_spoken_of_only_where_there_is_a_battery(
    calls: list[str], case: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    run = synthetic.envelope()
    bare = run.drop_vars([name for name in run.data_vars if "battery" in str(name) or "motor" in str(name)])
    monkeypatch.setattr(bemt, "envelope", lambda _: bare)
    result = CliRunner().invoke(envelope_command, [case])
    assert result.exit_code == 0
    assert "Lithium" not in result.stderr
    assert "plane of a turning propeller" in result.stderr
    assert "local rules" in result.stderr


def test_notes_of_a_result_are_said_on_stderr(calls: list[str], case: str) -> None:
    result = CliRunner().invoke(table_command, [case])
    assert "Note: the section was guessed\n" in result.stderr
    assert "Note:" not in result.stdout


def test_files_take_the_place_of_the_printed_table(calls: list[str], case: str, tmp_path: Path) -> None:
    result = CliRunner().invoke(
        table_command, [case, "-o", "a.nc", "-o", "a.csv", "--figure", "a.svg", "--radial"], catch_exceptions=False
    )
    assert result.exit_code == 0
    assert result.stdout == ""
    assert "Wrote a.nc, a.csv, a_rpm.csv, a_radial.csv, a.svg." in result.stderr
    assert calls[1] == "table the case, radial True, lookup True"
    assert sorted(path.name for path in tmp_path.iterdir()) == [
        "a.csv", "a.nc", "a.svg", "a_radial.csv", "a_rpm.csv", "case.toml",
    ]  # fmt: skip
    with netCDF4.Dataset("a.nc") as file:
        assert file.history.endswith("table case.toml")
    with open("a.csv", newline="", encoding="utf-8") as stream:
        assert next(csv.reader(stream))[:2] == ["rpm", "advance_ratio"]


def test_a_figure_alone_leaves_the_table_on_stdout(calls: list[str], case: str) -> None:
    result = CliRunner().invoke(envelope_command, [case, "--figure", "a.pdf"])
    assert result.exit_code == 0
    assert "static" in result.stdout
    assert Path("a.pdf").read_bytes().startswith(b"%PDF")


@pytest.mark.parametrize(
    ("arguments", "fits"),
    [(["-o", "a.xlsx"], ".nc, .csv"), (["-o", "a"], ".nc, .csv"), (["--figure", "a.jpg"], ".svg, .png, .pdf")],
)
def test_an_ending_that_stands_for_nothing_is_wrong_usage(
    calls: list[str], case: str, arguments: list[str], fits: str
) -> None:
    result = CliRunner().invoke(table_command, [case, *arguments])
    assert result.exit_code == 2
    assert fits in result.stderr
    assert calls == []  # before anything was computed


def test_a_case_that_is_not_there_is_wrong_usage(calls: list[str], case: str) -> None:
    result = CliRunner().invoke(envelope_command, ["other.toml"])
    assert result.exit_code == 2
    assert "other.toml" in result.stderr
    assert calls == []


def test_a_place_that_cannot_be_written_is_found_before_computing(calls: list[str], case: str) -> None:
    result = CliRunner().invoke(table_command, [case, "-o", "none/a.nc"])
    assert isinstance(result.exception, RunError)
    assert result.exception.exit_code == 1
    assert calls == []


@pytest.mark.parametrize(("strict", "code"), [([], 0), (["--strict"], 4)])
def test_points_that_did_not_converge_count_only_when_strict(
    calls: list[str], case: str, monkeypatch: pytest.MonkeyPatch, strict: list[str], code: int
) -> None:
    table = synthetic.coefficient_table()
    status = table["status"].values.copy()
    status[0, 0] = STATUS_NOT_CONVERGED
    broken = table.assign(status=(table["status"].dims, status, table["status"].attrs))
    monkeypatch.setattr(bemt, "coefficient_table", lambda *_, **__: broken)
    result = CliRunner().invoke(table_command, [case, "-o", "a.csv", *strict])
    assert result.exit_code == code
    assert f"1 of {status.size} points did not converge" in result.stderr
    assert Path("a.csv").is_file()  # written all the same


def test_strict_is_silent_where_all_converged(calls: list[str], case: str) -> None:
    result = CliRunner().invoke(envelope_command, [case, "--strict"])
    assert result.exit_code == 0
    assert "converge" not in result.stderr
