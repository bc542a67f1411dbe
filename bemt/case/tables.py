"""Reading the CSV files a case names: blade stations, section polars, airframe drag."""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from bemt.case.complaints import Complaints, did_you_mean, nearest
from bemt.case.units import ANGLE, FORCE, LENGTH, SPEED, Kind, conversion
from bemt.errors import InputError
from bemt.section.polar import NARROWEST_ALPHA_DEG, PolarTable

FloatArray = NDArray[np.float64]

UNCERTAINTY = "_u"
"""Ending of a column of standard uncertainties."""

_HEADED_POWER = re.compile(r"(?<=[A-Za-z])([2-9])\b")

RADIUS_TOLERANCE = 1e-3
"""By how much the tip station may lie beyond the tip: the rounding of a ruler, not a wrong diameter."""


@dataclass(frozen=True)
class Column:
    """A column a file may have: a pure ratio, or a quantity whose header ends in its unit.

    Parameters
    ----------
    name : str
        Without the unit.
    kind : Kind, optional
        None for a pure ratio.
    """

    name: str
    kind: Kind | None = None

    @property
    def spelling(self) -> str:
        """How a header of this column is written, in its first fitting unit."""
        if self.kind is None:
            return self.name
        return f"{self.name}_{self.kind.fitting[0].replace('/', '_').replace('*', '').replace('^', '')}"


@dataclass(frozen=True)
class Sheet:
    """The cells of a CSV file as SI numbers, with the line of each row.

    Parameters
    ----------
    file : str
        Name for messages.
    header_line : int
        Line of the header.
    lines : tuple of int
        Line of each row.
    values : dict of str to numpy.ndarray
        Columns by name without the unit, shape (n,), SI.
    raw : dict of str to list of str
        Cells as written.
    headers : dict of str to str
        Headers as written, by column name.
    complete : bool
        Whether every cell could be read.
    """

    file: str
    header_line: int
    lines: tuple[int, ...]
    values: dict[str, FloatArray]
    raw: dict[str, list[str]]
    headers: dict[str, str]
    complete: bool

    def has(self, *needed: tuple[str, str], complaints: Complaints) -> bool:
        """Complain about columns that are missing.

        Parameters
        ----------
        *needed : tuple of (str, str)
            Column and how its header is written.
        complaints : Complaints
            Takes what is found.

        Returns
        -------
        bool
            Whether none is missing.
        """
        missing = [spelling for name, spelling in needed if name not in self.values]
        for spelling in missing:
            complaints.add(self.file, self.header_line, spelling, "this column is missing")
        return not missing

    def complain_where(self, wrong: NDArray[np.bool_], name: str, message: str, complaints: Complaints) -> bool:
        """Complain about every row where something is wrong with a column.

        Parameters
        ----------
        wrong : numpy.ndarray of bool, shape (n,)
            Rows at fault.
        name : str
            Column.
        message : str
            What would fit; follows the cell as written.
        complaints : Complaints
            Takes what is found.

        Returns
        -------
        bool
            Whether any row is at fault.
        """
        for row in np.flatnonzero(wrong):
            complaints.add(self.file, self.lines[row], self.headers[name], f"{self.raw[name][row]} {message}")
        return bool(wrong.any())


def read_text(path: Path, file: str, complaints: Complaints) -> str | None:
    """Read a text file, or say why it cannot be read.

    Parameters
    ----------
    path : pathlib.Path
        Where it is.
    file : str
        Name for messages.
    complaints : Complaints
        Takes what is found.

    Returns
    -------
    str or None
        Without a byte-order mark; None where it cannot be read.
    """
    try:
        return decode(path.read_bytes())
    except FileNotFoundError:
        complaints.add(file, None, "", "no such file")
    except IsADirectoryError:
        complaints.add(file, None, "", "is a directory; a file is needed")
    except UnicodeDecodeError as error:
        complaints.add(file, error.object[: error.start].count(b"\n") + 1, "", "is not UTF-8 text")
    except (OSError, ValueError) as error:  # ValueError: a name with a null character
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        complaints.add(file, None, "", f"cannot be read: {reason}")
    return None


def decode(data: bytes) -> str:
    """Decode UTF-8 with or without a byte-order mark, with line ends made plain.

    Parameters
    ----------
    data : bytes
        Content of a file.

    Returns
    -------
    str

    Raises
    ------
    UnicodeDecodeError
        If it is not UTF-8.
    """
    return data.decode("utf-8-sig").replace("\r\n", "\n").replace("\r", "\n")


