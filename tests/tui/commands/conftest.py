"""A shelf of its own for every test of a command, and a small design to put on it."""

from __future__ import annotations

import json
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import MarginSheet
from stagebook.engine.studies.margins import study
from stagebook.storage import Note, Store
from stagebook.tui import app

Said = tuple[int, str, str]


@pytest.fixture
def stagebook(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Callable[..., Said]:
    """Runs the program with these arguments on the test's own shelf: exit status, standard output, standard error."""
    monkeypatch.setenv("STAGEBOOK_STORE", str(tmp_path / "shelf.sqlite3"))
    monkeypatch.chdir(tmp_path)

    def run(*arguments: object) -> Said:
        capsys.readouterr()
        try:
            status = app.main([str(argument) for argument in arguments])
        except SystemExit as leaving:
            status = int(leaving.code or 0)
        said = capsys.readouterr()
        return status, said.out, said.err

    return run


@pytest.fixture
def refused(stagebook: Callable[..., Said]) -> Callable[..., str]:
    """Runs the program, which must refuse in one line with status 2 and print nothing else; returns the line."""

    def run(*arguments: object) -> str:
        status, out, err = stagebook(*arguments)
        assert (status, out, len(err.splitlines())) == (2, "", 1), (status, out, err)
        assert err.startswith("stagebook")
        assert "Traceback" not in err
        return err

    return run


@pytest.fixture
def document() -> dict[str, Any]:
    """A door buzzer: a contact feeds a base resistor, one transistor switches a small sounder."""
    return {
        "stagebook": 1,
        "name": "buzzer",
        "purpose": "a contact sounds a small buzzer",
        "conditions": {
            "supply": {"min": "4 V", "nominal": "6 V", "max": "6.4 V"},
            "ambient": {"min": "0 C", "nominal": "25 C", "max": "50 C"},
            "source_resistance": {"min": "0R1", "nominal": "0R5", "max": "2R"},
        },
        "stages": [
            {
                "name": "driver",
                "kind": "free",
                "roles": {"driver": "Q1", "base_resistor": "R1", "load": "LS1"},
                "parts": [
                    {"ref": "S1", "kind": "contact", "pins": {"a": "supply", "b": "call"}},
                    {
                        "ref": "R1",
                        "kind": "resistor",
                        "pins": {"a": "call", "b": "base"},
                        "value": "1k",
                        "tolerance": "5 %",
                        "rating": "0.25 W",
                    },
                    {
                        "ref": "R2",
                        "kind": "resistor",
                        "pins": {"a": "base", "b": "0V"},
                        "value": "10k",
                        "tolerance": "5 %",
                        "rating": "0.25 W",
                    },
                    {
                        "ref": "Q1",
                        "kind": "npn",
                        "pins": {"collector": "low", "base": "base", "emitter": "0V"},
                        "class": "0.5 A driver npn",
                    },
                    {
                        "ref": "LS1",
                        "kind": "sounder",
                        "pins": {"plus": "supply", "minus": "low"},
                        "data": {
                            "current": {"typical": "30 mA", "max": "40 mA", "source": "datasheet"},
                            "operating_minimum": "3 V",
                            "surge": "40 mA",
                        },
                    },
                ],
            }
        ],
        "sequences": {
            "alarm": {
                "events": [
                    {"at": "0 s", "event": "connect supply", "rise": "1 us"},
                    {"at": "0.1 s", "event": "close", "part": "S1"},
                    {"at": "0.3 s", "event": "open", "part": "S1"},
                ],
                "ends": "0.5 s",
                "moments": {"standby": "0.09 s", "sounding": "0.2 s"},
            }
        },
        "requirements": [
            {
                "check": "duration",
                "of": "LS1",
                "sequence": "alarm",
                "from": "LS1 on",
                "to": "LS1 off",
                "min": "0.1 s",
                "max": "0.3 s",
                "required": "10 %",
            }
        ],
    }


@pytest.fixture
def written(document: dict[str, Any], tmp_path: Path) -> Path:
    """The small design as a file."""
    file = tmp_path / "buzzer.json"
    file.write_text(json.dumps(document), encoding="utf-8")
    return file


@pytest.fixture
def bell(tmp_path: Path) -> Path:
    """A latch with a timer and a sounder as a file."""
    file = tmp_path / "bell.json"
    file.write_bytes(Path(__file__).with_name("bell.json").read_bytes())
    return file


def part_of(document: dict[str, Any], ref: str) -> dict[str, Any]:
    """The part of a document with this reference."""
    return next(part for stage in document["stages"] for part in stage["parts"] if part["ref"] == ref)


@pytest.fixture
def shelve(document: dict[str, Any], tmp_path: Path) -> Callable[..., None]:
    """Puts the small design on the shelf: one revision with its computed margins for every set of values."""

    def put(*revisions: dict[str, str]) -> None:
        with Store.open(tmp_path / "shelf.sqlite3") as store:
            for place, values in enumerate(revisions):
                for ref, value in values.items():
                    part_of(document, ref)["value"] = value
                design = Design.load(document)
                if place:
                    store.edit("buzzer", "values", design)
                else:
                    store.create("buzzer", design)
                store.save("buzzer", Note(f"try {place + 1}"), _margins_of(design.canonical()))

    return put


@cache
def _margins_of(document: bytes) -> MarginSheet:
    """The margins of a document, computed once for all tests that put it on a shelf."""
    return study(Design.load(document))


@pytest.fixture
def untouched(tmp_path: Path) -> Callable[[], bool]:
    """Whether the folder of the test holds just what it held at first."""

    def state() -> dict[str, bytes | None]:
        return {
            str(file.relative_to(tmp_path)): file.read_bytes() if file.is_file() else None
            for file in tmp_path.rglob("*")
            if not file.name.startswith("shelf.sqlite3")
        }

    before = state()
    return lambda: state() == before
