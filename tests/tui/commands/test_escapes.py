"""Foreign text in what commands print and write: nothing steers the terminal, nothing runs in a spreadsheet.

Control functions: ECMA-48 (C0 and C1 sets). Formula cells: OWASP, "CSV Injection". Device names: "Naming Files, Paths,
and Namespaces", Microsoft Learn.
"""

from __future__ import annotations

import csv
import json
import sqlite3
import unicodedata
from collections.abc import Callable
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from stagebook.engine.design.document import Design
from stagebook.engine.studies.margins import study
from stagebook.storage import Note, Store
from stagebook.tui.out_file import cell, file_name
from stagebook.tui.shown import json_text

Said = tuple[int, str, str]

STEERS = "\x1b[2J\x1b]0;owned\x07\x9b31m\x7f\x08\u202e\u2028\u200b"
HIDDEN = {"Cc", "Cf", "Cs", "Co", "Cn", "Zl", "Zp"}


def raw(text: str) -> set[str]:
    """The characters of an output that a terminal would obey or hide."""
    return {c for c in text if c != "\n" and unicodedata.category(c) in HIDDEN}


made: dict[str, bytes] = {}
"""The files of the shelf below, computed once."""


@pytest.fixture
def poisoned(document: dict[str, Any], tmp_path: Path) -> Design:
    """A shelf whose every text is hostile: what a document may hold, and in sheets and notes more than it may."""
    stage = document["stages"][0]
    stage["name"] = "dri\u202ever"
    document["purpose"] = "to \u202e\u200b sound"
    for part in stage["parts"]:
        for pin, net in part["pins"].items():
            part["pins"][pin] = {"base": "+\u202ebase", "call": "@call"}.get(net, net)
    design = Design.load(document)
    if not made:
        _poison(document, design, tmp_path)
    for name, content in made.items():
        (tmp_path / name).write_bytes(content)
    return design


def _poison(document: dict[str, Any], design: Design, folder: Path) -> None:
    sheet = study(design)
    checks = tuple(
        replace(check, title=STEERS, corner=STEERS, outcome=STEERS, reason=STEERS + check.id) for check in sheet.checks
    )
    with Store.open(folder / "shelf.sqlite3") as store:
        store.create("buzzer", design)
        store.save("buzzer", Note("one"), replace(sheet, checks=checks))
        document["stages"][0]["parts"][1]["value"] = "2k2"
        other = Design.load(document)
        store.edit("buzzer", f"value {STEERS}", other)
        store.save("buzzer", Note("two"), replace(sheet, checks=checks, content=other.content))
    with closing(sqlite3.connect(folder / "shelf.sqlite3")) as stored:
        stored.execute("DROP TRIGGER revision_no_update")
        stored.execute("DROP TRIGGER margin_no_update")
        stored.execute("UPDATE revision SET note = json_set(note, '$.line', ?)", (STEERS,))
        stored.execute("UPDATE margin SET check_id = ? WHERE position = 0", (STEERS,))
        stored.commit()
    made["buzzer.json"] = json.dumps(document).encode()
    made["shelf.sqlite3"] = (folder / "shelf.sqlite3").read_bytes()


@pytest.mark.parametrize(
    "arguments",
    [
        ("list",),
        ("list", "--json"),
        ("margins", "buzzer", "--lanes", "0"),
        ("margins", "buzzer", "--lanes", "0", "--json"),
        ("margins", "buzzer.json", "--lanes", "0"),
        ("compare", "buzzer", "1", "2"),
        ("compare", "buzzer", "1", "2", "--json"),
        ("causes", "buzzer", "1", "2"),
        ("causes", "buzzer", "1", "2", "--json"),
        ("immunity", "buzzer"),
        ("immunity", "buzzer", "--json"),
        ("faults", "buzzer"),
        ("faults", "buzzer", "--json"),
        ("inspect",),
        ("inspect", "--json"),
        ("schema",),
        ("export", "buzzer", "."),
        ("import", "buzzer.json", "--as", "second"),
        ("import", "buzzer.json", "--as", STEERS),
        ("import", STEERS + ".json"),
        ("backup", f"copy{STEERS}"),
        ("backup", f"missing{STEERS}/copy"),
        ("margins", STEERS),
        ("margins", "buzzer", "--revision", STEERS),
        ("waves", "buzzer", "--csv", f"o{STEERS}.csv", "--nets", STEERS),
        ("waves", "buzzer", "--csv", "o.csv", "--sequence", STEERS),
        (STEERS,),
        ("list", f"--{STEERS}"),
    ],
    ids=lambda words: " ".join(words).replace(STEERS, "STEERS"),
)
def test_no_output_steers_the_terminal(
    stagebook: Callable[..., Said], poisoned: Design, arguments: tuple[str, ...]
) -> None:
    status, out, err = stagebook(*arguments)
    assert raw(out) == raw(err) == set()
    assert status in (0, 1, 2)
    assert out or err or arguments[0] in ("waves", "export")
    if "--json" in arguments and arguments[0] != "inspect":
        assert raw(json.dumps(json.loads(out), ensure_ascii=False)) & set(STEERS)  # escaped, and none of it gone