def read_sheet(
    path: Path, file: str, columns: Sequence[Column], complaints: Complaints, *, uncertainties: bool = False
) -> Sheet | None:
    """Read a comma-separated table whose columns stand under known names.

    Lines that are empty or begin with "#" are passed over.

    Parameters
    ----------
    path : pathlib.Path
        Where it is.
    file : str
        Name for messages.
    columns : sequence of Column
        What may stand in it.
    complaints : Complaints
        Takes what is found.
    uncertainties : bool
        Whether a header may end in `_u`: a column of standard uncertainties, which `Sheet.values` has under the name
        of its quantity with the same ending.

    Returns
    -------
    Sheet or None
        None where there is no usable header or no row.
    """
    text = read_text(path, file, complaints)
    if text is None:
        return None
    numbered: list[tuple[int, list[str]]] = []
    for number, line in enumerate(text.split("\n"), start=1):
        if line.strip() and not line.lstrip().startswith("#"):
            try:
                numbered.append((number, [cell.strip() for cell in next(csv.reader([line]))]))
            except csv.Error as error:
                complaints.add(file, number, "", f"is no row of a comma-separated table: {error}")
                return None
    if not numbered:
        complaints.add(file, None, "", "is empty; a header and rows are needed")
        return None
    (header_line, header), rows = numbered[0], numbered[1:]
    before = len(complaints)
    found = _columns_of(header, header_line, file, columns, complaints, uncertainties)
    if len(complaints) > before:
        return None
    if not rows:
        complaints.add(file, header_line, "", "has a header and no rows")
        return None
    values = {name: np.full(len(rows), np.nan) for name, *_ in found}
    raw: dict[str, list[str]] = {name: [] for name, *_ in found}
    for index, (row_line, row) in enumerate(rows):
        if len(row) != len(header):
            complaints.add(file, row_line, "", f"{len(row)} cells; the header has {len(header)} columns")
        cells = (row + [""] * len(header))[: len(header)]
        for (name, factor, offset), heading, cell in zip(found, header, cells, strict=True):
            raw[name].append(cell)
            value = _number(cell)
            if value is not None:
                values[name][index] = value * factor + offset
            elif len(row) == len(header):
                words = f"{cell!r} is not a number" if cell else "is empty; a number is needed"
                complaints.add(file, row_line, heading, words)
    return Sheet(
        file=file,
        header_line=header_line,
        lines=tuple(line for line, _ in rows),
        values=values,
        raw=raw,
        headers={name: heading for (name, *_), heading in zip(found, header, strict=True)},
        complete=len(complaints) == before,
    )


def _number(cell: str) -> float | None:
    try:
        number = float(cell.replace("_", "x"))  # Python would take 1_000
    except ValueError:
        return None
    return number if math.isfinite(number) else None


def _columns_of(
    header: list[str], line: int, file: str, columns: Sequence[Column], complaints: Complaints, uncertainties: bool
) -> list[tuple[str, float, float]]:
    """Return name, and factor and offset to SI, of each column of a header."""
    if len(header) == 1 and any(mark in header[0] for mark in ";\t"):
        complaints.add(file, line, "", "columns are separated by commas")
        return []
    found: list[tuple[str, float, float]] = []
    for heading in header:
        with complaints.gathered(file, line, heading):
            if uncertainties and heading.endswith(UNCERTAINTY):
                name, factor, _ = _column_of(heading.removesuffix(UNCERTAINTY), columns)
                name, offset = name + UNCERTAINTY, 0.0
            else:
                name, factor, offset = _column_of(heading, columns)
            if name in (known for known, *_ in found):
                raise ValueError("an earlier column gives the same quantity; give it once")
            found.append((name, factor, offset))
    return found


def _column_of(heading: str, columns: Sequence[Column]) -> tuple[str, float, float]:
    if not heading:
        raise ValueError("a column without a name")
    known = [column.spelling for column in columns]
    for column in columns:
        if column.kind is None:
            if heading == column.name:
                return column.name, 1.0, 0.0
        elif heading == column.name:
            raise ValueError(f"a {column.kind.name} column ends in its unit, such as {column.spelling}")
        elif heading.startswith(column.name + "_"):
            # An underscore inside the unit stands for "per", a figure for a power: airspeed_m_s, air_density_kg_m3.
            unit = _HEADED_POWER.sub(r"^\1", heading[len(column.name) + 1 :].replace("_", "/", 1))
            try:
                return column.name, *conversion(unit, column.kind)
            except ValueError as error:
                near = nearest(heading, known)
                if near in (None, column.spelling):
                    raise
                raise ValueError(f"unknown column (did you mean {near!r}?)") from error
    raise ValueError(f"unknown column{did_you_mean(heading, known)}; known ones: {', '.join(known)}")


