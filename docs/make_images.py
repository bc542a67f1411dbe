"""Remake the figures of the README from the shipped case, and the drawing of the axes.

    python docs/make_images.py
    python docs/make_images.py axes

Needs Pillow, which comes with matplotlib. The figures of the README are those of the commands, with fewer colours to
keep them small. The second line makes the drawing alone.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Arc, Circle, Polygon
from PIL import Image

from bemt.figures.style import INK, LIMIT, QUIET, our_style, save

DOCS = Path(__file__).parent
CASE = DOCS.parent / "cases" / "sandpiper.toml"
COLOURS = 128
WIDTHS = {"table": 1200, "envelope": 1080}


def store_small(drawn: Path, target: Path, width: int = 1200) -> None:
    """Store a picture with fewer points and colours."""
    with Image.open(drawn) as picture:
        narrow = picture.convert("RGB")
        if narrow.width > width:
            narrow = narrow.resize((width, round(narrow.height * width / narrow.width)), Image.Resampling.LANCZOS)
        small = narrow.quantize(COLOURS, kmeans=10, dither=Image.Dither.NONE)
    small.save(target, optimize=True)


_FLOW, _FORCE, _MOMENT = "#2b7a9b", INK, LIMIT
_INCIDENCE = np.radians(25.0)


def _arrow(
    axes: Axes,
    start: tuple[float, float],
    end: tuple[float, float],
    colour: str,
    words: str = "",
    at: tuple[float, float] | None = None,
    style: str = "-|>",
) -> None:
    """Draw an arrow, and words beyond its head or where they are wanted."""
    shape = {"arrowstyle": style, "color": colour, "linewidth": 1.8, "shrinkA": 0, "shrinkB": 0, "mutation_scale": 14}
    axes.annotate("", end, start, arrowprops=shape)
    if words:
        x, y = at or (end[0], end[1])
        axes.text(x, y, words, color=colour, fontsize=10, ha="center", va="center")


def _turn(
    axes: Axes,
    centre: tuple[float, float],
    radius: float,
    span: tuple[float, float],
    colour: str,
    flattened: float = 1.0,
) -> None:
    """Draw a curved arrow from one angle to another [deg], counter-clockwise positive; flat as seen from the side."""
    first, last = np.radians(span)
    angle = np.linspace(first, last, 40)
    x, y = centre[0] + radius * np.cos(angle), centre[1] + flattened * radius * np.sin(angle)
    axes.plot(x[:-2], y[:-2], color=colour, linewidth=1.8)
    _arrow(axes, (x[-4], y[-4]), (x[-1], y[-1]), colour)


def draw_axes(target: Path) -> None:
    """Draw incidence, forces and moments of a right-hand propeller, from the right side and from behind."""
    with our_style():
        figure = Figure(figsize=(8.4, 4.6))
        side, rear = (figure.add_axes((left, 0.02, 0.48, 0.86)) for left in (0.01, 0.51))
        for axes, title in ((side, "from the right side"), (rear, "from behind")):
            axes.set_xlim(-1.6, 1.6)
            axes.set_ylim(-1.5, 1.65)
            axes.set_aspect("equal")
            axes.axis("off")
            axes.set_title(title, fontsize=11, color=INK)

        ahead = np.array([np.cos(_INCIDENCE), np.sin(_INCIDENCE)])
        up = np.array([-ahead[1], ahead[0]])
        side.plot(
            *zip(-1.3 * ahead, 0.25 * ahead, strict=True), color=QUIET, linewidth=1.2, linestyle=(0, (7, 3, 1, 3))
        )
        body = [
            -1.35 * ahead - 0.16 * up,
            -0.08 * ahead - 0.16 * up,
            -0.08 * ahead + 0.16 * up,
            -1.35 * ahead + 0.16 * up,
        ]
        side.add_patch(Polygon(body, facecolor="#e9edef", edgecolor=QUIET, linewidth=0.9))
        side.plot(*zip(-0.8 * up, 0.8 * up, strict=True), color=INK, linewidth=5, solid_capstyle="round")
        side.plot([0.0, 1.45], [0.0, 0.0], color=QUIET, linewidth=0.9)
        side.text(1.5, -0.12, "flight path", color=QUIET, fontsize=9, ha="right", va="center")
        side.add_patch(Arc((0.0, 0.0), 1.7, 1.7, theta1=0.0, theta2=np.degrees(_INCIDENCE), color=QUIET, linewidth=1.1))
        side.text(0.98, 0.2, "i", color=INK, fontsize=12, style="italic", ha="center", va="center")
        _arrow(side, (0.0, 0.0), tuple(1.15 * ahead), _FORCE, "T", tuple(1.27 * ahead))
        _arrow(side, (0.0, 0.0), tuple(1.15 * up), _FORCE, "N", tuple(1.27 * up))
        _turn(side, (0.0, 0.0), 0.55, (200.0, 265.0), _MOMENT)
        side.text(-0.5, -0.76, "M, nose up", color=_MOMENT, fontsize=10, ha="center", va="center")
        for y in (-1.25, -0.95):
            _arrow(side, (1.45, y), (0.75, y), _FLOW)
        side.text(1.1, -1.1, "air, V", color=_FLOW, fontsize=10, ha="center", va="center")

        rear.add_patch(Circle((0.0, 0.0), 0.8, facecolor="#f3f5f6", edgecolor=QUIET, linewidth=1.0))
        for angle in (np.radians(100.0), np.radians(280.0)):
            tip, root = (np.array([np.cos(angle), np.sin(angle)]) * radius for radius in (0.78, 0.1))
            rear.plot(*zip(root, tip, strict=True), color=INK, linewidth=5, solid_capstyle="round")
        rear.add_patch(Circle((0.0, 0.0), 0.1, facecolor="white", edgecolor=INK, linewidth=1.2, zorder=3))
        _turn(rear, (0.0, 0.0), 0.93, (60.0, 5.0), INK)
        rear.text(0.88, 0.62, "rotation\nto the right", color=INK, fontsize=9, ha="left", va="center")
        rear.text(
            0.86, -0.4, "this blade\ngoes down, into\nthe crossflow", color=QUIET, fontsize=8.5, ha="left", va="center"
        )
        _arrow(rear, (0.0, 0.0), (0.0, 1.2), _FORCE, "N", (0.0, 1.32))
        _arrow(rear, (0.0, 0.0), (1.2, 0.0), _FORCE, "Y", (1.32, 0.0))
        for x in (-0.55, -0.2, 0.2):
            _arrow(rear, (x, -1.4), (x, -0.92), _FLOW)
        rear.text(0.32, -1.25, "V sin i", color=_FLOW, fontsize=10, ha="left", va="center")
        _turn(rear, (0.0, 1.05), 0.32, (370.0, 170.0), _MOMENT, flattened=0.35)
        rear.text(-0.42, 1.1, "yaw moment,\nnose to the right", color=_MOMENT, fontsize=10, ha="right", va="center")
        save(figure, target)


def main() -> None:
    """Draw each figure by its command and store it small; the axes as they are."""
    axes = DOCS / "images" / "axes.svg"
    draw_axes(axes)
    print(f"{axes}: {axes.stat().st_size} bytes")
    for command, width in () if "axes" in sys.argv[1:] else WIDTHS.items():
        with tempfile.TemporaryDirectory() as folder:
            drawn = Path(folder) / "figure.png"
            subprocess.run(
                [sys.executable, "-m", "bemt", command, str(CASE), "--figure", str(drawn)],
                check=True,
                stdout=subprocess.DEVNULL,
                cwd=DOCS.parent,
            )
            target = DOCS / "images" / f"sandpiper_{command}.png"
            store_small(drawn, target, width)
        print(f"{target}: {target.stat().st_size} bytes")


if __name__ == "__main__":
    main()
