"""Every result variable, once: its name, symbol, dimensions, units and meaning.

Files, figures, printed tables and the nomenclature page all read this registry; nothing else spells a unit or a
long name. Units are UDUNITS strings. Rotational speed is "rpm", never "s-1", which a units library reads as rad/s.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace


@dataclass(frozen=True)
class Quantity:
    """One result variable.

    Parameters
    ----------
    name : str
        Long plain name, the key in every file.
    symbol : str
        Symbol of the field.
    dimensions : tuple of str
        Names of the dimensions in order.
    units : str
        UDUNITS string; "1" where there is none.
    long_name : str
        Label of axes and columns.
    meaning : str
        What it is, which way is positive, where it is missing.
    flags : mapping of int to str, optional
        Values of a coded variable and their one-word meanings.
    masks : mapping of int to str, optional
        Bits of a bit-coded variable and their one-word meanings.
    """

    name: str
    symbol: str
    dimensions: tuple[str, ...]
    units: str
    long_name: str
    meaning: str
    flags: Mapping[int, str] | None = None
    masks: Mapping[int, str] | None = None


STATUS_NOT_RUN = 0
STATUS_CONVERGED = 1
STATUS_SEVERAL_ROOTS = 2
STATUS_REVERSED_FLOW = 3
STATUS_NOT_CONVERGED = 4

STATUS_FLAGS = {
    STATUS_NOT_RUN: "not_run",
    STATUS_CONVERGED: "converged",
    STATUS_SEVERAL_ROOTS: "converged_several_roots",
    STATUS_REVERSED_FLOW: "axial_flow_reversed",
    STATUS_NOT_CONVERGED: "not_converged",
}

SHARES = ("stalled_share", "outside_polar_share", "low_reynolds_share", "above_divergence_share")
"""Shares of the span that say how far a point can be trusted."""

TRUST_NOT_RUN = 0
TRUST_POOR = 1
TRUST_FAIR = 2
TRUST_GOOD = 3

TRUST_FLAGS = {
    TRUST_NOT_RUN: "not_run",
    TRUST_POOR: "poor",
    TRUST_FAIR: "fair",
    TRUST_GOOD: "good",
}

TRUST_REASONS = {
    1: "stalled",
    2: "outside_polars",
    4: "low_reynolds",
    8: "high_mach",
    16: "several_roots",
    32: "flow_reversed",
    64: "not_converged",
    128: "section_guessed",
    256: "descent",
    512: "large_incidence",
    1024: "outside_inflow_law",
}

SPOKEN_REASONS = {
    "stalled": "stalled",
    "outside_polars": "outside its section data",
    "low_reynolds": "low Reynolds number",
    "high_mach": "above the drag-divergence Mach number",
    "several_roots": "several solutions at the stall",
    "flow_reversed": "axial flow reversed, where momentum theory does not hold",
    "not_converged": "not converged",
    "section_guessed": "section guessed",
    "descent": "descent, a mean-inflow estimate",
    "large_incidence": "large incidence",
    "outside_inflow_law": "the wake contracts too much for the helix inflow",
}
"""The reasons in words a reader meets."""

WINDING_CEILING = 120.0
"""Winding temperature [degree Celsius] above which results are marked: enamel and magnets commonly stand 120 to 150
(common practice, no source)."""

_POINT = ("rpm", "advance_ratio")
_RPM = ("rpm",)
_RADIAL = ("rpm", "advance_ratio", "r_over_R")
_LOOKUP = ("lookup_mach", "lookup_reynolds", "lookup_helix_angle")
_GRID = ("airspeed", "throttle")
_SPEED = ("airspeed",)

COORDINATES = (
    Quantity("rpm", "n", ("rpm",), "rpm", "rotational speed", "revolutions of the propeller per minute"),
    Quantity("advance_ratio", "J", ("advance_ratio",), "1", "advance ratio", "V/(nD) with n in revolutions per second"),
    Quantity(
        "incidence",
        "i",
        ("incidence",),
        "degree",
        "incidence",
        "between flight path and shaft; as an angle of attack, so that air passes the disk from below to above",
    ),
    Quantity("r_over_R", "r/R", ("r_over_R",), "1", "radius over tip radius", "middle of each blade element"),
    Quantity("airspeed", "V", ("airspeed",), "m s-1", "airspeed", "of the aircraft, along the propeller shaft"),
    Quantity("throttle", "", ("throttle",), "1", "throttle", "stick position, 0 to 1"),
    Quantity("point", "", ("point",), "", "named point", "operating point a builder asks for by name"),
    Quantity(
        "lookup_helix_angle",
        "",
        ("lookup_helix_angle",),
        "degree",
        "helix angle at 0.75 R",
        "atan2(V, 0.75 pi n D): 0 standing still, 90 a stopped propeller in the wind",
    ),
    Quantity(
        "lookup_reynolds",
        "",
        ("lookup_reynolds",),
        "1",
        "reference Reynolds number",
        "of the chord at 0.75 R and the speed sqrt(V^2 + (0.75 pi n D)^2)",
    ),
    Quantity(
        "lookup_mach",
        "",
        ("lookup_mach",),
        "1",
        "reference Mach number",
        "of the speed sqrt(V^2 + (0.75 pi n D)^2)",
    ),
)

TABLE = (
    Quantity("thrust_coefficient", "CT", _POINT, "1", "thrust coefficient", "T/(rho n^2 D^4), n in rev/s"),
    Quantity("torque_coefficient", "CQ", _POINT, "1", "torque coefficient", "Q/(rho n^2 D^5), n in rev/s"),
    Quantity("power_coefficient", "CP", _POINT, "1", "power coefficient", "P/(rho n^3 D^5) = 2 pi CQ, n in rev/s"),
    Quantity(
        "efficiency",
        "eta",
        _POINT,
        "1",
        "propeller efficiency",
        "J CT/CP; 0 at J = 0, missing unless J >= 0, CT >= 0 and CP > 0; at incidence with the force along the flight "
        "path, CT cos(i) - CN sin(i), in place of CT",
    ),
    Quantity(
        "reference_reynolds",
        "Re75",
        _POINT,
        "1",
        "Reynolds number at 0.75 R",
        "rho c sqrt(V^2 + (0.75 pi n D)^2)/mu with the chord at 0.75 R",
    ),
    Quantity(
        "helical_tip_mach",
        "Mtip",
        _POINT,
        "1",
        "helical tip Mach number",
        "sqrt(V^2 + (pi n D)^2)/a; at incidence that of the advancing blade",
    ),
    Quantity(
        "stalled_share",
        "",
        _POINT,
        "1",
        "stalled share of the span",
        "share of the span, weighted by r^2 chord, beyond the angle of largest lift of its two-dimensional polar",
    ),
    Quantity(
        "outside_polar_share",
        "",
        _POINT,
        "1",
        "share of the span outside its polar data",
        "share of the span, weighted by r^2 chord, whose angle, Reynolds number, thickness or camber leaves its data",
    ),
    Quantity(
        "low_reynolds_share",
        "",
        _POINT,
        "1",
        "share of the span below Reynolds number 60 000",
        "share of the span, weighted by r^2 chord, where section drag is uncertain by 30 % or more",
    ),
    Quantity(
        "above_divergence_share",
        "",
        _POINT,
        "1",
        "share of the span above the drag-divergence Mach number",
        "share of the span, weighted by r^2 chord, beyond Korn's kappa - t/c - |cl|/10 at its own lift and Mach number",
    ),
    Quantity("trust", "", _POINT, "1", "grade of trust", "made of the shares and the status of the point", TRUST_FLAGS),
    Quantity(
        "trust_reasons",
        "",
        _POINT,
        "1",
        "reasons of the grade",
        "bits: what keeps the grade of trust from being good",
        None,
        TRUST_REASONS,
    ),
    Quantity("status", "", _POINT, "1", "status", "worst status of the blade elements of the point", STATUS_FLAGS),
    Quantity(
        "static_figure_of_merit",
        "FM",
        _RPM,
        "1",
        "static figure of merit",
        "sqrt(2/pi) CT^1.5/CP at J = 0; missing for CT <= 0",
    ),
    Quantity(
        "zero_thrust_advance_ratio",
        "J0",
        _RPM,
        "1",
        "advance ratio of zero thrust",
        "first J at which the thrust coefficient falls through 0; missing where the table has none",
    ),
    Quantity(
        "peak_efficiency",
        "eta_max",
        _RPM,
        "1",
        "peak efficiency",
        "largest efficiency over J where CT >= 0 and CP > 0",
    ),
    Quantity("peak_efficiency_advance_ratio", "", _RPM, "1", "advance ratio of peak efficiency", "J of the peak"),
)

RADIAL = (
    Quantity("inflow_angle", "phi", _RADIAL, "degree", "inflow angle", "from the plane of rotation"),
    Quantity("angle_of_attack", "alpha", _RADIAL, "degree", "angle of attack", "of the chord line"),
    Quantity(
        "section_lift_coefficient", "cl", _RADIAL, "1", "section lift coefficient", "stall delay and Mach included"
    ),
    Quantity("section_drag_coefficient", "cd", _RADIAL, "1", "section drag coefficient", "as used at the element"),
    Quantity(
        "axial_induced_velocity",
        "w",
        _RADIAL,
        "m s-1",
        "axial induced velocity at the disk",
        "positive in the direction of the slipstream",
    ),
    Quantity(
        "tangential_induced_velocity",
        "v",
        _RADIAL,
        "m s-1",
        "tangential induced velocity at the disk",
        "swirl, positive with the rotation",
    ),
    Quantity("thrust_loading", "dT/dr", _RADIAL, "N m-1", "thrust per radius", "of all blades together"),
    Quantity("torque_loading", "dQ/dr", _RADIAL, "N", "torque per radius", "of all blades together"),
)

_INCLINED = (*_POINT, "incidence")

INCIDENCE = (
    Quantity(
        "normal_force_coefficient",
        "CN",
        _INCLINED,
        "1",
        "normal force coefficient",
        "N/(rho n^2 D^4); in the plane of the disk, positive up, which is where the crossflow goes",
    ),
    Quantity(
        "side_force_coefficient",
        "CY",
        _INCLINED,
        "1",
        "side force coefficient",
        "Y/(rho n^2 D^4); in the plane of the disk, positive to the right as seen from behind",
    ),
    Quantity(
        "pitching_moment_coefficient",
        "Cm",
        _INCLINED,
        "1",
        "pitching moment coefficient",
        "M/(rho n^2 D^5); about the hub, positive nose up",
    ),
    Quantity(
        "yaw_moment_coefficient",
        "Cn",
        _INCLINED,
        "1",
        "yaw moment coefficient",
        "N/(rho n^2 D^5); about the hub, positive nose to the right; "
        "negative where a right-hand propeller pulls more at its right, down-going blade",
    ),
)

# Where an incidence is asked for, everything of a point runs over it as well.
TABLE_AT_INCIDENCE = (
    *(replace(quantity, dimensions=_INCLINED) if quantity.dimensions == _POINT else quantity for quantity in TABLE),
    *INCIDENCE,
)
RADIAL_AT_INCIDENCE = tuple(replace(quantity, dimensions=(*_INCLINED, "r_over_R")) for quantity in RADIAL)

LOOKUP = (
    Quantity(
        "lookup_thrust",
        "",
        _LOOKUP,
        "1",
        "thrust over rho U^2 D^2",
        "U^2 = V^2 + (0.75 pi n D)^2: finite from standing still to a stopped propeller",
    ),
    Quantity("lookup_torque", "", _LOOKUP, "1", "torque over rho U^2 D^3", "U as for lookup_thrust"),
    Quantity("lookup_stalled_share", "", _LOOKUP, "1", "stalled share of the span", "as stalled_share"),
    Quantity("lookup_outside_polar_share", "", _LOOKUP, "1", "share outside polar data", "as outside_polar_share"),
    Quantity("lookup_low_reynolds_share", "", _LOOKUP, "1", "share below Re 60 000", "as low_reynolds_share"),
    Quantity(
        "lookup_above_divergence_share", "", _LOOKUP, "1", "share above drag divergence", "as above_divergence_share"
    ),
    Quantity("lookup_status", "", _LOOKUP, "1", "status", "as status", STATUS_FLAGS),
)

_OPERATING = (
    Quantity("rpm", "n", _GRID, "rpm", "rotational speed", "of the propeller"),
    Quantity("thrust", "T", _GRID, "N", "thrust", "of all propellers, positive in the direction of flight"),
    Quantity("torque", "Q", _GRID, "N m", "propeller torque", "of one propeller, taken from the shaft"),
    Quantity("shaft_power", "P", _GRID, "W", "shaft power", "of one motor; negative where the wind drives it"),
    Quantity("motor_current", "I", _GRID, "A", "motor current", "of one motor"),
    Quantity("motor_voltage", "Vm", _GRID, "V", "motor voltage", "mean voltage at the leads of one motor"),
    Quantity("battery_current", "Ib", _GRID, "A", "battery current", "of the pack; negative where it is charged"),
    Quantity("battery_voltage", "Vb", _GRID, "V", "battery voltage", "of the pack under load"),
    Quantity("battery_power", "Pb", _GRID, "W", "battery power", "at the terminals of the pack"),
    Quantity(
        "propeller_efficiency",
        "eta_p",
        _GRID,
        "1",
        "propeller efficiency",
        "thrust power at the disk's airspeed over shaft power; 0 standing still, missing where it does not propel",
    ),
    Quantity("motor_efficiency", "eta_m", _GRID, "1", "motor efficiency", "shaft power over lead power, gear included"),
    Quantity(
        "controller_efficiency", "eta_c", _GRID, "1", "controller efficiency", "power to the motors over battery power"
    ),
    Quantity("battery_efficiency", "eta_b", _GRID, "1", "battery efficiency", "terminal over open-circuit voltage"),
    Quantity(
        "overall_efficiency",
        "eta",
        _GRID,
        "1",
        "overall efficiency",
        "power of the thrust that reaches the airframe over the power the cells give, resistance included",
    ),
    Quantity(
        "winding_temperature",
        "Tw",
        _GRID,
        "degree_Celsius",
        "winding temperature",
        "if held there; infinite where it rises without end, missing if not modelled",
    ),
    Quantity(
        "outside_polar_share",
        "",
        _GRID,
        "1",
        "share of the span outside its polar data",
        "of the propeller at this point, weighted by r^2 chord",
    ),
    Quantity("stalled_share", "", _GRID, "1", "stalled share of the span", "of the propeller, weighted by r^2 chord"),
    Quantity(
        "low_reynolds_share",
        "",
        _GRID,
        "1",
        "share of the span below Reynolds number 60 000",
        "of the propeller, weighted by r^2 chord",
    ),
    Quantity(
        "above_divergence_share",
        "",
        _GRID,
        "1",
        "share of the span above the drag-divergence Mach number",
        "of the propeller, weighted by r^2 chord",
    ),
    Quantity("trust", "", _GRID, "1", "grade of trust", "of the propeller's loads at this point", TRUST_FLAGS),
    Quantity(
        "trust_reasons",
        "",
        _GRID,
        "1",
        "reasons of the grade",
        "bits: what keeps the grade of trust from being good",
        None,
        TRUST_REASONS,
    ),
    Quantity("status", "", _GRID, "1", "status", "of the propeller solution behind this point", STATUS_FLAGS),
)

_MARGINS = (
    Quantity("rpm_margin", "", _GRID, "rpm", "margin of rpm", "propeller's printed limit less rpm"),
    Quantity(
        "motor_current_margin", "", _GRID, "A", "margin of motor current", "motor's continuous limit less current"
    ),
    Quantity(
        "controller_current_margin",
        "",
        _GRID,
        "A",
        "margin of controller current",
        "controller's continuous limit less motor current",
    ),
    Quantity(
        "battery_current_margin",
        "",
        _GRID,
        "A",
        "margin of battery current",
        "battery's largest current less battery current",
    ),
    Quantity(
        "winding_temperature_margin",
        "",
        _GRID,
        "K",
        "margin of winding temperature",
        f"what enamel and magnets commonly stand, {WINDING_CEILING:g} degC (common practice, no source), less this",
    ),
)


def _over(
    quantities: tuple[Quantity, ...], prefix: str, dimensions: tuple[str, ...], where: str
) -> tuple[Quantity, ...]:
    return tuple(
        replace(
            quantity,
            name=prefix + quantity.name,
            dimensions=dimensions,
            long_name=f"{quantity.long_name}, {where}",
        )
        for quantity in quantities
    )


_HELD = "the discharge integrated with motor current and rpm held; ends early where full throttle no longer holds them"

_LEVEL_ONLY = (
    Quantity("level_throttle", "", _SPEED, "1", "throttle, level flight", "stick position that holds level flight"),
    Quantity("drag", "D", _SPEED, "N", "drag of the airframe", "in level flight; missing below the stall speed"),
    Quantity(
        "required_thrust", "", _SPEED, "N", "thrust required", "of all propellers in level flight: drag/thrust factor"
    ),
    Quantity("endurance", "", _SPEED, "s", "endurance", f"at this airspeed on the usable charge, {_HELD}"),
    Quantity("range", "", _SPEED, "m", "range", "still-air distance at this airspeed: endurance times airspeed"),
    Quantity("climb_rate", "", _SPEED, "m s-1", "rate of climb", "at full throttle at this airspeed"),
)

_UNPOWERED = (
    Quantity("stopped_drag", "", _SPEED, "N", "drag of stopped propellers", "of all propellers, blades held still"),
    Quantity(
        "freewheeling_drag",
        "",
        _SPEED,
        "N",
        "drag of freewheeling propellers",
        "of all propellers, turned by the wind against the drag of motor and gear without current",
    ),
    Quantity(
        "freewheeling_rpm", "", _SPEED, "rpm", "freewheeling rotational speed", "0 where the wind does not turn it"
    ),
    Quantity(
        "windmilling_drag",
        "",
        _SPEED,
        "N",
        "drag of windmilling propellers",
        "of all propellers, turned by the wind without any torque on the shaft",
    ),
    Quantity("windmilling_rpm", "", _SPEED, "rpm", "windmilling rotational speed", "at no torque"),
)

_POINT_ONLY = (
    Quantity("point_airspeed", "V", ("point",), "m s-1", "airspeed, named point", "of the aircraft"),
    Quantity("point_throttle", "", ("point",), "1", "throttle, named point", "stick position"),
    Quantity(
        "point_endurance",
        "",
        ("point",),
        "s",
        "endurance, named point",
        f"{_HELD}; missing at full throttle, which no falling voltage holds",
    ),
    Quantity("point_range", "", ("point",), "m", "range, named point", "endurance times airspeed; missing as it is"),
    Quantity(
        "point_drain_time",
        "",
        ("point",),
        "s",
        "time at full throttle, named point",
        "until the usable charge is gone at full throttle at this airspeed; missing at part throttle",
    ),
    Quantity("point_climb_rate", "", ("point",), "m s-1", "rate of climb, named point", "missing unless it climbs"),
    Quantity(
        "point_thrust_to_weight",
        "",
        ("point",),
        "1",
        "thrust over weight, named point",
        "of the thrust that reaches the airframe",
    ),
)

ENVELOPE = (
    *_OPERATING,
    *_MARGINS,
    *_over(_OPERATING + _MARGINS, "level_", _SPEED, "level flight"),
    *_LEVEL_ONLY,
    *_UNPOWERED,
    *_over(_OPERATING + _MARGINS, "point_", ("point",), "named point"),
    *_POINT_ONLY,
)

_BARE = ("airspeed", "rpm")
_BARE_NAMES = (
    "rpm",
    "thrust",
    "torque",
    "shaft_power",
    "propeller_efficiency",
    "outside_polar_share",
    "stalled_share",
    "low_reynolds_share",
    "above_divergence_share",
    "trust",
    "trust_reasons",
    "status",
    "rpm_margin",
)
_BARE_OPERATING = tuple(quantity for quantity in _OPERATING + _MARGINS if quantity.name in _BARE_NAMES)
_BARE_GRID = tuple(replace(quantity, dimensions=_BARE) for quantity in _BARE_OPERATING if "rpm" not in quantity.name)
_ELECTRICAL = (
    "level_throttle",
    "endurance",
    "range",
    "freewheeling_drag",
    "freewheeling_rpm",
    "point_throttle",
    "point_endurance",
    "point_range",
    "point_drain_time",
)


def _without_motor(quantities: tuple[Quantity, ...]) -> tuple[Quantity, ...]:
    return tuple(quantity for quantity in quantities if quantity.name not in _ELECTRICAL)


# Without a motor the second axis is the rpm and nothing electrical exists; the same names otherwise.
ENVELOPE_WITHOUT_MOTOR = (
    *_BARE_GRID,
    *_over(_BARE_OPERATING, "level_", _SPEED, "level flight"),
    *_without_motor(_LEVEL_ONLY + _UNPOWERED),
    *_over(_BARE_OPERATING, "point_", ("point",), "named point"),
    *_without_motor(_POINT_ONLY),
)

_UPRIGHT = (
    Quantity(
        "level_throttle", "", _SPEED, "1", "throttle, steady climb", "stick position that holds it; hovering at 0"
    ),
    Quantity("drag", "D", _SPEED, "N", "drag of the airframe", "climbing straight up; 0 where the case has no table"),
    Quantity(
        "required_thrust",
        "",
        _SPEED,
        "N",
        "thrust required",
        "of all propellers to hover and climb straight up: (weight + drag)/thrust factor",
    ),
    Quantity("endurance", "", _SPEED, "s", "endurance", f"in steady climb, hovering at 0: {_HELD}"),
)
_UPRIGHT_CLIMB = Quantity(
    "climb_rate",
    "",
    ("throttle",),
    "m s-1",
    "rate of climb",
    "straight up and steady, where thrust holds weight and drag; missing where it sinks",
)
_UPRIGHT_POINT = (
    *(quantity for quantity in _POINT_ONLY if quantity.name != "point_range"),
    Quantity(
        "point_figure_of_merit",
        "FM",
        ("point",),
        "1",
        "figure of merit, named point",
        "ideal power T sqrt(T/(2 rho A)) of one rotor over its shaft power; missing in moving air",
    ),
)

# A hovering airframe: the airspeed is that of climbing straight up, `level_` a steady climb.
ENVELOPE_HOVER = (
    *_OPERATING,
    *_MARGINS,
    *_over(_OPERATING + _MARGINS, "level_", _SPEED, "steady climb"),
    *_UPRIGHT,
    _UPRIGHT_CLIMB,
    *_over(_OPERATING + _MARGINS, "point_", ("point",), "named point"),
    *_UPRIGHT_POINT,
)
ENVELOPE_HOVER_WITHOUT_MOTOR = (
    *_BARE_GRID,
    *_over(_BARE_OPERATING, "level_", _SPEED, "steady climb"),
    *_without_motor(_UPRIGHT),
    replace(_UPRIGHT_CLIMB, dimensions=("rpm",)),
    *_over(_BARE_OPERATING, "point_", ("point",), "named point"),
    *_without_motor(_UPRIGHT_POINT),
)


def by_name(group: tuple[Quantity, ...]) -> dict[str, Quantity]:
    """Return the quantities of a group by name.

    Parameters
    ----------
    group : tuple of Quantity
        One of the groups of this module.

    Returns
    -------
    dict of str to Quantity
    """
    return {quantity.name: quantity for quantity in group}
