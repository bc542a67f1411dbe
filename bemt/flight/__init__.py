"""Flight: airframe drag, hovering, and the envelope of drive, propeller and airframe."""

from __future__ import annotations

from bemt.flight.airframe import Airframe, Installation, Multirotor
from bemt.flight.envelope import EnvelopeResult, build_envelope, default_airspeed, default_throttle
from bemt.flight.limits import Limits, describe_first_limit, describe_limits

__all__ = [
    "Airframe",
    "EnvelopeResult",
    "Installation",
    "Limits",
    "Multirotor",
    "build_envelope",
    "default_airspeed",
    "default_throttle",
    "describe_first_limit",
    "describe_limits",
]
