"""A disk at incidence to the stream: blade elements all around the disk, momentum annulus by annulus.

Axes of the disk, for right-hand rotation: x downstream, along the crossflow; y where the blade advances into it; z
forward along the shaft. The azimuth counts from x in the sense of rotation. The crossflow V sin(incidence) counts as
passing the disk from below to above, as on an aircraft at that angle of attack, so that x points up, and y to the
right.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.quantities.registry import (
    STATUS_CONVERGED,
    STATUS_NOT_CONVERGED,
    STATUS_REVERSED_FLOW,
    STATUS_SEVERAL_ROOTS,
)
from bemt.rotor import kernels as k
from bemt.rotor.element_polars import coefficients, end_loss_factor, section_forces
from bemt.rotor.elements import BladeElements
from bemt.rotor.solution import solve

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

AZIMUTHS = 36
_BLOCK = 24  # points solved together: their arrays stay in the cache

# Residuals are section force coefficients at the undisturbed speed.
_TOLERANCE = 1e-10
_SEARCHED_TOLERANCE = 1e-7  # where two roots nearly meet, Newton's method cannot polish what the search found
_MOST_SKEW_UPDATES = 25
_SKEW_TOLERANCE = 1e-9
_MOST_STEPS = 40
_SLOPE_STEP = 1e-6
_LARGEST_STEP = 0.1  # of the undisturbed speed at the tip

_SCAN = 1.0 - np.cos(np.linspace(0.0, 0.5 * math.pi, 25))
_HALVINGS = 40
_MOST_SECANTS = 12

BUHL_FROM = 0.4
"""Axial induction factor above which a windmill's annulus carries more than momentum gives (M.L. Buhl 2005)."""


