"""The coefficient figure: CT, CP and efficiency over the advance ratio, one line an rpm."""

from __future__ import annotations

import math
import textwrap
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from numpy.typing import NDArray

from bemt.figures.style import INK, LIMIT, MARKERS, QUIET, our_style, ramp
from bemt.quantities.registry import (
    COORDINATES,
    STATUS_NOT_CONVERGED,
    TABLE_AT_INCIDENCE,
    TRUST_FAIR,
    TRUST_FLAGS,
    TRUST_GOOD,
    TRUST_NOT_RUN,
    TRUST_POOR,
    by_name,
)
from bemt.table.validity import trust_in_words

if TYPE_CHECKING:
    import xarray as xr

FloatArray = NDArray[np.float64]

_PANELS = (
    ("thrust_coefficient", "$C_T$"),
    ("power_coefficient", "$C_P$"),
    ("efficiency", r"$\eta$"),
)
_INCLINED_PANELS = (
    ("normal_force_coefficient", "$C_N$"),
    ("yaw_moment_coefficient", "$C_n$"),
)
_DASHES: dict[int, Any] = {
    TRUST_NOT_RUN: (0, (1.0, 1.6)),
    TRUST_POOR: (0, (1.0, 1.6)),
    TRUST_FAIR: (0, (5.0, 1.8)),
    TRUST_GOOD: "solid",
}
_NAMED_LINES = 10
_GUESSED = 128
_AXES = {"advance_ratio": "J"}
_WIDTH, _PANEL_HEIGHT, _LOW_PANEL_HEIGHT, _PANEL_GAP = 7.4, 2.55, 1.85, 0.22
_LINE, _NOTE_LENGTH = 0.155, 118
_DESCENT = "#f0ece2"


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


def _reasons(table: xr.Dataset) -> list[str]:
    """Say why points of this table have less than a good grade, and where, in lines of the page's width."""
    if "trust_reasons" not in table:
        return []
    axes = {_AXES.get(str(name), str(name)): table[name].values for name in table["trust"].dims}
    grades = trust_in_words(table["trust"].values, table["trust_reasons"].values, axes)[1:]
    return [line for grade in grades for line in textwrap.wrap(f"Trust {grade}.", _NOTE_LENGTH)]


def _line_label(lines: xr.Dataset, along: str, index: int) -> str:
    parts = []
    if along == "incidence":
        return f"incidence {float(lines['incidence'].values[index]):g}°"
    if "incidence" in lines.coords:
        return f"{float(lines['rpm'].values[index]):.0f} rpm"
    table = lines
    for name, symbol in (("static_figure_of_merit", "FM"), ("peak_efficiency", r"peak $\eta$")):
        if name in table and np.isfinite(value := float(table[name].values[index])):
            parts.append(f"{symbol} {value:.2f}")
    rpm = f"{float(table['rpm'].values[index]):.0f} rpm"
    return f"{rpm}: {', '.join(parts)}" if parts else rpm


def _lines(table: xr.Dataset) -> tuple[xr.Dataset, str, str]:
    """Return what is drawn over the advance ratio, the axis that tells the lines apart, and what the head says of it.

    With several incidences these are the lines, at the highest rpm; with one, as without, the rpm are.
    """
    if "incidence" not in table.dims:
        return table, "rpm", ""
    if table.sizes["incidence"] > 1:
        count = table.sizes["rpm"]
        named = f"{float(table['rpm'].values[-1]):.0f} rpm" + (f", the highest of {count}" if count > 1 else "")
        return table.isel(rpm=-1), "incidence", named
    return table.isel(incidence=0), "rpm", f"incidence {float(table['incidence'].values[0]):g}°"


def _subtitle(table: xr.Dataset, named: str) -> str:
    attrs, parts = table.attrs, []
    if "blades" in attrs:
        parts.append(f"{int(attrs['blades'])} blades")
    if "diameter" in attrs:
        parts.append(f"diameter {float(attrs['diameter']) * 1e3:.0f} mm")
    if "air_density" in attrs:
        parts.append(f"air {float(attrs['air_density']):.3f} kg/m³")
    if named:
        parts.append(named)
    return "   ".join(parts)


