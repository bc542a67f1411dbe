"""Write the tables of docs/results.md from the registry of result variables.

    python docs/make_results.py

Everything below the marker line is replaced; a test holds the page to the registry.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Mapping
from pathlib import Path

from bemt.quantities.registry import (
    COORDINATES,
    ENVELOPE,
    ENVELOPE_HOVER,
    ENVELOPE_WITHOUT_MOTOR,
    INCIDENCE,
    LOOKUP,
    RADIAL,
    STATUS_FLAGS,
    TABLE,
    TRUST_FLAGS,
    TRUST_REASONS,
    Quantity,
    by_name,
)

PAGE = Path(__file__).with_name("results.md")
MARKER = "<!-- made by docs/make_results.py: do not edit below -->"

PREFIXES = {"level_": "airspeed", "point_": "point"}


def rows(quantities: tuple[Quantity, ...], *, dimensions: bool = True) -> Iterator[str]:
    """Yield the lines of a table of quantities."""
    yield "| name | symbol | unit | over | meaning |" if dimensions else "| name | symbol | unit | meaning |"
    yield "|---|---|---|---|---|" if dimensions else "|---|---|---|---|"
    for quantity in quantities:
        over = [", ".join(f"`{name}`" for name in quantity.dimensions)] if dimensions else []
        cells = [
            f"`{quantity.name}`",
            quantity.symbol,
            quantity.units,
            *over,
            f"{quantity.long_name}: {quantity.meaning}",
        ]
        yield "| " + " | ".join(cells) + " |"


def codes(flags: Mapping[int, str]) -> Iterator[str]:
    """Yield the lines of a table of codes."""
    yield "| code | word |"
    yield "|---|---|"
    for code, word in flags.items():
        yield f"| {code} | `{word}` |"


def prefixed(prefix: str) -> tuple[list[str], tuple[Quantity, ...]]:
    """Split the quantities with a prefix into names that repeat those of the grid, and those of their own."""
    grid = by_name(ENVELOPE)
    named = [quantity for quantity in ENVELOPE if quantity.name.startswith(prefix)]
    bare = [quantity.name.removeprefix(prefix) for quantity in named]
    repeats = [name for name in bare if name in grid and len(grid[name].dimensions) == 2]
    return repeats, tuple(quantity for quantity in named if quantity.name.removeprefix(prefix) not in repeats)


def generated() -> str:
    """Return the generated part of the page."""
    grid = tuple(quantity for quantity in ENVELOPE if len(quantity.dimensions) == 2)
    _, own_level = prefixed("level_")
    repeated, own_point = prefixed("point_")
    level = tuple(
        quantity
        for quantity in ENVELOPE
        if quantity.dimensions == ("airspeed",) and not quantity.name.startswith("level_")
    )
    without = tuple(quantity for quantity in ENVELOPE_WITHOUT_MOTOR if quantity.dimensions == ("airspeed", "rpm"))
    known = by_name(ENVELOPE)
    repeated_upright = {f"level_{quantity.name}" for quantity in grid}
    upright = tuple(
        quantity
        for quantity in ENVELOPE_HOVER
        if quantity != known.get(quantity.name) and quantity.name not in repeated_upright
    )
    parts: list[Iterator[str] | list[str]] = [
        ["", "## Codes", "", "`status`, the worst of the blade elements of a point:", ""],
        codes(STATUS_FLAGS),
        ["", "`trust`:", ""],
        codes(TRUST_FLAGS),
        ["", "`trust_reasons`, bits that add up:", ""],
        codes(TRUST_REASONS),
        ["", "## Axes", ""],
        rows(COORDINATES, dimensions=False),
        ["", "## Coefficient table", ""],
        rows(TABLE),
        ["", "Where the case asks for an incidence, everything over `rpm` and `advance_ratio` runs over `incidence`,"],
        ["and these come in addition:", ""],
        rows(INCIDENCE),
        ["", "With `--radial`, or `radial=True` in Python:", ""],
        rows(RADIAL),
        ["", "The look-up table in the same dataset, for `.propeller`:", ""],
        rows(LOOKUP),
        ["", "## Envelope", ""],
        rows(grid),
        ["", "In level flight the same names with the prefix `level_` over `airspeed`, and:", ""],
        rows((*own_level, *level)),
        ["", "At the named points the same names with the prefix `point_` over `point`, and:", ""],
        rows(own_point),
        ["", "Without a motor the axes are `airspeed` and `rpm`, and what remains is:", ""],
        textwrap.wrap(", ".join(f"`{quantity.name}`" for quantity in without) + ",", 120),
        [
            "with `level_` and `point_` accordingly, `drag`, `required_thrust`, `climb_rate`, drag and rpm of stopped",
            "and windmilling propellers, `point_airspeed`, `point_climb_rate` and `point_thrust_to_weight`.",
            "",
            "Of a hovering airframe, where `airspeed` is that of climbing straight up and `level_` means a steady",
            "climb, these differ. Range and the drag of unpowered propellers are left out; without a motor",
            "`climb_rate` is over `rpm`.",
            "",
        ],
        rows(upright),
    ]
    assert set(repeated) == {quantity.name for quantity in grid}
    return "\n".join(line for part in parts for line in part) + "\n"


def page(text: str) -> str:
    """Return the page with its generated part renewed."""
    head, marker, _ = text.partition(MARKER)
    if not marker:
        raise ValueError(f"{PAGE} has no marker line")
    return f"{head}{MARKER}\n{generated()}"


if __name__ == "__main__":
    PAGE.write_text(page(PAGE.read_text(encoding="utf-8")), encoding="utf-8", newline="\n")
