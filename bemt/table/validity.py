"""How far a result can be trusted: a grade for each point, and the reasons that keep it from being good.

The limits are this project's judgement, not a standard. They follow from what is known of the inputs: sections beyond
stall and below a Reynolds number of 60 000 scatter most between sources, and nothing outside its data is better than a
guess.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.quantities.registry import (
    SHARES,
    SPOKEN_REASONS,
    STATUS_NOT_CONVERGED,
    STATUS_NOT_RUN,
    STATUS_REVERSED_FLOW,
    STATUS_SEVERAL_ROOTS,
    TRUST_FAIR,
    TRUST_FLAGS,
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

ABOVE_DIVERGENCE_SHARE = (0.05, 0.25)
"""The same for the share of the span above the drag-divergence Mach number.

Lock's rise 20 (M - Mcr)^4 adds 0.003 to the section drag coefficient at divergence and 0.012 a Mach number of 0.05
further on, as much as a thin section's own drag, and is known to a factor of two at best. Over 5 % of the span that is
less than 1 % of the power. Over a quarter, outermost, it is 5 % and more, and the loss of lift by shocks, which has no
law here, comes on top: no estimate then stands on its feet.
"""

MACH_BEYOND_DIVERGENCE = (0.0, 0.05)
"""The same for the helical tip Mach number less the drag-divergence Mach number of the tip section.

The share counts elements at their own lift, thickness and induced speed; this counts the tip alone, at a plain lift
coefficient. It catches blades whose tips are so narrow that the share stays small, and beyond 0.05 the relations for
drag divergence are outside of what they were made for.
"""

LARGE_INCIDENCE = math.radians(15.0)
"""Incidence of the shaft above which no point is better than fair.

Below it thrust and power differ from axial flow by no more than the crossflow squared. Beyond it they, and the forces
in the plane and the moments most of all, rest on the law of the skewed wake and on section data without unsteadiness.
"""

LIFT_AT_DIVERGENCE = 0.5
"""Section lift coefficient at which the drag-divergence Mach number of the tip is taken."""

KORN_LIFT_FACTOR = 0.1
"""Fall of the drag-divergence Mach number with the lift coefficient (Korn; W.H. Mason, Configuration Aerodynamics)."""

_BITS = {word: bit for bit, word in TRUST_REASONS.items()}


def grade(
    status: ArrayLike,
    shares: Mapping[str, ArrayLike],
    mach_beyond_divergence: ArrayLike,
    *,
    section_guessed: bool = False,
    descent: ArrayLike = False,
    incidence: ArrayLike = 0.0,
    outside_inflow_law: ArrayLike = False,
) -> tuple[NDArray[np.int16], NDArray[np.int16]]:
    """Grade points and say why.

    Parameters
    ----------
    status : array_like of int
        Codes of the registry.
    shares : mapping of str to array_like
        Each of the registry's shares of the span.
    mach_beyond_divergence : array_like
        Helical tip Mach number less the drag-divergence Mach number of the tip section.
    section_guessed : bool
        Whether the section is the default for an unknown one: no point is then better than fair.
    descent : array_like of bool
        Whether the air comes from behind: only estimated, and poor.
    incidence : array_like
        Between flight path and shaft [rad].
    outside_inflow_law : array_like of bool
        Whether the law of the inflow is outside of what it can describe: poor.

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
    status, stalled, outside, low, above, beyond, falling, inclined, lawless = np.broadcast_arrays(
        np.asarray(status),
        *(shares[name] for name in SHARES),
        mach_beyond_divergence,
        descent,
        incidence,
        outside_inflow_law,
    )
    trust = np.full(status.shape, TRUST_GOOD, dtype=np.int16)
    reasons = np.zeros(status.shape, dtype=np.int16)

    def hold(where: Any, best: int, word: str) -> None:
        np.minimum(trust, np.int16(best), out=trust, where=where)
        np.bitwise_or(reasons, np.int16(_BITS[word]), out=reasons, where=where)

    for value, (good_to, fair_to), word in (
        (stalled, STALLED_SHARE, "stalled"),
        (outside, OUTSIDE_POLAR_SHARE, "outside_polars"),
        (above, ABOVE_DIVERGENCE_SHARE, "high_mach"),
        (beyond, MACH_BEYOND_DIVERGENCE, "high_mach"),
    ):
        hold(value > good_to, TRUST_FAIR, word)
        hold(value > fair_to, TRUST_POOR, word)
    hold(low > LOW_REYNOLDS_SHARE, TRUST_FAIR, "low_reynolds")
    hold((status == STATUS_SEVERAL_ROOTS) & (stalled > STALLED_SHARE[0]), TRUST_FAIR, "several_roots")
    hold((status == STATUS_REVERSED_FLOW) & ~falling, TRUST_POOR, "flow_reversed")
    hold(falling, TRUST_POOR, "descent")
    hold(lawless, TRUST_POOR, "outside_inflow_law")
    hold(inclined > LARGE_INCIDENCE, TRUST_FAIR, "large_incidence")
    hold(status == STATUS_NOT_CONVERGED, TRUST_POOR, "not_converged")
    if section_guessed:
        hold(np.ones(status.shape, dtype=bool), TRUST_FAIR, "section_guessed")
    missing = status == STATUS_NOT_RUN
    trust[missing] = TRUST_NOT_RUN
    reasons[missing] = 0
    return trust, reasons


def trust_in_words(trust: ArrayLike, reasons: ArrayLike, axes: Mapping[str, ArrayLike]) -> tuple[str, ...]:
    """Say how many points have which grade, why, and where they lie.

    Parameters
    ----------
    trust, reasons : array_like of int, shape of the axes
        From `grade`.
    axes : mapping of str to array_like
        The axes in their order, by the name they have in a sentence, such as "rpm" or "J"; each one-dimensional.

    Returns
    -------
    tuple of str
        A line on the points that are good, then one for each worse grade that occurs: each reason with its number of
        points and the range of every axis that they do not span whole, the most frequent first.
    """
    trust, reasons = np.asarray(trust), np.asarray(reasons)
    ranges = [(name, np.asarray(values, dtype=np.float64)) for name, values in axes.items()]
    run = int((trust != TRUST_NOT_RUN).sum())
    lines = [f"{TRUST_FLAGS[TRUST_GOOD]} at {int((trust == TRUST_GOOD).sum())} of {run} points"]
    for held in (TRUST_FAIR, TRUST_POOR):
        here = trust == held
        if not here.any():
            continue
        found = {word: here & ((reasons & bit) != 0) for bit, word in TRUST_REASONS.items()}
        order = sorted((word for word in found if found[word].any()), key=lambda word: -int(found[word].sum()))
        said = [f"{SPOKEN_REASONS[word]} at {int(found[word].sum())}{_where(found[word], ranges)}" for word in order]
        lines.append(f"{TRUST_FLAGS[held]} at {int(here.sum())} points: {'; '.join(said)}")
    return tuple(lines)


def _where(points: NDArray[np.bool_], axes: list[tuple[str, NDArray[np.float64]]]) -> str:
    """Name the range of each axis that the points span; an axis that they span whole is left out."""
    parts = []
    for number, (name, values) in enumerate(axes):
        along = points.any(axis=tuple(k for k in range(points.ndim) if k != number))
        first, last = (int(k) for k in np.flatnonzero(along)[[0, -1]])
        if first == last and values.size > 1:
            parts.append(f"{name} {values[first]:.4g}")
        elif (first, last) != (0, values.size - 1):
            parts.append(f"{name} {values[first]:.4g} to {values[last]:.4g}")
    return f" ({', '.join(parts)})" if parts else ""


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
