"""Judge the engine by measured propellers and rotors, and write docs/validation.md with its figures.

    python docs/make_validation.py [FOLDER] [--to DIRECTORY] [--only NAME ...]

FOLDER has tables <name>_static.csv and <name>_advance.csv; the default is tests/measured, whose tables are thinned.
Cases always come from tests/measured. Needs Pillow, which comes with matplotlib.
"""

from __future__ import annotations

import argparse
import csv
import math
import statistics
import sys
import tempfile
import textwrap
import time
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import NamedTuple

import numpy as np
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from numpy.typing import NDArray

import bemt
from bemt.air import standard_air
from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.case.load import Case
from bemt.case.readings import Readings, load_readings
from bemt.errors import InputError
from bemt.figures.compare import comparison_figure
from bemt.figures.style import INK, MARKERS, QUIET, our_style, ramp, save
from bemt.files.compare import sentences
from bemt.rotor import kernels
from bemt.rotor.elements import BladeElements, blade_elements
from bemt.rotor.model import Model
from bemt.rotor.solution import solve
from bemt.section.polar import PolarTable
from bemt.study.compare import Comparison, Errors, compare, turned

DOCS = Path(__file__).parent
sys.path.insert(0, str(DOCS))
from make_images import store_small  # noqa: E402 - the folder of this script is not always on the path

FloatArray = NDArray[np.float64]

MEASURED = DOCS.parent / "tests" / "measured"
PAGE = "validation.md"
IMAGES = Path("images") / "validation"
HOVER, CLOSED = "caradonna_tung", "knight_hefner"

SHIPPED = Model()
VARIANTS: tuple[tuple[str, dict[str, object]], ...] = (
    ("end loss `prandtl`", {"end_loss": "prandtl"}),
    ("end loss `goldstein`", {"end_loss": "goldstein"}),
    ("end loss `none`", {"end_loss": "none"}),
    ("stall delay `snel`, strength 0", {"stall_delay": "snel", "stall_strength": 0.0}),
    ("stall delay `snel`, strength 0.5", {"stall_delay": "snel", "stall_strength": 0.5}),
    ("stall delay `snel`, strength 1", {"stall_delay": "snel", "stall_strength": 1.0}),
    ("stall delay `du-selig`, strength 0.5", {"stall_delay": "du-selig", "stall_strength": 0.5}),
    ("stall delay `du-selig`, strength 1", {"stall_delay": "du-selig", "stall_strength": 1.0}),
    ("past stall `plate`", {"post_stall": "plate"}),
    ("past stall `viterna`", {"post_stall": "viterna"}),
    ("past stall `aerodas`", {"post_stall": "aerodas"}),
    ("inflow `helix`, there", {"inflow": "helix"}),
)
"""Settings of the model that are tried one at a time; those that are the shipped ones are passed over."""


def names_in(folder: Path) -> list[str]:
    """Return the propellers of a folder that have a case."""
    tables = sorted(path.name.removesuffix("_advance.csv") for path in folder.glob("*_advance.csv"))
    return [name for name in tables if (MEASURED / f"{name}.toml").exists()]


def load(folder: Path, name: str) -> tuple[Case, Readings]:
    """Read the case of a propeller and its measured tables."""
    case = bemt.load(MEASURED / f"{name}.toml")
    files = [folder / f"{name}_{kind}.csv" for kind in ("static", "advance")]
    parts = [load_readings(path, diameter=case.propeller.diameter, air=case.air) for path in files if path.exists()]
    return case, Readings.joined(parts)


# --- rotors ----------------------------------------------------------------------------------------------------------


class RotorRow(NamedTuple):
    """One static point of a rotor: what it is judged by, and what is computed, as T/(rho A (Omega R)^2)."""

    rotor: str
    point: str
    reference: float
    computed: float

    @property
    def error(self) -> float:
        """Computed over reference, less 1."""
        return self.computed / self.reference - 1.0


