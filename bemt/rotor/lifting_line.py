"""Helical lifting line: each blade a line of bound vortices, its wake regular helices that keep their radius and pitch.

The finite number of blades is in the wake itself, not in a factor fitted to an optimum loading; what the wake does
downstream, contracting and rolling up, is not in it.
"""

from __future__ import annotations

from dataclasses import fields

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.quantities.registry import STATUS_CONVERGED, STATUS_NOT_CONVERGED, STATUS_REVERSED_FLOW, STATUS_SEVERAL_ROOTS
from bemt.rotor import kernels as k
from bemt.rotor.element_polars import coefficients, section_forces
from bemt.rotor.elements import BladeElements
from bemt.rotor.helical_vortex import closed_form
from bemt.rotor.solution import RotorSolution, solve

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

LEAST_WAKE_RADIUS = 0.9
"""Radius of the far wake over that of the tip, by momentum, below which the model should not be trusted."""

LARGEST_WAKE_RADIUS = 1.0 / LEAST_WAKE_RADIUS
"""The same for a windmill's wake, which widens."""

_BLOCK = 32  # points solved together: their matrices stay near the processor
_TOLERANCE = 1e-9  # of the circulation, over tip radius and speed
_PITCH_TOLERANCE = 1e-6
_MOST_ROUNDS = 40
_MOST_STEPS = 60
_MOST_FAILURES = 2  # of Newton's steps, for one point
_FIRST_DELAY, _LEAST_DELAY = 2.0, 0.02
_SHORTEST_STEP = 0.01
_STALL_MARGIN = np.radians(2.0)
_STALL_REACHES = (0.35, 0.7, 1.4)  # of the chord, standard deviation of the average: tried one after another
_LEAST_PITCH, _LARGEST_PITCH = 0.005, 100.0  # of the wake, over the tip radius
_SLOPE_STEP = 1e-4  # [rad]
_LARGEST_MACH = 0.99  # on the way only


def wake_radius(elements: BladeElements, airspeed: ArrayLike, thrust_per_density: ArrayLike) -> FloatArray:
    """Radius of the far wake over that of the tip, by the momentum of the whole disk.

    Parameters
    ----------
    elements : BladeElements
    airspeed : array_like, shape (n,)
        [m/s].
    thrust_per_density : array_like, shape (n,)
        T/rho [m4/s2].

    Returns
    -------
    numpy.ndarray, shape (n,)
        sqrt((V + w)/(V + 2 w)) with the induced velocity w from T = 2 rho A w (V + w): sqrt(1/2) standing still,
        1 without thrust, infinite for a windmill beyond momentum theory.
    """
    airspeed = np.asarray(airspeed, dtype=np.float64)
    load = np.asarray(thrust_per_density) / (2.0 * np.pi * elements.tip_radius**2)
    far = np.sqrt(np.maximum(airspeed**2 + 4.0 * load, 0.0))  # V + 2 w
    with np.errstate(divide="ignore", invalid="ignore"):
        found: FloatArray = np.sqrt(np.where(far > 0.0, 0.5 * (airspeed + far) / far, np.inf))
    return found


def outside_inflow_law(elements: BladeElements, airspeed: ArrayLike, thrust_per_density: ArrayLike) -> BoolArray:
    """Say where a helical lifting line should not be trusted, since the true wake changes its radius too much.

    The vortices of the model keep the radius and the pitch they have at the blade. The real wake narrows towards
    `wake_radius`, half of that within 0.6 of a radius (as the velocity on the axis of a vortex tube grows), where its
    first turn is. A tenth of the radius is as much as the part of the blade over which the loading falls to nothing at
    the tip, so that more moves the tip's loss itself. The induced velocity is then 0.31 of the airspeed, the thrust 1.6
    of dynamic pressure times disk area, which a usual propeller has at an advance ratio of 0.3 to 0.5.

    Parameters
    ----------
    elements : BladeElements
    airspeed : array_like, shape (n,)
        [m/s].
    thrust_per_density : array_like, shape (n,)
        T/rho [m4/s2]; NaN counts as outside.

    Returns
    -------
    numpy.ndarray of bool, shape (n,)
    """
    radius = wake_radius(elements, airspeed, thrust_per_density)
    return ~((radius >= LEAST_WAKE_RADIUS) & (radius <= LARGEST_WAKE_RADIUS))


