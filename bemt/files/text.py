"""Results as short tables for a terminal."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

import numpy as np

from bemt.files.flags import spoken, words
from bemt.quantities.registry import STATUS_NOT_CONVERGED

if TYPE_CHECKING:
    import xarray as xr

_ROWS_SHOWN = 16
_MISSING = "-"

# Head and unit, variable, factor, digits, and the margins that mark a value beyond a limit.
_Column = tuple[str, str, float, int, tuple[str, ...]]

_POINT_COLUMNS: tuple[_Column, ...] = (
    ("V\nm/s", "point_airspeed", 1.0, 1, ()),
    ("throttle\n%", "point_throttle", 100.0, 0, ()),
    ("speed\nrpm", "point_rpm", 1.0, 0, ("point_rpm_margin",)),
    ("thrust\nN", "point_thrust", 1.0, 2, ()),
    ("shaft\nW", "point_shaft_power", 1.0, 0, ()),
    (
        "motor\nA",
        "point_motor_current",
        1.0,
        1,
        ("point_motor_current_margin", "point_controller_current_margin"),
    ),
    ("battery\nA", "point_battery_current", 1.0, 1, ("point_battery_current_margin",)),
    ("battery\nW", "point_battery_power", 1.0, 0, ()),
    ("stalled\n%", "point_stalled_share", 100.0, 0, ()),
    ("endurance\nmin", "point_endurance", 1 / 60, 1, ()),
    ("range\nkm", "point_range", 1e-3, 1, ()),
    ("climb\nm/s", "point_climb_rate", 1.0, 2, ()),
)
_LEVEL_COLUMNS: tuple[_Column, ...] = (
    ("V\nm/s", "airspeed", 1.0, 1, ()),
    ("drag\nN", "drag", 1.0, 2, ()),
    ("throttle\n%", "level_throttle", 100.0, 0, ()),
    ("speed\nrpm", "level_rpm", 1.0, 0, ("level_rpm_margin",)),
    ("shaft\nW", "level_shaft_power", 1.0, 0, ()),
    (
        "motor\nA",
        "level_motor_current",
        1.0,
        1,
        ("level_motor_current_margin", "level_controller_current_margin"),
    ),
    ("battery\nA", "level_battery_current", 1.0, 1, ("level_battery_current_margin",)),
    ("battery\nW", "level_battery_power", 1.0, 0, ()),
    ("endurance\nmin", "endurance", 1 / 60, 1, ()),
    ("range\nkm", "range", 1e-3, 1, ()),
    ("climb\nm/s", "climb_rate", 1.0, 2, ()),
)


def _number(value: float, digits: int) -> str:
    return f"{value:.{digits}f}" if np.isfinite(value) else _MISSING


def _aligned(heads: Sequence[Sequence[str]], rows: Sequence[Sequence[str]], left: int = 0) -> Iterator[str]:
    """Right-align columns under their heads; the first `left` columns are left-aligned."""
    widths = [max(len(cell) for cell in column) for column in zip(*heads, *rows, strict=True)]
    for row in (*heads, *rows):
        cells = [
            cell.ljust(width) if k < left else cell.rjust(width)
            for k, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        yield "  ".join(cells).rstrip()


def _every(count: int) -> list[int]:
    """Pick evenly spaced rows, the last one always among them."""
    step = -(-max(count - 1, 1) // (_ROWS_SHOWN - 1))
    picked = list(range(0, count, step))
    return picked if picked[-1] == count - 1 else [*picked, count - 1]


def coefficient_text(table: xr.Dataset) -> str:
    """Print a coefficient table in short.

    Parameters
    ----------
    table : xarray.Dataset
        A coefficient table over `rpm` and `advance_ratio`.

    Returns
    -------
    str
        For each rpm its static figure of merit, zero-thrust advance ratio and peak, then rows over the advance ratio
        with CT, CP, efficiency and the grade of trust with its reasons. Long grids are thinned, and say so.
    """
    table = table.transpose("rpm", "advance_ratio", ...)
    J, picked = table["advance_ratio"].values, _every(table.sizes["advance_ratio"])
    grades = np.array(words(table["trust"]), dtype=object).reshape(table["trust"].shape)
    reasons = np.array(words(table["trust_reasons"]), dtype=object).reshape(grades.shape)
    lines: list[str] = []
    title = str(table.attrs.get("title", ""))
    if title:
        lines += [title, ""]
    for k, rpm in enumerate(table["rpm"].values):
        row = table.isel(rpm=k)
        lines.append(
            f"{rpm:.0f} rpm:  static figure of merit {_number(float(row['static_figure_of_merit']), 3)},"
            f"  no thrust at J = {_number(float(row['zero_thrust_advance_ratio']), 3)},"
            f"  peak efficiency {_number(float(row['peak_efficiency']), 3)}"
            f" at J = {_number(float(row['peak_efficiency_advance_ratio']), 3)}"
        )
        cells = [
            (
                f"{J[i]:.3f}",
                _number(float(row["thrust_coefficient"].values[i]), 4),
                _number(float(row["power_coefficient"].values[i]), 4),
                _number(float(row["efficiency"].values[i]), 3),
                _with_reasons(str(grades[k, i]), str(reasons[k, i])),
            )
            for i in picked
        ]
        body = list(_aligned([("J", "CT", "CP", "eta")], [cell[:4] for cell in cells]))
        lines.append("  " + body[0] + "  trust")
        lines += [f"  {text}  {cell[4]}" for text, cell in zip(body[1:], cells, strict=True)]
        lines.append("")
    if len(picked) < J.size:
        lines.append(f"{len(picked)} of {J.size} advance ratios shown; -o FILE.csv or FILE.nc keeps all.")
    lines.append("J = V/(nD), CT = T/(rho n^2 D^4), CP = P/(rho n^3 D^5), eta = J CT/CP, n in rev/s.")
    return "\n".join(lines)


def _with_reasons(grade: str, reasons: str) -> str:
    named = ", ".join(spoken(reason) for reason in reasons.split())
    return f"{spoken(grade)} ({named})" if named else spoken(grade)


def _operating_rows(
    run: xr.Dataset, columns: Sequence[_Column], dimension: str, picked: Sequence[int]
) -> tuple[list[list[str]], list[list[str]], bool]:
    """Return heads, rows and whether any value is beyond its limit, with columns nobody filled left out."""
    used = [column for column in columns if column[1] in run and np.isfinite(run[column[1]].values).any()]
    rows: list[list[str]] = []
    marked = False
    for k in picked:
        here = run.isel({dimension: k})
        cells = []
        for _, name, scale, digits, margins in used:
            text = _number(float(here[name]) * scale, digits)
            over = any(margin in here and float(here[margin]) < 0 for margin in margins)
            marked |= over
            cells.append(text + ("!" if over else " " if margins else ""))
        rows.append(cells)
    names = (column[0] + " " if column[4] else column[0] for column in used)
    heads = [list(line) for line in zip(*(_two_lines(name) for name in names), strict=True)]
    return heads, rows, marked


def _two_lines(head: str) -> tuple[str, str]:
    """Split a head into name and unit; the place of a mark behind values counts for both."""
    name, unit = head.split("\n")
    return (name + " ", unit) if unit.endswith(" ") else (name, unit)


def envelope_text(run: xr.Dataset) -> str:
    """Print an envelope in short.

    Parameters
    ----------
    run : xarray.Dataset
        An envelope.

    Returns
    -------
    str
        The named points, then level flight over airspeed; a value beyond its limit carries a mark.
    """
    lines: list[str] = []
    title = str(run.attrs.get("title", ""))
    if title:
        lines += [title, ""]
    marked = False
    if "point" in run.dims:
        heads, rows, over = _operating_rows(run, _POINT_COLUMNS, "point", range(run.sizes["point"]))
        names = [spoken(str(name)) for name in run["point"].values]
        lines += _aligned(
            [["", *head] for head in heads], [[name, *row] for name, row in zip(names, rows, strict=True)], left=1
        )
        lines.append("")
        marked |= over
    if "level_rpm" in run and np.isfinite(run["level_rpm"].values).any():
        flown = np.flatnonzero(np.isfinite(run["level_rpm"].values))
        picked = [int(flown[k]) for k in _every(flown.size)]
        heads, rows, over = _operating_rows(run, _LEVEL_COLUMNS, "airspeed", picked)
        lines += ["Level flight:", *_aligned(heads, rows), ""]
        marked |= over
        if len(picked) < flown.size:
            lines.append(f"{len(picked)} of {flown.size} airspeeds shown; -o FILE.csv or FILE.nc keeps all.")
    elif "drag" in run:
        lines += ["Level flight: at no airspeed of the grid.", ""]
    if marked:
        lines.append("! beyond a limit of the propeller, motor, controller or battery.")
    lines.append(
        "Thrust is of all propellers, shaft power and motor current of one motor, battery values of the pack."
        if "battery_current" in run
        else "No motor in the case: thrust and shaft power of one propeller."
    )
    return "\n".join(lines)


def unconverged(dataset: xr.Dataset) -> int:
    """Count the points that did not converge.

    Parameters
    ----------
    dataset : xarray.Dataset
        A coefficient table or an envelope.

    Returns
    -------
    int
        Number of points with the status "not converged".
    """
    return int((dataset["status"].values == STATUS_NOT_CONVERGED).sum())
