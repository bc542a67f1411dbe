"""Velocity that regular helical vortices behind a propeller induce at its lifting lines.

Each of the blades sheds a vortex of constant radius and pitch that starts at its lifting line and has no end. By
symmetry the velocity at a lifting line is half that of vortices without beginning either, which is a series of modified
Bessel functions (Kapteyn's kind). Replacing them by their uniform expansion for large orders lets the series be summed.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ive, kve, spence

FloatArray = NDArray[np.float64]

_EXACT_ORDERS = 16  # terms up to this order of the Bessel functions are taken exactly
_NEGLIGIBLE = 1e-13


def closed_form(
    blades: int, radius: ArrayLike, vortex_radius: ArrayLike, pitch: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Velocity at a lifting line by helical vortices, with the series summed after the expansion's second term.

    Parameters
    ----------
    blades : int
        Number of vortices, evenly spaced.
    radius : array_like, shape (...)
        Where on the lifting line, positive and not on the vortex [m].
    vortex_radius : array_like, shape (...)
        Radius of the vortices, 0 for a vortex along the axis [m].
    pitch : array_like, shape (...)
        Advance of the vortices per radian of turn, vortex radius times the tangent of their angle; positive [m].

    Returns
    -------
    axial, tangential : numpy.ndarray, shape (...)
        Velocity per circulation [1/m]. Positive circulation is that of a thrusting blade's tip vortex; axial is
        positive downstream and tangential positive against the blade's motion, so that swirl with the rotation is
        negative.

    Notes
    -----
    Times 4 pi pitch / blades (axial) and 4 pi radius / blades (tangential), the error is below 1.3 % of the larger of
    1 and the value itself with one blade, 0.3 % with two, 0.1 % with three and less with more.

    References
    ----------
    H.W. Lerbs, "Moderately loaded propellers with a finite number of blades and an arbitrary distribution of
    circulation", Trans. SNAME 60, 1952; J.W. Wrench, "The calculation of propeller induction factors", David Taylor
    Model Basin Report 1116, 1957.
    """
    series = _Series(blades, radius, vortex_radius, pitch)
    return series.velocity(series.sum_of_two_terms())


def refined(
    blades: int, radius: ArrayLike, vortex_radius: ArrayLike, pitch: ArrayLike
) -> tuple[FloatArray, FloatArray]:
    """Velocity at a lifting line by helical vortices, with the leading terms of the series taken exactly.

    Beside the exact terms, the third term of the expansion is summed too. A hundred times the work of
    `closed_form`.

    Parameters
    ----------
    blades : int
    radius, vortex_radius, pitch : array_like, shape (...)
        As for `closed_form`.

    Returns
    -------
    axial, tangential : numpy.ndarray, shape (...)
        As for `closed_form`, with an error below 1e-5 in its measure.

    References
    ----------
    The series: J.C. Hardin, "The velocity field induced by a helical vortex filament", Physics of Fluids 25, 1982,
    after S. Kawada, 1936. The expansions: NIST Digital Library of Mathematical Functions, 10.41.
    """
    series = _Series(blades, radius, vortex_radius, pitch)
    return series.velocity(series.sum_of_two_terms() + series.third_term() + series.exact_less_expanded())


class _Series:
    """The series of one call, without its sign: sum over m of pre q^m (1 + first/(m B) + second/(m B)^2 + ...)."""

    def __init__(self, blades: int, radius: ArrayLike, vortex_radius: ArrayLike, pitch: ArrayLike) -> None:
        self.blades = blades
        self.radius, vortex, self.pitch = np.broadcast_arrays(
            np.asarray(radius, dtype=np.float64),
            np.asarray(vortex_radius, dtype=np.float64),
            np.asarray(pitch, dtype=np.float64),
        )
        self.inside = self.radius < vortex
        self.y, self.y0 = self.radius / self.pitch, vortex / self.pitch
        root, root0 = np.sqrt(1.0 + self.y**2), np.sqrt(1.0 + self.y0**2)
        with np.errstate(divide="ignore"):
            apart = root - root0 + np.log(self.y * (1.0 + root0)) - np.log(self.y0 * (1.0 + root))
        self.decay = -blades * np.abs(apart)  # ln q
        self.pre = np.sqrt(root0 / root)
        self.t, self.t0 = 1.0 / root, 1.0 / root0
        t, t0 = self.t, self.t0
        u1, v1 = t * (3.0 - 5.0 * t**2) / 24.0, t0 * (-9.0 + 7.0 * t0**2) / 24.0
        # I and K' inside, K and I' outside: the signs of the odd terms change together.
        self.first = np.where(self.inside, u1 - v1, v1 - u1)
        self.u1_v1 = u1 * v1

    def sum_of_two_terms(self) -> FloatArray:
        """Return the sum of the series with the first two terms of the expansion."""
        q = np.exp(self.decay)
        less = -np.expm1(self.decay)  # 1 - q
        found: FloatArray = self.pre * (q / less - self.first / self.blades * np.log(less))
        return found

    def _second(self) -> FloatArray:
        t, t0 = self.t**2, self.t0**2
        u2 = t * (81.0 + t * (-462.0 + 385.0 * t)) / 1152.0
        v2 = t0 * (-135.0 + t0 * (594.0 - 455.0 * t0)) / 1152.0
        found: FloatArray = u2 + v2 - self.u1_v1
        return found

    def third_term(self) -> FloatArray:
        """Return what the third term of the expansion adds to the sum: a dilogarithm of q."""
        found: FloatArray = self.pre * self._second() / self.blades**2 * spence(-np.expm1(self.decay))
        return found

    def exact_less_expanded(self) -> FloatArray:
        """Return the leading terms of the series less what the expansion has in their place."""
        total = np.zeros(self.y.shape)
        second = self._second()
        for m in range(1, max(1, _EXACT_ORDERS // self.blades) + 1):
            order = m * self.blades
            worth = m * self.decay > np.log(_NEGLIGIBLE)
            y, y0, inside = self.y[worth], self.y0[worth], self.inside[worth]
            scale = np.exp(order * -np.abs(y - y0))
            exact = np.empty(y.shape)
            x, x0 = order * y, order * y0
            exact[inside] = ive(order, x[inside]) * (kve(order - 1, x0[inside]) + kve(order + 1, x0[inside]))
            out = ~inside
            exact[out] = kve(order, x[out]) * (ive(order - 1, x0[out]) + ive(order + 1, x0[out]))
            expanded = np.exp(m * self.decay) * self.pre * (1.0 + self.first / order + second / order**2)
            # The derivatives K' and I' are half the sums of their neighbours.
            total[worth] += order * y0 * scale * exact - expanded[worth]
        return total

    def velocity(self, total: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return axial and tangential velocity from the sum of the series."""
        part = self.blades / (4.0 * np.pi)
        signed = np.where(self.inside, -total, total)
        return part / self.pitch * (self.inside - signed), part / self.radius * (~self.inside + signed)
