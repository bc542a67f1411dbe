"""Motor constants from a bench: `bemt calibrate --of motor`.

Outside truth: closed forms of the direct-current machine, rows made by the equilibrium of `bemt.drive`, the spread of
repeated noise, the TOML parser of the standard library, and the stand logs in tests/measured/motors.
"""

from __future__ import annotations

import importlib.util
import math
import tomllib
from dataclasses import replace
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest
from analytic_propeller import AnalyticPropeller
from case_files import CASE, DRIVE, write_case
from click.testing import CliRunner

import bemt
from bemt.air import standard_air
from bemt.case.readings import Readings, load_readings
from bemt.case.rewrite import with_motor
from bemt.cli.main import main
from bemt.drive import Battery, Controller, Drive, Motor
from bemt.errors import InputError, RunError
from bemt.files.calibrate import calibration_text, notices, sentences
from bemt.study import motor_fit
from bemt.study.motor_fit import MotorFit, fit_motor, rpm_at_duty, supply_current

RPM = 30.0 / math.pi
MOTORS = Path(__file__).parent / "measured" / "motors"

MOTOR = Motor(speed_constant=900.0 / RPM, winding_resistance=0.05, no_load=((10.0, 0.8),))
LABEL = Motor(speed_constant=960.0 / RPM, winding_resistance=0.08, no_load=((10.0, 0.5),))
CONTROLLER = Controller(on_resistance=0.004, idle_current=0.05, switching_frequency=24e3, switching_time=80e-9)
BATTERY = Battery(cells_in_series=3, cell_resistance=0.004, capacity=8000.0)
PROPELLER = AnalyticPropeller(diameter=0.26)


def readings(**columns: Any) -> Readings:
    """Readings standing still in standard air."""
    rpm = np.asarray(columns.pop("rpm"), float)
    air = standard_air()
    state = {
        name: np.full(rpm.size, value)
        for name, value in (
            ("density", air.density), ("viscosity", air.viscosity), ("speed_of_sound", air.speed_of_sound),
        )
    }  # fmt: skip
    return Readings(source="rows", rpm=rpm, airspeed=np.zeros(rpm.size), **state, **columns)


def bench(motor: Motor = MOTOR, controller: Controller = CONTROLLER, count: int = 12) -> Readings:
    """Make loaded rows by the drive's own equilibrium, full throttle the last, and three of the motor running free."""
    points = Drive(PROPELLER, motor, BATTERY, controller).at_throttle(0.0, np.linspace(0.25, 1.0, count))
    # Running free is the same drive on a propeller that takes nothing: w = Kv (d Vb - I0 (R + Ron)), solved by hand.
    duty, voltage = np.array([0.4, 0.7, 1.0]), np.full(3, 12.0)
    speed = duty * voltage * motor.speed_constant
    for _ in range(60):
        drop = motor.no_load_current(speed) * (motor.winding_resistance + controller.on_resistance)
        speed = motor.speed_constant * (duty * voltage - drop)
    current = motor.no_load_current(speed)
    chops = np.where(duty < 1.0, controller.switching_share, 0.0)
    return readings(
        rpm=np.concatenate([points.rpm, speed * RPM]),
        voltage=np.concatenate([points.battery_voltage, voltage]),
        current=np.concatenate([points.battery_current, (duty + chops) * current + controller.idle_current]),
        torque=np.concatenate([points.torque, np.zeros(3)]),
        thrust=np.concatenate([points.thrust, np.zeros(3)]),
        duty=np.concatenate([points.duty, duty]),
    )


def noisy(rows: Readings, random: np.random.Generator) -> Readings:
    """Add normal noise of the uncertainties that the fit assumes."""
    changed = {}
    for name, (share, floor) in motor_fit.DEFAULT_UNCERTAINTY.items():
        values = getattr(rows, name)
        if values is not None:
            spread = np.where(values == 0.0, 0.0, share * values + floor * values.max())
            changed[name] = values + spread * random.standard_normal(values.size)
    assert rows.duty is not None
    changed["duty"] = rows.duty + motor_fit.DEFAULT_DUTY_UNCERTAINTY * random.standard_normal(rows.duty.size)
    # No duty above 1 is ever read; a fixed one at full throttle is what a user writes.
    changed["duty"] = np.where(rows.duty == 1.0, 1.0, np.minimum(changed["duty"], 0.999))
    return replace(rows, **changed)


