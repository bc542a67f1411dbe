"""Figures: what they draw, that it can be read, and that the files are what their endings say."""

from __future__ import annotations

import itertools
import struct
import xml.etree.ElementTree as ET
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import shipped
import synthetic
import xarray as xr
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.text import Text
from scipy.optimize import isotonic_regression

import bemt
from bemt.errors import InputError, RunError
from bemt.figures.coefficients import coefficient_figure
from bemt.figures.envelope import envelope_figure
from bemt.figures.style import MARKERS, ramp, save, spread
from bemt.quantities.dataset import build_dataset
from bemt.quantities.registry import STATUS_NOT_CONVERGED, TABLE, TABLE_AT_INCIDENCE, by_name


def hard_table() -> xr.Dataset:
    """Many rpm, few points, a long title, a guessed section and a point that failed."""
    table = synthetic.coefficient_table(rpm=tuple(np.arange(2000.0, 9000.0, 500.0)), count=12)
    status = table["status"].values.copy()
    status[3, 5] = STATUS_NOT_CONVERGED
    table["status"] = (table["status"].dims, status, table["status"].attrs)
    table["trust_reasons"] = (table["trust"].dims, table["trust_reasons"].values | 128, table["trust_reasons"].attrs)
    return table.assign_attrs(
        title="A propeller somebody carved in a shed beside the estuary in winter, second try " * 2
    )


def inclined_table(incidence: tuple[float, ...]) -> xr.Dataset:
    """The made-up table over incidences: everything falls with the cosine, forces in the plane grow with the sine."""
    flat = synthetic.coefficient_table(rpm=(3000.0, 6000.0), count=15)
    angle = np.radians(incidence)
    J = flat["advance_ratio"].values
    values, axes = {}, {"rpm": flat["rpm"].values, "advance_ratio": J, "incidence": np.array(incidence)}
    for quantity in TABLE_AT_INCIDENCE:
        if quantity.name not in flat:
            values[quantity.name] = 0.01 * np.broadcast_to(J[:, None] * np.sin(angle), (2, J.size, angle.size))
        elif "incidence" in quantity.dimensions:
            array = flat[quantity.name].values[..., None]
            values[quantity.name] = (
                array * np.cos(angle) if array.dtype.kind == "f" else np.repeat(array, angle.size, -1)
            )
        else:
            values[quantity.name] = flat[quantity.name].values
    values["trust_reasons"] = np.where(angle > 0.3, values["trust_reasons"] | 512, values["trust_reasons"])
    return build_dataset(TABLE_AT_INCIDENCE, values, axes, synthetic.ATTRS)


def descending_table() -> xr.Dataset:
    """The made-up table shifted to where the air comes from behind in its first third."""
    table = synthetic.coefficient_table(count=21)
    J = table["advance_ratio"].values - 0.33
    down = np.broadcast_to(J < 0.0, table["trust"].shape)
    for name, changed in (("trust", 1), ("trust_reasons", 256)):
        table[name] = (table[name].dims, np.where(down, changed, table[name].values), table[name].attrs)
    return table.assign_coords(advance_ratio=("advance_ratio", J, table["advance_ratio"].attrs))


FIGURES = {
    "incidences": lambda: coefficient_figure(inclined_table((0.0, 10.0, 30.0, 60.0))),
    "one incidence": lambda: coefficient_figure(inclined_table((30.0,))),
    "descent": lambda: coefficient_figure(descending_table()),
    "coefficients": lambda: coefficient_figure(synthetic.coefficient_table()),
    "one rpm": lambda: coefficient_figure(synthetic.coefficient_table(rpm=(4000.0,))),
    "hard coefficients": lambda: coefficient_figure(hard_table()),
    "envelope": lambda: envelope_figure(synthetic.envelope()),
    "winding": lambda: envelope_figure(synthetic.envelope(winding=True)),
    "hover": lambda: envelope_figure(
        bemt.envelope(shipped.case("mudlark_hover"), table=shipped.table("mudlark_hover"))
    ),
    "no motor": lambda: envelope_figure(
        bemt.envelope(
            replace(shipped.case("sandpiper"), motor=None, controller=None, battery=None),
            table=shipped.table("sandpiper"),
        )
    ),
    "no limits": lambda: envelope_figure(synthetic.envelope(limits=False)),
    "long title": lambda: envelope_figure(synthetic.envelope().assign_attrs(title="Survey of the mudflats " * 9)),
}


