"""The constants of a motor found on a bench: a short report for a terminal, and the new case."""

from __future__ import annotations

import math
import os
import textwrap
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from bemt.errors import InputError
from bemt.files.atomic import check_target, replacing
from bemt.version import __version__

if TYPE_CHECKING:
    from bemt.case.load import Case
    from bemt.study.motor_fit import MotorFit

_WIDTH = 100
_MOST_ROWS = 24
_RPM_PER_V = 30.0 / math.pi

# Name of the fit: key of the case or plain name, unit, factor from SI, decimals.
_SHOWN = {
    "speed_constant": ("speed constant", "rpm/V", _RPM_PER_V, 1),
    "winding_resistance": ("winding resistance", "mohm", 1e3, 2),
    "no_load_current": ("no-load current", "A", 1.0, 3),
    "no_load_growth": ("  share that grows with speed", "", 1.0, 3),
    "figure_of_merit": ("figure of merit, assumed propeller", "", 1.0, 3),
    "power_exponent": ("  its exponent of speed", "", 1.0, 3),
}


def calibration_text(fit: MotorFit, *, title: str = "") -> str:
    """Print the constants found on a bench in short.

    Parameters
    ----------
    fit : MotorFit
        From `bemt.calibrate_motor`.
    title : str
        First line; left out where empty.

    Returns
    -------
    str
        Constants with their standard uncertainties and correlations, what the rows could not tell and which reading
        would, and the residuals of the rows.
    """
    lines = [title, ""] if title else []
    rows = int(fit.used.sum())
    lines += [f"{rows} rows of {fit.readings.source}" + (f", {len(fit.left_out)} left out" if fit.left_out else ""), ""]
    lines += [*_constants(fit), "", *_correlations(fit)]
    for sentence in sentences(fit):
        lines += textwrap.wrap(sentence, _WIDTH, initial_indent="- ", subsequent_indent="  ")
    lines += ["", *_residuals(fit), ""]
    lines.append(
        "Standard uncertainties. w = Kv (d Vb - I (R + Ron)), Q = (I - I0)/Kv, supply power = motor power + controller."
    )
    return "\n".join(lines)


def _constants(fit: MotorFit) -> Iterator[str]:
    before = {
        "speed_constant": fit.start.speed_constant,
        "winding_resistance": fit.start.winding_resistance,
        "no_load_current": float(fit.start.no_load_current(fit.reference_speed)),
    }
    yield f"{'':36}{'found':>10}{'+-':>10}{'case':>10}{'rows tell':>12}"
    for name, value, spread, left in zip(fit.names, fit.values, fit.uncertainties, fit.shrinkage, strict=True):
        words, unit, factor, decimals = _SHOWN[name]
        if name == "no_load_current":
            words += f" at {fit.reference_speed * _RPM_PER_V:.0f} rpm"
        told = "held" if left == 0.0 else "no" if name in fit.untold else "yes" if left < 0.2 else "in part"
        given = f"{before[name] * factor:10.{decimals}f}" if name in before else f"{'-':>10}"
        label = f"{words} [{unit}]" if unit else words
        yield f"{label:36}{value * factor:10.{decimals}f}{spread * factor:10.{decimals}f}{given}{told:>12}"


def _correlations(fit: MotorFit) -> Iterator[str]:
    correlation = fit.correlation
    pairs = [
        f"{_SHOWN[fit.names[i]][0].strip()} with {_SHOWN[fit.names[j]][0].strip()} {correlation[i, j]:+.2f}"
        for i in range(len(fit.names))
        for j in range(i)
        if abs(correlation[i, j]) >= 0.5
    ]
    if pairs:
        yield from textwrap.wrap("Correlated: " + "; ".join(pairs) + ".", _WIDTH)
        yield ""