def rotor_thrust(elements: BladeElements, rpm: float, viscosity: float, sound: float) -> float:
    """Solve a rotor standing still and return T/(rho A (Omega R)^2)."""
    omega = 2.0 * math.pi * rpm / 60.0
    thrust = solve(elements, [0.0], [omega], [viscosity], [sound]).thrust_per_density[0]
    return float(thrust / (math.pi * elements.tip_radius**4 * omega**2))


def hover_points() -> list[dict[str, float]]:
    """Return the measured points of the rotor of Caradonna and Tung."""
    with (MEASURED / f"{HOVER}_hover.csv").open(encoding="utf-8") as stream:
        rows = csv.DictReader(line for line in stream if not line.startswith("#"))
        return [{name: float(cell) for name, cell in row.items()} for row in rows]


def hover_thrust() -> Callable[[float, float], float]:
    """Return what computes that rotor at a collective in degrees and an rpm; its blade file has 8 deg."""
    case = bemt.load(MEASURED / f"{HOVER}.toml")
    elements = blade_elements(case.propeller, case.model)

    def thrust(collective: float, rpm: float) -> float:
        blade = turned(elements, math.radians(collective - 8.0))
        return rotor_thrust(blade, rpm, case.air.kinematic_viscosity, case.air.speed_of_sound)

    return thrust


LIFT_SLOPE = 5.75
KNIGHT_HEFNER = {"radius": 0.762, "chord": 0.0508, "rpm": 960.0}
KNIGHT_HEFNER_BLADES = (2, 3, 4, 5)
KNIGHT_HEFNER_ROOT = 0.15
"""Where the blade begins in r/R: this project's assumption, and of no weight, for both solutions begin there."""


def knight_hefner_drag(alpha: FloatArray, share: float = 1.0) -> FloatArray:
    """Section drag of the report, or a share of it."""
    return share * (0.0113 + 1.25 * alpha**2)


def knight_hefner(blades: int, collective: float, end_loss: str = "none", drag_share: float = 1.0) -> BladeElements:
    """Return a rotor of M. Knight, R.A. Hefner, NACA TN-626, 1937, with the report's own section law.

    Untwisted blades with a lift slope of 5.75 per rad and cd = 0.0113 + 1.25 alpha^2; collective in radians.
    """
    alpha = np.radians(np.arange(-20.0, 20.1, 0.5))
    law = PolarTable(
        alpha=alpha,
        reynolds=np.array([1e4, 1e7]),
        lift=np.tile(LIFT_SLOPE * alpha, (2, 1)),
        drag=np.tile(knight_hefner_drag(alpha, drag_share), (2, 1)),
        source="NACA TN-626",
    )
    chord = KNIGHT_HEFNER["chord"] / KNIGHT_HEFNER["radius"]
    stations = Stations(np.array([KNIGHT_HEFNER_ROOT, 1.0]), np.full(2, chord), np.full(2, collective))
    rotor = Propeller(blades, 2.0 * KNIGHT_HEFNER["radius"], stations, (SectionSpan(polars=law),))
    return blade_elements(rotor, Model(elements=100, end_loss=end_loss, stall_delay="none"))


def knight_hefner_computed(elements: BladeElements) -> tuple[float, float]:
    """Solve a rotor in air without compressibility and return thrust and torque over density."""
    omega = 2.0 * math.pi * KNIGHT_HEFNER["rpm"] / 60.0
    solution = solve(elements, [0.0], [omega], [standard_air().kinematic_viscosity], [1e6])
    return float(solution.thrust_per_density[0]), float(solution.torque_per_density[0])


