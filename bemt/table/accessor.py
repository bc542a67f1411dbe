"""`.propeller` of a coefficient table: loads and coefficients at any airspeed, rpm and density."""

from __future__ import annotations

import math
import warnings
from dataclasses import replace
from functools import cached_property
from typing import Any

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from bemt.errors import InputError
from bemt.quantities.dataset import attributes
from bemt.quantities.registry import (
    COORDINATES,
    ENVELOPE,
    SHARES,
    STATUS_NOT_CONVERGED,
    STATUS_NOT_RUN,
    TABLE,
    Quantity,
    by_name,
)
from bemt.table.coefficients import efficiency
from bemt.table.lookup import REFERENCE_RADIUS, FloatArray, Lookup, StatusArray
from bemt.table.validity import grade

POINT_DIMENSION = "operating_point"
"""Dimension of plain lists of points, which have no name of their own."""

_FORCES = ("thrust", "torque", "shaft_power")


class LookupWarning(UserWarning):
    """A look-up left the table, and its points are NaN."""


@xr.register_dataset_accessor("propeller")
class PropellerAccessor:
    """Look-ups in a coefficient table.

    Parameters
    ----------
    dataset : xarray.Dataset
        With the look-up variables of a coefficient table.
    """

    def __init__(self, dataset: xr.Dataset) -> None:
        self._dataset = dataset

    @cached_property
    def lookup(self) -> Lookup:
        """The look-up table as a plain object."""
        return Lookup.from_dataset(self._dataset)

    def at(
        self,
        airspeed: Any,
        rpm: Any,
        density: Any = None,
        *,
        viscosity: Any = None,
        speed_of_sound: Any = None,
    ) -> xr.Dataset:
        """Return what one propeller does at airspeeds, rpm and densities.

        Parameters
        ----------
        airspeed : float, array_like or xarray.DataArray
            Of the air the disk meets, along the shaft [m/s].
        rpm : float, array_like or xarray.DataArray
            Revolutions per minute.
        density : float, array_like or xarray.DataArray, optional
            [kg/m3]; default that of the table.
        viscosity, speed_of_sound : float, array_like or xarray.DataArray, optional
            [Pa s] (dynamic), [m/s]; default those of the table, so that another density alone means another pressure at
            the same temperature.

        Returns
        -------
        xarray.Dataset
            Thrust, torque, shaft power, coefficients, efficiency, shares, grade of trust and status, with the
            dimensions of labelled arguments; plain lists of one length share the dimension `operating_point`. NaN where
            the point lies outside of the table.

        Raises
        ------
        InputError
            If the table has no look-up variables, or a plain array has more than one axis.

        Warns
        -----
        LookupWarning
            Once a call, with every reason why points are NaN.
        """
        lookup = self.lookup
        given = {
            "airspeed": airspeed,
            "rpm": rpm,
            "density": lookup.air.density if density is None else density,
            "viscosity": lookup.air.viscosity if viscosity is None else viscosity,
            "speed_of_sound": lookup.air.speed_of_sound if speed_of_sound is None else speed_of_sound,
        }
        labelled = xr.broadcast(*(_labelled(name, value) for name, value in given.items()))
        like = labelled[0]
        v, n, rho, mu, sound = (array.values for array in labelled)
        for name, value in (("density", rho), ("viscosity", mu), ("speed_of_sound", sound)):
            if not (value > 0.0).all():
                raise InputError(name, "must be above zero")
        loads = lookup.evaluate(v, n, rho, mu, sound)

        speed = np.hypot(v, REFERENCE_RADIUS * math.pi * n / 60.0 * lookup.diameter)
        reynolds = rho * speed * lookup.chord_75 / mu
        slow = (reynolds < lookup.reynolds[0] * (1.0 - 1e-12)) & (speed > 0.0) & np.isfinite(loads.thrust)
        _warn(lookup, v, n, reynolds, speed / sound, loads.status, slow)
        status = np.where(slow, STATUS_NOT_RUN, loads.status).astype(np.int16)
        thrust, torque = np.where(slow, np.nan, loads.thrust), np.where(slow, np.nan, loads.torque)
        shares = {name: np.where(slow, np.nan, getattr(loads, name)) for name in SHARES}

        turns = n / 60.0
        scale = np.where(turns > 0.0, rho * turns**2 * lookup.diameter**4, np.nan)
        ct, cq = thrust / scale, torque / (scale * lookup.diameter)
        cp = 2.0 * math.pi * cq
        ratio = v / np.where(turns > 0.0, turns * lookup.diameter, np.nan)
        tip_mach = np.hypot(v, math.pi * turns * lookup.diameter) / sound
        trust, reasons = grade(
            status,
            shares,
            tip_mach - lookup.tip_divergence_mach,
            section_guessed=lookup.section_guessed,
        )
        values: dict[str, NDArray[Any]] = {
            "thrust": thrust,
            "torque": torque,
            "shaft_power": torque * 2.0 * math.pi * turns,
            "thrust_coefficient": ct,
            "torque_coefficient": cq,
            "power_coefficient": cp,
            "efficiency": efficiency(ratio, ct, cp),
            "reference_reynolds": reynolds,
            "helical_tip_mach": tip_mach,
            **shares,
            "trust": trust,
            "trust_reasons": reasons,
            "status": status,
        }
        result = xr.Dataset(
            {name: (like.dims, array, attributes(_KNOWN[name])) for name, array in values.items()}, like.coords
        )
        asked = {"airspeed": v, "rpm": n, "advance_ratio": ratio}
        return result.assign(
            {
                name: (like.dims, array, attributes(_KNOWN[name]))
                for name, array in asked.items()
                if name not in result.coords
            }
        )


