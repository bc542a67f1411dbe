"""From a case file to the plain objects of the layers below, or to every complaint about it at once."""

from __future__ import annotations

import os
import sys
import tomllib
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from bemt.air import Air, standard_air
from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.case import models
from bemt.case.complaints import Complaints, nearest
from bemt.case.defaults import (
    DEFAULT_ADVANCE_RATIOS,
    DEFAULT_TIP_MACH,
    GUESSED_CAMBER,
    GUESSED_DRAG_SCALE,
    GUESSED_FAMILY,
    GUESSED_THICKNESS,
    MOTOR_DOUBTED,
    MOTOR_GUESSED,
    SECTION_GUESSED,
    default_advance_ratio_end,
    default_rpm,
)
from bemt.case.lines import KeyLines, syntax_error_place
from bemt.case.lines import Path as KeyPath
from bemt.case.schema import check_keys, unknown_keys
from bemt.case.sweep import check_sweep
from bemt.case.tables import decode, read_drag, read_polars, read_stations, read_text
from bemt.drive import Battery, Controller, Motor
from bemt.drive.battery import RESISTANCE_TEMPERATURE as CELL_AT
from bemt.drive.label import GUESS_BAND, NO_LOAD_VOLTAGE, Stator, doubts, guessed_no_load_current, guessed_resistance
from bemt.drive.motor import RESISTANCE_TEMPERATURE as COPPER_AT
from bemt.errors import CaseError, InputError
from bemt.flight.airframe import Airframe, Installation, Multirotor
from bemt.rotor.model import Model
from bemt.section.family import family
from bemt.section.polar import PolarTable
from bemt.table.grid import Grid

FloatArray = NDArray[np.float64]

STANDARD_INPUT = "-"

_LATER = "is not available in this version"

_LATER_KEYS: dict[tuple[str, str], tuple[str, str]] = {
    ("propeller", "pitch"): ("a blade from its label", "give the measured stations"),
    ("propeller", "outline"): ("a blade from its label", "give the measured stations"),
    ("section", "shape"): ("a section by its shape", "use polars or family"),
}
# Keys the schema leaves open because a later key can stand in for them.
_NEEDED: dict[tuple[str, str], tuple[tuple[str, ...], str]] = {
    ("propeller", "stations"): (("pitch", "outline"), "the CSV file of the blade's measured stations"),
    ("motor", "winding_resistance"): (
        ("label_only",),
        'the resistance between two leads at 20 degC, such as winding_resistance = "41 mohm"',
    ),
    ("motor", "no_load"): (
        ("label_only",),
        'a reading of the motor running free, such as no_load = [ { voltage = "10 V", current = "0.9 A" } ]',
    ),
    ("airframe", "drag"): (("hover",), "{ cd0 = ..., k = ... } or the name of a CSV file of airspeed_m_s and drag_N"),
}


@dataclass(frozen=True, eq=False)
class Case:
    """A case in plain SI objects; parts that the file does not have are None.

    Parameters
    ----------
    title : str
        As written.
    path : str
        The file as the user named it; "-" for standard input.
    text : str
        The whole case file.
    air : Air
        Air of all points.
    propeller : Propeller
        Blade, sections and size.
    model : Model
        Settings of the solution.
    grid : Grid
        Advance ratios and rpm of the coefficient table.
    envelope_airspeed : numpy.ndarray, shape (n,), or None
        Airspeeds of the envelope [m/s].
    envelope_throttle : numpy.ndarray, shape (n,), or None
        Throttle settings of the envelope, 0 to 1.
    motor, controller, battery, airframe, installation : optional
        As in the layers below.
    notes : tuple of str
        What a user must be told beside every result: guesses, limits passed.
    notices : tuple of str
        What is good to know about the case itself: defaults taken, keys without effect.
    """

    title: str
    path: str
    text: str
    air: Air
    propeller: Propeller
    model: Model
    grid: Grid
    envelope_airspeed: FloatArray | None = None
    envelope_throttle: FloatArray | None = None
    motor: Motor | None = None
    controller: Controller | None = None
    battery: Battery | None = None
    airframe: Airframe | Multirotor | None = None
    installation: Installation | None = None
    notes: tuple[str, ...] = ()
    notices: tuple[str, ...] = ()


