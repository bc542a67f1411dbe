"""`python -m bemt` is `bemt`."""

from __future__ import annotations

from bemt.cli.main import main

main(prog_name="bemt")
