"""The figure of a comparison: measured points over predicted lines, moving and standing still, on one page."""

from __future__ import annotations

import math
import textwrap
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from numpy.typing import NDArray

from bemt.figures.style import INK, MARKERS, QUIET, our_style, ramp
from bemt.quantities.registry import COORDINATES, TABLE, by_name
from bemt.table.coefficients import figure_of_merit

if TYPE_CHECKING:
    from bemt.study.compare import Comparison, Errors, Points

FloatArray = NDArray[np.float64]

_PANELS = (
    ("thrust_coefficient", "$C_T$"),
    ("power_coefficient", "$C_P$"),
    ("efficiency", r"$\eta$"),
)
_NAMED_RUNS = 10
_PANEL_HEIGHT, _PANEL_GAP = 2.2, 0.22
_LEFT, _RIGHT, _BETWEEN = 0.86, 0.25, 0.92
_MOVING_WIDTH, _STILL_WIDTH = 5.2, 2.7


def comparison_figure(comparison: Comparison, *, title: str = "") -> Figure:
    """Draw measured points over what is predicted for them.

    Parameters
    ----------
    comparison : Comparison
        From `bemt.compare`.
    title : str
        Of the page.

    Returns
    -------
    matplotlib.figure.Figure
        CT, CP and efficiency over the advance ratio, colour and shape naming the rpm; CT, CP and figure of merit over
        rpm standing still. Only the half there are readings for is drawn.
    """
    moving, still = bool(comparison.runs), bool(comparison.still.any())
    parts = [
        width for width, there in ((_MOVING_WIDTH, moving), (_STILL_WIDTH if moving else _MOVING_WIDTH, still)) if there
    ]
    width = _LEFT + sum(parts) + _BETWEEN * (len(parts) - 1) + _RIGHT
    heads = textwrap.wrap(title or "Measured and predicted coefficients", int(width * 7.6))
    summary = _summary(comparison)
    named = np.unique(
        np.linspace(0, len(comparison.runs) - 1, min(len(comparison.runs), _NAMED_RUNS)).round().astype(int)
    )
    names = max(1, int(width // 1.55))
    head = 0.30 + 0.26 * len(heads) + 0.21 * len(summary) + 0.24 * (1 + -(-len(named) // names)) + 0.04
    foot = 0.84
    height = head + 3 * _PANEL_HEIGHT + 2 * _PANEL_GAP + foot

    with our_style():
        figure = Figure(figsize=(width, height))
        columns: list[list[Axes]] = []
        left = _LEFT
        for part in parts:
            panels: list[Axes] = []
            for k in range(3):
                bottom = foot + (2 - k) * (_PANEL_HEIGHT + _PANEL_GAP)
                panels.append(
                    figure.add_axes(
                        (left / width, bottom / height, part / width, _PANEL_HEIGHT / height),
                        sharex=panels[0] if panels else None,
                    )
                )
            columns.append(panels)
            left += part + _BETWEEN
        colours = ramp(len(comparison.runs))
        if moving:
            _moving(columns[0], comparison, colours)
        if still:
            _still(columns[-1], comparison, alone=not moving)
        for panels in columns:
            for axes in panels:
                axes.tick_params(labelbottom=axes is panels[-1], length=3)
                axes.yaxis.set_label_coords(-0.6 / (axes.get_position().width * width), 0.5)

        y = 0.30
        x = _LEFT / width
        for line in heads:
            figure.text(x, 1 - y / height, line, fontsize=13, fontweight="bold", va="center")
            y += 0.26
        for line in summary:
            figure.text(x, 1 - y / height, line, fontsize=9, color=QUIET, va="center")
            y += 0.21
        kinds = [
            Line2D(
                [], [], color=INK, linestyle="", marker="o", markerfacecolor="white", markersize=5, label="measured"
            ),
            Line2D([], [], color=INK, linewidth=1.5, label="predicted"),
        ]
        runs = [
            Line2D([], [], color=colours[k], marker=MARKERS[k % len(MARKERS)], markersize=5, markeredgewidth=1.1,
                   markerfacecolor="white", linewidth=1.5, label=f"{comparison.runs[k].rpm:.0f} rpm")
            for k in named
        ]  # fmt: skip
        for handles, columns_wide in ((kinds, 2), (runs, names)):
            if not handles:
                continue
            figure.legend(
                handles=handles, loc="upper left", bbox_to_anchor=(x - 0.08 / width, 1 - (y - 0.04) / height),
                ncols=columns_wide, fontsize=9, handlelength=2.2, columnspacing=1.8, borderaxespad=0.0, borderpad=0.0,
            )  # fmt: skip
            y += 0.24 * -(-len(handles) // columns_wide)
        figure.text(
            x,
            0.14 / height,
            "$J = V/(nD)$,  $C_T = T/(ρn^2D^4)$,  $C_P = P/(ρn^3D^5)$,  $η = J C_T/C_P$,  n in rev/s",
            fontsize=8, color=QUIET, va="center",
        )  # fmt: skip
    return figure


def _moving(panels: list[Axes], comparison: Comparison, colours: list[Any]) -> None:
    quantities, axis = by_name(TABLE), by_name(COORDINATES)["advance_ratio"]
    last = float(comparison.advance_ratio.max())
    for axes, (name, symbol) in zip(panels, _PANELS, strict=True):
        measured = getattr(comparison.measured, name)
        for k, run in enumerate(comparison.runs):
            x, y = run.advance_ratio, getattr(run.line, name)
            if name == "efficiency":
                x, y = _closed(x, y, run.predicted.zero_thrust_advance_ratio)
            inside = x <= max(1.04 * last, run.advance_ratio[1])
            axes.plot(x[inside], y[inside], color=colours[k], linewidth=1.5, zorder=2)
            _points(axes, comparison.advance_ratio[run.rows], measured[run.rows], colours[k], MARKERS[k % len(MARKERS)])
        axes.set_ylabel(f"{quantities[name].long_name}  {symbol}")
        axes.margins(x=0.015, y=0.07)
        axes.axhline(0.0, color=QUIET, linewidth=0.9, zorder=1)
    panels[-1].set_ylim(bottom=-0.02)
    panels[0].set_xlim(left=-0.01 * last)
    panels[-1].set_xlabel(f"{axis.long_name}  $J$")


def _closed(J: FloatArray, efficiency: FloatArray, zero_thrust: float) -> tuple[FloatArray, FloatArray]:
    """Lead an efficiency line down to where the thrust ends."""
    if not math.isfinite(zero_thrust):
        return J, efficiency
    kept = zero_thrust > J
    return np.append(J[kept], zero_thrust), np.append(efficiency[kept], 0.0)


def _still(panels: list[Axes], comparison: Comparison, *, alone: bool) -> None:
    quantities, axis = by_name(TABLE), by_name(COORDINATES)["rpm"]
    rows, rpm = comparison.still, comparison.readings.rpm
    for axes, (name, symbol) in zip(panels, (*_PANELS[:2], ("static_figure_of_merit", "FM")), strict=True):
        axes.plot(comparison.static_rpm, _standing(comparison.static_line, name), color=INK, linewidth=1.5, zorder=2)
        _points(axes, rpm[rows], _standing(comparison.measured, name)[rows], INK, "o")
        axes.set_ylabel(f"{quantities[name].long_name}  {symbol}" if alone else f"standing still  {symbol}")
        axes.margins(x=0.06)
        low, high = axes.get_ylim()
        axes.set_ylim(min(0.0, low), 1.12 * high if high > 0.0 else high)
    panels[-1].set_xlabel(f"{axis.long_name}  [rpm]")


def _standing(points: Points, name: str) -> FloatArray:
    if name == "static_figure_of_merit":
        return figure_of_merit(points.thrust_coefficient, points.power_coefficient)
    values: FloatArray = getattr(points, name)
    return values


def _points(axes: Axes, x: FloatArray, y: FloatArray, colour: Any, marker: str) -> None:
    axes.plot(
        x, y, marker, color=colour, markersize=4.6, markeredgewidth=1.1, markerfacecolor="white", zorder=3, clip_on=True
    )


def _summary(comparison: Comparison) -> list[str]:
    """Put the errors, and what the best constant blade angle would leave of them, into two lines."""
    lines = [_rms("As given", comparison.errors)]
    if comparison.remedies:
        angle = comparison.remedies[0]
        lines.append(_rms(f"Turned by {math.degrees(angle.best):+.1f}° (not drawn)".replace("-", "−"), angle.errors))
    return [line for line in lines if line]


def _rms(words: str, errors: Errors) -> str:
    parts = []
    for kind, pairs, form in (
        ("rms moving", (("$C_T$", errors.thrust_rms), ("$C_P$", errors.power_rms)), "{:.1f}"),
        ("standing still", (("$C_T$", errors.static_thrust), ("$C_P$", errors.static_power)), "{:+.1f}"),
    ):
        known = [f"{symbol} {form.format(100.0 * value)} %" for symbol, value in pairs if math.isfinite(value)]
        if known:
            parts.append(f"{kind} {', '.join(known)}".replace("-", "−"))
    return f"{words}: {'; '.join(parts)} of the static value" if parts else ""