def load_case(source: str | os.PathLike[str]) -> Case:
    """Read a case file and every file it names.

    Parameters
    ----------
    source : str or path-like
        The case file; "-" reads it from standard input, and the paths in it are then relative to the current folder.

    Returns
    -------
    Case

    Raises
    ------
    CaseError
        With everything that is wrong in the case file and the files it names.
    """
    name = os.fspath(source)
    complaints = Complaints()
    if name == STANDARD_INPUT:
        file, folder = "<stdin>", Path()
        try:
            text: str | None = decode(sys.stdin.buffer.read())
        except UnicodeDecodeError:
            text = None
            complaints.add(file, None, "", "is not UTF-8 text")
    else:
        file, folder = name, Path(name).parent
        text = read_text(Path(name), file, complaints)
    if text is None:
        complaints.raise_any()
        raise CaseError([])
    try:
        document, lines = tomllib.loads(text), KeyLines(text)
    except tomllib.TOMLDecodeError as error:
        line, message = syntax_error_place(error, text)
        complaints.add(file, line, "", f"is not valid TOML: {message}")
        complaints.raise_any()
        raise
    except RecursionError:
        complaints.add(file, None, "", "is nested too deeply")
        complaints.raise_any()
        raise
    return _Loader(file, folder, document, lines, complaints).case(name, text)


def _spelled(path: KeyPath) -> str:
    """Return a key path as a reader would write it, elements of lists counted from 1."""
    words = ""
    for step in path:
        if isinstance(step, int):
            words += f"[{step + 1}]"
        else:
            words += ("." if words else "") + (step if step.replace("_", "").isalnum() else f'"{step}"')
    return words