_STATION_COLUMNS = (
    Column("r_over_R"),
    Column("radius", LENGTH),
    Column("c_over_R"),
    Column("chord", LENGTH),
    Column("twist", ANGLE),
    Column("t_over_c"),
    Column("thickness", LENGTH),
    Column("camber"),
)


@dataclass(frozen=True, eq=False)
class StationColumns:
    """The stations of a blade as written: ratios, or lengths that still need the measured diameter.

    Parameters
    ----------
    sheet : Sheet
        The cells as read.
    """

    sheet: Sheet

    @property
    def absolute(self) -> bool:
        """Whether any column is a length."""
        return any(name in self.sheet.values for name in ("radius", "chord", "thickness"))

    def over_radius(self, tip_radius: float, complaints: Complaints) -> dict[str, FloatArray | None] | None:
        """Make the stations dimensionless.

        Parameters
        ----------
        tip_radius : float
            Of the measured blade [m].
        complaints : Complaints
            Takes radii beyond the tip, and shares out of range.

        Returns
        -------
        dict of str to numpy.ndarray or None
            `r_over_R`, `c_over_R`, `twist` [rad], `t_over_c`, `camber`, shape (n,) each; None instead of the whole
            where something is out of range.
        """
        sheet, values = self.sheet, self.sheet.values
        where = "r_over_R" if "r_over_R" in values else "radius"
        radius = values["r_over_R"] if "r_over_R" in values else values["radius"] / tip_radius
        chord = values["c_over_R"] if "c_over_R" in values else values["chord"] / tip_radius
        thickness = values.get("t_over_c")
        if "thickness" in values:
            thickness = values["thickness"] / (chord * tip_radius)
        tip = f"the tip, r/R = 1 (radius {tip_radius * 1e3:.4g} mm, half of the measured diameter)"
        wrong = sheet.complain_where(radius > 1.0 + RADIUS_TOLERANCE, where, f"lies beyond {tip}", complaints)
        chord_name = "c_over_R" if "c_over_R" in values else "chord"
        wrong |= sheet.complain_where(chord > 2.0, chord_name, "is wider than the propeller's diameter", complaints)
        if thickness is not None:
            name = "t_over_c" if "t_over_c" in values else "thickness"
            wrong |= sheet.complain_where(thickness > 1.0, name, "is thicker than the chord is long", complaints)
        if wrong:
            return None
        return {
            "r_over_R": np.minimum(radius, 1.0),
            "c_over_R": chord,
            "twist": values["twist"],
            "t_over_c": thickness,
            "camber": values.get("camber"),
        }


def read_stations(path: Path, file: str, complaints: Complaints) -> StationColumns | None:
    """Read the stations of a blade.

    Parameters
    ----------
    path : pathlib.Path
        CSV with radius_<unit> or r_over_R; chord_<unit> or c_over_R; twist_<unit>; optional t_over_c or
        thickness_<unit>, and camber.
    file : str
        Name for messages.
    complaints : Complaints
        Takes what is found.

    Returns
    -------
    StationColumns or None
        None where anything is wrong.
    """
    before = len(complaints)
    sheet = read_sheet(path, file, _STATION_COLUMNS, complaints)
    if sheet is None:
        return None
    in_cells = len(complaints)
    for ratio, length, needed in (
        ("r_over_R", "radius", True),
        ("c_over_R", "chord", True),
        ("t_over_c", "thickness", False),
    ):
        both = f"{ratio} or {length}_mm (any length unit)"
        if ratio in sheet.values and length in sheet.values:
            complaints.add(file, sheet.header_line, sheet.headers[length], f"give {both}, not both")
        elif needed and ratio not in sheet.values and length not in sheet.values:
            complaints.add(file, sheet.header_line, f"{length}_mm", f"this column is missing; needed: {both}")
    if "twist" not in sheet.values:
        complaints.add(file, sheet.header_line, "twist_deg", "this column is missing; needed: twist_deg or twist_rad")
    if len(complaints) > in_cells:
        return None
    for name in ("r_over_R", "radius", "c_over_R", "chord", "t_over_c", "thickness"):
        if name in sheet.values:
            sheet.complain_where(sheet.values[name] <= 0, name, "must be more than 0", complaints)
    for name in ("r_over_R", "radius"):
        if name in sheet.values:
            steps = np.diff(sheet.values[name], prepend=-np.inf)
            sheet.complain_where(steps == 0, name, "is there twice; each station once", complaints)
            sheet.complain_where(
                steps < 0, name, "is less than the row before; radii ascend from root to tip", complaints
            )
    if "twist" in sheet.values:
        steep = np.abs(sheet.values["twist"]) >= np.pi / 2
        sheet.complain_where(steep, "twist", "lies beyond 90 deg from the plane of rotation", complaints)
    if "camber" in sheet.values:
        wrong = np.abs(sheet.values["camber"]) > 0.5
        sheet.complain_where(wrong, "camber", "is no share of the chord (within 0.5)", complaints)
    if "t_over_c" in sheet.values:
        sheet.complain_where(sheet.values["t_over_c"] > 1, "t_over_c", "is no share of the chord (0 to 1)", complaints)
    if len(sheet.lines) < 2:
        complaints.add(file, sheet.lines[0], "", "one station; at least two are needed, root and tip")
    return StationColumns(sheet) if len(complaints) == before else None


