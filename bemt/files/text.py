"""Results as short tables for a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from bemt.files.flags import spoken, words
from bemt.quantities.registry import STATUS_NOT_CONVERGED, WINDING_CEILING
from bemt.table.validity import trust_in_words

if TYPE_CHECKING:
    import xarray as xr

_ROWS_SHOWN = 16
_MISSING = "-"
_NO_POINT = "none"
_WIDTH = 110
_NO_BREAK = "\u00a0"  # keeps a number with its % while lines are wrapped
_SHORTENED = "Not all airspeeds shown; -o FILE.csv or FILE.nc keeps all."


@dataclass(frozen=True)
class _Column:
    """A column: its head and unit, the variable without its prefix, factor, digits, and margins that mark its value."""

    head: str
    unit: str
    name: str
    scale: float = 1.0
    digits: int = 0
    margins: tuple[str, ...] = ()


_DRIVE_COLUMNS = (
    _Column("rpm", "", "rpm", margins=("rpm_margin",)),
    _Column("thrust", "N", "thrust", digits=2),
    _Column("torque", "N m", "torque", digits=3),
    _Column("shaft", "W", "shaft_power"),
    _Column("motor", "A", "motor_current", digits=1, margins=("motor_current_margin", "controller_current_margin")),
    _Column("winding", "degC", "winding_temperature", margins=("winding_temperature_margin",)),
    _Column("battery", "A", "battery_current", digits=1, margins=("battery_current_margin",)),
    _Column("battery", "W", "battery_power"),
    _Column("eta", "%", "propeller_efficiency", 100.0, 1),
)


def _drive_columns(prefix: str, *left_out: str) -> tuple[_Column, ...]:
    """Return the columns of a drive with the names of level flight, of the named points or of the grid."""
    return tuple(
        replace(column, name=prefix + column.name, margins=tuple(prefix + margin for margin in column.margins))
        for column in _DRIVE_COLUMNS
        if column.name not in left_out
    )


_FLIGHT_COLUMNS = (
    _Column("endurance", "min", "endurance", 1 / 60, 1),
    _Column("range", "km", "range", 1e-3, 1),
    _Column("climb", "m/s", "climb_rate", digits=2),
)

_POINT_COLUMNS: tuple[_Column, ...] = (
    _Column("V", "m/s", "point_airspeed", digits=1),
    _Column("throttle", "%", "point_throttle", 100.0),
    *_drive_columns("point_", "torque", "propeller_efficiency"),
    *(replace(column, name=f"point_{column.name}") for column in _FLIGHT_COLUMNS),
    _Column("full", "min", "point_drain_time", 1 / 60, 1),
)
_HOVER_COLUMNS: tuple[_Column, ...] = (
    *_POINT_COLUMNS,
    _Column("T/W", "", "point_thrust_to_weight", digits=2),
    _Column("FM", "", "point_figure_of_merit", digits=2),
)
_LEVEL_COLUMNS: tuple[_Column, ...] = (
    _Column("V", "m/s", "airspeed", digits=1),
    _Column("drag", "N", "drag", digits=2),
    _Column("throttle", "%", "level_throttle", 100.0),
    *_drive_columns("level_", "thrust", "torque", "propeller_efficiency"),
    *_FLIGHT_COLUMNS,
)
_FULL_COLUMNS: tuple[_Column, ...] = (
    _Column("V", "m/s", "airspeed", digits=1),
    *(replace(column, digits=1) if column.name == "shaft_power" else column for column in _drive_columns("")),
)


def _number(value: float, digits: int) -> str:
    if value == np.inf:  # of all that is printed only a winding's temperature rises without end
        return "no end"
    # Adding 0 takes the sign off a zero.
    return f"{round(value, digits) + 0.0:.{digits}f}" if np.isfinite(value) else _MISSING


def _aligned(heads: Sequence[Sequence[str]], rows: Sequence[Sequence[str]], left: int = 0) -> Iterator[str]:
    """Right-align columns under their heads; the first `left` columns are left-aligned."""
    widths = [max(len(cell) for cell in column) for column in zip(*heads, *rows, strict=True)]
    for row in (*heads, *rows):
        cells = [
            cell.ljust(width) if k < left else cell.rjust(width)
            for k, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        yield "  ".join(cells).rstrip()


_OF_AN_RPM = (
    "static_figure_of_merit",
    "zero_thrust_advance_ratio",
    "peak_efficiency",
    "peak_efficiency_advance_ratio",
)


def _every(count: int, shown: int = _ROWS_SHOWN) -> list[int]:
    """Pick evenly spaced rows, the last one always among them."""
    step = -(-max(count - 1, 1) // (shown - 1))
    picked = list(range(0, count, step))
    return picked if picked[-1] == count - 1 else [*picked, count - 1]


def coefficient_text(table: xr.Dataset) -> str:
    """Print a coefficient table in short.

    Parameters
    ----------
    table : xarray.Dataset
        A coefficient table over `rpm` and `advance_ratio`, and `incidence` where it has one.

    Returns
    -------
    str
        For each rpm a line with static values, zero-thrust advance ratio and peak; then for each rpm (and incidence)
        rows over the advance ratio with the coefficients, efficiency and the grade of trust with its reasons; at the
        end how many points have which grade, why, and where. Long grids are thinned, and say so.
    """
    inclined = "incidence" in table.dims
    order = ("rpm", "advance_ratio", "incidence") if inclined else ("rpm", "advance_ratio")
    table = table.transpose(*order, ...)
    several = inclined and table.sizes["incidence"] > 1
    J = table["advance_ratio"].values
    picked = _every(J.size, _ROWS_OF_SEVERAL if several else _ROWS_SHOWN)
    lines: list[str] = []
    title = str(table.attrs.get("title", ""))
    if title:
        lines += [title, ""]
    lines += [*_summary(table), ""]
    for k, rpm in enumerate(table["rpm"].values):
        for i in range(table.sizes["incidence"] if inclined else 1):
            block = table.isel(rpm=k, incidence=i) if inclined else table.isel(rpm=k)
            where = f", incidence {float(block['incidence']):g} deg" if inclined else ""
            lines += [f"{rpm:.0f} rpm{where}:", *_coefficient_rows(block, picked), ""]
    if len(picked) < J.size:
        lines.append(f"{len(picked)} of {J.size} advance ratios shown; -o FILE.csv or FILE.nc keeps all.")
    lines += _trust_lines(table, "", order)
    lines += [
        "J = V/(nD), CT = T/(rho n^2 D^4), CP = P/(rho n^3 D^5), eta = J CT/CP, n in rev/s.",
        "FM = sqrt(2/pi) CT^1.5/CP standing still; J0 = J of no thrust.",
    ]
    if inclined:
        lines += [
            "At incidence i, V along the flight path: eta = J (CT cos(i) - CN sin(i))/CP; FM, J0 and the peak are of",
            "axial flow.",
            "In the plane of the disk CN up, CY to the right; about the hub Cm nose up, Cn nose right: by rho n^2 D^4",
            "and rho n^2 D^5, seen from behind, the air passing the disk from below to above.",
        ]
    return "\n".join(lines)


_AXES = {"advance_ratio": "J", "airspeed": "V"}
_ROWS_OF_SEVERAL = 8
_COEFFICIENT_COLUMNS = (
    ("J", "advance_ratio", 3),
    ("CT", "thrust_coefficient", 4),
    ("CP", "power_coefficient", 4),
    ("eta", "efficiency", 3),
    ("CN", "normal_force_coefficient", 4),
    ("CY", "side_force_coefficient", 4),
    ("Cm", "pitching_moment_coefficient", 4),
    ("Cn", "yaw_moment_coefficient", 4),
)


def _trust_lines(dataset: xr.Dataset, prefix: str, axes: tuple[str, ...]) -> Iterator[str]:
    """Yield how many points have which grade, why, and where."""
    named = {_AXES.get(axis, axis): dataset[axis].values for axis in axes}
    best, *others = trust_in_words(dataset[f"{prefix}trust"].values, dataset[f"{prefix}trust_reasons"].values, named)
    where = " in steady climb" if "point_figure_of_merit" in dataset else " in level flight"
    yield f"Trust{where if prefix else ''}: {best}"
    for grade in others:
        yield from textwrap.wrap(grade, 100, initial_indent="  ", subsequent_indent="    ")


def _coefficient_rows(block: xr.Dataset, picked: Sequence[int]) -> Iterator[str]:
    """Yield head and rows over the advance ratio, the grade of trust with its reasons last."""
    used = [column for column in _COEFFICIENT_COLUMNS if column[1] in block]
    grades, reasons = words(block["trust"]) or [], words(block["trust_reasons"]) or []
    rows = [[_number(float(block[name].values[i]), digits) for _, name, digits in used] for i in picked]
    body = list(_aligned([[head for head, _, _ in used]], rows))
    yield f"  {body[0]}  trust"
    for text, i in zip(body[1:], picked, strict=True):
        yield f"  {text}  {_with_reasons(grades[i], reasons[i])}"


def _summary(table: xr.Dataset) -> Iterator[str]:
    """Yield a line for each rpm: what it does standing still, where its thrust ends, and its best efficiency."""
    still = table.isel(advance_ratio=np.flatnonzero(table["advance_ratio"].values == 0.0)[:1])
    if "incidence" in still.dims:  # standing still there is none
        still = still.isel(incidence=0)
    rows = []
    for k, rpm in enumerate(table["rpm"].values):
        row = table.isel(rpm=k)
        static = [still[name].values[k] for name in ("thrust_coefficient", "power_coefficient")]
        rows.append(
            [f"{rpm:.0f}"]
            + [_number(float(value[0]), 4) if value.size else _MISSING for value in static]
            + [_number(float(row[name]), 3) for name in _OF_AN_RPM]
        )
    heads = [["", "static", "static", "static", "", "peak", "at"], ["rpm", "CT", "CP", "FM", "J0", "eta", "J"]]
    return _aligned(heads, rows)


def _with_reasons(grade: str, reasons: str) -> str:
    named = ", ".join(spoken(reason) for reason in reasons.split())
    return f"{spoken(grade)} ({named})" if named else spoken(grade)


def _operating_rows(
    run: xr.Dataset, columns: Sequence[_Column], dimension: str, picked: Sequence[int], trust: str
) -> tuple[list[list[str]], list[list[str]], bool]:
    """Return heads, rows and whether any value is beyond its limit, with columns nobody filled left out."""
    used = [
        column
        for column in columns
        if column.name in run and dimension in run[column.name].dims and not np.isnan(run[column.name].values).all()
    ]
    grades = words(run[trust]) if trust in run else None
    rows: list[list[str]] = []
    marked = False
    for k in picked:
        here = run.isel({dimension: k})
        cells = []
        for column in used:
            text = _number(float(here[column.name]) * column.scale, column.digits)
            over = any(margin in here and float(here[margin]) < 0 for margin in column.margins)
            marked |= over
            cells.append(text + ("!" if over else " " if column.margins else ""))
        rows.append(cells if grades is None else [*cells, grades[k]])
    # The place of a mark behind values counts for their heads too.
    places = [" " if column.margins else "" for column in used]
    heads = [
        [column.head + place for column, place in zip(used, places, strict=True)],
        [column.unit + place for column, place in zip(used, places, strict=True)],
    ]
    return (
        [head + ([] if grades is None else [last]) for head, last in zip(heads, ("trust", ""), strict=True)],
        rows,
        marked,
    )


def _points_block(run: xr.Dataset) -> tuple[list[str], bool]:
    """Return the lines of the named points, and whether any value is beyond its limit."""
    exists = np.isfinite(run["point_rpm"].values)
    columns = _HOVER_COLUMNS if "point_figure_of_merit" in run else _POINT_COLUMNS
    heads, rows, marked = _operating_rows(run, columns, "point", range(exists.size), "point_trust")
    names = [spoken(str(name)) for name in run["point"].values]
    shown = [
        [name, *(row if there else [_NO_POINT, *[""] * (len(row) - 1)])]
        for name, row, there in zip(names, rows, exists, strict=True)
    ]
    lines = list(_aligned([["", *head] for head in heads], shown, left=1))
    reasons = words(run["point_trust_reasons"]) if "point_trust_reasons" in run else None
    held = [
        f"{name} ({', '.join(spoken(word) for word in why.split())})"
        for name, why in zip(names, reasons or [], strict=False)
        if why
    ]
    if held:
        lines.append(f"Trust less than good: {'; '.join(held)}.")
    return [*lines, ""], marked


def _grid_blocks(run: xr.Dataset) -> tuple[list[str], bool]:
    """Return rows over airspeed at full throttle, or without a motor at every rpm, for what has no level flight."""
    bare = "throttle" not in run.dims
    axis = run["rpm" if bare else "throttle"].values
    lines: list[str] = []
    marked, whole = False, True
    for k in range(axis.size) if bare else [axis.size - 1]:
        here = run.isel({"rpm" if bare else "throttle": k})
        # One row beyond the last thrust: farther out it only brakes.
        pulls = np.flatnonzero(here["thrust"].values >= 0.0)
        count = min(int(pulls[-1]) + 2, here.sizes["airspeed"]) if pulls.size else here.sizes["airspeed"]
        picked = _every(count)
        heads, rows, over = _operating_rows(here, _FULL_COLUMNS, "airspeed", picked, "trust")
        marked |= over
        lines += [f"{axis[k]:.0f} rpm:" if bare else f"Throttle {100 * axis[k]:.0f} %:", *_aligned(heads, rows), ""]
        whole &= len(picked) == here.sizes["airspeed"]
    return lines if whole else [*lines, _SHORTENED], marked


def sentence(words: str) -> str:
    """Begin with a capital and end with a full stop.

    Parameters
    ----------
    words : str
        A note.

    Returns
    -------
    str
    """
    return f"{words[:1].upper()}{words[1:]}."


def _thinned(shown: int, of: int) -> list[str]:
    return [f"{shown} of {of} airspeeds shown; -o FILE.csv or FILE.nc keeps all."] if shown < of else []


def envelope_text(run: xr.Dataset) -> str:
    """Print an envelope in short.

    Parameters
    ----------
    run : xarray.Dataset
        An envelope.

    Returns
    -------
    str
        The named points, what a builder decides by in words, then level flight or steady climb over airspeed; without
        an airframe full throttle over airspeed, or, without a motor as well, every rpm of the grid over airspeed. A
        value beyond its limit carries a mark.
    """
    lines: list[str] = []
    title = str(run.attrs.get("title", ""))
    if title:
        lines += [title, ""]
    powered, flies = "battery_current" in run, "drag" in run
    marked = False
    # The one point of a propeller without motor and airframe would be a row of the grid a second time.
    if "point" in run.dims and (powered or flies):
        block, marked = _points_block(run)
        lines += block
    decisions = str(run.attrs.get("decisions", "")).splitlines()
    for decision in decisions:
        joined = sentence(decision).replace(" %", f"{_NO_BREAK}%")
        wrapped = textwrap.wrap(joined, _WIDTH, initial_indent="- ", subsequent_indent="  ")
        lines += [line.replace(_NO_BREAK, " ") for line in wrapped]
    lines += [""] if decisions else []
    steady = "Climbing straight up, hovering at 0 m/s" if "point_figure_of_merit" in run else "Level flight"
    if not flies:
        block, over = _grid_blocks(run)
        lines += block
        marked |= over
    elif "level_rpm" in run and np.isfinite(run["level_rpm"].values).any():
        flown = np.flatnonzero(np.isfinite(run["level_rpm"].values))
        picked = [int(flown[k]) for k in _every(flown.size)]
        heads, rows, over = _operating_rows(run, _LEVEL_COLUMNS, "airspeed", picked, "level_trust")
        lines += [f"{steady}:", *_aligned(heads, rows), "", *_thinned(len(picked), flown.size)]
        marked |= over
    else:
        lines += [f"{steady}: none at any airspeed of the grid.", ""]
    modelled = "winding_temperature" in run and not np.isnan(run["winding_temperature"].values).all()
    if not flies and "trust_reasons" in run:
        second = "rpm" if "throttle" not in run.dims else "throttle"
        lines += _trust_lines(run.transpose("airspeed", second, ...), "", ("airspeed", second))
    elif "level_trust_reasons" in run and (run["level_trust"].values > 0).any():
        lines += _trust_lines(run, "level_", ("airspeed",))
    if marked:
        too_hot = ", or a winding too hot" if modelled else ""
        lines.append(f"! beyond a limit of the propeller, motor, controller or battery{too_hot}.")
    if modelled:
        lines.append(
            "Winding: the temperature it would settle at, held there; marked above "
            f"{WINDING_CEILING:g} degC (common practice, no source)."
        )
    if "point_drain_time" in run:
        lines.append(
            "full: until the usable charge is gone at full throttle; endurance ends early where full throttle is"
        )
        lines.append("not enough for the falling voltage.")
    if "point_figure_of_merit" in run:
        lines.append("T/W: thrust that reaches the airframe over weight; FM: figure of merit, ideal over shaft power.")
    lines.append(
        "Thrust is of all propellers, shaft power and motor current of one motor, battery values of the pack."
        if powered
        else "No motor in the case: thrust, torque and shaft power of one propeller."
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
