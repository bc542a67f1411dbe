"""Remake the figures of the README from the shipped case.

    python docs/make_images.py

Needs Pillow, which comes with matplotlib. The figures are those of the commands, with fewer colours to keep them small.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
from pathlib import Path

from PIL import Image

DOCS = Path(__file__).parent
CASE = DOCS.parent / "cases" / "sandpiper.toml"
COLOURS = 128
WIDTH = 1200


def main() -> None:
    """Draw each figure by its command and store it small."""
    for command in ("table", "envelope"):
        with tempfile.TemporaryDirectory() as folder:
            drawn = Path(folder) / "figure.png"
            subprocess.run(
                [sys.executable, "-m", "bemt", command, str(CASE), "--figure", str(drawn)],
                check=True,
                stdout=subprocess.DEVNULL,
                cwd=DOCS.parent,
            )
            with Image.open(drawn) as picture:
                narrow = picture.convert("RGB")
                if narrow.width > WIDTH:
                    narrow = narrow.resize(
                        (WIDTH, round(narrow.height * WIDTH / narrow.width)), Image.Resampling.LANCZOS
                    )
                small = narrow.quantize(COLOURS, kmeans=10, dither=Image.Dither.NONE)
        target = DOCS / "images" / f"sandpiper_{command}.png"
        small.save(target, optimize=True)
        print(f"{target}: {target.stat().st_size} bytes")


if __name__ == "__main__":
    main()
