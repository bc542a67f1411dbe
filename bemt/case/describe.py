"""A case in plain words: what is in it, and what it is ready for."""

from __future__ import annotations

import math
import textwrap

import numpy as np

from bemt.case.load import Case
from bemt.case.pitch import chord_line_angle, pitch_over_diameter
from bemt.drive.motor import RESISTANCE_TEMPERATURE
from bemt.flight.airframe import Airframe, Multirotor
from bemt.rotor.elements import blade_elements
from bemt.section.family import family

_INCH = 0.0254
_INDENT = 12
_WIDTH = 100
_NO_BREAK = "\u00a0"  # keeps a number with its % while lines are wrapped
_RPM = 30.0 / math.pi


def describe(case: Case) -> str:
    """Describe a case.

    Parameters
    ----------
    case : Case
        As loaded.

    Returns
    -------
    str
        Lines of text, without a line end at the end.

    Raises
    ------
    InputError
        If blade and sections do not fit each other.
    """
    parts = [
        ("Propeller", _propeller(case)),
        ("Sections", _sections(case)),
        ("Air", _air(case)),
        ("Grid", _grid(case)),
        ("Motor", _motor(case)),
        ("Controller", _controller(case)),
        ("Battery", _battery(case)),
        ("Airframe", _airframe(case)),
        ("Remarks", list(case.notices)),
        ("Ready for", _readiness(case)),
    ]
    lines = [case.title or case.path]
    for heading, entries in parts:
        for index, entry in enumerate(entries):
            first = f"{heading if index == 0 else '':<{_INDENT}}"
            whole = entry.replace(" %", _NO_BREAK + "%")
            lines += textwrap.wrap(whole, _WIDTH, initial_indent=first, subsequent_indent=" " * (_INDENT + 2))
    return "\n".join(lines).replace(_NO_BREAK, " ")


def _propeller(case: Case) -> list[str]:
    propeller, stations = case.propeller, case.propeller.stations
    diameter = propeller.diameter
    count = f"{propeller.blades} blade{'s' if propeller.blades > 1 else ''}"
    limit = "no rpm limit given" if propeller.rpm_limit is None else f"limit {propeller.rpm_limit:g} rpm"
    widest = int(np.argmax(stations.c_over_R))
    angle = math.degrees(chord_line_angle(propeller, 0.75))
    pitch = pitch_over_diameter(propeller) * diameter
    return [
        f"{count}, diameter {_length(diameter)}, {propeller.rotation}-hand, {limit}",
        (
            f"{stations.r_over_R.size} stations from r/R = {stations.r_over_R[0]:.3f} to "
            f"{stations.r_over_R[-1]:.3f}; the blade begins at r/R = {propeller.root:.3f}"
        ),
        f"widest chord {stations.c_over_R[widest] * diameter * 500:.1f} mm at r/R = {stations.r_over_R[widest]:.2f}",
        (
            f"pitch {_length(pitch)} at 0.75 R: the chord line stands at {angle:.1f} deg (twist given for the "
            f"{stations.twist_reference})"
        ),
    ]


def _length(metres: float) -> str:
    return f"{metres * 1e3:.4g} mm ({metres / _INCH:.4g} in)"


def _sections(case: Case) -> list[str]:
    lines = []
    for span in case.propeller.sections:
        where = f"r/R = {span.start:g} to {span.end:g}: "
        if span.family is not None:
            guess = ", a guess" if case.propeller.section_guessed else ""
            lines.append(f"{where}family {span.family} ({family(span.family).description}){guess}")
        elif span.polars is not None:
            table = span.polars
            low, high = np.degrees(table.alpha[[0, -1]])
            lines.append(
                f"{where}polars of {table.source}: Reynolds number {table.reynolds[0]:g} to {table.reynolds[-1]:g}, "
                f"angle of attack {low:g} to {high:g} deg"
            )
    outside = blade_elements(case.propeller, case.model).outside_share
    if outside > 0.0:
        lines.append(
            f"{100 * outside:.3g} % of the span (weighted by r^2 chord) leaves the thickness or camber its family was "
            "made for: the nearest member serves there"
        )
    if case.model.drag_scale != 1.0:
        lines.append(f"section drag times {case.model.drag_scale:g}")
    return lines