def drawn_texts(figure: Figure) -> list[tuple[str, tuple[float, float, float, float]]]:
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    renderer = canvas.get_renderer()
    undrawn = set()
    for axes in figure.axes:
        for axis in (axes.xaxis, axes.yaxis):
            low, high = sorted(axis.get_view_interval())
            outside = (tick for tick in axis.get_major_ticks() if not low <= tick.get_loc() <= high)
            undrawn |= {label for tick in outside for label in (tick.label1, tick.label2)}
    found = []
    for artist in set(figure.findobj(Text)) - undrawn:
        if artist.get_visible() and artist.get_text().strip():
            box = artist.get_window_extent(renderer)
            if box.width > 0 and box.height > 0:
                found.append((artist.get_text(), (box.x0, box.y0, box.x1, box.y1)))
    return found


@pytest.mark.parametrize("name", FIGURES)
def test_no_text_covers_another_or_leaves_the_page(name: str) -> None:
    figure = FIGURES[name]()
    width, height = figure.get_size_inches() * figure.dpi
    texts = drawn_texts(figure)
    assert len(texts) > 20
    for text, (x0, y0, x1, y1) in texts:
        assert x0 >= 0, text
        assert y0 >= 0, text
        assert x1 <= width, text
        assert y1 <= height, text
    for (first, a), (second, b) in itertools.combinations(texts, 2):
        across = min(a[2], b[2]) - max(a[0], b[0])
        along = min(a[3], b[3]) - max(a[1], b[1])
        # Boxes reach from ascender to descender; a pixel of common margin covers no letter.
        assert across <= 1.0 or along <= 1.0, f"{first!r} and {second!r} overlap"


def test_lightness_alone_tells_the_lines_apart() -> None:
    # Relative luminance after W3C, Web Content Accessibility Guidelines 2.2, and CIE 1976 lightness from it.
    for count in (2, 3, 4, 5):
        linear = [[v / 12.92 if v <= 0.04045 else ((v + 0.055) / 1.055) ** 2.4 for v in rgb] for rgb in ramp(count)]
        luminance = np.array(linear) @ np.array([0.2126, 0.7152, 0.0722])
        lightness = 116 * np.cbrt(luminance) - 16
        assert (np.diff(lightness) < -5).all()
        # Graphics need a contrast of 3 against what they stand on for the mark itself, WCAG 1.4.11; the lightest
        # line comes with a shape of its own and stays above 2.
        assert (1.05 / (luminance + 0.05) > 2.0).all()
    assert len(set(MARKERS)) == len(MARKERS)


@pytest.mark.parametrize("seed", range(20))
def test_labels_move_as_little_as_they_can(seed: int) -> None:
    # The least-squares places under a smallest gap are an isotonic regression; SciPy has one of its own.
    generator = np.random.default_rng(seed)
    wanted = generator.uniform(200.0, 300.0, size=8)
    gap = float(generator.uniform(1.0, 20.0))
    places = np.array(spread(list(wanted), gap, -1e4, 1e4))
    order = np.argsort(wanted)
    steps = gap * np.arange(wanted.size)
    best = isotonic_regression(wanted[order] - steps).x + steps
    np.testing.assert_allclose(places[order], best, atol=1e-9)


def test_labels_stay_inside_and_apart() -> None:
    places = np.sort(spread([0.0, 1.0, 2.0, 99.0, 100.0, 140.0], 10.0, 0.0, 100.0))
    assert places[0] >= 0.0
    assert places[-1] <= 100.0
    assert (np.diff(places) >= 10.0 - 1e-9).all()
    crowded = np.sort(spread([5.0] * 21, 10.0, 0.0, 100.0))
    np.testing.assert_allclose(np.diff(crowded), 5.0)
    assert spread([10.0, 50.0], 5.0, 0.0, 100.0) == [10.0, 50.0]


def test_every_point_of_the_table_is_on_its_line() -> None:
    table = synthetic.coefficient_table(rpm=(3000.0, 6000.0), count=15)
    figure = coefficient_figure(table)
    for axes, name in zip(figure.axes, ("thrust_coefficient", "power_coefficient", "efficiency"), strict=True):
        vertices = {tuple(row) for c in axes.collections for path in c.get_paths() for row in path.vertices}
        for i, j in itertools.product(range(2), range(15)):
            value = float(table[name].values[i, j])
            if np.isfinite(value):
                assert (float(table["advance_ratio"].values[j]), value) in vertices
        assert axes.get_ylabel().startswith(by_name(TABLE)[name].long_name)