def knight_hefner_closed(
    elements: BladeElements, collective: float, *, drag_share: float = 1.0, swirl: bool = False
) -> tuple[float, float]:
    """Return thrust and torque over density by the closed form without end loss.

    phi = (sigma a/8)(sqrt(1 + 16 theta/(sigma a)) - 1) for small angles, at the speed Omega r. With `swirl` the angles
    are not taken as small, and the speed is what torque and momentum leave of it, Omega r cos phi/(1 + sigma cd/(4 sin
    phi)): the drag turns the air as well.
    """
    radius, width = elements.columns[:, kernels.E_RADIUS], elements.columns[:, kernels.E_WIDTH]
    chord, omega = KNIGHT_HEFNER["chord"], 2.0 * math.pi * KNIGHT_HEFNER["rpm"] / 60.0
    solidity = elements.blades * chord / (2.0 * math.pi * radius)
    loading = solidity * LIFT_SLOPE
    phi = loading / 8.0 * (np.sqrt(1.0 + 16.0 * collective / loading) - 1.0)
    lift, drag = LIFT_SLOPE * (collective - phi), knight_hefner_drag(collective - phi, drag_share)
    speed, up, along = omega * radius, lift, lift * phi + drag
    if swirl:
        sine, cosine = np.sin(phi), np.cos(phi)
        speed = speed * cosine / (1.0 + solidity * drag / (4.0 * sine))
        up, along = lift * cosine - drag * sine, lift * sine + drag * cosine
    head = 0.5 * speed**2 * elements.blades * chord * width
    return float((head * up).sum()), float((head * along * radius).sum())


def rotor_rows() -> list[RotorRow]:
    """Judge both rotors."""
    thrust = hover_thrust()
    rows = [
        RotorRow(
            "Caradonna and Tung",
            f"collective {point['collective_deg']:g}°, {point['rpm']:.0f} rpm, tip Mach {point['tip_mach']:.2f}",
            point["rotor_thrust_coefficient"],
            thrust(point["collective_deg"], point["rpm"]),
        )
        for point in hover_points()
    ]
    omega = 2.0 * math.pi * KNIGHT_HEFNER["rpm"] / 60.0
    unit = math.pi * KNIGHT_HEFNER["radius"] ** 4 * omega**2
    collective = math.radians(8.0)
    for blades in KNIGHT_HEFNER_BLADES:
        elements = knight_hefner(blades, collective)
        closed, _ = knight_hefner_closed(elements, collective, swirl=True)
        computed, _ = knight_hefner_computed(elements)
        rows.append(
            RotorRow(
                "Knight and Hefner, no end loss", f"collective 8°, {blades} blades", closed / unit, computed / unit
            )
        )
    return rows


def hover_figure() -> Figure:
    """Draw the thrust of the rotor of Caradonna and Tung over its collective."""
    thrust, points = hover_thrust(), hover_points()
    collective = np.linspace(0.0, 13.0, 27)
    lines = [
        (
            f"{rpm:.0f} rpm",
            collective,
            np.array([thrust(float(angle), rpm) for angle in collective]),
            [(p["collective_deg"], p["rotor_thrust_coefficient"]) for p in points if p["rpm"] == rpm],
        )
        for rpm in (1250.0, 2500.0)
    ]
    return _collective_figure(
        "Rotor of Caradonna and Tung, NASA TM-81232 (from memory)", lines, "measured", "predicted"
    )


def knight_hefner_figure() -> Figure:
    """Draw the thrust of the rotors of Knight and Hefner over their collective: closed form and solution."""
    omega = 2.0 * math.pi * KNIGHT_HEFNER["rpm"] / 60.0
    unit = math.pi * KNIGHT_HEFNER["radius"] ** 4 * omega**2
    collective, marked = np.linspace(0.5, 12.0, 24), np.array([2.0, 4.0, 6.0, 8.0, 10.0, 12.0])
    lines = []
    for blades in KNIGHT_HEFNER_BLADES:
        computed = [knight_hefner_computed(knight_hefner(blades, math.radians(angle)))[0] for angle in collective]
        closed = [
            knight_hefner_closed(knight_hefner(blades, math.radians(angle)), math.radians(angle), swirl=True)[0]
            for angle in marked
        ]
        lines.append(
            (
                f"{blades} blades",
                collective,
                np.array(computed) / unit,
                [(float(angle), value / unit) for angle, value in zip(marked, closed, strict=True)],
            )
        )
    return _collective_figure(
        "Rotors of Knight and Hefner, NACA TN-626, without end loss", lines, "closed form", "solution"
    )


