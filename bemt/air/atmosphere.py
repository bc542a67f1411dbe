"""The standard atmosphere of ISO 2533 to 20 km, with a temperature or pressure of one's own where one was measured."""

from __future__ import annotations

import math
from dataclasses import dataclass

from bemt.errors import InputError
from bemt.quantities.checks import require_finite, require_positive

STANDARD_GRAVITY = 9.80665  # m/s2
GAS_CONSTANT = 287.05287  # J/(kg K), of dry air
HEAT_CAPACITY_RATIO = 1.4

SEA_LEVEL_TEMPERATURE = 288.15  # K
SEA_LEVEL_PRESSURE = 101325.0  # Pa
TROPOSPHERE_LAPSE = -0.0065  # K/m
TROPOPAUSE = 11_000.0  # m, geopotential
LOWEST_ALTITUDE = -1_000.0
HIGHEST_ALTITUDE = 20_000.0

SUTHERLAND_FACTOR = 1.458e-6  # kg/(m s K^0.5)
SUTHERLAND_TEMPERATURE = 110.4  # K

# Outside of these a temperature is a mistake of units rather than weather, and Sutherland's law is out of its range.
COLDEST = 150.0  # K
HOTTEST = 400.0  # K


@dataclass(frozen=True)
class Air:
    """Air as the propeller meets it.

    Parameters
    ----------
    density : float
        [kg/m3], above zero.
    viscosity : float
        Dynamic viscosity [Pa s], above zero.
    speed_of_sound : float
        [m/s], above zero.
    temperature : float, optional
        [K]; None where only the three above are known. Needed for a winding temperature.
    pressure : float, optional
        [Pa]; None where not known.
    altitude : float, optional
        Geopotential altitude [m] the state was taken from; None where not known.

    Raises
    ------
    InputError
        If a value is not finite, or not above zero where it must be.
    """

    density: float
    viscosity: float
    speed_of_sound: float
    temperature: float | None = None
    pressure: float | None = None
    altitude: float | None = None

    def __post_init__(self) -> None:
        """Refuse values no air can have."""
        require_positive("density", self.density, "kg/m3")
        require_positive("viscosity", self.viscosity, "Pa s")
        require_positive("speed_of_sound", self.speed_of_sound, "m/s")
        if self.temperature is not None:
            require_positive("temperature", self.temperature, "K")
        if self.pressure is not None:
            require_positive("pressure", self.pressure, "Pa")
        if self.altitude is not None:
            require_finite("altitude", self.altitude, "m")

    @property
    def kinematic_viscosity(self) -> float:
        """Viscosity over density [m2/s]."""
        return self.viscosity / self.density


def sutherland_viscosity(temperature: float) -> float:
    """Return the dynamic viscosity of air by Sutherland's law.

    Parameters
    ----------
    temperature : float
        [K], above zero.

    Returns
    -------
    float
        Dynamic viscosity [Pa s].

    Raises
    ------
    InputError
        If the temperature is not above zero.

    References
    ----------
    ISO 2533:1975, Standard Atmosphere (constants 1.458e-6 kg/(m s K^0.5) and 110.4 K).
    """
    require_positive("temperature", temperature, "K")
    return SUTHERLAND_FACTOR * temperature * math.sqrt(temperature) / (temperature + SUTHERLAND_TEMPERATURE)


def standard_air(
    altitude: float = 0.0,
    *,
    temperature: float | None = None,
    temperature_offset: float = 0.0,
    pressure: float | None = None,
) -> Air:
    """Return the air of the standard atmosphere, or the air of a measured temperature or pressure.

    Parameters
    ----------
    altitude : float
        Geopotential altitude [m], -1000 to 20 000. It differs from the geometric height by 0.03 % at 2 km and by
        0.3 % at 20 km.
    temperature : float, optional
        Measured temperature [K] in place of the standard one; the pressure stays the standard pressure of the altitude.
    temperature_offset : float
        Added to the standard temperature [K]; not together with `temperature`.
    pressure : float, optional
        The air's own pressure [Pa], not reduced to sea level, in place of the standard one.

    Returns
    -------
    Air
        Density by the ideal gas law for dry air, viscosity by Sutherland's law, speed of sound with a ratio of heat
        capacities of 1.4.

    Raises
    ------
    InputError
        If the altitude is out of range, the temperature is outside 150 to 400 K, both a temperature and an offset are
        given, or the pressure is not above zero.

    Notes
    -----
    Troposphere, to 11 km: T = T0 + L h and p = p0 (T/T0)^(-g/(L R)). Isothermal layer, to 20 km: T = 216.65 K and
    p = p11 exp(-g (h - 11 km)/(R T)). Humidity is left out: saturated air at 30 degrees Celsius is 1.6 % lighter.

    References
    ----------
    ISO 2533:1975, Standard Atmosphere.
    """
    require_finite("altitude", altitude, "m")
    if not LOWEST_ALTITUDE <= altitude <= HIGHEST_ALTITUDE:
        raise InputError("altitude", f"{altitude:g} m must lie from {LOWEST_ALTITUDE:g} m to {HIGHEST_ALTITUDE:g} m")
    require_finite("temperature_offset", temperature_offset, "K")
    if temperature is not None and temperature_offset != 0.0:
        raise InputError("temperature_offset", "give either a temperature or an offset from the standard one, not both")

    own_temperature, own_pressure = _standard_state(altitude)
    if temperature is not None:
        require_finite("temperature", temperature, "K")
        own_temperature = temperature
    own_temperature += temperature_offset
    if not COLDEST <= own_temperature <= HOTTEST:
        field = "temperature_offset" if temperature_offset != 0.0 else "temperature"
        raise InputError(field, f"air at {own_temperature:g} K: must lie from {COLDEST:g} K to {HOTTEST:g} K")
    if pressure is not None:
        require_positive("pressure", pressure, "Pa")
        own_pressure = pressure

    return Air(
        density=own_pressure / (GAS_CONSTANT * own_temperature),
        viscosity=sutherland_viscosity(own_temperature),
        speed_of_sound=math.sqrt(HEAT_CAPACITY_RATIO * GAS_CONSTANT * own_temperature),
        temperature=own_temperature,
        pressure=own_pressure,
        altitude=altitude,
    )


def _standard_state(altitude: float) -> tuple[float, float]:
    """Return temperature [K] and pressure [Pa] of the standard atmosphere at a geopotential altitude [m]."""
    in_troposphere = min(altitude, TROPOPAUSE)
    temperature = SEA_LEVEL_TEMPERATURE + TROPOSPHERE_LAPSE * in_troposphere
    exponent = -STANDARD_GRAVITY / (TROPOSPHERE_LAPSE * GAS_CONSTANT)
    pressure = SEA_LEVEL_PRESSURE * (temperature / SEA_LEVEL_TEMPERATURE) ** exponent
    if altitude > TROPOPAUSE:
        pressure *= math.exp(-STANDARD_GRAVITY * (altitude - TROPOPAUSE) / (GAS_CONSTANT * temperature))
    return temperature, pressure
