"""What the drive asks of a propeller: its loads at an airspeed and rpm, and the rpm at which they reach a value."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.drive.roots import FloatArray, IndexArray, bracketed_root
from bemt.quantities.registry import SHARES, STATUS_CONVERGED, STATUS_NOT_CONVERGED
from bemt.table.validity import grade

RPM_PER_RAD_S = 30.0 / math.pi

# Nodes over the speed range at one airspeed. They only have to part the several equilibria a stalled, wind-driven
# blade can have; the root inside a cell is refined to rounding.
_NODES = 33
_WIDENING = 1.5
_MOST_WIDENINGS = 14


class Loads(Protocol):
    """Loads of one propeller, arrays of one shape."""

    @property
    def thrust(self) -> NDArray[np.float64]:
        """Thrust [N], NaN outside the table."""
        ...

    @property
    def torque(self) -> NDArray[np.float64]:
        """Torque taken from the shaft [N m], NaN outside the table."""
        ...

    @property
    def stalled_share(self) -> NDArray[np.float64]:
        """Stalled share of the span."""
        ...

    @property
    def outside_polar_share(self) -> NDArray[np.float64]:
        """Share of the span outside its polar data."""
        ...

    @property
    def low_reynolds_share(self) -> NDArray[np.float64]:
        """Share of the span below a Reynolds number of 60 000."""
        ...

    @property
    def above_divergence_share(self) -> NDArray[np.float64]:
        """Share of the span above the drag-divergence Mach number."""
        ...

    @property
    def status(self) -> NDArray[Any]:
        """Status of the solution behind the loads."""
        ...


class PropellerLoads(Protocol):
    """A propeller that can be asked for its loads."""

    @property
    def diameter(self) -> float:
        """Diameter [m]."""
        ...

    @property
    def air(self) -> Air:
        """Air of loads that are asked for without one."""
        ...

    @property
    def tip_divergence_mach(self) -> float:
        """Helical tip Mach number from which drag rises steeply; infinite where it is not known."""
        ...

    @property
    def section_guessed(self) -> bool:
        """Whether nobody knows the section of the blade."""
        ...

    def loads(self, airspeed: Any, rpm: Any, air: Air | None = None) -> Loads:
        """Return the loads of one propeller.

        Parameters
        ----------
        airspeed : array_like
            Of the air the disk meets [m/s].
        rpm : array_like
            Broadcast against `airspeed`.
        air : Air, optional
            Of all points; without one the propeller's own.

        Returns
        -------
        Loads
            Broadcast shape.
        """
        ...


@dataclass(frozen=True, eq=False)
class PropellerState:
    """Loads of one propeller at given points; NaN and status "not converged" where there is no answer.

    Parameters
    ----------
    speed : numpy.ndarray, shape (n,)
        Angular speed [rad/s].
    thrust, torque : numpy.ndarray, shape (n,)
        [N], [N m].
    stalled_share, outside_polar_share, low_reynolds_share, above_divergence_share : numpy.ndarray, shape (n,)
        Shares of the span.
    status : numpy.ndarray of int, shape (n,)
        Codes of the registry.
    """

    speed: FloatArray
    thrust: FloatArray
    torque: FloatArray
    stalled_share: FloatArray
    outside_polar_share: FloatArray
    low_reynolds_share: FloatArray
    above_divergence_share: FloatArray
    status: NDArray[np.int16]


@dataclass(frozen=True, eq=False)
class LoadCurves:
    """Thrust and torque over the speed range, once for each airspeed.

    Parameters
    ----------
    airspeed : numpy.ndarray, shape (n,)
        Of the air the disk meets [m/s].
    speed : numpy.ndarray, shape (n, m)
        Angular speeds from zero to beyond the fastest equilibrium [rad/s].
    thrust, torque : numpy.ndarray, shape (n, m)
        [N], [N m].
    """

    airspeed: FloatArray
    speed: FloatArray
    thrust: FloatArray
    torque: FloatArray


def propeller_state(
    propeller: PropellerLoads, air: Air | None, airspeed: FloatArray, speed: FloatArray
) -> PropellerState:
    """Return the loads at points that may be missing.

    Parameters
    ----------
    propeller : PropellerLoads
        Propeller.
    air : Air or None
        Air of the point; None: the propeller's own.
    airspeed : numpy.ndarray, shape (n,)
        Of the air the disk meets [m/s].
    speed : numpy.ndarray, shape (n,)
        Angular speed [rad/s]; NaN where there is none.

    Returns
    -------
    PropellerState
        Zero loads in still air at rest, whatever the propeller's table says there.
    """
    at_rest = (speed == 0.0) & (airspeed == 0.0)
    asked = np.isfinite(speed) & np.isfinite(airspeed) & ~at_rest
    thrust, torque = (np.where(at_rest, 0.0, np.nan) for _ in range(2))
    shares = {name: np.where(at_rest, 0.0, np.nan) for name in SHARES}
    status = np.where(at_rest, STATUS_CONVERGED, STATUS_NOT_CONVERGED).astype(np.int16)
    if asked.any():
        loads = propeller.loads(airspeed[asked], speed[asked] * RPM_PER_RAD_S, air=air)
        thrust[asked], torque[asked] = loads.thrust, loads.torque
        for name, share in shares.items():
            share[asked] = getattr(loads, name)
        status[asked] = loads.status
        missing = np.isnan(thrust) | np.isnan(torque)
        status[missing] = STATUS_NOT_CONVERGED
    else:
        missing = np.isnan(thrust)
    for array in (thrust, torque, *shares.values()):
        array[missing] = np.nan
    return PropellerState(np.where(missing, np.nan, speed), thrust, torque, **shares, status=status)


def graded(
    propeller: PropellerLoads, air: Air | None, airspeed: FloatArray, state: PropellerState
) -> tuple[NDArray[np.int16], NDArray[np.int16]]:
    """Grade how far the loads of points can be trusted.

    Parameters
    ----------
    propeller : PropellerLoads
        Propeller.
    air : Air or None
        Air of the points; None: the propeller's own.
    airspeed : numpy.ndarray, shape (n,)
        Of the air the disk meets [m/s].
    state : PropellerState
        The points.

    Returns
    -------
    trust, reasons : numpy.ndarray of int16, shape (n,)
        As `bemt.table.validity.grade`.
    """
    tip_mach = np.hypot(airspeed, 0.5 * propeller.diameter * state.speed) / (air or propeller.air).speed_of_sound
    return grade(
        state.status,
        {name: getattr(state, name) for name in SHARES},
        tip_mach - propeller.tip_divergence_mach,
        section_guessed=propeller.section_guessed,
    )


def load_curves(propeller: PropellerLoads, air: Air | None, airspeed: FloatArray, fastest: float) -> LoadCurves:
    """Return thrust and torque over the speed range at each airspeed.

    Parameters
    ----------
    propeller : PropellerLoads
        Propeller.
    air : Air or None
        Air of the point; None: the propeller's own.
    airspeed : numpy.ndarray, shape (n,)
        Of the air the disk meets [m/s].
    fastest : float
        Angular speed beyond which nothing drives the propeller but the wind [rad/s].

    Returns
    -------
    LoadCurves
        Each range reaches `fastest` and, in the wind, the speed at which the propeller takes torque, so that every
        equilibrium of a drive lies inside.
    """
    top = np.full(airspeed.shape, fastest)
    for _ in range(_MOST_WIDENINGS):
        driven = np.flatnonzero(propeller_state(propeller, air, airspeed, top).torque <= 0.0)
        if driven.size == 0:
            break
        top[driven] *= _WIDENING
    speed = top[:, np.newaxis] * np.linspace(0.0, 1.0, _NODES)
    flat_airspeed = np.repeat(airspeed, _NODES)
    state = propeller_state(propeller, air, flat_airspeed, speed.ravel())
    return LoadCurves(airspeed, speed, state.thrust.reshape(speed.shape), state.torque.reshape(speed.shape))


def last_falling_crossing(
    curves: LoadCurves,
    row: IndexArray,
    nodes: FloatArray,
    function: Callable[[FloatArray, IndexArray], FloatArray],
) -> FloatArray:
    """Return the fastest speed at which a function falls through zero.

    Parameters
    ----------
    curves : LoadCurves
        Give the speeds of the nodes.
    row : numpy.ndarray of int, shape (n,)
        Row of the curves each point belongs to.
    nodes : numpy.ndarray, shape (n, m)
        Values of the function at the nodes of its row; NaN where unknown.
    function : callable
        Takes speeds (k,) and the indices (k,) of points; returns values (k,).

    Returns
    -------
    numpy.ndarray, shape (n,)
        Angular speed [rad/s]; NaN where no two neighbouring nodes enclose a fall through zero.
    """
    falls = (nodes[:, :-1] > 0.0) & (nodes[:, 1:] <= 0.0)
    point = np.flatnonzero(falls.any(axis=1))
    cell = falls.shape[1] - 1 - np.argmax(falls[point, ::-1], axis=1)
    found = np.full(row.shape, np.nan)
    found[point] = bracketed_root(
        lambda speed, index: function(speed, point[index]),
        curves.speed[row[point], cell],
        curves.speed[row[point], cell + 1],
        nodes[point, cell],
        nodes[point, cell + 1],
    )
    return found


def speed_for_thrust(
    propeller: PropellerLoads, air: Air | None, airspeed: FloatArray, thrust: FloatArray, fastest: float
) -> FloatArray:
    """Return the speed at which one propeller gives a thrust.

    Parameters
    ----------
    propeller : PropellerLoads
        Propeller.
    air : Air or None
        Air of the point; None: the propeller's own.
    airspeed : numpy.ndarray, shape (n,)
        Of the air the disk meets [m/s].
    thrust : numpy.ndarray, shape (n,)
        Thrust asked of one propeller [N]; NaN where none is asked.
    fastest : float
        Angular speed up to which the search goes at least [rad/s].

    Returns
    -------
    numpy.ndarray, shape (n,)
        Angular speed [rad/s]; NaN where the thrust is not reached.
    """
    curves = load_curves(propeller, air, airspeed, fastest)

    def short_of(speed: FloatArray, index: IndexArray) -> FloatArray:
        return thrust[index] - propeller_state(propeller, air, airspeed[index], speed).thrust

    return last_falling_crossing(curves, np.arange(airspeed.size), thrust[:, np.newaxis] - curves.thrust, short_of)
