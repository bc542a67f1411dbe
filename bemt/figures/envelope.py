"""The envelope figure, one page to print: thrust, currents, rpm, efficiencies, endurance, limits, named points."""

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
from bemt.files.text import sentence
from bemt.quantities.registry import COORDINATES, ENVELOPE, STATUS_NOT_CONVERGED, WINDING_CEILING, by_name
from bemt.table.validity import trust_in_words

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
_CHAIN = (
    ("propeller", "level_propeller_efficiency", "-"),
    ("motor", "level_motor_efficiency", (0, (5.0, 1.5))),
    ("controller", "level_controller_efficiency", (0, (1.0, 1.2))),
    ("battery", "level_battery_efficiency", (0, (5.0, 1.5, 1.0, 1.5))),
    ("overall", "level_overall_efficiency", "-"),
)
_LINES = 5
_NO_BREAK = "\u00a0"
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
    _Column("full", "min", "point_drain_time", 1 / 60, 1),
    _Column("T/W", "", "point_thrust_to_weight", 1.0, 2),
    _Column("FM", "", "point_figure_of_merit", 1.0, 2),
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
    level = "required_thrust" if name == "thrust" else f"level_{name}"
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
    _mark_points(axes, run, name)


def _points_table(figure: Figure, run: xr.Dataset, left: float, right: float, top: float, step: float) -> None:
    """Set the named points as a small table; a value beyond its limit is bold, red and marked."""
    hovers = "point_figure_of_merit" in run
    columns = [
        column
        for column in _COLUMNS
        if column.name in run
        and not np.isnan(run[column.name].values).all()
        and (hovers or column.name != "point_thrust_to_weight")
    ]
    grades = words(run["point_trust"]) if "point_trust" in run else None
    # As wide as what stands in it: heads are smaller than values, a mark adds two characters.
    room = [max(len(column.head), len(column.unit), 7 if column.margins else 5) + 1.5 for column in columns]
    room += [] if grades is None else [6.0]
    edges = left + 0.11 + (right - left - 0.11) * np.cumsum(room) / sum(room)
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


def _mark_points(axes: Axes, run: xr.Dataset, name: str, scale: float = 1.0) -> None:
    """Mark cruise, hover and top speed where the panel's quantity has a value there."""
    if "point" not in run.coords or f"point_{name}" not in run:
        return
    for point, (shape, size) in _POINT_MARKS.items():
        if point in run["point"].values:
            row = run.sel(point=point)
            x, y = float(row["point_airspeed"]), float(row[f"point_{name}"]) * scale
            (left, right), (low, high) = axes.get_xlim(), axes.get_ylim()
            if not (left <= x <= right and low <= y <= high):
                continue
            axes.plot(
                [x], [y], shape, markersize=size, zorder=7, clip_on=False,
                markerfacecolor="#f2b705", markeredgecolor=INK, markeredgewidth=1.0,
            )  # fmt: skip


def _beyond_level(run: xr.Dataset) -> NDArray[np.bool_]:
    """Say where steady flight breaks any limit."""
    broken = np.zeros(run.sizes["airspeed"], dtype=bool)
    for margin in ("rpm_margin", *_MARGINS):
        if f"level_{margin}" in run:
            broken |= run[f"level_{margin}"].values < 0
    return broken


def _shade_beyond(axes: Axes, run: xr.Dataset, words_at: float) -> None:
    """Shade the airspeeds at which steady flight breaks a limit."""
    x, broken = run["airspeed"].values, _beyond_level(run)
    across = blended_transform_factory(axes.transData, axes.transAxes)
    axes.fill_between(x, 0.0, 1.0, where=broken, transform=across, facecolor=LIMIT, alpha=0.08, linewidth=0.0, zorder=0)
    if broken.any():
        # Where the shade is, words fit beside it on the side that has more room.
        first, last = x[broken][0], x[broken][-1]
        before = first - x[0] > x[-1] - last
        axes.annotate(
            "beyond a limit", (first if before else last, words_at), xycoords=across, fontsize=8, color=LIMIT,
            va="center", xytext=(-3 if before else 3, 0), textcoords="offset points", ha="right" if before else "left",
        )  # fmt: skip


