"""What a motor's label says: its constants guessed where only Kv is known, and whether others fit its stator.

All numbers here are from memory, of common brushless outrunners. They are starting values, not data.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

import numpy as np

from bemt.drive.motor import Motor
from bemt.errors import InputError

GUESS_BAND = 0.40  # relative, of a guessed resistance or no-load current; judgement
NO_LOAD_VOLTAGE = 10.0  # V, at which the guessed no-load current is meant

# Classes of motor by stator diameter: middle of the usual Kv [rpm/V], geometric middle of the usual resistance between
# two leads [ohm] and of the usual no-load current at 10 V [A]. From memory.
_CLASSES = (
    (175.0, 0.022, 1.41),  # 50 to 80 mm, propellers of 18 to 30 in
    (500.0, 0.049, 0.95),  # 35 to 42 mm, 12 to 16 in
    (950.0, 0.055, 0.98),  # 28 mm, 9 to 11 in
    (2100.0, 0.077, 1.02),  # 22 to 23 mm, 5 to 6 in
)
# Torque squared per watt of copper loss, over (stator diameter)^4 times height: the torque a layer of current gives
# grows with the square of the diameter, the copper that carries it with the depth of the slots. From memory of some ten
# motors from 11 to 81 mm, most of them within 40 % of it, all within a factor of 2.
_GOODNESS = 2.3e-10  # (N m)^2/W per mm^5
_RESISTANCE_FACTOR = 4.0  # beyond which a resistance does not belong to the label
_USUAL_RESISTANCE = (0.004, 1.0)  # ohm; a guess beyond says that Kv does not belong to the label
_USUAL_HEAT = (0.1, 60.0)  # W of copper loss at the current limit for each cm^3 of stator
_FOUR_DIGITS = re.compile(r"\d{4}", re.ASCII)
_RPM_PER_VOLT = 30.0 / math.pi


@dataclass(frozen=True)
class Stator:
    """A stator by the four digits on a motor.

    Parameters
    ----------
    diameter : float
        [mm].
    height : float
        [mm].

    Raises
    ------
    InputError
        If one of the two is zero.
    """

    diameter: float
    height: float

    def __post_init__(self) -> None:
        """Refuse a stator without size."""
        if self.diameter <= 0.0 or self.height <= 0.0:
            raise InputError("label", f"a stator of {self.diameter:g} by {self.height:g} mm is none")

    @classmethod
    def of(cls, label: str) -> Stator:
        """Read a label.

        Parameters
        ----------
        label : str
            Four digits: two for the diameter, two for the height.

        Returns
        -------
        Stator

        Raises
        ------
        InputError
            If the label is not of this kind.
        """
        if not _FOUR_DIGITS.fullmatch(label):
            raise InputError(
                "label", f'"{label}" is not four digits: two for the diameter of the stator in mm, two for its height'
            )
        return cls(float(label[:2]), float(label[2:]))

    def usual_resistance(self, speed_constant: float) -> float:
        """Return the resistance a motor on this stator would usually have.

        Parameters
        ----------
        speed_constant : float
            Kv [rad/s per V].

        Returns
        -------
        float
            Between two leads [ohm]; fewer turns raise Kv and take R down with its square.
        """
        return 1.0 / (speed_constant**2 * _GOODNESS * self.diameter**4 * self.height)

    def carries(self, speed_constant: float) -> bool:
        """Return whether a winding of this Kv on this stator is of a usual kind.

        Parameters
        ----------
        speed_constant : float
            Kv [rad/s per V].

        Returns
        -------
        bool
        """
        return _USUAL_RESISTANCE[0] <= self.usual_resistance(speed_constant) <= _USUAL_RESISTANCE[1]


def guessed_resistance(speed_constant: float, stator: Stator | None = None) -> float:
    """Return a winding resistance where only Kv is known.

    Parameters
    ----------
    speed_constant : float
        Kv [rad/s per V].
    stator : Stator, optional
        From the motor's label: a better guess, where it fits Kv.

    Returns
    -------
    float
        Between two leads at 20 degrees Celsius [ohm], uncertain by `GUESS_BAND` or more.
    """
    if stator is not None and stator.carries(speed_constant):
        return stator.usual_resistance(speed_constant)
    return _of_class(speed_constant, 1)


def guessed_no_load_current(speed_constant: float) -> float:
    """Return a no-load current where only Kv is known.

    Parameters
    ----------
    speed_constant : float
        Kv [rad/s per V].

    Returns
    -------
    float
        At `NO_LOAD_VOLTAGE` [A], uncertain by `GUESS_BAND` or more.
    """
    return _of_class(speed_constant, 2)


def doubts(motor: Motor, stator: Stator, *, resistance_guessed: bool = False) -> tuple[str, ...]:
    """Say where the constants of a motor are far from those of motors with such a stator.

    Parameters
    ----------
    motor : Motor
        Constants as given.
    stator : Stator
        From the label.
    resistance_guessed : bool
        Whether the resistance comes from the stator itself; then Kv alone is judged.

    Returns
    -------
    tuple of str
        One sentence a doubt; none where all fits.
    """
    usual = stator.usual_resistance(motor.speed_constant)
    size = f"a stator of {stator.diameter:g} by {stator.height:g} mm"
    kv = f"{motor.speed_constant * _RPM_PER_VOLT:.4g} rpm/V"
    found = []
    if not stator.carries(motor.speed_constant):
        found.append(f"{kv} on {size} would mean a winding of {_ohms(usual)}")
    ratio = motor.winding_resistance / usual
    if not resistance_guessed and not 1.0 / _RESISTANCE_FACTOR <= ratio <= _RESISTANCE_FACTOR:
        found.append(f"{_ohms(motor.winding_resistance)} at {kv} on {size}, where some {_ohms(usual)} are usual")
    if motor.current_limit is not None:
        volume = stator.diameter**2 * stator.height * 1e-3
        heat = motor.current_limit**2 * motor.winding_resistance
        if not _USUAL_HEAT[0] <= heat / volume <= _USUAL_HEAT[1]:
            found.append(f"a current limit of {motor.current_limit:g} A, which makes {heat:.3g} W in {size}")
    return tuple(found)


def _of_class(speed_constant: float, column: int) -> float:
    """Interpolate between the classes, both scales logarithmic, held beyond the outer ones."""
    classes = np.log(_CLASSES)
    return float(np.exp(np.interp(np.log(speed_constant * _RPM_PER_VOLT), classes[:, 0], classes[:, column])))


def _ohms(value: float) -> str:
    return f"{value * 1e3:.3g} mohm" if value < 1.0 else f"{value:.3g} ohm"
