"""Quantities written with their unit, turned into SI floats.

The units library does the parsing and the conversion. What it cannot know is settled here: a rotational speed is
never written in Hz or 1/s (the library reads those as radians per second, wrong by 2 pi), a temperature difference is
not a temperature, and a message about a wrong unit names units that fit.
"""

from __future__ import annotations

import difflib
import math
import re
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Any

from pydantic_core import core_schema

if TYPE_CHECKING:
    import pint
    from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
    from pydantic.json_schema import JsonSchemaValue

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?"
_QUANTITY = re.compile(rf"\s*({_NUMBER}|[+-]?(?:nan|inf(?:inity)?))(?![.\d])\s*(.*?)\s*", re.IGNORECASE | re.DOTALL)
# Products of names with one-digit exponents: the library would evaluate any arithmetic, "m**9**9**9" included.
_FACTOR = r"(?:1|[A-Za-z\u00b5\u03bc\u03a9\u2126\u00b0_]+(?:(?:\^|\*\*)-?[1-9]|\u207b?[\u00b9\u00b2\u00b3])?)"
_TIMES = r"(?:\s*[*/\u00b7]\s*|\s+)"
_PRODUCT = rf"{_FACTOR}(?:{_TIMES}{_FACTOR})*"
_UNIT = re.compile(rf"{_PRODUCT}(?:{_TIMES}\({_PRODUCT}\))?")


@dataclass(frozen=True)
class Kind:
    """A kind of quantity.

    Parameters
    ----------
    name : str
        For messages.
    unit : str
        The unit it is stored in.
    fitting : tuple of str
        Units a reader would write, for messages.
    """

    name: str
    unit: str
    fitting: tuple[str, ...]

    @property
    def hint(self) -> str:
        """Return the units that fit, as a phrase."""
        return "units that fit: " + ", ".join(self.fitting)


LENGTH = Kind("length", "m", ("mm", "cm", "m", "in", "ft"))
AREA = Kind("area", "m^2", ("m^2", "cm^2", "ft^2"))
SPEED = Kind("speed", "m/s", ("m/s", "km/h", "knot", "mph"))
MASS = Kind("mass", "kg", ("kg", "g", "lb", "oz"))
TIME = Kind("time", "s", ("s", "ms", "us", "ns", "min"))
ANGLE = Kind("angle", "rad", ("deg", "rad"))
ROTATION = Kind("rotational speed", "rpm", ("rpm", "rev/s", "rad/s"))
SPEED_CONSTANT = Kind("speed constant", "rad/s/V", ("rpm/V", "rad/s/V"))
FREQUENCY = Kind("frequency", "Hz", ("Hz", "kHz"))
TEMPERATURE = Kind("temperature", "K", ("degC", "K", "degF"))
TEMPERATURE_DIFFERENCE = Kind("temperature difference", "K", ("K", "degC", "degF"))
PRESSURE = Kind("pressure", "Pa", ("hPa", "kPa", "Pa", "inHg"))
DENSITY = Kind("density", "kg/m^3", ("kg/m^3", "g/cm^3"))
VISCOSITY = Kind("dynamic viscosity", "Pa*s", ("Pa*s", "mPa*s"))
VOLTAGE = Kind("voltage", "V", ("V", "mV"))
CURRENT = Kind("current", "A", ("A", "mA"))
RESISTANCE = Kind("resistance", "ohm", ("ohm", "mohm"))
INDUCTANCE = Kind("inductance", "H", ("uH", "mH"))
CHARGE = Kind("charge", "C", ("A*h", "mA*h"))
THERMAL_RESISTANCE = Kind("thermal resistance", "K/W", ("K/W",))
POWER = Kind("power", "W", ("W", "kW"))
FORCE = Kind("force", "N", ("N", "kgf", "gf", "lbf"))
TORQUE = Kind("torque", "N*m", ("N*m", "N*cm"))

_OFFSET_UNITS = {"degree_Celsius": "delta_degree_Celsius", "degree_Fahrenheit": "delta_degree_Fahrenheit"}


@cache
def registry() -> pint.UnitRegistry[float]:
    """Return the one unit registry, made when first needed.

    Returns
    -------
    pint.UnitRegistry
    """
    import pint

    units: pint.UnitRegistry[float] = pint.UnitRegistry(cache_folder=None)
    units.define("rev = revolution")
    units.define("newton_meter = newton * meter = Nm")  # the library would read a dimensionless "number" times metre
    return units


