"""Constants of a motor from rows of a bench: speed constant, winding resistance and no-load current."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.case.readings import Readings
from bemt.drive.controller import Controller
from bemt.drive.motor import Motor
from bemt.errors import InputError, RunError
from bemt.quantities.checks import require_one_of

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]

CONSTANTS = ("speed_constant", "winding_resistance", "no_load_current")
"""Kv [rad/s per V], R [ohm], and I0 at the highest speed of the rows [A]."""

GROWTH = "no_load_growth"
"""Share of that no-load current which falls to zero with speed, the rest being constant."""

FIGURE_OF_MERIT, POWER_EXPONENT = "figure_of_merit", "power_exponent"
"""The unknown propeller of rows with thrust but neither torque nor duty: figure of merit, and the exponent with which
it falls with speed."""

# How far the constants may be from those of the case, in natural logarithms (the last two: as such). It counts only
# where the rows say nothing. Common practice, no source.
PRIOR = {
    "speed_constant": 0.1,
    "winding_resistance": 0.5,
    "no_load_current": 0.7,
    GROWTH: 1.0,
    FIGURE_OF_MERIT: 0.35,
    POWER_EXPONENT: 0.1,
}
TYPICAL_FIGURE_OF_MERIT = 0.55
"""Where the search for an unknown propeller starts; common practice, no source."""

# Standard uncertainties where a file has no column for them: shares of the reading, and of the largest reading.
DEFAULT_UNCERTAINTY = {
    "rpm": (0.002, 0.0),
    "voltage": (0.003, 0.0),
    "current": (0.01, 0.002),
    "electric_power": (0.01, 0.002),
    "torque": (0.01, 0.003),
    "thrust": (0.01, 0.003),
}
DEFAULT_DUTY_UNCERTAINTY = 0.005

MORE_THAN_ALL = "more shaft power than electric power: one of its readings is wrong"
"""Why a row is left out that claims an efficiency above 1."""

UNTOLD_SHRINKAGE = 0.5
"""A constant whose uncertainty the rows do not even halve is one they cannot tell."""

_TOLD_SINGULAR_VALUE = 2.0  # below, a combination of constants is hardly better known than before
_GROWTH_SIGNIFICANCE = 3.0  # standard uncertainties from zero
_LOSS_SCALE = 2.0  # residuals, in standard uncertainties, from which they count less
_SMALL_STEP = 1e-6


@dataclass(frozen=True, eq=False)
class MotorFit:
    """Motor constants found on rows of a bench.

    Parameters
    ----------
    start, motor : Motor
        Before and after; the one differs from the other in speed constant, resistance and no-load readings.
    names : tuple of str, length k
        What was fitted: `CONSTANTS`, and what the rows gave reason for.
    values : numpy.ndarray, shape (k,)
        In SI units.
    covariance : numpy.ndarray, shape (k, k)
        Of `values`; where the rows cannot tell, it is that of the assumptions before.
    shrinkage : numpy.ndarray, shape (k,)
        Standard uncertainty after over that before; near 1 where the rows say nothing.
    untold : tuple of str
        Names of what the rows cannot tell.
    untold_combinations : tuple of tuple of str
        Names of the constants that take part in each combination the rows cannot tell.
    readings : Readings
        All rows.
    used : numpy.ndarray of bool, shape (n,)
        Rows the fit rests on.
    with_torque, with_duty, with_propeller : numpy.ndarray of bool, shape (n,)
        Of the used rows: those with a torque, those with a duty, and those whose torque comes from an unknown
        propeller.
    left_out : tuple of (str, str)
        Place and reason of every row that was not used.
    beyond_label : tuple of str
        Places of the rows that turn faster than the speed constant of the case allows at their duty and voltage.
    current : numpy.ndarray, shape (n,)
        Supply current from supply voltage, rpm and torque [A]; NaN where these are not known.
    supply_power : numpy.ndarray, shape (n,)
        Likewise [W], with the torque of an unknown propeller where that serves.
    rpm : numpy.ndarray, shape (n,)
        Rpm from duty, supply voltage and torque, or supply current where there is no torque; NaN likewise.
    scatter : float
        Root of the mean square of the residuals over their uncertainties. Where it exceeds 1, rows and model differ by
        more than the readings' uncertainties, and the covariance is scaled by its square.
    reference_speed : float
        Motor speed that the no-load current belongs to [rad/s].
    """

    start: Motor
    motor: Motor
    names: tuple[str, ...]
    values: FloatArray
    covariance: FloatArray
    shrinkage: FloatArray
    untold: tuple[str, ...]
    untold_combinations: tuple[tuple[str, ...], ...]
    readings: Readings
    used: BoolArray
    with_torque: BoolArray
    with_duty: BoolArray
    with_propeller: BoolArray
    left_out: tuple[tuple[str, str], ...]
    beyond_label: tuple[str, ...]
    current: FloatArray
    supply_power: FloatArray
    rpm: FloatArray
    scatter: float
    reference_speed: float

    @property
    def uncertainties(self) -> FloatArray:
        """Standard uncertainties of `values`, shape (k,)."""
        found: FloatArray = np.sqrt(np.diag(self.covariance))
        return found

    @property
    def correlation(self) -> FloatArray:
        """Correlation of `values`, shape (k, k); zero beside a constant that was held."""
        spread = self.uncertainties
        both = np.outer(spread, spread)
        found: FloatArray = np.where(both > 0.0, self.covariance, 0.0) / np.where(both > 0.0, both, 1.0)
        return found

    def value(self, name: str) -> tuple[float, float]:
        """Return a fitted constant.

        Parameters
        ----------
        name : str
            One of `names`.

        Returns
        -------
        value, uncertainty : float
            In SI units.
        """
        place = self.names.index(name)
        return float(self.values[place]), float(self.uncertainties[place])

    @property
    def label_difference(self) -> tuple[float, float]:
        """Speed constant found over that of the case, less 1, and the same in standard uncertainties."""
        value, spread = self.value("speed_constant")
        difference = value - self.start.speed_constant
        return difference / self.start.speed_constant, difference / spread if spread > 0.0 else 0.0


def supply_current(
    motor: Motor, controller: Controller, *, voltage: ArrayLike, rpm: ArrayLike, torque: ArrayLike
) -> FloatArray:
    """Return the supply current that a shaft torque takes at a supply voltage, whatever the duty.

    Parameters
    ----------
    motor : Motor
        One motor, whatever its count.
    controller : Controller
        Its controller.
    voltage : array_like
        Of the supply at the controller [V].
    rpm, torque : array_like
        Of the propeller's shaft [rpm], [N m]; broadcast.

    Returns
    -------
    numpy.ndarray
        Current [A].

    Notes
    -----
    Motor current I = Q Kv + I0, power at the leads I (w/Kv + I R); with the controller's own losses that is the power
    of the supply. The duty drops out.
    """
    voltage, rpm, torque = np.broadcast_arrays(*(np.asarray(value, np.float64) for value in (voltage, rpm, torque)))
    speed = rpm * (math.pi / 30.0) * motor.gear_ratio
    current = motor.current_for(torque, speed)
    resistance = motor.resistance + controller.on_resistance
    needed = speed * motor.torque_constant + current * resistance
    unknown = np.full(voltage.shape, np.nan)
    conductance = resistance * _ripple_share(motor, controller)
    found: FloatArray = _power(controller, voltage, unknown, current, needed, conductance) / voltage
    return found


def _ripple_share(motor: Motor, controller: Controller) -> float:
    """Return 1/(12 L^2 f^2) [1/ohm^2], which makes the loss of the ripple as in `bemt.drive.solve_circuit`."""
    if motor.winding_inductance is None or controller.switching_frequency is None:
        return 0.0
    return 1.0 / (12.0 * (motor.winding_inductance * controller.switching_frequency) ** 2)


def _power(
    controller: Controller,
    voltage: FloatArray,
    duty: FloatArray,
    current: FloatArray,
    needed: FloatArray,
    conductance: float,
) -> FloatArray:
    """Power of the supply [W] for a motor current and the voltage it needs behind the controller; NaN: not known.

    The duty, where it is not given, is that which makes this voltage. The ripple costs the conductance times
    (d (1 - d) Vb)^2. Without a voltage an ideal controller is meant.
    """
    diode = controller.diode_voltage
    duty = np.where(np.isnan(duty), (needed + diode) / (voltage + diode), duty)
    chops = duty < 1.0 - 1e-9  # the rounding of one that was not given
    lost = np.where(chops, controller.switching_share * voltage + (1.0 - duty) * diode, 0.0)
    ripple = np.where(chops, conductance * (duty * (1.0 - duty) * voltage) ** 2, 0.0)
    found: FloatArray = current * needed + np.abs(current) * lost + controller.idle_current * voltage + ripple
    return np.where(np.isnan(voltage), current * needed, found)


def rpm_at_duty(
    motor: Motor, controller: Controller, *, voltage: ArrayLike, duty: ArrayLike, torque: ArrayLike
) -> FloatArray:
    """Return the rpm at which a duty drives a shaft torque.

    Parameters
    ----------
    motor : Motor
        One motor, whatever its count.
    controller : Controller
        Its controller.
    voltage : array_like
        Of the supply at the controller [V].
    duty, torque : array_like
        0 to 1, and of the propeller's shaft [N m]; broadcast.

    Returns
    -------
    numpy.ndarray
        [rpm] of the propeller's shaft, not below zero.

    Notes
    -----
    w = Kv (d Vb - (1 - d) Vd - I (R + Ron)) with I = Q Kv + I0(w), by repeated insertion: I0 R is a small part of the
    voltage and changes little with speed.
    """
    voltage, duty, torque = np.broadcast_arrays(*(np.asarray(value, np.float64) for value in (voltage, duty, torque)))
    resistance = motor.resistance + controller.on_resistance
    offered = duty * voltage - (1.0 - duty) * controller.diode_voltage
    speed = motor.speed_constant * offered
    for _ in range(50):
        before = speed
        current = motor.current_for(torque, speed)
        speed = np.maximum(motor.speed_constant * (offered - current * resistance), 0.0)
        if np.allclose(speed, before, rtol=1e-12, atol=1e-9, equal_nan=True):
            break
    found: FloatArray = speed * (30.0 / math.pi) / motor.gear_ratio
    return found


def fit_motor(
    readings: Readings,
    controller: Controller | None = None,
    *,
    start: Motor,
    diameter: float | None = None,
    growth: bool = True,
    held: Sequence[str] = (),
) -> MotorFit:
    """Find the constants of a motor from its bench.

    Parameters
    ----------
    readings : Readings
        Of one motor: rpm, voltage and current of the supply (or its power), and torque and duty where known. Torque 0
        is a motor that runs free.
    controller : Controller, optional
        Its losses count as known; without one they are none.
    start : Motor
        Where the search begins, and what holds where the rows say nothing; its gear is kept.
    diameter : float, optional
        Of the propeller [m]; lets rows with thrust but without torque or duty serve.
    growth : bool, optional
        Whether to try a no-load current that grows with speed.
    held : sequence of str, optional
        Those of `CONSTANTS` that stay as they are: known from elsewhere.

    Returns
    -------
    MotorFit

    Raises
    ------
    InputError
        If no row says anything of the motor, or a held name is not known.
    RunError
        If the search does not converge.

    Notes
    -----
    A row with torque is met by supply power Vb Ib = I (w/Kv + I (R + Ron)) + losses of the controller, I = Q Kv + I0:
    that alone tells R Kv^2 and I0/Kv, but never Kv. A row with duty is met by w = Kv (d Vb - I (R + Ron)) as well, I
    being (Ib - I_idle)/(d + s) where no torque is given. The uncertainties of all readings of a row enter both
    residuals through their first derivatives, and so does the correlation this makes between the two. Far outliers
    count less (loss soft_l1).

    What was assumed before enters only along combinations of constants that the rows cannot tell: those with a singular
    value below 2 of the Jacobian in units of both uncertainties.

    R is that of 20 degrees Celsius if the winding was as warm as `start` says.

    References
    ----------
    Joint Committee for Guides in Metrology, Evaluation of measurement data, JCGM 100:2008, 5.1 and 5.2.
    """
    controller = Controller() if controller is None else controller
    for name in held:
        require_one_of("held", name, CONSTANTS)
    bench = _Bench(readings, controller, start, diameter)
    names = [*CONSTANTS, *((FIGURE_OF_MERIT, POWER_EXPONENT) if bench.with_propeller.any() else ())]
    free = tuple(name for name in names if name not in held)
    if not free:
        raise InputError("held", "nothing is left to be found")
    found = _search(bench, free)
    if growth and "no_load_current" in free and bench.residual_count > len(free) + 2:
        grown = _search(bench, (*free, GROWTH))
        share, spread = grown.parameters[GROWTH], math.sqrt(grown.covariance[-1, -1])
        if spread * _GROWTH_SIGNIFICANCE < share <= 1.0:
            found = grown
            names.append(GROWTH)
    return _result(bench, tuple(names), found)


# --- rows ------------------------------------------------------------------------------------------------------------


class _Bench:
    """The rows of a bench, what they can say, and their residuals for any constants."""

    def __init__(self, readings: Readings, controller: Controller, start: Motor, diameter: float | None) -> None:
        self.readings, self.controller, self.start = readings, controller, start
        count = readings.rpm.size
        absent = np.full(count, np.nan)

        def column(name: str) -> FloatArray:
            value = getattr(readings, name)
            return absent if value is None else np.asarray(value)

        self.measured = {name: column(name) for name in (*DEFAULT_UNCERTAINTY, "duty")}
        known = {name: np.isfinite(values) for name, values in self.measured.items()}
        self.warming = start.resistance / start.winding_resistance
        self.disk = 2.0 * readings.density * math.pi / 4.0 * (diameter or math.nan) ** 2
        self.supply_power = _given_power(self.measured)
        power = np.isfinite(self.supply_power)
        # Only the controller's own losses need the voltage where the power is given.
        self.ripple_share = _ripple_share(start, controller)
        losses = (controller.idle_current, controller.switching_share, controller.diode_voltage, self.ripple_share)
        bare = not any(losses)
        voltage = known["voltage"] | (bare & known["electric_power"])
        drives = known["duty"] & known["voltage"]
        still = (readings.airspeed == 0.0) & (np.nan_to_num(self.measured["thrust"]) > 0.0) & np.isfinite(self.disk)
        by_propeller = ~known["torque"] & ~drives & still
        power_rows = power & voltage & (known["torque"] | by_propeller)
        speed_rows = drives & (known["torque"] | (power & (np.nan_to_num(self.measured["duty"]) > 0.0)))

        self.left_out: list[tuple[str, str]] = []
        with np.errstate(invalid="ignore"):
            gained = self.measured["torque"] * readings.rpm * (math.pi / 30.0)
            impossible = gained > self.supply_power
        nothing = ~power_rows & ~speed_rows
        for row in np.flatnonzero(impossible):
            watts = f"{gained[row]:.3g} of {self.supply_power[row]:.3g} W"
            self.left_out.append((f"{self.place(int(row))} ({watts})", MORE_THAN_ALL))
        for row in np.flatnonzero(nothing & ~impossible):
            lacking = "torque or duty" if power[row] else "voltage and current, or electric power"
            self.left_out.append((self.place(int(row)), f"says nothing of the motor: no {lacking}"))
        self.used = ~(impossible | nothing)
        if not self.used.any():
            raise InputError(
                "readings",
                "no row says anything of the motor; needed: rpm, voltage_V and current_A, and with them torque_Nm or "
                "duty, or thrust standing still",
            )
        self.power_rows, self.speed_rows = power_rows & self.used, speed_rows & self.used
        self.with_torque, self.with_duty = known["torque"] & self.used, speed_rows & self.used
        self.with_propeller = by_propeller & self.power_rows
        self.residual_count = int(self.power_rows.sum() + self.speed_rows.sum())
        self.reference_speed = float(readings.rpm[self.used].max()) * (math.pi / 30.0) * start.gear_ratio
        self.spread = {name: self._spread(name) for name in self.measured}

    def place(self, row: int) -> str:
        """File and line of a row, or its number."""
        return self.readings.places[row] if self.readings.places else f"row {row + 1}"

    def _spread(self, name: str) -> FloatArray:
        """Return the uncertainty of one column: as given, else by the defaults; none of a motor that runs free."""
        values = self.measured[name]
        if name == "duty":
            assumed = np.full(values.shape, DEFAULT_DUTY_UNCERTAINTY)
        else:
            share, floor = DEFAULT_UNCERTAINTY[name]
            largest = np.nanmax(np.abs(values)) if np.isfinite(values).any() else 0.0
            assumed = share * np.abs(values) + floor * largest
        if name == "torque":
            assumed = np.where(values == 0.0, 0.0, assumed)
        given = self.readings.uncertainties.get(name)
        if given is not None:
            assumed = np.where(np.isfinite(given), given, assumed)
        return np.where(np.isfinite(values), assumed, 0.0)

    def start_values(self) -> dict[str, float]:
        """Return what the search begins with, as parameters."""
        current = float(self.start.no_load_current(self.reference_speed))
        return {
            "speed_constant": math.log(self.start.speed_constant),
            "winding_resistance": math.log(self.start.winding_resistance),
            "no_load_current": math.log(max(current, 1e-3)),
            GROWTH: 0.0,
            FIGURE_OF_MERIT: math.log(TYPICAL_FIGURE_OF_MERIT),
            POWER_EXPONENT: 0.0,
        }

    def residuals(self, parameters: Mapping[str, float], measured: Mapping[str, FloatArray]) -> FloatArray:
        """Predicted less measured supply power [W] and speed [rad/s], shape (2, n); 0 where a row has none."""
        Kv, R, reference_current, merit = (math.exp(parameters[name]) for name in (*CONSTANTS, FIGURE_OF_MERIT))
        gear, controller = self.start.gear_ratio, self.controller
        shaft_speed = measured["rpm"] * (math.pi / 30.0)
        speed = shaft_speed * gear
        ratio = speed / self.reference_speed
        share = parameters[GROWTH]
        I0 = reference_current * (1.0 - share + share * ratio)
        with np.errstate(divide="ignore", invalid="ignore"):
            ideal = np.abs(measured["thrust"]) ** 1.5 / np.sqrt(self.disk)
            of_propeller = ideal / merit * ratio ** parameters[POWER_EXPONENT] / shaft_speed
            torque = np.where(self.with_propeller, of_propeller, measured["torque"]) / gear
            torque = np.where(torque > 0.0, torque / self.start.gear_efficiency, torque * self.start.gear_efficiency)
            voltage, duty = measured["voltage"], measured["duty"]
            chops = np.where(duty >= 1.0, 0.0, controller.switching_share)
            given = _given_power(measured)
            drawn = np.where(np.isfinite(measured["current"]), measured["current"], given / voltage)
            resistance = R * self.warming + controller.on_resistance
            conductance = resistance * self.ripple_share
            ripple = conductance * (duty * (1.0 - duty)) ** 2 * voltage
            by_supply = (drawn - controller.idle_current - ripple) / (duty + chops)
            current = np.where(np.isfinite(torque), torque * Kv + I0, by_supply)
            drop = current * resistance
            power = _power(controller, voltage, duty, current, speed / Kv + drop, conductance) - given
            offered = duty * voltage - (1.0 - duty) * controller.diode_voltage
            faster = Kv * (offered - drop) - speed
        return np.stack([np.where(self.power_rows, power, 0.0), np.where(self.speed_rows, faster, 0.0)])

    def whitening(self, parameters: Mapping[str, float]) -> Callable[[FloatArray], FloatArray]:
        """Return what turns residuals into independent ones of unit variance, by the readings' uncertainties."""
        slopes = []
        for name, spread in self.spread.items():
            if spread.any():
                up = {**self.measured, name: self.measured[name] + spread}
                down = {**self.measured, name: self.measured[name] - spread}
                slopes.append(0.5 * (self.residuals(parameters, up) - self.residuals(parameters, down)))
        changes = np.array(slopes).reshape(-1, 2, self.used.size)
        variance = np.einsum("kin,kjn->ijn", changes, changes)
        tiny = np.finfo(np.float64).tiny
        first = np.sqrt(np.maximum(variance[0, 0], tiny))
        cross = np.where(self.power_rows, variance[0, 1], 0.0) / first
        # Rounding alone could take all of it away.
        second = np.sqrt(np.maximum(variance[1, 1] - cross**2, np.maximum(1e-12 * variance[1, 1], tiny)))
        power_rows, speed_rows = self.power_rows, self.speed_rows

        def whiten(residuals: FloatArray) -> FloatArray:
            one = np.where(power_rows, residuals[0], 0.0) / first
            two = (residuals[1] - cross * one) / second
            return np.concatenate([one[power_rows], two[speed_rows]])

        return whiten


