"""A propeller on a drive that is not known: points up to the shaft."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.air import Air
from bemt.drive.loads import (
    RPM_PER_RAD_S,
    PropellerLoads,
    PropellerState,
    graded,
    propeller_state,
    speed_for_thrust,
)
from bemt.drive.roots import FloatArray
from bemt.quantities.checks import require_positive


@dataclass(frozen=True, eq=False)
class ShaftPoints:
    """Operating points of a propeller up to its shaft, arrays of one shape; NaN where there is none.

    Parameters
    ----------
    airspeed : numpy.ndarray
        Of the aircraft [m/s].
    rpm, thrust, torque, shaft_power : numpy.ndarray
        [rpm], [N], [N m], [W].
    propeller_efficiency : numpy.ndarray
        Thrust power over shaft power, NaN where the propeller does not propel.
    outside_polar_share, stalled_share, low_reynolds_share, above_divergence_share : numpy.ndarray
        Shares of the propeller's span.
    trust, trust_reasons : numpy.ndarray of int
        Codes and bits of the registry.
    status : numpy.ndarray of int
        Codes of the registry.
    """

    airspeed: FloatArray
    rpm: FloatArray
    thrust: FloatArray
    torque: FloatArray
    shaft_power: FloatArray
    propeller_efficiency: FloatArray
    outside_polar_share: FloatArray
    stalled_share: FloatArray
    low_reynolds_share: FloatArray
    above_divergence_share: FloatArray
    trust: NDArray[np.int16]
    trust_reasons: NDArray[np.int16]
    status: NDArray[np.int16]


@dataclass(frozen=True, eq=False)
class BarePropeller:
    """One propeller turned by something that can turn it at any rpm up to a highest one.

    Parameters
    ----------
    propeller : PropellerLoads
        Loads of the propeller.
    highest_rpm : float
        Takes the place of full throttle [rpm].
    air : Air, optional
        Air of all points; None: the propeller's own.
    inflow_factor : float
        Share of the airspeed the disk sees.

    Raises
    ------
    InputError
        If the highest rpm or the factor is not above zero.
    """

    propeller: PropellerLoads
    highest_rpm: float
    air: Air | None = None
    inflow_factor: float = 1.0

    def __post_init__(self) -> None:
        """Refuse values that turn no propeller."""
        require_positive("rpm", self.highest_rpm)
        require_positive("inflow_factor", self.inflow_factor)

    @property
    def count(self) -> int:
        """Number of propellers."""
        return 1

    @property
    def no_load_speed(self) -> float:
        """Highest angular speed [rad/s]."""
        return self.highest_rpm / RPM_PER_RAD_S

    def at_rpm(self, airspeed: ArrayLike, rpm: ArrayLike) -> ShaftPoints:
        """Return the points at given rpm.

        Parameters
        ----------
        airspeed : array_like
            Of the aircraft [m/s].
        rpm : array_like
            Broadcast against `airspeed`; NaN where none is asked.

        Returns
        -------
        ShaftPoints
            Broadcast shape.
        """
        air_axis, turns = np.broadcast_arrays(np.asarray(airspeed, np.float64), np.asarray(rpm, np.float64))
        flat_airspeed = air_axis.ravel()
        disk_airspeed = flat_airspeed * self.inflow_factor
        state = propeller_state(self.propeller, self.air, disk_airspeed, turns.ravel() / RPM_PER_RAD_S)
        return self._points(flat_airspeed, state, air_axis.shape)

    def at_thrust(self, airspeed: ArrayLike, thrust: ArrayLike) -> ShaftPoints:
        """Return the points at which the propeller gives a thrust.

        Parameters
        ----------
        airspeed : array_like
            Of the aircraft [m/s].
        thrust : array_like
            [N], NaN where none is asked; broadcast against `airspeed`.

        Returns
        -------
        ShaftPoints
            Broadcast shape; NaN where the thrust is not reached up to the highest rpm.
        """
        air_axis, asked = np.broadcast_arrays(np.asarray(airspeed, np.float64), np.asarray(thrust, np.float64))
        flat_airspeed = air_axis.ravel()
        disk_airspeed = flat_airspeed * self.inflow_factor
        speed = speed_for_thrust(self.propeller, self.air, disk_airspeed, asked.ravel(), self.no_load_speed)
        speed = np.where(speed <= self.no_load_speed, speed, np.nan)
        state = propeller_state(self.propeller, self.air, disk_airspeed, speed)
        return self._points(flat_airspeed, state, air_axis.shape)

    def at_full(self, airspeed: ArrayLike) -> ShaftPoints:
        """Return the points at the highest rpm.

        Parameters
        ----------
        airspeed : array_like
            Of the aircraft [m/s].

        Returns
        -------
        ShaftPoints
            Shape of `airspeed`.
        """
        return self.at_rpm(airspeed, self.highest_rpm)

    def _points(self, airspeed: FloatArray, state: PropellerState, shape: tuple[int, ...]) -> ShaftPoints:
        """Turn the solution into the quantities of the registry."""
        disk_airspeed = airspeed * self.inflow_factor
        shaft_power = state.torque * state.speed
        propels = (state.thrust >= 0.0) & (shaft_power > 0.0)
        efficiency = np.where(propels, state.thrust * disk_airspeed, np.nan) / np.where(propels, shaft_power, 1.0)
        trust, reasons = graded(self.propeller, self.air, disk_airspeed, state)
        return ShaftPoints(
            airspeed=airspeed.reshape(shape),
            rpm=(state.speed * RPM_PER_RAD_S).reshape(shape),
            thrust=state.thrust.reshape(shape),
            torque=state.torque.reshape(shape),
            shaft_power=shaft_power.reshape(shape),
            propeller_efficiency=efficiency.reshape(shape),
            outside_polar_share=state.outside_polar_share.reshape(shape),
            stalled_share=state.stalled_share.reshape(shape),
            low_reynolds_share=state.low_reynolds_share.reshape(shape),
            above_divergence_share=state.above_divergence_share.reshape(shape),
            trust=trust.reshape(shape),
            trust_reasons=reasons.reshape(shape),
            status=state.status.reshape(shape),
        )