@cache
def parse_unit(text: str) -> pint.Unit:
    """Read a unit.

    Parameters
    ----------
    text : str
        Unit, such as "mm" or "rpm/V".

    Returns
    -------
    pint.Unit

    Raises
    ------
    ValueError
        If the units library does not know it.
    """
    if len(text) > 60 or not _UNIT.fullmatch(text):
        raise ValueError(f"{text!r} is not a unit")
    try:
        return registry().parse_units(text)
    except Exception as error:  # the library raises assertion, token, attribute and value errors for a bad unit
        raise ValueError(f"{text!r} is not a unit") from error


def conversion(unit_text: str, kind: Kind) -> tuple[float, float]:
    """Return factor and offset from a unit to the SI unit of its kind.

    Parameters
    ----------
    unit_text : str
        Unit as written.
    kind : Kind
        What is being measured.

    Returns
    -------
    factor, offset : float
        The offset is 0 but for temperatures.

    Raises
    ------
    ValueError
        If the unit is unknown or does not measure this kind of quantity.
    """
    unit = _fitting_unit(unit_text, kind)
    offset = _to_si(0.0, unit, kind)
    return (_to_si(1.0, unit, kind) - offset if offset else _to_si(1.0, unit, kind)), offset


def parse_quantity(text: str, kind: Kind) -> float:
    """Turn "12.5 in" into SI (a rotational speed into rpm).

    Parameters
    ----------
    text : str
        Number and unit.
    kind : Kind
        What is being measured.

    Returns
    -------
    float
        Value in `kind.unit`.

    Raises
    ------
    ValueError
        If the text is not a finite number with a unit that fits; the message names units that do.
    """
    match = _QUANTITY.fullmatch(text)
    if match is None:
        raise ValueError(f'{text!r} is not a number with a unit, such as "1.5 {kind.fitting[0]}"; {kind.hint}')
    number = float(match[1])
    if not math.isfinite(number):
        raise ValueError(f"{text!r} is not a finite number")
    if not match[2]:
        raise ValueError(f"{text!r} has no unit; {kind.hint}")
    if match[2].startswith(","):
        raise ValueError(f"{text!r} is not a number with a unit: the decimal mark is a point; {kind.hint}")
    value = _to_si(number, _fitting_unit(match[2], kind), kind)
    if not math.isfinite(value):
        raise ValueError(f"{text!r} is not a finite number in {kind.unit}")
    return value


def _fitting_unit(text: str, kind: Kind) -> pint.Unit:
    try:
        unit = parse_unit(text)
    except ValueError as error:
        near = difflib.get_close_matches(text, kind.fitting, n=1, cutoff=0.5)
        guess = f" (did you mean {near[0]!r}?)" if near else ""
        raise ValueError(f"{error}{guess}; {kind.hint}") from None
    # Root units keep the radian, so that rpm and Hz, or an angle and a percentage, do not pass for each other.
    units = registry()
    if units.get_root_units(unit)[1] != units.get_root_units(parse_unit(kind.unit))[1]:
        remark = ""
        if kind in (ROTATION, SPEED_CONSTANT) and unit.dimensionality == parse_unit(kind.unit).dimensionality:
            remark = " (is it revolutions or radians?)"
        elif kind is TEMPERATURE and text == "C":
            remark = " (C is the coulomb)"
        elif kind is CHARGE and unit.dimensionality == parse_unit("A").dimensionality:
            remark = " (that is a current)"
        article = "an" if kind.name[0] in "aeiou" else "a"
        raise ValueError(f"{text!r} does not measure {article} {kind.name}{remark}; {kind.hint}")
    return unit


def _to_si(number: float, unit: pint.Unit, kind: Kind) -> float:
    units = registry()
    if kind is TEMPERATURE_DIFFERENCE and str(unit) in _OFFSET_UNITS:
        unit = units.parse_units(_OFFSET_UNITS[str(unit)])
    return float(units.Quantity(number, unit).to(parse_unit(kind.unit)).magnitude)


@dataclass(frozen=True)
class Spread:
    """A standard uncertainty: absolute in SI, or relative where no unit was written.

    Parameters
    ----------
    value : float
        Not negative.
    relative : bool
        Whether it is a share of the value it belongs to.
    """

    value: float
    relative: bool


