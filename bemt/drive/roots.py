"""A bracketed root of many equations at once."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.intp]

_EPSILON = float(np.finfo(np.float64).eps)
_MOST_STEPS = 100


def bracketed_root(
    function: Callable[[FloatArray, IndexArray], FloatArray],
    low: FloatArray,
    high: FloatArray,
    at_low: FloatArray,
    at_high: FloatArray,
) -> FloatArray:
    """Return one root in each bracket, to a few units in the last place.

    Parameters
    ----------
    function : callable
        Takes positions (k,) and the indices (k,) of the equations they belong to; returns values (k,).
    low, high : numpy.ndarray, shape (n,)
        Ends of the brackets.
    at_low, at_high : numpy.ndarray, shape (n,)
        Values there, of opposite sign or zero.

    Returns
    -------
    numpy.ndarray, shape (n,)
        Roots; NaN where the ends do not enclose one, or where the function was not a number on the way.

    Notes
    -----
    Chandrupatla's method: inverse quadratic interpolation where it is safe, bisection where it is not, so the bracket
    always shrinks. The general-purpose library has the same, but importing it takes longer than a whole envelope.

    References
    ----------
    T. R. Chandrupatla, "A new hybrid quadratic/bisection algorithm for finding the zero of a nonlinear function without
    using derivatives", Advances in Engineering Software 28 (1997) 145-149.
    """
    root = np.where(at_low == 0.0, low, np.where(at_high == 0.0, high, np.nan))
    index = np.flatnonzero(at_low * at_high < 0.0)
    a, b, fa, fb = low[index], high[index], at_low[index], at_high[index]
    c, fc = b.copy(), fb.copy()
    step = fa / (fa - fb)
    for _ in range(_MOST_STEPS):
        if index.size == 0:
            break
        trial = a + step * (b - a)
        value = function(trial, index)
        same = np.sign(value) == np.sign(fa)
        c, fc = np.where(same, a, b), np.where(same, fa, fb)
        b, fb = np.where(same, b, a), np.where(same, fb, fa)
        a, fa = trial, value

        nearest = np.where(np.abs(fa) < np.abs(fb), a, b)
        smallest_step = 2.0 * _EPSILON * np.abs(nearest) / np.maximum(np.abs(b - a), np.finfo(np.float64).tiny)
        lost = np.isnan(fa)
        done = lost | (fa == 0.0) | (smallest_step >= 0.5)
        root[index[done]] = np.where(lost, np.nan, nearest)[done]
        going = ~done
        index, a, b, c = index[going], a[going], b[going], c[going]
        fa, fb, fc = fa[going], fb[going], fc[going]
        step = np.clip(_next_step(a, b, c, fa, fb, fc), smallest_step[going], 1.0 - smallest_step[going])
    root[index] = a
    return root


def _next_step(
    a: FloatArray, b: FloatArray, c: FloatArray, fa: FloatArray, fb: FloatArray, fc: FloatArray
) -> FloatArray:
    """Return the next position as a share of the way from a to b."""
    with np.errstate(divide="ignore", invalid="ignore"):
        place, height = (a - b) / (c - b), (fa - fb) / (fc - fb)
        safe = (height**2 < place) & ((1.0 - height) ** 2 < 1.0 - place)
        quadratic = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        return np.where(safe, quadratic, 0.5)
