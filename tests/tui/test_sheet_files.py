"""Parts list and margins as CSV files: what stands in them, and the key that writes them (CSV: RFC 4180)."""

from __future__ import annotations

import csv
from io import StringIO
from pathlib import Path

import pytest

from stagebook.engine.design.document import Design
from stagebook.storage import Store
from stagebook.tui.demo.flood import FLOOD
from stagebook.tui.out_file import FileRefused
from stagebook.tui.screens.dialog import Form
from stagebook.tui.sheet_files import margins_csv, parts_csv, write_sheets
from stagebook.tui.solver import Solver
from stagebook.tui.stagebook_app import StagebookApp

from .conftest import seen, settled, until

DESIGN, SHEET = list(FLOOD.designs())[-1], FLOOD.sheets()[-1]


def read(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(StringIO(text)))


def test_every_margin_stands_in_the_sheet_with_its_figures() -> None:
    rows = read(margins_csv(SHEET))
    slack = [float(row["worst margin"]) - float(row["required"]) for row in rows]
    assert slack == sorted(slack)
    found = {(row["check"], row["part"]): row for row in rows}
    assert len(found) == len(SHEET.checks)
    duration = next(check for check in SHEET.checks if check.id == "duration:driver:LS1")
    row = found["duration window", "LS1"]
    assert (row["least"], row["most"]) == (repr(duration.low), repr(duration.high))
    assert (row["from"], row["to"], row["unit"], row["demand"]) == ("60.0", "120.0", "s", "")
    assert found["supply slew without a false trip", "Q5"]["what happens"] == "immune at any slew"


def test_every_part_stands_in_the_list_with_its_role() -> None:
    rows = read(parts_csv(DESIGN))
    assert [row["part"] for row in rows] == [part.ref for part in DESIGN.parts]
    (timing,) = (row for row in rows if row["part"] == "C5")
    assert (timing["stage"], timing["value"], timing["role"]) == ("timer", "100u", "timing capacitor")
    assert timing["pins"] == "plus tc, minus 0V"


def test_a_text_that_a_spreadsheet_would_run_is_none() -> None:
    # Characters of OWASP, "CSV Injection".
    document = DESIGN.dump()
    document["stages"][0]["parts"][1]["value"] = "=1+1"
    assert "'=1+1" in parts_csv(Design.load(document))


def test_a_folder_that_is_none_is_refused(tmp_path: Path) -> None:
    with pytest.raises(FileRefused, match="there is no folder"):
        write_sheets(DESIGN, SHEET, str(tmp_path / "nowhere"))


async def test_a_key_writes_both_where_the_user_says(
    shelf: Store, solver: Solver, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    app = StagebookApp(shelf, solver)
    async with app.run_test(size=(80, 24)) as pilot:
        await settled(pilot)
        await pilot.press("enter")
        await settled(pilot)
        await pilot.press("W")
        await until(pilot, lambda: isinstance(app.screen, Form))
        await pilot.press("enter")
        await until(pilot, lambda: "written: " in seen(pilot))
    (name,) = (row.name for row in shelf.designs())
    assert sorted(path.name for path in tmp_path.glob("*.csv")) == [f"{name} margins.csv", f"{name} parts.csv"]
