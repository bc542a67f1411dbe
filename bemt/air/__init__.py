"""Air: the standard atmosphere and air of one's own."""

from __future__ import annotations

from bemt.air.atmosphere import Air, standard_air, sutherland_viscosity

__all__ = ["Air", "standard_air", "sutherland_viscosity"]
