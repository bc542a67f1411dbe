"""The coefficient figure: CT, CP and efficiency over the advance ratio, one line an rpm."""

from __future__ import annotations

import math
import textwrap
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from numpy.typing import NDArray

from bemt.figures.style import INK, LIMIT, MARKERS, QUIET, our_style, ramp
from bemt.files.flags import spoken
from bemt.quantities.registry import (
    COORDINATES,
    STATUS_NOT_CONVERGED,
    TABLE,
    TRUST_FAIR,
    TRUST_FLAGS,
    TRUST_GOOD,
    TRUST_NOT_RUN,
    TRUST_POOR,
    TRUST_REASONS,
    by_name,
)

if TYPE_CHECKING:
    import xarray as xr

FloatArray = NDArray[np.float64]

_PANELS = (
    ("thrust_coefficient", "$C_T$"),
    ("power_coefficient", "$C_P$"),
    ("efficiency", r"$\eta$"),
)
_DASHES: dict[int, Any] = {
    TRUST_NOT_RUN: (0, (1.0, 1.6)),
    TRUST_POOR: (0, (1.0, 1.6)),
    TRUST_FAIR: (0, (5.0, 1.8)),
    TRUST_GOOD: "solid",
}
_NAMED_LINES = 10
_GUESSED = 128
_WIDTH, _PANEL_HEIGHT, _PANEL_GAP = 7.4, 2.55, 0.22