@dataclass
class _Loader:
    """One reading of one case file: holds what all of its parts need, and collects complaints and remarks."""

    file: str
    folder: Path
    document: dict[str, Any]
    lines: KeyLines
    complaints: Complaints
    notes: list[str] = field(default_factory=list)
    notices: list[str] = field(default_factory=list)

    def case(self, name: str, text: str) -> Case:
        """Check everything, then build; raise with all complaints if there is any."""
        file = check_keys(self.document, self.complain)
        honoured = self.refuse_later_work()
        self.ask_for_needed_keys()
        air = self.air(file["air"]) if "air" in file else None
        drag_scale = self.drag_scale(file)
        model = self.model(file["model"], drag_scale) if "model" in file and honoured else None
        propeller = self.propeller(file)
        motor = self.motor(file.get("motor"))
        controller = self.controller(file.get("controller"))
        battery = self.battery(file.get("battery"))
        airframe = self.airframe(file.get("airframe"))
        installation = self.installation(file.get("installation"))
        axes = self.axes(file["grid"]) if "grid" in file else None
        if file.get("sweep") is not None:
            check_sweep(self.document["sweep"], self.complain)
        self.notices += [
            f"[{unused}] is read and checked, and has no effect on the commands of this version"
            for unused in ("sweep", "uncertainty")
            if unused in self.document
        ]
        grid = None
        if air is not None and propeller is not None and axes is not None:
            grid = self.grid(propeller, air, axes)
        self.complaints.raise_any()
        # A part that could not be built has left a complaint.
        assert air is not None
        assert model is not None
        assert propeller is not None
        assert grid is not None
        assert axes is not None
        self.remark_on_rpm(propeller, grid)
        return Case(
            title=file["title"],
            path=name,
            text=text,
            air=air,
            propeller=propeller,
            model=model,
            grid=grid,
            envelope_airspeed=axes["airspeed"],
            envelope_throttle=axes["throttle"],
            motor=motor,
            controller=controller,
            battery=battery,
            airframe=airframe,
            installation=installation,
            notes=tuple(self.notes),
            notices=tuple(self.notices),
        )

    def complain(self, path: KeyPath, message: str) -> None:
        """Note what is wrong with a key."""
        self.complaints.add(self.file, self.lines.of(path), _spelled(path), message)

    @contextmanager
    def about(self, section: KeyPath, **keys: str) -> Iterator[None]:
        """Turn an `InputError` of a plain object into a complaint about the key it came from."""
        try:
            yield
        except InputError as error:
            head = error.field.partition(".")[0]
            key = keys.get(head, head)
            self.complain(section + ((key,) if key else ()), error.message)

    def tables(self, name: str) -> Iterator[tuple[KeyPath, dict[str, Any]]]:
        """Return the tables written under a section's name, with their paths: none, one, or an array of them."""
        written = self.document.get(name)
        listed = written if isinstance(written, list) else [written]
        for index, table in enumerate(listed):
            if isinstance(table, dict):
                yield ((name, index) if isinstance(written, list) else (name,)), table

    def refuse_later_work(self) -> bool:
        """Refuse what this version would silently leave out; return whether all is honoured."""
        before = len(self.complaints)
        for (section, key), (what, instead) in _LATER_KEYS.items():
            for path, table in self.tables(section):
                if key in table:
                    self.complain((*path, key), f"{what} {_LATER}; {instead}")
        if "correction" in self.document:
            self.complain(("correction",), f"{_LATER}; remove this section: its numbers would not be applied")
        return len(self.complaints) == before

    def ask_for_needed_keys(self) -> None:
        """Complain where a key is missing, nothing stands in for it, and no misspelling of it has been found."""
        for (section, key), (substitutes, words) in _NEEDED.items():
            for path, table in self.tables(section):
                stood_in = any(table.get(substitute) for substitute in substitutes)
                misspelt = nearest(key, unknown_keys(path, table)) is not None
                if key not in table and not stood_in and not misspelt:
                    self.complain((*path, key), f"is missing: {words}")

    # --- air and model -----------------------------------------------------------------------------------------------

    def air(self, section: models.AirSection) -> Air | None:
        outright = {name: getattr(section, name) for name in ("density", "viscosity", "speed_of_sound")}
        state = [
            name
            for name in ("altitude", "temperature", "temperature_offset", "pressure")
            if getattr(section, name) is not None
        ]
        given = [name for name, value in outright.items() if value is not None]
        if given:
            missing = [name for name in outright if name not in given]
            for name in state:
                self.complain(
                    ("air", name),
                    f"conflicts with {given[0]}: give a state of the atmosphere, or density, "
                    "viscosity and speed_of_sound outright",
                )
            if missing:
                self.complain(("air", given[0]), f"needs {' and '.join(missing)} beside it")
            if state or missing:
                return None
            with self.about(("air",)):
                return Air(**{name: cast(float, value) for name, value in outright.items()})
            return None
        if section.temperature is not None and section.temperature_offset is not None:
            self.complain(("air", "temperature_offset"), "conflicts with temperature: give one of the two")
            return None
        with self.about(("air",)):
            return standard_air(
                section.altitude or 0.0,
                temperature=section.temperature,
                temperature_offset=section.temperature_offset or 0.0,
                pressure=section.pressure,
            )
        return None

    def drag_scale(self, file: Mapping[str, Any]) -> float:
        """Factor on the drag: as given, or the one that belongs to a guessed section."""
        model = file.get("model")
        if model is not None and model.drag_scale is not None:
            return float(model.drag_scale)
        return 1.0 if self.document.get("section") else GUESSED_DRAG_SCALE

    def model(self, section: models.ModelSection, drag_scale: float) -> Model | None:
        with self.about(("model",)):
            return Model(
                elements=section.elements,
                inflow=section.inflow,
                end_loss=section.end_loss.law,
                end_loss_ends=tuple(dict.fromkeys(section.end_loss.ends)),
                stall_delay=section.stall_delay,
                stall_strength=section.stall_strength,
                post_stall=section.post_stall,
                plate_drag=section.plate_drag,
                reynolds_rule=section.reynolds_rule,
                drag_scale=drag_scale,
            )
        return None

    # --- propeller ---------------------------------------------------------------------------------------------------

    def propeller(self, file: Mapping[str, Any]) -> Propeller | None:
        """Build the propeller; the blade's file is read even where a key of the section is wrong."""
        section: models.PropellerSection | None = file.get("propeller")
        written = self.document.get("propeller")
        name = written.get("stations") if isinstance(written, dict) else None
        columns = None
        if isinstance(name, str) and name and self.finds(("propeller", "stations"), name):
            columns = read_stations(self.folder / name, self.label(name), self.complaints)
        spans = self.spans(file["section"]) if "section" in file else None
        if section is None:
            return None
        measured = section.measured_diameter or section.diameter
        shares = None if columns is None else columns.over_radius(0.5 * measured, self.complaints)
        if columns is None or shares is None or spans is None:
            return None
        self.remark_on_scaling(section, columns.absolute)
        guessed = not spans
        if guessed:
            spans = (self.guessed_span(shares, self.drag_scale(file)),)
        elif section.twist_reference == "flat face":
            for number, span in enumerate(spans):
                if span.polars is not None:
                    self.complain(
                        ("propeller", "twist_reference"),
                        f'"flat face" needs a section family, whose lower face is known; section {number + 1} has '
                        'polars of its own: measure the "chord line" there',
                    )
                    return None
        root = max(section.hub_diameter / section.diameter, float(cast(FloatArray, shares["r_over_R"])[0]))
        if spans[0].start > root + 1e-9:
            self.complain(
                ("section", 0, "from"),
                f"{spans[0].start:g} lies outside the root of the blade, r/R = {root:.4g}, and leaves a gap there",
            )
            return None
        with self.about(("propeller",), r_over_R="stations", c_over_R="stations", twist="stations"):
            propeller = Propeller(
                blades=section.blades,
                diameter=section.diameter,
                stations=Stations(
                    r_over_R=cast(FloatArray, shares["r_over_R"]),
                    c_over_R=cast(FloatArray, shares["c_over_R"]),
                    twist=cast(FloatArray, shares["twist"]),
                    t_over_c=shares["t_over_c"],
                    camber=shares["camber"],
                    twist_reference=section.twist_reference,
                ),
                sections=spans,
                hub_diameter=section.hub_diameter,
                rpm_limit=section.rpm_limit,
                rotation=section.rotation,
                section_guessed=guessed,
            )
            self.remark_on_blade(propeller)
            return propeller
        return None

    def label(self, name: str) -> str:
        """Name a data file as the user would: from the current folder, as the case file itself."""
        return str(self.folder / name)

    def finds(self, path: KeyPath, name: str) -> bool:
        """Complain at the key rather than in the file where there is no such file."""
        try:
            there = (self.folder / name).exists()
        except (OSError, ValueError):  # a name no file system takes
            there = False
        if not there:
            self.complain(path, f"no such file: {self.label(name)}")
        return there

    def spans(self, entries: list[models.BladeSection]) -> tuple[SectionSpan, ...] | None:
        """Build the sections along the span; None where anything is wrong, empty where there is none."""
        before = len(self.complaints)
        spans: list[SectionSpan] = []
        for index, entry in enumerate(entries):
            here: KeyPath = ("section", index)
            sources = [key for key in ("polars", "family", "shape") if getattr(entry, key) is not None]
            if not sources:
                self.complain(here, "needs one of polars, family or shape")
            for extra in sources[1:]:
                self.complain((*here, extra), f"conflicts with {sources[0]}: one source a section")
            if entry.end <= entry.start:
                self.complain((*here, "to"), f"{entry.end:g} must be more than from = {entry.start:g}")
            if index and abs(entry.start - entries[index - 1].end) > 1e-9:
                kind = "overlaps" if entry.start < entries[index - 1].end else "leaves a gap after"
                self.complain(
                    (*here, "from"),
                    f"{entry.start:g} {kind} the section before, which ends at {entries[index - 1].end:g}; "
                    "sections run from root to tip without gaps",
                )
            polars = None
            if entry.polars is not None:
                polars = self.polars((*here, "polars"), entry.polars)
            if entry.family is not None:
                with self.about(here):
                    family(entry.family)
            if len(self.complaints) == before and entry.shape is None:
                spans.append(SectionSpan(start=entry.start, end=entry.end, polars=polars, family=entry.family))
        if entries and entries[-1].end < 1.0:
            self.complain(
                ("section", len(entries) - 1, "to"), f"{entries[-1].end:g} must be 1: no section reaches the tip"
            )
        return tuple(spans) if len(spans) == len(entries) and len(self.complaints) == before else None

    def polars(self, path: KeyPath, name: str) -> PolarTable | None:
        if not self.finds(path, name):
            return None
        return read_polars(self.folder / name, self.label(name), self.complaints)

    def guessed_span(self, shares: dict[str, FloatArray | None], drag_scale: float) -> SectionSpan:
        """Return the section of a moulded propeller of which nobody knows the section."""
        thickness = "thickness as measured" if shares["t_over_c"] is not None else "11 % thick"
        self.notes.append(SECTION_GUESSED.format(thickness=thickness, drag_scale=drag_scale))
        return SectionSpan(family=GUESSED_FAMILY, t_over_c=GUESSED_THICKNESS, camber=GUESSED_CAMBER)

    # --- drive and flight --------------------------------------------------------------------------------------------

    def motor(self, section: models.MotorSection | None) -> Motor | None:
        if section is None:
            return None
        resistance, no_load = section.winding_resistance, section.no_load
        controller = self.document.get("controller")
        if section.winding_inductance and not (isinstance(controller, dict) and "switching_frequency" in controller):
            self.complain(
                ("motor", "winding_inductance"), "needs switching_frequency in [controller]: the ripple comes from both"
            )
        if not section.label_only and (resistance is None or no_load is None):
            return None
        with self.about(("motor",)):
            stator = None if section.label is None else Stator.of(section.label)
            guessed = []
            if resistance is None:
                resistance = guessed_resistance(section.speed_constant, stator)
                guessed.append(f"winding resistance {resistance * 1e3:.3g} mohm")
            if no_load is None:
                current = guessed_no_load_current(section.speed_constant)
                readings: tuple[tuple[float, float], ...] = ((NO_LOAD_VOLTAGE, current),)
                guessed.append(f"no-load current {current:.2g} A")
            else:
                readings = tuple((reading.voltage, reading.current) for reading in no_load)
            motor = Motor(
                speed_constant=section.speed_constant,
                winding_resistance=resistance,
                no_load=readings,
                count=section.count,
                current_limit=section.current_limit,
                winding_temperature=section.winding_temperature or COPPER_AT,
                winding_inductance=section.winding_inductance,
                thermal_resistance=section.thermal_resistance,
                gear_ratio=section.gear_ratio,
                gear_efficiency=section.gear_efficiency,
            )
            if guessed:
                self.notes.append(MOTOR_GUESSED.format(guessed=" and ".join(guessed), band=100.0 * GUESS_BAND))
            if stator is not None:
                doubted = doubts(motor, stator, resistance_guessed=section.winding_resistance is None)
                self.notes += [MOTOR_DOUBTED.format(label=section.label, doubt=doubt) for doubt in doubted]
            return motor
        return None

    def controller(self, section: models.ControllerSection | None) -> Controller | None:
        if section is None:
            return None
        frequency, time = section.switching_frequency, section.switching_time
        motor = self.document.get("motor")
        inductance = isinstance(motor, dict) and "winding_inductance" in motor
        if time is None and frequency is not None and not inductance:
            self.complain(
                ("controller", "switching_frequency"),
                "needs switching_time beside it for the switching loss, or winding_inductance in [motor] for ripple",
            )
            return None
        if time is not None and frequency is None:
            self.complain(
                ("controller", "switching_time"),
                "needs switching_frequency beside it: the switching loss comes from both",
            )
            return None
        with self.about(("controller",)):
            return Controller(
                on_resistance=section.on_resistance,
                current_limit=section.current_limit,
                idle_current=section.idle_current,
                unpowered=section.unpowered,
                switching_frequency=frequency,
                switching_time=time,
                diode_voltage=section.diode_voltage,
                throttle_map=tuple((stick, duty) for stick, duty in section.throttle_map),
            )
        return None

    def battery(self, section: models.BatterySection | None) -> Battery | None:
        if section is None:
            return None
        with self.about(("battery",)):
            return Battery(
                cells_in_series=section.cells_in_series,
                cells_in_parallel=section.cells_in_parallel,
                chemistry=section.chemistry,
                capacity=section.capacity,
                cell_resistance=section.cell_resistance,
                discharge_multiple=section.discharge_multiple,
                charge_left=section.charge_left,
                usable_share=section.usable_share,
                temperature=section.temperature or CELL_AT,
            )
        return None

    def airframe(self, section: models.AirframeSection | None) -> Airframe | Multirotor | None:
        if section is None:
            return None
        if section.hover:
            return self.multirotor(section)
        if section.drag is None:
            return None
        drag: dict[str, Any] = {}
        if isinstance(section.drag, models.ParabolicDrag):
            drag = {"cd0": section.drag.cd0, "k": section.drag.k}
        elif self.finds(("airframe", "drag"), section.drag):
            table = read_drag(self.folder / section.drag, self.label(section.drag), self.complaints)
            drag = {} if table is None else {"drag_table": table}
        if not drag:
            return None
        with self.about(("airframe",)):
            return Airframe(
                mass=section.mass,
                wing_area=section.wing_area,
                cl_max=section.cl_max,
                cruise_speed=section.cruise_speed,
                **drag,
            )
        return None

    def multirotor(self, section: models.AirframeSection) -> Multirotor | None:
        before = len(self.complaints)
        for key in ("wing_area", "cl_max", "cruise_speed"):
            if getattr(section, key) is not None:
                self.complain(("airframe", key), "conflicts with hover = true: a hovering airframe has no wing")
        table = None
        if isinstance(section.drag, models.ParabolicDrag):
            self.complain(
                ("airframe", "drag"),
                "cd0 and k belong to a wing; with hover = true give a CSV file of airspeed_m_s and drag_N of the "
                "vertical climb, or leave drag out",
            )
        elif section.drag is not None and self.finds(("airframe", "drag"), section.drag):
            table = read_drag(self.folder / section.drag, self.label(section.drag), self.complaints)
        if len(self.complaints) > before:
            return None
        with self.about(("airframe",)):
            return Multirotor(mass=section.mass, drag_table=table)
        return None

    def installation(self, section: models.InstallationSection | None) -> Installation | None:
        if section is None:
            return None
        with self.about(("installation",)):
            return Installation(inflow_factor=section.inflow_factor, thrust_factor=section.thrust_factor)
        return None

    # --- grid --------------------------------------------------------------------------------------------------------

    def axes(self, section: models.GridSection) -> dict[str, FloatArray | None] | None:
        """Return the axes asked for, each ascending."""
        before = len(self.complaints)
        found: dict[str, FloatArray | None] = {}
        for name in ("advance_ratio", "rpm", "incidence", "airspeed", "throttle"):
            series = getattr(section, name)
            found[name] = None
            if series is None:
                continue
            spaced = not isinstance(series, list)
            values = np.linspace(series.start, series.end, series.count) if spaced else np.array(series)
            values = np.where(np.abs(values) < 1e-12 * np.abs(values).max(), 0.0, values)
            if np.any(np.diff(values) <= 0.0):
                message = "from must be less than to" if spaced else "values must ascend, each once"
                self.complain(("grid", name), message)
            found[name] = np.asarray(values, dtype=np.float64)
        return found if len(self.complaints) == before else None

    def grid(self, propeller: Propeller, air: Air, axes: Mapping[str, FloatArray | None]) -> Grid | None:
        advance_ratio, rpm = axes["advance_ratio"], axes["rpm"]
        if advance_ratio is None:
            end = default_advance_ratio_end(propeller)
            advance_ratio = np.linspace(0.0, end, DEFAULT_ADVANCE_RATIOS)
            self.notices.append(f"no advance_ratio in [grid]: 0 to {end:g} is taken from the pitch of the blade")
        if rpm is None:
            rpm = default_rpm(propeller, air, float(np.abs(advance_ratio).max()))
            reason = "the rpm limit" if rpm[-1] == propeller.rpm_limit else f"a tip Mach number of {DEFAULT_TIP_MACH:g}"
            self.notices.append(f"no rpm in [grid]: {rpm[0]:g} to {rpm[-1]:g} rpm is taken from {reason}")
            if propeller.rpm_limit is None:
                self.notes.append(
                    f"rpm up to {rpm[-1]:g} is a default (helical tip Mach number {DEFAULT_TIP_MACH:g}), "
                    "no rpm_limit given"
                )
        with self.about(("grid",)):
            incidence = axes["incidence"]
            return Grid(advance_ratio=advance_ratio, rpm=rpm, incidence=np.zeros(1) if incidence is None else incidence)
        return None

    # --- remarks -----------------------------------------------------------------------------------------------------

    def remark_on_scaling(self, section: models.PropellerSection, absolute: bool) -> None:
        measured = section.measured_diameter
        if measured is None or measured == section.diameter:
            return
        if absolute:
            self.notices.append(
                f"the blade was measured at {measured:.4g} m diameter and is scaled to {section.diameter:.4g} m"
            )
        else:
            self.notices.append("measured_diameter has no effect: the stations are shares of the radius already")

    def remark_on_blade(self, propeller: Propeller) -> None:
        last = float(propeller.stations.r_over_R[-1])
        if last < 0.995:
            self.notes.append(
                f"the last station is at r/R = {last:.3g}; its chord and twist are held from there to the tip. "
                "Measure a station at the tip."
            )
        uses_thickness = any(span.family is not None for span in propeller.sections) and not propeller.section_guessed
        if uses_thickness and propeller.stations.t_over_c is None:
            self.notes.append("no thickness is given; the default thickness of the section family serves")

    def remark_on_rpm(self, propeller: Propeller, grid: Grid) -> None:
        limit = propeller.rpm_limit
        if limit is not None and grid.rpm[-1] > limit:
            self.notes.append(
                f"the grid runs to {grid.rpm[-1]:g} rpm, beyond the propeller's limit of {limit:g} rpm: "
                "those rows are for reading, not for running"
            )
