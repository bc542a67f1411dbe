"""From a measured blade to the arrays that the kernels work on."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property, lru_cache

import numpy as np
from numpy.typing import NDArray

from bemt.blade.geometry import Propeller, SectionSpan
from bemt.errors import InputError
from bemt.interpolation import monotone_curve
from bemt.rotor import kernels as k
from bemt.rotor.end_loss import NO_LOSS, loss_tables
from bemt.rotor.model import Model
from bemt.section.compressibility import KORN_KAPPA, compressed
from bemt.section.family import Family, family
from bemt.section.full_circle import ANGLES, FullCircle, at_angle, full_circle, lift_slope
from bemt.section.polar import PolarTable
from bemt.section.reynolds import extended, extended_nodes
from bemt.section.stall_delay import LAWS, delayed_drag, delayed_lift

FloatArray = NDArray[np.float64]

UNKNOWN_THICKNESS = 0.12
"""Taken for the drag rise where nobody says how thick a section is."""

EXPANDED_MACH = np.array([0.0, 0.15, 0.3, 0.4, 0.5, 0.55, 0.6, 0.65, 0.7, 0.75, 0.8, 0.85, 0.9, 0.95])
"""Mach numbers at which the laws of compressibility are tabulated where another part of the blade has a Mach axis.

Straight lines between them miss the laws by 0.002 in lift and 3 % in drag (rms), each law in its kinks by more.
"""

_REFERENCE_REYNOLDS = 3e5
_CALM_FALL = 3.0  # [1/rad]: more than a separated section's lift falls, less than a stall does


@lru_cache(maxsize=1)
def _prandtl_table() -> FloatArray:
    return k.loss_table()


@dataclass(frozen=True, eq=False)
class BladeElements:
    """A blade cut into elements, with the section data of each, as the kernels read them.

    Parameters
    ----------
    blades : int
        Number of blades.
    tip_radius : float
        [m].
    chord_75 : float
        Chord at 0.75 R [m].
    r_over_R : numpy.ndarray, shape (n,)
        Middles of the elements.
    columns : numpy.ndarray, shape (n, kernels.E_COLUMNS)
        Geometry of each element.
    polars : numpy.ndarray, shape (n, n_mach n_re, n_alpha, 2)
        Lift and ln drag with stall delay, over the full circle.
    bounds : numpy.ndarray, shape (n, n_mach n_re, kernels.B_COLUMNS)
        Angles of stall and data, and where lift rises.
    ln_reynolds : numpy.ndarray, shape (n_re,)
        Natural logarithm of the Reynolds numbers of the rows.
    mach : numpy.ndarray, shape (n_mach,)
        Mach numbers of the polars. With one, compressibility is a law of the solution; with several, the rows of
        `polars` and `bounds` run over Mach numbers, and over Reynolds numbers within each (n_mach n_re rows), and
        compressibility is in them.
    loss : numpy.ndarray, shape (n_tables kernels.LOSS_CELLS, 5)
        Tables of the loss at an end, Prandtl's first.
    """

    blades: int
    tip_radius: float
    chord_75: float
    r_over_R: FloatArray
    columns: FloatArray
    polars: FloatArray
    bounds: FloatArray
    ln_reynolds: FloatArray
    mach: FloatArray = field(default_factory=lambda: np.zeros(1))
    loss: FloatArray = field(default_factory=_prandtl_table)

    @cached_property
    def span_weight(self) -> FloatArray:
        """What each element counts in a share of the span: r^2 chord, all together 1; shape (n,)."""
        weight = self.columns[:, k.E_RADIUS] ** 2 * self.columns[:, k.E_CHORD] * self.columns[:, k.E_WIDTH]
        share: FloatArray = weight / weight.sum()
        return share

    @property
    def tip_divergence(self) -> float:
        """Drag-divergence Mach number of the outermost element at no lift."""
        return float(self.columns[-1, k.E_DIVERGENCE])

    @property
    def outside_share(self) -> float:
        """Share of the span, weighted by r^2 chord, whose thickness or camber leaves its section data."""
        return float(self.span_weight @ self.columns[:, k.E_OUTSIDE])


def cosine_spaced(root: float, count: int) -> tuple[FloatArray, FloatArray]:
    """Cut the span into elements that crowd at both ends, where the loading changes fastest.

    Parameters
    ----------
    root : float
        r/R of the inner end.
    count : int
        Number of elements.

    Returns
    -------
    middle, width : numpy.ndarray, shape (count,)
        r/R of the middles (in the angle of the spacing) and widths.
    """
    edges = root + (1.0 - root) * 0.5 * (1.0 - np.cos(np.linspace(0.0, np.pi, count + 1)))
    angle = (np.arange(count) + 0.5) * np.pi / count
    return root + (1.0 - root) * 0.5 * (1.0 - np.cos(angle)), np.diff(edges)


def blade_elements(propeller: Propeller, model: Model) -> BladeElements:
    """Cut a propeller into elements and give each its own section.

    Parameters
    ----------
    propeller : Propeller
    model : Model

    Returns
    -------
    BladeElements

    Raises
    ------
    InputError
        If a family is unknown, or a twist from the flat face belongs to a section whose lower face is not known.
    """
    stations = propeller.stations
    tip_radius = 0.5 * propeller.diameter
    x, width = cosine_spaced(propeller.root, model.elements)
    chord = monotone_curve(stations.r_over_R, stations.c_over_R, x)
    twist = monotone_curve(stations.r_over_R, stations.twist, x)
    thickness = None if stations.t_over_c is None else monotone_curve(stations.r_over_R, stations.t_over_c, x)
    camber = None if stations.camber is None else monotone_curve(stations.r_over_R, stations.camber, x)

    reynolds, mach = _common_reynolds(propeller.sections, model), _common_mach(propeller.sections)
    shape = (x.size, mach.size, reynolds.size, ANGLES.size)
    lift, log_drag = np.empty(shape), np.empty(shape)
    stall = np.empty((4, *shape[:3]))
    trusted, mach_range = np.empty((2, x.size)), np.empty((2, x.size))
    outside, table_beta = np.zeros(x.size), np.ones(x.size)
    drag_thickness = np.full(x.size, UNKNOWN_THICKNESS) if thickness is None else thickness.copy()
    blade_angle = twist.copy()
    for number, span in enumerate(propeller.sections):
        last = number == len(propeller.sections) - 1
        here = (x >= span.start) & ((x < span.end) | last)
        if number == 0:
            here |= x < span.start
        if not here.any():
            continue
        section = _span_sections(
            span,
            reynolds,
            None if thickness is None else thickness[here],
            None if camber is None else camber[here],
            int(here.sum()),
            model,
        )
        curves = section.curves
        delayed = _with_stall_delay(curves, chord[here] / x[here], x[here], model)
        lift[here], log_drag[here], stall[:, here] = _on_mach_axis(section, *delayed, mach)
        trusted[:, here] = np.log(section.trusted)[:, None]
        mach_range[:, here] = np.array(section.mach_range)[:, None]
        outside[here] = section.outside
        table_beta[here] = section.table_beta
        drag_thickness[here] = section.thickness
        if stations.twist_reference == "flat face":
            if section.flat_face_angle is None:
                raise InputError(
                    "twist_reference",
                    '"flat face" needs a section family, whose lower face is known; '
                    'with polars of your own give the angle of the "chord line"',
                )
            blade_angle[here] += section.flat_face_angle
        elif stations.twist_reference == "zero lift":
            row = int(np.argmin(np.abs(np.log(reynolds / _REFERENCE_REYNOLDS))))
            blade_angle[here] += curves.zero_lift[:, 0, row]

    ln_reynolds = np.log(reynolds)
    columns = np.zeros((x.size, k.E_COLUMNS))
    columns[:, k.E_RADIUS] = x * tip_radius
    columns[:, k.E_WIDTH] = width * tip_radius
    columns[:, k.E_CHORD] = chord * tip_radius
    columns[:, k.E_TWIST] = blade_angle
    columns[:, k.E_SOLIDITY] = propeller.blades * chord / (2.0 * np.pi * x)
    loss = loss_tables(model.end_loss, model.end_loss_ends, propeller.blades, x, propeller.root)
    columns[:, k.E_LOSS], columns[:, k.E_LOSS_SCALE] = loss.table_index, loss.tip_scale
    columns[:, k.E_ROOT] = loss.root_scale
    columns[:, k.E_TIP] = np.where(
        loss.tip_scale < NO_LOSS, np.sqrt(0.5 * propeller.blades * (1.0 - x) / x), loss.tip_scale
    )
    columns[:, k.E_DIVERGENCE] = KORN_KAPPA - drag_thickness
    columns[:, k.E_TABLE_BETA] = table_beta
    columns[:, k.E_LN_RE_LOW], columns[:, k.E_LN_RE_HIGH] = trusted
    columns[:, k.E_MACH_LOW], columns[:, k.E_MACH_HIGH] = mach_range
    columns[:, k.E_OUTSIDE] = outside
    columns[:, k.E_POLAR] = np.arange(x.size)
    rows = (x.size, mach.size * reynolds.size)
    polars = np.stack([lift.reshape(*rows, -1), log_drag.reshape(*rows, -1)], axis=-1)
    stall_rows = stall.reshape(4, *rows)
    # With many Mach numbers one by one: all at once would need ten times the memory of the polars.
    together = x.size if mach.size == 1 else 1
    bounds = np.concatenate(
        [element_bounds(polars[i : i + together], stall_rows[:, i : i + together]) for i in range(0, x.size, together)]
    )
    return BladeElements(
        blades=propeller.blades,
        tip_radius=tip_radius,
        chord_75=float(monotone_curve(stations.r_over_R, stations.c_over_R, np.array(0.75))) * tip_radius,
        r_over_R=x,
        columns=columns,
        polars=polars,
        bounds=bounds,
        ln_reynolds=ln_reynolds,
        mach=mach,
        loss=loss.tables,
    )


def element_bounds(polars: FloatArray, stall: FloatArray) -> FloatArray:
    """Work out where the lift of each polar rises, and how steeply it falls elsewhere.

    Parameters
    ----------
    polars : numpy.ndarray, shape (n, n_re, n_alpha, 2)
        Lift and ln drag over a uniform grid from -pi to pi.
    stall : numpy.ndarray, shape (4, n, n_re)
        Angles of least and largest lift, lowest and highest angle of the data [rad].

    Returns
    -------
    numpy.ndarray, shape (n, n_re, kernels.B_COLUMNS)
        Between the rise angles every cell's lift grows at least as much as its drag changes. The falls are the
        largest of -dcl/dalpha + |dcd/dalpha| beyond them, the climb that of dcl/dalpha + |dcd/dalpha| [1/rad].
    """
    lift, drag = polars[..., 0], np.exp(polars[..., 1])
    n_alpha = lift.shape[-1]
    angles = np.linspace(-np.pi, np.pi, n_alpha)
    step = angles[1] - angles[0]
    fall = -np.diff(lift, axis=-1) + np.abs(np.diff(drag, axis=-1))
    rises = fall <= 0
    # The run of rising cells around the rise through zero that is nearest to no incidence.
    crossing = (lift[..., :-1] <= 0) & (lift[..., 1:] > 0) & rises
    distance = np.where(crossing, np.abs(angles[:-1] + 0.5 * step), np.inf)
    start = np.argmin(distance, axis=-1)
    cells = np.arange(n_alpha - 1)
    after = np.where(~rises & (cells >= start[..., None]), cells, n_alpha - 1).min(axis=-1)
    before = np.where(~rises & (cells <= start[..., None]), cells + 1, 0).max(axis=-1)
    lost = ~np.isfinite(distance.min(axis=-1))
    after, before = np.where(lost, start, after), np.where(lost, start, before)
    bounds = np.empty((*lift.shape[:-1], k.B_COLUMNS))
    bounds[..., k.B_RISE_LOW] = angles[before]
    bounds[..., k.B_RISE_HIGH] = angles[after]
    bounds[..., k.B_RISE_LIFT] = np.take_along_axis(lift, after[..., None], -1)[..., 0]
    beyond = cells >= after[..., None]
    bounds[..., k.B_FALL_HIGH] = np.where(beyond, fall, 0.0).max(axis=-1) / step
    climb = np.diff(lift, axis=-1) + np.abs(np.diff(drag, axis=-1))
    bounds[..., k.B_CLIMB_HIGH] = np.where(beyond, climb, 0.0).max(axis=-1) / step
    bounds[..., k.B_CLIMB_LOW] = np.where(cells < before[..., None], climb, 0.0).max(axis=-1) / step
    bounds[..., k.B_FALL_LOW] = np.where(cells < before[..., None], fall, 0.0).max(axis=-1) / step
    bounds[..., k.B_TROUGH_FROM], bounds[..., k.B_TROUGH_TO], bounds[..., k.B_TROUGH_LIFT] = _troughs(
        lift, drag, angles, after
    )
    slower = -np.diff(lift, axis=-1) + 0.5 * np.abs(np.diff(drag, axis=-1))
    steep = slower > _CALM_FALL * step
    calm = np.where(steep & beyond & (cells < 3 * n_alpha // 4), cells + 1, after[..., None]).max(axis=-1)
    bounds[..., k.B_CALM_FROM] = angles[calm]
    bounds[..., k.B_CALM_FALL] = np.where(cells >= calm[..., None], slower, 0.0).max(axis=-1) / step
    below_half = (np.arange(n_alpha) >= after[..., None]) & (angles <= 0.25 * np.pi)
    bounds[..., k.B_PEAK_AT] = angles[np.where(below_half, lift, -np.inf).argmax(axis=-1)]
    bounds[..., k.B_PEAK_LIFT] = np.where(np.arange(n_alpha) >= after[..., None], lift, -np.inf).max(axis=-1)
    bounds[..., k.B_STALL_LOW], bounds[..., k.B_STALL_HIGH] = stall[0], stall[1]
    bounds[..., k.B_DATA_LOW], bounds[..., k.B_DATA_HIGH] = stall[2], stall[3]
    return bounds


def _troughs(
    lift: FloatArray, drag: FloatArray, angles: FloatArray, after: NDArray[np.intp]
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Where lift may be least inside an interval above the rise, rather than at its ends, and how small it is there.

    Up to 90 deg, lift that rises, falls to one trough, rises and falls again while drag grows leaves only the trough;
    any other shape leaves the whole range and no lift at all.
    """
    nodes = np.arange(angles.size)
    quarter = int(np.searchsorted(angles, 0.5 * np.pi))
    half = int(np.searchsorted(angles, 0.25 * np.pi))
    beyond = (nodes >= after[..., None]) & (nodes <= quarter)
    peak = np.argmax(np.where(beyond & (nodes <= half), lift, -np.inf), axis=-1)
    falling = np.diff(lift, axis=-1) < 0
    trough = np.argmin(np.where(beyond & (nodes >= peak[..., None]) & (nodes <= half), lift, np.inf), axis=-1)
    top = np.argmax(np.where(beyond & (nodes >= trough[..., None]), lift, -np.inf), axis=-1)
    cells = nodes[:-1]
    start, peak_, trough_, top_ = (value[..., None] for value in (after, peak, trough, top))
    up = ((cells >= start) & (cells < peak_)) | ((cells >= trough_) & (cells < top_))
    down = ((cells >= peak_) & (cells < trough_)) | ((cells >= top_) & (cells < quarter))
    wrong = (up & falling) | (down & (np.diff(lift, axis=-1) > 0))
    wrong |= (cells >= start) & (cells < quarter) & (np.diff(drag, axis=-1) < 0)
    plain = ~wrong.any(axis=-1)
    at_trough = np.take_along_axis(lift, trough[..., None], -1)[..., 0]
    return (
        np.where(plain, angles[trough], angles[after]),
        np.where(plain, angles[trough], np.pi),
        np.where(plain, at_trough, -np.inf),
    )