def pitt_peters(wake_angle: FloatArray, crossflow: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return how the induced velocity leans in a skewed wake, after the first harmonic of a disk's pressure.

    Parameters
    ----------
    wake_angle : numpy.ndarray
        Between wake and shaft [rad], 0 to pi/2 and somewhat beyond.
    crossflow : numpy.ndarray
        Crossflow over tip speed; without effect here.

    Returns
    -------
    along, across : numpy.ndarray
        Gain of the induced velocity at the rim, as a share of its mean: downstream, and where the blade advances.

    Notes
    -----
    D.M. Pitt, D.A. Peters, Theoretical Prediction of Dynamic-Inflow Derivatives, Vertica 5, 1981: 15 pi/32 tan(chi/2).
    From potential flow of a disk with light loading, for every wake angle up to edgewise flow.
    """
    along: FloatArray = 15.0 * math.pi / 32.0 * np.tan(0.5 * wake_angle)
    return along, np.zeros_like(crossflow)


def drees(wake_angle: FloatArray, crossflow: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return how the induced velocity leans in a skewed wake by the vortex theory of Drees.

    Parameters
    ----------
    wake_angle, crossflow : numpy.ndarray
        As for `pitt_peters`.

    Returns
    -------
    along, across : numpy.ndarray
        As for `pitt_peters`.

    Notes
    -----
    J.M. Drees, A Theory of Airflow through Rotors and its Application to some Helicopter Problems, J. Helicopter
    Association of Great Britain 3(2), 1949: 4/3 (1 - cos chi - 1.8 mu^2)/sin chi, and -2 mu across (from memory). Meant
    for helicopters in forward flight, crossflow up to some 0.4 of the tip speed.
    """
    sine = np.sin(wake_angle)
    lean = np.where(sine > 0.0, 1.8 * crossflow**2 / np.where(sine > 0.0, sine, 1.0), 0.0)
    along: FloatArray = 4.0 / 3.0 * (np.tan(0.5 * wake_angle) - lean)
    return along, -2.0 * crossflow


def even(wake_angle: FloatArray, crossflow: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Return no lean at all: every annulus has the same induced velocity all around (H. Glauert 1926).

    Parameters
    ----------
    wake_angle, crossflow : numpy.ndarray
        As for `pitt_peters`.

    Returns
    -------
    along, across : numpy.ndarray
        Zeros.
    """
    return np.zeros_like(wake_angle), np.zeros_like(crossflow)


SkewLaw = Callable[[FloatArray, FloatArray], tuple[FloatArray, FloatArray]]

SKEW_LAWS: dict[str, SkewLaw] = {"pitt-peters": pitt_peters, "drees": drees, "none": even}


@dataclass(frozen=True, eq=False)
class IncidenceSolution:
    """Forces and moments of a right-hand propeller at a list of points, each of shape (n,), over the air's density.

    Parameters
    ----------
    thrust_per_density, torque_per_density : numpy.ndarray
        Along the shaft, forward [m4/s2]; taken from the shaft [m5/s2]. NaN where an annulus did not converge.
    normal_force_per_density, side_force_per_density : numpy.ndarray
        In the plane of the disk, along the crossflow and toward the advancing blade [m4/s2].
    pitching_moment_per_density, yaw_moment_per_density : numpy.ndarray
        About the hub [m5/s2]: nose toward the crossflow's downstream side (up), nose toward the advancing blade.
    stalled_share, outside_polar_share, low_reynolds_share, above_divergence_share : numpy.ndarray
        Shares of the span weighted by r^2 chord, averaged over the azimuth.
    status : numpy.ndarray of int16
        Worst status of the annuli.
    radial : mapping of str to numpy.ndarray, shape (n, n_elements), optional
        Averages over the azimuth by the registry's names, angles in radians and of the mean flow of the annulus,
        loadings per unit density.
    """

    thrust_per_density: FloatArray
    torque_per_density: FloatArray
    normal_force_per_density: FloatArray
    side_force_per_density: FloatArray
    pitching_moment_per_density: FloatArray
    yaw_moment_per_density: FloatArray
    stalled_share: FloatArray
    outside_polar_share: FloatArray
    low_reynolds_share: FloatArray
    above_divergence_share: FloatArray
    status: NDArray[np.int16]
    radial: Mapping[str, FloatArray] | None = None


def solve_incidence(
    elements: BladeElements,
    airspeed: ArrayLike,
    angular_speed: ArrayLike,
    incidence: ArrayLike,
    kinematic_viscosity: ArrayLike,
    speed_of_sound: ArrayLike,
    *,
    azimuths: int = AZIMUTHS,
    skew: str = "pitt-peters",
    radial: bool = False,
) -> IncidenceSolution:
    """Solve a propeller whose shaft is inclined to the stream.

    Parameters
    ----------
    elements : BladeElements
        The blade.
    airspeed : array_like, shape (n,)
        Of the stream [m/s], not negative.
    angular_speed : array_like, shape (n,)
        [rad/s], above zero.
    incidence : array_like, shape (n,)
        Between stream and shaft [rad], 0 to pi/2.
    kinematic_viscosity, speed_of_sound : array_like, shape (n,)
        [m2/s], [m/s].
    azimuths : int
        Blade positions around the disk.
    skew : {"pitt-peters", "drees", "none"}
        How the induced velocity leans in the skewed wake.
    radial : bool
        Keep the averages of each annulus.

    Returns
    -------
    IncidenceSolution

    Raises
    ------
    InputError
        If a value is out of range or not finite, or the law is not known.

    Notes
    -----
    Each annulus has a mean axial velocity w0 and swirl v0, for which the mean force of its elements around the disk is
    4 pi rho r F w0 U0 and 4 pi rho r F v0 U0 with U0 = sqrt((V sin i)^2 + (V cos i + w0)^2): H. Glauert, A General
    Theory of the Autogyro, ARC R&M 1111, 1926, applied annulus by annulus; at no incidence it is the axial solution,
    with which it shares Buhl's relation for windmills and the loss F at the annulus' mean inflow angle. An element sees
    V cos i + w0 (1 + r/R (kx cos psi + ky sin psi)) axially and Omega r - v0 + V sin i sin psi in the plane; the flow
    along the blade does nothing, blades are rigid, and section data are those of steady flow. The root is the one that
    Newton's method finds from the axial solution at V cos i, which is that of least induction.

    Axial flow counts as reversed where it turns back although the crossflow is too weak to carry the wake away.
    """
    if skew not in SKEW_LAWS:
        raise InputError("skew", f"{skew!r}; one of {', '.join(SKEW_LAWS)}")
    given = np.broadcast_arrays(
        *(
            np.atleast_1d(np.asarray(value, dtype=np.float64))
            for value in (airspeed, angular_speed, incidence, kinematic_viscosity, speed_of_sound)
        )
    )
    if not all(np.isfinite(value).all() for value in given) or (given[0] < 0.0).any():
        raise InputError("operating point", "airspeed, rotational speed and air must be finite and not negative")
    if not (given[1] > 0.0).all():
        raise InputError("operating point", "a disk at incidence needs a turning propeller")
    if (given[2] < 0.0).any() or (given[2] > 0.5 * math.pi + 1e-12).any():
        raise InputError("incidence", "from 0 to 90 deg")
    parts = []
    for start in range(0, given[0].size, _BLOCK):
        v, omega, angle, nu, sound = (value[start : start + _BLOCK] for value in given)
        block = _Block(elements, v, omega, angle, nu, sound, azimuths, SKEW_LAWS[skew])
        w, swirl, axial_status = block.start()
        parts.append(block.forces(*block.converge(w, swirl), axial_status, radial))
    joined = {
        field.name: np.concatenate([getattr(part, field.name) for part in parts])
        for field in fields(IncidenceSolution)
        if field.name != "radial"
    }
    along = None
    if radial:
        along = {name: np.concatenate([part.radial[name] for part in parts if part.radial]) for name in _RADIAL_NAMES}
    return IncidenceSolution(**joined, radial=along)


_RADIAL_NAMES = (
    "inflow_angle",
    "angle_of_attack",
    "section_lift_coefficient",
    "section_drag_coefficient",
    "axial_induced_velocity",
    "tangential_induced_velocity",
    "thrust_loading",
    "torque_loading",
)


class _Flow:
    """What the elements of some points see at given induced velocities; arrays (points, azimuths, elements)."""

    def __init__(self, block: _Block, points: NDArray[np.intp], w: FloatArray, v: FloatArray) -> None:
        ratio, radius = block.elements.r_over_R, block.radius
        along, across = (gain[points, None, None] for gain in block.lean)
        lean = 1.0 + ratio * (along * block.cosine + across * block.sine)
        self.axial = block.axial[points, None, None] + w[:, None, :] * lean
        self.around = (
            block.omega[points, None, None] * radius - v[:, None, :] + block.crossflow[points, None, None] * block.sine
        )
        self.speed = np.hypot(self.axial, self.around)
        self.alpha = block.twist - np.arctan2(self.axial, self.around)
        with np.errstate(divide="ignore"):
            self.ln_reynolds = np.log(self.speed * block.chord / block.nu[points, None, None])
        self.mach = self.speed / block.sound[points, None, None]

    def pressure_forces(self, lift: FloatArray, drag: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return W^2 cn and W^2 ct [m2/s2]."""
        return (
            self.speed * (lift * self.around - drag * self.axial),
            self.speed * (lift * self.axial + drag * self.around),
        )


class _Block:
    """Some points solved together. Arrays of points (p,), of annuli (p, n_elements)."""

    def __init__(
        self,
        elements: BladeElements,
        airspeed: FloatArray,
        omega: FloatArray,
        incidence: FloatArray,
        nu: FloatArray,
        sound: FloatArray,
        azimuths: int,
        law: SkewLaw,
    ) -> None:
        columns = elements.columns
        self.elements, self.law = elements, law
        self.radius, self.width = columns[:, k.E_RADIUS], columns[:, k.E_WIDTH]
        self.chord, self.twist = columns[:, k.E_CHORD], columns[:, k.E_TWIST]
        self.omega, self.nu, self.sound = omega, nu, sound
        self.axial = airspeed * np.cos(incidence)
        self.crossflow = airspeed * np.sin(incidence)
        self.axial[incidence >= 0.5 * math.pi - 1e-12] = 0.0
        psi = (np.arange(azimuths) + 0.5) * (2.0 * math.pi / azimuths)
        self.sine, self.cosine = np.sin(psi)[:, None], np.cos(psi)[:, None]
        self.half_blade_chord = 0.5 * elements.blades * self.chord
        undisturbed = airspeed[:, None] ** 2 + (omega[:, None] * self.radius) ** 2
        self.scale = self.half_blade_chord * undisturbed
        self.tip_speed = np.hypot(airspeed, omega * elements.tip_radius)
        # Of the whole disk: an annulus' share of the mean induced velocity.
        self.disk_share = 2.0 * self.radius * self.width / elements.tip_radius**2
        self.lean = (np.zeros_like(airspeed), np.zeros_like(airspeed))

    def start(self) -> tuple[FloatArray, FloatArray, NDArray[np.int16]]:
        """Take the axial solution, and let the crossflow thin its induced velocities at the same forces."""
        axial = solve(self.elements, self.axial, self.omega, self.nu, self.sound, radial=True)
        assert axial.radial is not None
        w = np.nan_to_num(axial.radial["axial_induced_velocity"])
        v = np.nan_to_num(axial.radial["tangential_induced_velocity"])
        through, across = self.axial[:, None], self.crossflow[:, None]
        flux = np.abs(through + w)
        thinned = w
        for _ in range(12):
            thinned = 0.5 * (thinned + w * flux / np.maximum(np.hypot(across, through + thinned), 1e-12))
        crossed = across > 0.0
        thinned = np.where(crossed, thinned, w)
        swirl = np.where(crossed, v * flux / np.maximum(np.hypot(across, through + thinned), 1e-12), v)
        return thinned, swirl, axial.radial["status"].astype(np.int16)

    def residuals(self, points: NDArray[np.intp], w: FloatArray, v: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return element less momentum force of the annuli of some points, as section coefficients."""
        flow = _Flow(self, points, w, v)
        lift, drag = coefficients(self.elements, flow.alpha, flow.ln_reynolds, flow.mach)
        normal, tangential = (force.mean(axis=1) for force in flow.pressure_forces(lift, drag))
        through = self.axial[points, None] + w
        around = self.omega[points, None] * self.radius - v
        flux = np.hypot(self.crossflow[points, None], through)
        sine = np.abs(through) / np.maximum(np.hypot(through, around), 1e-300)
        held = 4.0 * math.pi * self.radius * end_loss_factor(self.elements, sine) * flux
        # Buhl's 8/9 + (4F - 40/9) a + (50/9 - 4F) a^2 is momentum's 4Fa(1 - a) and 50/9 (a - 0.4)^2 for every F.
        beyond = np.maximum(-w - BUHL_FROM * self.axial[points, None], 0.0)
        beyond = np.where(through > 0.0, beyond, 0.0)
        braking = math.pi * self.radius * 50.0 / 9.0 * beyond**2
        scale = self.scale[points]
        return (
            (self.half_blade_chord * normal - held * w + braking) / scale,
            (self.half_blade_chord * tangential - held * v) / scale,
        )

    def lean_of(self, w: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the lean of the induced velocity at its present mean."""
        mean = w @ self.disk_share
        wake_angle = np.arctan2(self.crossflow, np.maximum(self.axial + mean, 0.0))
        crossed = self.crossflow > 0.0
        along, across = self.law(np.where(crossed, wake_angle, 0.0), self.crossflow / self.tip_speed)
        return np.where(crossed, along, 0.0), np.where(crossed, across, 0.0)

    def converge(self, w: FloatArray, v: FloatArray) -> tuple[FloatArray, FloatArray, BoolArray]:
        """Return induced velocities and which annuli converged; the lean follows the mean induced velocity."""
        active = np.arange(w.shape[0])
        done = np.zeros(w.shape, dtype=bool)
        for update in range(_MOST_SKEW_UPDATES):
            lean = self.lean_of(w)
            moved = np.maximum(np.abs(lean[0] - self.lean[0]), np.abs(lean[1] - self.lean[1]))
            self.lean = lean
            if update:
                active = np.flatnonzero(moved > _SKEW_TOLERANCE)
                if active.size == 0:
                    break
            w[active], v[active], done[active] = self.newton(active, w[active], v[active])
            lost = active[~done[active].all(axis=1)]
            if lost.size and update < 3:
                w[lost], v[lost], done[lost] = self.bracketed(lost, w[lost], v[lost], done[lost])
        else:
            done[active] &= (moved[active] < 1e-6)[:, None]
        return w, v, done

    def newton(
        self, points: NDArray[np.intp], w: FloatArray, v: FloatArray
    ) -> tuple[FloatArray, FloatArray, BoolArray]:
        """Solve both equations of each annulus, slopes by differences and then by Broyden's update."""
        w, v = w.copy(), v.copy()
        first, second = self.residuals(points, w, v)
        error = np.hypot(first, second)
        done = error < _TOLERANCE
        rows = np.flatnonzero(~done.all(axis=1))
        jacobian = np.zeros((2, 2, *w.shape))
        damping = np.ones(w.shape)
        stale = np.ones(w.shape, dtype=bool)
        for _ in range(_MOST_STEPS):
            if rows.size == 0:
                break
            here = points[rows]
            renew = rows[(stale[rows] & ~done[rows]).any(axis=1)]
            if renew.size:
                fresh = stale[renew] & ~done[renew]
                slopes = self.slopes(points[renew], w[renew], v[renew], first[renew], second[renew])
                jacobian[:, :, renew] = np.where(fresh, slopes, jacobian[:, :, renew])
                stale[renew] &= ~fresh
            (a, b), (c, d) = jacobian[:, :, rows]
            determinant = a * d - b * c
            determinant = np.where(np.abs(determinant) > 1e-300, determinant, 1e-300)
            limit = _LARGEST_STEP * self.tip_speed[here, None]
            step_w = np.clip(-(d * first[rows] - b * second[rows]) / determinant, -limit, limit)
            step_v = np.clip(-(a * second[rows] - c * first[rows]) / determinant, -limit, limit)
            moving = np.where(done[rows], 0.0, damping[rows])
            step_w, step_v = moving * step_w, moving * step_v
            next_first, next_second = self.residuals(here, w[rows] + step_w, v[rows] + step_v)
            next_error = np.hypot(next_first, next_second)
            better = (next_error < error[rows]) & ~done[rows]
            # Broyden: the least change of the slopes that explains the step.
            square = np.maximum(step_w**2 + step_v**2, 1e-300)
            for line, change in ((0, next_first - first[rows]), (1, next_second - second[rows])):
                missed = change - jacobian[line, 0, rows] * step_w - jacobian[line, 1, rows] * step_v
                jacobian[line, 0, rows] += np.where(done[rows], 0.0, missed * step_w / square)
                jacobian[line, 1, rows] += np.where(done[rows], 0.0, missed * step_v / square)
            slow = next_error > 0.3 * error[rows]
            stale[rows] |= slow & ~done[rows]
            damping[rows] = np.where(better, np.minimum(2.0 * damping[rows], 1.0), 0.5 * damping[rows])
            w[rows] = np.where(better, w[rows] + step_w, w[rows])
            v[rows] = np.where(better, v[rows] + step_v, v[rows])
            first[rows] = np.where(better, next_first, first[rows])
            second[rows] = np.where(better, next_second, second[rows])
            error[rows] = np.where(better, next_error, error[rows])
            done[rows] |= error[rows] < _TOLERANCE
            alive = (~done[rows] & (damping[rows] > 1e-6)).any(axis=1)
            rows = rows[alive]
        return w, v, done

    def slopes(
        self, points: NDArray[np.intp], w: FloatArray, v: FloatArray, first: FloatArray, second: FloatArray
    ) -> FloatArray:
        """Return the slopes of both residuals with both velocities, shape (2, 2, points, elements)."""
        step = _SLOPE_STEP * self.tip_speed[points, None]
        with_w = self.residuals(points, w + step, v)
        with_v = self.residuals(points, w, v + step)
        return np.array(
            [
                [(with_w[0] - first) / step, (with_v[0] - first) / step],
                [(with_w[1] - second) / step, (with_v[1] - second) / step],
            ]
        )

    def bracketed(
        self, points: NDArray[np.intp], w: FloatArray, v: FloatArray, done: BoolArray
    ) -> tuple[FloatArray, FloatArray, BoolArray]:
        """Search the annuli that Newton's method left, outward from no induction; swirl follows at every trial."""
        no_induction = np.where(done, w, 0.0)
        reach = np.where(done, 0.0, self.tip_speed[points, None])
        swirl = np.where(done, v, 0.0)
        at_rest, swirl = self.with_swirl(points, no_induction, swirl)
        outward = np.sign(at_rest)
        low, low_swirl = no_induction.copy(), swirl.copy()
        high = np.full(w.shape, np.nan)
        previous = no_induction
        for share in _SCAN[1:]:
            trial = no_induction + outward * share * reach
            value, swirl = self.with_swirl(points, trial, swirl)
            crossed = np.isnan(high) & (np.sign(value) != outward) & ~done
            low, high = np.where(crossed, previous, low), np.where(crossed, trial, high)
            low_swirl = np.where(crossed, swirl, low_swirl)
            previous = trial
        searched = np.isfinite(high)
        high = np.where(searched, high, low)
        swirl = low_swirl
        for _ in range(_HALVINGS):
            middle = 0.5 * (low + high)
            value, swirl = self.with_swirl(points, middle, swirl)
            before = np.sign(value) == outward
            low, high = np.where(before, middle, low), np.where(before, high, middle)
        found_w = np.where(searched, 0.5 * (low + high), w)
        found_v = np.where(searched, swirl, v)
        w, v, done = self.newton(points, found_w, found_v)
        return w, v, done | (np.hypot(*self.residuals(points, w, v)) < _SEARCHED_TOLERANCE)

    def with_swirl(self, points: NDArray[np.intp], w: FloatArray, v: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the axial residual once the swirl has followed, by secants, and the swirl."""
        through = self.axial[points, None] + w
        flux = np.maximum(np.hypot(self.crossflow[points, None], through), 1e-3 * self.tip_speed[points, None])
        slope = -4.0 * math.pi * self.radius * flux / self.scale[points]
        limit = 0.1 * self.omega[points, None] * self.radius
        first, second = self.residuals(points, w, v)
        for _ in range(_MOST_SECANTS):
            if (np.abs(second) < 0.1 * _SEARCHED_TOLERANCE).all():
                break
            step = np.clip(-second / slope, -limit, limit)
            first, after = self.residuals(points, w, v + step)
            v = v + step
            # The momentum of the swirl grows with it: a secant that says otherwise is not believed.
            taken = np.where(np.abs(step) > 0.0, (after - second) / np.where(step == 0.0, 1.0, step), slope)
            slope = np.where(taken < 0.2 * slope, np.maximum(taken, 5.0 * slope), slope)
            second = after
        return first, v

    def forces(
        self, w: FloatArray, v: FloatArray, done: BoolArray, start: NDArray[np.int16], radial: bool
    ) -> IncidenceSolution:
        """Add up the elements around the disk."""
        elements = self.elements
        points = np.arange(w.shape[0])
        flow = _Flow(self, points, w, v)
        section = section_forces(elements, flow.alpha, flow.ln_reynolds, flow.mach)
        normal, tangential = (
            self.half_blade_chord * force for force in flow.pressure_forces(section.lift, section.drag)
        )
        outside = np.maximum(section.outside, elements.columns[:, k.E_OUTSIDE])
        weight = elements.span_weight

        status = np.where(start == STATUS_SEVERAL_ROOTS, STATUS_SEVERAL_ROOTS, STATUS_CONVERGED)
        turned_back = (self.axial[:, None] + w < 0.0) & (self.crossflow < self.axial)[:, None]
        status[turned_back] = STATUS_REVERSED_FLOW
        status[~done] = STATUS_NOT_CONVERGED
        worst = status.max(axis=1).astype(np.int16)
        known = np.where(worst == STATUS_NOT_CONVERGED, np.nan, 1.0)

        def added(loading: FloatArray) -> FloatArray:
            total: FloatArray = known * (loading.mean(axis=1) @ self.width)
            return total

        along = None
        if radial:
            inflow = np.arctan2(self.axial[:, None] + w, self.omega[:, None] * self.radius - v)
            values = (
                inflow,
                self.twist - inflow,
                section.lift.mean(axis=1),
                section.drag.mean(axis=1),
                w,
                v,
                normal.mean(axis=1),
                self.radius * tangential.mean(axis=1),
            )
            along = {name: np.where(done, value, np.nan) for name, value in zip(_RADIAL_NAMES, values, strict=True)}
        return IncidenceSolution(
            thrust_per_density=added(normal),
            torque_per_density=added(self.radius * tangential),
            normal_force_per_density=added(tangential * self.sine),
            side_force_per_density=added(-tangential * self.cosine),
            pitching_moment_per_density=added(-self.radius * self.cosine * normal),
            yaw_moment_per_density=added(-self.radius * self.sine * normal),
            stalled_share=section.stalled.mean(axis=1) @ weight,
            outside_polar_share=outside.mean(axis=1) @ weight,
            low_reynolds_share=section.low_reynolds.mean(axis=1) @ weight,
            above_divergence_share=section.diverged.mean(axis=1) @ weight,
            status=worst,
            radial=along,
        )
