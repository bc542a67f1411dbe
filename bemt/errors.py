"""The exceptions of the package: a small tree with one exit code each.

Everything below the case file raises `InputError` with the name of the offending field; the case layer turns that
into a `CaseError`, which knows the file and the line as well.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


class BemtError(Exception):
    """Anything that went wrong for a reason the user can act on."""

    exit_code = 1


class RunError(BemtError):
    """A run could not be finished: output not writable, a fit that did not converge."""


class MissingExtraError(BemtError, ImportError):
    """An optional part of the installation is needed and absent."""


class InputError(BemtError, ValueError):
    """A value that cannot be used.

    Parameters
    ----------
    field : str
        Name of the parameter or column at fault.
    message : str
        What is wrong and what would fit.
    """

    exit_code = 3

    def __init__(self, field: str, message: str) -> None:
        super().__init__(f"{field}: {message}" if field else message)
        self.field = field
        self.message = message


@dataclass(frozen=True)
class Complaint:
    """One thing that is wrong in a file: where it stands and what would fit.

    Parameters
    ----------
    file : str
        As the user named it.
    line : int or None
        Counted from 1, where known.
    field : str
        Dotted key or column.
    message : str
        What is wrong and what would fit.
    """

    file: str
    line: int | None
    field: str
    message: str

    def __str__(self) -> str:
        """Return `file:line: field: message`, leaving out what is not known."""
        place = self.file if self.line is None else f"{self.file}:{self.line}"
        return f"{place}: {self.field}: {self.message}" if self.field else f"{place}: {self.message}"


class CaseError(BemtError, ValueError):
    """A case or a data file is wrong; carries every complaint found, not only the first.

    Parameters
    ----------
    complaints : iterable of Complaint
        In the order in which they are to be read.
    """

    exit_code = 3

    def __init__(self, complaints: Iterable[Complaint]) -> None:
        self.complaints = tuple(complaints)
        super().__init__("\n".join(str(complaint) for complaint in self.complaints))