@dataclass(frozen=True, eq=False)
class _SpanSections:
    """Curves over (elements of the span, Mach numbers of its own, common Reynolds numbers)."""

    curves: FullCircle
    trusted: tuple[float, float]
    mach: FloatArray | None
    outside: FloatArray
    table_beta: float
    thickness: FloatArray
    flat_face_angle: FloatArray | None

    @property
    def mach_range(self) -> tuple[float, float]:
        """Mach numbers of the data; a law of compressibility serves any."""
        return (0.0, np.inf) if self.mach is None else (float(self.mach[0]), float(self.mach[-1]))


def _common_reynolds(spans: tuple[SectionSpan, ...], model: Model) -> FloatArray:
    """Reynolds numbers of all spans together: interpolation between them is exact for each span's own rows."""
    rows = []
    for span in spans:
        table = span.polars if span.polars is not None else family(str(span.family))
        trusted_from = table.reynolds_trusted_from
        rows.append(extended_nodes(table.reynolds, rule=model.reynolds_rule, trusted_from=trusted_from))
    return _merged(rows, np.log)


def _common_mach(spans: tuple[SectionSpan, ...]) -> FloatArray:
    """Mach numbers of all spans together, and where the laws are tabulated for a span without; 0 alone if all are."""
    axes = [_mach_axis(span) for span in spans]
    own = [axis for axis in axes if axis is not None]
    if not own:
        return np.zeros(1)
    return _merged(own if len(own) == len(axes) else [*own, EXPANDED_MACH], lambda mach: mach)