@dataclass(frozen=True)
class Measured:
    """Annotation of a model field that holds a quantity: validates text with a unit into an SI float.

    Parameters
    ----------
    kind : Kind
        What is measured.
    above, at_least : float, optional
        Bounds in SI.
    bare : bool
        Whether a plain number is taken as well, in `kind.unit`.
    """

    kind: Kind
    above: float | None = None
    at_least: float | None = None
    bare: bool = False

    def parse(self, value: object) -> float:
        """Validate one value.

        Parameters
        ----------
        value : object
            As it stands in the file.

        Returns
        -------
        float
            In SI (rpm for a rotational speed).

        Raises
        ------
        ValueError
            If it is no such quantity, or out of bounds.
        """
        number = _plain_number(value)
        if isinstance(value, str):
            result = parse_quantity(value, self.kind)
        elif number is None:
            raise ValueError(f'must be text with a unit, such as "1.5 {self.kind.fitting[0]}"; {self.kind.hint}')
        elif not self.bare:
            raise ValueError(
                f'{value} has no unit; {self.kind.hint}, written as text: "{value} {self.kind.fitting[0]}"'
            )
        else:
            result = number
        if not math.isfinite(result):
            raise ValueError(f"{value} is not a finite number")
        shown = f"{value!r}" if isinstance(value, str) else f"{value}"
        if self.above is not None and not result > self.above:
            raise ValueError(f"{shown} must be {_more_than(self.above, self.kind)}")
        if self.at_least is not None and not result >= self.at_least:
            raise ValueError(f"{shown} must not be {_less_than(self.at_least, self.kind)}")
        return result

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:
        """Return the schema that calls `parse`."""
        return core_schema.no_info_plain_validator_function(self.parse)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """Describe the text form (and the plain number, where one is taken) for a JSON schema."""
        text: dict[str, Any] = {
            "type": "string",
            "description": f"{self.kind.name} with its unit",
            "examples": [f"1.5 {unit}" for unit in self.kind.fitting],
        }
        if not self.bare:
            return text
        return {"anyOf": [text, {"type": "number", "description": f"{self.kind.name} in {self.kind.unit}"}]}


@dataclass(frozen=True)
class MeasuredSpread:
    """Annotation of a standard uncertainty: text with a unit is absolute, a bare number relative.

    Parameters
    ----------
    kind : Kind
        What is uncertain.
    """

    kind: Kind

    def parse(self, value: object) -> Spread:
        """Validate one value.

        Parameters
        ----------
        value : object
            As it stands in the file.

        Returns
        -------
        Spread

        Raises
        ------
        ValueError
            If it is neither a quantity of the kind nor a number, or is negative.
        """
        number = _plain_number(value)
        if isinstance(value, str):
            spread = Spread(parse_quantity(value, self.kind), relative=False)
        elif number is not None and math.isfinite(number):
            spread = Spread(number, relative=True)
        else:
            raise ValueError(f"must be a number (relative) or text with a unit; {self.kind.hint}")
        if spread.value < 0.0:
            raise ValueError(f"{value} must not be negative")
        return spread

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler) -> core_schema.CoreSchema:
        """Return the schema that calls `parse`."""
        return core_schema.no_info_plain_validator_function(self.parse)

    def __get_pydantic_json_schema__(
        self, schema: core_schema.CoreSchema, handler: GetJsonSchemaHandler
    ) -> JsonSchemaValue:
        """Describe both forms for a JSON schema."""
        return {
            "anyOf": [
                {"type": "string", "description": f"standard uncertainty, {self.kind.name} with its unit"},
                {"type": "number", "minimum": 0, "description": "relative standard uncertainty"},
            ]
        }


def _plain_number(value: object) -> float | None:
    if isinstance(value, (int, float)) and not isinstance(value, bool):
        return float(value) if abs(value) < 1e300 or isinstance(value, float) else math.inf
    return None


def _more_than(bound: float, kind: Kind) -> str:
    return "more than 0" if bound == 0.0 and kind is not TEMPERATURE else f"more than {bound:g} {kind.unit}"


def _less_than(bound: float, kind: Kind) -> str:
    return "negative" if bound == 0.0 else f"less than {bound:g} {kind.unit}"
