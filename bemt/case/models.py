"""The schema of the case file: every section and key, its unit, its bounds and its default.

The models validate one section at a time and know nothing of files or of other sections; `bemt.case.load` does that
and turns them into the plain objects of the layers below.
"""

from __future__ import annotations

from typing import Annotated, Any, Generic, Literal, TypeAlias, TypeVar

from pydantic import BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag

from bemt.case.units import (
    ANGLE,
    AREA,
    CHARGE,
    CURRENT,
    DENSITY,
    FREQUENCY,
    INDUCTANCE,
    LENGTH,
    MASS,
    PRESSURE,
    RESISTANCE,
    ROTATION,
    SPEED,
    SPEED_CONSTANT,
    TEMPERATURE,
    TEMPERATURE_DIFFERENCE,
    THERMAL_RESISTANCE,
    TIME,
    VISCOSITY,
    VOLTAGE,
    Measured,
    MeasuredSpread,
    Spread,
)

Length = Annotated[float, Measured(LENGTH, above=0.0)]
LengthOrZero = Annotated[float, Measured(LENGTH, at_least=0.0)]
Altitude = Annotated[float, Measured(LENGTH)]
Area = Annotated[float, Measured(AREA, above=0.0)]
Speed = Annotated[float, Measured(SPEED, above=0.0)]
SpeedOrZero = Annotated[float, Measured(SPEED, at_least=0.0)]
Mass = Annotated[float, Measured(MASS, above=0.0)]
Time = Annotated[float, Measured(TIME, above=0.0)]
Angle = Annotated[float, Measured(ANGLE)]
Rpm = Annotated[float, Measured(ROTATION, above=0.0, bare=True)]
SpeedConstant = Annotated[float, Measured(SPEED_CONSTANT, above=0.0)]
Frequency = Annotated[float, Measured(FREQUENCY, above=0.0)]
Temperature = Annotated[float, Measured(TEMPERATURE, above=0.0)]
TemperatureDifference = Annotated[float, Measured(TEMPERATURE_DIFFERENCE)]
Pressure = Annotated[float, Measured(PRESSURE, above=0.0)]
Density = Annotated[float, Measured(DENSITY, above=0.0)]
Viscosity = Annotated[float, Measured(VISCOSITY, above=0.0)]
Voltage = Annotated[float, Measured(VOLTAGE, above=0.0)]
VoltageOrZero = Annotated[float, Measured(VOLTAGE, at_least=0.0)]
Current = Annotated[float, Measured(CURRENT, above=0.0)]
CurrentOrZero = Annotated[float, Measured(CURRENT, at_least=0.0)]
Resistance = Annotated[float, Measured(RESISTANCE, above=0.0)]
ResistanceOrZero = Annotated[float, Measured(RESISTANCE, at_least=0.0)]
Inductance = Annotated[float, Measured(INDUCTANCE, above=0.0)]
Charge = Annotated[float, Measured(CHARGE, above=0.0)]
ThermalResistance = Annotated[float, Measured(THERMAL_RESISTANCE, above=0.0)]

Share = Annotated[float, Field(ge=0.0, le=1.0)]
Positive = Annotated[float, Field(gt=0.0)]
NotNegative = Annotated[float, Field(ge=0.0)]
Count = Annotated[int, Field(ge=1, le=1000)]
FileName = Annotated[str, Field(min_length=1)]

TwistReference = Literal["chord line", "flat face", "zero lift"]

Value = TypeVar("Value")

LIST_TAG = "<list>"
RANGE_TAG = "<range>"
TABLE_TAG = "<table>"
FILE_TAG = "<file>"


class Section(BaseModel):
    """What all sections share: no unknown keys, no silent conversions, no values that are not finite."""

    model_config = ConfigDict(extra="forbid", strict=True, allow_inf_nan=False, frozen=True)


class Range(Section, Generic[Value]):
    """Equally spaced values: { from, to, count }."""

    start: Value = Field(alias="from")
    end: Value = Field(alias="to")
    count: int = Field(ge=2, le=10_000)


def _list_or_range(value: Any) -> str | None:
    if isinstance(value, list):
        return LIST_TAG
    return RANGE_TAG if isinstance(value, (dict, Range)) else None


def _table_or_file(value: Any) -> str | None:
    if isinstance(value, str):
        return FILE_TAG
    return TABLE_TAG if isinstance(value, (dict, BaseModel)) else None


def _number_or_text(value: Any) -> Any:
    if isinstance(value, bool) or not isinstance(value, (int, float, str)):
        raise ValueError("must be a number, or text with a unit")
    return value