_POLAR_COLUMNS = (
    Column("reynolds"),
    Column("alpha", ANGLE),
    Column("cl"),
    Column("cd"),
    Column("cm"),
    Column("mach"),
)


def read_polars(path: Path, file: str, complaints: Complaints) -> PolarTable | None:
    """Read the polars of one section.

    The angles of the Reynolds and Mach numbers need not agree: all are brought to the union of the angles over the
    range they share, by straight lines between rows. With several Mach numbers each needs all Reynolds numbers.

    Parameters
    ----------
    path : pathlib.Path
        Tidy CSV: reynolds, alpha_<unit>, cl, cd, optional cm and mach.
    file : str
        Name for messages.
    complaints : Complaints
        Takes what is found.

    Returns
    -------
    PolarTable or None
        None where anything is wrong.
    """
    before = len(complaints)
    sheet = read_sheet(path, file, _POLAR_COLUMNS, complaints)
    if sheet is None:
        return None
    if not sheet.has(
        ("reynolds", "reynolds"), ("alpha", "alpha_deg"), ("cl", "cl"), ("cd", "cd"), complaints=complaints
    ):
        return None
    values = sheet.values
    sheet.complain_where(values["reynolds"] <= 0, "reynolds", "must be more than 0", complaints)
    sheet.complain_where(np.abs(values["alpha"]) > np.pi + 1e-9, "alpha", "lies beyond 180 deg", complaints)
    sheet.complain_where(values["cd"] <= 0, "cd", "must be more than 0", complaints)
    sheet.complain_where(values["cd"] > 5, "cd", "is no drag coefficient of a section", complaints)
    sheet.complain_where(np.abs(values["cl"]) > 5, "cl", "is no lift coefficient of a section", complaints)
    if "mach" in values:
        wrong = (values["mach"] < 0) | (values["mach"] >= 1)
        sheet.complain_where(wrong, "mach", "must lie between 0 and 1", complaints)
    _complain_of_repeated_points(sheet, complaints)
    reynolds = np.unique(values["reynolds"])
    if sheet.complete and reynolds.size < 2:
        complaints.add(
            file,
            sheet.lines[0],
            "reynolds",
            f"only {reynolds[0]:g}; at least two Reynolds numbers are needed to interpolate between",
        )
    mach = np.unique(values["mach"]) if "mach" in values else np.zeros(1)
    blocks = _blocks(sheet, mach, reynolds, complaints)
    if len(complaints) > before:
        return None
    return _common_angles(sheet, mach, reynolds, blocks, complaints)


def _complain_of_repeated_points(sheet: Sheet, complaints: Complaints) -> None:
    axes = [name for name in ("alpha", "reynolds", "mach") if name in sheet.values]
    seen: dict[tuple[float, ...], int] = {}
    for row, line in enumerate(sheet.lines):
        point = tuple(float(sheet.values[name][row]) for name in axes)
        if point in seen:
            where = " and ".join(f"{name} {value:g}" for name, value in zip(axes[1:], point[1:], strict=True))
            message = f"{sheet.raw['alpha'][row]} at {where} stands on line {seen[point]} already"
            complaints.add(sheet.file, line, sheet.headers["alpha"], message)
        seen.setdefault(point, line)