def coefficient_figure(table: xr.Dataset) -> Figure:
    """Draw a coefficient table on one page.

    Parameters
    ----------
    table : xarray.Dataset
        A coefficient table over `rpm` and `advance_ratio`, and `incidence` where it has one. Its attributes `title`,
        `blades`, `diameter` [m] and `air_density` [kg/m3] make the head, where they are there.

    Returns
    -------
    matplotlib.figure.Figure
        Three panels over the advance ratio, at incidence two more for normal force and yaw moment. Colour and shape
        name the rpm, or the incidence at the highest rpm where there are several; full, dashed and dotted lines stand
        for good, fair and poor trust, and hollow shapes for poor. Descent is shaded. A note says in words what keeps
        points from a good grade, and where.
    """
    quantities, axis = by_name(TABLE_AT_INCIDENCE), by_name(COORDINATES)["advance_ratio"]
    lines, along, head_words = _lines(table)
    lines = lines.transpose(along, "advance_ratio", ...)
    shown = _PANELS + (_INCLINED_PANELS if "incidence" in table.dims else ())
    tall = _PANEL_HEIGHT if len(shown) == len(_PANELS) else _LOW_PANEL_HEIGHT
    J, count = lines["advance_ratio"].values, lines.sizes[along]
    grade = lines["trust"].values if "trust" in lines else np.full((count, J.size), TRUST_GOOD)
    guessed = "trust_reasons" in table and bool((table["trust_reasons"].values & _GUESSED).any())
    named = np.unique(np.linspace(0, count - 1, min(count, _NAMED_LINES)).round().astype(int))

    title = textwrap.wrap(str(table.attrs.get("title", "")) or "Propeller coefficients", 62)
    reasons = _reasons(table)
    rows = -(-len(named) // 2)
    head = 0.30 + 0.26 * len(title) + 0.26 + (0.36 if guessed else 0.0) + 0.22 * rows + 0.12
    foot = 0.95 + _LINE * len(reasons)
    height = head + len(shown) * tall + (len(shown) - 1) * _PANEL_GAP + foot

    with our_style():
        figure = Figure(figsize=(_WIDTH, height))
        left, right = 0.86 / _WIDTH, 1 - 0.25 / _WIDTH
        panels: list[Axes] = []
        for k in range(len(shown)):
            bottom = (foot + (len(shown) - 1 - k) * (tall + _PANEL_GAP)) / height
            panels.append(
                figure.add_axes((left, bottom, right - left, tall / height), sharex=panels[0] if panels else None)
            )
        colours = ramp(count)
        for axes, (name, symbol) in zip(panels, shown, strict=True):
            values = lines[name].values
            for index in range(count):
                x, y, trust, end = J, values[index], grade[index], math.nan
                if name == "efficiency" and "incidence" not in table.dims and "zero_thrust_advance_ratio" in table:
                    end = float(table["zero_thrust_advance_ratio"].values[index])
                    x, y, trust = _closed(x, y, trust, end)
                _graded_line(axes, x, y, trust, colours[index], MARKERS[index % len(MARKERS)], 2 * index + 1, end)
            failed = (
                lines["status"].values == STATUS_NOT_CONVERGED if "status" in lines else np.zeros_like(values, bool)
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
            if J[0] < 0.0:
                axes.axvspan(J[0], min(0.0, J[-1]), facecolor=_DESCENT, edgecolor="none", zorder=0)
        panels[2].set_ylim(bottom=-0.02)
        panels[-1].set_xlabel(f"{axis.long_name}  $J$")

        def down(inches: float) -> float:
            return 1 - inches / height

        y = 0.30
        for line in title:
            figure.text(left, down(y), line, fontsize=13, fontweight="bold", va="center")
            y += 0.26
        figure.text(left, down(y), _subtitle(table, head_words), fontsize=9.5, color=QUIET, va="center")
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
                   label=_line_label(lines, along, int(k)))
            for k in named
        ]  # fmt: skip
        figure.legend(
            handles=handles, loc="upper left", bbox_to_anchor=(left - 0.008, down(y - 0.07)), ncols=2, fontsize=9,
            handlelength=2.2, columnspacing=2.2, labelspacing=0.35, borderaxespad=0.0, borderpad=0.0,
        )  # fmt: skip
        present = [code for code in (TRUST_GOOD, TRUST_FAIR, TRUST_POOR) if (grade == code).any()]
        marks: list[Artist] = [
            Line2D([], [], color=INK, linewidth=1.5, linestyle=_DASHES[code], marker="o" if code == TRUST_POOR else "",
                   markerfacecolor="white", markersize=5, label=f"{TRUST_FLAGS[code]} trust")
            for code in present
        ]  # fmt: skip
        if J[0] < 0.0:
            marks.append(Patch(facecolor=_DESCENT, edgecolor="none", label="descent, estimated"))
        if "status" in lines and (lines["status"].values == STATUS_NOT_CONVERGED).any():
            marks.append(Line2D([], [], color=LIMIT, marker="x", linestyle="", label="not converged"))
        figure.legend(
            handles=marks, loc="lower left", bbox_to_anchor=(left - 0.008, (0.29 + _LINE * len(reasons)) / height),
            ncols=5, fontsize=8.5, handlelength=2.8, columnspacing=1.6, borderaxespad=0.0, borderpad=0.0,
        )  # fmt: skip
        for row, line in enumerate(reasons):
            above = 0.31 + _LINE * (len(reasons) - 1 - row)
            figure.text(left, above / height, line, fontsize=7.5, color=QUIET, va="center")
        figure.text(
            left,
            0.14 / height,
            "$J = V/(nD)$,  $C_T = T/(ρn^2D^4)$,  $C_P = P/(ρn^3D^5)$,  "
            + (r"$η = J\,(C_T \cos i - C_N \sin i)/C_P$" if "incidence" in table.dims else "$η = J C_T/C_P$")
            + ",  n in rev/s",
            fontsize=8, color=QUIET, va="center",
        )  # fmt: skip
        if len(named) < count:
            panels[0].set_title(
                f"{count} {along} in all; lines between those named run in order", fontsize=8, loc="right"
            )
    return figure
