"""The airframe in level flight or hovering, and what it does to the propeller's inflow and thrust."""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.air.atmosphere import STANDARD_GRAVITY
from bemt.errors import InputError
from bemt.quantities.checks import require_not_negative, require_positive


@dataclass(frozen=True)
class Airframe:
    """A winged aircraft by its weight and drag.

    Give either `wing_area`, `cd0` and `k`, or a `drag_table`.

    Parameters
    ----------
    mass : float
        [kg].
    wing_area : float, optional
        Reference area of the coefficients [m2].
    cd0 : float, optional
        Drag coefficient without lift.
    k : float, optional
        Growth of the drag coefficient with the square of the lift coefficient.
    cl_max : float, optional
        Largest lift coefficient; without it (or a wing area) no stall speed is known.
    cruise_speed : float, optional
        Airspeed of the point "cruise" [m/s].
    drag_table : tuple of (float, float), optional
        Airspeed [m/s] and drag [N] in level flight at the air and mass at hand, airspeeds ascending.

    Raises
    ------
    InputError
        If a value is out of range, or neither or both kinds of drag are given.
    """

    mass: float
    wing_area: float | None = None
    cd0: float | None = None
    k: float | None = None
    cl_max: float | None = None
    cruise_speed: float | None = None
    drag_table: tuple[tuple[float, float], ...] | None = None

    def __post_init__(self) -> None:
        """Refuse values that describe no aircraft."""
        require_positive("mass", self.mass, "kg")
        for name, unit in (("wing_area", "m2"), ("cd0", ""), ("cl_max", ""), ("cruise_speed", "m/s")):
            if getattr(self, name) is not None:
                require_positive(name, getattr(self, name), unit)
        if self.k is not None:
            require_not_negative("k", self.k)
        if self.drag_table is not None:
            if self.cd0 is not None or self.k is not None:
                raise InputError("drag", "give either cd0 and k or a table of airspeed and drag, not both")
            _check_table(self.drag_table)
        elif self.cd0 is None or self.k is None:
            raise InputError("drag", "needs cd0 and k, or a table of airspeed and drag")
        elif self.wing_area is None:
            raise InputError("wing_area", "needed to make a drag of cd0 and k")

    @property
    def weight(self) -> float:
        """Mass times standard gravity [N]."""
        return self.mass * STANDARD_GRAVITY

    def stall_speed(self, density: float) -> float | None:
        """Return the slowest airspeed of level flight.

        Parameters
        ----------
        density : float
            Of the air [kg/m3].

        Returns
        -------
        float or None
            sqrt(2 m g/(rho S cl_max)) [m/s]; None without a largest lift coefficient or a wing area.
        """
        if self.cl_max is None or self.wing_area is None:
            return None
        return math.sqrt(2.0 * self.weight / (density * self.wing_area * self.cl_max))

    @property
    def fastest(self) -> float:
        """Airspeed at which the drag ceases to be known [m/s]; infinite without a drag table."""
        return math.inf if self.drag_table is None else self.drag_table[-1][0]

    def slowest(self, density: float) -> float:
        """Return the airspeed at which the drag begins to be known [m/s].

        Parameters
        ----------
        density : float
            Of the air [kg/m3].

        Returns
        -------
        float
            The stall speed, or the start of the drag table where that is faster; 0 where neither is given.
        """
        stall = self.stall_speed(density) or 0.0
        return stall if self.drag_table is None else max(stall, self.drag_table[0][0])

    def drag(self, airspeed: ArrayLike, density: float) -> NDArray[np.float64]:
        """Return the drag in level flight.

        Parameters
        ----------
        airspeed : array_like
            [m/s].
        density : float
            Of the air [kg/m3]; a drag table is taken to be of this air.

        Returns
        -------
        numpy.ndarray
            q S (cd0 + k (m g/(q S))^2) or the table's value, straight lines between its rows [N]; NaN at rest, below
            the stall speed and outside the table.
        """
        airspeed = np.asarray(airspeed, dtype=np.float64)
        flies = (airspeed > 0.0) & (airspeed >= self.slowest(density))
        if self.drag_table is not None:
            axis, values = np.array(self.drag_table, dtype=np.float64).T
            return np.where(flies & (airspeed <= axis[-1]), np.interp(airspeed, axis, values), np.nan)
        area, cd0, k = (float(value or 0.0) for value in (self.wing_area, self.cd0, self.k))
        pressure_area = np.where(flies, 0.5 * density * airspeed**2 * area, np.nan)
        found: NDArray[np.float64] = pressure_area * cd0 + k * self.weight**2 / pressure_area
        return found


