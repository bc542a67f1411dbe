"""Write the table of measured motors into docs/calibrate.md.

    python docs/make_motors.py

Constants found on some runs of the stand logs in tests/measured/motors, judged on runs that took no part. What stands
between the two marker lines of the page is replaced; a test holds the page to the code.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path

import numpy as np

import bemt
from bemt.case.readings import Readings, load_readings
from bemt.drive import Controller, Motor
from bemt.study.motor_fit import MotorFit, fit_motor, rpm_at_duty, supply_current

ROOT = Path(__file__).parent.parent
MOTORS = ROOT / "tests" / "measured" / "motors"
PAGE = Path(__file__).with_name("calibrate.md")
BEGIN = "<!-- made by docs/make_motors.py: do not edit from here -->"
END = "<!-- to here -->"

STAND_RUNS = ("1", "2", "3", "4", "6")
"""Run 5 is left out: at its lowest speeds more power leaves the shaft than enters the controller."""

TELEMETRY = {"A": ("telemetry_run_1", "stand_run_1"), "B": ("telemetry_run_2", "stand_run_4")}
"""Motor as the telemetry names it, its run there, and the stand run of the same rpm, which has the torque."""

CONTROLLER = Controller()
"""Nothing is known of the one on the stand: its losses count with the motor's resistance and no-load current."""


def readings(name: str) -> Readings:
    """Read one run."""
    case = bemt.load(MOTORS / "stand.toml")
    return load_readings(MOTORS / f"{name}.csv", diameter=case.propeller.diameter, air=case.air)


def label() -> Motor:
    """Return the motor as labelled, with the guesses from which the search begins."""
    motor = bemt.load(MOTORS / "stand.toml").motor
    assert motor is not None
    return motor


def errors(predicted: np.ndarray, measured: np.ndarray) -> tuple[float, float]:
    """Return bias and rms as shares of the run's maximum."""
    found = (predicted - measured) / measured.max()
    return float(found.mean()), float(np.sqrt(np.mean(found**2)))


def current_errors(motor: Motor, run: Readings) -> tuple[float, float]:
    """Judge the supply current from supply voltage, rpm and torque."""
    assert run.voltage is not None
    assert run.current is not None
    assert run.torque is not None
    found = supply_current(motor, CONTROLLER, voltage=run.voltage, rpm=run.rpm, torque=run.torque)
    return errors(found, run.current)


def rpm_errors(motor: Motor, run: Readings) -> tuple[float, float]:
    """Judge the rpm from duty, supply voltage and torque."""
    assert run.voltage is not None
    assert run.duty is not None
    assert run.torque is not None
    found = rpm_at_duty(motor, CONTROLLER, voltage=run.voltage, duty=run.duty, torque=run.torque)
    return errors(found, run.rpm)


def left_out_runs() -> dict[str, tuple[MotorFit, float, float]]:
    """Fit on all stand runs but one and judge the one: fit, bias and rms by the run left out."""
    runs = {name: readings(f"stand_run_{name}") for name in STAND_RUNS}
    found = {}
    for name, run in runs.items():
        fit = fit_motor(Readings.joined([other for key, other in runs.items() if key != name]), start=label())
        found[name] = (fit, *current_errors(fit.motor, run))
    return found


def with_stand_torque(motor: str, *, own_current: bool = False) -> Readings:
    """Return the telemetry of a motor with the torque of its stand run, and without its own current unless asked for.

    The propeller is the same, so that torque over rpm squared is taken from the stand run at the same rpm. The power
    that the telemetry reports is mostly some 20 % below that of the stand's supply at the same rpm: one of the two is
    wrong, and the stand has the better instrument.
    """
    telemetry, stand = (readings(name) for name in TELEMETRY[motor])
    assert stand.torque is not None
    order = np.argsort(stand.rpm)
    shape = np.interp(telemetry.rpm, stand.rpm[order], (stand.torque / stand.rpm**2)[order])
    current = telemetry.current if own_current else None
    return replace(telemetry, torque=shape * telemetry.rpm**2, current=current)