def _chain_panel(axes: Axes, run: xr.Dataset) -> None:
    """Draw the efficiency of each part over airspeed in steady flight, side by side."""
    x = run["airspeed"].values
    axes.set_xlim(x[0], x[-1] if x.size > 1 else x[0] + 1.0)
    axes.set_ylim(0.0, 105.0)
    axes.set_ylabel("efficiency, steady flight [%]")
    _shade_beyond(axes, run, 0.05)
    parts = [part for part in _CHAIN if part[1] in run and not np.isnan(run[part[1]].values).all()]
    flown = np.flatnonzero(np.isfinite(run["level_rpm"].values))
    colours = [INK if part == "overall" else colour for (part, _, _), colour in zip(parts, ramp(5), strict=False)]
    for (part, name, dash), colour in zip(parts, colours, strict=True):
        width = 2.4 if part == "overall" else 1.8
        axes.plot(x, 100.0 * run[name].values, color=colour, linestyle=dash, linewidth=width, zorder=3)
    of_all = "overall_efficiency" if "point_overall_efficiency" in run else "propeller_efficiency"
    _mark_points(axes, run, of_all, 100.0)
    figure = axes.get_figure()
    if figure is None:
        return
    # Names stand before the slowest flight where there is room, otherwise on their lines.
    room = x[flown[0]] - x[0] > 0.2 * (x[-1] - x[0])
    at = x[flown[0]] + (0.0 if room else 0.62) * (x[flown[-1]] - x[flown[0]])
    heights = [float(np.interp(at, x[flown], 100.0 * run[name].values[flown])) for _, name, _ in parts]
    box, gap = axes.get_window_extent(), 11.5 * figure.dpi / 72
    pixels = [float(axes.transData.transform((0.0, height))[1]) for height in heights]
    places = spread(pixels, gap, box.y0 + 0.5 * gap, box.y1 - 0.3 * gap)
    for place, (part, _, _), colour in zip(places, parts, colours, strict=True):
        axes.annotate(
            part, (at, axes.transData.inverted().transform((0.0, place))[1]), fontsize=8, fontweight="bold",
            xytext=(-4 if room else 0, 0), textcoords="offset points", ha="right" if room else "center", va="center",
            color=colour, zorder=6,
            bbox={"boxstyle": "round,pad=0.12", "facecolor": "white", "edgecolor": "none", "alpha": 0.92},
        )  # fmt: skip


def _rpm_panel(axes: Axes, run: xr.Dataset) -> None:
    """Draw the rpm of steady flight of a propeller whose rpm is an axis elsewhere."""
    x = run["airspeed"].values
    axes.set_xlim(x[0], x[-1] if x.size > 1 else x[0] + 1.0)
    axes.plot(x, run["level_rpm"].values, color=INK, linewidth=2.0, linestyle=_LEVEL, zorder=4)
    top = 1.1 * float(np.nanmax([np.nanmax(run["level_rpm"].values), run["rpm"].values[-1]]))
    axes.set_ylim(0.0, top)
    axes.set_ylabel(f"{by_name(COORDINATES)['rpm'].long_name} [rpm]")
    limit = _limit(run, "level_rpm", "level_rpm_margin")
    _draw_limits(axes, [] if limit is None else [(limit, "propeller")], "rpm", top)
    _mark_points(axes, run, "rpm")


def _endurance_panel(axes: Axes, run: xr.Dataset) -> None:
    """Draw endurance, and range on an axis of its own, over airspeed."""
    x = run["airspeed"].values
    axes.set_xlim(x[0], x[-1] if x.size > 1 else x[0] + 1.0)
    _shade_beyond(axes, run, 0.95)
    minutes = run["endurance"].values / 60.0
    axes.plot(x, minutes, color=INK, linewidth=2.0)
    axes.set_ylim(0.0, 1.12 * float(np.nanmax(minutes[np.isfinite(minutes)], initial=1e-9)))
    axes.set_ylabel("endurance (full line) [min]" if "range" in run else "endurance [min]")
    _mark_points(axes, run, "endurance", 1.0 / 60.0)
    if "range" not in run:
        return
    second = axes.twinx()
    colour = ramp(5)[3]
    reach = run["range"].values / 1e3
    second.plot(x, reach, color=colour, linewidth=2.0, linestyle=_LEVEL)
    second.set_ylim(0.0, 1.12 * float(np.nanmax(reach[np.isfinite(reach)], initial=1e-9)))
    second.set_ylabel("range (dashed line) [km]", color=colour)
    second.grid(visible=False)
    second.tick_params(length=3)
    second.spines["right"].set_visible(True)


def _words(run: xr.Dataset) -> list[str]:
    """Return what the page says in words: decisions, and how far to trust it."""
    said = [sentence(text) for text in str(run.attrs.get("decisions", "")).splitlines()]
    if "level_trust_reasons" in run and (run["level_trust"].values > 0).any():
        grades = trust_in_words(run["level_trust"].values, run["level_trust_reasons"].values, {"V": run["airspeed"]})
        said.append(f"Trust in steady flight: {'; '.join(grades)}.")
    elif run.attrs.get("trust"):
        said.append(f"Trust: {'; '.join(str(run.attrs['trust']).splitlines())}.")
    joined = [text.replace(" %", f"{_NO_BREAK}%") for text in said]
    return [line for text in joined for line in textwrap.wrap(text, 152, initial_indent="• ", subsequent_indent="   ")]


def _legend(run: xr.Dataset, rows: str, points: bool, hot: bool) -> list[str]:
    """Return what the numbers are, as lines."""
    if rows == "throttle":
        found = "Thrust is of all propellers, shaft power and motor current of one motor, battery current of the pack."
    else:
        found = "No motor in the case: thrust and shaft power of one propeller."
    if points and rows == "throttle":
        found += " ! beyond its limit."
    if points and hot:
        found += f" Winding: if held there, ! above {WINDING_CEILING:g} °C."
    if points and "point_drain_time" in run:
        found += " full: until the usable charge is gone at full throttle."
    return textwrap.wrap(found, 155)


