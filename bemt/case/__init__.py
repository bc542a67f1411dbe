"""The case file: its schema, the files it names, and the plain objects it turns into."""

from __future__ import annotations

from bemt.case.load import Case, load_case

__all__ = ["Case", "load_case"]
