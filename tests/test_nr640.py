"""The shipped case of a published propeller against its wind-tunnel measurements.

Source of the measurements, thinned and rounded: tests/measured/README.md. Two good tunnels differ by 2.7 to 5.3 % rms
on one and the same propeller (M.D. McCrink, J.W. Gregory, AIAA 2015-3296, 2015), so agreement closer than that would
prove nothing.
"""

from __future__ import annotations

from functools import cache
from pathlib import Path

import numpy as np
import pytest
import shipped

import bemt
from bemt.study.compare import Comparison

SOURCE = "UIUC Propeller Data Site, volume 2; AIAA 2014-2151"
MEASURED = Path(__file__).parent / "measured"

WORST_RMS = 0.06
WORST_STATIC = 0.10


@cache
def comparison() -> Comparison:
    tables = (MEASURED / f"nr640_9_15deg_{kind}.csv" for kind in ("static", "advance"))
    return bemt.compare(shipped.case("nr640_9in"), *tables)


@pytest.mark.parametrize(("symbol", "column"), [("CT", 0), ("CP", 1)])
def test_measured_coefficients_are_met(symbol: str, column: int) -> None:
    found = comparison()
    name = ("thrust_coefficient", "power_coefficient")[column]
    measured, case = getattr(found.measured, name), shipped.case("nr640_9in")
    computed = shipped.coefficients(case.propeller, case.model, case.air, found.readings.rpm, found.advance_ratio)[
        column
    ]
    # The definitions, written apart from the study's own.
    rpm, still = found.readings.rpm, found.advance_ratio == 0.0
    static = still & (rpm > rpm[still].max() / 3.0)
    static_value = measured[static].mean()
    rms = np.sqrt(np.mean((computed - measured)[~still] ** 2)) / static_value
    signed = np.mean((computed - measured)[static]) / static_value
    print(
        f"NR640, {symbol} against {SOURCE}: {rms:.1%} rms of the static value over {(~still).sum()} advance rows; "
        f"standing still {signed:+.1%} in the mean of {static.sum()} rows"
    )
    errors = found.errors
    ours = ((errors.thrust_rms, errors.static_thrust), (errors.power_rms, errors.static_power))[column]
    assert ours == pytest.approx((rms, signed), rel=1e-9)
    assert rms <= WORST_RMS
    assert abs(signed) <= WORST_STATIC