def _given_power(measured: Mapping[str, FloatArray]) -> FloatArray:
    """Power of the supply [W]: as read, else voltage times current."""
    given = measured["electric_power"]
    return np.where(np.isfinite(given), given, measured["voltage"] * measured["current"])


# --- search ----------------------------------------------------------------------------------------------------------


@dataclass(frozen=True, eq=False)
class _Found:
    """Outcome of one search; covariance and the rest in the order of the free parameters."""

    free: tuple[str, ...]
    parameters: dict[str, float]
    covariance: FloatArray
    weak: FloatArray
    scatter: float


def _search(bench: _Bench, free: tuple[str, ...]) -> _Found:
    """Fit with all assumptions, find what the rows cannot tell, and fit again with those about that alone."""
    from scipy.optimize import least_squares

    start = bench.start_values()
    centre = np.array([start[name] for name in free])
    prior = np.array([PRIOR[name] for name in free])

    def parameters(x: FloatArray) -> dict[str, float]:
        return start | dict(zip(free, (float(value) for value in centre + prior * x), strict=True))

    x = np.zeros(len(free))
    weak, scale = np.eye(len(free)), 1.0
    for _ in range(4):
        whiten = bench.whitening(parameters(x))

        def rows(x: FloatArray, whiten: Callable[[FloatArray], FloatArray] = whiten) -> FloatArray:
            return whiten(bench.residuals(parameters(x), bench.measured))

        def both(
            x: FloatArray,
            rows: Callable[[FloatArray], FloatArray] = rows,
            weak: FloatArray = weak,
            scale: float = scale,
        ) -> FloatArray:
            return np.concatenate([rows(x) / scale, weak @ x])

        # Twenty prior widths either way keep the exponentials finite.
        solution = least_squares(
            both, x, bounds=(-20.0, 20.0), loss="soft_l1", f_scale=_LOSS_SCALE, xtol=1e-12, ftol=1e-12, gtol=1e-12
        )
        if not solution.success or not np.isfinite(solution.x).all():
            raise RunError(f"the motor's constants were not found: {solution.message}")
        x = solution.x
        jacobian = _slopes(rows, x)
        freedom = max(bench.residual_count - len(free) + weak.shape[0], 1)
        scatter = math.sqrt(float(np.sum(rows(x) ** 2)) / freedom)
        scale = max(scatter, 1.0)
        _, singular, directions = np.linalg.svd(jacobian / scale, full_matrices=True)
        singular = np.concatenate([singular, np.zeros(len(free) - singular.size)])
        weak = directions[singular < _TOLD_SINGULAR_VALUE]
    information = jacobian.T @ jacobian / scale**2 + weak.T @ weak
    covariance = np.asarray(np.linalg.inv(information) * np.outer(prior, prior), np.float64)
    return _Found(free, parameters(x), covariance, weak, scatter)


