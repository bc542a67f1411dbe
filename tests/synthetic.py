"""Made-up results in the shape the solver gives them, for the tests of everything that leaves. No physics in here."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from bemt.quantities.dataset import build_dataset
from bemt.quantities.registry import ENVELOPE, LOOKUP, RADIAL, TABLE

ATTRS = {
    "title": "Mudflat survey aircraft, hand-carved 13.2 x 7",
    "air_density": 1.225,
    "diameter": 0.33528,
    "blades": 2,
}


def coefficient_table(
    rpm: tuple[float, ...] = (3000.0, 5000.0, 7000.0, 9000.0), count: int = 45, *, radial: bool = False
) -> xr.Dataset:
    n, J = np.array(rpm), np.linspace(0.0, 1.1, count)
    grow = 1 + 0.05 * np.log(n / n[0])[:, None]
    CT = 0.115 * grow * (1 - (J / (0.86 * grow)) ** 1.6) * (1 - 0.18 * np.exp(-((J / 0.18) ** 2)))
    CP = 0.056 / grow**0.5 * (1 + 0.5 * J - 1.2 * J**2.2)
    with np.errstate(divide="ignore", invalid="ignore"):
        efficiency = np.where((CT >= 0) & (CP > 0), J * CT / CP, np.nan)
    efficiency[:, 0] = 0.0
    shape = CT.shape
    stalled = np.broadcast_to(np.clip(0.5 - 2.5 * J, 0, 1), shape)
    low = np.broadcast_to(np.clip(1 - n / 5200.0, 0, 1)[:, None], shape)
    trust = np.where((stalled > 0.3) | (low > 0.5), 1, np.where((stalled > 0.05) | (low > 0.1) | (J > 0.95), 2, 3))
    reasons = np.where(stalled > 0.05, 1, 0) + np.where(low > 0.1, 4, 0)
    values: dict[str, np.ndarray[Any, Any]] = {
        "thrust_coefficient": CT,
        "torque_coefficient": CP / (2 * np.pi),
        "power_coefficient": CP,
        "efficiency": efficiency,
        "stalled_share": stalled,
        "outside_polar_share": np.zeros(shape),
        "low_reynolds_share": low,
        "above_divergence_share": np.zeros(shape),
        "trust": trust.astype(np.int16),
        "trust_reasons": reasons.astype(np.int16),
        "status": np.ones(shape, dtype=np.int16),
        "static_figure_of_merit": np.sqrt(2 / np.pi) * CT[:, 0] ** 1.5 / CP[:, 0],
        "zero_thrust_advance_ratio": 0.86 * grow[:, 0],
        "peak_efficiency": np.nanmax(efficiency, axis=1),
        "peak_efficiency_advance_ratio": J[np.nanargmax(efficiency, axis=1)],
        "lookup_thrust": np.random.default_rng(1).normal(size=(1, 3, 181)),
        "lookup_status": np.ones((1, 3, 181), dtype=np.int16),
    }
    coordinates = {
        "rpm": n,
        "advance_ratio": J,
        "lookup_mach": np.array([0.3]),
        "lookup_reynolds": np.array([5e4, 1e5, 2e5]),
        "lookup_helix_angle": np.linspace(0, 90, 181),
    }
    if radial:
        coordinates["r_over_R"] = np.linspace(0.2, 0.98, 7)
        values["thrust_loading"] = np.random.default_rng(2).normal(size=(*shape, 7))
    return build_dataset(TABLE + RADIAL + LOOKUP, values, coordinates, ATTRS)


def envelope(*, limits: bool = True, winding: bool = False) -> xr.Dataset:
    """An envelope in the shape of the real one: smooth made-up laws, every limit of the case set and some crossed.

    With a winding it gets too hot beyond 42 A or so, and hotter without end beyond 44 A.
    """
    V, throttle = np.linspace(0.0, 30.0, 61), np.linspace(0.1, 1.0, 19)
    pitch_speed = 36.0 * throttle[None, :]
    ratio = V[:, None] / pitch_speed
    rpm = 9000 * throttle**0.9 * (1 + 0.1 * np.clip(ratio, 0, 1.2) ** 2)
    thrust = 26.0 * throttle**1.9 * (1 - np.clip(ratio, 0, 1.4) ** 1.7) * (1 - 0.1 * np.exp(-((ratio / 0.2) ** 2)))
    motor = 46.0 * throttle**1.6 * (1.02 - 0.75 * np.clip(ratio, 0, 1.3) ** 1.8)
    battery = motor * throttle
    voltage = 15.6 - 0.012 * battery
    grid = {
        "rpm": rpm,
        "thrust": thrust,
        "torque": 0.012 * motor,
        "shaft_power": 0.012 * motor * rpm * np.pi / 30,
        "motor_current": motor,
        "battery_current": battery,
        "battery_voltage": voltage,
        "battery_power": voltage * battery,
        "propeller_efficiency": np.clip(0.7 * ratio * (1.9 - ratio), 0, 0.7),
        "overall_efficiency": np.clip(0.55 * ratio * (1.9 - ratio), 0, 0.55),
        "outside_polar_share": np.zeros_like(rpm),
        "stalled_share": np.zeros_like(rpm),
        "low_reynolds_share": np.clip(1 - rpm / 5600.0, 0, 1),
        "above_divergence_share": np.zeros_like(rpm),
        "trust": np.where(rpm < 5040.0, 2, 3).astype(np.int16),
        "trust_reasons": np.where(rpm < 5040.0, 4, 0).astype(np.int16),
        "status": np.ones_like(rpm, dtype=np.int16),
    }
    if winding:
        grid["winding_temperature"] = np.where(motor < 44.0, 15.0 + 0.05 * motor**2, np.inf)
        grid["winding_temperature_margin"] = 120.0 - grid["winding_temperature"]
    if limits:
        grid |= {
            "rpm_margin": 9500 - rpm,
            "motor_current_margin": 42 - motor,
            "controller_current_margin": 50 - motor,
            "battery_current_margin": 125 - battery,
        }
    with np.errstate(divide="ignore"):
        drag = np.where(V < 9.0, np.nan, 0.012 * V**2 + 260.0 / V**2)
    level: dict[str, np.ndarray[Any, Any]] = {name: np.full(V.size, np.nan) for name in grid}
    needed = np.full(V.size, np.nan)
    for i, wanted in enumerate(drag):
        if np.isfinite(wanted) and wanted <= thrust[i, -1]:
            needed[i] = np.interp(wanted, thrust[i], throttle)
            for name in grid:
                level[name][i] = np.interp(needed[i], throttle, np.asarray(grid[name], dtype=float)[i])
    flown = np.isfinite(needed)
    level["status"] = np.where(flown, 1, 0).astype(np.int16)
    level["trust"] = np.where(flown, np.where(level["rpm"] < 5040.0, 2, 3), 0).astype(np.int16)
    level["trust_reasons"] = np.where(level["rpm"] < 5040.0, 4, 0).astype(np.int16)
    values: dict[str, np.ndarray[Any, Any]] = {**grid, **{f"level_{name}": array for name, array in level.items()}}
    endurance = 4.0 * 3600 / level["battery_current"]
    values |= {
        "level_throttle": needed,
        "drag": drag,
        "required_thrust": drag,
        "endurance": endurance,
        "range": endurance * V,
        "climb_rate": (thrust[:, -1] - drag) * V / (3.1 * 9.80665),
    }
    points = ["static", "cruise", "best_endurance", "best_range", "best_climb", "top_speed"]
    at = [0, 32, int(np.nanargmin(level["battery_current"])), int(np.nanargmax(values["range"])), 24, 0]
    at[5] = int(np.flatnonzero(np.isfinite(needed))[-1])
    full = {0, 4}
    for name, array in grid.items():
        values[f"point_{name}"] = np.array(
            [array[i, -1] if k in full else level[name][i] for k, i in enumerate(at)], dtype=array.dtype
        )
    values["point_airspeed"] = V[at]
    values["point_throttle"] = np.array([1.0 if k in full else needed[i] for k, i in enumerate(at)])
    values["point_endurance"] = np.array([np.nan if k in full else endurance[i] for k, i in enumerate(at)])
    values["point_range"] = np.array([np.nan if k in full else values["range"][i] for k, i in enumerate(at)])
    values["point_drain_time"] = np.array([280.0 if k in {0, 4, 5} else np.nan for k in range(6)])
    values["point_climb_rate"] = np.array([np.nan, np.nan, np.nan, np.nan, values["climb_rate"][24], np.nan])
    words = {
        "decisions": "cruise at 16.0 m/s takes 49 % throttle, above the usual 30 to 40 % (common practice, no source)\n"
        "at cruise the cells give 87.6 W; lost: motor 11.5 W (86.6 %), propeller 21 W (71 %). The propeller loses most"
    }
    axes = {"airspeed": V, "throttle": throttle, "point": np.array(points)}
    return build_dataset(ENVELOPE, values, axes, ATTRS | words)
