"""Drag of propellers that nobody drives: held still, freewheeling on their motors, windmilling."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from bemt.drive import Controller, Drive
from bemt.drive.loads import (
    RPM_PER_RAD_S,
    PropellerState,
    last_falling_crossing,
    load_curves,
    propeller_state,
)
from bemt.drive.roots import FloatArray, IndexArray
from bemt.flight.level import Source


def unpowered_drag(source: Source, airspeed: FloatArray) -> dict[str, NDArray[np.float64]]:
    """Return drag and rpm of propellers without power.

    Parameters
    ----------
    source : Drive or BarePropeller
        What gives the thrust otherwise.
    airspeed : numpy.ndarray, shape (n,)
        Of the aircraft [m/s].

    Returns
    -------
    dict of str to numpy.ndarray
        By the names of the registry: of all propellers held still; windmilling, no torque on the shaft; and on a drive
        freewheeling, where only the motor's own drag and the gear brake it. NaN outside the propeller's table, and
        where the wind does not find a speed without torque.
    """
    count, disk_airspeed = source.count, airspeed * source.inflow_factor
    stopped = propeller_state(source.propeller, source.air, disk_airspeed, np.zeros(airspeed.shape))
    windmill = _windmilling(source, disk_airspeed)
    # Adding 0 takes the sign off a zero.
    found = {
        "stopped_drag": -count * stopped.thrust + 0.0,
        "windmilling_drag": -count * windmill.thrust + 0.0,
        "windmilling_rpm": windmill.speed * RPM_PER_RAD_S,
    }
    if isinstance(source, Drive):
        # Without idle current and map: the circuit of an ideal controller at duty 0 is an open one.
        free = replace(source, controller=Controller()).at_throttle(airspeed, 0.0)
        found |= {"freewheeling_drag": -free.thrust + 0.0, "freewheeling_rpm": free.rpm}
    return found


def _windmilling(source: Source, airspeed: FloatArray) -> PropellerState:
    """Return the fastest state without torque; standing still where there is no wind."""
    curves = load_curves(source.propeller, source.air, airspeed, 0.1 * source.no_load_speed)

    def driving(speed: FloatArray, index: IndexArray) -> FloatArray:
        return -propeller_state(source.propeller, source.air, airspeed[index], speed).torque

    speed = last_falling_crossing(curves, np.arange(airspeed.size), -curves.torque, driving)
    return propeller_state(source.propeller, source.air, airspeed, np.where(airspeed == 0.0, 0.0, speed))
