"""The envelope figure: thrust, currents and rpm over airspeed, with drag, limits and the named points, on one page."""

from __future__ import annotations

import textwrap
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.legend_handler import HandlerTuple
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle
from matplotlib.transforms import blended_transform_factory
from numpy.typing import NDArray

from bemt.figures.style import INK, LIMIT, QUIET, our_style, ramp, spread
from bemt.files.flags import words
from bemt.quantities.registry import COORDINATES, ENVELOPE, STATUS_NOT_CONVERGED, WINDING_CEILING, by_name

if TYPE_CHECKING:
    import xarray as xr

FloatArray = NDArray[np.float64]

# Panel, and the margins that draw limits into it with the words beside the line.
_PANELS: tuple[tuple[str, tuple[tuple[str, str], ...]], ...] = (
    ("thrust", ()),
    ("battery_current", (("battery_current_margin", "battery"),)),
    ("motor_current", (("motor_current_margin", "motor"), ("controller_current_margin", "controller"))),
    ("rpm", (("rpm_margin", "propeller"),)),
)
_MARGINS = (*(margin for _, limits in _PANELS for margin, _ in limits), "winding_temperature_margin")
_WITHOUT_MOTOR: tuple[tuple[str, tuple[tuple[str, str], ...]], ...] = (("thrust", ()), ("shaft_power", ()))
_LINES = 5
_BEYOND = (0, (1.0, 1.5))
_LEVEL: Any = (0, (6.0, 2.0))
_POINT_MARKS = {"cruise": ("*", 13.0), "top_speed": ("D", 6.5), "hover": ("*", 13.0)}


@dataclass(frozen=True)
class _Column:
    head: str
    unit: str
    name: str
    scale: float
    digits: int
    margins: tuple[str, ...] = ()


_COLUMNS = (
    _Column("airspeed", "m/s", "point_airspeed", 1.0, 1),
    _Column("throttle", "%", "point_throttle", 100.0, 0),
    _Column("rpm", "", "point_rpm", 1.0, 0, ("point_rpm_margin",)),
    _Column("thrust", "N", "point_thrust", 1.0, 2),
    _Column("shaft", "W", "point_shaft_power", 1.0, 0),
    _Column(
        "motor", "A", "point_motor_current", 1.0, 1, ("point_motor_current_margin", "point_controller_current_margin")
    ),
    _Column("winding", "°C", "point_winding_temperature", 1.0, 0, ("point_winding_temperature_margin",)),
    _Column("battery", "A", "point_battery_current", 1.0, 1, ("point_battery_current_margin",)),
    _Column("battery", "W", "point_battery_power", 1.0, 0),
    _Column("overall", "η %", "point_overall_efficiency", 100.0, 1),
    _Column("endurance", "min", "point_endurance", 1 / 60, 1),
    _Column("range", "km", "point_range", 1e-3, 1),
    _Column("climb", "m/s", "point_climb_rate", 1.0, 2),
)


def _limit(run: xr.Dataset, name: str, margin: str) -> float | None:
    """Recover a limit from the values and their margin; None where the case sets no such limit."""
    if margin not in run:
        return None
    both = (run[name] + run[margin]).values
    return float(np.median(both[np.isfinite(both)])) if np.isfinite(both).any() else None


def _beyond(run: xr.Dataset, rows: str) -> NDArray[np.bool_]:
    """Say which points of the grid break any limit, or would overheat the winding if held."""
    broken = np.zeros((run.sizes["airspeed"], run.sizes[rows]), dtype=bool)
    for margin in _MARGINS:
        if margin in run:
            broken |= run[margin].transpose("airspeed", rows).values < 0
    return broken


def _line(axes: Axes, x: FloatArray, y: FloatArray, broken: NDArray[np.bool_], colour: Any) -> None:
    """Draw one throttle: full inside all limits, dotted where one is broken."""
    if x.size == 1:  # a line of one point shows nothing
        axes.plot(x, y, "o", color=colour, markerfacecolor="white" if broken[0] else colour)
        return
    axes.plot(x, np.where(broken, np.nan, y), color=colour, linewidth=1.8)
    joined = broken.copy()  # the dotted part reaches back to the last good point, so that no gap opens
    joined[:-1] |= broken[1:]
    joined[1:] |= broken[:-1]
    if broken.any():
        axes.plot(x, np.where(joined, y, np.nan), color=colour, linewidth=1.8, linestyle=_BEYOND)