def _collective_figure(
    title: str,
    lines: Sequence[tuple[str, FloatArray, FloatArray, Sequence[tuple[float, float]]]],
    points: str,
    line: str,
) -> Figure:
    with our_style():
        figure = Figure(figsize=(7.0, 4.4))
        axes = figure.add_axes((0.13, 0.14, 0.84, 0.68))
        for k, ((label, x, y, known), colour) in enumerate(zip(lines, ramp(len(lines)), strict=True)):
            axes.plot(x, y, color=colour, linewidth=1.6, label=label)
            axes.plot(
                *np.array(known).T, MARKERS[k], color=colour, markerfacecolor="white", markersize=5.5,
                markeredgewidth=1.2, zorder=3,
            )  # fmt: skip
        axes.set_xlabel("collective [deg]")
        axes.set_ylabel(r"rotor thrust coefficient  $T/(ρA(ΩR)^2)$")
        axes.set_ylim(bottom=0.0)
        axes.set_xlim(left=0.0)
        kinds = [
            Line2D([], [], color=INK, linestyle="", marker="o", markerfacecolor="white", label=points),
            Line2D([], [], color=INK, label=line),
        ]
        names = [
            Line2D([], [], color=colour, marker=MARKERS[k], markerfacecolor="white", label=label)
            for k, ((label, *_), colour) in enumerate(zip(lines, ramp(len(lines)), strict=True))
        ]
        axes.legend(handles=[*names, *kinds], loc="upper left", fontsize=9)
        figure.text(0.13, 0.93, title, fontsize=12, fontweight="bold")
        figure.text(0.13, 0.87, "standing still", fontsize=9, color=QUIET)
    return figure


# --- the page --------------------------------------------------------------------------------------------------------


def percent(share: float, sign: bool = True) -> str:
    """Return a share in per cent with one decimal, or a dash."""
    return "–" if not math.isfinite(share) else f"{100.0 * share:{'+' if sign else ''}.1f}".replace("-", "−")


def plain(value: float) -> str:
    """Return a difference with three decimals, or a dash."""
    return "–" if not math.isfinite(value) else f"{value:+.3f}".replace("-", "−")


def table(head: Sequence[str], rows: Iterable[Sequence[str]]) -> Iterator[str]:
    """Yield the lines of a table of the page."""
    yield "| " + " | ".join(head) + " |"
    yield "|---" * len(head) + "|"
    for row in rows:
        yield "| " + " | ".join(row) + " |"


def error_cells(errors: Errors) -> list[str]:
    """Return the cells that say how far off a prediction is."""
    return [
        percent(errors.thrust_bias),
        percent(errors.thrust_rms, sign=False),
        percent(errors.power_bias),
        percent(errors.power_rms, sign=False),
        percent(errors.static_thrust),
        percent(errors.static_power),
        plain(errors.peak_efficiency),
        plain(errors.zero_thrust),
    ]


ERROR_HEADS = ["CT mean", "CT rms", "CP mean", "CP rms", "static CT", "static CP", "peak η", "J₀"]
_FIELDS = tuple(Errors.__dataclass_fields__)


def summary(errors: Sequence[Errors], of: Callable[[Sequence[float]], float]) -> Errors:
    """Put the magnitudes of several errors together, field by field."""
    values = {}
    for name in _FIELDS:
        known = [abs(getattr(error, name)) for error in errors if math.isfinite(getattr(error, name))]
        values[name] = of(known) if known else math.nan
    return Errors(**values)


def unsigned_cells(errors: Errors) -> list[str]:
    """Return the cells of a summary of magnitudes."""
    return [cell.replace("+", "") for cell in error_cells(errors)]