def solve_helix(
    elements: BladeElements,
    airspeed: ArrayLike,
    angular_speed: ArrayLike,
    kinematic_viscosity: ArrayLike,
    speed_of_sound: ArrayLike,
    *,
    radial: bool = False,
) -> RotorSolution:
    """Solve the lifting line at a list of operating points.

    Vortices leave at the edges of the blade elements, at the root too: there a bare blade end is taken, without a hub
    that would close it. Each vortex has the pitch r tan(phi) of the flow where it leaves. End loss follows from the
    wake, so the elements' own is not used; their section data are. Where sections are about to stall they see induced
    velocities averaged over a third of a chord along the span, over more where there is no solution with that.

    Parameters
    ----------
    elements : BladeElements
        The blade; the elements must follow one another from root to tip.
    airspeed : array_like, shape (n,)
        Along the shaft, at the disk without the propeller [m/s], not negative.
    angular_speed : array_like, shape (n,)
        [rad/s], not negative; not 0 together with the airspeed.
    kinematic_viscosity, speed_of_sound : array_like, shape (n,)
        [m2/s], [m/s].
    radial : bool
        Keep what each element does.

    Returns
    -------
    RotorSolution
        Status 2 where the momentum solution that it starts from has several roots; 3 where the flow turns back
        through the disk somewhere, the helices there being drawn with a least pitch; 4, and NaN everywhere, where no
        solution was reached: mostly where the flow nearly stands still, well inside what
        `outside_inflow_law` marks. What that marks is solved all the same where it can be. No `end_loss`,
        `high_induction` and `evaluations` along the blade (NaN).

    Raises
    ------
    InputError
        If a value is out of range or not finite.

    Notes
    -----
    With ever more blades of the same total chord it comes to the momentum solution without end loss, but for what the
    wake's changing pitch along the span makes of it (1 %). 40 elements are within 0.1 % of 80 in thrust and torque. No
    contraction, no roll-up.

    References
    ----------
    H.W. Lerbs, "Moderately loaded propellers with a finite number of blades and an arbitrary distribution of
    circulation", Trans. SNAME 60, 1952.
    """
    start = solve(elements, airspeed, angular_speed, kinematic_viscosity, speed_of_sound, radial=True)
    assert start.radial is not None
    count = start.status.size
    points = [
        np.broadcast_to(np.asarray(value, dtype=np.float64), (count,))
        for value in (airspeed, angular_speed, kinematic_viscosity, speed_of_sound)
    ]
    parts = []
    for begin in range(0, count, _BLOCK):
        part = slice(begin, begin + _BLOCK)
        line = _LiftingLine(elements, *(value[part] for value in points))
        line.solve(start.radial["inflow_angle"][part], start.radial["speed"][part])
        parts.append(line.solution(start.status[part]))
    along = {name: np.concatenate([part.radial[name] for part in parts if part.radial]) for name in start.radial}
    names = [item.name for item in fields(RotorSolution) if item.name != "radial"]
    return RotorSolution(
        **{name: np.concatenate([getattr(part, name) for part in parts]) for name in names},
        radial=along if radial else None,
    )


