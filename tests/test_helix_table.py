"""Tables by the helix inflow: where to trust them, how far they lead from momentum, and what they cannot do."""

from __future__ import annotations

import re
from dataclasses import replace
from functools import lru_cache

import numpy as np
import pytest
import shipped
import xarray as xr

import bemt
from bemt.case.load import Case
from bemt.errors import InputError
from bemt.quantities.registry import TRUST_POOR, TRUST_REASONS
from bemt.table.build import TableResult, build_table
from bemt.table.build_lookup import build_lookup
from bemt.table.grid import Grid

GRID = Grid(np.linspace(0.0, 0.7, 15), np.array([5000.0, 9000.0]))
BIT = next(bit for bit, word in TRUST_REASONS.items() if word == "outside_inflow_law")


@lru_cache
def case() -> Case:
    plain = shipped.case("sandpiper")
    return replace(plain, model=replace(plain.model, inflow="helix"), grid=GRID)


@lru_cache
def tables() -> tuple[TableResult, TableResult]:
    here = case()
    momentum = replace(here.model, inflow="momentum")
    return (
        build_table(here.propeller, here.air, here.model, GRID, radial=True),
        build_table(here.propeller, here.air, momentum, GRID, lookup=False),
    )


def test_slow_flight_is_poor_and_says_why() -> None:
    values = tables()[0].values
    outside = (values["trust_reasons"] & BIT) != 0
    assert outside[:, 0].all()
    assert not outside[:, -6:].any()
    assert (values["trust"][outside] == TRUST_POOR).all()
    # W.J.M. Rankine, R.E. Froude: the far wake is sqrt((V + w)/(V + 2w)) of the disk; below 0.9 nobody trusts helices
    # that keep their radius.
    load = 8.0 * values["thrust_coefficient"] / (np.pi * np.maximum(GRID.advance_ratio, 1e-9) ** 2)
    far = np.sqrt(1.0 + load)
    known = np.isfinite(far)
    np.testing.assert_array_equal(outside[known], (np.sqrt((1.0 + far) / (2.0 * far)) < 0.9)[known])


def test_where_it_is_to_be_trusted_it_is_close_to_momentum() -> None:
    # Published comparisons of inflow models in axial flow find some per cent: O. Gur, A. Rosen, Aeronautical J. 112,
    # 2008 (as summarised by M.L. Ruh, J.T. Hwang, AIAA J. 61, 2023).
    helix, momentum = (table.values for table in tables())
    inside = (helix["trust_reasons"] & BIT) == 0
    largest = {}
    for symbol, name in (("CT", "thrust_coefficient"), ("CP", "power_coefficient")):
        gap = np.abs(helix[name] - momentum[name])[inside] / momentum[name].max()
        assert gap.max() < 0.06
        assert gap.max() > 1e-3  # another law, not the same one
        row = np.abs(momentum[name]).max(axis=1, keepdims=True)
        largest[symbol] = 100.0 * float((np.abs(helix[name] - momentum[name]) / row)[inside].max())
    (note,) = [note for note in tables()[0].notes if note.startswith("helix inflow")]
    for symbol, value in largest.items():
        said = re.search(rf"{symbol} typically by ([\d.]+) % and at most by ([\d.]+) %", note)
        assert said is not None
        assert float(said[2]) == pytest.approx(value, abs=0.06)
        assert float(said[1]) <= float(said[2])
    for name in ("zero_thrust_advance_ratio", "peak_efficiency"):
        np.testing.assert_allclose(helix[name], momentum[name], rtol=0.04)
        assert (helix[name] != momentum[name]).all()


def test_landmarks_agree_with_the_points() -> None:
    values = tables()[0].values
    for k in range(GRID.rpm.size):
        ct = values["thrust_coefficient"][k]
        after = int(np.flatnonzero(ct < 0.0)[0])
        end = np.interp(0.0, -ct[after - 1 : after + 1], GRID.advance_ratio[after - 1 : after + 1])
        assert values["zero_thrust_advance_ratio"][k] == pytest.approx(end, abs=2e-3)
        inside = np.where((values["trust_reasons"][k] & BIT) == 0, values["efficiency"][k], np.nan)
        assert np.nanmax(inside) - 1e-3 < values["peak_efficiency"][k] < np.nanmax(inside) + 0.01
    assert np.isnan(values["static_figure_of_merit"]).all()


def test_it_has_no_look_up_and_says_what_to_do() -> None:
    table = tables()[0]
    assert table.lookup is None
    dataset = table.to_dataset({})
    assert dataset.attrs["inflow"] == "helix"
    assert dataset["thrust_loading"].sizes["r_over_R"] == case().model.elements
    for ask in (
        lambda: dataset.propeller.at(airspeed=10.0, rpm=5000.0),
        lambda: build_lookup(case().propeller, case().air, case().model),
        lambda: bemt.envelope(case()),
        lambda: bemt.envelope(case(), table=dataset),
    ):
        with pytest.raises(InputError, match=r'moving air only.*use inflow = "momentum"') as caught:
            ask()
        assert caught.value.field == "model.inflow"
    assert isinstance(dataset, xr.Dataset)


@pytest.mark.parametrize("grid", [Grid(np.array([0.4]), GRID.rpm, np.array([0.2])), Grid(np.array([-0.1]), GRID.rpm)])
def test_it_is_of_axial_flow_ahead(grid: Grid) -> None:
    with pytest.raises(InputError, match="without incidence or descent"):
        build_table(case().propeller, case().air, case().model, grid)
