"""Measure the equilibrium of motor and propeller over a whole grid against one root search a point.

    python benchmarks/drive.py

The propeller, motor, controller and battery are those of cases/sandpiper.toml; the table is solved before the clock
starts. Times are the best of several runs on one core.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
from scipy.optimize import brentq

import bemt
from bemt.drive import Drive, OperatingPoints
from bemt.drive.loads import RPM_PER_RAD_S
from bemt.table.build_lookup import build_lookup

SHIPPED = Path(__file__).parent.parent / "cases" / "sandpiper.toml"
AIRSPEEDS, THROTTLES = 120, 60


def drive_of(case: bemt.Case) -> Drive:
    """Return the drive of a case that has all its parts, on a look-up table solved for it."""
    assert case.motor is not None
    assert case.controller is not None
    assert case.battery is not None
    lookup = build_lookup(case.propeller, case.air, case.model)
    return Drive(lookup, case.motor, case.battery, case.controller, case.air)


def usual(drive: Drive, airspeed: float, throttle: float) -> float:
    """Return the rpm of one driven point by one scalar root search on plain numbers, the look-up aside.

    For a controller whose duty is the stick, without diode and ripple.
    """
    motor, controller, battery = drive.motor, drive.controller, drive.battery
    switching = controller.switching_share if throttle < 1.0 else 0.0
    shared = motor.count * battery.resistance
    voltage = throttle * (battery.open_circuit_voltage - shared * controller.idle_current)
    resistance = motor.resistance + controller.on_resistance + shared * throttle * (throttle + switching)
    (_, no_load_current), *_ = motor.no_load

    def surplus(speed: float) -> float:
        current = max((voltage - speed / motor.speed_constant) / resistance, 0.0)
        offered = (current - no_load_current) / motor.speed_constant
        return offered - float(drive.propeller.loads(airspeed, speed * RPM_PER_RAD_S, air=drive.air).torque)

    return float(brentq(surplus, 1e-6, 1.5 * drive.no_load_speed, xtol=1e-10)) * RPM_PER_RAD_S


def best_of(runs: int, action: Callable[[], object]) -> float:
    """Return the shortest time of several runs [s]."""
    times = []
    for _ in range(runs):
        start = time.perf_counter()
        action()
        times.append(time.perf_counter() - start)
    return min(times)


def main() -> None:
    """Measure."""
    drive = drive_of(bemt.load(SHIPPED))
    airspeed = np.linspace(0.0, 30.0, AIRSPEEDS)[:, np.newaxis]
    throttle = np.linspace(1.0 / THROTTLES, 1.0, THROTTLES)

    def whole() -> OperatingPoints:
        return drive.at_throttle(airspeed, throttle)

    grid = whole()
    took = best_of(7, whole)
    places = [(i, j) for i in range(0, AIRSPEEDS // 2, 12) for j in range(THROTTLES // 2, THROTTLES, 5)]

    def singly() -> list[float]:
        return [usual(drive, float(airspeed[i, 0]), float(throttle[j])) for i, j in places]

    apart = max(abs(rpm / grid.rpm[place] - 1.0) for rpm, place in zip(singly(), places, strict=True))
    single = best_of(3, singly) / len(places)
    points = AIRSPEEDS * THROTTLES
    for what, seconds in (
        (f"{AIRSPEEDS} x {THROTTLES} points at once", took),
        ("brentq, one a point", single * points),
    ):
        print(f"{what:24s} {seconds * 1e3:9.1f} ms  {seconds / points * 1e6:8.2f} us a point")
    print(f"ratio {single * points / took:.0f}; rpm agree to {apart:.1e}")


if __name__ == "__main__":
    main()
