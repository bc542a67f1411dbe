"""Comparing with measured points: known mistakes are found again, and the report says what was found."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest
import shipped
import test_figures
from click.testing import CliRunner
from matplotlib.colors import to_rgb

import bemt
from bemt.air import standard_air
from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.case.readings import Readings
from bemt.cli.main import main
from bemt.errors import InputError
from bemt.figures.compare import comparison_figure
from bemt.files.compare import comparison_text, sentences
from bemt.flight.airframe import Installation
from bemt.quantities.registry import STATUS_NOT_CONVERGED
from bemt.rotor.model import Model
from bemt.section.polar import PolarTable
from bemt.study import compare as study
from bemt.study.compare import Comparison, compare

AIR = standard_air()
MEASURED = Path(__file__).parent / "measured"
NAME = "da4002_9x6.75"


def propeller() -> Propeller:
    """A blade of constant pitch with a section that stalls at 12 deg; quick to cut into elements."""
    r = np.array([0.15, 0.4, 0.75, 1.0])
    alpha = np.radians([-10.0, -4.0, 0.0, 6.0, 10.0, 12.0, 14.0, 20.0])
    lift = np.array([-0.6, -0.1, 0.35, 1.0, 1.3, 1.35, 1.2, 1.0])
    drag = np.array([0.08, 0.025, 0.018, 0.022, 0.035, 0.05, 0.09, 0.25])
    reynolds = np.array([3e4, 3e5])
    table = PolarTable(alpha, reynolds, np.tile(lift, (2, 1)), drag * np.array([[1.3], [0.7]]), source="invented")
    return Propeller(2, 0.254, Stations(r, 0.16 * np.ones(4), np.arctan(0.2 / r)), (SectionSpan(polars=table),))


def readings(
    of: Propeller, model: Model, rpm: Sequence[float], advance_ratio: Sequence[float], *, torque: bool = True
) -> Readings:
    """What a perfect tunnel would measure of a propeller that obeys the model."""
    speed, ratio = np.asarray(rpm, dtype=float), np.asarray(advance_ratio, dtype=float)
    thrust, power = shipped.coefficients(of, model, AIR, speed, ratio)
    return made(of.diameter, speed, ratio, thrust, power if torque else None)


def made(
    diameter: float, rpm: np.ndarray, advance_ratio: np.ndarray, thrust: np.ndarray, power: np.ndarray | None
) -> Readings:
    n, whole = rpm / 60.0, np.ones(rpm.size)
    head = AIR.density * n**2 * diameter**4
    return Readings(
        "made",
        rpm=rpm,
        airspeed=advance_ratio * n * diameter,
        density=AIR.density * whole,
        viscosity=AIR.viscosity * whole,
        speed_of_sound=AIR.speed_of_sound * whole,
        thrust=thrust * head,
        torque=None if power is None else power * head * diameter / (2.0 * math.pi),
    )


STILL = [(rpm, 0.0) for rpm in (1500.0, 3000.0, 4500.0, 6000.0)]
SWEEP = [(rpm, J) for rpm in (4000.0, 6000.0) for J in np.linspace(0.1, 0.95, 12)]
ALL = tuple(map(list, zip(*(STILL + SWEEP), strict=True)))


def test_a_propeller_that_obeys_the_model_leaves_no_error() -> None:
    found = compare(propeller(), Model(), readings(propeller(), Model(), *ALL))
    for value in vars(found.errors).values():
        # Landmarks of the rows and of the lines are estimates from different points.
        assert value == pytest.approx(0.0, abs=4e-3)
    assert found.errors.thrust_rms == pytest.approx(0.0, abs=1e-12)
    assert found.remedies[0].best == pytest.approx(0.0, abs=math.radians(0.05))
    assert not any(remedy.worth_saying for remedy in found.remedies)


@pytest.mark.parametrize("degrees", [1.3, -2.6])
def test_a_blade_that_was_turned_is_found_out(degrees: float) -> None:
    blade = propeller()
    stations = replace(blade.stations, twist=blade.stations.twist + math.radians(degrees))
    found = compare(blade, Model(), readings(replace(blade, stations=stations), Model(), *ALL))
    angle = found.remedies[0]
    assert math.degrees(angle.best) == pytest.approx(degrees, abs=0.05)
    assert angle.worth_saying
    assert angle.errors.thrust_rms < 0.03 * found.errors.thrust_rms
    assert angle.errors.power_rms < 0.03 * found.errors.power_rms
    assert abs(angle.errors.static_thrust) < 0.005
    assert f"{abs(degrees):.1f} deg {'larger' if degrees > 0 else 'smaller'}" in sentences(found)[0]


def test_drag_that_is_too_low_is_found_out() -> None:
    found = compare(propeller(), Model(), readings(propeller(), Model(drag_scale=1.3), *ALL))
    angle, drag, stall = found.remedies
    assert abs(math.degrees(angle.best)) < 1.0  # an angle can give back some of the power, not the thrust with it
    assert drag.best == pytest.approx(1.3, abs=0.04)
    assert abs(math.degrees(drag.angle)) < 0.1
    assert drag.errors.power_rms < 0.1 * found.errors.power_rms
    assert drag.worth_saying
    assert not stall.worth_saying
    assert any("drag looks too low" in sentence for sentence in sentences(found))


def test_a_stall_that_comes_too_early_is_found_out() -> None:
    given = Model(stall_strength=0.1)
    found = compare(propeller(), given, readings(propeller(), Model(stall_strength=0.7), *ALL))
    _, drag, stall = found.remedies
    assert stall.best == pytest.approx(0.7, abs=0.05)
    assert abs(math.degrees(stall.angle)) < 0.1
    assert stall.worth_saying
    assert not drag.worth_saying
    (sentence,) = [text for text in sentences(found) if "Stall" in text]
    assert "too early" in sentence
    assert f"{100 * found.predicted.stalled_share[found.static].mean():.0f} % of the span" in sentence


def test_without_a_law_of_stall_delay_its_strength_is_no_remedy() -> None:
    model = Model(stall_delay="none")
    found = compare(propeller(), model, readings(propeller(), model, *ALL))
    assert [remedy.quantity for remedy in found.remedies] == ["blade_angle", "drag_scale"]


def test_turning_elements_is_turning_stations() -> None:
    blade = propeller()
    stations = replace(blade.stations, twist=blade.stations.twist + 0.02)
    ours = study.turned(study.blade_elements(blade, Model()), 0.02)
    theirs = study.blade_elements(replace(blade, stations=stations), Model())
    np.testing.assert_allclose(ours.columns, theirs.columns, rtol=0.0, atol=1e-14)


def quadratic(torque: bool = True) -> tuple[Comparison, float, float]:
    """Rows of CT = a - b J^2 and constant CP: J CT/CP is largest at sqrt(a/3b), and CT is 0 at sqrt(a/b)."""
    a, b, cp = 0.1, 0.25, 0.05
    J = np.linspace(0.1, 0.7, 13)
    rpm = np.concatenate([5000.0 * (1.0 + 0.01 * np.cos(9.0 * J)), np.array([3000.0, 1000.0, 900.0])])
    J = np.concatenate([J[::-1], np.zeros(3)])
    thrust = np.where(J > 0.0, a - b * J**2, np.where(rpm > 2000.0, 0.12, 0.3))
    found = compare(propeller(), Model(), made(0.254, rpm, J, thrust, np.full(J.size, cp) if torque else None))
    return found, math.sqrt(a / (3.0 * b)), math.sqrt(a / b)


def test_landmarks_are_those_of_the_closed_form() -> None:
    found, peak, end = quadratic()
    (run,) = found.runs
    assert run.rows.size == 13
    assert (np.diff(found.advance_ratio[run.rows]) > 0).all()
    # The estimates' own errors: a parabola through a cubic, and a chord across one step of a parabola.
    assert run.measured.peak_advance_ratio == pytest.approx(peak, abs=0.01)
    assert run.measured.peak_efficiency == pytest.approx(peak * (0.1 - 0.25 * peak**2) / 0.05, rel=5e-3)
    assert run.measured.zero_thrust_advance_ratio == pytest.approx(end, abs=0.05**2 / (4.0 * end))
    assert found.measured.efficiency[run.rows[-1]] != found.measured.efficiency[run.rows[-1]]  # brakes: none


def test_the_static_value_leaves_out_the_lowest_rpm() -> None:
    found, _, _ = quadratic()
    assert found.static.sum() == 1  # of 3000, 1000 and 900 rpm one is above a third of the highest
    assert found.still.sum() == 3
    assert found.static_thrust == pytest.approx(0.12)


def test_without_a_static_row_the_largest_value_serves() -> None:
    rows = readings(propeller(), Model(), *map(list, zip(*SWEEP, strict=True)))
    found = compare(propeller(), Model(), rows)
    assert found.static_thrust == pytest.approx(found.measured.thrust_coefficient.max())
    assert any("no reading stands still" in note for note in found.notes)
    assert math.isnan(found.errors.static_thrust)
    assert not found.static_rpm.size


def test_without_torque_thrust_alone_is_judged() -> None:
    found, _, _ = quadratic(torque=False)
    assert math.isfinite(found.errors.thrust_rms)
    assert math.isnan(found.errors.power_rms)
    assert math.isnan(found.runs[0].measured.peak_efficiency)
    assert found.remedies
    assert "-" in comparison_text(found)


def test_readings_without_thrust_and_torque_cannot_be_compared() -> None:
    rows = replace(readings(propeller(), Model(), *ALL), thrust=None, torque=None)
    with pytest.raises(InputError, match="neither"):
        compare(propeller(), Model(), rows)


@pytest.mark.parametrize("row", ["5000,0,3.1,0.05", "5000,9,1.9,0.04", "5000,9,0,0", "500,40,-1,-0.01"])
def test_a_single_row_is_compared(row: str, tmp_path: Path) -> None:
    path = tmp_path / "one.csv"
    path.write_text(f"rpm,airspeed_m_s,thrust_N,torque_Nm\n{row}\n", encoding="utf-8")
    figure = tmp_path / "one.png"
    code, out, _ = run(MEASURED / f"{NAME}.toml", path, "--figure", figure)
    assert code == 0
    assert "nan" not in out
    assert "inf" not in out.replace("infl", "")
    assert figure.stat().st_size > 0


def test_a_body_in_the_case_is_not_in_the_readings() -> None:
    case = bemt.load(MEASURED / f"{NAME}.toml")
    found = bemt.compare(
        replace(case, installation=Installation(inflow_factor=0.9, thrust_factor=0.9)), MEASURED / f"{NAME}_static.csv"
    )
    assert any("[installation]" in note for note in found.notes)
    bare = bemt.compare(case, MEASURED / f"{NAME}_static.csv")
    assert found.errors.static_thrust == bare.errors.static_thrust
    assert found.errors.static_power == bare.errors.static_power


def test_where_the_helices_do_not_hold_there_is_no_prediction() -> None:
    blade, model = propeller(), Model(inflow="helix", elements=16)
    found = compare(blade, model, readings(blade, Model(elements=16), *ALL), remedies=("blade_angle",))
    predicted = np.isfinite(found.predicted.thrust_coefficient)
    assert not predicted[found.still].any()
    fast = found.advance_ratio > 0.7
    assert predicted[fast].all()
    # The two laws differ by some per cent; no difference would mean that the other one was solved.
    assert 0.0 < found.errors.thrust_rms < 0.06
    assert any("rows have no prediction" in note for note in found.notes)


def test_rows_are_predicted_in_their_own_air() -> None:
    rows = readings(propeller(), Model(), *ALL)
    thin = replace(rows, density=0.5 * rows.density)
    found = compare(propeller(), Model(), thin).predicted.thrust_coefficient
    expected, _ = shipped.coefficients(
        propeller(), Model(), replace(AIR, density=0.5 * AIR.density), rows.rpm, np.array(ALL[1])
    )
    np.testing.assert_allclose(found, expected, rtol=1e-12)


@cache
def measured_comparison() -> Comparison:
    return bemt.compare(
        bemt.load(MEASURED / f"{NAME}.toml"), *(MEASURED / f"{NAME}_{kind}.csv" for kind in ("static", "advance"))
    )


def test_the_report_has_the_numbers_of_the_comparison() -> None:
    found = measured_comparison()
    text = comparison_text(found, title="A title")
    assert text.startswith("A title\n")
    (moving,) = [line for line in text.splitlines() if line.startswith("moving ")]
    errors = found.errors
    expected = [errors.thrust_bias, errors.thrust_rms, errors.power_bias, errors.power_rms]
    assert [float(word) for word in moving.split()[1:]] == pytest.approx(
        [100.0 * value for value in expected], abs=0.051
    )
    assert f"turned by {math.degrees(found.remedies[0].best):+.2f} deg" in text
    for run in found.runs:
        assert f"{run.rpm:.0f} rpm" in text
    for sentence in sentences(found):
        assert sentence.split(".")[0][:40] in text


@pytest.mark.parametrize("part", ["both", "moving", "static"])
def test_the_figure_shows_every_row_and_can_be_read(part: str) -> None:
    blade = propeller()
    chosen = {"both": STILL + SWEEP, "moving": SWEEP, "static": STILL}[part]
    found = compare(blade, Model(), readings(blade, Model(), *map(list, zip(*chosen, strict=True))))
    figure = comparison_figure(found, title="A propeller somebody carved in a shed beside the estuary in winter " * 2)
    width, height = figure.get_size_inches() * figure.dpi
    texts = test_figures.drawn_texts(figure)
    for text, (x0, y0, x1, y1) in texts:
        assert min(x0, y0) >= 0, text
        assert x1 <= width, text
        assert y1 <= height, text
    for k, (text, (x0, y0, x1, y1)) in enumerate(texts):
        for other, (u0, v0, u1, v1) in texts[k + 1 :]:
            assert min(x1, u1) - max(x0, u0) <= 1.0 or min(y1, v1) - max(y0, v0) <= 1.0, f"{text!r} covers {other!r}"
    for axes in figure.axes:
        assert axes.get_ylabel()
    shown = sum(
        line.get_xdata().size for axes in figure.axes[::3] for line in axes.lines if line.get_linestyle() == "None"
    )
    assert shown == len(chosen)
    # In grey print lines of different rpm differ in lightness, and their points in shape as well.
    runs = (
        [line for line in figure.axes[0].lines if line.get_marker() not in ("None", "", "o")]
        if part != "static"
        else []
    )
    greys = [float(np.dot(to_rgb(line.get_color()), (0.299, 0.587, 0.114))) for line in runs]
    assert len(set(np.round(greys, 2))) == len(greys)


def run(*arguments: object) -> tuple[int, str, str]:
    done = CliRunner().invoke(main, ["compare", *map(str, arguments)])
    assert done.exception is None or isinstance(done.exception, SystemExit)
    return done.exit_code, done.stdout, done.stderr


def test_the_command_reports_on_stdout_and_talks_on_stderr(tmp_path: Path) -> None:
    figure = tmp_path / "figure.svg"
    case, advance = MEASURED / f"{NAME}.toml", MEASURED / f"{NAME}_advance.csv"
    code, out, err = run(case, advance, "--figure", figure)
    assert code == 0
    assert "what would be left" in out
    assert "Note" not in out
    assert "no air is given" in err
    assert "no reading stands still" in err
    assert figure.stat().st_size > 10_000


def test_wrong_use_and_wrong_files_end_with_their_code(tmp_path: Path) -> None:
    case = MEASURED / f"{NAME}.toml"
    figure, bad = tmp_path / "figure.png", tmp_path / "bad.csv"
    bad.write_text("rpm,advance_ratio,thrust_coefficent\n5000,0.2,0.1\n", encoding="utf-8")
    code, out, err = run(case, bad, "--figure", figure)
    assert (code, out) == (3, "")
    assert f"{bad}:1: thrust_coefficent: unknown column (did you mean 'thrust_coefficient'?)" in err
    assert not figure.exists()
    assert run(case)[0] == 2
    assert run(case, tmp_path / "none.csv")[0] == 2
    code, out, _ = run(case, MEASURED / f"{NAME}_static.csv", "--figure", tmp_path / "figure.doc")
    assert (code, out) == (2, "")
    bad.write_text("rpm,voltage_V\n5000,12\n", encoding="utf-8")
    code, _, err = run(case, bad)
    assert code == 3
    assert "neither" in err


def test_rows_that_do_not_converge_are_left_out_and_said(monkeypatch: pytest.MonkeyPatch) -> None:
    solved = study.solve

    def failing(*arguments: object, **options: object) -> object:
        solution = solved(*arguments, **options)  # type: ignore[arg-type]
        for values in (solution.thrust_per_density, solution.torque_per_density):
            values[0] = np.nan
        solution.status[0] = STATUS_NOT_CONVERGED
        return solution

    monkeypatch.setattr(study, "solve", failing)
    files = (MEASURED / f"{NAME}.toml", MEASURED / f"{NAME}_static.csv")
    code, out, err = run(*files)
    assert code == 0
    assert "1 of 7 rows did not converge" in err
    assert "nan" not in out
    assert run(*files, "--strict")[0] == 4
