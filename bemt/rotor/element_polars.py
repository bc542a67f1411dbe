"""Section data and end loss of blade elements in plain numpy: what every solution beside the compiled one works on."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from bemt.rotor import kernels as k
from bemt.rotor.elements import BladeElements
from bemt.section.compressibility import compressed, divergence_mach

FloatArray = NDArray[np.float64]

LOW_REYNOLDS = 60_000.0
"""Below it section drag is uncertain by 30 % or more."""

_LOSS_FLOOR = 1e-4


class SectionForces(NamedTuple):
    """Section coefficients at elements, and where they stand among their data.

    Parameters
    ----------
    lift, drag : numpy.ndarray, shape (..., n_elements)
        Coefficients with stall delay and compressibility.
    stalled, outside, low_reynolds, diverged : numpy.ndarray of bool, shape (..., n_elements)
        Beyond the two-dimensional stall; outside the data; below a Reynolds number of 60 000; above the
        drag-divergence Mach number.
    """

    lift: FloatArray
    drag: FloatArray
    stalled: NDArray[np.bool_]
    outside: NDArray[np.bool_]
    low_reynolds: NDArray[np.bool_]
    diverged: NDArray[np.bool_]


def coefficients(
    elements: BladeElements, alpha: FloatArray, ln_reynolds: FloatArray, mach: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return lift and drag coefficients, by the same interpolation and laws as the compiled solution.

    Lift linear and drag logarithmic between Reynolds numbers, held at both ends; Prandtl and Glauert's factor at a
    Mach number held at drag divergence (Korn), with Lock's drag rise, unless the polars have a Mach axis of their own.

    Parameters
    ----------
    elements : BladeElements
    alpha, ln_reynolds, mach : numpy.ndarray, shape (..., n_elements)
        Angle of attack [rad], any; logarithm of the Reynolds number; Mach number. They broadcast.

    Returns
    -------
    lift, drag : numpy.ndarray, shape (..., n_elements)
    """
    lift, log_drag = _interpolated(elements, alpha, ln_reynolds, mach)
    drag = np.exp(log_drag)
    if elements.mach.size > 1:
        return lift, drag
    return compressed(
        alpha,
        lift,
        drag,
        mach,
        divergence=elements.columns[:, k.E_DIVERGENCE],
        table_beta=elements.columns[:, k.E_TABLE_BETA],
    )


def section_forces(
    elements: BladeElements, alpha: FloatArray, ln_reynolds: FloatArray, mach: FloatArray
) -> SectionForces:
    """Return lift and drag coefficients, and what keeps them from being trusted.

    Parameters
    ----------
    elements : BladeElements
    alpha, ln_reynolds, mach : numpy.ndarray, shape (..., n_elements)
        As for `coefficients`.

    Returns
    -------
    SectionForces
    """
    lift, drag = coefficients(elements, alpha, ln_reynolds, mach)
    columns = elements.columns
    alpha = np.remainder(alpha + np.pi, 2.0 * np.pi) - np.pi
    element = np.arange(columns.shape[0])
    row, weight = _reynolds_place(elements, ln_reynolds)
    at_mach = _mach_place(elements, mach)[0] * elements.ln_reynolds.size

    def bound(column: int) -> FloatArray:
        low = elements.bounds[element, at_mach + row, column]
        high = elements.bounds[element, at_mach + row + 1, column]
        found: FloatArray = low + weight * (high - low)
        return found

    return SectionForces(
        lift=lift,
        drag=drag,
        stalled=(alpha > bound(k.B_STALL_HIGH)) | (alpha < bound(k.B_STALL_LOW)),
        outside=(alpha > bound(k.B_DATA_HIGH))
        | (alpha < bound(k.B_DATA_LOW))
        | (ln_reynolds < columns[:, k.E_LN_RE_LOW])
        | (ln_reynolds > columns[:, k.E_LN_RE_HIGH])
        | (mach < columns[:, k.E_MACH_LOW])
        | (mach > columns[:, k.E_MACH_HIGH]),
        low_reynolds=np.broadcast_to(ln_reynolds < np.log(LOW_REYNOLDS), lift.shape),
        diverged=mach > divergence_mach(elements.columns[:, k.E_DIVERGENCE], lift),
    )


def end_loss_factor(elements: BladeElements, absolute_sine: FloatArray) -> FloatArray:
    """Return the factor of the loss at both ends, from the tables of the compiled solution.

    Parameters
    ----------
    elements : BladeElements
    absolute_sine : numpy.ndarray, shape (..., n_elements)
        |sin phi|.

    Returns
    -------
    numpy.ndarray, shape (..., n_elements)
        F, no less than 1e-4.
    """
    inverse_root = 1.0 / np.sqrt(np.maximum(absolute_sine, 1e-15))
    columns = elements.columns
    tip = _end_loss(elements.loss, columns[:, k.E_LOSS_SCALE] * inverse_root, columns[:, k.E_LOSS].astype(np.intp))
    root = _end_loss(elements.loss, columns[:, k.E_ROOT] * inverse_root, np.intp(0))
    factor: FloatArray = np.maximum(tip * root, _LOSS_FLOOR)
    return factor


def _end_loss(tables: FloatArray, x: FloatArray, table: NDArray[np.intp] | np.intp) -> FloatArray:
    place = x * tables[0, 4]
    cell = np.minimum(place, k.LOSS_CELLS - 1).astype(np.intp)
    t = place - cell
    c0, c1, c2, c3, _ = np.moveaxis(tables[table * k.LOSS_CELLS + cell], -1, 0)
    return np.where(place < k.LOSS_CELLS, c0 + t * (c1 + t * (c2 + t * c3)), 1.0)


def _reynolds_place(elements: BladeElements, ln_reynolds: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    return _place(elements.ln_reynolds, ln_reynolds)


def _mach_place(elements: BladeElements, mach: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    if elements.mach.size == 1:
        return np.zeros(np.shape(mach), dtype=np.intp), np.zeros(np.shape(mach))
    return _place(elements.mach, mach)


def _place(nodes: FloatArray, value: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    cell = np.clip(np.searchsorted(nodes, value, side="right") - 1, 0, nodes.size - 2)
    return cell, np.clip((value - nodes[cell]) / (nodes[cell + 1] - nodes[cell]), 0.0, 1.0)


def _interpolated(
    elements: BladeElements, alpha: FloatArray, ln_reynolds: FloatArray, mach: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Return lift and ln drag of the tables, linear in angle, ln Re and Mach number."""
    polars = elements.polars
    element = np.arange(polars.shape[0])
    last = polars.shape[2] - 1
    place = np.remainder(alpha + np.pi, 2.0 * np.pi) * (last / (2.0 * np.pi))
    cell = np.minimum(place.astype(np.intp), last - 1)
    t = (place - cell)[..., None]
    row, weight = _reynolds_place(elements, ln_reynolds)
    weight = weight[..., None]

    def at(rows: NDArray[np.intp]) -> FloatArray:
        low = polars[element, rows, cell] * (1.0 - t) + polars[element, rows, cell + 1] * t
        high = polars[element, rows + 1, cell] * (1.0 - t) + polars[element, rows + 1, cell + 1] * t
        mixed: FloatArray = low * (1.0 - weight) + high * weight
        return mixed

    if elements.mach.size == 1:
        found = at(row)
    else:
        below, share = _mach_place(elements, mach)
        count = elements.ln_reynolds.size
        share = share[..., None]
        found = at(below * count + row) * (1.0 - share) + at((below + 1) * count + row) * share
    return found[..., 0], found[..., 1]
