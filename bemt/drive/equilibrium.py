"""Where a motor and a propeller agree: the equilibrium rpm for every airspeed and throttle."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.air import Air
from bemt.drive.battery import Battery
from bemt.drive.circuit import Circuit, duty_for, solve_circuit
from bemt.drive.controller import Controller
from bemt.drive.loads import (
    RPM_PER_RAD_S,
    PropellerLoads,
    PropellerState,
    graded,
    last_falling_crossing,
    load_curves,
    propeller_state,
    speed_for_thrust,
)
from bemt.drive.motor import Motor
from bemt.drive.roots import FloatArray, IndexArray
from bemt.errors import InputError
from bemt.quantities.checks import require_positive

_BEYOND_NO_LOAD = 1.02


@dataclass(frozen=True, eq=False)
class OperatingPoints:
    """Operating points of a drive, arrays of one shape; NaN where there is no equilibrium or no meaning.

    Torque and powers are of one motor, thrust of all propellers, battery quantities of the pack; with a gear, rpm and
    torque are the propeller's and the gear's loss counts with the motor. Names and units are those of the registry.

    Parameters
    ----------
    airspeed : numpy.ndarray
        Of the aircraft [m/s].
    throttle, duty : numpy.ndarray
        Stick and duty, 0 to 1.
    rpm : numpy.ndarray
        Of the propeller; 0 where it stands still.
    thrust, torque, shaft_power : numpy.ndarray
        [N], [N m], [W].
    motor_current, motor_voltage, battery_current, battery_voltage, battery_power : numpy.ndarray
        [A], [V], [A], [V], [W].
    propeller_efficiency, motor_efficiency, controller_efficiency : numpy.ndarray
        Shares of power; NaN where power does not flow from the battery to the air.
    battery_efficiency, overall_efficiency : numpy.ndarray
        Shares of power; NaN where power does not flow from the battery to the air.
    winding_temperature : numpy.ndarray
        Steady [degree Celsius]; NaN where not modelled, infinite where the winding runs away.
    outside_polar_share, stalled_share, low_reynolds_share, above_divergence_share : numpy.ndarray
        Shares of the propeller's span.
    trust, trust_reasons : numpy.ndarray of int
        Codes and bits of the registry.
    status : numpy.ndarray of int
        Codes of the registry; "not converged" where no equilibrium lies inside the propeller's table.
    """

    airspeed: FloatArray
    throttle: FloatArray
    duty: FloatArray
    rpm: FloatArray
    thrust: FloatArray
    torque: FloatArray
    shaft_power: FloatArray
    motor_current: FloatArray
    motor_voltage: FloatArray
    battery_current: FloatArray
    battery_voltage: FloatArray
    battery_power: FloatArray
    propeller_efficiency: FloatArray
    motor_efficiency: FloatArray
    controller_efficiency: FloatArray
    battery_efficiency: FloatArray
    overall_efficiency: FloatArray
    winding_temperature: FloatArray
    outside_polar_share: FloatArray
    stalled_share: FloatArray
    low_reynolds_share: FloatArray
    above_divergence_share: FloatArray
    trust: NDArray[np.int16]
    trust_reasons: NDArray[np.int16]
    status: NDArray[np.int16]


@dataclass(frozen=True, eq=False)
class Drive:
    """Propellers on their motors, controllers and one battery.

    Parameters
    ----------
    propeller : PropellerLoads
        Loads of one propeller, e.g. a look-up in its table.
    motor : Motor
        Motors, each with a propeller.
    battery : Battery
        Shared by all.
    controller : Controller, optional
        One for each motor; without one an ideal controller.
    air : Air, optional
        Air of all points; None: the propeller's own.
    inflow_factor : float
        Share of the airspeed the disk sees.
    thrust_factor : float
        Share of the thrust that reaches the airframe; enters the overall efficiency alone.

    Raises
    ------
    InputError
        If a factor is not above zero.
    """

    propeller: PropellerLoads
    motor: Motor
    battery: Battery
    controller: Controller = field(default_factory=Controller)
    air: Air | None = None
    inflow_factor: float = 1.0
    thrust_factor: float = 1.0

    def __post_init__(self) -> None:
        """Refuse factors that describe no installation."""
        require_positive("inflow_factor", self.inflow_factor)
        require_positive("thrust_factor", self.thrust_factor)

    @property
    def count(self) -> int:
        """Number of propellers."""
        return self.motor.count

    @property
    def no_load_speed(self) -> float:
        """Angular speed no propeller on this drive exceeds unless the wind drives it [rad/s]."""
        voltage = self.battery.open_circuit_voltage * self.controller.full_duty
        return voltage * self.motor.speed_constant / self.motor.gear_ratio

    @property
    def models_winding(self) -> bool:
        """Whether the winding temperature is known: it needs a thermal resistance and the air's temperature."""
        known_air = self.air is not None and self.air.temperature is not None
        return known_air and self.motor.thermal_resistance is not None

    def at_throttle(
        self, airspeed: ArrayLike, throttle: ArrayLike, open_circuit_voltage: ArrayLike | None = None
    ) -> OperatingPoints:
        """Return the equilibrium at each airspeed and throttle, the glide included.

        Parameters
        ----------
        airspeed : array_like
            Of the aircraft [m/s], not negative.
        throttle : array_like
            Stick, 0 to 1; broadcast against `airspeed`.
        open_circuit_voltage : array_like, optional
            Of the battery [V], not above that of its charge left, which is the default; broadcast against the others.

        Returns
        -------
        OperatingPoints
            Broadcast shape.

        Raises
        ------
        InputError
            If an airspeed is negative or a throttle outside 0 to 1.

        Notes
        -----
        The torque the motor offers falls with speed and the torque the propeller takes rises, so at most throttles one
        root lies between standstill and the larger of no-load and windmilling speed. A stalled, wind-driven blade can
        have more: the fastest is taken, which is where a propeller throttled down in flight comes to rest. Where the
        drive cannot overcome its own friction the propeller stands still, rpm 0.
        """
        given = self.battery.open_circuit_voltage if open_circuit_voltage is None else open_circuit_voltage
        air_axis, stick, rest = np.broadcast_arrays(
            _checked_airspeed(airspeed), _checked_throttle(throttle), np.asarray(given, dtype=np.float64)
        )
        shape = air_axis.shape
        flat_airspeed, flat_stick, voltage = air_axis.ravel(), stick.ravel(), rest.ravel()
        duty = self.controller.duty(flat_stick)
        rows, row = np.unique(flat_airspeed, return_inverse=True)
        curves = load_curves(self.propeller, self.air, rows * self.inflow_factor, self.no_load_speed * _BEYOND_NO_LOAD)
        disk_airspeed = curves.airspeed[row]

        def surplus(speed: FloatArray, index: IndexArray) -> FloatArray:
            taken = propeller_state(self.propeller, self.air, disk_airspeed[index], speed).torque
            return self._torque_offered(duty[index], speed, voltage[index]) - taken

        offered = self._torque_offered(duty[:, np.newaxis], curves.speed[row], voltage[:, np.newaxis])
        nodes = offered - curves.torque[row]
        speed = last_falling_crossing(curves, row, nodes, surplus)
        stands_still = np.isnan(speed) & (nodes[:, 0] <= 0.0) & ~np.any(nodes > 0.0, axis=1)
        speed[stands_still] = 0.0

        state = propeller_state(self.propeller, self.air, disk_airspeed, speed)
        motor_speed = state.speed * self.motor.gear_ratio
        circuit = solve_circuit(self.motor, self.controller, self.battery, duty, motor_speed, voltage)
        return self._points(flat_airspeed, flat_stick, duty, voltage, state, circuit, shape)

    def at_thrust(self, airspeed: ArrayLike, thrust: ArrayLike) -> OperatingPoints:
        """Return the points at which all propellers together give a thrust.

        Parameters
        ----------
        airspeed : array_like
            Of the aircraft [m/s], not negative.
        thrust : array_like
            Of all propellers [N], NaN where none is asked; broadcast against `airspeed`.

        Returns
        -------
        OperatingPoints
            Broadcast shape; NaN where the drive does not reach the thrust.

        Raises
        ------
        InputError
            If an airspeed is negative.

        Notes
        -----
        The thrust fixes the propeller's speed, that and its torque the motor current, those the duty in closed form:
        only one root is searched, and the point is an equilibrium of `at_throttle` to rounding.
        """
        air_axis, asked = np.broadcast_arrays(_checked_airspeed(airspeed), np.asarray(thrust, dtype=np.float64))
        shape = air_axis.shape
        flat_airspeed, each = air_axis.ravel(), asked.ravel() / self.count
        disk_airspeed = flat_airspeed * self.inflow_factor
        fastest = self.no_load_speed * _BEYOND_NO_LOAD
        speed = speed_for_thrust(self.propeller, self.air, disk_airspeed, each, fastest)
        state = propeller_state(self.propeller, self.air, disk_airspeed, speed)
        motor_speed = state.speed * self.motor.gear_ratio
        current = self.motor.current_for(state.torque, motor_speed)
        duty = duty_for(self.motor, self.controller, self.battery, current, motor_speed)
        stick = self.controller.throttle(duty)

        state = _only_where(np.isfinite(stick), state)
        duty = np.where(np.isfinite(stick), duty, np.nan)
        circuit = solve_circuit(self.motor, self.controller, self.battery, duty, state.speed * self.motor.gear_ratio)
        voltage = np.full(duty.shape, self.battery.open_circuit_voltage)
        return self._points(flat_airspeed, stick, duty, voltage, state, circuit, shape)

    def at_full(self, airspeed: ArrayLike) -> OperatingPoints:
        """Return the equilibrium at full throttle.

        Parameters
        ----------
        airspeed : array_like
            Of the aircraft [m/s], not negative.

        Returns
        -------
        OperatingPoints
            Shape of `airspeed`.
        """
        return self.at_throttle(airspeed, 1.0)

    def _torque_offered(self, duty: FloatArray, speed: FloatArray, voltage: FloatArray) -> FloatArray:
        motor_speed = speed * self.motor.gear_ratio
        current = solve_circuit(self.motor, self.controller, self.battery, duty, motor_speed, voltage).motor_current
        return self.motor.propeller_torque(current, motor_speed)

    def _points(
        self,
        airspeed: FloatArray,
        stick: FloatArray,
        duty: FloatArray,
        open_circuit_voltage: FloatArray,
        state: PropellerState,
        circuit: Circuit,
        shape: tuple[int, ...],
    ) -> OperatingPoints:
        """Turn the solution into the quantities of the registry."""
        thrust = self.count * state.thrust
        shaft_power = state.torque * state.speed
        heat_of_ripple = self.motor.resistance * circuit.ripple_current**2 / 12.0
        lead_power = circuit.motor_voltage * circuit.motor_current + heat_of_ripple
        battery_power = circuit.battery_voltage * circuit.battery_current
        cell_power = open_circuit_voltage * circuit.battery_current
        propels = (thrust >= 0.0) & (shaft_power > 0.0)
        at_disk = thrust * airspeed * self.inflow_factor
        gained = thrust * airspeed * self.thrust_factor
        no_power = np.isfinite(state.speed) & (circuit.battery_current == 0.0)
        trust, reasons = graded(self.propeller, self.air, airspeed * self.inflow_factor, state)
        values: dict[str, NDArray[np.float64] | NDArray[np.int16]] = {
            "airspeed": airspeed,
            "throttle": stick,
            "duty": duty,
            "rpm": state.speed * RPM_PER_RAD_S,
            "thrust": thrust,
            "torque": state.torque,
            "shaft_power": shaft_power,
            "motor_current": circuit.motor_current,
            "motor_voltage": circuit.motor_voltage,
            "battery_current": circuit.battery_current,
            "battery_voltage": circuit.battery_voltage,
            "battery_power": battery_power,
            "propeller_efficiency": _share(at_disk, self.count * shaft_power, propels),
            "motor_efficiency": _share(shaft_power, lead_power, shaft_power >= 0.0),
            "controller_efficiency": _share(self.count * lead_power, battery_power, lead_power >= 0.0),
            "battery_efficiency": np.where(no_power, 1.0, _share(battery_power, cell_power, cell_power > 0.0)),
            "overall_efficiency": _share(gained, cell_power, propels),
            "winding_temperature": self._winding_temperature(circuit.rms_current, state.speed),
            "outside_polar_share": state.outside_polar_share,
            "stalled_share": state.stalled_share,
            "low_reynolds_share": state.low_reynolds_share,
            "above_divergence_share": state.above_divergence_share,
            "trust": trust,
            "trust_reasons": reasons,
            "status": state.status,
        }
        return OperatingPoints(**{name: array.reshape(shape) for name, array in values.items()})  # type: ignore[arg-type]

    def _winding_temperature(self, current: FloatArray, speed: FloatArray) -> FloatArray:
        if self.air is None or self.air.temperature is None:
            return np.full(current.shape, np.nan)
        return self.motor.steady_temperature(current, speed * self.motor.gear_ratio, self.air.temperature)


