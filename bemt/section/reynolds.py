"""Rules for drag at Reynolds numbers beyond a table. They act by rows added to the table before any solution."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from bemt.section.laws import Law

FloatArray = NDArray[np.float64]

FARTHEST = 2.0
"""By what factor beyond the table's Reynolds numbers a rule acts; farther out drag is held."""

_LAMINAR_EXPONENT, _TURBULENT_EXPONENT = 0.5, 0.2
_LN_CHANGE = (np.log(5e5), np.log(1e6))
_FRICTION_SHARE = 0.12  # of the drag coefficient at most: the rest is pressure drag of separated flow


def power_law(reynolds: FloatArray) -> FloatArray:
    """Drag in proportion to Re^-0.5 below 500 000 and to Re^-0.2 above 1 000 000, the exponent changing in between.

    The exponents of laminar and of turbulent skin friction (1.328 Re^-0.5, H. Blasius; 0.074 Re^-0.2, L. Prandtl); that
    section drag follows friction is the suggestion of Yamauchi and Johnson.

    Parameters
    ----------
    reynolds : numpy.ndarray, shape (n,)
        Reynolds number of the chord.

    Returns
    -------
    numpy.ndarray, shape (n,)
        Of which only ratios have a meaning.

    Notes
    -----
    Lift is held. The same authors let the largest lift grow with Re^0.125 to Re^0.2, which holds for high Reynolds
    numbers; below about 50 000 the stall follows no power at all.

    References
    ----------
    G.K. Yamauchi, W. Johnson, "Trends of Reynolds Number Effects on Two-Dimensional Airfoil Characteristics for
    Helicopter Rotor Analyses", NASA TM-84363, 1983.
    """
    low, high = _LN_CHANGE
    ln_reynolds = np.log(reynolds)
    share = np.clip((ln_reynolds - low) / (high - low), 0.0, 1.0)
    # The exponent, integrated over ln Re.
    turbulent = 0.5 * (high - low) * share**2 + np.maximum(ln_reynolds - high, 0.0)
    level: FloatArray = np.exp(-_LAMINAR_EXPONENT * ln_reynolds + (_LAMINAR_EXPONENT - _TURBULENT_EXPONENT) * turbulent)
    return level


def held(reynolds: FloatArray) -> FloatArray:
    """Drag as at the nearest Reynolds number of the table.

    Parameters
    ----------
    reynolds : numpy.ndarray, shape (n,)
        Reynolds number of the chord.

    Returns
    -------
    numpy.ndarray, shape (n,)
        Ones.
    """
    return np.ones_like(reynolds)


LAWS: dict[str, Law[Callable[[FloatArray], FloatArray]]] = {
    "power-law": Law(
        power_law,
        "G.K. Yamauchi, W. Johnson, Trends of Reynolds Number Effects on Two-Dimensional Airfoil Characteristics for "
        "Helicopter Rotor Analyses, NASA TM-84363, 1983",
        "skin friction, a factor of 2 in Reynolds number beyond the table",
    ),
    "held": Law(held, "", "no Reynolds number beyond the table"),
}
"""The rules by the name that a case gives them."""


def extended_nodes(reynolds: FloatArray, *, rule: str, trusted_from: float = 0.0) -> FloatArray:
    """Add to the Reynolds numbers of a table those up to which a rule acts.

    Parameters
    ----------
    reynolds : numpy.ndarray, shape (n_re,)
        Ascending.
    rule : str
        One of `LAWS`.
    trusted_from : float
        Reynolds number below which the rows are extrapolated already; they count towards the factor of 2.

    Returns
    -------
    numpy.ndarray, shape (n_more,)
        Ascending, with none, one or two more.
    """
    level = LAWS[rule].function
    ends = np.array([max(reynolds[0], trusted_from) / FARTHEST, reynolds[-1] * FARTHEST])
    beyond = (ends < reynolds[0]) | (ends > reynolds[-1])
    acts = beyond & (level(ends) != level(reynolds[[0, -1]]))
    return np.concatenate([ends[:1][acts[:1]], reynolds, ends[1:][acts[1:]]])


def extended(
    reynolds: FloatArray, lift: FloatArray, drag: FloatArray, *, rule: str, trusted_from: float = 0.0
) -> tuple[FloatArray, FloatArray]:
    """Add the rows of `extended_nodes` to a table.

    Parameters
    ----------
    reynolds : numpy.ndarray, shape (n_re,)
        Ascending.
    lift, drag : numpy.ndarray, shape (..., n_re, n_alpha)
        Section coefficients.
    rule : str
        One of `LAWS`.
    trusted_from : float
        As for `extended_nodes`.

    Returns
    -------
    lift, drag : numpy.ndarray, shape (..., n_more, n_alpha)
        Lift of a new row is that of its neighbour; so is drag but for its part up to 0.12, which follows the rule.
    """
    level = LAWS[rule].function
    nodes = extended_nodes(reynolds, rule=rule, trusted_from=trusted_from)
    nearest = np.clip(np.searchsorted(reynolds, nodes), 0, reynolds.size - 1)
    more = level(nodes) / level(reynolds[nearest]) - 1.0
    beside = drag[..., nearest, :]
    return lift[..., nearest, :], beside + more[:, None] * np.minimum(beside, _FRICTION_SHARE)
