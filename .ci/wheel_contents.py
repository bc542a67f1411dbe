"""Check that a wheel holds every file of its packages, data included, and nothing else.

Usage: python .ci/wheel_contents.py WHEEL CHECKOUT
"""

from __future__ import annotations

import sys
import zipfile
from pathlib import Path

PACKAGES = ("bemt", "airfoils_demo")


def main(wheel: str, checkout: str) -> int:
    """Print what is missing and what is too much; return 1 if there is any."""
    root = Path(checkout)
    wanted = {
        path.relative_to(root).as_posix()
        for package in PACKAGES
        for path in (root / package).rglob("*")
        if path.is_file() and "__pycache__" not in path.parts
    }
    with zipfile.ZipFile(wheel) as archive:
        held = {name for name in archive.namelist() if ".dist-info/" not in name and not name.endswith("/")}
    for name in sorted(wanted - held):
        print(f"missing in the wheel: {name}")
    for name in sorted(held - wanted):
        print(f"should not be in the wheel: {name}")
    data = sum(not name.endswith(".py") for name in held)
    print(f"{Path(wheel).name}: {len(held)} files, {data} of them data")
    return int(wanted != held or data == 0)


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:3]))