def _share(gained: FloatArray, spent: FloatArray, where: NDArray[np.bool_]) -> FloatArray:
    """Return a share of power, NaN where nothing is spent or the condition does not hold."""
    meant = where & (spent > 0.0)
    return np.where(meant, gained, np.nan) / np.where(meant, spent, 1.0)


def _only_where(kept: NDArray[np.bool_], state: PropellerState) -> PropellerState:
    """Return the state with NaN where it is not kept."""
    return PropellerState(
        speed=np.where(kept, state.speed, np.nan),
        thrust=np.where(kept, state.thrust, np.nan),
        torque=np.where(kept, state.torque, np.nan),
        stalled_share=np.where(kept, state.stalled_share, np.nan),
        outside_polar_share=np.where(kept, state.outside_polar_share, np.nan),
        low_reynolds_share=np.where(kept, state.low_reynolds_share, np.nan),
        above_divergence_share=np.where(kept, state.above_divergence_share, np.nan),
        status=state.status,
    )


def _checked_airspeed(airspeed: ArrayLike) -> FloatArray:
    found = np.asarray(airspeed, dtype=np.float64)
    if np.any(found < 0.0):
        raise InputError("airspeed", f"{found.min():g} m/s must not be negative")
    return found


def _checked_throttle(throttle: ArrayLike) -> FloatArray:
    found = np.asarray(throttle, dtype=np.float64)
    if not np.all((found >= 0.0) & (found <= 1.0)):
        raise InputError("throttle", "the stick must lie from 0 to 1")
    return found
