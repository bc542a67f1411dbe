"""Air against the printed standard atmosphere, an independent library and the gas law."""

from __future__ import annotations

import math

import numpy as np
import pytest
from ambiance import Atmosphere

from bemt.air import Air, standard_air, sutherland_viscosity
from bemt.errors import InputError

EARTH_RADIUS = 6_356_766.0  # m, ISO 2533, which turns geopotential into geometric altitude

# ISO 2533:1975, table of geopotential altitudes, from memory: m, K, Pa, kg/m3, m/s.
PRINTED = [
    (-1000.0, 294.65, 113_929.0, 1.34702, 344.11),
    (0.0, 288.15, 101_325.0, 1.22500, 340.294),
    (1000.0, 281.65, 89_874.6, 1.11164, 336.434),
    (5000.0, 255.65, 54_019.9, 0.736116, 320.529),
    (11_000.0, 216.65, 22_632.1, 0.363918, 295.069),
    (20_000.0, 216.65, 5_474.89, 0.0880349, 295.069),
]


@pytest.mark.parametrize(("altitude", "temperature", "pressure", "density", "speed_of_sound"), PRINTED)
def test_printed_standard_atmosphere(altitude, temperature, pressure, density, speed_of_sound):
    air = standard_air(altitude)
    assert air.temperature == pytest.approx(temperature, abs=1e-9)
    assert air.pressure == pytest.approx(pressure, rel=2e-5)
    assert air.density == pytest.approx(density, rel=2e-5)
    assert air.speed_of_sound == pytest.approx(speed_of_sound, rel=2e-5)
    assert air.altitude == altitude


def test_sea_level_viscosity():
    # ISO 2533, sea level, from memory: 1.7894e-5 Pa s, and 1.4607e-5 m2/s.
    air = standard_air()
    assert air.viscosity == pytest.approx(1.7894e-5, rel=5e-5)
    assert air.kinematic_viscosity == pytest.approx(1.4607e-5, rel=5e-5)


def test_agrees_with_an_independent_library():
    geopotential = np.concatenate([np.linspace(-1000.0, 20_000.0, 43), [11_000.0]])
    reference = Atmosphere(geopotential * EARTH_RADIUS / (EARTH_RADIUS - geopotential))
    ours = [standard_air(float(altitude)) for altitude in geopotential]
    for name, theirs in (
        ("temperature", reference.temperature),
        ("pressure", reference.pressure),
        ("density", reference.density),
        ("speed_of_sound", reference.speed_of_sound),
        ("viscosity", reference.dynamic_viscosity),
        ("kinematic_viscosity", reference.kinematic_viscosity),
    ):
        np.testing.assert_allclose([getattr(air, name) for air in ours], theirs, rtol=2e-6, err_msg=name)


def test_viscosity_of_warm_air():
    # Incropera and DeWitt, thermophysical properties of air at 300 K, from memory: 184.6e-7 Pa s.
    assert sutherland_viscosity(300.0) == pytest.approx(184.6e-7, rel=3e-3)


def test_a_measured_temperature_keeps_the_pressure_of_the_altitude():
    standard, cold = standard_air(1500.0), standard_air(1500.0, temperature=263.15)
    assert cold.pressure == standard.pressure
    # Ideal gas: at one pressure density goes with 1/T, and sound with the root of T.
    assert cold.density / standard.density == pytest.approx(standard.temperature / 263.15, rel=1e-14)
    assert cold.speed_of_sound / standard.speed_of_sound == pytest.approx(
        math.sqrt(263.15 / standard.temperature), rel=1e-14
    )


def test_an_offset_is_the_temperature_it_makes():
    offset = standard_air(300.0, temperature_offset=-3.0)
    assert offset == standard_air(300.0, temperature=offset.temperature)
    assert offset.temperature == pytest.approx(288.15 - 1.95 - 3.0)


def test_a_measured_pressure_is_the_airs_own():
    air = standard_air(120.0, temperature=285.15, pressure=100_200.0)
    assert air.pressure == 100_200.0
    assert air.density == pytest.approx(100_200.0 / (287.05287 * 285.15), rel=1e-14)


@pytest.mark.parametrize(
    ("field", "arguments"),
    [
        ("altitude", {"altitude": 20_001.0}),
        ("altitude", {"altitude": -1001.0}),
        ("altitude", {"altitude": math.nan}),
        ("altitude", {"altitude": "high"}),
        ("temperature", {"temperature": 12.0}),  # degrees Celsius by mistake
        ("temperature", {"temperature": math.inf}),
        ("temperature_offset", {"temperature": 280.0, "temperature_offset": 3.0}),
        ("temperature_offset", {"temperature_offset": 300.0}),
        ("temperature_offset", {"temperature_offset": math.nan}),
        ("pressure", {"pressure": 0.0}),
        ("pressure", {"pressure": -1.0}),
    ],
)
def test_impossible_weather_names_the_field(field, arguments):
    with pytest.raises(InputError) as caught:
        standard_air(**arguments)
    assert caught.value.field == field


@pytest.mark.parametrize("field", ["density", "viscosity", "speed_of_sound", "temperature", "pressure"])
@pytest.mark.parametrize("value", [0.0, -1.0, math.nan, math.inf])
def test_impossible_air_names_the_field(field, value):
    good = {"density": 1.2, "viscosity": 1.8e-5, "speed_of_sound": 340.0}
    with pytest.raises(InputError) as caught:
        Air(**(good | {field: value}))
    assert caught.value.field == field