class _LiftingLine:
    """The lines of a block of points: circulation at the elements, pitch of the wake at their edges."""

    def __init__(
        self,
        elements: BladeElements,
        airspeed: FloatArray,
        angular_speed: FloatArray,
        kinematic_viscosity: FloatArray,
        speed_of_sound: FloatArray,
    ) -> None:
        columns = elements.columns
        self.elements = elements
        self.radius, self.width = columns[:, k.E_RADIUS], columns[:, k.E_WIDTH]
        self.chord, self.twist = columns[:, k.E_CHORD], columns[:, k.E_TWIST]
        self.edges = elements.tip_radius - np.append(np.cumsum(self.width[::-1])[::-1], 0.0)
        # Pitch at the edges from that at the middles, held at both ends.
        self.to_edges = np.array([np.interp(self.edges, self.radius, unit) for unit in np.eye(self.radius.size)])
        self.airspeed, self.turning = airspeed[:, None], angular_speed[:, None] * self.radius
        self.inverse_sound = 1.0 / speed_of_sound[:, None]
        self.re_per_speed = self.chord / kinematic_viscosity[:, None]
        self.undisturbed = np.hypot(self.airspeed, self.turning)

    def solve(self, inflow_angle: FloatArray, speed: FloatArray) -> None:
        """Solve all points, beginning at a solution by other means."""
        unknown = ~np.isfinite(inflow_angle * speed)
        phi = np.where(unknown, np.arctan2(self.airspeed, self.turning), inflow_angle)
        speed = np.where(unknown, self.undisturbed, speed)
        axial, around = speed * np.sin(phi), speed * np.cos(phi)
        self.axial, self.around, self.circulation = axial.copy(), around.copy(), np.zeros(phi.shape)
        self.pitch = np.empty((phi.shape[0], self.edges.size))
        self.done = np.zeros(phi.shape[0], dtype=bool)
        forward = (axial >= 0.0).all(axis=1)
        rows = np.arange(self.done.size)
        for reach in _STALL_REACHES:
            self.axial[rows], self.around[rows] = axial[rows], around[rows]
            self.converge(rows, self.as_sections_see(rows, reach))
            rows = np.flatnonzero(~self.done | (forward & (self.axial < 0.0).any(axis=1)))
            if rows.size == 0:
                break

    def as_sections_see(self, rows: NDArray[np.intp], reach: float) -> FloatArray:
        """Return what averages induced velocities along the span where sections are about to stall.

        Section data say nothing about lengths along the span below a chord. Falling lift would amplify such waves and
        leave any number of saw-toothed solutions, or none. An average over a third of the chord to each side damps them
        unless lift falls by more than 5/rad; steeper stalls need a longer reach.
        """
        axial, around = self.axial[rows], self.around[rows]
        alpha, ln_reynolds, mach = self.section_state(rows, axial, around)
        stalled = np.zeros(alpha.shape, dtype=bool)
        for margin in (-_STALL_MARGIN, _STALL_MARGIN):
            stalled |= section_forces(self.elements, alpha + margin, ln_reynolds, mach).stalled
        distance = (self.radius - self.radius[:, None]) / (reach * self.chord[:, None])
        average = np.exp(-0.5 * distance**2) * self.width
        average /= average.sum(axis=1, keepdims=True)
        found: FloatArray = np.where(stalled[..., None], average, np.eye(self.radius.size))
        return found

    def section_state(
        self, rows: slice | NDArray[np.intp], axial: FloatArray, around: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return angle of attack, ln Re and Mach number in a flow."""
        speed = np.maximum(np.hypot(axial, around), 1e-9)
        mach = np.minimum(speed * self.inverse_sound[rows], _LARGEST_MACH)
        return self.twist - np.arctan2(axial, around), np.log(speed * self.re_per_speed[rows]), mach

    def wake_pitch(self, rows: slice | NDArray[np.intp]) -> FloatArray:
        """Return the advance per radian of the flow at the edges, ln of it bounded, from the flow at the middles."""
        least, most = _LEAST_PITCH * self.elements.tip_radius, _LARGEST_PITCH * self.elements.tip_radius
        axial, around = self.axial[rows], self.around[rows]
        with np.errstate(divide="ignore", invalid="ignore"):
            pitch = np.where(around > 0.0, self.radius * axial / around, most)
        found: FloatArray = np.clip(pitch, least, most) @ self.to_edges
        return found

    def circulation_wanted(
        self, rows: slice | NDArray[np.intp], axial: FloatArray, around: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return the circulation of the sections in a flow, and its slopes with both velocities."""
        alpha, ln_reynolds, mach = self.section_state(rows, axial, around)
        speed = np.maximum(np.hypot(axial, around), 1e-9)
        lift = coefficients(self.elements, alpha, ln_reynolds, mach)[0]
        above = coefficients(self.elements, alpha + _SLOPE_STEP, ln_reynolds, mach)[0]
        below = coefficients(self.elements, alpha - _SLOPE_STEP, ln_reynolds, mach)[0]
        slope = (above - below) / (2.0 * _SLOPE_STEP)
        half = 0.5 * self.chord
        sine, cosine = axial / speed, around / speed
        # d phi = (cos dU_a - sin dU_t) / W.
        return half * speed * lift, half * (lift * sine - slope * cosine), half * (lift * cosine + slope * sine)

    def converge(self, rows: NDArray[np.intp], seen: FloatArray) -> None:
        """Let the circulation and the wake's pitch follow one another, from the present flow on."""
        share, last, failures = np.ones(rows.size), np.full(rows.size, np.inf), np.zeros(rows.size, dtype=np.int64)
        self.pitch[rows] = self.wake_pitch(rows)
        for number in range(_MOST_ROUNDS):
            by_axial, by_around = self.influence(rows, seen)
            if number == 0:
                self.circulation[rows] = self.linear_start(rows, by_axial, by_around)
            solved = self.newton(rows, by_axial, by_around)
            pitch = self.wake_pitch(rows)
            moved = np.abs(pitch / self.pitch[rows] - 1.0).max(axis=1)
            self.done[rows] = solved & (moved < _PITCH_TOLERANCE)
            share = np.where(moved > 0.7 * last, np.maximum(0.5 * share, 0.1), share)
            failures += ~solved
            going = ~self.done[rows] & (failures <= _MOST_FAILURES)
            rows, share, last, failures = rows[going], share[going], moved[going], failures[going]
            seen = seen[going]
            if rows.size == 0:
                break
            self.pitch[rows] += share[:, None] * (pitch[going] - self.pitch[rows])

    def linear_start(self, rows: NDArray[np.intp], by_axial: FloatArray, by_around: FloatArray) -> FloatArray:
        """Solve sections that are straight lines around the flow they start in, as no flow can run away then."""
        axial, around = self.axial[rows], self.around[rows]
        wanted, slope_axial, slope_around = self.circulation_wanted(rows, axial, around)
        moved = slope_axial * (self.airspeed[rows] - axial) + slope_around * (self.turning[rows] - around)
        matrix = self.jacobian(by_axial, by_around, slope_axial, slope_around)
        found = np.linalg.solve(matrix, (wanted + moved)[..., None])[..., 0]
        return np.asarray(found, dtype=np.float64)

    def jacobian(
        self, by_axial: FloatArray, by_around: FloatArray, slope_axial: FloatArray, slope_around: FloatArray
    ) -> FloatArray:
        """Return the slopes of the circulation less that of the sections, with the circulation."""
        found: FloatArray = (
            np.eye(self.radius.size) - slope_axial[..., None] * by_axial - slope_around[..., None] * by_around
        )
        return found

    def newton(self, rows: NDArray[np.intp], by_axial: FloatArray, by_around: FloatArray) -> BoolArray:
        """Solve the circulation for a given wake, and say where it was reached.

        Newton's steps as long as they bring something. Where the corners of a polar stop them, the circulation follows
        what the sections want with a delay, as if in time, until the steps are good again.
        """
        scale = self.elements.tip_radius * self.undisturbed[rows, -1:]
        circulation = self.circulation[rows]

        def look(at: NDArray[np.intp], trial: FloatArray) -> tuple[FloatArray, ...]:
            axial = self.airspeed[rows[at]] + (by_axial[at] @ trial[..., None])[..., 0]
            around = self.turning[rows[at]] + (by_around[at] @ trial[..., None])[..., 0]
            wanted, slope_axial, slope_around = self.circulation_wanted(rows[at], axial, around)
            missing = wanted - trial
            return axial, around, slope_axial, slope_around, missing, np.linalg.norm(missing / scale[at], axis=1)

        state = look(np.arange(rows.size), circulation)
        *_, slope_axial, slope_around, missing, error = state
        delay = np.zeros(rows.size)
        for _ in range(_MOST_STEPS):
            here = np.flatnonzero(error > _TOLERANCE)
            if here.size == 0:
                break
            matrix = self.jacobian(by_axial[here], by_around[here], slope_axial[here], slope_around[here])
            matrix += delay[here, None, None] * np.eye(self.radius.size)
            step = np.linalg.solve(matrix, missing[here, :, None])[..., 0]
            before, marching = error[here], delay[here] > 0.0
            trying, length = np.arange(here.size), 1.0
            while trying.size and length > _SHORTEST_STEP:
                at = here[trying]
                trial = circulation[at] + length * step[trying]
                found = look(at, trial)
                better = (found[-1] < error[at] * (1.0 - 0.1 * length)) | marching[trying]
                circulation[at[better]] = trial[better]
                for kept, new in zip(state, found, strict=True):
                    kept[at[better]] = new[better]
                trying, length = trying[~better], 0.5 * length
            delay[here] *= np.clip(error[here] / before, 0.5, 2.0)
            delay[delay < _LEAST_DELAY] = 0.0
            delay[here[trying]] = _FIRST_DELAY
        self.circulation[rows], self.axial[rows], self.around[rows] = circulation, *state[:2]
        reached: BoolArray = error <= _TOLERANCE
        return reached

    def influence(self, rows: NDArray[np.intp], seen: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the velocities that sections see by circulation at the elements, each (points, middles, elements)."""
        pitch = self.pitch[rows, None, :]
        axial, around = closed_form(self.elements.blades, self.radius[:, None], self.edges, pitch)
        return seen @ np.diff(axial), seen @ np.diff(around)

    def solution(self, start: NDArray[np.int16]) -> RotorSolution:
        """Add up the elements of every point."""
        elements, blades = self.elements, self.elements.blades
        speed, phi = np.hypot(self.axial, self.around), np.arctan2(self.axial, self.around)
        section = section_forces(elements, *self.section_state(slice(None), self.axial, self.around))
        pressure = 0.5 * blades * self.chord * speed
        thrust = pressure * (section.lift * self.around - section.drag * self.axial)
        torque = pressure * (section.lift * self.axial + section.drag * self.around) * self.radius
        outside = np.maximum(section.outside, elements.columns[:, k.E_OUTSIDE])
        weight = elements.span_weight
        status = np.where(start == STATUS_SEVERAL_ROOTS, STATUS_SEVERAL_ROOTS, STATUS_CONVERGED).astype(np.int16)
        status[(self.axial < 0.0).any(axis=1)] = STATUS_REVERSED_FLOW
        status[~self.done] = STATUS_NOT_CONVERGED
        known = np.where(self.done, 1.0, np.nan)
        nothing = np.full(speed.shape, np.nan)
        along = {
            "inflow_angle": phi,
            "angle_of_attack": self.twist - phi,
            "section_lift_coefficient": section.lift,
            "section_drag_coefficient": section.drag,
            "axial_induced_velocity": self.axial - self.airspeed,
            "tangential_induced_velocity": self.turning - self.around,
            "thrust_loading": thrust,
            "torque_loading": torque,
            "speed": speed,
            "end_loss": nothing,
            "high_induction": nothing,
            "status": np.broadcast_to(status[:, None], speed.shape).astype(np.float64),
            "evaluations": nothing,
        }
        for name in along.keys() - {"status"}:
            along[name] = along[name] * known[:, None]
        return RotorSolution(
            thrust_per_density=known * (thrust @ self.width),
            torque_per_density=known * (torque @ self.width),
            stalled_share=known * (section.stalled @ weight),
            outside_polar_share=known * (outside @ weight),
            low_reynolds_share=known * (section.low_reynolds @ weight),
            above_divergence_share=known * (section.diverged @ weight),
            status=status,
            radial=along,
        )
