"""Shape-preserving cubic interpolation on plain arrays."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


def monotone_slopes(x: FloatArray, y: FloatArray) -> FloatArray:
    """Return the slopes of a cubic that keeps the shape of its data: no overshoot, no false extreme.

    Parameters
    ----------
    x : numpy.ndarray, shape (n,)
        Ascending, n >= 2.
    y : numpy.ndarray, shape (..., n)
        Values along the last axis.

    Returns
    -------
    numpy.ndarray, shape (..., n)
        dy/dx at the nodes: weighted harmonic mean inside, one-sided three-point formula at the ends.

    References
    ----------
    F.N. Fritsch, J. Butland, "A method for constructing local monotone piecewise cubic interpolants", SIAM J. Sci.
    Stat. Comput. 5, 1984.
    """
    h = np.diff(x)
    delta = np.diff(y, axis=-1) / h
    if x.size == 2:
        return np.broadcast_to(delta, y.shape).copy()
    slopes = np.zeros(y.shape)
    left, right = delta[..., :-1], delta[..., 1:]
    w_left = 2.0 * h[1:] + h[:-1]
    w_right = h[1:] + 2.0 * h[:-1]
    same = left * right > 0
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        mean = (w_left + w_right) / (w_left / left + w_right / right)
    slopes[..., 1:-1] = np.where(same, mean, 0.0)

    def end(h_0: float, h_1: float, d_0: FloatArray, d_1: FloatArray) -> FloatArray:
        slope = ((2.0 * h_0 + h_1) * d_0 - h_0 * d_1) / (h_0 + h_1)
        slope = np.where(slope * d_0 <= 0, 0.0, slope)
        return np.where((d_0 * d_1 <= 0) & (np.abs(slope) > 3.0 * np.abs(d_0)), 3.0 * d_0, slope)

    slopes[..., 0] = end(h[0], h[1], delta[..., 0], delta[..., 1])
    slopes[..., -1] = end(h[-1], h[-2], delta[..., -1], delta[..., -2])
    return slopes


def monotone_curve(x: FloatArray, y: FloatArray, at: FloatArray) -> FloatArray:
    """Evaluate the shape-preserving cubic through (x, y), held constant beyond both ends.

    Parameters
    ----------
    x, y : numpy.ndarray, shape (n,)
        Nodes, x ascending.
    at : numpy.ndarray
        Where to evaluate.

    Returns
    -------
    numpy.ndarray
        Shaped as `at`.
    """
    slopes = monotone_slopes(x, y)
    inside = np.clip(at, x[0], x[-1])
    cell = np.clip(np.searchsorted(x, inside, side="right") - 1, 0, x.size - 2)
    h = x[cell + 1] - x[cell]
    t = (inside - x[cell]) / h
    value_left, slope_left, value_right, slope_right = hermite_weights(t)
    return (
        value_left * y[cell]
        + value_right * y[cell + 1]
        + h * (slope_left * slopes[cell] + slope_right * slopes[cell + 1])
    )


def hermite_weights(t: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Return the cubic Hermite weights of left value, left slope, right value and right slope.

    Parameters
    ----------
    t : numpy.ndarray
        Position within the cell, 0 to 1.

    Returns
    -------
    tuple of numpy.ndarray
        Four weights shaped as `t`; slopes are per cell width.
    """
    square = t * t
    cube = square * t
    return 2 * cube - 3 * square + 1, cube - 2 * square + t, 3 * square - 2 * cube, cube - square