def _air(case: Case) -> list[str]:
    air = case.air
    words = f"density {air.density:.4g} kg/m3, viscosity {air.viscosity:.4g} Pa s, sound {air.speed_of_sound:.4g} m/s"
    if air.temperature is not None and air.pressure is not None:
        words += f" ({air.temperature - 273.15:.1f} degC, {air.pressure / 100:.4g} hPa)"
    return [words]


def _grid(case: Case) -> list[str]:
    ratios, rpm = case.grid.advance_ratio, case.grid.rpm
    mach = rpm[-1] / 60 * case.propeller.diameter * math.hypot(math.pi, ratios[-1]) / case.air.speed_of_sound
    return [
        f"advance ratio {ratios[0]:g} to {ratios[-1]:g} in {ratios.size} steps; rpm "
        + ", ".join(f"{value:g}" for value in rpm)
        + (
            "; incidence " + ", ".join(f"{math.degrees(value):.4g}" for value in case.grid.incidence) + " deg"
            if case.grid.inclined
            else ""
        )
        + f"; helical tip Mach number up to {mach:.2f}"
    ]


def _motor(case: Case) -> list[str]:
    motor = case.motor
    if motor is None:
        return []
    words = f"{motor.count} x {motor.speed_constant * _RPM:.4g} rpm/V, {motor.resistance * 1e3:.4g} mohm"
    if motor.winding_temperature != RESISTANCE_TEMPERATURE:
        words += f" at {motor.winding_temperature - 273.15:.4g} degC"
    if motor.gear_ratio != 1.0:
        words += f", gear {motor.gear_ratio:g} to 1"
    return [words + (f", limit {motor.current_limit:g} A" if motor.current_limit else ", no current limit given")]


def _controller(case: Case) -> list[str]:
    controller = case.controller
    if controller is None:
        return ["none given: an ideal one, without losses or limits, serves"] if case.motor is not None else []
    limit = f"limit {controller.current_limit:g} A" if controller.current_limit else "no current limit given"
    return [f"{controller.on_resistance * 1e3:.4g} mohm, {controller.unpowered} when the wind drives it, {limit}"]


def _battery(case: Case) -> list[str]:
    battery = case.battery
    if battery is None:
        return []
    limit = "no current limit given" if battery.current_limit is None else f"limit {battery.current_limit:.4g} A"
    return [
        (
            f"{battery.cells_in_series} in series, {battery.cells_in_parallel} in parallel, {battery.chemistry}, "
            f"{battery.capacity / 3600:.4g} A h, {battery.open_circuit_voltage:.1f} V at rest, "
            f"{battery.resistance * 1e3:.3g} mohm at {battery.temperature - 273.15:.4g} degC, {limit}"
        )
    ]


def _airframe(case: Case) -> list[str]:
    airframe = case.airframe
    if airframe is None:
        return []
    words = f"{airframe.mass:g} kg"
    if isinstance(airframe, Multirotor):
        known = "drag of the climb from a table" if airframe.drag_table else "no drag of the climb given"
        return [f"{words}, hovering, {known}"]
    if airframe.wing_area is not None:
        words += f", wing {airframe.wing_area:g} m2"
    stall = airframe.stall_speed(case.air.density)
    words += ", no stall speed known" if stall is None else f", stalls at {stall:.1f} m/s"
    return [words + ("" if airframe.cruise_speed is None else f", cruises at {airframe.cruise_speed:g} m/s")]


def _readiness(case: Case) -> list[str]:
    """Say which commands would run and what is missing for the others."""
    lines = ["bemt table: yes"]
    if case.motor is not None and case.battery is None:
        lines.append("bemt envelope: no, [battery] is missing: the motor has nothing to run on")
        return lines
    if case.motor is None:
        idle = [f"[{name}]" for name in ("controller", "battery") if getattr(case, name) is not None]
        words = "yes, over airspeed and rpm up to shaft power; currents and endurance need [motor]"
        words += " and [battery]" if case.battery is None else ""
        words += f"; {' and '.join(idle)} {'has' if len(idle) == 1 else 'have'} no effect without it" if idle else ""
    else:
        words = "yes, over airspeed and throttle"
    lines.append(f"bemt envelope: {words}")
    if case.airframe is None:
        lines.append("level flight and its named points need [airframe]; standing still is given")
    elif isinstance(case.airframe, Airframe) and case.airframe.cruise_speed is None:
        lines.append('the point "cruise" needs airframe.cruise_speed')
    return lines