def constants(motor: Motor, at: float) -> np.ndarray:
    return np.array([motor.speed_constant, motor.winding_resistance, float(motor.no_load_current(at))])


# --- closed forms and the drive itself -------------------------------------------------------------------------------


def test_a_row_running_free_and_a_loaded_one_give_the_constants_in_closed_form() -> None:
    V1, I1, w1 = 12.05, 0.82, 1058.0
    V2, I2, w2 = 11.31, 24.6, 872.0
    Kv = (w1 - w2 * I1 / I2) / (V1 - V2 * I1 / I2)
    R = (V2 - w2 / Kv) / I2
    rows = readings(
        rpm=np.array([w1, w2]) * RPM,
        voltage=np.array([V1, V2]),
        current=np.array([I1, I2]),
        torque=np.array([0.0, np.nan]),
        duty=np.ones(2),
    )
    for start in (LABEL, MOTOR):
        fit = fit_motor(rows, start=start)
        assert fit.untold == ()
        assert fit.values == pytest.approx([Kv, R, I1], rel=1e-7)


@pytest.mark.parametrize(
    ("controller", "extra"),
    [
        (Controller(), {}),
        (CONTROLLER, {}),
        (replace(CONTROLLER, diode_voltage=0.6), {}),
        (CONTROLLER, {"winding_inductance": 10e-6, "winding_temperature": 350.0}),
    ],
)
def test_exact_rows_give_the_constants_back(controller: Controller, extra: dict[str, float]) -> None:
    rows = bench(replace(MOTOR, **extra), controller)
    if controller.diode_voltage or extra:  # the three rows made by hand know of no diode and no ripple
        rows = rows.only(np.arange(rows.rpm.size) < rows.rpm.size - 3)
    fit = fit_motor(rows, controller, start=replace(LABEL, **extra))
    assert fit.names == motor_fit.CONSTANTS
    assert fit.values == pytest.approx(constants(MOTOR, fit.reference_speed), rel=1e-6)
    assert fit.scatter < 1e-5
    assert rows.current is not None
    assert fit.current == pytest.approx(rows.current, rel=1e-6)
    assert fit.rpm == pytest.approx(rows.rpm, rel=1e-6)


def test_prediction_and_equilibrium_agree() -> None:
    points = Drive(PROPELLER, MOTOR, BATTERY, CONTROLLER).at_throttle(0.0, np.linspace(0.2, 1.0, 9))
    current = supply_current(MOTOR, CONTROLLER, voltage=points.battery_voltage, rpm=points.rpm, torque=points.torque)
    rpm = rpm_at_duty(MOTOR, CONTROLLER, voltage=points.battery_voltage, duty=points.duty, torque=points.torque)
    assert current == pytest.approx(points.battery_current, rel=1e-8)
    assert rpm == pytest.approx(points.rpm, rel=1e-8)


def test_a_gear_is_reckoned_with() -> None:
    geared = replace(MOTOR, gear_ratio=2.5, gear_efficiency=0.95)
    points = Drive(AnalyticPropeller(diameter=0.45), geared, BATTERY, CONTROLLER).at_throttle(
        0.0, np.linspace(0.3, 1.0, 8)
    )
    rows = readings(
        rpm=points.rpm, voltage=points.battery_voltage, current=points.battery_current, torque=points.torque,
        duty=points.duty,
    )  # fmt: skip
    fit = fit_motor(rows, CONTROLLER, start=replace(LABEL, gear_ratio=2.5, gear_efficiency=0.95))
    assert fit.values == pytest.approx(constants(MOTOR, fit.reference_speed), rel=1e-5)
    assert fit.rpm == pytest.approx(points.rpm, rel=1e-6)