def error_table(found: dict[str, Errors], extra: dict[str, str] | None = None) -> Iterator[str]:
    """Yield a table with a row a propeller, the median and the worst."""
    head = ["propeller", *([] if extra is None else ["turned by"]), *ERROR_HEADS]
    blank = [] if extra is None else [""]
    rows = [[f"`{name}`", *([] if extra is None else [extra[name]]), *error_cells(found[name])] for name in found]
    every = list(found.values())
    rows += [
        ["**median magnitude**", *blank, *unsigned_cells(summary(every, statistics.median))],
        ["**largest magnitude**", *blank, *unsigned_cells(summary(every, max))],
    ]
    yield from table(head, rows)


def best_turned(case: Case, readings: Readings, changes: Mapping[str, object]) -> Comparison:
    """Compare with some settings of the model changed, searching the best blade angle alone."""
    model = replace(case.model, **changes)  # type: ignore[arg-type]
    return compare(case.propeller, model, readings, remedies=("blade_angle",))


def variant_rows(loaded: Mapping[str, tuple[Case, Readings]]) -> Iterator[list[str]]:
    """Yield what each choice of model makes of the errors, every blade turned by its best angle."""
    shipped = (
        f"as shipped: `{SHIPPED.end_loss}`, `{SHIPPED.stall_delay}` at {SHIPPED.stall_strength:g}, "
        f"`{SHIPPED.post_stall}`, `{SHIPPED.inflow}`"
    )
    yield _variant(shipped, [best_turned(case, readings, {}) for case, readings in loaded.values()])
    for words, changes in VARIANTS:
        if all(getattr(SHIPPED, name) == value for name, value in changes.items()):
            continue
        try:
            found = [best_turned(case, readings, changes) for case, readings in loaded.values()]
        except (InputError, TypeError):
            yield [words, "not available in this version", *[""] * len(ERROR_HEADS)]
            continue
        if changes.get("inflow") == "helix":
            # The law does not hold everywhere: judge the other one by the same rows beside it.
            rows = [np.isfinite(comparison.predicted.thrust_coefficient) for comparison in found]
            share = sum(int(kept.sum()) for kept in rows) / sum(kept.size for kept in rows)
            same = [
                best_turned(case, readings.only(kept | (readings.airspeed == 0.0)), {})
                for (case, readings), kept in zip(loaded.values(), rows, strict=True)
            ]
            yield _variant(f"inflow `momentum`, on the {100.0 * share:.0f} % of the rows that `helix` serves", same)
        yield _variant(words, found)


def _variant(words: str, found: Sequence[Comparison]) -> list[str]:
    judged = [comparison.remedies[0] for comparison in found if comparison.remedies]
    if not judged:
        return [words, *["–"] * (1 + len(ERROR_HEADS))]
    angle = statistics.median(abs(math.degrees(remedy.best)) for remedy in judged)
    return [words, f"{angle:.2f}°", *unsigned_cells(summary([remedy.errors for remedy in judged], statistics.median))]


def prose(text: str, bullet: bool = False) -> list[str]:
    """Return a paragraph or an entry of a list in lines of the page."""
    first, more = ("- ", "  ") if bullet else ("", "")
    return textwrap.wrap(
        " ".join(text.split()), 120, initial_indent=first, subsequent_indent=more, break_long_words=False,
        break_on_hyphens=False,
    )  # fmt: skip