@dataclass(frozen=True)
class Multirotor:
    """An aircraft without a wing, held up by its propellers, their shafts upright.

    Parameters
    ----------
    mass : float
        [kg].
    drag_table : tuple of (float, float), optional
        Airspeed [m/s] and drag [N] of the whole craft climbing straight up in the air at hand, airspeeds ascending from
        above 0. Without it the drag of climbing is left out, and climb rates are upper ends.

    Raises
    ------
    InputError
        If a value is out of range.
    """

    mass: float
    drag_table: tuple[tuple[float, float], ...] | None = None

    def __post_init__(self) -> None:
        """Refuse values that describe no aircraft."""
        require_positive("mass", self.mass, "kg")
        if self.drag_table is not None:
            _check_table(self.drag_table)
            if self.drag_table[0][0] == 0.0:
                raise InputError("drag.airspeed", "hovering at 0 m/s has no drag: the table begins above it")

    @property
    def weight(self) -> float:
        """Mass times standard gravity [N]."""
        return self.mass * STANDARD_GRAVITY

    @property
    def fastest(self) -> float:
        """Climb speed at which the drag ceases to be known [m/s]; infinite without a drag table."""
        return math.inf if self.drag_table is None else self.drag_table[-1][0]

    def drag(self, airspeed: ArrayLike) -> NDArray[np.float64]:
        """Return the drag of climbing straight up.

        Parameters
        ----------
        airspeed : array_like
            Speed of the climb [m/s].

        Returns
        -------
        numpy.ndarray
            The table's value, straight lines between its rows and from none at rest [N]; zero without a table, NaN
            beyond it.
        """
        airspeed = np.asarray(airspeed, dtype=np.float64)
        if self.drag_table is None:
            return np.where(np.isfinite(airspeed), 0.0, np.nan)
        axis, values = np.array(((0.0, 0.0), *self.drag_table), dtype=np.float64).T
        return np.where(airspeed <= axis[-1], np.interp(airspeed, axis, values), np.nan)


def _check_table(table: tuple[tuple[float, float], ...]) -> None:
    """Refuse pairs that are no table of airspeed and drag."""
    if len(table) < 2 or any(len(pair) != 2 for pair in table):
        raise InputError("drag", "the table needs at least two pairs of airspeed and drag")
    for airspeed, drag in table:
        require_not_negative("drag.airspeed", airspeed, "m/s")
        require_positive("drag.drag", drag, "N")
    if any(after[0] <= before[0] for before, after in itertools.pairwise(table)):
        raise InputError("drag.airspeed", "must rise strictly from row to row")


@dataclass(frozen=True)
class Installation:
    """A body before or behind the propeller, as two multipliers.

    Parameters
    ----------
    inflow_factor : float
        Of the airspeed the disk sees.
    thrust_factor : float
        Of the thrust that reaches the airframe.

    Raises
    ------
    InputError
        If a factor is not above zero.
    """

    inflow_factor: float = 1.0
    thrust_factor: float = 1.0

    def __post_init__(self) -> None:
        """Refuse factors that describe no installation."""
        require_positive("inflow_factor", self.inflow_factor)
        require_positive("thrust_factor", self.thrust_factor)
