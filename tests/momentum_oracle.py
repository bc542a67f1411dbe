"""The momentum solution once more, by SciPy alone: two unknowns an element, another solver, its own look-ups.

Nothing here comes from the compiled solution or its plain-numpy companion. The unknowns are the induced velocities
themselves, w along the shaft and v around it, found by `scipy.optimize.brentq`, one inside the other, from
blade-element and annulus forces (H. Glauert in W.F. Durand (ed.), Aerodynamic Theory IV, 1935), with Reynolds and
Mach number at the local speed.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import RectBivariateSpline
from scipy.optimize import brentq

from bemt.rotor.elements import BladeElements
from bemt.rotor.kernels import E_CHORD, E_DIVERGENCE, E_RADIUS, E_TABLE_BETA, E_TWIST, E_WIDTH

FloatArray = NDArray[np.float64]


def loads(
    elements: BladeElements, root_radius: float, airspeed: float, omega: float, viscosity: float, sound: float
) -> tuple[float, float]:
    """Return thrust and torque per unit density, with Prandtl's loss at both ends and flow in one direction."""
    thrust = torque = 0.0
    angles = np.linspace(-np.pi, np.pi, elements.polars.shape[2])
    for i, column in enumerate(elements.columns):
        lift_of, ln_drag_of = (
            RectBivariateSpline(elements.ln_reynolds, angles, elements.polars[i, :, :, part], kx=1, ky=1)
            for part in (0, 1)
        )
        along, across = _element(elements, column, lift_of, ln_drag_of, root_radius, airspeed, omega, viscosity, sound)
        thrust += along * column[E_WIDTH]
        torque += across * column[E_RADIUS] * column[E_WIDTH]
    return thrust, torque


def _element(
    elements: BladeElements,
    column: FloatArray,
    lift_of: Callable[[float, float], FloatArray],
    ln_drag_of: Callable[[float, float], FloatArray],
    root_radius: float,
    airspeed: float,
    omega: float,
    viscosity: float,
    sound: float,
) -> tuple[float, float]:
    """Return the forces along the shaft and around it, per unit density and radius."""
    r, chord, twist = column[E_RADIUS], column[E_CHORD], column[E_TWIST]

    def forces(w: float, v: float) -> tuple[float, float, float]:
        axial, around = airspeed + w, omega * r - v
        speed, phi = math.hypot(axial, around), math.atan2(axial, around)
        alpha = (twist - phi + math.pi) % (2.0 * math.pi) - math.pi
        ln_re = min(max(math.log(speed * chord / viscosity), elements.ln_reynolds[0]), elements.ln_reynolds[-1])
        bare, mach = float(lift_of(ln_re, alpha)[0, 0]), speed / sound
        lift = bare
        for _ in range(20):  # Prandtl-Glauert at a Mach number held at Korn's drag divergence
            divergence = max(column[E_DIVERGENCE] - 0.1 * min(abs(lift), 2.0), 0.3)
            factor = max(column[E_TABLE_BETA] / math.sqrt(1.0 - min(mach, divergence) ** 2), 1.0)
            fade = min(max((math.radians(50.0) - abs(alpha)) / math.radians(20.0), 0.0), 1.0)
            lift = bare * (1.0 + (factor - 1.0) * fade)
        rise = 20.0 * max(mach - divergence + (0.1 / 80.0) ** (1.0 / 3.0), 0.0) ** 4
        drag = math.exp(float(ln_drag_of(ln_re, alpha)[0, 0])) + min(rise, 0.5)
        sine, cosine = math.sin(phi), math.cos(phi)
        pressure = 0.5 * speed**2 * elements.blades * chord
        ends = [
            math.acos(math.exp(-0.5 * elements.blades * gap / abs(sine)))
            for gap in ((elements.tip_radius - r) / r, (r - root_radius) / root_radius)
        ]
        annulus = 4.0 * math.pi * r * (2.0 / math.pi) ** 2 * ends[0] * ends[1] * abs(axial)
        return pressure * (lift * cosine - drag * sine), pressure * (lift * sine + drag * cosine), annulus

    def swirl(w: float) -> float:
        def surplus(v: float) -> float:
            _, across, annulus = forces(w, v)
            return across - annulus * v

        return float(brentq(surplus, -0.9 * omega * r, 0.9 * omega * r, xtol=1e-13, rtol=1e-14))

    def surplus(w: float) -> float:
        along, _, annulus = forces(w, swirl(w))
        return along - annulus * w

    # From no induction outward, so that the first root is found.
    sign = math.copysign(1.0, forces(0.0, 0.0)[0])
    step = sign * 0.01 * math.hypot(airspeed, omega * r)
    near, far = 0.0, step
    while sign * surplus(far) > 0.0:
        near, far = far, far + step
    w = float(brentq(surplus, near, far, xtol=1e-13, rtol=1e-14))
    along, across, _ = forces(w, swirl(w))
    return along, across
