"""What importing the package costs and offers, seen from a fresh interpreter."""

from __future__ import annotations

import ast
import json
import subprocess
import sys
from pathlib import Path

import pytest

import bemt

HEAVY = {"numpy", "scipy", "numba", "llvmlite", "xarray", "pandas", "matplotlib", "netCDF4", "pint", "tomlkit"}
PACKAGE = Path(bemt.__file__).parent


def loaded_by(code: str) -> set[str]:
    """Run code in a fresh interpreter and return the top-level modules it loaded."""
    probe = f"import sys, json\n{code}\nprint(json.dumps(sorted({{name.split('.')[0] for name in sys.modules}})))"
    done = subprocess.run([sys.executable, "-c", probe], capture_output=True, text=True, check=True)
    return set(json.loads(done.stdout.splitlines()[-1]))


def test_import_loads_nothing_heavy() -> None:
    assert loaded_by("import bemt; bemt.__version__, dir(bemt)") & HEAVY == set()


@pytest.mark.parametrize("arguments", [[], ["table"], ["envelope"], ["check"], ["start"], ["compare"], ["calibrate"]])
def test_help_loads_nothing_heavy(arguments: list[str]) -> None:
    code = f"""
from bemt.cli.main import main
sys.argv = ["bemt", *{arguments!r}, "--help"]
try:
    main()
except SystemExit as end:
    assert not end.code, end.code
"""
    assert loaded_by(code) & HEAVY == set()


def test_writers_are_found_without_loading_them() -> None:
    assert loaded_by("import bemt.files, bemt.figures") & HEAVY == set()


def test_public_names_are_there_and_only_those() -> None:
    assert set(bemt.__all__) == {"__version__", "calibrate_motor", "coefficient_table", "compare", "envelope", "load"}
    assert set(bemt.__all__) <= set(dir(bemt))
    for name in set(bemt.__all__) - {"__version__"}:
        assert callable(getattr(bemt, name))
    with pytest.raises(AttributeError, match="no_such_thing"):
        _ = bemt.no_such_thing


def test_compiled_code_stands_in_one_file() -> None:
    # The compiler's cache sees changes of the cached function's own file only.
    importing = set()
    for path in PACKAGE.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            if isinstance(node, ast.ImportFrom) and node.module:
                names.append(node.module)
            if any(name.split(".")[0] == "numba" for name in names):
                importing.add(path.relative_to(PACKAGE).as_posix())
    assert importing == {"rotor/kernels.py"}


def test_the_package_says_it_is_typed_and_brings_its_section_data() -> None:
    assert (PACKAGE / "py.typed").is_file()
    import airfoils_demo

    assert list(Path(airfoils_demo.__file__).parent.glob("*.npz"))


def test_the_yardstick_in_python_and_ours_do_the_same_work() -> None:
    # Equal forces from SciPy's root finder and formulas written apart; drag is interpolated otherwise, and three of the
    # elements have several roots, hence the tolerance.
    sys.path.insert(0, str(Path(__file__).parent.parent / "benchmarks"))
    try:
        from standard_work import ours, standard_work, usual
    finally:
        sys.path.pop(0)
    work = standard_work()
    total, solved = usual(work)
    assert solved == 31 * 40
    assert ours(work).checksum() == pytest.approx(total, rel=5e-4)
