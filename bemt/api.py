"""The functions of the public face; `bemt` hands them out when they are first asked for."""

from __future__ import annotations

import math
from pathlib import Path
from typing import TYPE_CHECKING

from bemt.errors import InputError
from bemt.version import __version__

if TYPE_CHECKING:
    import xarray as xr

    from bemt.case.load import Case

__all__ = ["coefficient_table", "envelope", "load"]


def load(path: str | Path) -> Case:
    """Read a case file and everything it names.

    Parameters
    ----------
    path : str or pathlib.Path
        The case file; "-" reads it from standard input.

    Returns
    -------
    Case
        Plain objects in SI units, checked.

    Raises
    ------
    CaseError
        If anything in the file or in a data file is wrong, with every complaint found.
    """
    from bemt.case.load import load_case

    return load_case(path)


def _attributes(case: Case) -> dict[str, str | float | int]:
    from bemt.table.build import references

    found: dict[str, str | float | int] = {
        "title": case.title,
        "source": f"bemt {__version__}",
        "references": references(case.model),
        "case": case.text,
        "blades": case.propeller.blades,
        "diameter": case.propeller.diameter,
        "air_density": case.air.density,
        "air_viscosity": case.air.viscosity,
        "air_speed_of_sound": case.air.speed_of_sound,
    }
    if case.notes:
        found["notes"] = "\n".join(case.notes)
    return found


def coefficient_table(case: Case, *, radial: bool = False, lookup: bool = True) -> xr.Dataset:
    """Solve the propeller of a case over its grid.

    Parameters
    ----------
    case : Case
        From `load`.
    radial : bool, optional
        Also return the loading along the blade, over `r_over_R`.
    lookup : bool, optional
        Whether `.propeller` is to answer look-ups; without, the table is ready sooner.

    Returns
    -------
    xarray.Dataset
        CT, CQ, CP, efficiency, grade of trust and status over `rpm` and `advance_ratio`; the registry names every
        variable. Its `.propeller` answers look-ups at any airspeed, rpm and density of the table.

    Raises
    ------
    InputError
        If the propeller and its section data do not fit each other.
    """
    from bemt.table.build import build_table

    result = build_table(case.propeller, case.air, case.model, case.grid, radial=radial, lookup=lookup)
    return result.to_dataset(_attributes(case))


def envelope(case: Case, *, table: xr.Dataset | None = None) -> xr.Dataset:
    """Find what the propeller does on the motor, controller, battery and airframe of a case.

    Parameters
    ----------
    case : Case
        From `load`.
    table : xarray.Dataset, optional
        The coefficient table of the same case, fresh or read back from a file; without it the look-up table alone is
        solved here.

    Returns
    -------
    xarray.Dataset
        Operating points over `airspeed` and `throttle`, level flight over `airspeed`, and the named points. Without a
        motor in the case the second axis is `rpm`, as the grid of the case has it.

    Raises
    ------
    InputError
        If the case lacks a part that the envelope needs, or the table is that of another propeller.
    """
    from bemt.flight.envelope import build_envelope
    from bemt.table.build import build_lookup

    if table is None:
        lookup = build_lookup(case.propeller, case.air, case.model)
    else:
        from bemt.table.lookup import Lookup

        lookup = Lookup.from_dataset(table)
        if not math.isclose(lookup.diameter, case.propeller.diameter, rel_tol=1e-9):
            raise InputError(
                "table",
                f"is of a propeller of {lookup.diameter:.4g} m diameter; that of the case has "
                f"{case.propeller.diameter:.4g} m",
            )
    return build_envelope(
        lookup,
        case.air,
        motor=case.motor,
        controller=case.controller,
        battery=case.battery,
        airframe=case.airframe,
        installation=case.installation,
        rpm_limit=case.propeller.rpm_limit,
        airspeed=case.envelope_airspeed,
        throttle=case.envelope_throttle,
        rpm=case.grid.rpm if case.motor is None else None,
    ).to_dataset(_attributes(case))
