"""Measure the solver against the yardsticks, and the start of the program.

    python benchmarks/run.py              the standard work: plain C, brentq in Python, ours
    python benchmarks/run.py --start CASE      help, first and later `bemt table CASE`, imports

Prints one line a measurement. Times are the best of several runs on one core.
"""

from __future__ import annotations

import argparse
import json
import os
import shutil
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))

import numpy as np
from standard_work import ours, standard_work, usual

HERE = Path(__file__).parent


def best_of(runs: int, action: Callable[[], float]) -> float:
    """Return the smallest result of several runs."""
    return min(action() for _ in range(runs))


def c_yardstick(tables: int) -> tuple[float, float] | None:
    """Compile the C yardstick on the spot; return nanoseconds an element and the checksum of one table.

    None where there is no compiler.
    """
    compiler = shutil.which("cc") or shutil.which("gcc") or shutil.which("clang")
    if compiler is None:
        return None
    with tempfile.TemporaryDirectory() as folder:
        program = Path(folder) / "yardstick"
        subprocess.run(
            [compiler, "-O3", "-march=native", "-ffast-math", "-o", program, HERE / "yardstick.c", "-lm"], check=True
        )

        def run(count: int) -> dict[str, float]:
            printed = subprocess.run([program, str(count)], check=True, capture_output=True, text=True).stdout
            return dict(json.loads(printed))

        took = best_of(5, lambda: run(tables)["nanoseconds_per_element"])
        return took, run(1)["checksum"]


def solver(tables: int) -> None:
    """Print how long one element takes each way."""
    work = standard_work()
    elements = work.radius.size * work.advance_ratio.size
    rows: list[tuple[str, float, float]] = []

    in_c = c_yardstick(tables)
    if in_c is None:
        print("no C compiler found: the yardstick in C is left out")
    else:
        rows.append(("plain C, one bracketed root an element", *in_c))

    def once_usual() -> float:
        start = time.perf_counter()
        _, solved = usual(work, every=6)
        return (time.perf_counter() - start) / solved * 1e9

    rows.append(("scipy.optimize.brentq, one call an element", best_of(3, once_usual), usual(work)[0]))

    ready = ours(work)
    ready.solve(work.pitch)  # compiles

    def once_ours() -> float:
        start = time.perf_counter()
        for table in range(tables):
            ready.solve(work.pitch * (1.0 + 1e-6 * table))
        return (time.perf_counter() - start) / (tables * elements) * 1e9

    batch = 20

    def once_batch() -> float:
        start = time.perf_counter()
        for table in range(0, tables, batch):
            ready.solve_batch(work.pitch * (1.0 + 1e-6 * np.arange(table, table + batch)))
        return (time.perf_counter() - start) / (tables // batch * batch * elements) * 1e9

    rows.append(("bemt.rotor, one table a call", best_of(5, once_ours), ready.checksum()))
    took = best_of(5, once_batch)
    rows.append((f"bemt.rotor, {batch} tables a call", took, ready.checksum()))
    for what, nanoseconds, total in rows:
        print(
            f"{what:44s} {nanoseconds:9.1f} ns an element  {1e9 / (nanoseconds * elements):8.1f} tables/s"
            f"  checksum {total:.6f}  {nanoseconds / took:7.2f} times the last"
        )


def start(case: str) -> None:
    """Print how long a user waits for the program."""
    program = [sys.executable, "-c", "from bemt.cli.main import main; main()"]

    def seconds(command: list[str], environment: dict[str, str]) -> float:
        begun = time.perf_counter()
        subprocess.run(command, check=True, capture_output=True, env=environment)
        return time.perf_counter() - begun

    with tempfile.TemporaryDirectory() as cache:
        environment = {**os.environ, "NUMBA_CACHE_DIR": cache}
        waits = {
            "python -c pass": best_of(5, lambda: seconds([sys.executable, "-c", "pass"], environment)),
            "import bemt": best_of(5, lambda: seconds([sys.executable, "-c", "import bemt"], environment)),
            "bemt --help": best_of(5, lambda: seconds([*program, "--help"], environment)),
            "bemt table CASE, nothing compiled yet": seconds([*program, "table", case], environment),
            "bemt table CASE, compiled before": best_of(3, lambda: seconds([*program, "table", case], environment)),
        }
    for what, wait in waits.items():
        print(f"{what:44s} {wait:6.2f} s")


def main() -> None:
    """Parse the command line and measure."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--tables", type=int, default=400, help="tables of the standard work in one run")
    parser.add_argument("--start", metavar="CASE", help="measure the start of the program on this case instead")
    arguments = parser.parse_args()
    if arguments.start:
        start(arguments.start)
    else:
        solver(arguments.tables)


if __name__ == "__main__":
    main()