def _merged(axes: list[FloatArray], scale: Callable[[FloatArray], FloatArray]) -> FloatArray:
    """Nodes of all axes, without those that differ by rounding only."""
    nodes = np.unique(np.concatenate(axes))
    return np.ascontiguousarray(nodes[np.concatenate([[True], np.diff(scale(nodes)) > 1e-6])])


def _mach_axis(span: SectionSpan) -> FloatArray | None:
    return None if span.polars is None or span.polars.mach_numbers.size == 1 else span.polars.mach_numbers


def _between(nodes: FloatArray, own: FloatArray, values: FloatArray, axis: int) -> FloatArray:
    """Interpolate along an axis by straight lines, held beyond the ends."""
    if own.size == nodes.size and np.array_equal(own, nodes):
        return values
    position = np.interp(nodes, own, np.arange(own.size))
    row = np.minimum(position.astype(int), own.size - 2)
    weight = np.expand_dims(position - row, tuple(range(1, values.ndim - axis % values.ndim)))
    low, high = np.take(values, row, axis), np.take(values, row + 1, axis)
    mixed: FloatArray = low * (1 - weight) + high * weight
    return mixed


def _with_stall_delay(
    curves: FullCircle, c_over_r: FloatArray, r_over_R: FloatArray, model: Model
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return lift and ln drag of a span with stall delay, and the angles of stall and data, shape (4, ...)."""
    lift_share, drag_share = (
        np.broadcast_to((model.stall_strength * share)[:, None, None], curves.zero_lift.shape)
        for share in LAWS[model.stall_delay].function(c_over_r, r_over_R)
    )
    lift = delayed_lift(ANGLES, curves.lift, curves.zero_lift, lift_slope(curves), lift_share)
    at_zero_lift = at_angle(curves.log_drag, curves.zero_lift)
    log_drag = delayed_drag(ANGLES, curves.log_drag, curves.zero_lift, at_zero_lift, drag_share)
    return lift, log_drag, np.stack([curves.stall_low, curves.stall_high, curves.data_low, curves.data_high])


def _on_mach_axis(
    section: _SpanSections, lift: FloatArray, log_drag: FloatArray, stall: FloatArray, mach: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Bring the curves of a span to the common Mach numbers: a table's own by interpolation, others by the laws."""
    if mach.size == 1:
        return lift, log_drag, stall
    if section.mach is not None:
        return (
            _between(mach, section.mach, lift, 1),
            _between(mach, section.mach, log_drag, 1),
            _between(mach, section.mach, stall, 2),
        )
    shape = (lift.shape[0], mach.size, *lift.shape[2:])
    found_lift, found_drag = np.empty(shape), np.empty(shape)
    for number, thickness in enumerate(section.thickness):  # one by one: all at once they leave the processor's cache
        found_lift[number], found_drag[number] = compressed(
            ANGLES,
            lift[number],
            np.exp(log_drag[number]),
            mach[:, None, None],
            divergence=np.array(KORN_KAPPA - thickness),
            table_beta=section.table_beta,
        )
    return found_lift, np.log(found_drag), np.repeat(stall, mach.size, axis=2)


def _span_sections(
    span: SectionSpan,
    reynolds: FloatArray,
    thickness: FloatArray | None,
    camber: FloatArray | None,
    count: int,
    model: Model,
) -> _SpanSections:
    if span.polars is not None:
        table = span.polars
        if thickness is None:
            known = span.t_over_c if span.t_over_c is not None else table.t_over_c
            thickness = np.full(count, UNKNOWN_THICKNESS if known is None else known)
        shape = (-1, table.reynolds.size, table.alpha.size)
        one = _curves(
            table, reynolds, table.lift.reshape(shape), table.drag.reshape(shape), float(thickness.mean()), model
        )
        curves = FullCircle(
            *(
                np.broadcast_to(getattr(one, name), (count, *getattr(one, name).shape))
                for name in ("lift", "log_drag", "stall_low", "stall_high", "data_low", "data_high", "zero_lift")
            )
        )
        axis = _mach_axis(span)
        return _SpanSections(
            curves=curves,
            trusted=(max(table.reynolds_trusted_from, float(table.reynolds[0])), float(table.reynolds[-1])),
            mach=axis,
            outside=np.zeros(count),
            table_beta=1.0 if axis is not None else float(np.sqrt(1.0 - table.mach_numbers[0] ** 2)),
            thickness=thickness,
            flat_face_angle=None,
        )
    shapes = family(str(span.family))
    if thickness is None:
        thickness = np.full(count, shapes.default_thickness if span.t_over_c is None else span.t_over_c)
    if camber is None and not shapes.camber_follows_thickness:
        camber = np.full(count, shapes.default_camber if span.camber is None else span.camber)
    lift, drag = (values[:, None] for values in shapes.at_many(thickness, camber))
    return _SpanSections(
        curves=_curves(shapes, reynolds, lift, drag, thickness[:, None, None], model),
        trusted=(shapes.reynolds_trusted_from, float(shapes.reynolds[-1])),
        mach=None,
        outside=np.array(
            [not shapes.covers(t, None if camber is None else camber[i]) for i, t in enumerate(thickness)], dtype=float
        ),
        table_beta=1.0,
        thickness=thickness,
        flat_face_angle=shapes.flat_face_angle(thickness, camber),
    )


def _curves(
    table: PolarTable | Family,
    reynolds: FloatArray,
    lift: FloatArray,
    drag: FloatArray,
    t_over_c: FloatArray | float,
    model: Model,
) -> FullCircle:
    """Bring lift and drag, shape (..., n_re, n_alpha), to the common Reynolds numbers and the full circle."""
    rule, trusted_from = model.reynolds_rule, table.reynolds_trusted_from
    nodes = np.log(extended_nodes(table.reynolds, rule=rule, trusted_from=trusted_from))
    lift, drag = extended(table.reynolds, lift, drag, rule=rule, trusted_from=trusted_from)
    return full_circle(
        table.alpha,
        _between(np.log(reynolds), nodes, lift, -2),
        np.exp(_between(np.log(reynolds), nodes, np.log(drag), -2)),
        plate_drag=model.plate_drag,
        drag_scale=model.drag_scale,
        whole_table=isinstance(table, PolarTable),
        post_stall=model.post_stall,
        t_over_c=t_over_c,
    )