def page(
    folder: Path, found: dict[str, Comparison], variants: Sequence[Sequence[str]], rotors: Sequence[RotorRow]
) -> str:
    """Return the text of the page."""
    blind = {name: comparison.errors for name, comparison in found.items()}
    best = {name: comparison.remedies[0].errors for name, comparison in found.items()}
    angles = {
        name: f"{math.degrees(comparison.remedies[0].best):+.2f}°".replace("-", "−")
        for name, comparison in found.items()
    }
    lines = [
        "<!-- made by docs/make_validation.py: do not edit -->",
        "# Validation",
        "",
        *_introduction(folder, found),
        "",
        "## As described",
        "",
        *prose(
            """Predicted less measured. CT and CP in % of their static value, mean and rms over the moving rows, mean
            standing still; peak efficiency and the advance ratio of zero thrust J₀ as differences, mean of the runs
            whose rows bracket them."""
        ),
        "",
        *error_table(blind),
        "",
        "## With the one blade angle that serves best",
        "",
        *prose(
            """Every blade turned by the constant angle that makes the errors of its moving rows least. It is reported,
            not used: no propeller has constants of its own here."""
        ),
        "",
        *error_table(best, angles),
        "",
        "What is left, propeller by propeller:",
        "",
        *(
            line
            for name, comparison in found.items()
            for line in prose(f"`{name}`: {' '.join(sentences(comparison))}", bullet=True)
        ),
        "",
        "## What limits the agreement",
        "",
        *_limits(found),
        "",
        "## What each choice of model does",
        "",
        *prose(
            """Medians of the magnitudes over the propellers above, every blade turned by the angle that serves best
            with that choice, one choice changed at a time. Differences smaller than those between tunnels decide
            nothing."""
        ),
        "",
        *table(["choice", "angle", *ERROR_HEADS], variants),
        "",
        "## Rotors standing still",
        "",
        *_rotors(rotors),
        "",
        "## Figures",
        "",
        "Points are measured, lines predicted with the blade as described.",
        "",
    ]
    for name, comparison in found.items():
        runs = ", ".join(f"{run.rpm:.0f}" for run in comparison.runs)
        words = f"{name}: CT, CP and efficiency over advance ratio at {runs} rpm, and standing still over rpm"
        lines += [_picture(words, name), ""]
    lines += [
        _picture("Rotor of Caradonna and Tung: thrust coefficient over collective, measured and predicted", HOVER),
        "",
        _picture("Rotors of Knight and Hefner: thrust coefficient over collective, closed form and solution", CLOSED),
    ]
    return "\n".join(lines) + "\n"


def _picture(words: str, name: str) -> str:
    return f"![{words}]({(IMAGES / name).as_posix()}.png)"


def _introduction(folder: Path, found: dict[str, Comparison]) -> list[str]:
    moving = sum(int(comparison.moving.sum()) for comparison in found.values())
    still = sum(int(comparison.still.sum()) for comparison in found.values())
    thinned = sum(load(MEASURED, name)[1].rpm.size for name in found)
    if folder.resolve() == MEASURED.resolve():
        tables = "the **thinned tables** of `tests/measured`: about every third row, rounded"
    elif moving + still > thinned:
        tables = "**full tables** in a folder that was named"
    else:
        tables = "**tables no fuller than the thinned ones**, in a folder that was named"
    return prose(
        f"""Published propellers and rotors, computed from their geometry with default settings and nothing fitted,
        beside what was measured. Made by `python docs/make_validation.py` from {tables}; {moving} rows moving and
        {still} standing still. `python docs/make_validation.py FOLDER` judges a folder of full tables the same way.
        Sources: [tests/measured/README.md](../tests/measured/README.md). How the figures are defined:
        [compare.md](compare.md)."""
    )


def _limits(found: dict[str, Comparison]) -> Iterator[str]:
    blind = summary([comparison.errors for comparison in found.values()], statistics.median)
    best = summary([comparison.remedies[0].errors for comparison in found.values()], statistics.median)
    before, after = ([percent(e.thrust_rms, False), percent(e.power_rms, False)] for e in (blind, best))
    angle = statistics.median(abs(math.degrees(comparison.remedies[0].best)) for comparison in found.values())
    low = statistics.median(float(np.mean(c.predicted.low_reynolds_share)) for c in found.values())
    stalled = statistics.median(float(np.mean(c.predicted.stalled_share[c.static])) for c in found.values())
    for entry in (
        """**Measurement.** Two good wind tunnels measuring one and the same 10 in propeller differ by 2.7 to 5.3 % rms
        in CT and CP (Ohio State against Illinois; M. D. McCrink, J. W. Gregory, AIAA 2015-3296, 2015). Closer agreement
        than that cannot be shown with such data.""",
        f"""**The blade angle.** The source digitised it from photographs, which leaves about 1°. In the median the
        angle that serves best is {angle:.1f}° off; with it the median rms goes from {before[0]} to {after[0]} % in CT
        and from {before[1]} to {after[1]} % in CP. A zero-lift angle of the section that is off by as much looks the
        same.""",
        f"""**Section data at low Reynolds numbers.** {100.0 * low:.0f} % of the span, in the median propeller, works
        below 60 000, where section drag from any source is uncertain by 30 % or more.""",
        f"""**Stall.** Standing still {100.0 * stalled:.0f} % of the span is stalled in the median. Laws of stall delay
        were fitted to wind turbines, and the largest lift of a section is uncertain itself.""",
        """**The inner blade** of the NR640 is thicker than any section data, and the fairing of a root is in no
        model.""",
    ):
        yield from prose(entry, bullet=True)