def _graded_line(
    axes: Axes,
    x: FloatArray,
    y: FloatArray,
    grade: NDArray[Any],
    colour: Any,
    marker: str,
    first: int,
    unmarked: float = math.nan,
) -> None:
    """Draw one rpm: colour and shape say which it is, dashes and hollow shapes say how far to trust it."""
    worse = np.minimum(grade[:-1], grade[1:])
    start = 0
    for stop in range(1, x.size):
        # One collection a run of equal grade, or the dashes would start afresh at every point.
        if stop == x.size - 1 or worse[stop] != worse[start]:
            path = np.column_stack([x[start : stop + 1], y[start : stop + 1]])
            axes.add_collection(
                LineCollection([path], colors=[colour], linewidths=1.7, linestyles=[_DASHES[int(worse[start])]])
            )
            start = stop
    every = max(1, x.size // 9)
    at = np.arange(first % every, x.size, every) if x.size > 9 else np.arange(x.size)
    at = at[x[at] != unmarked]
    for solid in (True, False):
        chosen = at[(grade[at] > TRUST_POOR) == solid]
        axes.plot(
            x[chosen],
            y[chosen],
            marker,
            color=colour,
            markersize=5.2,
            markeredgewidth=1.2,
            markerfacecolor=colour if solid else "white",
            zorder=3,
        )
    axes.update_datalim(np.column_stack([x, y])[np.isfinite(y)])


def _closed(
    J: FloatArray, efficiency: FloatArray, grade: NDArray[Any], zero_thrust: float
) -> tuple[FloatArray, FloatArray, NDArray[Any]]:
    """Lead an efficiency curve down to where the thrust ends, and with it the efficiency."""
    after = int(np.searchsorted(J, zero_thrust))
    inside = 0 < after < J.size and J[after] > zero_thrust  # both false where there is no such advance ratio
    if not inside or np.isnan(efficiency[after - 1]) or np.isfinite(efficiency[after]):
        return J, efficiency, grade
    return (
        np.insert(J, after, zero_thrust),
        np.insert(efficiency, after, 0.0),
        np.insert(grade, after, min(grade[after - 1], grade[after])),
    )


def _reasons(table: xr.Dataset) -> str:
    """Name what keeps points of this table from a good grade, the most frequent first."""
    if "trust_reasons" not in table:
        return ""
    codes = table["trust_reasons"].values
    counts = {word: int(((codes & bit) != 0).sum()) for bit, word in TRUST_REASONS.items()}
    named = sorted((word for word, count in counts.items() if count), key=lambda word: -counts[word])
    return ", ".join(spoken(word) for word in named)


def _line_label(table: xr.Dataset, index: int) -> str:
    parts = []
    for name, symbol in (("static_figure_of_merit", "FM"), ("peak_efficiency", r"peak $\eta$")):
        if name in table and np.isfinite(value := float(table[name].values[index])):
            parts.append(f"{symbol} {value:.2f}")
    rpm = f"{float(table['rpm'].values[index]):.0f} rpm"
    return f"{rpm}: {', '.join(parts)}" if parts else rpm


def _subtitle(table: xr.Dataset) -> str:
    attrs, parts = table.attrs, []
    if "blades" in attrs:
        parts.append(f"{int(attrs['blades'])} blades")
    if "diameter" in attrs:
        parts.append(f"diameter {float(attrs['diameter']) * 1e3:.0f} mm")
    if "air_density" in attrs:
        parts.append(f"air {float(attrs['air_density']):.3f} kg/m³")
    return "   ".join(parts)


def coefficient_figure(table: xr.Dataset) -> Figure:
    """Draw a coefficient table on one page.

    Parameters
    ----------
    table : xarray.Dataset
        A coefficient table over `rpm` and `advance_ratio`. Its attributes `title`, `blades`, `diameter` [m] and
        `air_density` [kg/m3] make the head, where they are there.

    Returns
    -------
    matplotlib.figure.Figure
        Three panels over the advance ratio. Colour and shape name the rpm; full, dashed and dotted lines stand for
        good, fair and poor trust, and hollow shapes for poor.
    """
    quantities, axis = by_name(TABLE), by_name(COORDINATES)["advance_ratio"]
    table = table.transpose("rpm", "advance_ratio", ...)
    J, count = table["advance_ratio"].values, table.sizes["rpm"]
    grade = table["trust"].values if "trust" in table else np.full((count, J.size), TRUST_GOOD)
    guessed = "trust_reasons" in table and bool((table["trust_reasons"].values & _GUESSED).any())
    named = np.unique(np.linspace(0, count - 1, min(count, _NAMED_LINES)).round().astype(int))

    title = textwrap.wrap(str(table.attrs.get("title", "")) or "Propeller coefficients", 62)
    rows = -(-len(named) // 2)
    head = 0.30 + 0.26 * len(title) + 0.26 + (0.36 if guessed else 0.0) + 0.22 * rows + 0.12
    foot = 1.12
    height = head + 3 * _PANEL_HEIGHT + 2 * _PANEL_GAP + foot

    with our_style():
        figure = Figure(figsize=(_WIDTH, height))
        left, right = 0.86 / _WIDTH, 1 - 0.25 / _WIDTH
        panels: list[Axes] = []
        for k in range(3):
            bottom = (foot + (2 - k) * (_PANEL_HEIGHT + _PANEL_GAP)) / height
            panels.append(
                figure.add_axes(
                    (left, bottom, right - left, _PANEL_HEIGHT / height), sharex=panels[0] if panels else None
                )
            )
        colours = ramp(count)
        for axes, (name, symbol) in zip(panels, _PANELS, strict=True):
            values = table[name].values
            for index in range(count):
                x, y, trust, end = J, values[index], grade[index], math.nan
                if name == "efficiency" and "zero_thrust_advance_ratio" in table:
                    end = float(table["zero_thrust_advance_ratio"].values[index])
                    x, y, trust = _closed(x, y, trust, end)
                _graded_line(axes, x, y, trust, colours[index], MARKERS[index % len(MARKERS)], 2 * index + 1, end)
            failed = (
                table["status"].values == STATUS_NOT_CONVERGED if "status" in table else np.zeros_like(values, bool)
            )
            axes.plot(
                np.broadcast_to(J, values.shape)[failed], values[failed], "x", color=LIMIT, markersize=7, zorder=4
            )
            axes.set_ylabel(f"{quantities[name].long_name}  {symbol}")
            axes.autoscale_view()
            axes.margins(x=0.015, y=0.07)
            axes.axhline(0.0, color=QUIET, linewidth=0.9, zorder=1)
            axes.tick_params(labelbottom=axes is panels[-1], length=3)
            axes.yaxis.set_label_coords(-0.095, 0.5)
        panels[-1].set_ylim(bottom=-0.02)
        panels[-1].set_xlabel(f"{axis.long_name}  $J$")

        def down(inches: float) -> float:
            return 1 - inches / height

        y = 0.30
        for line in title:
            figure.text(left, down(y), line, fontsize=13, fontweight="bold", va="center")
            y += 0.26
        figure.text(left, down(y), _subtitle(table), fontsize=9.5, color=QUIET, va="center")
        y += 0.26
        if guessed:
            figure.text(
                left,
                down(y + 0.05),
                "Section guessed: nobody measured this blade's section. Read the lines as a first estimate.",
                fontsize=9,
                va="center",
                color="#6b3d00",
                bbox={"boxstyle": "round,pad=0.35", "facecolor": "#fff3dc", "edgecolor": "#c98a1b", "linewidth": 0.8},
            )
            y += 0.36
        handles = [
            Line2D([], [], color=colours[k], marker=MARKERS[k % len(MARKERS)], markersize=5.2, linewidth=1.7,
                   label=_line_label(table, int(k)))
            for k in named
        ]  # fmt: skip
        figure.legend(
            handles=handles, loc="upper left", bbox_to_anchor=(left - 0.008, down(y - 0.07)), ncols=2, fontsize=9,
            handlelength=2.2, columnspacing=2.2, labelspacing=0.35, borderaxespad=0.0, borderpad=0.0,
        )  # fmt: skip
        present = [code for code in (TRUST_GOOD, TRUST_FAIR, TRUST_POOR) if (grade == code).any()]
        marks = [
            Line2D([], [], color=INK, linewidth=1.5, linestyle=_DASHES[code], marker="o" if code == TRUST_POOR else "",
                   markerfacecolor="white", markersize=5, label=f"{TRUST_FLAGS[code]} trust")
            for code in present
        ]  # fmt: skip
        if "status" in table and (table["status"].values == STATUS_NOT_CONVERGED).any():
            marks.append(Line2D([], [], color=LIMIT, marker="x", linestyle="", label="not converged"))
        figure.legend(
            handles=marks, loc="lower left", bbox_to_anchor=(left - 0.008, 0.46 / height), ncols=4, fontsize=8.5,
            handlelength=2.8, columnspacing=1.6, borderaxespad=0.0, borderpad=0.0,
        )  # fmt: skip
        reasons = _reasons(table)
        if reasons:
            figure.text(
                left, 0.32 / height, f"Less than good because: {reasons}.", fontsize=8, color=QUIET, va="center"
            )
        figure.text(
            left,
            0.14 / height,
            "$J = V/(nD)$,  $C_T = T/(ρn^2D^4)$,  $C_P = P/(ρn^3D^5)$,  $η = J C_T/C_P$,  n in rev/s",
            fontsize=8, color=QUIET, va="center",
        )  # fmt: skip
        if len(named) < count:
            panels[0].set_title(f"{count} rpm in all; lines between those named run in order", fontsize=8, loc="right")
    return figure