def test_lines_of_a_table_at_incidence_are_the_incidences_at_the_highest_rpm() -> None:
    table = inclined_table((0.0, 10.0, 30.0, 60.0))
    figure = coefficient_figure(table)
    names = [
        "thrust_coefficient",
        "power_coefficient",
        "efficiency",
        "normal_force_coefficient",
        "yaw_moment_coefficient",
    ]
    assert len(figure.axes) == len(names)
    for axes, name in zip(figure.axes, names, strict=True):
        vertices = {tuple(row) for c in axes.collections for path in c.get_paths() for row in path.vertices}
        for i, j in itertools.product(range(4), range(15)):
            value = float(table[name].values[-1, j, i])
            if np.isfinite(value):
                assert (float(table["advance_ratio"].values[j]), value) in vertices
        assert axes.get_ylabel().startswith(by_name(TABLE_AT_INCIDENCE)[name].long_name)
    texts = " ".join(text.get_text() for text in figure.findobj(Text))
    assert "6000 rpm, the highest of 2" in texts
    assert "incidence 60°" in texts
    assert "large incidence at" in texts


def test_a_note_says_in_words_why_and_where_points_are_less_than_good() -> None:
    table = synthetic.coefficient_table()
    texts = " ".join(text.get_text() for text in coefficient_figure(table).texts)
    trust, slow = table["trust"].values, (table["trust_reasons"].values & 4) != 0
    for grade, code in (("fair", 2), ("poor", 1)):
        here = trust == code
        assert f"Trust {grade} at {here.sum()} points: " in texts
        assert f"low Reynolds number at {(slow & here).sum()}" in texts


def test_efficiency_comes_down_to_zero_where_the_thrust_ends() -> None:
    table = synthetic.coefficient_table(rpm=(3000.0, 6000.0), count=15)
    axes = coefficient_figure(table).axes[2]
    vertices = [tuple(row) for c in axes.collections for path in c.get_paths() for row in path.vertices]
    for end in table["zero_thrust_advance_ratio"].values:
        assert (float(end), 0.0) in vertices
        assert max(J for J, _ in vertices if J <= end) == end
        # The added end is no point of the table, and carries no mark.
        assert not any(end in line.get_xdata() for line in axes.lines if line.get_linestyle() == "None")
    # Nothing is added where the thrust does not end within the table.
    short = coefficient_figure(table.isel(advance_ratio=slice(0, 8))).axes[2]
    assert (
        max(row[0] for c in short.collections for path in c.get_paths() for row in path.vertices)
        == (table["advance_ratio"].values[7])
    )


def test_the_legend_of_an_envelope_borrows_no_lines_colour() -> None:
    figure = envelope_figure(synthetic.envelope())
    (legend,) = figure.legends
    drawn = dict(zip([text.get_text() for text in legend.get_texts()], legend.legend_handles, strict=True))
    throttles = set(ramp(5))
    assert throttles <= {line.get_color() for line in figure.axes[0].lines}
    # The entry of the throttle shows all of their colours, and no other entry shows one of them.
    assert throttles <= {line.get_color() for line in legend.findobj(Line2D)}
    assert "throttle, low to high" in drawn
    for name in ("beyond a limit", "required in level flight"):
        assert to_rgb(drawn[name].get_color()) not in throttles


def test_a_winding_too_hot_is_marked_and_a_missing_point_is_none() -> None:
    run = synthetic.envelope(winding=True)
    for name in [str(name) for name in run.data_vars if str(name).startswith("point_")]:
        if run[name].dtype.kind == "f":
            run[name] = run[name].where(run["point"] != "top_speed")
    texts = [text for text, _ in drawn_texts(envelope_figure(run))]
    assert "no end !" in texts
    assert "none" in texts
    assert "top speed" in texts  # in the table; not in the legend, which speaks of marks that are drawn
    assert texts.count("top speed") == 1
    assert any("winding above 120 °C" in text for text in texts)


def test_poor_trust_is_dotted_and_hollow_and_good_is_not() -> None:
    table = synthetic.coefficient_table(rpm=(6000.0,), count=9)
    grade = np.array([[1, 1, 1, 2, 2, 2, 3, 3, 3]], dtype=np.int16)
    table["trust"] = (table["trust"].dims, grade, table["trust"].attrs)
    axes = coefficient_figure(table).axes[0]
    patterns = [collection.get_linestyles()[0][1] for collection in axes.collections]
    assert len(patterns) == 3
    assert patterns[2] is None
    assert patterns[0][0] < patterns[1][0]  # dots are shorter than dashes
    hollow = {float(x) for line in axes.lines if line.get_markerfacecolor() == "white" for x in line.get_xdata()}
    assert hollow == set(table["advance_ratio"].values[:3].tolist())


def test_a_guessed_section_and_a_failed_point_are_said() -> None:
    plain = [text for text, _ in drawn_texts(coefficient_figure(synthetic.coefficient_table()))]
    hard = [text for text, _ in drawn_texts(coefficient_figure(hard_table()))]
    for words in ("Section guessed", "not converged"):
        assert not any(words in text for text in plain)
        assert any(words in text for text in hard)


