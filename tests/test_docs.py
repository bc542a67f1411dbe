"""The documentation against the program: links, commands, code, quoted numbers, and pages made from registries."""

from __future__ import annotations

import importlib.util
import re
import shlex
import shutil
import subprocess
import tomllib
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest
import test_nr640
import xarray as xr
from click.testing import CliRunner
from pydantic import BaseModel

from bemt.case import models
from bemt.case.schema import check_keys
from bemt.cli.main import main
from bemt.quantities.registry import ENVELOPE, ENVELOPE_HOVER, ENVELOPE_WITHOUT_MOTOR, LOOKUP, RADIAL, TABLE

ROOT = Path(__file__).parent.parent
PAGES = sorted([*ROOT.glob("*.md"), *ROOT.glob("docs/*.md"), *ROOT.glob("benchmarks/*.md")])
README = ROOT / "README.md"
SHELL = ("sh", "bash", "console")

FENCE = re.compile(r"^```(\w*)\n(.*?)^```$", re.MULTILINE | re.DOTALL)


def blocks(page: Path, *languages: str) -> list[str]:
    """Fenced blocks of a page in one of the languages."""
    return [body for language, body in FENCE.findall(page.read_text(encoding="utf-8")) if language in languages]


def named(page: Path) -> str:
    return page.relative_to(ROOT).as_posix()


def anchors(page: Path) -> set[str]:
    """Anchors of a page's headings, as code hosting sites make them (common practice, no source)."""
    text = FENCE.sub("", page.read_text(encoding="utf-8"))
    heads = re.findall(r"^#+ (.*)$", text, re.MULTILINE)
    return {re.sub(r"[^\w\- ]", "", head.lower()).strip().replace(" ", "-") for head in heads}


@pytest.mark.parametrize("page", PAGES, ids=named)
def test_links_lead_somewhere(page: Path) -> None:
    text = FENCE.sub("", page.read_text(encoding="utf-8"))
    targets = re.findall(r"\]\(([^)\s]+)\)", text)
    broken = []
    for target in targets:
        if "://" in target:
            continue
        name, _, anchor = target.partition("#")
        there = page.parent / name if name else page
        if not there.exists() or (anchor and anchor not in anchors(there)):
            broken.append(target)
    assert broken == []


@pytest.mark.parametrize("page", PAGES, ids=named)
def test_fences_are_closed_and_pictures_are_small(page: Path) -> None:
    text = page.read_text(encoding="utf-8")
    assert len(re.findall(r"^```", text, re.MULTILINE)) == 2 * len(FENCE.findall(text))
    for picture in re.findall(r"!\[[^\]]*\]\(([^)]+)\)", text):
        assert (page.parent / picture).stat().st_size < 200_000


def test_the_readme_opens_with_two_lines_to_paste() -> None:
    first, second = blocks(README, *SHELL)[:2]
    for block in (first, second):
        assert block.count("\n") == 1
        assert block.startswith("python3 -m venv .venv && ")
    for needed in ("pip install", "bemt table cases/", "bemt envelope cases/"):
        assert needed in first
    assert "pip install" in second
    assert second.rstrip().endswith("pytest -q")


def test_the_second_block_is_the_one_that_the_checks_run() -> None:
    script = ROOT / ".ci" / "run"
    awk = shutil.which("awk")
    if not script.exists() or awk is None:
        pytest.skip("needs .ci/run and awk")
    found = re.search(r"command=\$\(awk '([^']+)' README\.md\)", script.read_text(encoding="utf-8"))
    assert found is not None
    done = subprocess.run([awk, found[1], str(README)], capture_output=True, text=True, check=True)
    assert done.stdout == blocks(README, *SHELL)[1]


def commands(page: Path) -> list[str]:
    """Lines of a page's shell blocks that call the program; the two set-up lines do not begin with it."""
    return [line for block in blocks(page, *SHELL) for line in block.splitlines() if line.startswith("bemt ")]


def workplace(folder: Path) -> None:
    for data in ("cases", "tests/measured"):
        shutil.copytree(ROOT / data, folder / data)