def test_growth_with_speed_is_found_where_it_is_there() -> None:
    growing = replace(MOTOR, no_load=((4.0, 0.5), (12.0, 1.1)))
    fit = fit_motor(bench(growing), CONTROLLER, start=LABEL)
    assert fit.names == (*motor_fit.CONSTANTS, motor_fit.GROWTH)
    speed = np.linspace(0.1, 1.0, 7) * fit.reference_speed
    assert fit.motor.no_load_current(speed) == pytest.approx(growing.no_load_current(speed), rel=1e-4)


def test_power_serves_in_place_of_current() -> None:
    rows = bench()
    assert rows.voltage is not None
    assert rows.current is not None
    by_power = replace(rows, electric_power=rows.voltage * rows.current, current=None)
    fit = fit_motor(by_power, CONTROLLER, start=LABEL)
    assert fit.values == pytest.approx(constants(MOTOR, fit.reference_speed), rel=1e-6)


# --- noise -----------------------------------------------------------------------------------------------------------


def test_noisy_rows_give_the_constants_within_two_uncertainties() -> None:
    fit = fit_motor(noisy(bench(), np.random.default_rng(7)), CONTROLLER, start=LABEL)
    assert fit.untold == ()
    error = fit.values - constants(MOTOR, fit.reference_speed)
    assert (np.abs(error[:3]) < 2.0 * fit.uncertainties[:3]).all()
    assert 0.5 < fit.scatter < 1.5


def test_covariance_is_that_of_repeated_noise() -> None:
    # 250 repetitions know a standard deviation to 4.5 %.
    exact, random = bench(), np.random.default_rng(11)
    fits = [fit_motor(noisy(exact, random), CONTROLLER, start=LABEL, growth=False) for _ in range(250)]
    values = np.array([fit.values for fit in fits])
    claimed = np.sqrt(np.mean([fit.uncertainties**2 for fit in fits], axis=0))
    spread = values.std(axis=0, ddof=1)
    print("spread over claimed:", spread / claimed)
    assert spread == pytest.approx(claimed, rel=0.2)
    correlation = np.corrcoef(values.T)
    assert correlation == pytest.approx(fit_motor(exact, CONTROLLER, start=LABEL).correlation, abs=0.2)
    # The truth lies within the claimed uncertainty of the mean, by its own uncertainty.
    bias = values.mean(axis=0) - constants(MOTOR, fits[0].reference_speed)
    assert (np.abs(bias) < 0.3 * claimed).all()


def test_whitened_residuals_are_independent_and_of_unit_variance() -> None:
    # Both residuals of a row rest on the same rpm, voltage and torque. 3000 draws know a correlation to 0.018, a
    # variance to 2.6 %; the first derivatives leave some per cent of their own at the smallest currents.
    exact, random = bench(), np.random.default_rng(23)
    at = {name: math.log(value) for name, value in zip(motor_fit.CONSTANTS, constants(MOTOR, 1.0), strict=True)}
    rows = motor_fit._Bench(exact, CONTROLLER, LABEL, None)
    at = rows.start_values() | at
    whiten = rows.whitening(at)
    draws = []
    for _ in range(3000):
        changed = {
            name: values + rows.spread[name] * random.standard_normal(values.size)
            for name, values in rows.measured.items()
        }
        draws.append(whiten(rows.residuals(at, changed)))
    covariance = np.cov(np.array(draws).T)
    count = exact.rpm.size
    assert np.diag(covariance) == pytest.approx(np.ones(2 * count), rel=0.12)
    assert np.abs(covariance[:count, count:]).max() < 0.1


def test_one_misread_row_does_not_decide() -> None:
    rows = bench()
    assert rows.current is not None
    misread = rows.current.copy()
    misread[8] *= 1.3
    misread_rows = replace(rows, current=misread)
    errors = {}
    for scale in (motor_fit._LOSS_SCALE, 1e6):  # the second is plain least squares
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(motor_fit, "_LOSS_SCALE", scale)
            fit = fit_motor(misread_rows, CONTROLLER, start=LABEL, growth=False)
        errors[scale] = np.abs(fit.values - constants(MOTOR, fit.reference_speed)) / fit.uncertainties
    print("robust and plain errors:", errors)
    robust, plain = errors.values()
    assert (robust < 1.0).all()
    assert np.linalg.norm(robust) < 0.8 * np.linalg.norm(plain)