def test_an_export_escapes_and_comes_back_the_same(
    stagebook: Callable[..., Said], poisoned: Design, tmp_path: Path
) -> None:
    assert stagebook("export", "buzzer", "--revision", "1", "out.json")[0] == 0
    text = (tmp_path / "out.json").read_text("utf-8")
    assert raw(text) == set()
    assert "\\u202e" in text
    assert Design.load(text) == poisoned


def test_an_export_into_a_folder_takes_the_name_of_the_design(
    stagebook: Callable[..., Said], poisoned: Design, tmp_path: Path
) -> None:
    (tmp_path / "out").mkdir()
    status, out, _ = stagebook("export", "buzzer", "out")
    assert (status, out.split()[-1]) == (0, "r2.json")
    (tmp_path / "up.json").write_text(json.dumps({**poisoned.dump(), "name": "..\\..\\up"}))
    assert stagebook("export", "up.json", "out")[0] == 0
    assert sorted(file.name for file in (tmp_path / "out").iterdir()) == ["______up.json", "buzzer r2.json"]


def test_heads_of_a_table_of_waves_are_no_formulas(
    stagebook: Callable[..., Said], poisoned: Design, tmp_path: Path
) -> None:
    assert stagebook("waves", "buzzer", "--csv", "o.csv", "--at", "0.2")[0] == 0
    text = (tmp_path / "o.csv").read_text("utf-8")
    assert raw(text) == set()
    heads, row = csv.reader(text.splitlines())
    assert heads == ["time", "supply", "'@call", "'+<U+202E>base", "low"]
    assert float(row[0]) == 0.2


@pytest.mark.parametrize("text", ["=1+1", "+9V", "-x", "@sum(a)", "\t=1", "\r=1", " =1", "\n+1", "\uff1d1+1", '=cmd|"'])
def test_a_formula_in_a_cell_is_defused(text: str) -> None:
    assert cell(text).startswith("'")


@given(st.text())
@example("a\n=1")
def test_a_cell_is_visible_and_starts_no_formula(text: str) -> None:
    assert raw(cell(text)) == set()
    assert cell(text).lstrip()[:1] not in ("=", "+", "-", "@")


@given(st.text())
@example("..")
@example("../../etc/passwd")
@example("/")
@example("a\0b")
@example(".hidden")
@example("~")
@example("-rf")
@example("con")
@example("x" * 5000)
@example("\U0001f514" * 200)
@example("C:\\x")
def test_a_file_name_made_of_any_name_stays_in_its_folder(tmp_path_factory: pytest.TempPathFactory, text: str) -> None:
    name = file_name(text, ".json")
    folder = tmp_path_factory.getbasetemp()
    assert Path(name).name == name
    assert (folder / name).resolve().parent == folder.resolve()
    assert len(name.encode()) < 120
    assert name[0] not in ".-~ "
    assert not any(c in name for c in '/\\:*?"<>|%$\0')
    assert raw(name) == set()


@pytest.mark.parametrize("name", ["con", "NUL", "com1", "Lpt9", "aux"])
def test_a_file_name_means_no_device(name: str) -> None:
    assert file_name(name, ".json") == f"_{name}.json"


def test_a_customary_name_is_kept() -> None:
    assert file_name("flood alarm-2 r3", ".json") == "flood alarm-2 r3.json"


@given(st.recursive(st.text() | st.floats(allow_nan=False, allow_infinity=False), st.lists), st.booleans())
@example([STEERS, "\U000e0001", "\ud800"], True)
@example([STEERS, "\U000e0001", "\ud800"], False)
def test_json_is_the_same_value_without_a_raw_control(value: Any, ascii_only: bool) -> None:
    text = json_text(value, ascii_only=ascii_only)
    assert raw(text) == set()
    assert json.loads(text) == value
    assert text.isascii() or not ascii_only
