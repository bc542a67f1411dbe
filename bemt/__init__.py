"""Blade-element momentum engine for propellers nobody has measured.

The public face: load a case, and the few functions that take one. Importing it loads nothing heavy; each function
brings what it needs when it is first asked for.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from bemt.version import __version__

if TYPE_CHECKING:
    from bemt.api import calibrate_motor, coefficient_table, compare, envelope, load

__all__ = ["__version__", "calibrate_motor", "coefficient_table", "compare", "envelope", "load"]


def __getattr__(name: str) -> Any:
    """Import a public function when it is first asked for (PEP 562)."""
    if name in __all__:
        from bemt import api

        found = getattr(api, name)
        globals()[name] = found
        return found
    raise AttributeError(f"module 'bemt' has no attribute {name!r}")


def __dir__() -> list[str]:
    """List the public names before they are loaded."""
    return sorted({*globals(), *__all__})
