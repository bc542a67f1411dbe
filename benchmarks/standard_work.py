"""The standard work that speed is measured on, and the two ways of doing it in Python: the usual one and ours.

Two blades of 40 equal elements, 31 advance ratios from 0 to 0.9 at 6000 rpm, polars of 721 angles by 8 Reynolds
numbers. yardstick.c holds the same numbers. The polars are formulas, not data of any section.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from bemt.rotor.solution import RotorSolution

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Work:
    """Arrays of the standard work in SI units; angles in radians."""

    alpha: FloatArray
    ln_reynolds: FloatArray
    lift: FloatArray  # (n_re, n_alpha)
    drag: FloatArray
    radius: FloatArray
    width: float
    chord: FloatArray
    pitch: float
    advance_ratio: FloatArray
    blades: int = 2
    tip_radius: float = 0.15
    root_radius: float = 0.015
    revolutions: float = 100.0  # per second
    density: float = 1.225
    viscosity: float = 1.8e-5

    @property
    def diameter(self) -> float:
        """Diameter [m]."""
        return 2.0 * self.tip_radius

    @property
    def twist(self) -> FloatArray:
        """Blade angle of each element."""
        return np.arctan(self.pitch / (2.0 * np.pi * self.radius))


def standard_work() -> Work:
    """Make the standard work."""
    alpha = np.linspace(-np.pi, np.pi, 721)
    rows = np.arange(8)
    attached = 1.0 / (1.0 + np.exp(40.0 * (np.abs(alpha) - 0.24)))
    lift = 6.0 * (alpha + 0.06) * attached + 1.1 * np.sin(2.0 * alpha) * (1.0 - attached)
    friction = 0.012 + 0.01 * (7 - rows) / 8
    drag = (friction[:, None] + 0.3 * alpha**2) * attached + (0.02 + 1.9 * np.sin(alpha) ** 2) * (1.0 - attached)
    tip, count = 0.15, 40
    radius = tip * (0.15 + 0.85 * (np.arange(count) + 0.5) / count)
    return Work(
        alpha=alpha,
        ln_reynolds=9.2 + 0.6 * rows,
        lift=np.tile(lift, (8, 1)),
        drag=drag,
        radius=radius,
        width=0.85 * tip / count,
        chord=0.18 * tip * (1.0 - 0.6 * ((radius / tip - 0.35) / 0.65) ** 2),
        pitch=0.1524,
        advance_ratio=np.linspace(0.0, 0.9, 31),
        tip_radius=tip,
    )


def usual(work: Work, every: int = 1) -> tuple[float, int]:
    """Solve with `scipy.optimize.brentq`, one call an element, as a first attempt in Python would.

    Parameters
    ----------
    work : Work
        The standard work.
    every : int, optional
        Take only every so many advance ratios; the whole takes a second.

    Returns
    -------
    total : float
        Sum of CT + CQ over the advance ratios taken.
    solutions : int
        Elements solved.
    """
    from scipy.optimize import brentq

    # Plain floats and lists: in a scalar function they are several times faster than arrays.
    lift, drag = work.lift.tolist(), work.drag.tolist()
    spin = 2.0 * math.pi * work.revolutions
    twist = work.twist.tolist()

    def forces(phi: float, blade_angle: float, row: int, upper: float, tip: float, root: float) -> tuple[float, ...]:
        place = min(max((blade_angle - phi + math.pi) * 360.0 / math.pi, 0.0), 719.9999)
        cell = int(place)
        right = place - cell
        cl = (1.0 - upper) * (lift[row][cell] + right * (lift[row][cell + 1] - lift[row][cell])) + upper * (
            lift[row + 1][cell] + right * (lift[row + 1][cell + 1] - lift[row + 1][cell])
        )
        cd = (1.0 - upper) * (drag[row][cell] + right * (drag[row][cell + 1] - drag[row][cell])) + upper * (
            drag[row + 1][cell] + right * (drag[row + 1][cell + 1] - drag[row + 1][cell])
        )
        sine, cosine = math.sin(phi), math.cos(phi)
        loss = 4.0 / math.pi**2 * math.acos(math.exp(-tip / sine)) * math.acos(math.exp(-root / sine))
        return cl * cosine - cd * sine, cl * sine + cd * cosine, loss

    def gap(phi: float, axial: float, around: float, solidity: float, *section: float) -> float:
        normal, tangential, loss = forces(phi, *section)  # type: ignore[arg-type]
        sine, cosine = math.sin(phi), math.cos(phi)
        load = solidity / (4.0 * loss)
        return axial * (sine * cosine + load * tangential) - around * (sine * sine - load * normal)

    total, solutions = 0.0, 0
    for ratio in work.advance_ratio[::every].tolist():
        axial = ratio * work.revolutions * work.diameter
        for radius, chord, blade_angle in zip(work.radius.tolist(), work.chord.tolist(), twist, strict=True):
            around = spin * radius
            solidity = work.blades * chord / (2.0 * math.pi * radius)
            along = (math.log(work.density * around * chord / work.viscosity) - work.ln_reynolds[0]) / 0.6
            along = min(max(float(along), 0.0), 6.9999)
            section = (
                blade_angle,
                int(along),
                along - int(along),
                work.blades / 2.0 * (work.tip_radius - radius) / radius,
                work.blades / 2.0 * (radius - work.root_radius) / radius,
            )
            phi = brentq(gap, 1e-6, math.pi / 2.0, args=(axial, around, solidity, *section), xtol=2e-10)
            normal, tangential, loss = forces(phi, *section)
            speed = around / (math.cos(phi) + solidity * tangential / (4.0 * loss * math.sin(phi)))
            force = 0.5 * work.density * speed**2 * work.blades * chord * work.width
            scale = work.density * work.revolutions**2 * work.diameter**4
            total += force * normal / scale + force * tangential * radius / (scale * work.diameter)
            solutions += 1
    return total, solutions


class Ours:
    """The same work for `bemt.rotor`.

    Harder than the yardstick's in two ways: the Reynolds number follows the local speed, induced part included, and
    every root is proven to be the first one. Drag is interpolated in its logarithm.

    Parameters
    ----------
    work : Work
        The standard work.
    """

    def __init__(self, work: Work) -> None:
        from bemt.rotor import kernels as k
        from bemt.rotor.elements import BladeElements, element_bounds

        self._work, self._twist = work, k.E_TWIST
        count = work.radius.size
        columns = np.zeros((count, k.E_COLUMNS))
        columns[:, k.E_RADIUS] = work.radius
        columns[:, k.E_WIDTH] = work.width
        columns[:, k.E_CHORD] = work.chord
        columns[:, k.E_SOLIDITY] = work.blades * work.chord / (2.0 * np.pi * work.radius)
        half = 0.5 * work.blades / work.radius
        columns[:, k.E_MACH_HIGH] = np.inf
        columns[:, k.E_TIP] = columns[:, k.E_LOSS_SCALE] = np.sqrt(half * (work.tip_radius - work.radius))
        columns[:, k.E_ROOT] = np.sqrt(half * (work.radius - work.root_radius))
        columns[:, k.E_DIVERGENCE] = 0.75
        columns[:, k.E_TABLE_BETA] = 1.0
        columns[:, k.E_LN_RE_LOW] = work.ln_reynolds[0]
        columns[:, k.E_LN_RE_HIGH] = work.ln_reynolds[-1]
        columns[:, k.E_POLAR] = 0  # one polar for all
        polars = np.stack([work.lift, np.log(work.drag)], axis=-1)[None]
        attached = np.abs(work.alpha) < np.radians(30.0)
        stall = np.empty((4, 1, work.ln_reynolds.size))
        stall[0] = work.alpha[attached][np.argmin(work.lift[:, attached], axis=1)]
        stall[1] = work.alpha[attached][np.argmax(work.lift[:, attached], axis=1)]
        stall[2:] = np.array([-np.pi, np.pi])[:, None, None]
        self._elements = BladeElements(
            blades=work.blades,
            tip_radius=work.tip_radius,
            chord_75=float(np.interp(0.75 * work.tip_radius, work.radius, work.chord)),
            r_over_R=work.radius / work.tip_radius,
            columns=columns,
            polars=polars,
            bounds=element_bounds(polars, stall),
            ln_reynolds=work.ln_reynolds,
        )
        self._airspeed = work.advance_ratio * work.revolutions * work.diameter
        self._angular_speed = 2.0 * np.pi * work.revolutions

    def solve(self, pitch: float) -> RotorSolution:
        """Solve one table, the plain-Python face around the kernels included.

        Parameters
        ----------
        pitch : float
            Of the blade [m].

        Returns
        -------
        RotorSolution
            Over the advance ratios.
        """
        from bemt.rotor.solution import solve

        work = self._work
        self._elements.columns[:, self._twist] = np.arctan(pitch / (2.0 * np.pi * work.radius))
        # The yardstick knows no Mach number: sound without end.
        return solve(self._elements, self._airspeed, self._angular_speed, work.viscosity / work.density, np.inf)

    def solve_batch(self, pitches: FloatArray) -> FloatArray:
        """Solve the tables of several pitches in one call of the kernels, as a sweep would.

        Parameters
        ----------
        pitches : numpy.ndarray, shape (n,)
            Of the blades [m].

        Returns
        -------
        numpy.ndarray, shape (kernels.S_ROWS, n_j, n * n_elements)
            The kernels' own result, every element of every table.
        """
        from dataclasses import replace

        from bemt.rotor.solution import solve_pairs

        work = self._work
        columns = np.tile(self._elements.columns, (pitches.size, 1))
        columns[:, self._twist] = np.arctan(pitches[:, None] / (2.0 * np.pi * work.radius)).ravel()
        points = np.empty((work.advance_ratio.size, 4))
        points[:] = 0.0, self._angular_speed, work.density / work.viscosity, 0.0
        points[:, 0] = self._airspeed
        return solve_pairs(points, replace(self._elements, columns=columns))

    def checksum(self) -> float:
        """Return the sum of CT + CQ over the standard table."""
        solution = self.solve(self._work.pitch)
        scale = self._work.revolutions**2 * self._work.diameter**4
        return float((solution.thrust_per_density + solution.torque_per_density / self._work.diameter).sum() / scale)


def ours(work: Work) -> Ours:
    """Make our solver ready for the standard work: `ours(work).solve(pitch)` is what is timed."""
    return Ours(work)