def _blocks(sheet: Sheet, mach: FloatArray, reynolds: FloatArray, complaints: Complaints) -> list[NDArray[np.intp]]:
    """Rows of each Mach and, within it, Reynolds number, by ascending angle; complain of what is missing."""
    values = sheet.values
    blocks = []
    for number in mach:
        at_mach = values["mach"] == number if mach.size > 1 else np.ones(len(sheet.lines), dtype=bool)
        for wanted in reynolds:
            rows = np.flatnonzero(at_mach & (values["reynolds"] == wanted))
            blocks.append(rows[np.argsort(values["alpha"][rows])])
            where = f"reynolds {wanted:g}" + (f" and mach {number:g}" if mach.size > 1 else "")
            if rows.size:
                _complain_of_reach(sheet, rows, where, complaints)
            elif sheet.complete:
                line = sheet.lines[int(np.argmax(at_mach))]
                message = f"no row has {where}; with several Mach numbers each needs all Reynolds numbers of the file"
                complaints.add(sheet.file, line, sheet.headers["mach"], message)
    return blocks


def _complain_of_reach(sheet: Sheet, rows: NDArray[np.intp], where: str, complaints: Complaints) -> None:
    angles = np.degrees(sheet.values["alpha"][rows])
    low, high = NARROWEST_ALPHA_DEG
    if not np.isfinite(angles).all():
        return
    if angles.min() > low + 1e-6 or angles.max() < high - 1e-6:
        complaints.add(
            sheet.file,
            sheet.lines[rows.min()],
            sheet.headers["alpha"],
            f"at {where} the angles reach from {angles.min():g} to {angles.max():g} deg; they must reach "
            f"at least from {low:g} to {high:g} deg, past the stall",
        )


def _common_angles(
    sheet: Sheet, mach: FloatArray, reynolds: FloatArray, blocks: list[NDArray[np.intp]], complaints: Complaints
) -> PolarTable | None:
    values = sheet.values
    low = max(values["alpha"][rows[0]] for rows in blocks)
    high = min(values["alpha"][rows[-1]] for rows in blocks)
    alpha = np.unique(values["alpha"])
    alpha = alpha[(alpha >= low) & (alpha <= high)]
    shape = (mach.size, reynolds.size, alpha.size) if mach.size > 1 else (reynolds.size, alpha.size)

    def over_angles(name: str) -> FloatArray:
        over = [np.interp(alpha, values["alpha"][rows], values[name][rows]) for rows in blocks]
        return np.array(over).reshape(shape)

    try:
        return PolarTable(
            alpha=alpha,
            reynolds=reynolds,
            lift=over_angles("cl"),
            drag=over_angles("cd"),
            moment=over_angles("cm") if "cm" in values else None,
            source=sheet.file,
            mach=mach if mach.size > 1 else float(mach[0]),
        )
    except InputError as error:
        complaints.add(sheet.file, sheet.header_line, error.field, error.message)
        return None


def read_drag(path: Path, file: str, complaints: Complaints) -> tuple[tuple[float, float], ...] | None:
    """Read the drag of an airframe in level flight.

    Parameters
    ----------
    path : pathlib.Path
        CSV with airspeed_<unit> and drag_<unit>.
    file : str
        Name for messages.
    complaints : Complaints
        Takes what is found.

    Returns
    -------
    tuple of (float, float) or None
        Airspeed [m/s] and drag [N]; None where anything is wrong.
    """
    before = len(complaints)
    sheet = read_sheet(path, file, (Column("airspeed", SPEED), Column("drag", FORCE)), complaints)
    if sheet is None:
        return None
    if not sheet.has(("airspeed", "airspeed_m_s"), ("drag", "drag_N"), complaints=complaints):
        return None
    steps = np.diff(sheet.values["airspeed"], prepend=-np.inf)
    sheet.complain_where(steps <= 0, "airspeed", "is not above the row before; airspeeds ascend", complaints)
    sheet.complain_where(sheet.values["airspeed"] < 0, "airspeed", "must not be negative", complaints)
    sheet.complain_where(sheet.values["drag"] <= 0, "drag", "must be more than 0", complaints)
    if len(sheet.lines) < 2:
        complaints.add(file, sheet.lines[0], "", "one row; at least two are needed")
    if len(complaints) > before:
        return None
    return tuple(zip(sheet.values["airspeed"].tolist(), sheet.values["drag"].tolist(), strict=True))
