"""Guesses from a motor's label, and doubts about it: their laws, and what a user is told."""

from __future__ import annotations

import math
from dataclasses import replace
from pathlib import Path

import pytest
from case_files import CASE, write_case

import bemt
from bemt.drive import Motor, speed_constant_from_rpm
from bemt.drive.label import Stator, doubts, guessed_no_load_current, guessed_resistance
from bemt.errors import InputError

KV = speed_constant_from_rpm(920.0)


@pytest.mark.parametrize(
    ("rpm_per_volt", "resistance", "current"),
    [
        # From memory: usual ranges of motors for propellers of 18 to 30, 12 to 16, 9 to 11 and 5 to 6 in.
        (175.0, (0.010, 0.050), (0.8, 2.5)),
        (500.0, (0.030, 0.080), (0.6, 1.5)),
        (950.0, (0.030, 0.100), (0.6, 1.6)),
        (2100.0, (0.050, 0.120), (0.7, 1.5)),
    ],
)
def test_guesses_lie_in_the_middle_of_the_usual_ranges(rpm_per_volt, resistance, current):
    kv = speed_constant_from_rpm(rpm_per_volt)
    assert guessed_resistance(kv) == pytest.approx(math.sqrt(resistance[0] * resistance[1]), rel=0.02)
    assert guessed_no_load_current(kv) == pytest.approx(math.sqrt(current[0] * current[1]), rel=0.02)


def test_guesses_run_straight_between_the_classes_on_logarithmic_scales():
    between = speed_constant_from_rpm(math.sqrt(500.0 * 950.0))
    ends = [speed_constant_from_rpm(value) for value in (500.0, 950.0)]
    for guess in (guessed_resistance, guessed_no_load_current):
        assert guess(between) == pytest.approx(math.sqrt(guess(ends[0]) * guess(ends[1])), rel=1e-12)
        assert guess(speed_constant_from_rpm(9000.0)) == guess(speed_constant_from_rpm(2100.0))


@pytest.mark.parametrize(
    ("label", "rpm_per_volt", "resistance"),
    [("2207", 1750, 0.065), ("2212", 920, 0.14), ("2814", 1000, 0.035), ("3508", 700, 0.07), ("4014", 400, 0.06)],
)
def test_a_stator_makes_a_better_guess(label, rpm_per_volt, resistance):
    # Resistances from memory of common motors of these labels.
    kv, stator = speed_constant_from_rpm(rpm_per_volt), Stator.of(label)
    assert guessed_resistance(kv, stator) == pytest.approx(resistance, rel=0.4)
    # Half the turns of twice the section: Kv doubles, a quarter of the resistance remains.
    assert stator.usual_resistance(2.0 * kv) == pytest.approx(0.25 * stator.usual_resistance(kv), rel=1e-12)


def test_a_stator_that_does_not_fit_the_speed_constant_is_no_help():
    kv = speed_constant_from_rpm(100.0)
    assert guessed_resistance(kv, Stator.of("2204")) == guessed_resistance(kv)
    motor = Motor(kv, guessed_resistance(kv), ((10.0, 1.0),))
    (doubt,) = doubts(motor, Stator.of("2204"), resistance_guessed=True)
    assert "100 rpm/V on a stator of 22 by 4 mm" in doubt


def test_doubts():
    motor, stator = Motor(KV, 0.14, ((10.0, 0.6),), current_limit=15.0), Stator.of("2212")
    assert doubts(motor, stator) == ()
    assert doubts(replace(motor, current_limit=None), stator) == ()
    (slip,) = doubts(replace(motor, winding_resistance=1.4), replace(stator, height=13.0))
    assert "1.4 ohm at 920 rpm/V" in slip
    (limit,) = doubts(replace(motor, current_limit=90.0), stator)
    assert "90 A" in limit
    assert "22 by 12 mm" in limit


@pytest.mark.parametrize("label", ["281", "28145", "28x14", "", "0014", "2800", "\u0662\u0668\u0661\u0664"])
def test_labels_that_are_none(label):
    with pytest.raises(InputError) as caught:
        Stator.of(label)
    assert caught.value.field == "label"


MOTOR = '[motor]\nspeed_constant = "920 rpm/V"\n'


def motor_case(folder: Path, lines: str) -> bemt.Case:
    return bemt.load(write_case(folder, CASE + MOTOR + lines))


def test_a_case_with_a_label_alone_says_so_loudly(tmp_path):
    case = motor_case(tmp_path, "label_only = true\n")
    assert case.motor is not None
    assert case.motor.winding_resistance == guessed_resistance(KV)
    assert case.motor.no_load == ((10.0, guessed_no_load_current(KV)),)
    (note,) = [note for note in case.notes if "only Kv is known" in note]
    for words in ("resistance 54.7 mohm", "no-load current 0.98 A", "from memory", "40 % or more", "bemt calibrate"):
        assert words in note


def test_what_is_given_is_not_guessed(tmp_path):
    case = motor_case(tmp_path, 'label_only = true\nlabel = "2212"\nwinding_resistance = "130 mohm"\n')
    assert case.motor is not None
    assert case.motor.winding_resistance == pytest.approx(0.130)
    (note,) = [note for note in case.notes if "only Kv is known" in note]
    assert "resistance" not in note
    assert not any("label" in note for note in case.notes)


def test_a_label_that_contradicts_the_values_is_said(tmp_path):
    case = motor_case(
        tmp_path,
        'label = "4114"\nwinding_resistance = "300 mohm"\nno_load = [ { voltage = "10 V", current = "0.6 A" } ]\n'
        'winding_temperature = "60 degC"\n',
    )
    (note,) = [note for note in case.notes if "label" in note]
    assert '"4114"' in note
    assert "300 mohm" in note
    assert case.motor is not None
    assert case.motor.resistance == pytest.approx(0.3 * (1.0 + 0.00393 * 40.0))