def envelope_figure(run: xr.Dataset) -> Figure:
    """Draw an envelope on one page, of the proportion of A4 where all panels have something to show.

    Parameters
    ----------
    run : xarray.Dataset
        An envelope over `airspeed` and `throttle`, or over `airspeed` and `rpm` where the case has no motor.

    Returns
    -------
    matplotlib.figure.Figure
        A panel each for thrust available and required, currents and rpm with their limits, the chain of efficiencies,
        endurance and range in level flight or steady climb; then the named points as a table, and what a builder
        decides by in words. Lines are dotted where any limit is broken, or the winding would get too hot.
    """
    rows = "throttle" if "throttle" in run.dims else "rpm"
    grid = [panel for panel in (_PANELS if rows == "throttle" else _WITHOUT_MOTOR) if panel[0] in run.data_vars]
    flown = "level_rpm" in run and np.isfinite(run["level_rpm"].values).sum() > 1
    more = [_rpm_panel] if flown and rows == "rpm" else []
    more += [_chain_panel] if flown and "level_propeller_efficiency" in run else []
    more += [_endurance_panel] if flown and "endurance" in run else []
    settings = run[rows].values
    picks = sorted({int(np.argmin(np.abs(settings - settings[-1] * (k + 1) / _LINES))) for k in range(_LINES)})
    title = textwrap.wrap(str(run.attrs.get("title", "")) or "Envelope", 80)
    # The one point of a propeller without motor and airframe would only repeat the end of a line.
    points = "point" in run.dims and (rows == "throttle" or "drag" in run)
    hot = "winding_temperature" in run and not np.isnan(run["winding_temperature"].values).all()
    hovers = "point_figure_of_merit" in run
    said, legend = _words(run), _legend(run, rows, points, hot)
    count = len(grid) + len(more)
    lines = -(-count // 2)

    width, panel_height, gap, step, pitch = 9.6, 2.45, 0.36, 0.21, 0.168
    head = 0.30 + 0.27 * len(title) + 0.45
    foot = 0.72 + 0.15 * len(legend) + pitch * len(said) + (step * (1.9 + run.sizes["point"]) + 0.30 if points else 0.1)
    height = head + lines * panel_height + (lines - 1) * gap + foot
    left, right, between = 0.78 / width, 1 - (0.66 if "range" in run else 0.3) / width, 0.85 / width
    column = (right - left - between) / 2
    edge = 1 - 0.3 / width

    with our_style():
        figure = Figure(figsize=(width, height))
        for k in range(count):
            row, side = divmod(k, 2)
            bottom = (foot + (lines - 1 - row) * (panel_height + gap)) / height
            axes = figure.add_axes((left + side * (column + between), bottom, column, panel_height / height))
            if k < len(grid):
                name, wanted = grid[k]
                limits = [(value, what) for margin, what in wanted if (value := _limit(run, name, margin)) is not None]
                _panel(axes, run, rows, name, limits, picks)
            else:
                more[k - len(grid)](axes, run)
            last = k + 2 >= count
            axes.tick_params(labelbottom=last, length=3)
            if last:
                climbing = "climb speed" if hovers else str(by_name(COORDINATES)["airspeed"].long_name)
                axes.set_xlabel(f"{climbing} [m/s]")
        y = 0.30
        for text in title:
            figure.text(left, 1 - y / height, text, fontsize=13.5, fontweight="bold", va="center")
            y += 0.27
        # The lines' own colours in a row: a single one would read as the line that has it.
        setting = tuple(Line2D([], [], color=colour, linewidth=1.8) for colour in ramp(len(picks)))
        marks: list[Any] = [setting]
        names = [f"{rows}, low to high" if len(picks) > 1 else rows]
        if "required_thrust" in run and np.isfinite(run["required_thrust"].values).any():
            marks.append(Line2D([], [], color=INK, linewidth=2.0, linestyle=_LEVEL))
            names.append("required to climb" if hovers else "required in level flight")
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
            names.append("beyond a limit" + (f", or winding above {WINDING_CEILING:g} °C" if hot else ""))
        figure.legend(
            marks, names, loc="upper left", bbox_to_anchor=(left - 0.006, 1 - (y - 0.10) / height), ncols=len(marks),
            fontsize=8.5, handlelength=2.4, columnspacing=1.4, borderaxespad=0.0, borderpad=0.0,
            handler_map={tuple: HandlerTuple(ndivide=None, pad=0.0)},
        )  # fmt: skip
        below = foot - 0.66
        if points:
            _points_table(figure, run, 0.3 / width, edge, below / height, step / height)
            below -= step * (1.9 + run.sizes["point"]) + 0.20
        for k, text in enumerate(said):
            figure.text(0.3 / width, (below - (k + 0.5) * pitch) / height, text, fontsize=8, va="center")
        for k, text in enumerate(reversed(legend)):
            figure.text(0.3 / width, (0.12 + 0.15 * k) / height, text, fontsize=7.5, color=QUIET, va="center")
    return figure
