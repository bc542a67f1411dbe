"""The version of the package, in one place for the code, the wheel and every file written."""

from __future__ import annotations

__version__ = "0.1.0"