def test_envelope_draws_limits_drag_and_cruise() -> None:
    run = synthetic.envelope()
    panels = {axes.get_ylabel().split(" [")[0]: axes for axes in envelope_figure(run).axes}
    assert set(panels) == {
        "thrust",
        "battery current",
        "motor current",
        "rotational speed",
        "efficiency, steady flight",
        "endurance (full line)",
        "range (dashed line)",
    }
    levels = {
        name: {round(float(line.get_ydata()[0]), 6) for line in axes.lines if np.ptp([*line.get_ydata(), 0, 0]) > 0
               and len(set(line.get_ydata())) == 1}
        for name, axes in panels.items()
    }  # fmt: skip
    assert {42.0, 50.0} <= levels["motor current"]
    assert 9500.0 in levels["rotational speed"]
    thrust = panels["thrust"].lines
    assert any(np.array_equal(line.get_ydata(), run["required_thrust"].values, equal_nan=True) for line in thrust)
    for name, variable, scale in (
        ("efficiency, steady flight", "level_overall_efficiency", 100.0),
        ("endurance (full line)", "endurance", 1.0 / 60.0),
        ("range (dashed line)", "range", 1e-3),
    ):
        wanted = run[variable].values * scale
        assert any(
            np.size(line.get_ydata()) == wanted.size and np.allclose(line.get_ydata(), wanted, equal_nan=True)
            for line in panels[name].lines
        )
    cruise = run.sel(point="cruise")
    at = (float(cruise["point_airspeed"]), float(cruise["point_thrust"]))
    assert any(line.get_marker() == "*" and (line.get_xdata()[0], line.get_ydata()[0]) == at for line in thrust)


def test_the_page_has_the_proportion_of_a4_and_says_in_words_what_it_means() -> None:
    figure = envelope_figure(bemt.envelope(shipped.case("sandpiper"), table=shipped.table("sandpiper")))
    width, height = figure.get_size_inches()
    assert height / width == pytest.approx(2.0**0.5, rel=0.05)  # ISO 216
    texts = " ".join(text.get_text() for text in figure.texts)
    assert "The propeller loses most." in texts
    assert "Trust in steady flight: good at" in texts


def test_the_page_of_what_hovers() -> None:
    run = bemt.envelope(shipped.case("mudlark_hover"), table=shipped.table("mudlark_hover"))
    figure = envelope_figure(run)
    labels = {axes.get_ylabel().split(" [")[0] for axes in figure.axes}
    assert "endurance" in labels
    assert "range (dashed line)" not in labels
    assert any(axes.get_xlabel() == "climb speed [m/s]" for axes in figure.axes)
    texts = [text for text, _ in drawn_texts(figure)]
    assert "FM" in texts
    assert "required to climb" in texts


def test_envelope_dots_exactly_where_a_limit_is_broken() -> None:
    run = synthetic.envelope()
    axes = envelope_figure(run).axes[0]
    full = run["thrust"].values[:, -1]
    broken = (
        (run["motor_current_margin"].values[:, -1] < 0)
        | (run["rpm_margin"].values[:, -1] < 0)
        | (run["battery_current_margin"].values[:, -1] < 0)
    )
    assert 0 < broken.sum() < broken.size
    solid = [line for line in axes.lines if line.get_linestyle() == "-" and np.size(line.get_ydata()) == full.size]
    assert any(np.array_equal(line.get_ydata(), np.where(broken, np.nan, full), equal_nan=True) for line in solid)


@pytest.mark.parametrize("draw", ["coefficients", "envelope"])
def test_files_are_what_their_endings_say(tmp_path: Path, draw: str) -> None:
    figure = FIGURES[draw]()
    for name in ("a.png", "a.svg", "a.pdf", "b.SVG"):
        save(figure, tmp_path / name)
    raw = (tmp_path / "a.png").read_bytes()
    assert raw[:8] == b"\x89PNG\r\n\x1a\n"
    width, height = struct.unpack(">II", raw[16:24])  # PNG specification: IHDR
    assert (width, height) == pytest.approx(tuple(figure.get_size_inches() * 160), abs=1)
    root = ET.fromstring((tmp_path / "a.svg").read_text(encoding="utf-8"))
    assert root.tag == "{http://www.w3.org/2000/svg}svg"
    assert (tmp_path / "a.pdf").read_bytes().startswith(b"%PDF-")
    assert (tmp_path / "a.svg").read_bytes() == (tmp_path / "b.SVG").read_bytes()


def test_places_that_cannot_be_written(tmp_path: Path) -> None:
    figure = FIGURES["one rpm"]()
    with pytest.raises(InputError, match=r"\.svg, \.png, \.pdf"):
        save(figure, tmp_path / "figure.jpg")
    with pytest.raises(RunError, match="no folder"):
        save(figure, tmp_path / "none" / "figure.png")
    assert list(tmp_path.iterdir()) == []