def crossed_motors() -> dict[str, tuple[MotorFit, float, float, float, float]]:
    """Fit on both runs of one motor and judge those of the other: errors of rpm and of current by the motor judged."""
    found = {}
    for fitted, judged in (("B", "A"), ("A", "B")):
        fit = fit_motor(
            Readings.joined([readings(TELEMETRY[fitted][1]), with_stand_torque(fitted)]), CONTROLLER, start=label()
        )
        found[judged] = (
            fit,
            *rpm_errors(fit.motor, with_stand_torque(judged)),
            *current_errors(fit.motor, readings(TELEMETRY[judged][1])),
        )
    return found


def other_choices() -> dict[str, dict[str, tuple[float, float]]]:
    """Judge the rpm by constants from other choices of rows of the other motor: errors by choice and motor judged."""

    def fitted(rows: Readings) -> Motor:
        return fit_motor(rows, CONTROLLER, start=label()).motor

    choices: dict[str, Callable[[str], Motor]] = {
        "both logs, as above": lambda other: fitted(
            Readings.joined([readings(TELEMETRY[other][1]), with_stand_torque(other)])
        ),
        "telemetry with the stand's torque, without a current": lambda other: fitted(with_stand_torque(other)),
        "telemetry with the stand's torque and its own current": lambda other: fitted(
            with_stand_torque(other, own_current=True)
        ),
        "telemetry alone: duty and its own current": lambda other: fitted(readings(TELEMETRY[other][0])),
        "none: the label and our guesses": lambda other: label(),  # noqa: ARG005
    }
    return {
        choice: {judged: rpm_errors(motor(other), with_stand_torque(judged)) for judged, other in ("AB", "BA")}
        for choice, motor in choices.items()
    }


def motor_table() -> str:
    """Return the tables as Markdown."""
    return "\n".join([*_currents(), "", *_speeds(), "", *_choices()])


def _constants(fit: MotorFit) -> str:
    factors = {"speed_constant": 30.0 / math.pi, "winding_resistance": 1e3, "no_load_current": 1.0}
    decimals = {"speed_constant": 0, "winding_resistance": 0, "no_load_current": 2}
    cells = []
    for name, factor in factors.items():
        value, spread = fit.value(name)
        cells.append(f"{value * factor:.{decimals[name]}f} ± {spread * factor:.{decimals[name]}f}")
    return " | ".join(cells)


def _currents() -> Iterator[str]:
    yield "| judged, not fitted: stand run | rows | Kv, rpm/V | R, mΩ | I0, A | current: bias | rms |"
    yield "|---|---|---|---|---|---|---|"
    for name, (fit, bias, rms) in left_out_runs().items():
        rows = readings(f"stand_run_{name}").rpm.size
        yield f"| {name} | {rows} | {_constants(fit)} | {bias:+.1%} | {rms:.1%} |"


def _speeds() -> Iterator[str]:
    yield "| judged, not fitted: motor | Kv, rpm/V | R, mΩ | I0, A | rpm: bias | rms | current: bias | rms |"
    yield "|---|---|---|---|---|---|---|---|"
    for name, (fit, *found) in crossed_motors().items():
        bias, rms, current_bias, current_rms = found
        cells = f"{_constants(fit)} | {bias:+.1%} | {rms:.1%} | {current_bias:+.1%} | {current_rms:.1%}"
        yield f"| {name} | {cells} |"


def _choices() -> Iterator[str]:
    yield "| constants from, of the other motor | rpm of A: bias | rms | rpm of B: bias | rms |"
    yield "|---|---|---|---|---|"
    for choice, found in other_choices().items():
        cells = " | ".join(f"{bias:+.1%} | {rms:.1%}" for bias, rms in found.values())
        yield f"| {choice} | {cells} |"


def page(text: str) -> str:
    """Return the page with its tables renewed."""
    head, begin, rest = text.partition(BEGIN)
    _, end, tail = rest.partition(END)
    if not begin or not end:
        raise ValueError(f"{PAGE} lacks a marker line")
    return f"{head}{BEGIN}\n\n{motor_table()}\n\n{END}{tail}"


if __name__ == "__main__":
    PAGE.write_text(page(PAGE.read_text(encoding="utf-8")), encoding="utf-8", newline="\n")
