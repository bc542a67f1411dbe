"""The functions of the public face; `bemt` hands them out when they are first asked for."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

from bemt.errors import InputError
from bemt.version import __version__

if TYPE_CHECKING:
    import xarray as xr

    from bemt.case.load import Case
    from bemt.study.compare import Comparison
    from bemt.study.motor_fit import MotorFit

__all__ = ["calibrate_motor", "coefficient_table", "compare", "envelope", "load"]


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
    from bemt.table.references import references

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
    from dataclasses import replace

    import numpy as np

    from bemt.blade.untwist import rigid_blade_note
    from bemt.flight.envelope import build_envelope
    from bemt.table.build_lookup import build_lookup

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
    run = build_envelope(
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
    )
    notes = []
    turning = np.nan_to_num(run.values["rpm"] if run.rpm is None else run.rpm)
    rigid = rigid_blade_note(case.propeller, float(turning.max()))
    if rigid is not None:
        notes.append(rigid)
    if case.grid.inclined:
        notes.append("incidence of [grid] is of the coefficient table alone: the envelope is of axial flow")
    return replace(run, notes=(*run.notes, *notes)).to_dataset(_attributes(case))


def compare(case: Case, *measured: str | Path) -> Comparison:
    """Judge the prediction of a case by measured points.

    Parameters
    ----------
    case : Case
        From `load`.
    *measured : str or pathlib.Path
        CSV files of readings, at least one; several count as one.

    Returns
    -------
    Comparison
        Measured and predicted coefficients of every row, errors, landmarks of each run, and what one change to the
        whole blade would leave.

    Raises
    ------
    CaseError
        If anything in a file is wrong, with every complaint found.
    InputError
        If no file is named, or the readings have neither thrust nor torque.
    """
    from bemt.case.readings import Readings, load_readings
    from bemt.study.compare import compare as judge

    if not measured:
        raise InputError("measured", "at least one file of readings is needed")
    parts = [load_readings(path, diameter=case.propeller.diameter, air=case.air) for path in measured]
    found = judge(case.propeller, case.model, Readings.joined(parts))
    if case.installation is None:
        return found
    return replace(found, notes=(*found.notes, "[installation] is not applied to readings of a propeller"))


def calibrate_motor(case: Case, *measured: str | Path, held: Sequence[str] = ()) -> MotorFit:
    """Find the constants of a case's motor from rows of a bench.

    Parameters
    ----------
    case : Case
        From `load`; its `[motor]` is where the search begins, its `[controller]` counts as known.
    *measured : str or pathlib.Path
        CSV files of readings of one motor, at least one; several count as one.
    held : sequence of str, optional
        Constants that stay as the case has them: "speed_constant", "winding_resistance", "no_load_current".

    Returns
    -------
    MotorFit
        Speed constant, resistance and no-load current with their covariance, what the rows cannot tell, and the motor
        that has them.

    Raises
    ------
    CaseError
        If anything in a file is wrong, with every complaint found.
    InputError
        If no file is named, the case has no motor, or no row says anything of it.
    RunError
        If the search does not converge.
    """
    from bemt.case.readings import Readings, load_readings
    from bemt.study.motor_fit import fit_motor

    if not measured:
        raise InputError("measured", "at least one file of readings is needed")
    if case.motor is None:
        raise InputError("motor", "the case has no [motor]; give it one with the speed_constant of the label")
    diameter = case.propeller.diameter
    parts = [load_readings(path, diameter=diameter, air=case.air) for path in measured]
    readings = Readings.joined(parts)
    return fit_motor(readings, case.controller, start=case.motor, diameter=diameter, held=held)