def _slopes(function: Callable[[FloatArray], FloatArray], x: FloatArray) -> FloatArray:
    columns = [(function(x + step) - function(x - step)) / (2.0 * _SMALL_STEP) for step in _SMALL_STEP * np.eye(x.size)]
    return np.stack(columns, axis=1)


def _result(bench: _Bench, names: tuple[str, ...], found: _Found) -> MotorFit:
    """Turn parameters into constants of a motor."""
    linear = (GROWTH, POWER_EXPONENT)
    values = np.array([found.parameters[n] if n in linear else math.exp(found.parameters[n]) for n in names])
    covariance = np.zeros((len(names), len(names)))
    places = [names.index(name) for name in found.free]
    slope = np.array([1.0 if name in linear else values[names.index(name)] for name in found.free])
    covariance[np.ix_(places, places)] = found.covariance * np.outer(slope, slope)
    prior = np.array([PRIOR[name] for name in found.free])
    shrinkage = np.zeros(len(names))
    shrinkage[places] = np.sqrt(np.diag(found.covariance)) / prior
    motor = _motor(bench, dict(zip(names, values, strict=True)))

    measured = bench.measured
    voltage, duty = measured["voltage"], measured["duty"]
    power_error, speed_error = bench.residuals(found.parameters, measured)
    power = np.where(bench.power_rows, bench.supply_power + power_error, np.nan)
    speed = measured["rpm"] + speed_error * (30.0 / math.pi) / motor.gear_ratio
    with np.errstate(invalid="ignore"):
        possible = bench.start.speed_constant * duty * voltage * (30.0 / math.pi) / bench.start.gear_ratio
        beyond = bench.used & (measured["rpm"] > possible)
    return MotorFit(
        start=bench.start,
        motor=motor,
        names=names,
        values=values,
        covariance=covariance,
        shrinkage=shrinkage,
        untold=tuple(
            name for name, left in zip(names, shrinkage, strict=True) if left > UNTOLD_SHRINKAGE and name in CONSTANTS
        ),
        untold_combinations=tuple(
            tuple(name for name, part in zip(found.free, direction, strict=True) if abs(part) > 0.1)
            for direction in found.weak
        ),
        readings=bench.readings,
        used=bench.used,
        with_torque=bench.with_torque,
        with_duty=bench.with_duty,
        with_propeller=bench.with_propeller,
        left_out=tuple(bench.left_out),
        beyond_label=tuple(bench.place(int(row)) for row in np.flatnonzero(beyond)),
        current=np.where(bench.with_propeller, np.nan, power / voltage),
        supply_power=power,
        rpm=np.where(bench.speed_rows, speed, np.nan),
        scatter=found.scatter,
        reference_speed=bench.reference_speed,
    )


def _motor(bench: _Bench, constants: Mapping[str, float]) -> Motor:
    """Return the motor whose two no-load readings make the line of the fitted no-load current."""
    Kv, R, at_reference = (constants[name] for name in CONSTANTS)
    share = constants.get(GROWTH, 0.0)
    readings = []
    for ratio in (0.5, 1.0):
        current = at_reference * (1.0 - share + share * ratio)
        readings.append((ratio * bench.reference_speed / Kv + current * R, current))  # read on a cold motor
    return replace(bench.start, speed_constant=Kv, winding_resistance=R, no_load=tuple(readings))
