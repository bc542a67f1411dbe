"""Laws of end loss: the circulation a blade loses at its ends. Interchangeable pure functions, and their tables."""

from __future__ import annotations

from collections.abc import Callable, Collection
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from bemt.rotor import kernels as k
from bemt.rotor.goldstein import goldstein_factor, pitch_at, pitch_coordinate, prandtl_factor

FloatArray = NDArray[np.float64]
Law = Callable[[int, FloatArray, float, FloatArray], FloatArray]

NO_LOSS = 1e6
"""Scale of an element at which an end takes nothing."""

_SEARCH = np.linspace(0.0, 1.0, 1025)  # pitch coordinates at which the least factor is looked for
_LARGEST_NODE = 60  # node of a table at |sin phi| = 1; the last node is then at 0.014
_JOIN_FROM = 4.2
_DIFFERENCE = 0.03  # of a cell


def prandtl(blades: int, r_over_R: FloatArray, root_over_R: float, absolute_sine: FloatArray) -> FloatArray:
    """Prandtl's factor for the tip: straight parallel sheets in place of helical ones.

    Parameters
    ----------
    blades : int
    r_over_R : numpy.ndarray
        Positive, up to 1.
    root_over_R : float
        Not used.
    absolute_sine : numpy.ndarray
        |sin phi|, from 0 to 1. Broadcasts with `r_over_R`.

    Returns
    -------
    numpy.ndarray
        From 0 to 1.

    Notes
    -----
    Good for small helix angles and many blades. For an optimum loading it exceeds Goldstein's factor at 0.9 R by
    0.6 % (two blades, wake pitch 0.05), 2 % (0.1) and 14 % (0.3).

    References
    ----------
    L. Prandtl, appendix to A. Betz, "Schraubenpropeller mit geringstem Energieverlust", 1919, with the local helix
    angle after H. Glauert in W.F. Durand (ed.), Aerodynamic Theory IV, 1935.
    """
    del root_over_R
    return prandtl_factor(blades, r_over_R, absolute_sine)


def goldstein(blades: int, r_over_R: FloatArray, root_over_R: float, absolute_sine: FloatArray) -> FloatArray:
    """Goldstein's factor at the local wake pitch (r/R) tan phi, made never to rise with |sin phi|.

    The sheets of Goldstein's problem reach the axis and drag the fluid around it along, so that the factor rises
    again, beyond 1, where the helix is steep inboard. A hub does not do that: the least value up to the helix angle
    is taken, at most 1.

    Parameters
    ----------
    blades : int
        1 to 12.
    r_over_R : numpy.ndarray
        From 0 to 1.
    root_over_R : float
        Not used.
    absolute_sine : numpy.ndarray
        |sin phi|, from 0 to 1. Broadcasts with `r_over_R`.

    Returns
    -------
    numpy.ndarray
        From 0 to 1; times |sin phi| it never falls with |sin phi|.

    Notes
    -----
    Exact for optimum loading (rigid sheets) only. The least value is searched to 1e-5.

    References
    ----------
    S. Goldstein, "On the vortex theory of screw propellers", Proceedings of the Royal Society A 123, 1929. Its use at
    the local helix angle, and the bounds, are this project's.
    """
    del root_over_R
    radii, place = np.unique(r_over_R, return_inverse=True)
    pitch = pitch_at(_SEARCH)
    least = np.minimum.accumulate(goldstein_factor(blades, radii[:, None], pitch), axis=1)
    least = np.minimum(least, 1.0)
    most = np.maximum.accumulate(least / np.hypot(1.0, radii[:, None] / np.maximum(pitch, 1e-300)), axis=1)
    sine = np.clip(absolute_sine, 1e-300, 1.0)
    with np.errstate(divide="ignore"):
        wake_pitch = r_over_R * sine / np.sqrt((1.0 - sine) * (1.0 + sine))
    before = np.searchsorted(_SEARCH, pitch_coordinate(wake_pitch), side="right") - 1
    at = place.reshape(np.shape(r_over_R)), before
    factor = np.minimum(least[at], goldstein_factor(blades, r_over_R, wake_pitch))
    found: FloatArray = np.maximum(factor, most[at] / sine)
    return found


def no_loss(blades: int, r_over_R: FloatArray, root_over_R: float, absolute_sine: FloatArray) -> FloatArray:
    """No loss: as with infinitely many blades.

    Parameters
    ----------
    blades : int
    r_over_R : numpy.ndarray
    root_over_R : float
    absolute_sine : numpy.ndarray
        As for `prandtl`.

    Returns
    -------
    numpy.ndarray
        Ones.
    """
    del blades, root_over_R
    return np.ones(np.broadcast_shapes(np.shape(r_over_R), np.shape(absolute_sine)))


LAWS: dict[str, Law] = {"prandtl": prandtl, "goldstein": goldstein, "none": no_loss}
"""The laws for the tip by the name that a case gives them."""


def prandtl_root(blades: int, r_over_R: FloatArray, root_over_R: float, absolute_sine: FloatArray) -> FloatArray:
    """Prandtl's factor turned round for the root, the only one there is for it.

    Parameters
    ----------
    blades : int
    r_over_R : numpy.ndarray
        From the root outward.
    root_over_R : float
        Where the blade begins.
    absolute_sine : numpy.ndarray
        |sin phi|, from 0 to 1. Broadcasts with `r_over_R`.

    Returns
    -------
    numpy.ndarray
        (2/pi) acos(exp(-(B/2) (r - r_root) / (r_root |sin phi|))), from 0 to 1.

    Notes
    -----
    Meant for a blade that ends in the open. A hub closes the gap, so the true loss is smaller.

    References
    ----------
    H. Glauert in W.F. Durand (ed.), Aerodynamic Theory IV, 1935.
    """
    exponent = 0.5 * blades * (r_over_R - root_over_R) / root_over_R / np.maximum(absolute_sine, 1e-300)
    found: FloatArray = 2.0 / np.pi * np.arccos(np.exp(-exponent))
    return found