def _inline_labels(
    axes: Axes, x: FloatArray, lines: list[tuple[FloatArray, str, Any]], low: float, high: float
) -> None:
    """Write each line's value on it near standing still, where lines of different throttle are furthest apart."""
    at = int(np.argmin(np.abs(x - (x[0] + 0.05 * (x[-1] - x[0])))))
    shown = [(float(y[at]), text, colour) for y, text, colour in lines if np.isfinite(y[at]) and low <= y[at] <= high]
    figure = axes.get_figure()
    if figure is None:
        return
    pixels = [float(axes.transData.transform((x[at], y))[1]) for y, _, _ in shown]
    across = blended_transform_factory(axes.transAxes, axes.transData)
    box = axes.get_window_extent()
    gap = 12.0 * figure.dpi / 72
    places = spread(pixels, gap, box.y0 + 0.5 * gap, box.y1 - 0.5 * gap)
    for place, (_, text, colour) in zip(places, shown, strict=True):
        axes.annotate(
            text,
            (0.02, axes.transData.inverted().transform((0.0, place))[1]),
            xycoords=across,
            va="center",
            ha="left",
            color=colour,
            fontsize=8,
            fontweight="bold",
            zorder=6,
            bbox={"boxstyle": "round,pad=0.12", "facecolor": "white", "edgecolor": "none", "alpha": 0.92},
        )


def _draw_limits(axes: Axes, limits: list[tuple[float, str]], unit: str, top: float) -> None:
    """Draw limit lines and shade what lies above the lowest; limits far above the lines are only named."""
    merged: dict[float, list[str]] = {}
    for value, what in limits:
        merged.setdefault(round(value, 6), []).append(what)
    shown = sorted(value for value in merged if value <= top)
    if shown:
        axes.axhspan(shown[0], top * 10, facecolor=LIMIT, alpha=0.06, zorder=0)
    across = blended_transform_factory(axes.transAxes, axes.transData)
    for value in shown:
        axes.axhline(value, color=LIMIT, linewidth=1.1, zorder=2)
    figure = axes.get_figure()
    if shown and figure is not None:
        pixels = [float(axes.transData.transform((0.0, value))[1]) for value in shown]
        box, scale = axes.get_window_extent(), figure.dpi / 72
        drawn = np.concatenate([axes.transData.transform(line.get_xydata()) for line in axes.lines])
        for value, was, place in zip(
            shown, pixels, spread([p + 6 * scale for p in pixels], 11 * scale, box.y0, box.y1 + 5 * scale), strict=True
        ):
            text = f"{' and '.join(merged[value])} limit {value:g} {unit}"
            width = 5.2 * scale * len(text)
            # Of three places along the line the one with the fewest drawn points behind the letters.
            right = min(
                (0.995, 0.75, 0.5),
                key=lambda edge: int(
                    (
                        (np.abs(drawn[:, 0] - (box.x0 + edge * box.width - 0.5 * width)) < 0.5 * width)
                        & (np.abs(drawn[:, 1] - place) < 7 * scale)
                    ).sum()
                ),
            )
            axes.annotate(
                text,
                (right, value),
                xycoords=across,
                xytext=(0, (place - was) / scale),
                textcoords="offset points",
                ha="right",
                va="center",
                color=LIMIT,
                fontsize=8,
                annotation_clip=False,
                zorder=6,
                bbox={"boxstyle": "round,pad=0.08", "facecolor": "white", "edgecolor": "none", "alpha": 0.85},
            )
    beyond = [f"{' and '.join(names)} limit {value:g} {unit}" for value, names in sorted(merged.items()) if value > top]
    if beyond:
        axes.set_title(f"above this picture: {', '.join(beyond)}", fontsize=8, color=QUIET, loc="right", pad=4)