@pytest.fixture(scope="module")
def outputs(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    """Standard output of every command of the pages, run in their order in a fresh folder a page."""
    printed: dict[str, str] = {}
    with pytest.MonkeyPatch.context() as patch:
        for page in PAGES:
            folder = tmp_path_factory.mktemp("commands")
            workplace(folder)
            patch.chdir(folder)
            for line in commands(page):
                words = shlex.split(line, comments=True)
                done = CliRunner().invoke(main, words[1:])
                assert done.exit_code == 0, f"{named(page)}: {line}\n{done.output}"
                for word in words:
                    assert not word.endswith((".png", ".svg", ".nc", ".csv")) or Path(word).stat().st_size > 0
                printed[line] = done.stdout
    return printed


def test_the_commands_of_the_pages_run(outputs: dict[str, str]) -> None:
    assert {line.split()[1] for line in outputs} == {"start", "check", "table", "envelope", "compare", "calibrate"}


def test_numbers_quoted_in_the_readme_are_those_that_are_printed(outputs: dict[str, str]) -> None:
    (quoted,) = blocks(README, "text")
    printed = outputs["bemt envelope cases/sandpiper.toml --figure sandpiper.png"].splitlines()
    lines = {line.split("  ")[0]: line for line in printed}
    rows = [line for line in quoted.splitlines() if re.match(r"\w", line)]
    assert len(rows) == 6
    for row in rows:
        name = row.split("  ")[0]
        words, actual = row.removeprefix(name).split(), lines[name].removeprefix(name).split()
        assert len(words) == len(actual)
        for word, other in zip(words, actual, strict=True):
            assert word.endswith("!") == other.endswith("!")
            if not re.match(r"-?\d", word):  # a grade, or "-" where there is nothing
                assert word == other
            else:
                # Within a change of the last digit that is shown, or half a per cent.
                digits = len(word.rstrip("!").partition(".")[2])
                value = float(word.rstrip("!"))
                assert float(other.rstrip("!")) == pytest.approx(value, rel=5e-3, abs=1.01 * 10.0**-digits)


@pytest.mark.parametrize(("symbol", "column"), [("CT", 0), ("CP", 1)])
def test_the_agreement_claimed_in_the_readme_is_the_one_measured(
    symbol: str, column: int, capsys: pytest.CaptureFixture[str]
) -> None:
    test_nr640.test_measured_coefficients_are_met(symbol, column)
    found = re.search(r": ([\d.]+)% rms .* standing still ([+-])([\d.]+)%", capsys.readouterr().out)
    assert found is not None
    text = README.read_text(encoding="utf-8")
    assert f"{found[1]} % in {symbol}" in text
    assert f"{symbol} {found[3]} % {'high' if found[2] == '+' else 'low'}" in text


@pytest.mark.parametrize("page", [page for page in PAGES if blocks(page, "python")], ids=named)
def test_python_blocks_run(page: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    workplace(tmp_path)
    monkeypatch.chdir(tmp_path)
    names: dict[str, Any] = {}
    for number, block in enumerate(blocks(page, "python"), start=1):
        exec(compile(block, f"{page.name}, block {number}", "exec"), names)
    results = [value for value in names.values() if isinstance(value, (xr.DataArray, xr.Dataset))]
    for result in results:
        for array in result.data_vars.values() if isinstance(result, xr.Dataset) else [result]:
            assert array.size, f"{array.name} is empty"
    assert len(names) > 1, "the blocks leave nothing behind"  # exec itself leaves __builtins__


def script(name: str) -> ModuleType:
    """Load a script of the docs folder."""
    spec = importlib.util.spec_from_file_location(name, ROOT / "docs" / f"{name}.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_nomenclature_is_in_step_with_the_registry() -> None:
    text = (ROOT / "docs" / "results.md").read_text(encoding="utf-8")
    assert script("make_results").page(text) == text
    prefixes = [prefix for prefix in ("level_", "point_") if f"prefix `{prefix}`" in text]
    for quantity in (*TABLE, *RADIAL, *LOOKUP, *ENVELOPE, *ENVELOPE_WITHOUT_MOTOR, *ENVELOPE_HOVER):
        bare = [quantity.name.removeprefix(prefix) for prefix in prefixes]
        assert any(f"`{name}`" in text for name in (quantity.name, *bare)), quantity.name


CASE_PAGE = ROOT / "docs" / "case-file.md"
LATE = ("sweep", "uncertainty", "correction")


def case_keys() -> Iterator[tuple[str, str]]:
    """Every section and key of the schema, by the names a user writes."""
    for section, info in models.CaseFile.model_fields.items():
        kinds = [info.annotation, *getattr(info.annotation, "__args__", ())]
        for kind in kinds:
            if isinstance(kind, type) and issubclass(kind, BaseModel) and section not in LATE:
                for name, field in kind.model_fields.items():
                    yield section, field.alias or name


def case_rows() -> list[tuple[str, str, str]]:
    """Section, key and example of every row of the page."""
    found: list[tuple[str, str, str]] = []
    section = ""
    for line in CASE_PAGE.read_text(encoding="utf-8").splitlines():
        head = re.match(r"## \[+(\w+)\]+", line)
        if head:
            section = head[1]
        row = re.match(r"\| `(\w+)` \|.*\| `([^`]+)` \|$", line)
        if row:
            found.append((section, row[1], row[2]))
    return found


def test_every_key_of_the_case_is_described_and_no_other() -> None:
    assert sorted(case_keys()) == sorted((section, key) for section, key, _ in case_rows())


@pytest.mark.parametrize(("section", "key", "example"), case_rows())
def test_examples_of_keys_are_valid(section: str, key: str, example: str) -> None:
    table = tomllib.loads(example)
    assert list(table) == [key]
    complaints: list[tuple[Any, ...]] = []
    document = {section: [table] if section == "section" else table}
    check_keys(document, lambda path, message: complaints.append((path, message)))
    assert [(path, message) for path, message in complaints if key in path] == []
