"""Random propellers over all models: every element has a named outcome, and none with a good status is wrong.

`BEMT_RANDOM_PROPELLERS=500 pytest -s tests/test_random_propellers.py` solves a million elements; without it, some ten
thousand.
"""

from __future__ import annotations

import os
from dataclasses import replace

import numpy as np
import pytest
import random_elements
import random_propellers as make
import shipped
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from bemt.quantities.registry import STATUS_NOT_CONVERGED
from bemt.rotor import kernels as k
from bemt.rotor.elements import blade_elements
from bemt.rotor.solution import solve

NAMES = {1: "converged", 2: "several roots", 3: "reversed flow", 4: "not converged"}
POINTS_EACH = 50
FAST = 0.6


def check(seed: int) -> tuple[dict[int, int], int]:
    """Solve one random propeller; return how many elements had which outcome, and how many failed below `FAST`."""
    rng = np.random.default_rng(seed)
    propeller, model = make.propeller(rng), make.model(rng)
    elements = blade_elements(propeller, model)
    points = make.points(rng, propeller.diameter, POINTS_EACH)
    found = solve(elements, points.airspeed, points.angular_speed, make.VISCOSITY, make.SOUND, radial=True)
    assert found.radial is not None
    status = found.radial["status"]
    assert np.isin(status, list(NAMES)).all(), "an outcome without a name"
    good = status != STATUS_NOT_CONVERGED
    for name, values in found.radial.items():
        if name != "high_induction":  # missing but on Buhl's branch
            assert np.isfinite(values[good]).all(), f"{name} is not a number with a good status"
    whole = found.status != STATUS_NOT_CONVERGED
    assert np.isfinite(found.thrust_per_density[whole] + found.torque_per_density[whole]).all()
    assert np.isnan(found.thrust_per_density[~whole]).all(), "no number where an element did not converge"
    for share in (
        found.stalled_share,
        found.outside_polar_share,
        found.low_reynolds_share,
        found.above_divergence_share,
    ):
        assert ((share >= 0.0) & (share <= 1.0 + 1e-12)).all()
    flat = np.zeros((POINTS_EACH, k.P_COLUMNS))
    flat[:, k.P_AIRSPEED], flat[:, k.P_OMEGA] = points.airspeed, points.angular_speed
    error, _ = random_elements.closure(flat, elements.columns, found.radial)
    assert error[good].max(initial=0.0) < 1e-9, "blade-element and momentum forces disagree"
    undisturbed = np.hypot(points.airspeed[:, None], points.angular_speed[:, None] * elements.columns[:, k.E_RADIUS])
    lost = (status == STATUS_NOT_CONVERGED) & (undisturbed < FAST * make.SOUND)
    return {code: int((status == code).sum()) for code in NAMES}, int(lost.sum())


@settings(max_examples=15, deadline=None, derandomize=True, suppress_health_check=list(HealthCheck))
@given(st.integers(0, 2**31))
def test_any_propeller_has_a_named_outcome(seed: int) -> None:
    check(seed)


def test_hardly_any_element_fails() -> None:
    propellers = int(os.environ.get("BEMT_RANDOM_PROPELLERS", "12"))
    total, lost = dict.fromkeys(NAMES, 0), 0
    for seed in range(propellers):
        counts, slow = check(seed)
        lost += slow
        for code, count in counts.items():
            total[code] += count
    elements = sum(total.values())
    print(
        f"\n{elements} elements: "
        + ", ".join(f"{NAMES[code]} {count}" for code, count in total.items())
        + f", {lost} of these below Mach {FAST}"
    )
    # Beyond drag divergence the laws of compressibility fold back on themselves, and no result is worth much.
    assert total[4] <= 1e-3 * elements
    assert lost <= max(1e-4 * elements, 3)


@pytest.mark.parametrize("law", ["prandtl", "goldstein"])
def test_many_blades_of_equal_solidity_lose_nothing_at_the_ends(law: str) -> None:
    """The loss belongs to a blade's distance from the next: it goes as 1/B (Prandtl 1919)."""
    case = shipped.case("nr640_9in")
    rpm, ratio = np.array([6000.0]), np.array([0.4])

    def thrust(blades: int, end_loss: str) -> float:
        stations = replace(case.propeller.stations, c_over_R=case.propeller.stations.c_over_R * 2.0 / blades)
        propeller = replace(case.propeller, blades=blades, stations=stations)
        # Chords shrink with the number of blades, so the air is thinned to keep the Reynolds number.
        air = replace(case.air, viscosity=case.air.viscosity * 2.0 / blades)
        model = replace(case.model, end_loss=end_loss, stall_delay="none")
        return float(shipped.coefficients(propeller, model, air, rpm, ratio)[0][0])

    counts = (2, 4, 8) if law == "goldstein" else (2, 4, 8, 32, 128)
    free = thrust(2, "none")
    lost = np.array([1.0 - thrust(blades, law) / free for blades in counts])
    print(f"\n{law}: thrust lost at the ends " + ", ".join(f"{b}: {x:.2%}" for b, x in zip(counts, lost, strict=True)))
    assert (np.diff(lost) < 0).all()
    assert lost[-1] < 1.5 * lost[0] / counts[-1] * counts[0]