def _panel(
    axes: Axes, run: xr.Dataset, rows: str, name: str, limits: list[tuple[float, str]], picks: list[int]
) -> None:
    quantity = by_name(ENVELOPE)[name]
    x = run["airspeed"].values
    values = run[name].transpose("airspeed", rows).values
    broken = _beyond(run, rows)
    colours = ramp(len(picks))
    lines = []
    for index, colour in zip(picks, colours, strict=True):
        _line(axes, x, values[:, index], broken[:, index], colour)
        at = float(run[rows].values[index])
        lines.append((values[:, index], f"{at * 100:.0f} %" if rows == "throttle" else f"{at:.0f} rpm", colour))
    if "status" in run:
        failed = (run["status"].transpose("airspeed", rows).values == STATUS_NOT_CONVERGED) & np.isfinite(values)
        axes.plot(np.broadcast_to(x[:, None], values.shape)[failed], values[failed], "x", color=LIMIT, markersize=5)
    level = "drag" if name == "thrust" else f"level_{name}"
    needed = run[level].values if level in run else np.full(x.size, np.nan)
    axes.plot(x, needed, color=INK, linewidth=2.0, linestyle=_LEVEL, zorder=4)

    seen = values[:, picks]
    highest = float(np.nanmax(seen)) if np.isfinite(seen).any() else 1.0
    near = [value for value, _ in limits if value <= 1.6 * highest]
    # Drag towards the stall and a windmilling brake at full dive would press everything else flat.
    top = 1.10 * max([highest, *near])
    lowest = float(np.nanmin(seen)) if np.isfinite(seen).any() else 0.0
    low = max(lowest * 1.05, -0.12 * top) if lowest < 0 else 0.0
    axes.set_ylim(low, top)
    axes.set_xlim(x[0], x[-1] if x.size > 1 else x[0] + 1.0)
    if low < 0:
        axes.axhline(0.0, color=QUIET, linewidth=0.9, zorder=1)
    axes.set_ylabel(
        f"{quantity.long_name}" + ("" if quantity.units in ("1", quantity.long_name) else f" [{quantity.units}]")
    )
    axes.tick_params(length=3)
    unit = "" if quantity.units == "1" else quantity.units
    _draw_limits(axes, limits, unit, top)
    _inline_labels(axes, x, lines, low, top)
    if "point" in run.coords and f"point_{name}" in run:
        for point, (shape, size) in _POINT_MARKS.items():
            if point in run["point"].values:
                row = run.sel(point=point)
                axes.plot(
                    [float(row["point_airspeed"])], [float(row[f"point_{name}"])], shape, markersize=size, zorder=7,
                    markerfacecolor="#f2b705", markeredgecolor=INK, markeredgewidth=1.0,
                )  # fmt: skip


def _points_table(figure: Figure, run: xr.Dataset, left: float, right: float, top: float, step: float) -> None:
    """Set the named points as a small table; a value beyond its limit is bold, red and marked."""
    columns = [column for column in _COLUMNS if column.name in run and not np.isnan(run[column.name].values).all()]
    grades = words(run["point_trust"]) if "point_trust" in run else None
    edges = np.linspace(left + 0.10, right, len(columns) + (1 if grades is None else 2))[1:]
    if grades is not None:
        figure.text(edges[-1], top, "trust", fontsize=8, color=QUIET, ha="right", va="center")
    for edge, column in zip(edges, columns, strict=False):
        figure.text(edge, top, column.head, fontsize=8, color=QUIET, ha="right", va="center")
        figure.text(edge, top - 0.72 * step, column.unit, fontsize=8, color=QUIET, ha="right", va="center")
    rule = top - 1.3 * step
    figure.add_artist(Line2D([left, right], [rule, rule], color=QUIET, linewidth=0.8, transform=figure.transFigure))
    for k, point in enumerate(run["point"].values):
        y = rule - (k + 0.75) * step
        if k % 2:
            figure.add_artist(
                Rectangle((left, y - step / 2), right - left, step, facecolor="#f3f6f7", transform=figure.transFigure)
            )
        figure.text(left + 0.004, y, str(point).replace("_", " "), fontsize=8.5, va="center", fontweight="bold")
        row = run.isel(point=k)
        if np.isnan(float(row["point_rpm"])):
            figure.text(edges[0], y, "none", fontsize=8.5, ha="right", va="center")
            continue
        if grades is not None:
            figure.text(edges[-1], y, grades[k], fontsize=8.5, ha="right", va="center")
        for edge, column in zip(edges, columns, strict=False):
            value = float(row[column.name]) * column.scale
            over = any(margin in row and float(row[margin]) < 0 for margin in column.margins)
            text = "no end" if value == np.inf else f"{value:.{column.digits}f}" if np.isfinite(value) else "–"
            figure.text(
                edge, y, f"{text} !" if over else text, fontsize=8.5, ha="right", va="center",
                color=LIMIT if over else INK, fontweight="bold" if over else "normal",
            )  # fmt: skip


