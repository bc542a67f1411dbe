"""Where each key of a TOML text stands.

The standard parser gives values but no places. This scanner walks a text the parser has already accepted and notes
the line of every table, key and array element, under the same path the value has in the parsed document.
"""

from __future__ import annotations

import re
import tomllib
from bisect import bisect_right
from collections.abc import Mapping

Path = tuple[str | int, ...]

_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_SPACE = re.compile(r"[ \t]*")
_KEY = re.compile(
    r"""(?:"(?:\\.|[^"\\])*"|'[^']*'|[A-Za-z0-9_-]+)(?:[ \t]*\.[ \t]*(?:"(?:\\.|[^"\\])*"|'[^']*'|[A-Za-z0-9_-]+))*"""
)
_STRINGS = (
    re.compile(r'"""(?:\\.|[^\\])*?"{3,5}', re.DOTALL),
    re.compile(r"'''.*?'{3,5}", re.DOTALL),
    re.compile(r'"(?:\\.|[^"\\])*"'),
    re.compile(r"'[^']*'"),
)
_SCALAR = re.compile(r"[^,\]}#\r\n]+")


class KeyLines:
    """Lines of the keys of one TOML text.

    Parameters
    ----------
    text : str
        A text that `tomllib` accepts.
    """

    def __init__(self, text: str) -> None:
        self._text = text
        self._newlines = [match.start() for match in re.finditer("\n", text)]
        self._lines: dict[Path, int] = {}
        self._last_element: dict[Path, int] = {}
        self._scan()

    @property
    def lines(self) -> Mapping[Path, int]:
        """Line of every path seen, counted from 1."""
        return self._lines

    def of(self, path: Path) -> int | None:
        """Return the line of a path, or of the nearest table around it.

        Parameters
        ----------
        path : tuple of str or int
            Keys and array indices from the root.

        Returns
        -------
        int or None
            None where nothing on the way to it is written in the text.
        """
        while path:
            if path in self._lines:
                return self._lines[path]
            path = path[:-1]
        return None

    def _scan(self) -> None:
        table: Path = ()
        position = self._skip(_BLANK, 0)
        while position < len(self._text):
            if self._text.startswith("[", position):
                table, position = self._header(position)
            else:
                position = self._pair(position, table)
            position = self._skip(_BLANK, position)

    def _header(self, position: int) -> tuple[Path, int]:
        array = self._text.startswith("[[", position)
        start = self._skip(_SPACE, position + (2 if array else 1))
        keys, end = self._keys(start)
        path: Path = ()
        for key in keys[:-1]:
            path = (*path, key)
            self._note(path, position)
            path = self._into(path)
        path += (keys[-1],)
        if array:
            index = self._last_element.get(path, -1) + 1
            self._last_element[path] = index
            self._note(path, position)
            path += (index,)
        else:
            path = self._into(path)
        self._note(path, position)
        end = self._skip(_SPACE, end)
        return path, end + (2 if array else 1)

    def _into(self, path: Path) -> Path:
        """Follow an array of tables to its latest element, as a header does."""
        return (*path, self._last_element[path]) if path in self._last_element else path

    def _pair(self, position: int, table: Path) -> int:
        keys, end = self._keys(position)
        path = table
        for key in keys:
            path += (key,)
            self._note(path, position)
        end = self._skip(_SPACE, self._skip(_SPACE, end) + 1)
        return self._value(end, path)

    def _value(self, position: int, path: Path) -> int:
        for string in _STRINGS:
            match = string.match(self._text, position)
            if match:
                return match.end()
        if self._text.startswith("[", position):
            return self._array(position, path)
        if self._text.startswith("{", position):
            return self._inline_table(position, path)
        scalar = _SCALAR.match(self._text, position)
        return scalar.end() if scalar else position + 1

    def _array(self, position: int, path: Path) -> int:
        position = self._skip(_BLANK, position + 1)
        index = 0
        while not self._text.startswith("]", position):
            self._note((*path, index), position)
            position = self._skip(_BLANK, self._value(position, (*path, index)))
            if self._text.startswith(",", position):
                position = self._skip(_BLANK, position + 1)
            index += 1
        return position + 1

    def _inline_table(self, position: int, path: Path) -> int:
        position = self._skip(_BLANK, position + 1)
        while not self._text.startswith("}", position):
            position = self._skip(_BLANK, self._pair(position, path))
            if self._text.startswith(",", position):
                position = self._skip(_BLANK, position + 1)
        return position + 1

    def _keys(self, position: int) -> tuple[list[str], int]:
        match = _KEY.match(self._text, position)
        if match is None:
            raise ValueError(f"no key at line {self._line(position)}")
        keys = []
        inner = tomllib.loads(f"{match[0]} = 0")
        while isinstance(inner, dict):
            ((key, inner),) = inner.items()
            keys.append(key)
        return keys, match.end()

    def _note(self, path: Path, position: int) -> None:
        self._lines.setdefault(path, self._line(position))

    def _line(self, position: int) -> int:
        return bisect_right(self._newlines, position - 1) + 1

    def _skip(self, pattern: re.Pattern[str], position: int) -> int:
        match = pattern.match(self._text, position)
        return match.end() if match else position


def syntax_error_place(error: tomllib.TOMLDecodeError, text: str) -> tuple[int, str]:
    """Take line and message out of the parser's exception.

    Parameters
    ----------
    error : tomllib.TOMLDecodeError
        As raised.
    text : str
        What was parsed.

    Returns
    -------
    line : int
        Counted from 1; the last line where the text ended too early.
    message : str
        Without the place.
    """
    words = str(error)
    match = re.search(r"\s*\(at line (\d+), column (\d+)\)", words)
    if match:
        return int(match[1]), words[: match.start()] + f" (column {match[2]})"
    message = re.sub(r"\s*\(at end of document\)", "", words)
    return max(1, text.rstrip("\n").count("\n") + 1), message + " (the text ends too early)"
