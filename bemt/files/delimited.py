"""CSV after RFC 4180: plain tidy tables, one file for each set of dimensions."""

from __future__ import annotations

import csv
import itertools
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

from bemt.files.atomic import replacing
from bemt.files.flags import words

if TYPE_CHECKING:
    import numpy as np
    import xarray as xr

# The set of dimensions that gives FILE.csv comes first; the others say what is appended to FILE.
_SUFFIXES = {
    ("rpm", "advance_ratio"): "",
    ("rpm", "advance_ratio", "incidence"): "",
    ("airspeed", "throttle"): "",
    ("airspeed", "rpm"): "",
    ("rpm",): "_rpm",
    ("rpm", "advance_ratio", "r_over_R"): "_radial",
    ("rpm", "advance_ratio", "incidence", "r_over_R"): "_radial",
    ("airspeed",): "_level",
    ("point",): "_points",
}


def tables(dataset: xr.Dataset) -> dict[tuple[str, ...], list[str]]:
    """Group the variables of a dataset by their dimensions, those of the look-up left out.

    Parameters
    ----------
    dataset : xarray.Dataset
        A coefficient table or an envelope.

    Returns
    -------
    dict of tuple of str to list of str
        Names of the variables by the names of their dimensions, in the order of the dataset.
    """
    found: dict[tuple[str, ...], list[str]] = {}
    for name, variable in dataset.data_vars.items():
        dimensions = tuple(str(dimension) for dimension in variable.dims)
        dimensions = next((known for known in _SUFFIXES if set(known) == set(dimensions)), dimensions)
        if not any(dimension.startswith("lookup_") for dimension in dimensions):
            found.setdefault(dimensions, []).append(str(name))
    return found


def _column(variable: xr.DataArray) -> list[str]:
    coded = words(variable)
    if coded is not None:
        return coded
    values: np.ndarray[Any, Any] = variable.values.ravel()
    if values.dtype.kind == "f":
        # repr gives the shortest text that reads back as the same number; a missing value is an empty cell.
        return ["" if value != value else repr(value) for value in values.tolist()]
    return [str(value) for value in values.tolist()]


def rows(dataset: xr.Dataset, dimensions: tuple[str, ...], names: list[str]) -> Iterator[tuple[str, ...]]:
    """Yield the header and the rows of one table.

    Parameters
    ----------
    dataset : xarray.Dataset
        The result.
    dimensions : tuple of str
        Dimensions of the table, the one that varies fastest last.
    names : list of str
        Variables over just these dimensions.

    Yields
    ------
    tuple of str
        One row; the columns of the dimensions come first.
    """
    places = itertools.product(*(_column(dataset[dimension]) for dimension in dimensions))
    columns = [_column(dataset[name].transpose(*dimensions)) for name in names]
    yield (*dimensions, *names)
    for place, values in zip(places, zip(*columns, strict=True), strict=True):
        yield (*place, *values)


def write_csv(dataset: xr.Dataset, path: Path, history: str) -> tuple[Path, ...]:  # noqa: ARG001 - one signature a writer
    """Write one CSV file for each set of dimensions.

    Parameters
    ----------
    dataset : xarray.Dataset
        The result. Coded variables are written as their words, missing values as empty cells.
    path : pathlib.Path
        The file of the points; the others stand beside it.
    history : str
        Not kept: RFC 4180 knows no comments.

    Returns
    -------
    tuple of pathlib.Path
        The files written, that of the points first.

    Raises
    ------
    RunError
        If a file could not be written.
    """
    groups = tables(dataset)
    order = sorted(groups, key=lambda dimensions: _SUFFIXES.get(dimensions, "_") != "")
    targets = [
        path.with_name(path.stem + _SUFFIXES.get(dimensions, "_" + "_".join(dimensions)) + path.suffix)
        for dimensions in order
    ]
    with replacing(targets) as drafts:
        for draft, dimensions in zip(drafts, order, strict=True):
            with draft.open("w", encoding="utf-8", newline="") as stream:
                csv.writer(stream).writerows(rows(dataset, dimensions, groups[dimensions]))
    return tuple(targets)
