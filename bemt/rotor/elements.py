"""From a measured blade to the arrays that the kernels work on."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.blade.geometry import Propeller, SectionSpan
from bemt.errors import InputError
from bemt.interpolation import monotone_curve
from bemt.rotor import kernels as k
from bemt.rotor.model import Model
from bemt.section.family import family
from bemt.section.full_circle import ANGLES, FullCircle, full_circle, lift_slope
from bemt.section.stall_delay import LAWS, delayed_lift

FloatArray = NDArray[np.float64]

KORN_KAPPA = 0.87
"""Korn's technology factor for conventional sections (W.H. Mason, Configuration Aerodynamics)."""

UNKNOWN_THICKNESS = 0.12
"""Taken for the drag rise where nobody says how thick a section is."""

_NO_LOSS = 1e6
_REFERENCE_REYNOLDS = 3e5
_CALM_FALL = 3.0  # [1/rad]: more than a separated section's lift falls, less than a stall does


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
    polars : numpy.ndarray, shape (n, n_re, n_alpha, 2)
        Lift and ln drag with stall delay, over the full circle.
    bounds : numpy.ndarray, shape (n, n_re, kernels.B_COLUMNS)
        Angles of stall and data, and where lift rises.
    ln_reynolds : numpy.ndarray, shape (n_re,)
        Natural logarithm of the Reynolds numbers of the rows.
    """

    blades: int
    tip_radius: float
    chord_75: float
    r_over_R: FloatArray
    columns: FloatArray
    polars: FloatArray
    bounds: FloatArray
    ln_reynolds: FloatArray

    @property
    def outside_share(self) -> float:
        """Share of the span, weighted by r^2 chord, whose thickness or camber leaves its section data."""
        weight = self.columns[:, k.E_RADIUS] ** 2 * self.columns[:, k.E_CHORD] * self.columns[:, k.E_WIDTH]
        return float(weight @ self.columns[:, k.E_OUTSIDE] / weight.sum())


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

    reynolds = _common_reynolds(propeller.sections)
    shape = (x.size, reynolds.size, ANGLES.size)
    lift, log_drag = np.empty(shape), np.empty(shape)
    stall = np.empty((4, *shape[:2]))
    trusted = np.empty((2, x.size))
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
        delay = model.stall_strength * LAWS[model.stall_delay](chord[here] / x[here], x[here])
        delayed = delayed_lift(
            ANGLES,
            curves.lift,
            curves.zero_lift,
            lift_slope(curves),
            np.broadcast_to(delay[:, None], curves.zero_lift.shape),
        )
        lift[here], log_drag[here] = delayed, curves.log_drag
        stall[:, here] = curves.stall_low, curves.stall_high, curves.data_low, curves.data_high
        trusted[:, here] = np.log(section.trusted)[:, None]
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
            blade_angle[here] += curves.zero_lift[:, row]

    ln_reynolds = np.log(reynolds)
    columns = np.zeros((x.size, k.E_COLUMNS))
    columns[:, k.E_RADIUS] = x * tip_radius
    columns[:, k.E_WIDTH] = width * tip_radius
    columns[:, k.E_CHORD] = chord * tip_radius
    columns[:, k.E_TWIST] = blade_angle
    columns[:, k.E_SOLIDITY] = propeller.blades * chord / (2.0 * np.pi * x)
    half = 0.5 * propeller.blades
    prandtl = model.end_loss == "prandtl"
    tip = prandtl and "tip" in model.end_loss_ends
    root = prandtl and "root" in model.end_loss_ends
    columns[:, k.E_TIP] = np.sqrt(half * (1.0 - x) / x) if tip else _NO_LOSS
    columns[:, k.E_ROOT] = np.sqrt(half * (x - propeller.root) / propeller.root) if root else _NO_LOSS
    columns[:, k.E_DIVERGENCE] = KORN_KAPPA - drag_thickness
    columns[:, k.E_TABLE_BETA] = table_beta
    columns[:, k.E_LN_RE_LOW], columns[:, k.E_LN_RE_HIGH] = trusted
    columns[:, k.E_OUTSIDE] = outside
    columns[:, k.E_POLAR] = np.arange(x.size)
    polars = np.stack([lift, log_drag], axis=-1)
    return BladeElements(
        blades=propeller.blades,
        tip_radius=tip_radius,
        chord_75=float(monotone_curve(stations.r_over_R, stations.c_over_R, np.array(0.75))) * tip_radius,
        r_over_R=x,
        columns=columns,
        polars=polars,
        bounds=element_bounds(polars, stall),
        ln_reynolds=ln_reynolds,
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
    curves: FullCircle
    trusted: tuple[float, float]
    outside: FloatArray
    table_beta: float
    thickness: FloatArray | float
    flat_face_angle: FloatArray | None


def _common_reynolds(spans: tuple[SectionSpan, ...]) -> FloatArray:
    """Reynolds numbers of all spans together: interpolation between them is exact for each span's own rows."""
    rows = [span.polars.reynolds if span.polars is not None else family(str(span.family)).reynolds for span in spans]
    merged = np.unique(np.concatenate(rows))
    keep = np.concatenate([[True], np.diff(np.log(merged)) > 1e-6])
    return np.ascontiguousarray(merged[keep])


