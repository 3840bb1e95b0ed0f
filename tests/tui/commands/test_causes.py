"""``stagebook causes``: shares of every change. Keys: the project's own contract; shares after Shapley (1953)."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.studies.margins import study
from stagebook.storage import Note, Store

Run = Callable[..., tuple[int, str, str]]
Shelve = Callable[..., None]

OVERDRIVE = "base_overdrive:driver:Q1"


def asked(stagebook: Run, *arguments: object) -> dict[str, Any]:
    status, out, err = stagebook("causes", *arguments, "--json")
    assert (status, err) == (0, "")
    found: dict[str, Any] = json.loads(out)
    return found


def save_next(document: dict[str, Any], shelf: Path, **changed: str) -> None:
    """Save the document as the next revision, its sheet changed by these fields."""
    design = Design.load(document)
    with Store.open(shelf) as store:
        store.edit("buzzer", "document", design)
        store.save("buzzer", Note("next"), replace(study(design), **changed))  # type: ignore[arg-type]


def test_shares_of_two_changes_as_json(stagebook: Run, shelve: Shelve) -> None:
    shelve({"R1": "1k", "R2": "10k"}, {"R1": "2k2", "R2": "2k2"})
    found = asked(stagebook, "buzzer", 1, 2)
    assert (found["design"], found["from"], found["to"]) == ("buzzer", 1, 2)
    assert found["changed"] == ["R1", "R2"]
    assert (found["appeared"], found["vanished"]) == ([], [])
    checks = {check["id"]: check for check in found["checks"]}
    assert {"base_overdrive:driver:Q1", "resistor_power:driver:R1"} <= set(checks)
    for check in checks.values():
        before, after = check["before"], check["after"]
        assert -1 <= before <= 1
        assert -1 <= after <= 1
        assert set(check["shares"]) == set(check["alone"]) == set(check["reverted"]) == {"R1", "R2"}
        assert sum(check["shares"].values()) == pytest.approx(after - before, abs=1e-12)
        alone = sum(value - before for value in check["alone"].values())
        assert check["interaction"] == pytest.approx(after - before - alone, abs=1e-12)
        # With two changes, reverting the one is making the other alone.
        assert check["reverted"]["R1"] == pytest.approx(check["alone"]["R2"], abs=1e-12)
        # Two changes share what they do together evenly (Shapley's formula for two players).
        for what in ("R1", "R2"):
            fair = ((check["alone"][what] - before) + (after - check["reverted"][what])) / 2
            assert check["shares"][what] == pytest.approx(fair, abs=1e-12)
    overdrive = checks[OVERDRIVE]
    assert overdrive["shares"]["R1"] < overdrive["shares"]["R2"] < 0


def test_before_and_after_are_the_stored_margins(stagebook: Run, shelve: Shelve, tmp_path: Path) -> None:
    shelve({"R1": "1k"}, {"R1": "2k2"})
    found = {check["id"]: check for check in asked(stagebook, "buzzer", 1, 2)["checks"]}
    with Store.open(tmp_path / "shelf.sqlite3") as store:
        old, new = (store.revision("buzzer", number).sheet for number in (1, 2))
    for side, sheet in (("before", old), ("after", new)):
        kept = next(check for check in sheet.checks if check.id == OVERDRIVE)
        assert found[OVERDRIVE][side] == pytest.approx(kept.margin, abs=1e-9)


def test_the_way_back_has_the_opposite_shares(stagebook: Run, shelve: Shelve) -> None:
    shelve({"R1": "1k", "R2": "10k"}, {"R1": "2k2", "R2": "2k2"})
    there, back = (
        next(check for check in asked(stagebook, "buzzer", *order)["checks"] if check["id"] == OVERDRIVE)
        for order in ((1, 2), (2, 1))
    )
    for what in ("R1", "R2"):
        assert there["shares"][what] == pytest.approx(-back["shares"][what], abs=1e-9)


def test_a_check_that_appears_or_vanishes(
    stagebook: Run, shelve: Shelve, document: dict[str, Any], tmp_path: Path
) -> None:
    shelve({})
    document["requirements"] = []
    save_next(document, tmp_path / "shelf.sqlite3")
    assert asked(stagebook, "buzzer", 1, 2)["vanished"] == ["duration:driver:LS1"]
    assert asked(stagebook, "buzzer", 2, 1)["appeared"] == ["duration:driver:LS1"]
    assert "Only in the older one: duration:driver:LS1" in stagebook("causes", "buzzer", 1, 2)[1]
    assert "Only in the newer one: duration:driver:LS1" in stagebook("causes", "buzzer", 2, 1)[1]


def test_a_change_of_formula_has_its_own_line(
    stagebook: Run, shelve: Shelve, document: dict[str, Any], tmp_path: Path
) -> None:
    design = Design.load(document)
    sheet = study(design)
    checks = tuple(
        replace(check, margin=check.margin - 0.125) if check.id == OVERDRIVE and check.margin else check
        for check in sheet.checks
    )
    with Store.open(tmp_path / "shelf.sqlite3") as store:
        store.create("buzzer", design)
        store.save("buzzer", Note("by an older engine"), replace(sheet, engine="0.old", checks=checks))
    document["purpose"] = "the same circuit"
    save_next(document, tmp_path / "shelf.sqlite3")
    found = next(check for check in asked(stagebook, "buzzer", 1, 2)["checks"] if check["id"] == OVERDRIVE)
    assert found["after"] - found["before"] == pytest.approx(0, abs=1e-12)
    assert found["formula"] == pytest.approx(0.125, abs=1e-9)
    assert "by the formulas of this version: +12.5" in " ".join(stagebook("causes", "buzzer", 1, 2)[1].split())


def test_the_table_has_room_in_eighty_columns(stagebook: Run, shelve: Shelve) -> None:
    shelve({"R1": "1k", "R2": "10k"}, {"R1": "2k2", "R2": "2k2"})
    status, out, err = stagebook("causes", "buzzer", 1, 2)
    lines = out.splitlines()
    assert (status, err) == (0, "")
    assert max(map(len, lines)) <= 80
    assert lines[0] == "buzzer r1 to r2: changed R1, R2"
    changes = [float(line.split()[2]) for line in lines if line[:9].strip()[:1] in "+-" and line[:9].strip()]
    assert len(changes) > 2
    assert changes == sorted(changes)
    assert "not changed." in out
