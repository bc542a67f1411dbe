"""The shipped cases and their tables, solved once for all tests."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np
import xarray as xr

import bemt
from bemt.air import Air
from bemt.blade.geometry import Propeller
from bemt.case.load import Case
from bemt.rotor.elements import blade_elements
from bemt.rotor.model import Model
from bemt.rotor.solution import solve

CASES = ("nr640_9in", "sandpiper")  # gone through by the tests of the solution; mudlark_hover serves those of hovering
FOLDER = Path(__file__).parent.parent / "cases"


@lru_cache
def case(name: str) -> Case:
    return bemt.load(FOLDER / f"{name}.toml")


@lru_cache
def table(name: str) -> xr.Dataset:
    return bemt.coefficient_table(case(name), radial=True)


def coefficients(
    propeller: Propeller, model: Model, air: Air, rpm: np.ndarray, advance_ratio: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """CT and CP straight from the solver, by their definitions; arrays of one shape (n,)."""
    n, diameter = rpm / 60.0, propeller.diameter
    solution = solve(
        blade_elements(propeller, model),
        advance_ratio * n * diameter,
        2.0 * np.pi * n,
        air.viscosity / air.density,
        air.speed_of_sound,
    )
    return (
        solution.thrust_per_density / (n**2 * diameter**4),
        2.0 * np.pi * solution.torque_per_density / (n**2 * diameter**5),
    )
