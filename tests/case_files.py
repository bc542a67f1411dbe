"""Small cases on disk for the tests of the case layer and the commands."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

BLADE = """\
radius_mm,chord_mm,twist_deg,t_over_c
20,18,42,0.20
60,25,24,0.13
100,24,15,0.11
130,19,11.5,0.10
150,8,9.5,0.10
"""

CASE = """\
title = "test"

[propeller]
blades = 2
diameter = "300 mm"
stations = "blade.csv"
rpm_limit = 10000

[[section]]
family = "flat-bottom"

[grid]
advance_ratio = { from = 0.0, to = 0.7, count = 8 }
rpm = [4000, 8000]
"""

DRIVE = """\
[motor]
speed_constant = "900 rpm/V"
winding_resistance = "50 mohm"
no_load = [ { voltage = "10 V", current = "0.8 A" } ]

[battery]
cells_in_series = 3
capacity = "2.2 A*h"
cell_resistance = "6 mohm"
"""


def polars(reynolds: tuple[float, ...] = (50e3, 200e3), alpha: tuple[float, ...] = (-6, -2, 0, 4, 8, 12, 16)) -> str:
    """Return polars of an invented section: a straight lift line and a parabola of drag."""
    rows = [
        f"{re:g},{a:g},{0.1 * a + 0.3:g},{0.012 * (1e5 / re) ** 0.5 + 2e-4 * a * a:g}" for re in reynolds for a in alpha
    ]
    return "\n".join(["reynolds,alpha_deg,cl,cd", *rows]) + "\n"


def write_case(folder: Path, case: str = CASE, files: Mapping[str, str | bytes] | None = None) -> Path:
    """Write a case and the files it names, and return the path of the case."""
    for name, content in {"blade.csv": BLADE, **(files or {}), "case.toml": case}.items():
        (folder / name).write_bytes(content if isinstance(content, bytes) else content.encode())
    return folder / "case.toml"


def line_of(text: str, needle: str) -> int:
    """Return the number of the first line that holds some words."""
    return next(number for number, line in enumerate(text.splitlines(), start=1) if needle in line)
