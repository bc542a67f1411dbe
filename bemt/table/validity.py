"""How far a result can be trusted: a grade for each point, and the reasons that keep it from being good.

The limits are this project's judgement, not a standard. They follow from what is known of the inputs: sections beyond
stall and below a Reynolds number of 60 000 scatter most between sources, and nothing outside its data is better than a
guess.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.quantities.registry import (
    STATUS_NOT_CONVERGED,
    STATUS_NOT_RUN,
    STATUS_REVERSED_FLOW,
    STATUS_SEVERAL_ROOTS,
    TRUST_FAIR,
    TRUST_GOOD,
    TRUST_NOT_RUN,
    TRUST_POOR,
    TRUST_REASONS,
)

STALLED_SHARE = (0.05, 0.35)
"""Stalled share of the span above which a point is no longer good, and above which it is poor."""

OUTSIDE_POLAR_SHARE = (0.05, 0.35)
"""The same for the share of the span outside its polar data."""

LOW_REYNOLDS_SHARE = 0.10
"""Share of the span below a Reynolds number of 60 000 above which a point is no longer good.

Alone it makes no point poor: section drag is uncertain there by 30 % or more, which is worth some per cent of power.
Where a family or a table of polars no longer vouches for its data, the span counts as outside of them as well.
"""

MACH_BEYOND_DIVERGENCE = (0.0, 0.10)
"""The same for the helical tip Mach number less the drag-divergence Mach number of the tip section."""

LIFT_AT_DIVERGENCE = 0.5
"""Section lift coefficient at which the drag-divergence Mach number of the tip is taken."""

KORN_LIFT_FACTOR = 0.1
"""Fall of the drag-divergence Mach number with the lift coefficient (Korn; W.H. Mason, Configuration Aerodynamics)."""

_BITS = {word: bit for bit, word in TRUST_REASONS.items()}


def grade(
    status: ArrayLike,
    stalled_share: ArrayLike,
    outside_polar_share: ArrayLike,
    low_reynolds_share: ArrayLike,
    mach_beyond_divergence: ArrayLike,
    *,
    section_guessed: bool = False,
) -> tuple[NDArray[np.int16], NDArray[np.int16]]:
    """Grade points and say why.

    Parameters
    ----------
    status : array_like of int
        Codes of the registry.
    stalled_share, outside_polar_share, low_reynolds_share : array_like
        Shares of the span, weighted by r^2 chord.
    mach_beyond_divergence : array_like
        Helical tip Mach number less the drag-divergence Mach number of the tip section.
    section_guessed : bool
        Whether the section is the default for an unknown one: no point is then better than fair.

    Returns
    -------
    trust : numpy.ndarray of int16
        Grade by the codes of the registry, broadcast shape; "not run" where the status says so.
    reasons : numpy.ndarray of int16
        Bits of the registry: everything that keeps the grade from being good.

    Notes
    -----
    Most measures have two limits, and the worst counts. Reversed flow and a point that did not converge are poor.
    Several roots hold a point at fair where more of the span is stalled than a good point may have: the roots that
    rival each other are those of stalled elements, and a few of these at the root carry nothing.
    """
    status, stalled, outside, low, beyond = np.broadcast_arrays(
        np.asarray(status), stalled_share, outside_polar_share, low_reynolds_share, mach_beyond_divergence
    )
    trust = np.full(status.shape, TRUST_GOOD, dtype=np.int16)
    reasons = np.zeros(status.shape, dtype=np.int16)

    def hold(where: Any, best: int, word: str) -> None:
        np.minimum(trust, np.int16(best), out=trust, where=where)
        np.bitwise_or(reasons, np.int16(_BITS[word]), out=reasons, where=where)

    for value, (good_to, fair_to), word in (
        (stalled, STALLED_SHARE, "stalled"),
        (outside, OUTSIDE_POLAR_SHARE, "outside_polars"),
        (beyond, MACH_BEYOND_DIVERGENCE, "high_mach"),
    ):
        hold(value > good_to, TRUST_FAIR, word)
        hold(value > fair_to, TRUST_POOR, word)
    hold(low > LOW_REYNOLDS_SHARE, TRUST_FAIR, "low_reynolds")
    hold((status == STATUS_SEVERAL_ROOTS) & (stalled > STALLED_SHARE[0]), TRUST_FAIR, "several_roots")
    hold(status == STATUS_REVERSED_FLOW, TRUST_POOR, "flow_reversed")
    hold(status == STATUS_NOT_CONVERGED, TRUST_POOR, "not_converged")
    if section_guessed:
        hold(np.ones(status.shape, dtype=bool), TRUST_FAIR, "section_guessed")
    missing = status == STATUS_NOT_RUN
    trust[missing] = TRUST_NOT_RUN
    reasons[missing] = 0
    return trust, reasons


def divergence_at_lift(divergence_mach_without_lift: float) -> float:
    """Return the drag-divergence Mach number of a tip section that lifts as a propeller's does.

    Parameters
    ----------
    divergence_mach_without_lift : float
        Korn's technology factor less the thickness.

    Returns
    -------
    float
        Drag-divergence Mach number at `LIFT_AT_DIVERGENCE`.
    """
    return divergence_mach_without_lift - KORN_LIFT_FACTOR * LIFT_AT_DIVERGENCE