def _labelled(name: str, value: Any) -> xr.DataArray:
    if isinstance(value, xr.DataArray):
        return value.astype(np.float64)
    array = np.asarray(value, dtype=np.float64)
    if array.ndim > 1:
        raise InputError(name, f"an array of {array.ndim} axes needs names for them: give it as an xarray.DataArray")
    return xr.DataArray(array, dims=(POINT_DIMENSION,)[: array.ndim])


def _warn(
    lookup: Lookup,
    airspeed: FloatArray,
    rpm: FloatArray,
    reynolds: FloatArray,
    mach: FloatArray,
    status: StatusArray,
    slow: NDArray[np.bool_],
) -> None:
    """Say once why points are missing."""
    reasons = [
        (airspeed < 0.0, "airspeed below zero: flow from behind is not covered"),
        (rpm < 0.0, "rpm below zero: a propeller turning backward is not covered"),
        (np.isnan(airspeed) | np.isnan(rpm), "airspeed or rpm is not a number"),
        (slow, f"reference Reynolds number below {lookup.reynolds[0]:.3g}, the lowest of the table"),
        (
            reynolds > lookup.reynolds[-1] * (1.0 + 1e-12),
            f"reference Reynolds number above {lookup.reynolds[-1]:.3g}, the highest of the table",
        ),
        (
            mach > lookup.mach[-1] * (1.0 + 1e-12),
            f"reference Mach number above {lookup.mach[-1]:.3g}, the highest of the table",
        ),
        (status == STATUS_NOT_CONVERGED, "the solution did not converge at a neighbouring node of the table"),
    ]
    said = [f"{why} ({int(where.sum())} of {where.size} points)" for where, why in reasons if where.any()]
    if said:
        warnings.warn("look-up outside the table gives NaN: " + "; ".join(said), LookupWarning, stacklevel=3)


def _of_one(quantity: Quantity) -> Quantity:
    """Return an operating quantity as it is said of a single propeller."""
    meaning = "positive in the direction of flight" if quantity.name == "thrust" else "taken from the shaft"
    return replace(quantity, meaning=f"of one propeller, {meaning}")


_KNOWN = by_name(COORDINATES) | by_name(TABLE) | {name: _of_one(by_name(ENVELOPE)[name]) for name in _FORCES}
