"""The compiled momentum solution of whole propellers against the oracle by SciPy alone."""

from __future__ import annotations

import math
from dataclasses import replace

import momentum_oracle
import pytest
import shipped

from bemt.rotor.elements import blade_elements
from bemt.rotor.solution import solve

# rpm and advance ratio: slow and fast, up to tip Mach numbers where the laws of compressibility bite, thrust of both
# signs. All attached: where the stall offers several roots a general solver may find any of them.
POINTS = ((3000.0, 0.45), (14000.0, 0.55), (6000.0, 0.95))


@pytest.mark.parametrize("name", shipped.CASES)
def test_the_compiled_solution_is_the_oracle_s(name: str) -> None:
    case = shipped.case(name)
    elements = blade_elements(case.propeller, replace(case.model, elements=10))
    viscosity, sound = case.air.kinematic_viscosity, case.air.speed_of_sound
    worst = 0.0
    for rpm, advance_ratio in POINTS:
        n, diameter = rpm / 60.0, case.propeller.diameter
        airspeed, omega = advance_ratio * n * diameter, 2.0 * math.pi * n
        found = solve(elements, [airspeed], [omega], [viscosity], [sound])
        thrust, torque = momentum_oracle.loads(
            elements, case.propeller.root * 0.5 * diameter, airspeed, omega, viscosity, sound
        )
        scale = n**2 * diameter**4
        errors = (
            (found.thrust_per_density[0] - thrust) / scale,
            2.0 * math.pi * (found.torque_per_density[0] - torque) / (scale * diameter),
        )
        worst = max(worst, *map(abs, errors))
    print(f"\n{name}: CT and CP within {worst:.1e} of the oracle")
    # Reynolds and Mach number lag the local speed by at most 1e-5, worth about 1e-6 of coefficients near 0.1.
    assert worst < 3e-7
