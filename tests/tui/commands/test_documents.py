"""``import``, ``export``, ``list`` and ``schema``. The contract is the project's own, in README and --help."""

from __future__ import annotations

import json
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, Depth, MarginSheet, Verdict
from stagebook.storage import Note, Store

Run = Callable[..., tuple[int, str, str]]
Refused = Callable[..., str]


def save(shelf: Path, name: str, margin: float | None, verdict: Verdict, line: str = "first") -> None:
    """Save the draft as a revision with one margin of these figures."""
    with Store.open(shelf) as store:
        content = store.draft(name).design.content
        check = CheckResult(
            id="duration:driver:LS1",
            number=11,
            title="duration",
            stage="driver",
            part="LS1",
            sequence="alarm",
            demand=None,
            capability=None,
            unit="s",
            limits=(0.1, 0.3),
            low=0.19,
            high=0.21,
            margin=margin,
            required=0.1,
            verdict=verdict,
            outcome=None,
            reason=None,
            corner="nominal",
            conditions={},
            nominal=margin,
            hand=None,
            spread=None,
        )
        sheet = MarginSheet(name, content, "test", 1, 0, 0.0, Depth.CORNERS, (check,))
        store.save(name, Note(line), sheet)


def test_a_document_goes_in_and_comes_out_as_typed(stagebook: Run, written: Path, document: dict[str, Any]) -> None:
    assert stagebook("import", written)[0] == 0
    status, out, err = stagebook("export", "buzzer", "--draft", "out.json")
    assert (status, out, err) == (0, "", "")
    assert Design.load(Path("out.json").read_bytes()).content == Design.load(document).content
    assert '"value": "1k"' in Path("out.json").read_text(encoding="utf-8")


def test_a_design_without_a_revision_stands_as_its_draft(stagebook: Run, written: Path) -> None:
    stagebook("import", written, "--as", "hall")
    assert stagebook("export", "hall", "out.json")[0] == 0
    assert Design.load(Path("out.json").read_bytes()).name == "buzzer"


def test_the_newest_revision_is_exported_and_others_by_number(
    stagebook: Run, written: Path, tmp_path: Path, document: dict[str, Any]
) -> None:
    stagebook("import", written)
    shelf = tmp_path / "shelf.sqlite3"
    save(shelf, "buzzer", 0.5, Verdict.PASS)
    document["purpose"] = "changed"
    with Store.open(shelf) as store:
        store.edit("buzzer", "purpose", Design.load(document))
    save(shelf, "buzzer", 0.4, Verdict.PASS)
    document["purpose"] = "changed again"
    with Store.open(shelf) as store:
        store.edit("buzzer", "purpose", Design.load(document))
    purposes = []
    for which in ((), ("--revision", 1), ("--revision", "r2"), ("--draft",)):
        assert stagebook("export", "buzzer", *which, "out.json")[0] == 0
        purposes.append(json.loads(Path("out.json").read_text())["purpose"])
    assert purposes == ["changed", "a contact sounds a small buzzer", "changed", "changed again"]


def test_a_file_can_be_exported_to_another(stagebook: Run, written: Path) -> None:
    assert stagebook("export", written, "copy.json")[0] == 0
    assert Design.load(Path("copy.json").read_bytes()) == Design.load(written.read_bytes())


def test_an_export_leaves_nothing_half_written(refused: Refused, written: Path, tmp_path: Path) -> None:
    kept = tmp_path / "kept"
    kept.mkdir()
    before = sorted(os.listdir(tmp_path))
    assert "cannot be written" in refused("export", written, "missing/out.json")
    (kept / "buzzer.json").mkdir()
    assert "cannot be written" in refused("export", written, kept)
    assert os.listdir(kept) == ["buzzer.json"]
    assert sorted(os.listdir(tmp_path)) == before


def test_the_list_of_an_empty_shelf(stagebook: Run) -> None:
    assert json.loads(stagebook("list", "--json")[1]) == {"designs": []}
    assert "empty" in stagebook("list")[1]