def sentences(fit: MotorFit) -> list[str]:
    """Say in words what the rows could not tell, what would, and what contradicts what.

    Parameters
    ----------
    fit : MotorFit
        From `bemt.calibrate_motor`.

    Returns
    -------
    list of str
        At least one.
    """
    found = []
    free_running = bool((fit.with_torque & (np.nan_to_num(_column(fit, "torque"), nan=1.0) == 0.0)).any())
    if fit.with_propeller.any():
        found.append(
            "Motor and propeller are both unknown in rows of thrust, electric power and rpm without torque or duty: "
            "electric power is shaft power plus losses, so that the propeller's power coefficient (its figure of "
            "merit) trades against winding resistance and no-load current, and the speed constant does not show at "
            "all. Numbers found from such rows alone are assumptions in the main."
        )
        found.append(
            "What would part the two: a row of the motor running free (voltage_V, current_A, rpm, torque_Nm 0), which "
            "tells the no-load current, and with its duty (1 at full throttle) the speed constant; a torque on loaded "
            "rows; or the winding resistance from a known direct current through two leads, put into the case and "
            "kept with --hold winding_resistance."
        )
    for combination in fit.untold_combinations:
        if not set(combination) <= set(_SHOWN) or (fit.with_propeller.any() and len(fit.untold_combinations) > 1):
            continue
        names = [_SHOWN[name][0].strip() for name in combination]
        if len(names) > 1:
            found.append(
                f"The rows do not tell {', '.join(names[:-1])} and {names[-1]} apart: they trade against each other."
            )
    if "speed_constant" in fit.untold:
        found.append(
            "The speed constant is not told by these rows and stays near that of the case. Voltage, current, rpm and "
            "torque tell R Kv^2 and I0/Kv alone, which is all the supply current depends on; rows with their duty (1 "
            "at full throttle) tell the speed constant."
        )
    if "winding_resistance" in fit.untold:
        found.append(
            "The winding resistance is not told: a row of large current would tell it (with duty, or with torque), or "
            "a known direct current through two leads of the motor standing still."
        )
    if "no_load_current" in fit.untold and not free_running:
        found.append("The no-load current is not told: a row of the motor running free, torque_Nm 0, would tell it.")
    if not fit.untold and not fit.with_propeller.any():
        found.append("The rows tell all constants.")
    if fit.scatter > 1.5:
        found.append(
            f"The rows scatter about the model {fit.scatter:.1f} times as much as their uncertainties allow; the "
            "uncertainties above are widened by that. A motor is not quite three constants, or readings are off."
        )
    found += _label_sentences(fit)
    return found


def _label_sentences(fit: MotorFit) -> Iterator[str]:
    share, sigmas = fit.label_difference
    given, found = (Kv * _RPM_PER_V for Kv in (fit.start.speed_constant, fit.motor.speed_constant))
    if "speed_constant" not in fit.untold and abs(sigmas) >= 2.0 and abs(share) >= 0.01:
        yield (
            f"The rows contradict the case's speed constant of {given:.0f} rpm/V: {found:.0f} rpm/V fits them, "
            f"{share:+.1%} or {abs(sigmas):.1f} standard uncertainties away."
        )
    if fit.beyond_label:
        yield (
            f"{_some(fit.beyond_label)}: rpm above speed constant times duty times voltage with the case's {given:.0f} "
            "rpm/V, which a motor cannot reach even without losses. The label's speed constant is not the motor's, or "
            "the duty is not what it says."
        )


def notices(fit: MotorFit) -> list[str]:
    """Say which rows were left out and why.

    Parameters
    ----------
    fit : MotorFit
        From `bemt.calibrate_motor`.

    Returns
    -------
    list of str
        One a reason.
    """
    reasons: dict[str, list[str]] = {}
    for place, reason in fit.left_out:
        reasons.setdefault(reason, []).append(place)
    return [f"{_some(places)}: left out: {reason}" for reason, places in reasons.items()]


def _some(places: list[str] | tuple[str, ...]) -> str:
    more = len(places) - 5
    return ", ".join(places[:5]) + (f" and {more} more" if more > 0 else "")


def _column(fit: MotorFit, name: str) -> np.ndarray[tuple[int, ...], np.dtype[np.float64]]:
    values = getattr(fit.readings, name)
    return np.full(fit.used.shape, np.nan) if values is None else np.asarray(values)