SweepNumber: TypeAlias = Annotated[float | str, BeforeValidator(_number_or_text)]


_AsList, _AsRange, _Choice = Tag(LIST_TAG), Tag(RANGE_TAG), Discriminator(_list_or_range)
_SomeValues = Field(min_length=1, max_length=10_000)

# Spelled out one by one: an alias with a type variable would leave the range's own values unchecked.
RatioSeries: TypeAlias = Annotated[
    Annotated[list[float], _SomeValues, _AsList] | Annotated[Range[float], _AsRange], _Choice
]
ShareSeries: TypeAlias = Annotated[
    Annotated[list[Share], _SomeValues, _AsList] | Annotated[Range[Share], _AsRange], _Choice
]
RpmSeries: TypeAlias = Annotated[Annotated[list[Rpm], _SomeValues, _AsList] | Annotated[Range[Rpm], _AsRange], _Choice]
SpeedSeries: TypeAlias = Annotated[
    Annotated[list[SpeedOrZero], _SomeValues, _AsList] | Annotated[Range[SpeedOrZero], _AsRange], _Choice
]
AngleSeries: TypeAlias = Annotated[
    Annotated[list[Angle], _SomeValues, _AsList] | Annotated[Range[Angle], _AsRange], _Choice
]
SweepSeries: TypeAlias = Annotated[
    Annotated[list[SweepNumber], _SomeValues, _AsList] | Annotated[Range[SweepNumber], _AsRange], _Choice
]


class AirSection(Section):
    """[air]: the standard atmosphere, a measured one, or its three properties outright."""

    altitude: Altitude | None = None
    temperature: Temperature | None = None
    temperature_offset: TemperatureDifference | None = None
    pressure: Pressure | None = None
    density: Density | None = None
    viscosity: Viscosity | None = None
    speed_of_sound: Speed | None = None


class PropellerSection(Section):
    """[propeller]: the only section a coefficient table needs."""

    blades: Annotated[int, Field(ge=1, le=12)]
    diameter: Length
    stations: FileName | None = None
    measured_diameter: Length | None = None
    twist_reference: TwistReference = "chord line"
    rotation: Literal["right", "left"] = "right"
    hub_diameter: LengthOrZero = 0.0
    rpm_limit: Rpm | None = None
    pitch: Length | None = None
    outline: FileName | None = None


class BladeSection(Section):
    """[[section]]: what section a part of the span has."""

    start: Share = Field(default=0.0, alias="from")
    end: Share = Field(default=1.0, alias="to")
    polars: FileName | None = None
    family: FileName | None = None
    shape: FileName | None = None


class EndLoss(Section):
    """Law of the loss at the blade's ends, and the ends it is applied to."""

    law: Literal["prandtl", "goldstein", "none"] = "prandtl"
    ends: list[Literal["tip", "root"]] = ["tip", "root"]


class ModelSection(Section):
    """[model]: which of the rival models is used."""

    elements: Annotated[int, Field(ge=8, le=400)] = 40
    inflow: Literal["momentum", "helix"] = "momentum"
    end_loss: EndLoss = EndLoss()
    stall_delay: Literal["snel", "du-selig", "none"] = "snel"
    stall_strength: Share = 0.5
    post_stall: Literal["plate", "viterna", "aerodas"] = "plate"
    plate_drag: Annotated[float, Field(ge=1.0, le=2.2)] = 1.8
    reynolds_rule: Literal["power-law", "held"] = "power-law"
    drag_scale: Annotated[float, Field(ge=0.1, le=10.0)] | None = None


class GridSection(Section):
    """[grid]: what is computed and printed."""

    advance_ratio: RatioSeries | None = None
    rpm: RpmSeries | None = None
    incidence: AngleSeries | None = None
    airspeed: SpeedSeries | None = None
    throttle: ShareSeries | None = None


class NoLoadReading(Section):
    """One reading of a motor running free."""

    voltage: Voltage
    current: CurrentOrZero


class MotorSection(Section):
    """[motor]."""

    count: Count = 1
    speed_constant: SpeedConstant
    winding_resistance: Resistance | None = None
    no_load: Annotated[list[NoLoadReading], Field(min_length=1)] | None = None
    label_only: bool = False
    label: Annotated[str, Field(min_length=1)] | None = None
    winding_temperature: Temperature | None = None
    winding_inductance: Inductance | None = None
    thermal_resistance: ThermalResistance | None = None
    current_limit: Current | None = None
    gear_ratio: Positive = 1.0
    gear_efficiency: Annotated[float, Field(gt=0.0, le=1.0)] = 1.0