def _rotors(rotors: Sequence[RotorRow]) -> Iterator[str]:
    yield from prose(
        """Thrust coefficient T/(ρA(ΩR)²). The rotor of F. X. Caradonna and C. Tung (NASA TM-81232, 1981; values from
        memory) is measured. Those of M. Knight and R. A. Hefner (NACA TN-626, 1937) are judged by the closed form of
        momentum theory, swirl included, with the report's own section law, lift slope 5.75 per rad and
        cd = 0.0113 + 1.25 α², without end loss in either."""
    )
    yield ""
    rows = [
        [row.rotor, row.point, f"{row.reference:.5f}", f"{row.computed:.5f}", f"{percent(row.error)} %"]
        for row in rotors
    ]
    yield from table(["rotor", "point", "reference", "computed", "difference"], rows)
    yield ""
    yield from prose(
        """The hovering rotor differs for a known reason: its untwisted blades carry much of their load at the tip, and
        the vortex each tip leaves passes close below the next blade, which neither annular momentum theory nor an
        end-loss factor knows. Such theory gives
        too much thrust there. At a tip Mach number of 0.88 the law of compressibility adds more lift than was measured
        besides. It is reported, and no test demands agreement."""
    )


def draw(figure: Figure, target: Path) -> None:
    """Store a figure small."""
    with tempfile.TemporaryDirectory() as scratch:
        drawn = Path(scratch) / "figure.png"
        save(figure, drawn)
        store_small(drawn, target)


def make(folder: Path, to: Path, only: Sequence[str] = ()) -> Path:
    """Judge every propeller of a folder, or some of them, write page and figures, and return the page."""
    names = [name for name in names_in(folder) if not only or name in only]
    if not names:
        raise SystemExit(f"{folder} has no table <name>_advance.csv of a propeller with a case in {MEASURED}")
    (to / IMAGES).mkdir(parents=True, exist_ok=True)
    loaded = {name: load(folder, name) for name in names}
    found = {}
    for name, (case, readings) in loaded.items():
        found[name] = compare(case.propeller, case.model, readings)
        draw(comparison_figure(found[name], title=case.title), to / IMAGES / f"{name}.png")
        print(f"{name}: {' '.join(error_cells(found[name].errors))}")
    draw(hover_figure(), to / IMAGES / f"{HOVER}.png")
    draw(knight_hefner_figure(), to / IMAGES / f"{CLOSED}.png")
    target = to / PAGE
    text = page(folder, found, list(variant_rows(loaded)), rotor_rows())
    target.write_text(text, encoding="utf-8", newline="\n")
    return target


def main() -> None:
    """Read the command line and do the work."""
    parser = argparse.ArgumentParser(description="Judge the engine by measured propellers and rotors.")
    parser.add_argument("folder", nargs="?", type=Path, default=MEASURED, help="measured tables")
    parser.add_argument("--to", type=Path, default=DOCS, help="folder of the page and its figures")
    parser.add_argument("--only", nargs="+", default=(), metavar="NAME", help="some of the propellers")
    arguments = parser.parse_args()
    begun = time.monotonic()
    written = make(arguments.folder, arguments.to, arguments.only)
    print(f"Wrote {written} in {time.monotonic() - begun:.0f} s.")


if __name__ == "__main__":
    main()
