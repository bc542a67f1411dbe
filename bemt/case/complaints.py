"""Collecting everything that is wrong, so that a user mends a file once."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Iterator
from contextlib import contextmanager

from bemt.errors import CaseError, Complaint, InputError


class Complaints:
    """What is wrong in the files of a case, in the order found."""

    def __init__(self) -> None:
        self._found: list[Complaint] = []
        self._places: set[tuple[str, int | None, str, str]] = set()

    def __len__(self) -> int:
        return len(self._found)

    def add(self, file: str, line: int | None, field: str, message: str) -> None:
        """Note one complaint; of several about one place and field only the first, which caused the others, is kept.

        Parameters
        ----------
        file : str
            As the user named it.
        line : int or None
            Counted from 1; None where it is not known.
        field : str
            Key or column.
        message : str
            What is wrong and what would fit.
        """
        complaint = Complaint(file, line, field, " ".join(message.split()))
        place = (file, line, field, message if line is None else "")
        if place not in self._places:
            self._places.add(place)
            self._found.append(complaint)

    @contextmanager
    def gathered(self, file: str, line: int | None, field: str) -> Iterator[None]:
        """Turn an `InputError` or `ValueError` raised inside into a complaint about one field.

        Parameters
        ----------
        file, line, field
            As for `add`.

        Yields
        ------
        None
        """
        try:
            yield
        except InputError as error:
            self.add(file, line, field, error.message)
        except ValueError as error:
            self.add(file, line, field, str(error))

    def raise_any(self) -> None:
        """Raise if there is anything to complain about.

        Raises
        ------
        CaseError
            With every complaint, sorted by place within each file.
        """
        if self._found:
            files = list(dict.fromkeys(complaint.file for complaint in self._found))
            raise CaseError(sorted(self._found, key=lambda c: (files.index(c.file), c.line or 0)))


def nearest(word: str, known: Iterable[str]) -> str | None:
    """Return the known word that was probably meant.

    Parameters
    ----------
    word : str
        As found.
    known : iterable of str
        What would fit.

    Returns
    -------
    str or None
        None where nothing is near.
    """
    lower = {name.lower(): name for name in known}
    near = difflib.get_close_matches(word.lower(), lower, n=1, cutoff=0.6)
    return lower[near[0]] if near else None


def did_you_mean(word: str, known: Iterable[str]) -> str:
    """Return " (did you mean 'x'?)" for the nearest known word.

    Parameters
    ----------
    word, known
        As for `nearest`.

    Returns
    -------
    str
        Empty where nothing is near.
    """
    near = nearest(word, known)
    return f" (did you mean {near!r}?)" if near else ""