def test_given_uncertainties_count() -> None:
    rows = noisy(bench(), np.random.default_rng(3))
    sure = replace(rows, uncertainties={"torque": np.full(rows.rpm.size, 10.0)})
    loose = fit_motor(sure, CONTROLLER, start=LABEL, growth=False)
    # A torque of no use leaves the no-load current to the three rows running free, whose torque is given 10 N m too.
    assert (
        loose.value("no_load_current")[1]
        > 3.0 * fit_motor(rows, CONTROLLER, start=LABEL, growth=False).value("no_load_current")[1]
    )


# --- what the rows cannot tell ---------------------------------------------------------------------------------------


def words(fit: MotorFit) -> str:
    return " ".join(sentences(fit))


def test_without_duty_the_speed_constant_is_not_told_but_the_current_is() -> None:
    rows = replace(bench(), duty=None)
    fit = fit_motor(rows, CONTROLLER, start=LABEL)
    assert fit.untold == ("speed_constant",)
    assert "speed_constant" in fit.untold_combinations[0]
    # What the rows tell whatever Kv is: R Kv^2 with the controller's, and I0/Kv.
    Kv, R, I0 = fit.values[:3]
    assert (R + 0.004) * Kv**2 == pytest.approx((0.05 + 0.004) * MOTOR.speed_constant**2, rel=0.01)
    assert I0 / Kv == pytest.approx(0.8 / MOTOR.speed_constant, rel=0.01)
    assert fit.current == pytest.approx(rows.current, rel=1e-3)
    assert "speed constant is not told" in words(fit)
    assert "R Kv^2 and I0/Kv" in words(fit)
    assert f"{'no':>12}" in calibration_text(fit).splitlines()[3]


def test_rows_running_free_alone_do_not_tell_the_resistance() -> None:
    rows = bench()
    free = rows.only(np.asarray(rows.torque) == 0.0)
    fit = fit_motor(noisy(free, np.random.default_rng(1)), CONTROLLER, start=LABEL)
    assert fit.untold == ("winding_resistance",)
    assert fit.motor.winding_resistance == pytest.approx(LABEL.winding_resistance, rel=0.2)
    assert fit.motor.speed_constant == pytest.approx(MOTOR.speed_constant, rel=0.01)
    assert "winding resistance is not told" in words(fit)


def test_loaded_rows_without_torque_do_not_tell_the_no_load_current() -> None:
    rows = bench()
    loaded = replace(rows.only(np.asarray(rows.torque) > 0.0), torque=None, thrust=None)
    fit = fit_motor(loaded, CONTROLLER, start=LABEL)
    assert fit.untold == ("no_load_current",)
    assert fit.values[:2] == pytest.approx(constants(MOTOR, 1.0)[:2], rel=1e-5)
    assert "no-load current is not told" in words(fit)


def scale_only(rows: Readings) -> Readings:
    assert rows.voltage is not None
    assert rows.current is not None
    return replace(
        rows.only(np.asarray(rows.thrust) > 0.0), electric_power=(rows.voltage * rows.current)[:-3], torque=None,
        duty=None, voltage=None, current=None,
    )  # fmt: skip


