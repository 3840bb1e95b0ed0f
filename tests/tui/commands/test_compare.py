"""``stagebook compare``: stored margins side by side. Keys and order: the project's own contract."""

from __future__ import annotations

import json
import subprocess
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

from stagebook.engine.design.document import Design
from stagebook.engine.studies.margins import study
from stagebook.storage import Note, Store

Run = Callable[..., tuple[int, str, str]]
Shelve = Callable[..., None]

OVERDRIVE = "base_overdrive:driver:Q1"


def test_the_stored_margins_as_json(stagebook: Run, shelve: Shelve, tmp_path: Path) -> None:
    shelve({"R1": "1k"}, {"R1": "4k7"}, {"R1": "820R", "R2": "12k"})
    status, out, err = stagebook("compare", "buzzer", 1, 2, 3, "--json")
    found = json.loads(out)
    assert (status, err) == (0, "")
    assert found["design"] == "buzzer"
    assert found["revisions"] == ["r1", "r2", "r3"]
    assert [[change["what"] for change in changes] for changes in found["changed"]] == [[], ["R1"], ["R1", "R2"]]
    assert found["changed"][1] == [{"what": "R1", "kind": "value", "before": "1k", "after": "4k7"}]
    with Store.open(tmp_path / "shelf.sqlite3") as store:
        kept = [{check.id: check for check in store.revision("buzzer", n).sheet.checks} for n in (1, 2, 3)]
    assert {check["id"] for check in found["checks"]} == set(kept[0])
    for check in found["checks"]:
        first, *others = check["columns"]
        assert first["difference"] is None
        assert [cell["margin"] for cell in check["columns"]] == [table[check["id"]].margin for table in kept]
        assert [cell["difference"] for cell in others] == [cell["margin"] - first["margin"] for cell in others]
    # A verdict that fell comes before what only lost.
    assert found["checks"][0]["id"] == OVERDRIVE
    assert [cell["verdict"] for cell in found["checks"][0]["columns"]] == ["PASS", "THIN", "PASS"]
    worse = [check["worse"] for check in found["checks"]]
    assert worse == sorted(worse, reverse=True)


def test_the_first_revision_is_the_one_compared_with(stagebook: Run, shelve: Shelve) -> None:
    shelve({"R1": "1k"}, {"R1": "3k3"})
    found = {}
    for order in ((1, 2), (2, 1)):
        checks = json.loads(stagebook("compare", "buzzer", *order, "--json")[1])["checks"]
        found[order] = next(check for check in checks if check["id"] == OVERDRIVE)
    assert found[1, 2]["worse"]
    assert not found[2, 1]["worse"]
    assert found[1, 2]["columns"][1]["difference"] == -found[2, 1]["columns"][1]["difference"]


def test_six_revisions_have_room_in_eighty_columns(stagebook: Run, shelve: Shelve) -> None:
    shelve(*({"R1": value} for value in ("1k", "1k5", "3k3", "4k7", "10k", "100k")))
    status, out, err = stagebook("compare", "buzzer", 1, 2, 3, 4, 5, 6)
    lines = out.splitlines()
    assert (status, err) == (0, "")
    assert max(map(len, lines)) <= 80
    assert lines[0] == "buzzer: r2, r3, r4, r5, r6 against r1"
    assert "r6: R1 1k to 100k" in lines
    text = " ".join(out.split())
    # In 100 k flow less than 60 uA: the transistor never switches the sounder on.
    assert "r6: " in text[text.index("got worse") :]
    assert "X FAIL" in lines[-1]
    overdrive = next(line for line in lines if "base overdrive" in line)
    assert overdrive.split()[::2][:6] == ["=", "=", "=", "!", "X", "X"]


def test_a_check_that_only_one_side_has(
    stagebook: Run, shelve: Shelve, document: dict[str, Any], tmp_path: Path
) -> None:
    shelve({})
    document["requirements"] = []
    design = Design.load(document)
    with Store.open(tmp_path / "shelf.sqlite3") as store:
        store.edit("buzzer", "no requirement", design)
        store.save("buzzer", Note("two"), study(design))
    checks = json.loads(stagebook("compare", "buzzer", 1, 2, "--json")[1])["checks"]
    columns = next(check["columns"] for check in checks if check["id"] == "duration:driver:LS1")
    assert columns[0]["verdict"] == "PASS"
    assert columns[1] is None
    line = next(line for line in stagebook("compare", "buzzer", 1, 2)[1].splitlines() if "duration window" in line)
    assert line.split()[2] == "-"


def test_another_engine_is_told(stagebook: Run, shelve: Shelve, document: dict[str, Any], tmp_path: Path) -> None:
    shelve({})
    document["purpose"] = "another one"
    design = Design.load(document)
    with Store.open(tmp_path / "shelf.sqlite3") as store:
        store.edit("buzzer", "purpose", design)
        store.save("buzzer", Note("two"), replace(study(design), engine="0.old"))
    assert json.loads(stagebook("compare", "buzzer", 1, 2, "--json")[1])["engines"][1] == "0.old"
    assert "r2 by 0.old" in " ".join(stagebook("compare", "buzzer", 1, 2)[1].split())


def test_what_is_stored_needs_no_solver(shelve: Shelve, tmp_path: Path) -> None:
    shelve({"R1": "1k"}, {"R1": "3k3"})
    code = (
        "import sys; from stagebook.tui.app import main\n"
        f"main(['compare', 'buzzer', '1', '2', '--store', {str(tmp_path / 'shelf.sqlite3')!r}])\n"
        "print([name for name in ('numba', 'numpy', 'textual') if name in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert "base overdrive" in done.stdout
    assert done.stderr.strip() == "[]"