class ControllerSection(Section):
    """[controller]."""

    current_limit: Current | None = None
    on_resistance: ResistanceOrZero = 0.0
    unpowered: Literal["freewheel", "regenerate", "brake"] = "freewheel"
    switching_frequency: Frequency | None = None
    switching_time: Time | None = None
    diode_voltage: VoltageOrZero = 0.0
    idle_current: CurrentOrZero = 0.0
    throttle_map: Annotated[list[Annotated[list[Share], Field(min_length=2, max_length=2)]], Field(min_length=2)] = [
        [0.0, 0.0],
        [1.0, 1.0],
    ]


class BatterySection(Section):
    """[battery]."""

    cells_in_series: Count
    cells_in_parallel: Count = 1
    chemistry: Literal["lithium-polymer", "lithium-ion"] = "lithium-polymer"
    capacity: Charge
    cell_resistance: ResistanceOrZero
    discharge_multiple: Positive | None = None
    charge_left: Share = 1.0
    usable_share: Share = 0.8
    temperature: Temperature | None = None


class ParabolicDrag(Section):
    """Drag coefficient over lift coefficient: cd0 + k cl^2."""

    cd0: Positive
    k: NotNegative


Drag: TypeAlias = Annotated[
    Annotated[ParabolicDrag, Tag(TABLE_TAG)] | Annotated[FileName, Tag(FILE_TAG)], Discriminator(_table_or_file)
]


class AirframeSection(Section):
    """[airframe]: a wing, or none."""

    mass: Mass
    wing_area: Area | None = None
    drag: Drag | None = None
    cl_max: Positive | None = None
    cruise_speed: Speed | None = None
    hover: bool = False


class InstallationSection(Section):
    """[installation]: multipliers for a body before or behind the propeller."""

    inflow_factor: Positive = 1.0
    thrust_factor: Positive = 1.0


class SweepBound(Section):
    """Smallest and largest value that a swept result may have."""

    min: SweepNumber | None = None
    max: SweepNumber | None = None


class SweepKeep(Section):
    """What of every swept case is stored."""

    table: bool = False
    quantities: list[str] = []


class SweepSection(BaseModel):
    """[sweep]: values by the dotted name of a number of the case, or of a blade operation."""

    model_config = ConfigDict(extra="allow", strict=True, allow_inf_nan=False, frozen=True)
    __pydantic_extra__: dict[str, SweepSeries]

    bounds: dict[str, SweepBound] = {}
    keep: SweepKeep = SweepKeep()


class CorrectionSection(Section):
    """[correction]: what a calibration found."""

    blade_angle: Angle | None = None
    drag_scale: Positive | None = None
    stall_strength: Share | None = None
    covariance: list[list[float]] | None = None


class UncertaintySection(Section):
    """[uncertainty]: standard uncertainties; relative where no unit stands."""

    twist: Annotated[Spread, MeasuredSpread(ANGLE)] | None = None
    twist_scatter: Annotated[Spread, MeasuredSpread(ANGLE)] | None = None
    chord: Annotated[Spread, MeasuredSpread(LENGTH)] | None = None
    chord_scatter: Annotated[Spread, MeasuredSpread(LENGTH)] | None = None
    zero_lift_angle: Annotated[Spread, MeasuredSpread(ANGLE)] | None = None
    speed_constant: Annotated[Spread, MeasuredSpread(SPEED_CONSTANT)] | None = None
    drag_scale: NotNegative | None = None
    stall_strength: NotNegative | None = None


class CaseFile(Section):
    """A whole case file."""

    title: str = ""
    air: AirSection = AirSection()
    propeller: PropellerSection
    section: list[BladeSection] = []
    model: ModelSection = ModelSection()
    grid: GridSection = GridSection()
    motor: MotorSection | None = None
    controller: ControllerSection | None = None
    battery: BatterySection | None = None
    airframe: AirframeSection | None = None
    installation: InstallationSection | None = None
    sweep: SweepSection | None = None
    correction: CorrectionSection | None = None
    uncertainty: UncertaintySection | None = None


BLADE_OPERATIONS: dict[str, Any] = {
    "blade.pitch_scale": Positive,
    "blade.turn": Angle,
    "blade.cut": LengthOrZero,
    "blade.chord_scale": Positive,
}
"""Swept names that stand for no key of the case, and the type of their values."""