def test_the_list_names_revisions_and_the_worst_margin(stagebook: Run, written: Path, tmp_path: Path) -> None:
    stagebook("import", written)
    stagebook("import", written, "--as", "attic")
    save(tmp_path / "shelf.sqlite3", "buzzer", -0.36, Verdict.FAIL)
    status, out, err = stagebook("list", "--json")
    attic, buzzer = json.loads(out)["designs"]
    assert (status, err) == (0, "")
    assert attic == {"name": "attic", "revisions": 0, "saved": None, "worst": None}
    assert buzzer["revisions"] == 1
    assert buzzer["saved"].startswith("20")
    assert buzzer["worst"] == {"id": "duration:driver:LS1", "margin": -0.36, "verdict": "FAIL"}
    plain = stagebook("list")[1].splitlines()
    assert max(map(len, plain)) <= 80
    assert "-36" in plain[2]
    assert "FAIL" in plain[2]
    assert "never" in plain[1]
    assert "without the edits" not in plain[-1]
    with Store.open(tmp_path / "shelf.sqlite3") as store:
        draft = store.draft("buzzer").design
        store.edit("buzzer", "6 V", Design.load({**draft.dump(), "purpose": "another"}))
    assert "without the edits since" in stagebook("list")[1].splitlines()[-1]


def test_an_unknown_margin_is_null(stagebook: Run, written: Path, tmp_path: Path) -> None:
    stagebook("import", written)
    save(tmp_path / "shelf.sqlite3", "buzzer", None, Verdict.UNKNOWN)
    (buzzer,) = json.loads(stagebook("list", "--json")[1])["designs"]
    assert buzzer["worst"]["margin"] is None
    assert buzzer["worst"]["verdict"] == "UNKNOWN"


def test_the_store_can_be_named_before_and_behind_the_command(stagebook: Run, written: Path) -> None:
    stagebook("--store", "other.sqlite3", "import", written)
    assert len(json.loads(stagebook("list", "--json", "--store", "other.sqlite3")[1])["designs"]) == 1
    assert len(json.loads(stagebook("--store", "other.sqlite3", "list", "--json")[1])["designs"]) == 1
    assert json.loads(stagebook("list", "--json")[1]) == {"designs": []}


@pytest.mark.parametrize(
    ("content", "says"),
    [
        (b"", "not JSON"),
        (b"{", "not JSON at line 1"),
        (b"\xff\xfe\x00", "UTF-8"),
        (b"[]", "not an object"),
        (b'{"stagebook": 2, "name": "x", "sequences": {}}', "stagebook"),
        (b'{"stagebook": 1, "name": "x", "sequences": {"alarm": {"events": [], "ends": "nan"}}}', "ends"),
        (b'{"a":' * 5000 + b"1" + b"}" * 5000, "nested too deep"),
        (b" " * 1_000_001, "bytes"),
    ],
)
def test_a_bad_document_is_refused_with_its_file(refused: Refused, tmp_path: Path, content: bytes, says: str) -> None:
    (tmp_path / "bad.json").write_bytes(content)
    for command in (("import", "bad.json"), ("export", "bad.json", "out.json")):
        line = refused(*command)
        assert "bad.json" in line
        assert says in line
    assert not (tmp_path / "out.json").exists()


