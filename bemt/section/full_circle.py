"""Section tables continued over the full circle, as a rotor needs them from standing still to a stopped blade."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.section.post_stall import LAWS, SeparatedSection

FloatArray = NDArray[np.float64]

GRID_SIZE = 721
"""Angles of the uniform grid from -180 to 180 deg, both ends included."""

ANGLES = np.linspace(-np.pi, np.pi, GRID_SIZE)

_BLEND_WIDTH = np.radians(1.0)
_KEPT_PAST_STALL = np.radians(4.0)
_LATEST_STALL = np.radians(25.0)
_SLOPE_SPAN = np.radians(5.0)
_MATCHED = np.radians((5.0, 45.0))  # a law is matched between these angles: some have no meaning near 0 and 90 deg


@dataclass(frozen=True, eq=False)
class FullCircle:
    """Two-dimensional polars over the full circle.

    Parameters
    ----------
    lift, log_drag : numpy.ndarray, shape (..., GRID_SIZE)
        Lift coefficient and logarithm of the drag coefficient over `ANGLES`.
    stall_low, stall_high : numpy.ndarray, shape (...)
        Angles of the least and the largest lift of the table [rad].
    data_low, data_high : numpy.ndarray, shape (...)
        Angles from which on the post-stall law has at least half the weight, or where the data end [rad].
    zero_lift : numpy.ndarray, shape (...)
        Zero-lift angle [rad].
    """

    lift: FloatArray
    log_drag: FloatArray
    stall_low: FloatArray
    stall_high: FloatArray
    data_low: FloatArray
    data_high: FloatArray
    zero_lift: FloatArray


def full_circle(
    alpha: FloatArray,
    lift: FloatArray,
    drag: FloatArray,
    *,
    plate_drag: float,
    drag_scale: float = 1.0,
    whole_table: bool = False,
    post_stall: str = "plate",
    t_over_c: FloatArray | float = 0.12,
) -> FullCircle:
    """Continue tables to the full circle by blending into a post-stall law.

    Lift and the logarithm of drag pass into the law by a logistic of 1 deg width centred 4 deg past the stall, where
    laws that are matched to the section are matched; beyond its last angle a table is held while the blend takes
    over. A table that reaches further is used as far as it goes, if asked; one that spans the whole circle is used
    alone.

    Parameters
    ----------
    alpha : numpy.ndarray, shape (n,)
        Angles of the table [rad], ascending.
    lift, drag : numpy.ndarray, shape (..., n)
        Section coefficients.
    plate_drag : float
        Drag coefficient at 90 deg.
    drag_scale : float
        Factor on the table's drag.
    whole_table : bool
        Use the table to its ends (measured or computed data of the user) rather than 4 deg past stall only.
    post_stall : str
        Name of the law, one of `bemt.section.post_stall.LAWS`.
    t_over_c : float or numpy.ndarray, shape (...)
        Thickness as a share of the chord; some laws need it.

    Returns
    -------
    FullCircle

    References
    ----------
    B. Montgomerie, FOI-R--1305--SE, 2004 (blending of an attached and a separated curve).
    """
    cell = np.clip(np.searchsorted(alpha, ANGLES, side="right") - 1, 0, alpha.size - 2)
    t = np.clip((ANGLES - alpha[cell]) / (alpha[cell + 1] - alpha[cell]), 0.0, 1.0)
    table_lift = lift[..., cell] * (1 - t) + lift[..., cell + 1] * t
    log_table = np.log(drag)
    table_drag = log_table[..., cell] * (1 - t) + log_table[..., cell + 1] * t + np.log(drag_scale)

    zero_lift = _zero_lift(alpha, lift)
    near = np.abs(alpha) <= _LATEST_STALL
    above = near & (alpha >= zero_lift[..., None])
    below = near & (alpha <= zero_lift[..., None])
    stall_high = alpha[np.argmax(np.where(above, lift, -np.inf), axis=-1)]
    stall_low = alpha[np.argmin(np.where(below, lift, np.inf), axis=-1)]

    high = stall_high + _KEPT_PAST_STALL
    low = stall_low - _KEPT_PAST_STALL
    if whole_table:
        high = np.where(alpha[-1] > high + 2 * _BLEND_WIDTH, alpha[-1] - 2 * _BLEND_WIDTH, high)
        low = np.where(alpha[0] < low - 2 * _BLEND_WIDTH, alpha[0] + 2 * _BLEND_WIDTH, low)
    share = np.zeros(table_lift.shape)
    if alpha[-1] < np.radians(170.0):
        share += _logistic((ANGLES - high[..., None]) / _BLEND_WIDTH)
    if alpha[0] > np.radians(-170.0):
        share += _logistic((low[..., None] - ANGLES) / _BLEND_WIDTH)
    share = np.minimum(share, 1.0)

    match_high, match_low = np.clip(high, *_MATCHED), np.clip(low, -_MATCHED[1], -_MATCHED[0])
    section = SeparatedSection(
        high_angle=match_high,
        high_lift=at_angle(table_lift, match_high),
        high_drag=np.exp(at_angle(table_drag, match_high)),
        low_angle=match_low,
        low_lift=at_angle(table_lift, match_low),
        low_drag=np.exp(at_angle(table_drag, match_low)),
        edge_drag=drag_scale * drag.min(axis=-1),
        t_over_c=np.asarray(t_over_c, dtype=np.float64),
    )
    law_lift, law_drag = LAWS[post_stall].function(ANGLES, plate_drag, section)
    blended_lift = (1 - share) * table_lift + share * law_lift
    blended_drag = (1 - share) * table_drag + share * np.log(law_drag)
    # Both ends of the circle are one angle.
    for curve in (blended_lift, blended_drag):
        curve[..., 0] = curve[..., -1] = 0.5 * (curve[..., 0] + curve[..., -1])
    return FullCircle(
        lift=blended_lift,
        log_drag=blended_drag,
        stall_low=stall_low,
        stall_high=stall_high,
        data_low=np.maximum(alpha[0], low),
        data_high=np.minimum(alpha[-1], high),
        zero_lift=zero_lift,
    )


def lift_slope(curves: FullCircle) -> FloatArray:
    """Slope of the attached lift just above the zero-lift angle, no steeper than 2 pi.

    Parameters
    ----------
    curves : FullCircle

    Returns
    -------
    numpy.ndarray, shape (...)
        [1/rad], from the secant over 5 deg.
    """
    slope: FloatArray = np.clip(at_angle(curves.lift, curves.zero_lift + _SLOPE_SPAN) / _SLOPE_SPAN, 0.0, 2 * np.pi)
    return slope


def at_angle(curves: FloatArray, angle: FloatArray) -> FloatArray:
    """Read curves over `ANGLES` at one angle each, by straight lines.

    Parameters
    ----------
    curves : numpy.ndarray, shape (..., GRID_SIZE)
    angle : numpy.ndarray, shape (...)
        [rad], within -pi to pi.

    Returns
    -------
    numpy.ndarray, shape (...)
    """
    position = (angle + np.pi) / (ANGLES[1] - ANGLES[0])
    cell = np.clip(position.astype(int), 0, GRID_SIZE - 2)
    t = position - cell
    here = np.take_along_axis(curves, cell[..., None], -1)[..., 0]
    there = np.take_along_axis(curves, cell[..., None] + 1, -1)[..., 0]
    value: FloatArray = here * (1 - t) + there * t
    return value


def _logistic(x: FloatArray) -> FloatArray:
    return 0.5 * (1.0 + np.tanh(0.5 * x))


def _zero_lift(alpha: FloatArray, lift: FloatArray) -> FloatArray:
    """Angle nearest zero within 20 deg at which lift rises through zero; the table's end where it never does."""
    crossing = (lift[..., :-1] < 0) & (lift[..., 1:] >= 0)
    middle = 0.5 * (alpha[:-1] + alpha[1:])
    distance = np.where(crossing & (np.abs(middle) < np.radians(20.0)), np.abs(middle), np.inf)
    cell = np.argmin(distance, axis=-1)
    found = np.isfinite(np.take_along_axis(distance, cell[..., None], -1)[..., 0])
    left = np.take_along_axis(lift, cell[..., None], -1)[..., 0]
    right = np.take_along_axis(lift, cell[..., None] + 1, -1)[..., 0]
    with np.errstate(divide="ignore", invalid="ignore"):
        root = alpha[cell] - left * (alpha[cell + 1] - alpha[cell]) / (right - left)
    fallback = alpha[np.argmin(np.abs(lift), axis=-1)]
    nearest: FloatArray = np.where(found, root, fallback)
    return nearest
