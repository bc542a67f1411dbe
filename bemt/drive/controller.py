"""The electronic speed controller, averaged over its switching period."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemt.errors import InputError
from bemt.quantities.checks import require_not_negative, require_one_of, require_positive, require_share

UNPOWERED = ("freewheel", "regenerate", "brake")


@dataclass(frozen=True)
class Controller:
    """A controller by its resistance, idle current and what it does when the wind drives the motor.

    With duty d, motor current I, battery voltage Vb: motor voltage d Vb - I Ron, less (1 - d) Vd where a diode
    freewheels; current drawn from the battery d I + I_idle, and while it chops also 1/2 |I| t f for switching and what
    the ripple costs.

    Parameters
    ----------
    on_resistance : float
        Of the whole current path, two switches in series [ohm].
    current_limit : float, optional
        Largest continuous motor current [A].
    idle_current : float
        Drawn by the electronics whatever the motor does [A].
    unpowered : {"freewheel", "regenerate", "brake"}
        What happens where the wind drives the motor faster than the duty asks for: no current flows back; current flows
        back into the battery; or no current flows back, but at duty zero the leads are shorted. At duty zero the second
        and the third are the same circuit.
    switching_frequency : float, optional
        f [Hz]; switching loss needs it and the time, ripple it and the motor's inductance.
    switching_time : float, optional
        t, rise and fall together [s].
    diode_voltage : float
        Vd of the diodes through which the current freewheels between the pulses [V]; zero where switches do it.
    throttle_map : tuple of (float, float)
        Stick and duty, from stick 0 to stick 1, the duty never falling; straight lines between.

    Raises
    ------
    InputError
        If a value is out of range, the map is none, or a controller with diodes is to regenerate.
    """

    on_resistance: float = 0.0
    current_limit: float | None = None
    idle_current: float = 0.0
    unpowered: str = "freewheel"
    switching_frequency: float | None = None
    switching_time: float | None = None
    diode_voltage: float = 0.0
    throttle_map: tuple[tuple[float, float], ...] = ((0.0, 0.0), (1.0, 1.0))

    def __post_init__(self) -> None:
        """Refuse values that describe no controller."""
        require_not_negative("on_resistance", self.on_resistance, "ohm")
        require_not_negative("idle_current", self.idle_current, "A")
        require_one_of("unpowered", self.unpowered, UNPOWERED)
        require_not_negative("diode_voltage", self.diode_voltage, "V")
        if self.diode_voltage > 0.0 and self.unpowered == "regenerate":
            raise InputError("diode_voltage", "a diode lets no current back: regeneration needs switches in its place")
        for name, unit in (("current_limit", "A"), ("switching_frequency", "Hz"), ("switching_time", "s")):
            if getattr(self, name) is not None:
                require_positive(name, getattr(self, name), unit)
        if self.switching_share >= 1.0:
            raise InputError("switching_time", "switching would take longer than the period of switching_frequency")
        self._check_map()

    def _check_map(self) -> None:
        if len(self.throttle_map) < 2 or any(len(pair) != 2 for pair in self.throttle_map):
            raise InputError("throttle_map", "needs at least two pairs of stick and duty")
        for stick, duty in self.throttle_map:
            require_share("throttle_map", stick)
            require_share("throttle_map", duty)
        sticks, duties = np.array(self.throttle_map, dtype=np.float64).T
        if sticks[0] != 0.0 or sticks[-1] != 1.0 or np.any(np.diff(sticks) <= 0.0):
            raise InputError("throttle_map", "the stick must rise from 0 to 1")
        if np.any(np.diff(duties) < 0.0) or duties[-1] <= duties[0]:
            raise InputError("throttle_map", "the duty must rise with the stick")

    @property
    def switching_share(self) -> float:
        """Part of the motor current lost to switching while the controller chops, t f/2."""
        if self.switching_frequency is None or self.switching_time is None:
            return 0.0
        return 0.5 * self.switching_time * self.switching_frequency

    @property
    def full_duty(self) -> float:
        """Duty at full stick."""
        return self.throttle_map[-1][1]

    def duty(self, throttle: ArrayLike) -> NDArray[np.float64]:
        """Return the duty of a stick position.

        Parameters
        ----------
        throttle : array_like
            Stick, 0 to 1.

        Returns
        -------
        numpy.ndarray
            Duty, 0 to 1.
        """
        sticks, duties = np.array(self.throttle_map, dtype=np.float64).T
        found: NDArray[np.float64] = np.interp(np.asarray(throttle, dtype=np.float64), sticks, duties)
        return found

    def throttle(self, duty: ArrayLike) -> NDArray[np.float64]:
        """Return the smallest stick position that gives a duty.

        Parameters
        ----------
        duty : array_like
            Duty.

        Returns
        -------
        numpy.ndarray
            Stick, 0 to 1; NaN where no position gives this duty.
        """
        sticks, duties = np.array(self.throttle_map, dtype=np.float64).T
        distinct, first = np.unique(duties, return_index=True)
        duty = np.asarray(duty, dtype=np.float64)
        # Where the duty stays flat and then rises, the rise starts at the last stick of the flat part.
        _, from_the_end = np.unique(duties[::-1], return_index=True)
        last = duties.size - 1 - from_the_end
        segment = np.clip(np.searchsorted(distinct, duty, side="right") - 1, 0, distinct.size - 2)
        share = (duty - distinct[segment]) / (distinct[segment + 1] - distinct[segment])
        stick = np.where(
            share == 0.0,
            sticks[first[segment]],
            sticks[last[segment]] + share * (sticks[first[segment + 1]] - sticks[last[segment]]),
        )
        return np.where((duty >= distinct[0]) & (duty <= distinct[-1]), stick, np.nan)