def _on_rows(reynolds: FloatArray, own: FloatArray, values: FloatArray) -> FloatArray:
    """Interpolate rows linearly in ln Re, held beyond the ends; values have shape (..., n_own, n_alpha)."""
    if own.size == reynolds.size and np.array_equal(own, reynolds):
        return values
    position = np.interp(np.log(reynolds), np.log(own), np.arange(own.size))
    row = np.minimum(position.astype(int), own.size - 2)
    weight = (position - row)[:, None]
    mixed: FloatArray = values[..., row, :] * (1 - weight) + values[..., row + 1, :] * weight
    return mixed


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
        lift = _on_rows(reynolds, table.reynolds, table.lift)
        drag = np.exp(_on_rows(reynolds, table.reynolds, np.log(table.drag)))
        one = full_circle(
            table.alpha, lift, drag, plate_drag=model.plate_drag, drag_scale=model.drag_scale, whole_table=True
        )
        curves = FullCircle(
            *(
                np.broadcast_to(getattr(one, name), (count, *getattr(one, name).shape))
                for name in ("lift", "log_drag", "stall_low", "stall_high", "data_low", "data_high", "zero_lift")
            )
        )
        thick: FloatArray | float = UNKNOWN_THICKNESS
        if thickness is not None:
            thick = thickness
        elif span.t_over_c is not None or table.t_over_c is not None:
            thick = float(span.t_over_c if span.t_over_c is not None else table.t_over_c or UNKNOWN_THICKNESS)
        return _SpanSections(
            curves=curves,
            trusted=(max(table.reynolds_trusted_from, float(table.reynolds[0])), float(table.reynolds[-1])),
            outside=np.zeros(count),
            table_beta=float(np.sqrt(1.0 - table.mach**2)),
            thickness=thick,
            flat_face_angle=None,
        )
    shapes = family(str(span.family))
    if thickness is None:
        thickness = np.full(count, shapes.default_thickness if span.t_over_c is None else span.t_over_c)
    if camber is None and not shapes.camber_follows_thickness:
        camber = np.full(count, shapes.default_camber if span.camber is None else span.camber)
    lift, drag = shapes.at_many(thickness, camber)
    lift = _on_rows(reynolds, shapes.reynolds, lift)
    drag = np.exp(_on_rows(reynolds, shapes.reynolds, np.log(drag)))
    return _SpanSections(
        curves=full_circle(
            shapes.alpha, lift, drag, plate_drag=model.plate_drag, drag_scale=model.drag_scale, whole_table=False
        ),
        trusted=(shapes.reynolds_trusted_from, float(shapes.reynolds[-1])),
        outside=np.array(
            [not shapes.covers(t, None if camber is None else camber[i]) for i, t in enumerate(thickness)], dtype=float
        ),
        table_beta=1.0,
        thickness=thickness,
        flat_face_angle=shapes.flat_face_angle(thickness, camber),
    )
