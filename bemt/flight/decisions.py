"""What a builder decides by, in words: lift, throttle, losses, the first limit, drag without power."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from bemt.drive import Drive, OperatingPoints
from bemt.flight.hover import UprightFlight, figure_of_merit
from bemt.flight.level import LevelFlight, Points
from bemt.flight.unpowered import unpowered_drag

_LIFT_OFF = 1.2  # of the stall speed
_CRUISE_THROTTLE = (0.3, 0.4)


def describe_flight(steady: LevelFlight | UprightFlight, points: Points, names: tuple[str, ...]) -> tuple[str, ...]:
    """Say whether it takes off, what throttle it then needs, and where the power goes.

    Parameters
    ----------
    steady : LevelFlight or UprightFlight
        Airframe and what pulls it.
    points : OperatingPoints or ShaftPoints, shape (n,)
        The named points.
    names : tuple of str, length n
        Their names.

    Returns
    -------
    tuple of str
        Sentences; those that have no meaning here are left out.
    """
    at = {name: _only(points, k) for k, name in enumerate(names)}
    wing = isinstance(steady, LevelFlight)
    where = "cruise" if wing else "hover"
    held = at[where]
    found = [_take_off(steady, at["static"]) if isinstance(steady, LevelFlight) else _lift(steady, at["static"])]
    if np.isnan(held.rpm[0]):
        return tuple(found)
    if isinstance(held, OperatingPoints):
        found.append(_throttle(float(held.throttle[0]), f"{where} at {held.airspeed[0]:.1f} m/s" if wing else where))
    if isinstance(steady.source, Drive) and isinstance(held, OperatingPoints):
        found.append(_chain(steady, steady.source, held, where))
    elif wing:
        found.append(
            f"at cruise the propeller makes {100 * held.propeller_efficiency[0]:.1f} % of {held.shaft_power[0]:.4g} W "
            "of shaft power into thrust power"
        )
    else:
        merit = _merit(steady, held)
        found.append(f"hover takes {held.shaft_power[0]:.4g} W at the shaft, figure of merit {merit:.2f}")
    if isinstance(steady, LevelFlight):
        found.append(_unpowered(steady, float(held.airspeed[0])))
    return tuple(found)


def _only(points: Points, k: int) -> Points:
    return type(points)(**{name: array[k : k + 1] for name, array in vars(points).items()})


def _merit(steady: LevelFlight | UprightFlight, points: Points) -> float:
    source = steady.source
    air = source.air or source.propeller.air
    return float(figure_of_merit(points, source.count, source.propeller.diameter, air.density)[0])


def _take_off(steady: LevelFlight, static: Points) -> str:
    ratio = steady.thrust_factor * float(static.thrust[0]) / steady.airframe.weight
    full = "full throttle" if isinstance(steady.source, Drive) else "the highest rpm"
    words = f"take-off: full thrust standing still is {ratio:.2f} of the weight"
    stall = steady.airframe.stall_speed(steady.density)
    if stall is None:
        return words
    climb = float(steady.climb_rate(np.array([_LIFT_OFF * stall]))[0])
    leaves = f"gives a climb of {climb:.1f} m/s" if climb > 0.0 else "gives no climb: it does not take off"
    return f"{words}; at {_LIFT_OFF:g} times the stall speed, where it leaves the ground, {full} {leaves}"


def _lift(steady: UprightFlight, static: Points) -> str:
    ratio = steady.thrust_factor * float(static.thrust[0]) / steady.airframe.weight
    if not ratio > 1.0:
        return f"it does not lift off: full thrust standing still is {ratio:.2f} of the weight"
    return f"full thrust standing still is {ratio:.2f} of the weight; about 2 is wanted (common practice, no source)"


def _throttle(throttle: float, what: str) -> str:
    words = f"{what} takes {100 * throttle:.0f} % throttle"
    if what == "hover":
        return words
    low, high = _CRUISE_THROTTLE
    place = "below" if throttle < low else "above" if throttle > high else "inside"
    return f"{words}, {place} the usual {100 * low:.0f} to {100 * high:.0f} % (common practice, no source)"


def _chain(steady: LevelFlight | UprightFlight, drive: Drive, held: OperatingPoints, where: str) -> str:
    """Say which share of the cells' power each part passes on, and which part loses most."""

    def value(name: str) -> float:
        return float(getattr(held, name)[0])

    cells = drive.battery.open_circuit_voltage * value("battery_current")
    terminals = value("battery_power")
    leads = drive.count * value("motor_current") * value("motor_voltage")
    shafts = drive.count * value("shaft_power")
    if isinstance(steady, LevelFlight):
        left = value("thrust") * value("airspeed") * steady.thrust_factor
        share = value("propeller_efficiency")
        end = f"{left:.3g} W move the aircraft, overall {100 * value('overall_efficiency'):.1f} %"
    else:
        share = _merit(steady, held)
        left = share * shafts
        end = f"{left:.3g} W is the least that this thrust takes on disks of this size"
    parts = {
        "battery": (cells - terminals, value("battery_efficiency")),
        "controller": (terminals - leads, value("controller_efficiency")),
        "motor": (leads - shafts, value("motor_efficiency")),
        "propeller": (shafts - left, share),
    }
    listed = ", ".join(f"{part} {max(lost, 0.0):.3g} W ({100 * kept:.1f} %)" for part, (lost, kept) in parts.items())
    most = max(parts, key=lambda part: parts[part][0])
    what = "efficiency" if isinstance(steady, LevelFlight) else "efficiency; of the propeller its figure of merit"
    return f"at {where} the cells give {cells:.3g} W; lost ({what}): {listed}; {end}. The {most} loses most"


def _unpowered(steady: LevelFlight, airspeed: float) -> str:
    drags = {name: float(array[0]) for name, array in unpowered_drag(steady.source, np.array([airspeed])).items()}
    words = [f"held still {_newton(drags['stopped_drag'])}"]
    if "freewheeling_drag" in drags:
        words.append(f"freewheeling {_turning(drags, 'freewheeling')}")
    words.append(f"windmilling without friction {_turning(drags, 'windmilling')}")
    drag = float(steady.drag(np.array([airspeed]))[0])
    who = "propellers" if steady.source.count > 1 else "propeller"
    return f"drag of the unpowered {who} at {airspeed:.1f} m/s: {', '.join(words)}; the airframe's own {drag:.3g} N"


def _newton(value: float) -> str:
    return "not known" if np.isnan(value) else f"{value:.3g} N"


def _turning(drags: Mapping[str, float], state: str) -> str:
    drag = _newton(drags[f"{state}_drag"])
    return drag if np.isnan(drags[f"{state}_rpm"]) else f"{drag} at {drags[f'{state}_rpm']:.0f} rpm"
