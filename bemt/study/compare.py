"""Judging the prediction of a propeller by measured points: how far off, in which way, and what would mend it.

Nothing found here is written back: a comparison reports, it does not correct.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields, replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from bemt.blade.geometry import Propeller
from bemt.case.readings import Readings
from bemt.errors import InputError
from bemt.quantities.registry import STATUS_NOT_CONVERGED
from bemt.rotor import kernels
from bemt.rotor.elements import BladeElements, blade_elements
from bemt.rotor.lifting_line import outside_inflow_law, solve_helix
from bemt.rotor.model import Model
from bemt.rotor.solution import RotorSolution, solve
from bemt.table.coefficients import efficiency

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

REMEDIES = ("blade_angle", "drag_scale", "stall_strength")

SAME_RPM = 0.03
"""Moving rows whose rpm differ by less than this share belong to one run."""

FEWEST_ROWS_OF_A_RUN = 4
"""A run with fewer rows gives no peak efficiency and no advance ratio of zero thrust."""

LARGEST_TURN = math.radians(6.0)
"""The blade angle that would serve best is looked for within this much of the given one."""

DRAG_SCALES = (0.5, 2.0)
"""The factor on section drag that would serve best is looked for within these."""

WORTH_SHARE, WORTH_POINTS = 0.2, 0.003
"""A remedy is worth saying if it takes at least this share off the error, and this much of the static value."""

_STEPS = {"blade_angle": 9, "drag_scale": 5, "stall_strength": 5}
_TOLERANCES = {"blade_angle": math.radians(0.02), "drag_scale": 0.005, "stall_strength": 0.01}
_SMALL_TURN = math.radians(0.25)
_LINE_POINTS = 41
_BEYOND = 1.25  # how far a predicted line runs past the largest measured advance ratio
_NEAR_PEAK = 0.93  # of the largest measured efficiency: rows that shape the top


@dataclass(frozen=True, eq=False)
class Points:
    """What a propeller does at a list of points.

    Parameters
    ----------
    thrust_coefficient, power_coefficient, efficiency : numpy.ndarray, shape (n,)
        CT, CP and efficiency; NaN where there is none.
    stalled_share, outside_polar_share, low_reynolds_share : numpy.ndarray, shape (n,)
        Shares of the span, weighted by r^2 chord; NaN for measured points.
    status : numpy.ndarray of int16, shape (n,)
        By the codes of the registry; 0 for measured points.
    """

    thrust_coefficient: FloatArray
    power_coefficient: FloatArray
    efficiency: FloatArray
    stalled_share: FloatArray
    outside_polar_share: FloatArray
    low_reynolds_share: FloatArray
    status: NDArray[np.int16]


@dataclass(frozen=True)
class Landmarks:
    """Where efficiency is largest and where thrust ends.

    Parameters
    ----------
    peak_efficiency, peak_advance_ratio, zero_thrust_advance_ratio : float
        NaN where the points do not bracket it.
    """

    peak_efficiency: float = math.nan
    peak_advance_ratio: float = math.nan
    zero_thrust_advance_ratio: float = math.nan


@dataclass(frozen=True, eq=False)
class Run:
    """The moving rows at one rpm, and the predicted lines through them.

    Parameters
    ----------
    rpm : float
        Mean of the rows.
    rows : numpy.ndarray of int, shape (n_rows,)
        Of the readings, by ascending advance ratio.
    advance_ratio : numpy.ndarray, shape (n_line,)
        Of the lines.
    line : Points
        Predicted over `advance_ratio`, at the mean rpm and air of the rows.
    measured, predicted : Landmarks
        Of the rows and of the lines.
    """

    rpm: float
    rows: NDArray[np.intp]
    advance_ratio: FloatArray
    line: Points
    measured: Landmarks
    predicted: Landmarks


@dataclass(frozen=True)
class Errors:
    """Predicted less measured, coefficients as shares of their static value; NaN where there is nothing to judge.

    Parameters
    ----------
    thrust_bias, thrust_rms, power_bias, power_rms : float
        Mean and root mean square over the moving rows, of CT and CP.
    static_thrust, static_power : float
        Mean over the static rows that make the static value.
    peak_efficiency, zero_thrust : float
        Mean over the runs that have both a measured and a predicted one, of efficiency and of J.
    """

    thrust_bias: float
    thrust_rms: float
    power_bias: float
    power_rms: float
    static_thrust: float
    static_power: float
    peak_efficiency: float
    zero_thrust: float


@dataclass(frozen=True)
class Remedy:
    """One number of the whole blade, chosen to serve the readings best, and what it would leave.

    Parameters
    ----------
    quantity : {"blade_angle", "drag_scale", "stall_strength"}
        The number that was searched. With the last two the blade angle is fitted anew.
    given, best : float
        As it is, and as it would serve best; a turn of the blade [rad] is given as 0.
    angle : float
        Turn of the blade that goes with it [rad].
    at_limit : bool
        Whether the best value lies at the end of the range searched.
    errors : Errors
        With the best value.
    gain : float
        By how much the error that was made least falls, as a share of the static value.
    worth_saying : bool
        Whether the gain is large enough to be named as what is wrong.
    """

    quantity: str
    given: float
    best: float
    angle: float
    at_limit: bool
    errors: Errors
    gain: float
    worth_saying: bool


@dataclass(frozen=True, eq=False)
class Comparison:
    """Measured points of a propeller beside what is predicted for them.

    Parameters
    ----------
    readings : Readings
        As measured.
    advance_ratio : numpy.ndarray, shape (n,)
        V/(nD) of each row.
    measured, predicted : Points
        Of each row.
    moving : numpy.ndarray of bool, shape (n,)
        Rows with airspeed.
    static : numpy.ndarray of bool, shape (n,)
        Rows that make the static value: those without airspeed above a third of their highest rpm.
    static_thrust, static_power : float
        CT and CP that errors are shares of.
    runs : tuple of Run
        Moving rows by rpm, ascending.
    static_rpm : numpy.ndarray, shape (n_line,) or (0,)
        Of the static line.
    static_line : Points
        Predicted standing still over `static_rpm`.
    errors : Errors
        Of the prediction as it is.
    remedies : tuple of Remedy
        Blade angle first, then drag and stall on top of it; empty where no row could be judged.
    notes : tuple of str
        What a user must be told.
    """

    readings: Readings
    advance_ratio: FloatArray
    measured: Points
    predicted: Points
    moving: BoolArray
    static: BoolArray
    static_thrust: float
    static_power: float
    runs: tuple[Run, ...]
    static_rpm: FloatArray
    static_line: Points
    errors: Errors
    remedies: tuple[Remedy, ...]
    notes: tuple[str, ...]

    @property
    def still(self) -> BoolArray:
        """Rows without airspeed, shape (n,)."""
        return ~self.moving

    @property
    def unconverged(self) -> int:
        """How many rows have no prediction because it did not converge."""
        return int((self.predicted.status == STATUS_NOT_CONVERGED).sum())


def compare(
    propeller: Propeller, model: Model, readings: Readings, *, remedies: Sequence[str] = REMEDIES
) -> Comparison:
    """Predict every measured point at its own rpm, airspeed and air, and judge the difference.

    Parameters
    ----------
    propeller : Propeller
        As described.
    model : Model
        Settings of the solution.
    readings : Readings
        With thrust, torque or both.
    remedies : sequence of {"blade_angle", "drag_scale", "stall_strength"}
        Numbers of the whole blade to search; the blade angle is always among them.

    Returns
    -------
    Comparison

    Raises
    ------
    InputError
        If the readings have neither thrust nor torque, or the propeller and its section data do not fit each other.

    Notes
    -----
    The static value is the mean of CT and CP over the static rows above a third of the highest static rpm; without
    static rows it is the largest measured magnitude. The measured peak efficiency of a run is the top of the parabola
    through the rows near it (least squares), the measured advance ratio of zero thrust lies on the straight line
    between the two rows that bracket it.

    The best blade angle makes the sum of the squared errors of CT and CP over the moving rows least, or over the
    static rows where none moves. Drag and stall are then searched one at a time, each with the angle that serves the
    moving rows best beside it; what counts there is the mean square over the moving rows and that over the static
    rows, where stall shows.
    """
    if readings.thrust is None and readings.torque is None:
        raise InputError("thrust, torque", f"{readings.source} has neither, so there is nothing to compare")
    judge = _Judge(propeller, readings, model.inflow)
    elements = blade_elements(propeller, model)
    predicted, runs = judge.predict(elements), judge.runs(elements)
    judged = int(np.isfinite(judge.residuals(elements, judge.moving | judge.static)).sum())
    static_rpm = judge.static_rpm()
    at = judge.static if static_rpm.size else judge.moving
    return Comparison(
        readings=readings,
        advance_ratio=judge.advance_ratio,
        measured=judge.measured,
        predicted=predicted,
        moving=judge.moving,
        static=judge.static,
        static_thrust=judge.scales[0],
        static_power=judge.scales[1],
        runs=runs,
        static_rpm=static_rpm,
        static_line=judge.points(elements, np.zeros(static_rpm.size), static_rpm, at),
        errors=judge.errors(predicted, runs),
        remedies=judge.remedies(model, elements, remedies) if judged else (),
        notes=(*readings.notes, *judge.notes(predicted)),
    )


def turned(elements: BladeElements, angle: float) -> BladeElements:
    """Return a blade with all of its elements turned.

    Parameters
    ----------
    elements : BladeElements
    angle : float
        [rad], positive towards coarser pitch.

    Returns
    -------
    BladeElements
    """
    columns = elements.columns.copy()
    columns[:, kernels.E_TWIST] += angle
    return replace(elements, columns=columns)


class _Judge:
    """The readings of one propeller in coefficients, and what any version of its blade is worth against them."""

    def __init__(self, propeller: Propeller, readings: Readings, inflow: str) -> None:
        self.propeller, self.readings, self.inflow = propeller, readings, inflow
        turns, diameter = readings.turns, propeller.diameter
        self.advance_ratio = readings.airspeed / (turns * diameter)
        nothing = np.full(turns.size, np.nan)
        head = readings.density * turns**2 * diameter**4
        thrust = nothing if readings.thrust is None else readings.thrust / head
        power = nothing if readings.torque is None else 2.0 * math.pi * readings.torque / (head * diameter)
        self.measured = Points(
            thrust,
            power,
            efficiency(self.advance_ratio, thrust, power),
            *(nothing,) * 3,
            status=np.zeros(turns.size, dtype=np.int16),
        )
        self.moving = readings.airspeed > 0.0
        still = ~self.moving
        highest = readings.rpm[still].max(initial=0.0)
        self.static = still & (readings.rpm > highest / 3.0)

    @cached_property
    def scales(self) -> tuple[float, float]:
        """CT and CP that errors are shares of."""

        def scale(values: FloatArray) -> float:
            known = np.isfinite(values)
            if (known & self.static).any():
                return abs(float(values[known & self.static].mean()))
            return float(np.abs(values[known]).max(initial=0.0))

        found = scale(self.measured.thrust_coefficient), scale(self.measured.power_coefficient)
        return tuple(value if value > 0.0 else math.nan for value in found)  # type: ignore[return-value]

    def points(self, elements: BladeElements, advance_ratio: FloatArray, rpm: FloatArray, air_of: BoolArray) -> Points:
        """Predict points in the mean air of some rows."""
        density, viscosity, sound = (
            np.full(rpm.shape, float(getattr(self.readings, name)[air_of].mean()) if air_of.any() else math.nan)
            for name in ("density", "viscosity", "speed_of_sound")
        )
        return self._solve(elements, advance_ratio, rpm, viscosity / density, sound)

    def predict(self, elements: BladeElements) -> Points:
        """Predict every row at its own rpm, airspeed and air."""
        readings = self.readings
        return self._solve(
            elements, self.advance_ratio, readings.rpm, readings.viscosity / readings.density, readings.speed_of_sound
        )

    def _solve(
        self,
        elements: BladeElements,
        advance_ratio: FloatArray,
        rpm: FloatArray,
        kinematic_viscosity: FloatArray,
        speed_of_sound: FloatArray,
    ) -> Points:
        turns, diameter = rpm / 60.0, self.propeller.diameter
        if not rpm.size:
            return Points(*(np.zeros(0),) * 6, status=np.zeros(0, dtype=np.int16))
        solution = self._solution(
            elements, advance_ratio * turns * diameter, 2.0 * math.pi * turns, kinematic_viscosity, speed_of_sound
        )
        thrust = solution.thrust_per_density / (turns**2 * diameter**4)
        power = 2.0 * math.pi * solution.torque_per_density / (turns**2 * diameter**5)
        return Points(
            thrust,
            power,
            efficiency(advance_ratio, thrust, power),
            solution.stalled_share,
            solution.outside_polar_share,
            solution.low_reynolds_share,
            solution.status,
        )

    def _solution(self, elements: BladeElements, airspeed: FloatArray, *others: FloatArray) -> RotorSolution:
        found = solve(elements, airspeed, *others)
        if self.inflow == "momentum":
            return found
        # Points that the helices are not good for stay without a prediction, their status "not run".
        serves = ~outside_inflow_law(elements, airspeed, found.thrust_per_density)
        parts: dict[str, Any] = {
            item.name: np.full(airspeed.size, np.nan) for item in fields(RotorSolution) if item.name != "radial"
        }
        parts["status"] = np.zeros(airspeed.size, dtype=np.int16)
        if serves.any():
            helical = solve_helix(elements, airspeed[serves], *(other[serves] for other in others))
            for name, values in parts.items():
                values[serves] = getattr(helical, name)
        return RotorSolution(**parts)

    # --- runs and landmarks ------------------------------------------------------------------------------------------

    @cached_property
    def groups(self) -> list[NDArray[np.intp]]:
        """Moving rows by rpm, each by ascending advance ratio."""
        order = np.flatnonzero(self.moving)
        order = order[np.argsort(self.readings.rpm[order], kind="stable")]
        groups: list[list[int]] = []
        for row in order.tolist():
            if not groups or self.readings.rpm[row] > (1.0 + SAME_RPM) * self.readings.rpm[groups[-1][0]]:
                groups.append([])
            groups[-1].append(row)
        return [
            np.array(sorted(group, key=lambda row: float(self.advance_ratio[row])), dtype=np.intp) for group in groups
        ]

    def runs(self, elements: BladeElements) -> tuple[Run, ...]:
        """Predict a line through the rows of every run, and find the landmarks of both."""
        return tuple(self._run(elements, rows) for rows in self.groups)

    def _run(self, elements: BladeElements, rows: NDArray[np.intp]) -> Run:
        J, rpm = self.advance_ratio[rows], float(self.readings.rpm[rows].mean())
        line_J = np.linspace(0.0, _BEYOND * float(J[-1]), _LINE_POINTS)
        here = np.zeros(self.moving.size, dtype=bool)
        here[rows] = True
        line = self.points(elements, line_J, np.full(line_J.size, rpm), here)
        measured = Landmarks()
        if rows.size >= FEWEST_ROWS_OF_A_RUN:
            measured = _landmarks(
                J, self.measured.thrust_coefficient[rows], self.measured.efficiency[rows], near_peak=_NEAR_PEAK
            )
        predicted = _landmarks(line_J, line.thrust_coefficient, line.efficiency, near_peak=1.0)
        return Run(rpm, rows, line_J, line, measured, predicted)

    def static_rpm(self) -> FloatArray:
        """Rpm of the line standing still: over the range of the static rows."""
        still = self.readings.rpm[~self.moving]
        return np.linspace(still.min(), still.max(), _LINE_POINTS) if still.size else np.zeros(0)

    # --- errors and remedies -----------------------------------------------------------------------------------------

    def errors(self, predicted: Points, runs: tuple[Run, ...]) -> Errors:
        """Sum up the differences."""
        thrust, power = self._differences(predicted)
        peaks = [run.predicted.peak_efficiency - run.measured.peak_efficiency for run in runs]
        ends = [run.predicted.zero_thrust_advance_ratio - run.measured.zero_thrust_advance_ratio for run in runs]
        return Errors(
            thrust_bias=_mean(thrust[self.moving]),
            thrust_rms=math.sqrt(_mean(thrust[self.moving] ** 2)),
            power_bias=_mean(power[self.moving]),
            power_rms=math.sqrt(_mean(power[self.moving] ** 2)),
            static_thrust=_mean(thrust[self.static]),
            static_power=_mean(power[self.static]),
            peak_efficiency=_mean(np.array(peaks)),
            zero_thrust=_mean(np.array(ends)),
        )

    def _differences(self, predicted: Points) -> tuple[FloatArray, FloatArray]:
        return (
            (predicted.thrust_coefficient - self.measured.thrust_coefficient) / self.scales[0],
            (predicted.power_coefficient - self.measured.power_coefficient) / self.scales[1],
        )

    def residuals(self, elements: BladeElements, rows: BoolArray) -> FloatArray:
        """Errors of CT and CP of some rows as shares of the static value, shape (2, n)."""
        return np.stack(self._differences(self.predict(elements)))[:, rows]

    def _error(self, elements: BladeElements, parts: tuple[BoolArray, ...]) -> float:
        """Root of the mean square over each part of the rows, the parts counting alike."""
        thrust_power = np.stack(self._differences(self.predict(elements)))
        return math.sqrt(math.fsum(_mean(thrust_power[:, part] ** 2) for part in parts) / len(parts))

    def remedies(self, model: Model, elements: BladeElements, wanted: Sequence[str]) -> tuple[Remedy, ...]:
        """Search the numbers of the whole blade that would serve the readings best."""
        parts = tuple(part for part in (self.moving, self.static) if np.isfinite(self.residuals(elements, part)).any())
        fitted, both = parts[0], (-LARGEST_TURN, LARGEST_TURN)
        turn = self._search("blade_angle", 0.0, both, parts[:1], lambda angle: (turned(elements, angle), angle))
        at_best = turned(elements, turn.best)
        slope = (
            self._fit_errors(turned(at_best, _SMALL_TURN), fitted) - self._fit_errors(at_best, fitted)
        ) / _SMALL_TURN

        def with_model(changed: Model) -> tuple[BladeElements, float]:
            # One Gauss-Newton step: over the angles in question CT and CP are nearly straight lines.
            blade = turned(blade_elements(self.propeller, changed), turn.best)
            step = -float(slope @ self._fit_errors(blade, fitted)) / float(slope @ slope)
            angle = min(max(turn.best + step, -LARGEST_TURN), LARGEST_TURN)
            return turned(blade, angle - turn.best), angle

        drag, strength = model.drag_scale, model.stall_strength
        found = [turn]
        if "drag_scale" in wanted:
            between = max(0.1, DRAG_SCALES[0] * drag), min(10.0, DRAG_SCALES[1] * drag)
            found.append(
                self._search(
                    "drag_scale", drag, between, parts, lambda scale: with_model(replace(model, drag_scale=scale))
                )
            )
        if "stall_strength" in wanted and model.stall_delay != "none":
            found.append(
                self._search(
                    "stall_strength",
                    strength,
                    (0.0, 1.0),
                    parts,
                    lambda share: with_model(replace(model, stall_strength=share)),
                )
            )
        return tuple(found)

    def _fit_errors(self, elements: BladeElements, rows: BoolArray) -> FloatArray:
        """Errors of CT and CP of some rows in one list, 0 where there is none."""
        return np.nan_to_num(self.residuals(elements, rows)).ravel()

    def _search(
        self,
        quantity: str,
        given: float,
        between: tuple[float, float],
        parts: tuple[BoolArray, ...],
        blade: Callable[[float], tuple[BladeElements, float]],
    ) -> Remedy:
        """Find the value of least error: a scan, then the bounded search of Brent around its best node."""
        from scipy.optimize import minimize_scalar

        seen: dict[float, float] = {}

        def error(value: float) -> float:
            found = self._error(blade(float(value))[0], parts)
            seen[float(value)] = found if math.isfinite(found) else math.inf
            return seen[float(value)]

        nodes = np.unique([*np.linspace(*between, _STEPS[quantity]), given])
        top = int(np.argmin([error(value) for value in nodes]))
        minimize_scalar(
            error,
            bounds=(float(nodes[max(top - 1, 0)]), float(nodes[min(top + 1, nodes.size - 1)])),
            method="bounded",
            options={"xatol": _TOLERANCES[quantity]},
        )
        best = min(seen, key=lambda value: seen[value])
        elements, angle = blade(best)
        gain = seen[float(given)] - seen[best]
        return Remedy(
            quantity=quantity,
            given=given,
            best=best,
            angle=angle,
            at_limit=min(abs(best - end) for end in between) < 2.0 * _TOLERANCES[quantity],
            errors=self.errors(self.predict(elements), self.runs(elements)),
            gain=gain,
            worth_saying=gain >= max(WORTH_SHARE * seen[float(given)], WORTH_POINTS),
        )

    def notes(self, predicted: Points) -> list[str]:
        """Say what the judgement rests on where that is not plain."""
        found = []
        if not self.static.any():
            found.append("no reading stands still: errors are shares of the largest measured CT and CP")
        if not self.moving.any():
            found.append("no reading moves: standing still, blade angle, drag and stall cannot be told apart")
        lost = int((~np.isfinite(predicted.thrust_coefficient)).sum())
        if lost:
            found.append(f"{lost} of {predicted.status.size} rows have no prediction and are left out")
        return found


def _mean(values: FloatArray) -> float:
    known = values[np.isfinite(values)]
    return float(known.mean()) if known.size else math.nan


def _landmarks(J: FloatArray, thrust: FloatArray, eta: FloatArray, *, near_peak: float) -> Landmarks:
    peak, at = _peak(J, eta, near_peak)
    return Landmarks(peak, at, _zero_thrust(J, thrust))


def _peak(J: FloatArray, eta: FloatArray, near: float) -> tuple[float, float]:
    """Top of the parabola through the points of nearly the largest efficiency, and one on either side at least."""
    known = np.isfinite(eta)
    J, eta = J[known], eta[known]
    top = int(np.argmax(eta)) if eta.size else 0
    if not 0 < top < eta.size - 1:
        return math.nan, math.nan
    low, high = top - 1, top + 1
    while low > 0 and eta[low - 1] >= near * eta[top]:
        low -= 1
    while high < eta.size - 1 and eta[high + 1] >= near * eta[top]:
        high += 1
    x = J[low : high + 1] - J[top]
    if (np.diff(x) <= 0.0).all():
        return math.nan, math.nan
    square, slope, level = np.polyfit(x, eta[low : high + 1], 2)
    place = -0.5 * slope / square if square < 0.0 else math.nan
    if not x[0] < place < x[-1]:  # the rows scatter more than they curve
        return float(eta[top]), float(J[top])
    return float(level + 0.5 * slope * place), float(J[top] + place)


def _zero_thrust(J: FloatArray, thrust: FloatArray) -> float:
    """Where thrust last turns from pulling to braking, on the straight line between the two points."""
    known = np.isfinite(thrust)
    J, thrust = J[known], thrust[known]
    ends = np.flatnonzero((thrust[:-1] > 0.0) & (thrust[1:] <= 0.0))
    if not ends.size:
        return math.nan
    cell = int(ends[-1])
    share = thrust[cell] / (thrust[cell] - thrust[cell + 1])
    return float(J[cell] + share * (J[cell + 1] - J[cell]))