def test_kitchen_scale_wattmeter_and_tachometer_part_neither_motor_nor_propeller() -> None:
    rows = bench(controller=Controller())
    alone = fit_motor(scale_only(rows), start=LABEL, diameter=PROPELLER.diameter)
    assert alone.with_propeller.all()
    assert "speed_constant" in alone.untold
    assert "winding_resistance" in alone.untold
    assert any({"winding_resistance", "figure_of_merit"} <= set(names) for names in alone.untold_combinations)
    said = words(alone)
    for needed in (
        "Motor and propeller are both unknown",
        "power coefficient (its figure of merit) trades against winding resistance and no-load current",
        "a row of the motor running free (voltage_V, current_A, rpm, torque_Nm 0)",
        "a torque on loaded rows",
        "from a known direct current",
    ):
        assert needed in said
    assert "The rows tell all constants" not in said

    # The readings that are said to part the two do so.
    free = rows.only(np.asarray(rows.torque) == 0.0)
    parted = fit_motor(Readings.joined([scale_only(rows), free]), start=LABEL, diameter=PROPELLER.diameter)
    assert "speed_constant" not in parted.untold
    assert "no_load_current" not in parted.untold
    known = replace(LABEL, winding_resistance=MOTOR.winding_resistance)
    held = fit_motor(
        Readings.joined([scale_only(rows), free]), start=known, diameter=PROPELLER.diameter,
        held=["winding_resistance"],
    )  # fmt: skip
    assert held.untold == ()
    merit, spread = held.value("figure_of_merit")
    # Of the rows' own torque: ideal power over shaft power.
    loaded = rows.only(np.asarray(rows.torque) > 0.0)
    thrust, torque = np.asarray(loaded.thrust), np.asarray(loaded.torque)
    area = math.pi / 4.0 * PROPELLER.diameter**2
    true = thrust**1.5 / np.sqrt(2.0 * loaded.density * area) / (torque * loaded.rpm / RPM)
    assert np.ptp(true) < 1e-9
    assert abs(merit - true[0]) < spread < 0.05


def test_a_held_constant_stays() -> None:
    fit = fit_motor(bench(), CONTROLLER, start=LABEL, held=["speed_constant"])
    assert fit.motor.speed_constant == pytest.approx(LABEL.speed_constant, rel=1e-15)
    assert fit.value("speed_constant")[1] == 0.0
    assert fit.correlation[0, 1] == 0.0
    assert "held" in calibration_text(fit)


def test_rows_that_cannot_be_are_left_out_by_name() -> None:
    rows = bench()
    assert rows.torque is not None
    torque = rows.torque.copy()
    torque[4] *= 2.0
    places = tuple(f"b.csv:{line}" for line in range(2, rows.rpm.size + 2))
    fit = fit_motor(replace(rows, torque=torque, places=places), CONTROLLER, start=LABEL)
    assert not fit.used[4]
    assert fit.used.sum() == rows.rpm.size - 1
    (said,) = notices(fit)
    assert said.startswith("b.csv:6 (")
    assert motor_fit.MORE_THAN_ALL in said
    assert fit.values == pytest.approx(constants(MOTOR, fit.reference_speed), rel=1e-6)


def test_a_label_that_the_rows_contradict_is_said() -> None:
    fit = fit_motor(noisy(bench(), np.random.default_rng(5)), CONTROLLER, start=LABEL)
    share, sigmas = fit.label_difference
    assert share == pytest.approx(900 / 960 - 1, abs=0.01)
    assert sigmas < -5.0
    assert "contradict the case's speed constant of 960 rpm/V" in words(fit)
    low = replace(LABEL, speed_constant=0.9 * MOTOR.speed_constant)
    beyond = fit_motor(bench(), CONTROLLER, start=low)
    assert beyond.beyond_label
    assert "which a motor cannot reach even without losses" in words(beyond)
    assert not fit.beyond_label


# --- wrong use of the library ----------------------------------------------------------------------------------------


def test_rows_that_say_nothing_and_names_that_are_none_are_refused() -> None:
    with pytest.raises(InputError, match="no row says anything of the motor"):
        fit_motor(readings(rpm=[5000.0, 6000.0], thrust=np.array([1.0, 2.0])), start=LABEL)
    with pytest.raises(InputError, match="held"):
        fit_motor(bench(), start=LABEL, held=["winding"])
    with pytest.raises(InputError, match="nothing is left"):
        fit_motor(bench(), start=LABEL, held=motor_fit.CONSTANTS)


