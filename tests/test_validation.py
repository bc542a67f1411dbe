"""The validation page: made by one command, and in step with the code."""

from __future__ import annotations

import re
import shutil
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from test_docs import ROOT, script

validation = script("make_validation")

PAGE = ROOT / "docs" / "validation.md"
NAME = "da4002_9x6.75"


def row(text: str, head: str, name: str) -> list[str]:
    """Cells of a propeller's row in the table under a heading."""
    part = text.split(f"## {head}\n")[1].split("\n## ")[0]
    (line,) = re.findall(rf"^\| `{re.escape(name)}` \| (.*) \|$", part, re.MULTILINE)
    return [cell.strip().rstrip("°").replace("−", "-") for cell in line.split("|")]


def test_one_command_makes_the_page_and_its_figures(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(
        validation,
        "VARIANTS",
        (
            ("what is shipped", {"end_loss": validation.SHIPPED.end_loss}),
            ("end loss `none`", {"end_loss": "none"}),
            ("of the future", {"end_loss": "future"}),
        ),
    )
    made = validation.make(validation.MEASURED, tmp_path, [NAME])
    text = made.read_text(encoding="utf-8")
    assert "**thinned tables**" in text
    for picture in re.findall(r"!\[[^\]]*\]\(([^)]+)\)", text):
        assert 5_000 < (tmp_path / picture).stat().st_size < 200_000
    assert "what is shipped" not in text
    assert "| end loss `none` |" in text
    assert "| of the future | not available in this version |" in text
    # The committed page has the numbers that the code gives now, within the last digit that is printed.
    committed = PAGE.read_text(encoding="utf-8")
    for head in ("As described", "With the one blade angle that serves best"):
        now, then = row(text, head, NAME), row(committed, head, NAME)
        assert len(now) == len(then) > 7
        for cell, other in zip(now, then, strict=True):
            digits = len(other.partition(".")[2])
            assert float(cell) == pytest.approx(float(other), abs=1.01 * 10.0**-digits)


def test_a_folder_of_tables_of_ones_own_is_taken(tmp_path: Path) -> None:
    shutil.copy(validation.MEASURED / f"{NAME}_advance.csv", tmp_path)
    assert validation.names_in(tmp_path) == [NAME]
    _, readings = validation.load(tmp_path, NAME)
    assert (readings.airspeed > 0.0).all()
    with pytest.raises(SystemExit):
        validation.make(tmp_path, tmp_path, ["no_such_propeller"])


def test_the_page_says_whether_tables_were_thinned(tmp_path: Path) -> None:
    still, moving = np.zeros(400, dtype=bool), np.ones(400, dtype=bool)
    rows = {count: {NAME: SimpleNamespace(moving=moving[:count], still=still[:count])} for count in (5, 400)}

    def said(folder: Path, count: int) -> str:
        return " ".join(validation._introduction(folder, rows[count]))

    assert "**thinned tables**" in said(validation.MEASURED, 5)
    assert "**full tables**" in said(tmp_path, 400)
    assert "no fuller than the thinned ones" in said(tmp_path, 5)


def test_every_propeller_of_the_folder_has_its_place_on_the_page() -> None:
    text = PAGE.read_text(encoding="utf-8")
    names = validation.names_in(validation.MEASURED)
    assert len(names) == 6
    for name in names:
        assert row(text, "As described", name)
        assert f"({(validation.IMAGES / name).as_posix()}.png)" in text
    for name in (validation.HOVER, validation.CLOSED):
        assert f"{name}.png" in text
