"""netCDF-4 files after the CF conventions."""

from __future__ import annotations

import os
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from bemt.errors import InputError, RunError
from bemt.files.atomic import replacing
from bemt.version import __version__

if TYPE_CHECKING:
    import xarray as xr

# Below this, compression costs more in chunk headers than it saves.
_COMPRESSED_FROM_BYTES = 16_384


def timestamp() -> str:
    """Return the time of writing in UTC, or that of SOURCE_DATE_EPOCH, which makes files reproducible byte by byte."""
    fixed = os.environ.get("SOURCE_DATE_EPOCH")
    moment = datetime.fromtimestamp(int(fixed), UTC) if fixed else datetime.now(UTC)
    return moment.strftime("%Y-%m-%dT%H:%M:%SZ")


def _encoding(dataset: xr.Dataset) -> dict[str, dict[str, Any]]:
    found: dict[str, dict[str, Any]] = {}
    for name, variable in dataset.variables.items():
        how: dict[str, Any] = {}
        if name in dataset.coords:
            how["_FillValue"] = None  # CF: a coordinate has no missing values
        if variable.dtype.kind in "fiu" and variable.nbytes >= _COMPRESSED_FROM_BYTES:
            how |= {"zlib": True, "complevel": 4, "shuffle": True}
        flags = variable.attrs.get("flag_values", variable.attrs.get("flag_masks"))
        if flags is not None:
            how["dtype"] = flags.dtype  # CF: the flags and the variable share one type
        found[str(name)] = how
    return found


def write_netcdf(dataset: xr.Dataset, path: Path, history: str) -> tuple[Path, ...]:
    """Write everything into one netCDF-4 file.

    Parameters
    ----------
    dataset : xarray.Dataset
        The result; its attributes are written as they stand.
    path : pathlib.Path
        The file.
    history : str
        What was run; goes into the `history` attribute with the time and the version, after what stands there.

    Returns
    -------
    tuple of pathlib.Path
        The file written.

    Raises
    ------
    RunError
        If the file could not be written.
    """
    line = f"{timestamp()} bemt {__version__}: {history or 'written'}"
    before = dataset.attrs.get("history")
    labelled = dataset.assign_attrs(
        source=dataset.attrs.get("source", f"bemt {__version__}"), history=f"{before}\n{line}" if before else line
    )
    with replacing([path]) as (draft,):
        try:
            labelled.to_netcdf(draft, format="NETCDF4", engine="netcdf4", encoding=_encoding(labelled))
        except RuntimeError as error:  # what the netCDF library raises for a full disk
            raise RunError(f"cannot write {path}: {error}") from error
    return (path,)


def read_netcdf(path: Path) -> xr.Dataset:
    """Read a file of `write_netcdf`.

    Parameters
    ----------
    path : pathlib.Path
        The file.

    Returns
    -------
    xarray.Dataset
        Held in memory; the file is closed.

    Raises
    ------
    InputError
        If the file is not there or is no netCDF file.
    """
    import xarray as xr

    import bemt.table.accessor  # noqa: F401 - registers `.propeller`

    if not path.is_file():
        raise InputError("", f"{path}: there is no such file")
    try:
        # Endurance has units "s" and must stay a number: no decoding of times.
        return xr.load_dataset(path, engine="netcdf4", decode_times=False, decode_timedelta=False)
    except (OSError, RuntimeError, ValueError) as error:
        raise InputError("", f"{path}: not a netCDF file that can be read ({error})") from error