def _residuals(fit: MotorFit) -> Iterator[str]:
    """Errors of current and rpm over the used rows, and the rows themselves, thinned where they are many."""
    rpm, measured = fit.readings.rpm, _column(fit, "current")
    power, voltage = _column(fit, "electric_power"), _column(fit, "voltage")
    power = np.where(np.isfinite(power), power, voltage * measured)
    for name, predicted, true, over in (
        ("supply current from voltage, rpm and torque", fit.current, power / voltage, "largest current"),
        (
            "supply power with the assumed propeller",
            np.where(fit.with_propeller, fit.supply_power, np.nan),
            power,
            "largest power",
        ),
        ("rpm from duty and voltage, with torque or current", fit.rpm, rpm, "highest rpm"),
    ):
        error = np.where(fit.used, predicted - true, np.nan)
        known = np.isfinite(error)
        if known.any():
            error = error[known] / np.abs(true[known]).max()
            yield f"{name}: bias {error.mean():+.1%}, rms {np.sqrt(np.mean(error**2)):.1%} of the {over}"
    yield ""
    yield f"{'rpm':>8}{'fitted':>8}{'supply W':>10}{'fitted':>10}   row"
    rows = np.flatnonzero(fit.used)
    for row in rows[np.unique(np.linspace(0, rows.size - 1, min(rows.size, _MOST_ROWS)).round().astype(int))]:
        place = fit.readings.places[row] if fit.readings.places else str(row + 1)
        numbers = (_number(rpm[row], 8, 0), _number(fit.rpm[row], 8, 0))
        powers = (_number(power[row], 10, 2), _number(fit.supply_power[row], 10, 2))
        yield "".join((*numbers, *powers)) + f"   {place}"


def _number(value: float, width: int, decimals: int) -> str:
    return f"{value:{width}.{decimals}f}" if math.isfinite(value) else f"{'-':>{width}}"


def check_new_case(case: Case, target: str) -> None:
    """Refuse a place where the new case cannot be written, before anything is computed.

    Parameters
    ----------
    case : Case
        The old case.
    target : str
        File of the new one.

    Raises
    ------
    InputError
        If it is the old case itself, or its name does not end in .toml.
    RunError
        If the place cannot be written to.
    """
    if not target.endswith(".toml"):
        raise InputError("output", f"{target!r} must end in .toml: it is a case")
    if case.path != "-" and os.path.realpath(target) == os.path.realpath(case.path):
        raise InputError("output", "is the case itself; a calibration writes a new case beside it")
    check_target(target)


def write_calibrated_case(case: Case, fit: MotorFit, target: str) -> None:
    """Write the case with the motor's constants replaced by those found.

    Parameters
    ----------
    case : Case
        The old case; its file stays as it is.
    fit : MotorFit
        From `bemt.calibrate_motor`.
    target : str
        File of the new case.

    Raises
    ------
    InputError
        If it is the old case itself.
    RunError
        If it cannot be written.
    """
    from bemt.case.rewrite import with_motor

    check_new_case(case, target)
    folder = os.getcwd() if case.path == "-" else os.path.dirname(os.path.abspath(case.path))
    text = with_motor(
        case.text,
        fit.motor,
        remarks=_provenance(fit),
        folder=folder,
        new_folder=os.path.dirname(os.path.abspath(os.path.realpath(target))),
    )
    with replacing([target]) as (draft,):
        Path(draft).write_text(text, encoding="utf-8", newline="\n")


def _provenance(fit: MotorFit) -> list[str]:
    lines = textwrap.wrap(
        "[motor] speed_constant, winding_resistance and no_load found by bemt calibrate --of motor, version "
        f"{__version__}, from {int(fit.used.sum())} rows of {fit.readings.source}.",
        _WIDTH,
    )
    for name, value, spread in zip(fit.names, fit.values, fit.uncertainties, strict=True):
        words, unit, factor, decimals = _SHOWN[name]
        untold = ", not told by the rows" if name in fit.untold else ""
        lines.append(
            f"{words.strip()}: {value * factor:.{decimals}f} +- {spread * factor:.{decimals}f} {unit}".rstrip() + untold
        )
    return lines