def test_a_search_that_does_not_end_is_a_failed_run(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    import scipy.optimize

    full = scipy.optimize.least_squares
    monkeypatch.setattr(scipy.optimize, "least_squares", lambda *a, **k: full(*a, **{**k, "max_nfev": 1}))
    with pytest.raises(RunError, match="were not found"):
        fit_motor(bench(), CONTROLLER, start=LABEL)
    case, rows = on_disk(tmp_path)
    code, shown, said = run("calibrate", case, rows, "--of", "motor", "-o", tmp_path / "new.toml")
    assert (code, shown) == (1, "")
    assert "were not found" in said
    assert not (tmp_path / "new.toml").exists()


# --- the command and the new case ------------------------------------------------------------------------------------

ROWS = """\
rpm,voltage_V,current_A,torque_Nm,duty
10809,12.05,0.80,0,1
9072,11.31,24.6,0.2525,1
6101,12.04,8.51,0.1371,0.62
"""


def run(*arguments: str | Path, stdin: str | None = None) -> tuple[int, str, str]:
    done = CliRunner().invoke(main, [str(argument) for argument in arguments], input=stdin)
    return done.exit_code, done.stdout, done.stderr


def on_disk(folder: Path, case: str = CASE + DRIVE, rows: str = ROWS) -> tuple[Path, Path]:
    path = write_case(folder, case)
    (folder / "bench.csv").write_text(rows)
    return path, folder / "bench.csv"


def test_the_command_reports_and_writes_a_case_that_has_the_motor(tmp_path: Path) -> None:
    text = (CASE + DRIVE).replace('speed_constant = "900 rpm/V"', 'speed_constant = "900 rpm/V"  # of the label')
    case, rows = on_disk(tmp_path, "# mine\n" + text)
    before = case.read_bytes()
    (tmp_path / "sub").mkdir()
    new = tmp_path / "sub" / "new.toml"
    code, shown, said = run("calibrate", case, rows, "--of", "motor", "-o", new)
    assert code == 0, said
    fit = bemt.calibrate_motor(bemt.load(case), rows)
    assert shown == calibration_text(fit, title="test") + "\n"
    assert f"Wrote {new}" in said
    assert "plane of a turning propeller" in said
    assert "Lithium cells" in said
    assert "local rules" in said
    assert case.read_bytes() == before

    loaded = bemt.load(new)
    assert loaded.motor is not None
    assert loaded.motor.speed_constant == pytest.approx(fit.motor.speed_constant, rel=1e-6)
    assert loaded.motor.winding_resistance == pytest.approx(fit.motor.winding_resistance, rel=1e-6)
    speed = np.linspace(100.0, 1000.0, 5)
    assert loaded.motor.no_load_current(speed) == pytest.approx(fit.motor.no_load_current(speed), rel=1e-5)
    written = new.read_text()
    for kept in ("# mine", "# of the label", 'stations = "../blade.csv"', "capacity"):
        assert kept in written
    for told in ("bench.csv", bemt.__version__, "speed constant:", "+-"):
        assert told in written.partition("# mine")[0]
    old, found = tomllib.loads(text), tomllib.loads(written)
    for document in (old, found):
        for key in ("speed_constant", "winding_resistance", "no_load"):
            del document["motor"][key]
        del document["propeller"]["stations"]
    assert old == found


@pytest.mark.parametrize(
    "motor",
    [
        '[[motor.no_load]]\nvoltage = "10 V"\ncurrent = "0.8 A"\n',
        'label_only = true\n[battery]\ncapacity = "2 A*h"\n',
        'no_load = [\n  { voltage = "10 V", current = "0.8 A" }, # cold\n]\r\n[battery]\r\ncapacity = "2 A*h"\n',
    ],
)
def test_every_way_to_write_the_motor_is_kept(motor: str) -> None:
    text = f'[propeller]\nblades = 2 # two\n[motor]\nspeed_constant = "900 rpm/V" # label\n{motor}'
    found = with_motor(text, MOTOR, remarks=["by hand"], folder=".", new_folder=".")
    document = tomllib.loads(found)
    assert document["motor"].pop("no_load") == [{"voltage": "10 V", "current": "0.8 A"}]
    assert document["motor"] == {"speed_constant": "900 rpm/V", "winding_resistance": "50 mohm"}
    assert document["propeller"] == {"blades": 2}
    assert found.startswith("# by hand")
    assert "# two" in found
    assert "# label" in found


def test_inline_and_dotted_tables_are_kept() -> None:
    for text in (
        'motor = { speed_constant = "900 rpm/V", count = 2 }\n[propeller]\nblades = 2\n',
        'motor.speed_constant = "900 rpm/V"\nmotor.count = 2\n[propeller]\nblades = 2\n',
    ):
        document = tomllib.loads(with_motor(text, MOTOR, remarks=[], folder=".", new_folder="."))
        assert document["motor"]["count"] == 2
        assert document["motor"]["winding_resistance"] == "50 mohm"
        assert document["propeller"] == {"blades": 2}


def test_a_label_is_enough_to_begin_with(tmp_path: Path) -> None:
    label = DRIVE.replace('winding_resistance = "50 mohm"\nno_load = [ { voltage = "10 V", current = "0.8 A" } ]', "")
    case, rows = on_disk(tmp_path, CASE + label.replace("[motor]", "[motor]\nlabel_only = true"))
    assert "label_only" in case.read_text()
    code, _, said = run("calibrate", case, rows, "--of", "motor", "-o", tmp_path / "new.toml")
    assert code == 0, said
    measured = fit_motor(load_readings(rows, diameter=0.3, air=standard_air()), start=LABEL)
    motor = bemt.load(tmp_path / "new.toml").motor
    assert motor is not None
    assert motor.winding_resistance == pytest.approx(measured.motor.winding_resistance, rel=1e-3)
    assert "label_only" not in (tmp_path / "new.toml").read_text()


def test_several_files_and_standard_input(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    case, rows = on_disk(tmp_path)
    (tmp_path / "more.csv").write_text("rpm,voltage_V,current_A,duty\n8900,11.7,16.4,1\n")
    monkeypatch.chdir(tmp_path)
    code, shown, said = run("calibrate", "-", rows, "more.csv", "--of", "motor", "-o", "n.toml", stdin=case.read_text())
    assert code == 0, said
    assert "4 rows of" in shown
    assert bemt.load("n.toml").motor is not None


HEADER, *LINES = ROWS.splitlines()

# Name: case, rows, file and line that must be named (or neither), words that must be there.
WRONG = {
    "no motor": (CASE, ROWS, "", "the case has no [motor]"),
    "nothing of the motor": (CASE + DRIVE, "rpm,thrust_N\n5000,2\n", "", "no row says anything of the motor"),
    "unknown column": (CASE + DRIVE, ROWS.replace("duty", "throttle"), "bench.csv:1: throttle", "throttle"),
    "duty in per cent": (CASE + DRIVE, ROWS.replace("0.62", "62"), "bench.csv:4: duty", "no share"),
    "rpm of zero": (CASE + DRIVE, ROWS.replace("6101", "0"), "bench.csv:4: rpm", "more than 0"),
    "empty cell": (CASE + DRIVE, ROWS.replace("24.6", ""), "bench.csv:3: current_A", "is empty"),
    "torque and power": (
        CASE + DRIVE, "\n".join([HEADER + ",shaft_power_W", *(row + ",0" for row in LINES)]), "bench.csv:1", "same as",
    ),
    "only impossible rows": (
        CASE + DRIVE, "rpm,voltage_V,current_A,torque_Nm\n8000,11,1,0.3\n", "", "no row says anything",
    ),
    "case itself wrong": (CASE + DRIVE.replace("900 rpm/V", "900"), ROWS, "case.toml", "speed_constant"),
}  # fmt: skip


@pytest.mark.parametrize("name", WRONG)
def test_wrong_inputs_end_with_3_and_write_nothing(name: str, tmp_path: Path) -> None:
    case, rows, place, needed = WRONG[name]
    path, table = on_disk(tmp_path, case, rows)
    code, shown, said = run("calibrate", path, table, "--of", "motor", "-o", tmp_path / "new.toml")
    assert (code, shown) == (3, "")
    assert place in said
    assert needed in said
    assert "Traceback" not in said
    assert not (tmp_path / "new.toml").exists()


def test_wrong_usage_is_2_and_writes_nothing(tmp_path: Path) -> None:
    case, rows = on_disk(tmp_path)
    before = case.read_bytes()
    link = tmp_path / "link.toml"
    link.symlink_to(case)
    for arguments, needed in (
        ([case, rows], "calibrating a propeller is not available in this version"),
        ([case, rows, "--of", "motor", "-o", case], "is the case itself"),
        ([case, rows, "--of", "motor", "-o", link], "is the case itself"),
        ([case, rows, "--of", "motor", "-o", tmp_path / "new.csv"], "must end in .toml"),
        ([case, tmp_path / "none.csv", "--of", "motor"], "does not exist"),
        ([case, "--of", "motor"], "Missing argument"),
    ):
        code, shown, said = run("calibrate", *arguments)
        assert (code, shown) == (2, "")
        assert needed in said
    code, _, said = run("calibrate", case, rows, "--of", "motor", "-o", tmp_path / "nowhere" / "new.toml")
    assert code == 1
    assert "there is no folder" in said
    assert case.read_bytes() == before
    with pytest.raises(InputError, match="at least one file"):
        bemt.calibrate_motor(bemt.load(case))


# --- measured motors -------------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def motors() -> ModuleType:
    """The script that makes the tables of docs/calibrate.md."""
    path = Path(__file__).parent.parent / "docs" / "make_motors.py"
    spec = importlib.util.spec_from_file_location("make_motors", path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_measured_currents_are_met_on_runs_left_out(motors: ModuleType) -> None:
    found = motors.left_out_runs()
    assert set(found) == {"1", "2", "3", "4", "6"}
    print(motors.motor_table())
    for name, (fit, bias, rms) in found.items():
        assert rms <= 0.06, name
        assert abs(bias) <= 0.03, name
        assert fit.untold == ("speed_constant",)


def test_measured_rpm_is_met_by_the_constants_of_another_motor(motors: ModuleType) -> None:
    for fit, bias, rms, _, current_rms in motors.crossed_motors().values():
        assert abs(bias) <= 0.03
        assert rms <= 0.05
        assert rms < min(motors.rpm_errors(motors.label(), motors.with_stand_torque(name))[1] for name in "AB")
        assert current_rms <= 0.06
        share, sigmas = fit.label_difference
        assert share > 0.1
        assert sigmas > 5.0
        assert len(fit.beyond_label) == 1
        assert "telemetry_run" in fit.beyond_label[0]
        assert "contradict" in words(fit)


def test_the_faulty_run_is_found_out() -> None:
    case = bemt.load(MOTORS / "stand.toml")
    fit = bemt.calibrate_motor(case, MOTORS / "stand_run_5.csv")
    assert [place.rpartition("/")[2].partition(" ")[0] for place, _ in fit.left_out] == [
        "stand_run_5.csv:2",
        "stand_run_5.csv:3",
    ]
    assert {reason for _, reason in fit.left_out} == {motor_fit.MORE_THAN_ALL}
    for run_name in "12346":
        assert not bemt.calibrate_motor(case, MOTORS / f"stand_run_{run_name}.csv").left_out


def test_the_page_is_in_step(motors: ModuleType) -> None:
    text = motors.PAGE.read_text(encoding="utf-8")
    assert motors.page(text) == text


def test_places_follow_rows(tmp_path: Path) -> None:
    _, rows = on_disk(tmp_path)
    read = load_readings(rows, diameter=0.3, air=standard_air())
    assert read.places == tuple(f"{rows}:{line}" for line in (2, 3, 4))
    assert read.only(np.array([False, True, True])).places == read.places[1:]
    assert Readings.joined([read, read]).places == read.places * 2
    assert Readings.joined([read, replace(read, places=())]).places == ()
    with pytest.raises(InputError, match="places"):
        replace(read, places=("one",))
