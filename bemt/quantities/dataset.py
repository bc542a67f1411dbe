"""The one place where plain arrays become a labelled dataset, with every attribute taken from the registry."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from bemt.quantities.registry import COORDINATES, Quantity, by_name

if TYPE_CHECKING:
    import xarray as xr

CONVENTIONS = "CF-1.11"

DEFINITIONS = (
    "J = V/(nD), CT = T/(rho n^2 D^4), CQ = Q/(rho n^2 D^5), CP = P/(rho n^3 D^5) = 2 pi CQ, eta = J CT/CP, "
    "FM = sqrt(2/pi) CT^1.5/CP at J = 0; n in revolutions per second."
)


def attributes(quantity: Quantity) -> dict[str, Any]:
    """Return the CF attributes of a quantity.

    Parameters
    ----------
    quantity : Quantity
        Entry of the registry.

    Returns
    -------
    dict
        `units`, `long_name`, `comment`, `symbol`, and the flags of a coded variable.
    """
    found: dict[str, Any] = {"long_name": quantity.long_name, "comment": quantity.meaning}
    if quantity.units:
        found["units"] = quantity.units
    if quantity.symbol:
        found["symbol"] = quantity.symbol
    if quantity.flags is not None:
        found["flag_values"] = np.array(list(quantity.flags), dtype=np.int16)
        found["flag_meanings"] = " ".join(quantity.flags.values())
    if quantity.masks is not None:
        found["flag_masks"] = np.array(list(quantity.masks), dtype=np.int16)
        found["flag_meanings"] = " ".join(quantity.masks.values())
    return found


def build_dataset(
    group: tuple[Quantity, ...],
    values: Mapping[str, np.ndarray],
    coordinates: Mapping[str, np.ndarray],
    attrs: Mapping[str, Any],
) -> xr.Dataset:
    """Label plain arrays.

    Parameters
    ----------
    group : tuple of Quantity
        Registry entries that may appear.
    values : mapping of str to numpy.ndarray
        Arrays by name, shaped as the registry's dimensions say.
    coordinates : mapping of str to numpy.ndarray
        Values of the dimensions, one-dimensional.
    attrs : mapping
        Attributes of the dataset; strings and numbers only.

    Returns
    -------
    xarray.Dataset

    Raises
    ------
    KeyError
        If a name is not in the registry.
    """
    import xarray as xr

    known = by_name(group)
    axes = by_name(COORDINATES)
    variables = {}
    for name, array in values.items():
        quantity = known[name]
        variables[name] = (quantity.dimensions, np.asarray(array), attributes(quantity))
    coords = {name: (name, np.asarray(axis), attributes(axes[name])) for name, axis in coordinates.items()}
    merged = {"Conventions": CONVENTIONS, "definitions": DEFINITIONS, **attrs}
    return xr.Dataset(variables, coords, merged)