class EndLossTables(NamedTuple):
    """End loss as the compiled solver reads it: factors over x = scale / sqrt(|sin phi|), 1 beyond the last x.

    Parameters
    ----------
    tip_scale, root_scale : numpy.ndarray, shape (n,)
        Scales of each element. Those of the root belong to the first table.
    table_index : numpy.ndarray of int, shape (n,)
        Table of each element's factor for the tip.
    tables : numpy.ndarray, shape (n_tables * cells, 5)
        One below the other, each as `kernels.loss_table` makes the first.
    """

    tip_scale: FloatArray
    root_scale: FloatArray
    table_index: NDArray[np.int64]
    tables: FloatArray


def loss_tables(
    law: str, ends: Collection[str], blades: int, r_over_R: FloatArray, root_over_R: float
) -> EndLossTables:
    """Tabulate a law for the elements of a blade.

    Prandtl's law is the same function of x for all elements; others get a table each.

    Parameters
    ----------
    law : {"prandtl", "goldstein", "none"}
        One of `LAWS`.
    ends : collection of {"tip", "root"}
        Ends that lose anything.
    blades : int
    r_over_R : numpy.ndarray, shape (n,)
        Middles of the elements, inside the blade.
    root_over_R : float
        Where the blade begins.

    Returns
    -------
    EndLossTables
        Absolute errors: Prandtl 2e-10. Goldstein 1e-4 up to |sin phi| = 0.93, 3e-4 beyond and within 0.001 R of the
        tip; below 0.02 it is led to exactly 1. No table rises with |sin phi|, and none times |sin phi| falls by more
        than 2e-5.

    Raises
    ------
    InputError
        By Goldstein's law with more blades than it is known for.
    """
    first = k.loss_table()
    tip, root = np.full(r_over_R.shape, NO_LOSS), np.full(r_over_R.shape, NO_LOSS)
    index: NDArray[np.int64] = np.zeros(r_over_R.shape, dtype=np.int64)
    tables = first
    if law != "none" and "root" in ends:
        root = np.sqrt(0.5 * blades * (r_over_R - root_over_R) / root_over_R)
    if law != "none" and "tip" in ends:
        tip = np.sqrt(0.5 * blades * (1.0 - r_over_R) / r_over_R)
        if law != "prandtl":
            # On a node where it can be, so that no cell reaches from |sin phi| = 1 to where there is no law.
            node = np.minimum(np.floor(tip * first[0, 4]), _LARGEST_NODE)
            tip = np.where(node > 0.0, node / first[0, 4], tip)
            index = 1 + np.arange(r_over_R.size, dtype=np.int64)
            own = _own_tables(LAWS[law], blades, r_over_R, root_over_R, tip, first)
            tables = np.concatenate([first, own])
    return EndLossTables(tip, root, index, tables)


def _own_tables(
    law: Law,
    blades: int,
    r_over_R: FloatArray,
    root_over_R: float,
    scale: FloatArray,
    first: FloatArray,
) -> FloatArray:
    cells = first.shape[0]
    h = 1.0 / first[0, 4]
    x = h * np.arange(cells + 1)
    scale = scale[:, None]

    def at(place: FloatArray) -> FloatArray:
        sine = (scale / np.maximum(place, scale)) ** 2
        return law(blades, r_over_R[:, None], root_over_R, sine)

    # Nodes at |sin phi| > 1 stay 0: no cell there is asked for, but the first of elements closest to the tip.
    d = _DIFFERENCE * h
    value = np.where(x < scale - 0.5 * d, 0.0, at(x))
    right, more = at(x + d), at(x + 2.0 * d)
    slope = np.where(x < scale + 0.5 * d, 4.0 * right - more - 3.0 * value, right - at(x - d)) * (0.5 * h / d)
    near = scale[:, 0] < h
    slope[near, 0] = (at(scale) / scale)[near, 0] * h
    step = np.clip((x - _JOIN_FROM) / (x[-1] - _JOIN_FROM), 0.0, 1.0)
    short = 1.0 - value[:, -1:]
    value += short * step**2 * (3.0 - 2.0 * step)
    slope += short * 6.0 * step * (1.0 - step) * h / (x[-1] - _JOIN_FROM)
    slope[:, -1] = 0.0
    # Neither may a cubic turn round, nor factor times |sin phi|, which goes with value / x^2.
    rise, inner = np.diff(value), x[1:-1]
    fall = np.full(rise.shape, np.inf)
    fall[:, 1:] = -np.diff(value[:, 1:] / x[1:] ** 2)
    fall = np.where(x[:-1] < scale - 0.5 * d, np.inf, fall)
    level = 2.0 * h * value[:, 1:-1] / inner
    least = level - 3.0 * inner**2 * np.minimum(fall[:, :-1], fall[:, 1:]).clip(0.0)
    most = np.minimum(3.0 * np.minimum(rise[:, :-1], rise[:, 1:]).clip(0.0), level)
    slope[:, 1:-1] = np.clip(slope[:, 1:-1], np.minimum(least.clip(0.0), most), most)
    left, right = slope[:, :-1], slope[:, 1:]
    own = np.empty((r_over_R.size, cells, 5))
    own[..., 0] = value[:, :-1]
    own[..., 1] = left
    own[..., 2] = 3.0 * rise - 2.0 * left - right
    own[..., 3] = left + right - 2.0 * rise
    own[..., 4] = first[0, 4]
    return own.reshape(-1, 5)