def test_a_bad_field_is_named_with_stage_and_part(refused: Refused, document: dict[str, Any], tmp_path: Path) -> None:
    document["stages"][0]["parts"][1]["value"] = {"a": 1}
    (tmp_path / "bad.json").write_text(json.dumps(document))
    line = refused("import", "bad.json")
    assert "driver" in line
    assert "R1" in line
    assert "value" in line


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("import",), "FILE"),
        (("import", "nowhere.json"), "cannot be read"),
        (("import", "."), "cannot be read"),
        (("import", "nul\0l.json"), "cannot be read"),
        (("import", "buzzer.json", "--as", ""), "name"),
        (("import", "buzzer.json", "--as", "a/b"), "file"),
        (("import", "buzzer.json", "--as", "x.json"), ".json"),
        (("import", "buzzer.json", "--as", "two\nlines"), "control character"),
        (("import", "buzzer.json", "--as", "x" * 400), "characters"),
        (("export", "buzzer"), "FILE"),
        (("export", "nothing", "out.json"), "no design"),
        (("export", "", "out.json"), "no design"),
        (("export", "nowhere.json", "out.json"), "cannot be read"),
        (("export", "buzzer.json", "--revision", "1", "out.json"), "no revisions"),
        (("export", "buzzer.json", "--draft", "out.json"), "no revisions"),
        (("export", "x", "--draft", "--revision", "1", "out.json"), "not allowed with"),
        (("export", "x", "--revision", "0", "out.json"), "not a revision"),
        (("export", "x", "--revision", "-1", "out.json"), "revision"),
        (("export", "x", "--revision", "1.5", "out.json"), "not a revision"),
        (("export", "x", "--revision", "\u0663", "out.json"), "not a revision"),
        (("list", "--jsn"), "--jsn"),
        (("list", "extra"), "extra"),
        (("list", "--store", "."), "not a file"),
        (("list", "--store", "buzzer.json"), "buzzer.json"),
        (("list", "--store", "buzzer.json/inside"), "there is no store"),
        (("import", "buzzer.json", "--store", "buzzer.json/inside"), "cannot be opened"),
        (("schema", "--json"), "--json"),
    ],
)
def test_wrong_input_is_one_line(refused: Refused, written: Path, arguments: tuple[str, ...], says: str) -> None:
    assert says in refused(*arguments)
    assert written.exists()


def test_a_revision_that_is_not_there(refused: Refused, stagebook: Run, written: Path, tmp_path: Path) -> None:
    stagebook("import", written)
    assert "revision" in refused("export", "buzzer", "--revision", "1", "out.json")
    save(tmp_path / "shelf.sqlite3", "buzzer", 0.5, Verdict.PASS)
    assert "7" in refused("export", "buzzer", "--revision", "7", "out.json")


def test_a_name_is_taken_once(refused: Refused, stagebook: Run, written: Path) -> None:
    assert stagebook("import", written)[0] == 0
    said = refused("import", written)
    assert "already" in said
    assert "--as NAME" in said
    assert len(json.loads(stagebook("list", "--json")[1])["designs"]) == 1


def test_a_misspelt_name_is_helped(refused: Refused, stagebook: Run, written: Path) -> None:
    stagebook("import", written)
    assert "'buzzer'" in refused("export", "buzer", "out.json")


def test_a_document_that_cannot_be_computed_is_taken_in_with_the_reason(
    stagebook: Run, tmp_path: Path, document: dict[str, Any]
) -> None:
    part = next(part for stage in document["stages"] for part in stage["parts"] if "value" in part)
    part["value"] = "220q"
    (tmp_path / "odd.json").write_text(json.dumps(document), encoding="utf-8")
    status, out, err = stagebook("import", tmp_path / "odd.json")
    assert (status, out) == (0, "buzzer is on the shelf, as a draft without a revision yet\n")
    assert err.startswith("stagebook import: it cannot be computed as it stands: stage ")
    assert f"part {part['ref']}, field value: " in err
    assert err.count("\n") == 1


def test_export_says_which_edits_are_not_in_what_it_writes(
    stagebook: Run, written: Path, tmp_path: Path, document: dict[str, Any]
) -> None:
    stagebook("import", written)
    shelf = tmp_path / "shelf.sqlite3"
    save(shelf, "buzzer", 0.5, Verdict.PASS)
    assert stagebook("export", "buzzer", "out.json") == (0, "", "")
    with Store.open(shelf) as store:
        store.edit("buzzer", "purpose", Design.load({**document, "purpose": "changed"}))
    said = "stagebook export: buzzer r1 is written, without 1 edit of the draft; --draft writes the draft\n"
    assert stagebook("export", "buzzer", "out.json") == (0, "", said)
    assert stagebook("export", "buzzer", "--revision", "1", "out.json") == (0, "", "")
