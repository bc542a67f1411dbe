"""Coded variables in words, read from their own flag attributes."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from bemt.quantities.registry import SPOKEN_REASONS

if TYPE_CHECKING:
    import numpy as np
    import xarray as xr


def spoken(word: str) -> str:
    """Turn the word of a flag into plain English.

    Parameters
    ----------
    word : str
        As in `flag_meanings`.

    Returns
    -------
    str
        A reason of a grade of trust in the registry's words, any other word with spaces for its underscores.
    """
    return SPOKEN_REASONS.get(word, word.replace("_", " "))


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
