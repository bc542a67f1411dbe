"""The program's manners, the starter case, and what `bemt check` says of a case."""

from __future__ import annotations

import subprocess
import sys
import tomllib
from pathlib import Path

import click
import pytest
from case_files import CASE, DRIVE, write_case
from click.testing import CliRunner

from bemt.cli import start
from bemt.cli.main import COMMANDS, main
from bemt.errors import RunError
from bemt.version import __version__

CASES = Path(__file__).parents[1] / "cases"


def run(*arguments: str | Path, stdin: str | None = None) -> tuple[int, str, str]:
    done = CliRunner().invoke(main, [str(argument) for argument in arguments], input=stdin)
    return done.exit_code, done.stdout, done.stderr


# --- the program -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("arguments", [["--help"], ["--version"], *([name, "--help"] for name in COMMANDS)])
def test_help_loads_nothing_slow(arguments: list[str]) -> None:
    code = (
        "import sys\nfrom bemt.cli.main import main\n"
        f"try: main({arguments!r})\nexcept SystemExit as end: assert not end.code\n"
        "slow = {'numpy', 'scipy', 'numba', 'xarray', 'matplotlib', 'pydantic', 'pint', 'netCDF4', 'bemt.case'}\n"
        "print('LOADED', sorted(slow & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.splitlines()[-1] == "LOADED []"
    assert done.stderr == ""


def test_version_and_commands() -> None:
    assert run("--version") == (0, f"bemt {__version__}\n", "")
    _, shown, _ = run("--help")
    listed = [line.split()[0] for line in shown.partition("Commands:")[2].splitlines() if line.strip()]
    assert listed == ["start", "check", "table", "envelope", "compare", "calibrate"]


def test_wrong_usage_is_2() -> None:
    assert run("no-such-command")[0] == 2
    assert run("check")[0] == 2
    assert run("check", "--no-such-option", CASES / "sandpiper.toml")[0] == 2


@pytest.mark.parametrize(
    ("error", "code", "message"),
    [
        (RunError("could not be finished"), 1, "could not be finished\n"),
        (OSError(28, "No space left on device", "out.nc"), 1, "out.nc: No space left on device\n"),
        (KeyboardInterrupt(), 1, "Aborted!\n"),
    ],
)
def test_how_a_command_ends(monkeypatch: pytest.MonkeyPatch, error: BaseException, code: int, message: str) -> None:
    @click.command("check")
    def failing() -> None:
        raise error

    monkeypatch.setattr("bemt.cli.check.command", failing)
    found, out, err = run("check")
    assert (found, out) == (code, "")
    assert err.lstrip("\n") == message


def test_no_color_is_obeyed(monkeypatch: pytest.MonkeyPatch) -> None:
    @click.command("check")
    def coloured() -> None:
        click.secho("red", fg="red")

    monkeypatch.setattr("bemt.cli.check.command", coloured)
    monkeypatch.delenv("NO_COLOR", raising=False)
    assert CliRunner().invoke(main, ["check"], color=True).stdout != "red\n"
    monkeypatch.setenv("NO_COLOR", "1")
    assert CliRunner().invoke(main, ["check"], color=True).stdout == "red\n"


# --- start -----------------------------------------------------------------------------------------------------------


def test_the_starter_case_is_whole(tmp_path: Path) -> None:
    code, out, err = run("start", tmp_path / "new" / "folder")
    assert (code, out) == (0, "")
    assert "plane of a turning propeller" in err
    case = tmp_path / "new" / "folder" / "case.toml"
    assert "Invented" in case.read_text()
    code, out, _ = run("check", case)
    assert code == 0
    assert "bemt envelope: yes, over airspeed and throttle" in out


def test_the_starter_case_runs_as_it_is(tmp_path: Path) -> None:
    run("start", tmp_path)
    code, out, err = run("table", tmp_path / "case.toml", "-o", tmp_path / "table.csv")
    assert (code, out) == (0, ""), err
    assert (tmp_path / "table.csv").stat().st_size > 0


def test_the_starter_is_the_demo_case(tmp_path: Path) -> None:
    run("start", tmp_path)
    starter = tomllib.loads((tmp_path / "case.toml").read_text())
    assert starter["propeller"].pop("stations") == "blade.csv"
    demo = tomllib.loads((CASES / "sandpiper.toml").read_text())
    assert demo["propeller"].pop("stations") == "sandpiper_blade.csv"
    assert starter == demo
    assert (tmp_path / "blade.csv").read_bytes() == (CASES / "sandpiper_blade.csv").read_bytes()


@pytest.mark.parametrize("name", start.STARTER_FILES)
def test_nothing_is_overwritten(tmp_path: Path, name: str) -> None:
    (tmp_path / name).write_text("mine")
    code, out, err = run("start", tmp_path)
    assert (code, out) == (2, "")
    assert name in err
    assert [path.name for path in tmp_path.iterdir()] == [name]
    assert (tmp_path / name).read_text() == "mine"


def test_a_file_in_place_of_the_folder_is_wrong_usage(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("mine")
    assert run("start", tmp_path / "file")[0] == 2


def test_all_of_the_starter_or_nothing(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(start, "STARTER_FILES", ("case.toml", "no-such-starter-file"))
    code, out, _ = run("start", tmp_path / "new" / "folder")
    assert (code, out) == (1, "")
    assert list(tmp_path.iterdir()) == []


# --- check -----------------------------------------------------------------------------------------------------------


def test_check_tells_what_is_in_the_demo_case() -> None:
    code, out, err = run("check", CASES / "sandpiper.toml")
    assert code == 0
    for words in (
        "Mudflat survey aircraft",
        "2 blades, diameter 335.3 mm (13.2 in)",
        "limit 9500 rpm",
        "pitch 17",
        "family flat-bottom",
        "12.0 degC",
        "rpm 3000, 5000, 7000, 9000",
        "690 rpm/V, 41 mohm",
        "5 A h",
        "cruises at 16 m/s",
        "bemt table: yes",
        "bemt envelope: yes",
    ):
        assert words in out
    assert "limit printed on it overrules" in err
    assert "rpm_limit" not in err


def test_check_tells_what_leaves_the_section_data() -> None:
    # The innermost third of the published blade is 36 % thick; the family ends at 25 %.
    code, out, err = run("check", CASES / "nr640_9in.toml")
    assert code == 0
    assert "% of the span (weighted by r^2 chord) leaves the thickness" in out
    assert "This case names no rpm_limit" in err
    assert "level flight and its named points need [airframe]" in out


def test_check_tells_that_the_section_is_a_guess(tmp_path: Path) -> None:
    case = write_case(tmp_path, CASE.replace('[[section]]\nfamily = "flat-bottom"\n', ""))
    code, out, err = run("check", case)
    assert code == 0
    assert "a guess" in out
    assert not any(line.lstrip().startswith("%") for line in out.splitlines())  # a number keeps its unit
    assert "\u00a0" not in out
    assert "Note: the section of the blade is a guess" in err


@pytest.mark.parametrize(
    ("more", "words"),
    [
        (DRIVE, "bemt envelope: yes, over airspeed and throttle"),
        (DRIVE.partition("[battery]")[0], "bemt envelope: no, [battery] is missing"),
        ("[battery]" + DRIVE.partition("[battery]")[2], "[battery] has no effect without it"),
        ("", "yes, over airspeed and rpm up to shaft power"),
        (DRIVE, "an ideal one, without losses or limits, serves"),
    ],
)
def test_check_tells_what_is_missing_for_the_envelope(tmp_path: Path, more: str, words: str) -> None:
    code, out, _ = run("check", write_case(tmp_path, CASE + more))
    assert code == 0
    assert words in " ".join(out.split())


def test_check_of_standard_input(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_case(tmp_path)
    monkeypatch.chdir(tmp_path)
    assert run("check", "-", stdin=CASE)[0] == 0
    code, out, err = run("check", "-", stdin=CASE.replace("300 mm", "300"))
    assert (code, out) == (3, "")
    assert err.startswith("<stdin>:5: propeller.diameter: ")
