"""Results as files: netCDF and CSV, chosen by the ending of the name."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from bemt.errors import InputError
from bemt.files.atomic import check_target

if TYPE_CHECKING:
    import xarray as xr

__all__ = ["DATA_ENDINGS", "check_data_target", "check_target", "read", "write"]

DATA_ENDINGS = (".nc", ".csv")


def check_data_target(path: str | Path) -> None:
    """Find out whether a data file can be written under a name, before anything is computed.

    Parameters
    ----------
    path : str or pathlib.Path
        The file that is to be written.

    Raises
    ------
    InputError
        If no format belongs to the ending.
    RunError
        If the place cannot be written to.
    """
    ending = Path(path).suffix
    if ending.lower() not in DATA_ENDINGS:
        what = f"the ending {ending!r} stands for no data file" if ending else "a data file needs an ending"
        raise InputError("", f"{path}: {what}; those that do: {', '.join(DATA_ENDINGS)}")
    check_target(path)


def write(dataset: xr.Dataset, path: str | Path, *, history: str = "") -> tuple[Path, ...]:
    """Write a result in the format its ending names, whole or not at all.

    Parameters
    ----------
    dataset : xarray.Dataset
        A coefficient table or an envelope.
    path : str or pathlib.Path
        Ending `.nc`: one netCDF-4 file with everything, look-up variables included. Ending `.csv`: one file for each
        set of dimensions, `FILE.csv` and beside it for instance `FILE_rpm.csv`; without the look-up variables.
    history : str, optional
        What was run, for the audit trail in a netCDF file.

    Returns
    -------
    tuple of pathlib.Path
        The files written.

    Raises
    ------
    InputError
        If no format belongs to the ending.
    RunError
        If a file could not be written.
    """
    check_data_target(path)
    target = Path(path)
    writer: Callable[[xr.Dataset, Path, str], tuple[Path, ...]]
    if target.suffix.lower() == ".nc":
        from bemt.files.netcdf import write_netcdf as writer
    else:
        from bemt.files.delimited import write_csv as writer
    return writer(dataset, target, history)


def read(path: str | Path) -> xr.Dataset:
    """Read a netCDF file written by `write` back, ready for look-ups.

    Parameters
    ----------
    path : str or pathlib.Path
        The file, ending `.nc`.

    Returns
    -------
    xarray.Dataset
        As it was written, held in memory.

    Raises
    ------
    InputError
        If the file is not there or is no netCDF file.
    """
    from bemt.files.netcdf import read_netcdf

    return read_netcdf(Path(path))