def envelope_figure(run: xr.Dataset) -> Figure:
    """Draw an envelope on one page.

    Parameters
    ----------
    run : xarray.Dataset
        An envelope over `airspeed` and `throttle`, or over `airspeed` and `rpm` where the case has no motor.

    Returns
    -------
    matplotlib.figure.Figure
        A panel each for thrust with the drag line, battery current, motor current and rpm, with their limits, and
        the named points as a table. Lines are dotted where any limit is broken, or the winding would get too hot.
    """
    rows = "throttle" if "throttle" in run.dims else "rpm"
    panels = [panel for panel in (_PANELS if rows == "throttle" else _WITHOUT_MOTOR) if panel[0] in run.data_vars]
    settings = run[rows].values
    picks = sorted({int(np.argmin(np.abs(settings - settings[-1] * (k + 1) / _LINES))) for k in range(_LINES)})
    title = textwrap.wrap(str(run.attrs.get("title", "")) or "Envelope", 92)
    # The one point of a propeller without motor and airframe would only repeat the end of a line.
    points = "point" in run.dims and (rows == "throttle" or "drag" in run)
    hot = "winding_temperature" in run and not np.isnan(run["winding_temperature"].values).all()
    lines = -(-len(panels) // 2)

    width, panel_height, gap, step = 11.0, 2.7, 0.34, 0.21
    head = 0.30 + 0.27 * len(title) + 0.50
    foot = 0.62 + (step * (1.9 + run.sizes["point"]) + 0.48 if points else 0.1)
    height = head + lines * panel_height + (lines - 1) * gap + foot
    left, right, between = 0.80 / width, 1 - 0.25 / width, 0.95 / width
    column = (right - left - between) / 2

    with our_style():
        figure = Figure(figsize=(width, height))
        for k, (name, wanted) in enumerate(panels):
            row, side = divmod(k, 2)
            bottom = (foot + (lines - 1 - row) * (panel_height + gap)) / height
            axes = figure.add_axes((left + side * (column + between), bottom, column, panel_height / height))
            limits = [(value, what) for margin, what in wanted if (value := _limit(run, name, margin)) is not None]
            _panel(axes, run, rows, name, limits, picks)
            last = k + 2 >= len(panels)
            axes.tick_params(labelbottom=last)
            if last:
                axes.set_xlabel(f"{by_name(COORDINATES)['airspeed'].long_name} [m/s]")
        y = 0.30
        for text in title:
            figure.text(left, 1 - y / height, text, fontsize=13.5, fontweight="bold", va="center")
            y += 0.27
        # The lines' own colours in a row: a single one would read as the line that has it.
        setting = tuple(Line2D([], [], color=colour, linewidth=1.8) for colour in ramp(len(picks)))
        marks: list[Any] = [setting]
        names = [f"{rows}, low to high" if len(picks) > 1 else rows]
        if "drag" in run and np.isfinite(run["drag"].values).any():
            marks.append(Line2D([], [], color=INK, linewidth=2.0, linestyle=_LEVEL))
            names.append("level flight (drag)")
        for point, (shape, size) in _POINT_MARKS.items():
            there = points and point in run["point"].values
            if there and np.isfinite(float(run["point_rpm"].sel(point=point))):
                marks.append(
                    Line2D([], [], marker=shape, markersize=0.8 * size, linestyle="", markerfacecolor="#f2b705",
                           markeredgecolor=INK)
                )  # fmt: skip
                names.append(point.replace("_", " "))
        if _beyond(run, rows)[:, picks].any():
            marks.append(Line2D([], [], color=QUIET, linewidth=1.8, linestyle=_BEYOND))
            names.append("beyond a limit" + (f", or winding above {WINDING_CEILING:g} °C if held" if hot else ""))
        figure.legend(
            marks, names, loc="upper left", bbox_to_anchor=(left - 0.006, 1 - (y - 0.10) / height), ncols=len(marks),
            fontsize=9, handlelength=2.6, columnspacing=1.8, borderaxespad=0.0, borderpad=0.0,
            handler_map={tuple: HandlerTuple(ndivide=None, pad=0.0)},
        )  # fmt: skip
        if points:
            _points_table(figure, run, left, right, (foot - 0.66) / height, step / height)
        figure.text(
            left, 0.17 / height,
            (
                "Thrust is of all propellers, shaft power and motor current of one motor, battery current of the pack."
                if rows == "throttle"
                else "No motor in the case: thrust and shaft power of one propeller."
            )
            + (" ! beyond its limit." if points and rows == "throttle" else "")
            + (f" Winding: if held there, ! above {WINDING_CEILING:g} °C." if points and hot else ""),
            fontsize=8, color=QUIET, va="center",
        )  # fmt: skip
    return figure
