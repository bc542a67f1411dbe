"""One entry of a table of rival laws: what a case calls by name."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Generic, TypeVar

Function = TypeVar("Function")


@dataclass(frozen=True)
class Law(Generic[Function]):
    """A law that others of the same signature can stand in for.

    Parameters
    ----------
    function : callable
        The law.
    source : str
        Where it was published; empty where there is nothing to name.
    range : str
        What it was made for, in words.
    """

    function: Function
    source: str
    range: str
