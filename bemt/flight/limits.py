"""The limits printed on propeller, motor, controller and battery, and what a winding commonly stands.

Margins to them, and in words where they bind.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.drive import Drive, OperatingPoints, ShaftPoints
from bemt.quantities.registry import WINDING_CEILING

FloatArray = NDArray[np.float64]

_WORDS = {
    "rpm": ("propeller rpm, limit {:g} rpm", "rpm"),
    "motor_current": ("motor current, limit {:g} A", "A"),
    "controller_current": ("controller current, limit {:g} A", "A"),
    "battery_current": ("battery current, limit {:g} A", "A"),
    "winding_temperature": ("winding temperature if held there, ceiling {:g} degC", "K"),
}
_SHORT_WORDS = {
    "rpm": "the propeller's rpm ({:g} rpm)",
    "motor_current": "the motor's current ({:g} A)",
    "controller_current": "the controller's current ({:g} A)",
    "battery_current": "the battery's current ({:g} A)",
    "winding_temperature": "the winding's temperature if held there ({:g} degC)",
}
_BEYOND_ANY = -1e9  # takes the place of an infinite excess where a straight line is drawn between samples


@dataclass(frozen=True)
class Limits:
    """Largest continuous values; None where none is known.

    Parameters
    ----------
    rpm : float, optional
        Of the propeller.
    motor_current, controller_current : float, optional
        Of one motor [A].
    battery_current : float, optional
        Of the pack [A].
    winding_temperature : float, optional
        Of the winding [degree Celsius].
    """

    rpm: float | None = None
    motor_current: float | None = None
    controller_current: float | None = None
    battery_current: float | None = None
    winding_temperature: float | None = None

    @classmethod
    def of(cls, drive: Drive, rpm_limit: float | None) -> Limits:
        """Collect the limits of a drive.

        Parameters
        ----------
        drive : Drive
            Motor, controller and battery.
        rpm_limit : float or None
            Printed on the propeller.

        Returns
        -------
        Limits
            With the common ceiling of the winding where its temperature is modelled.
        """
        return cls(
            rpm=rpm_limit,
            motor_current=drive.motor.current_limit,
            controller_current=drive.controller.current_limit,
            battery_current=drive.battery.current_limit,
            winding_temperature=WINDING_CEILING if drive.models_winding else None,
        )

    def margins(self, points: OperatingPoints | ShaftPoints) -> dict[str, FloatArray]:
        """Return limit less value, by the names of the registry.

        Parameters
        ----------
        points : OperatingPoints or ShaftPoints
            Any shape.

        Returns
        -------
        dict of str to numpy.ndarray
            Shape of the points; NaN where no limit is known, negative beyond a limit.
        """
        values: dict[str, tuple[float | None, FloatArray]] = {"rpm_margin": (self.rpm, points.rpm)}
        if isinstance(points, OperatingPoints):
            values |= {
                "motor_current_margin": (self.motor_current, points.motor_current),
                "controller_current_margin": (self.controller_current, points.motor_current),
                "battery_current_margin": (self.battery_current, points.battery_current),
                "winding_temperature_margin": (self.winding_temperature, points.winding_temperature),
            }
        return {name: (np.nan if limit is None else limit) - value for name, (limit, value) in values.items()}


def describe_limits(
    limits: Limits, airspeed: FloatArray, throttle: FloatArray, values: Mapping[str, NDArray[np.generic]]
) -> tuple[str, ...]:
    """Say in words where each limit binds, the one that binds at the smallest throttle first.

    Parameters
    ----------
    limits : Limits
        Those known.
    airspeed : numpy.ndarray, shape (n_airspeed,)
        Axis of the envelope [m/s].
    throttle : numpy.ndarray, shape (n_throttle,)
        Axis of the envelope.
    values : mapping of str to numpy.ndarray
        The margins over (airspeed, throttle) and, with prefix `level_`, over airspeed where there is an airframe.

    Returns
    -------
    tuple of str
        One sentence for each known limit.
    """

    def margin_of(name: str) -> FloatArray:
        return np.maximum(np.asarray(values[name], dtype=np.float64), _BEYOND_ANY)

    found: list[tuple[float, str]] = []
    for name, (words, unit) in _WORDS.items():
        limit = getattr(limits, name)
        if limit is None:
            continue
        margin = margin_of(f"{name}_margin")
        over_throttle = _negative_spans(throttle, margin[0])
        places = []
        if over_throttle:
            where = "standing still" if airspeed[0] == 0.0 else f"at {airspeed[0]:.1f} m/s"
            places.append(f"{where} from throttle {over_throttle[0][0]:.2f}")
        over_airspeed = _negative_spans(airspeed, margin[:, -1])
        if over_airspeed:
            where = "at full throttle" if throttle[-1] == 1.0 else f"at throttle {throttle[-1]:.2f}"
            places.append(f"{where} {_airspeeds(over_airspeed, airspeed)}")
        level = f"level_{name}_margin"
        over_level = _negative_spans(airspeed, margin_of(level)) if level in values else []
        if over_level:
            places.append(f"in {_steady(values)} {_airspeeds(over_level, airspeed)}")
        head = f"{words.format(limit)}: "
        if places:
            first = over_throttle[0][0] if over_throttle else float(throttle[-1])
            found.append((first, head + "exceeded " + "; ".join(places)))
        elif np.isnan(margin).all():
            found.append((np.inf, head + "not known, no point was solved"))
        else:
            smallest = float(np.nanmin(margin))
            found.append((np.inf, f"{head}not reached, {smallest:.4g} {unit} left at the closest point"))
    return tuple(sentence for _, sentence in sorted(found, key=lambda pair: pair[0]))


def describe_first_limit(
    limits: Limits, standing: OperatingPoints, held: OperatingPoints | None = None, flight: str = "level flight"
) -> str:
    """Say which limit is passed first as the throttle rises, standing still and in steady flight.

    Parameters
    ----------
    limits : Limits
        Those known.
    standing : OperatingPoints, shape (n,)
        Standing still, throttles ascending.
    held : OperatingPoints, shape (m,), optional
        Steady flight, airspeeds ascending.
    flight : str
        What the steady flight is called.

    Returns
    -------
    str
        One sentence.
    """
    known = [name for name in _WORDS if getattr(limits, name) is not None]
    if not known:
        return "what burns first is not known: the case gives no limit of propeller, motor, controller or battery"

    def spans(points: OperatingPoints, axis: FloatArray, name: str) -> list[tuple[float, float]]:
        return _negative_spans(axis, np.maximum(limits.margins(points)[f"{name}_margin"], _BEYOND_ANY))

    def first(found: list[tuple[float, str, str]]) -> str:
        if not found:
            return "none"
        at, name, where = min(found)
        return f"{_SHORT_WORDS[name].format(getattr(limits, name))} from throttle {at:.2f}{where}"

    over_throttle = [(found[0][0], name, "") for name in known if (found := spans(standing, standing.throttle, name))]
    words = f"first beyond a limit as the throttle rises: standing still {first(over_throttle)}"
    if held is None or np.isnan(held.throttle).all():
        return words
    flown = np.isfinite(held.throttle)
    steady = [
        (float(np.interp(edge, held.airspeed[flown], held.throttle[flown])), name, f" at {edge:.1f} m/s")
        for name in known
        for span in spans(held, held.airspeed, name)
        for edge in span
    ]
    return f"{words}; in {flight} {first(steady)}"


def _steady(values: Mapping[str, NDArray[np.generic]]) -> str:
    """Name the steady flight; only what hovers has a figure of merit."""
    return "hover and climb" if "point_figure_of_merit" in values else "level flight"


def _negative_spans(axis: FloatArray, margin: FloatArray) -> list[tuple[float, float]]:
    """Return the spans of an axis over which a margin is negative, their ends by straight lines between samples."""
    negative = margin < 0.0
    edges = np.diff(np.concatenate([[0], negative.astype(np.int8), [0]]))
    spans = []
    for start, stop in zip(np.flatnonzero(edges == 1).tolist(), np.flatnonzero(edges == -1).tolist(), strict=True):
        begin = axis[start] if start == 0 else _zero_between(axis, margin, start - 1)
        end = axis[-1] if stop == axis.size else _zero_between(axis, margin, stop - 1)
        spans.append((float(begin), float(end)))
    return spans


def _zero_between(axis: FloatArray, margin: FloatArray, left: int) -> float:
    """Return where the margin passes zero between two samples, or the negative one where its neighbour is missing."""
    before, after = margin[left], margin[left + 1]
    if np.isnan(before):
        return float(axis[left + 1])
    if np.isnan(after):
        return float(axis[left])
    return float(axis[left] + before / (before - after) * (axis[left + 1] - axis[left]))


def _airspeeds(spans: list[tuple[float, float]], axis: FloatArray) -> str:
    words = []
    for begin, end in spans:
        if begin == axis[0] and end == axis[-1]:
            words.append("at every airspeed of the grid")
        elif begin == axis[0]:
            words.append(f"below {end:.1f} m/s")
        elif end == axis[-1]:
            words.append(f"above {begin:.1f} m/s")
        else:
            words.append(f"from {begin:.1f} to {end:.1f} m/s")
    return " and ".join(words)
