"""A comparison with measured points as a short report for a terminal."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from bemt.study.compare import Comparison, Errors, Remedy, Run

_MISSING = "-"
_WIDTH = 100


def comparison_text(comparison: Comparison, *, title: str = "") -> str:
    """Print a comparison in short.

    Parameters
    ----------
    comparison : Comparison
        From `bemt.compare`.
    title : str
        First line; left out where empty.

    Returns
    -------
    str
        Errors over the moving rows and standing still, peak efficiency and zero-thrust advance ratio of every run,
        what one change to the whole blade would leave, and what the errors look like in words.
    """
    lines = [title, ""] if title else []
    lines += [*_heading(comparison), "", *_errors(comparison.errors), ""]
    if comparison.runs:
        lines += [*_landmarks(comparison.runs), ""]
    if comparison.remedies:
        lines += [*_what_is_left(comparison), ""]
        for sentence in sentences(comparison):
            lines += textwrap.wrap(sentence, _WIDTH, initial_indent="- ", subsequent_indent="  ")
        lines.append("")
    lines.append("J = V/(nD), CT = T/(rho n^2 D^4), CP = P/(rho n^3 D^5), eta = J CT/CP, n in rev/s.")
    return "\n".join(lines)


def sentences(comparison: Comparison) -> list[str]:
    """Say in words what the errors look like.

    Parameters
    ----------
    comparison : Comparison
        From `bemt.compare`.

    Returns
    -------
    list of str
        One for the blade angle, and one for each further remedy that is worth saying.
    """
    found = []
    for remedy in comparison.remedies:
        if remedy.quantity == "blade_angle":
            found.append(_angle_sentence(remedy, comparison))
        elif remedy.worth_saying:
            found.append(_SENTENCES[remedy.quantity](remedy, comparison))
    if len(found) == 1 and len(comparison.remedies) > 1:
        found.append("Neither another drag nor another stall of the sections would mend much of what is left.")
    return found


def _angle_sentence(remedy: Remedy, comparison: Comparison) -> str:
    angle = math.degrees(remedy.best)
    rows = "moving rows" if comparison.moving.any() else "static rows"
    if not remedy.worth_saying:
        return f"The blade angle fits: turning the blade by {angle:+.1f} deg would serve the {rows} hardly better."
    way, other = ("larger", "lower") if angle > 0.0 else ("smaller", "higher")
    if remedy.at_limit:
        return (
            f"The blade acts as if its angle were {abs(angle):.1f} deg {way} or more, the end of what was tried: look "
            "for another mistake first, such as units, diameter, pole pairs or a column taken for another."
        )
    return (
        f"The blade acts as if its angle were {abs(angle):.1f} deg {way}, or the zero-lift angle of its sections "
        f"as much {other}; the {rows} cannot tell which."
    )


def _drag_sentence(remedy: Remedy, comparison: Comparison) -> str:  # noqa: ARG001
    factor = remedy.best / remedy.given
    way = "low" if factor > 1.0 else "high"
    least = "at least " if remedy.at_limit else ""
    return (
        f"Section drag looks too {way} by {least}about {abs(1.0 - 1.0 / factor):.0%} of the true one: drag_scale "
        f"{remedy.best:.2f} in place of {remedy.given:.2f} would serve better."
    ).replace("%", " %")


def _stall_sentence(remedy: Remedy, comparison: Comparison) -> str:
    more = remedy.best > remedy.given
    share = _percent_mean(comparison.predicted.stalled_share[comparison.static])
    error = comparison.remedies[0].errors.static_thrust
    where = ""
    if math.isfinite(error) and (error < 0.0) == more:
        where = (
            f": static thrust is {abs(error) * 100:.0f} % {'low' if error < 0 else 'high'} where {share} % of the span "
            "is stalled"
        )
    whole = ", the whole law," if more and remedy.at_limit else ""
    return (
        f"Stall comes too {'early' if more else 'late'}{where}. stall_strength {remedy.best:.2f}{whole} in place of "
        f"{remedy.given:.2f} would serve better."
    )


_SENTENCES = {"drag_scale": _drag_sentence, "stall_strength": _stall_sentence}


def _heading(comparison: Comparison) -> Iterator[str]:
    moving, still = int(comparison.moving.sum()), int(comparison.still.sum())
    yield f"{comparison.readings.source}: {_rows(moving)} moving, {_rows(still)} standing still."
    if comparison.static.any():
        least = comparison.readings.rpm[comparison.static].min()
        origin = f"mean of the {_rows(int(comparison.static.sum()))} standing still from {least:.0f} rpm"
    else:
        origin = "the largest measured, no row standing still"
    values = [
        f"{symbol} {value:.4f}"
        for symbol, value in (("CT", comparison.static_thrust), ("CP", comparison.static_power))
        if math.isfinite(value)
    ]
    yield f"Errors are predicted less measured, in % of {' and '.join(values)} ({origin})."
    for words, rows in (("moving", comparison.moving), ("standing still", comparison.static)):
        if rows.any():
            predicted = comparison.predicted
            yield (
                f"Of the span {words}, in the mean: {_percent_mean(predicted.stalled_share[rows])} % stalled, "
                f"{_percent_mean(predicted.outside_polar_share[rows])} % outside section data, "
                f"{_percent_mean(predicted.low_reynolds_share[rows])} % below Re 60 000."
            )


def _rows(count: int) -> str:
    return f"{count} row" if count == 1 else f"{count} rows"


def _percent_mean(shares: np.ndarray[tuple[int], np.dtype[np.float64]]) -> str:
    known = shares[np.isfinite(shares)]
    return f"{100.0 * known.mean():.0f}" if known.size else _MISSING


def _errors(errors: Errors) -> Iterator[str]:
    yield from _table(
        ("", "CT mean", "CT rms", "CP mean", "CP rms"),
        [
            (
                "moving",
                _percent(errors.thrust_bias),
                _percent(errors.thrust_rms, sign=False),
                _percent(errors.power_bias),
                _percent(errors.power_rms, sign=False),
            ),
            ("standing still", _percent(errors.static_thrust), "", _percent(errors.static_power), ""),
        ],
    )


def _landmarks(runs: Sequence[Run]) -> Iterator[str]:
    rows = []
    for run in runs:
        eta, own_eta, at, own_at, end, own_end = (
            _number(getattr(landmarks, name))
            for name in ("peak_efficiency", "peak_advance_ratio", "zero_thrust_advance_ratio")
            for landmarks in (run.measured, run.predicted)
        )
        rows.append((f"{run.rpm:.0f} rpm", f"{run.rows.size}", eta, own_eta, at, own_at, end, own_end))
    yield from _table(
        ("", "rows", "peak eta", "predicted", "at J", "predicted", "CT = 0 at J", "predicted"),
        rows,
    )
    if any(_MISSING in row for row in rows):
        yield f"{_MISSING} where the rows, or the line predicted through them, do not bracket it."


def _what_is_left(comparison: Comparison) -> Iterator[str]:
    rows = [("as given", *_left(comparison.errors))]
    for remedy in comparison.remedies:
        change = "" if remedy.quantity == "blade_angle" else f", {remedy.quantity} {remedy.best:.2f}"
        rows.append((f"turned by {math.degrees(remedy.angle):+.2f} deg{change}", *_left(remedy.errors)))
    yield from _table(("what would be left", "CT rms", "CP rms", "static CT", "static CP", "peak eta", "J0"), rows)
    yield "Peak eta and J0 (of no thrust) as plain differences, mean of the runs that have both."


def _left(errors: Errors) -> tuple[str, ...]:
    return (
        _percent(errors.thrust_rms, sign=False),
        _percent(errors.power_rms, sign=False),
        _percent(errors.static_thrust),
        _percent(errors.static_power),
        _number(errors.peak_efficiency, sign=True),
        _number(errors.zero_thrust, sign=True),
    )


def _percent(share: float, *, sign: bool = True) -> str:
    if not math.isfinite(share):
        return _MISSING
    return f"{100.0 * share:+.1f}" if sign else f"{100.0 * share:.1f}"


def _number(value: float, *, sign: bool = False) -> str:
    if not math.isfinite(value):
        return _MISSING
    return f"{value:+.3f}" if sign else f"{value:.3f}"


def _table(head: Sequence[str], rows: Sequence[Sequence[str]]) -> Iterator[str]:
    """Align columns under their heads, the first one to the left."""
    widths = [max(len(cell) for cell in column) for column in zip(head, *rows, strict=True)]
    for row in (head, *rows):
        cells = [row[0].ljust(widths[0]), *(cell.rjust(width) for cell, width in zip(row[1:], widths[1:], strict=True))]
        yield "  ".join(cells).rstrip()
