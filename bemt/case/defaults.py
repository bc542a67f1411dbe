"""What serves where a case says nothing: the section of an unknown blade, and the grid of its table."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air
from bemt.blade.geometry import Propeller
from bemt.case.pitch import pitch_over_diameter

FloatArray = NDArray[np.float64]

GUESSED_FAMILY = "four-digit"
GUESSED_CAMBER = 0.04
GUESSED_THICKNESS = 0.11
GUESSED_DRAG_SCALE = 1.2
"""The section of a moulded propeller when nobody knows it: of the guesses tried on open wind-tunnel data of moulded
propellers, the one that missed thrust and power least."""

SECTION_GUESSED = (
    "the section of the blade is a guess: no [[section]] is given, so the default for a moulded propeller of unknown "
    "section serves (family four-digit, camber 4 %, {thickness}, section drag times {drag_scale:g}). Expect some 6 % "
    "of the static thrust and 8 % of the static power as typical error, more for other kinds of blade. "
    "Give the section if you know it."
)

MOTOR_GUESSED = (
    "of the motor only Kv is known; guessed: {guessed}, from memory of motors of its kind, each uncertain by "
    "{band:.0f} % or more. Currents, losses and the winding's heat are no better than that. "
    "Measure both: bemt calibrate finds them from a bench."
)
MOTOR_DOUBTED = (
    'the motor does not look like its label "{label}": {doubt}. From memory of common motors, and crude; some makers '
    "print the size of the can instead of the stator. Check the values."
)

DEFAULT_ADVANCE_RATIOS = 45
_DEFAULT_RPMS = 4
DEFAULT_TIP_MACH = 0.6
_PITCH_MARGIN = 1.25


def default_advance_ratio_end(propeller: Propeller) -> float:
    """Return where a table ends that says nothing about it: somewhat past the advance ratio of no thrust.

    Parameters
    ----------
    propeller : Propeller
        With stations.

    Returns
    -------
    float
        1.25 times the pitch over diameter at 0.75 R, up to the next twentieth; 0.25 to 5.
    """
    end = _PITCH_MARGIN * pitch_over_diameter(propeller)
    return min(max(math.ceil(end * 20.0 - 1e-9) / 20.0, 0.25), 5.0)


def default_rpm(propeller: Propeller, air: Air, advance_ratio: float) -> FloatArray:
    """Return the rotational speeds of a table that says nothing about them.

    Parameters
    ----------
    propeller : Propeller
        With its limit, if any.
    air : Air
        For the speed of sound.
    advance_ratio : float
        Largest one of the table.

    Returns
    -------
    numpy.ndarray, shape (4,)
        Quarters of the rpm limit, or of the rpm at which the helical tip Mach number is 0.6 at that advance ratio; the
        smaller ones rounded to hundreds where they are larger than that.
    """
    limit = propeller.rpm_limit
    if limit is None:
        tip_speed = DEFAULT_TIP_MACH * air.speed_of_sound
        limit = _rounded(60.0 * tip_speed / (propeller.diameter * math.hypot(math.pi, advance_ratio)))
    quarters = [_rounded(limit * share / _DEFAULT_RPMS) for share in range(1, _DEFAULT_RPMS)]
    return np.array([*quarters, limit], dtype=np.float64)


def _rounded(rpm: float) -> float:
    return math.floor(rpm / 100.0) * 100.0 if rpm >= 400.0 else rpm
