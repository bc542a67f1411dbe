"""A new case out of an old one: some values replaced, everything else, comments included, as it was."""

from __future__ import annotations

import math
import os
import tomllib
from collections.abc import Iterator, MutableMapping, Sequence
from typing import TYPE_CHECKING, Any

from bemt.errors import RunError

if TYPE_CHECKING:
    from bemt.drive.motor import Motor

_FILE_KEYS = (
    ("propeller", "stations"),
    ("propeller", "outline"),
    ("section", "polars"),
    ("section", "shape"),
    ("airframe", "drag"),
)
"""Keys whose value may be the name of a file."""


def with_motor(text: str, motor: Motor, *, remarks: Sequence[str], folder: str, new_folder: str) -> str:
    """Return the text of a case with the constants of its motor replaced.

    Parameters
    ----------
    text : str
        The old case, valid and with a `[motor]`.
    motor : Motor
        Its speed constant, resistance and no-load readings are written, nothing else.
    remarks : sequence of str
        Lines for a comment at the head.
    folder, new_folder : str
        Where the old case stands and where the new one will; names of files are rewritten where the two differ.

    Returns
    -------
    str

    Raises
    ------
    RunError
        If the text cannot be changed without changing more than was meant.
    """
    import tomlkit
    from tomlkit.items import AoT

    line_end = "\r\n" if "\r\n" in text else "\n"
    document = tomlkit.parse(text)
    meant: dict[str, Any] = tomllib.loads(text)
    readings = [{"voltage": f"{volt:.7g} V", "current": f"{amp:.7g} A"} for volt, amp in sorted(motor.no_load)]
    values: dict[str, Any] = {
        "speed_constant": f"{motor.speed_constant * 30.0 / math.pi:.7g} rpm/V",
        "winding_resistance": f"{motor.winding_resistance * 1e3:.7g} mohm",
        "no_load": readings,
    }
    written: Any = document["motor"]
    for key, value in values.items():
        replacement: Any = value
        if key == "no_load":
            if isinstance(written.get(key), AoT):
                replacement = tomlkit.aot()
                for reading in readings:
                    replacement.append(tomlkit.item(reading))
            else:
                replacement = tomlkit.array()
                for reading in readings:
                    inline = tomlkit.inline_table()
                    inline.update(reading)
                    replacement.append(inline)
        written[key] = replacement
        meant["motor"][key] = value
    if meant["motor"].pop("label_only", None) is not None:  # the constants are known now
        del written["label_only"]
    for tables in (document, meant):
        for table, key in _files(tables):
            table[key] = _moved(table[key], folder, new_folder)
    head = "".join(f"# {line}".rstrip() + line_end for line in remarks)
    found = head + line_end + tomlkit.dumps(document)
    try:
        same = tomllib.loads(found) == meant
    except tomllib.TOMLDecodeError:
        same = False
    if not same:
        raise RunError("the case is written in a way that cannot be changed safely; put the constants in by hand")
    return found


def _files(document: MutableMapping[str, Any]) -> Iterator[tuple[Any, str]]:
    """Yield every table with the key of a file in it."""
    for section, key in _FILE_KEYS:
        tables = document.get(section, [])
        for table in tables if isinstance(tables, list) else [tables]:
            if isinstance(table.get(key), str):
                yield table, key


def _moved(name: str, folder: str, new_folder: str) -> str:
    """Return the name of a file as seen from another folder; names that are no files there stay."""
    there = os.path.join(folder, name)
    if os.path.isabs(name) or os.path.realpath(folder) == os.path.realpath(new_folder) or not os.path.exists(there):
        return str(name)
    try:
        return os.path.relpath(os.path.realpath(there), os.path.realpath(new_folder)).replace(os.sep, "/")
    except ValueError:  # another drive
        return os.path.abspath(there).replace(os.sep, "/")
