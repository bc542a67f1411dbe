"""Flight: airframe drag and the envelope of drive, propeller and airframe."""

from __future__ import annotations

from bemt.flight.airframe import Airframe, Installation
from bemt.flight.envelope import EnvelopeResult, build_envelope, default_airspeed, default_throttle
from bemt.flight.limits import Limits, describe_limits

__all__ = [
    "Airframe",
    "EnvelopeResult",
    "Installation",
    "Limits",
    "build_envelope",
    "default_airspeed",
    "default_throttle",
    "describe_limits",
]
