"""Coded variables in words, read from their own flag attributes."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    import numpy as np
    import xarray as xr


_SPOKEN = {"low_reynolds": "low Reynolds number", "high_mach": "high Mach number"}


def spoken(word: str) -> str:
    """Turn the word of a flag into plain English.

    Parameters
    ----------
    word : str
        As in `flag_meanings`.

    Returns
    -------
    str
        The same with spaces for underscores; "low_reynolds" becomes "low Reynolds number".
    """
    return _SPOKEN.get(word, word.replace("_", " "))


def _items(attribute: Any) -> list[int]:
    import numpy as np

    # A list of one item comes back from netCDF as a plain number.
    return [int(item) for item in np.atleast_1d(attribute)]


def words(variable: xr.DataArray) -> list[str] | None:
    """Translate a coded variable.

    Parameters
    ----------
    variable : xarray.DataArray
        Any variable.

    Returns
    -------
    list of str or None
        One entry a value in row-major order: the word of its flag, or of its bits the words with a space between
        (none set: empty). None where the variable is not coded.
    """
    meanings = str(variable.attrs.get("flag_meanings", "")).split()
    values: np.ndarray[Any, Any] = variable.values.ravel()
    if "flag_values" in variable.attrs:
        by_value = dict(zip(_items(variable.attrs["flag_values"]), meanings, strict=True))
        return [by_value[int(value)] for value in values]
    if "flag_masks" in variable.attrs:
        bits = list(zip(_items(variable.attrs["flag_masks"]), meanings, strict=True))
        return [" ".join(word for bit, word in bits if int(value) & bit) for value in values]
    return None
