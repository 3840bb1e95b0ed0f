"""What the computing commands refuse: one line that says what to write, status 2, nothing left behind.

The contract is the project's own. Every case also asserts that no file came, went or changed.
"""

from __future__ import annotations

import json
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

Run = Callable[..., tuple[int, str, str]]
Refused = Callable[..., str]
Untouched = Callable[[], bool]

WAVES = ("waves", "buzzer.json", "--csv", "o.csv")


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("margins",), "WHAT"),
        (("margins", ""), "no design"),
        (("margins", "nothing"), "no design"),
        (("margins", "buz\x1b[2Jzer"), "no design"),
        (("margins", "two\nlines"), "no design"),
        (("margins", "x" * 50_000), "no design"),
        (("margins", "nowhere.json"), "cannot be read"),
        (("margins", "nul\0l.json"), "cannot be read"),
        (("margins", "lone\udcff.json"), "cannot be read"),
        (("margins", "./"), "cannot be read"),
        (("margins", "buzzer.json/x"), "cannot be read"),
        (("margins", "./buzzer.json", "--revision", "1"), "no revisions"),
        (("margins", "./buzzer.json", "--draft"), "no revisions"),
        (("margins", "buzzer.json", "more"), "more"),
        (("margins", "buzzer.json", "--strictly"), "--strictly"),
        (("margins", "buzzer.json", "--stric"), "--stric"),
        (("margins", "buzzer.json", "--lanes"), "--lanes"),
        (("margins", "buzzer.json", "--lanes", "-1"), "whole number from 0 to 100000"),
        (("margins", "buzzer.json", "--lanes", "100001"), "whole number from 0 to 100000"),
        (("margins", "buzzer.json", "--lanes", "1000000000"), "whole number from 0 to 100000"),
        (("margins", "buzzer.json", "--lanes", "9" * 5000), "whole number from 0 to 100000"),
        (("margins", "buzzer.json", "--lanes", "1e3"), "whole number from 0"),
        (("margins", "buzzer.json", "--lanes", "1.0"), "whole number from 0"),
        (("margins", "buzzer.json", "--lanes", "\u0663"), "whole number from 0"),
        (("margins", "buzzer.json", "--lanes", ""), "whole number from 0"),
        (("margins", "buzzer.json", "--seed", "seven"), "whole number from 0"),
        (("margins", "buzzer.json", "--seed", "nan"), "whole number from 0"),
        (("margins", "buzzer.json", "--seed", "-1"), "whole number from 0"),
        (("margins", "buzzer.json", "--seed", "4294967296"), "to 4294967295"),
        (("margins", "buzzer", "--store", "."), "not a file"),
        (("margins", "buzzer", "--store", "~no such user/s"), "there is no store ~no such user/s"),
        (("margins", "buzzer", "--store", "nul\0l"), "there is no store"),
        (("margins", "buzzer", "--store", "buzzer.json/s"), "there is no store"),
        (("margins", "buzzer", "--store", "x" * 300), "cannot be opened"),
        (("margins", "buzzer", "--store", "buzzer.json"), "not a Stagebook store"),
        (("waves", "buzzer.json"), "--csv"),
        (("waves", "--csv", "o.csv"), "WHAT"),
        (("waves", "nothing", "--csv", "o.csv"), "no design"),
        (("waves", "buzzer.json", "--csv", ""), "cannot be written"),
        (("waves", "buzzer.json", "--csv", "."), "it is a folder"),
        (("waves", "buzzer.json", "--csv", "new/"), "it is a folder"),
        (("waves", "buzzer.json", "--csv", "missing/o.csv"), "there is no folder"),
        (("waves", "buzzer.json", "--csv", "buzzer.json/o.csv"), "cannot be written"),
        (("waves", "buzzer.json", "--csv", "nul\0l.csv"), "cannot be written"),
        (("waves", "buzzer.json", "--csv", "missing\x1b[2J/o.csv"), "there is no folder"),
        (("waves", "buzzer.json", "--csv", "o" * 300), "cannot be written"),
        (("waves", "buzzer.json", "--csv", "buzzer.json"), "is the design that is read"),
        (("waves", "buzzer.json", "--csv", "./../{folder}/buzzer.json"), "is the design that is read"),
        ((*WAVES, "--nets", "nothing"), "net 'nothing' is not in the design; write one of 0V, base, call, low, supply"),
        ((*WAVES, "--nets", "base;low"), "base;low"),
        ((*WAVES, "--nets", "\x1b[2J"), "is not in the design"),
        ((*WAVES, "--nets", ""), "empty net"),
        ((*WAVES, "--nets", "base,,low"), "empty net"),
        ((*WAVES, "--nets", "base,"), "empty net"),
        ((*WAVES, "--sequence", "dawn"), "there is no sequence 'dawn'; write one of alarm"),
        ((*WAVES, "--sequence", ""), "there is no sequence"),
        ((*WAVES, "--at", ""), "empty"),
        ((*WAVES, "--at", "1ms,,2s"), "empty"),
        ((*WAVES, "--at", "5 V"), "is a voltage where a time"),
        ((*WAVES, "--at", "nan"), "not a value"),
        ((*WAVES, "--at", "inf"), "not a value"),
        ((*WAVES, "--at", "1e400"), "far outside"),
        ((*WAVES, "--at=-1ms"), "below 0 s"),
        ((*WAVES, "--at", "0.6"), "between 0 s and 0.5 s"),
        ((*WAVES, "--at", "0.1,10 h"), "between 0 s and 0.5 s"),
        ((*WAVES, "--at", ",".join(["0.1"] * 10_001)), "at most 10000"),
        ((*WAVES, "--rtol", "0"), "1e-12"),
        ((*WAVES, "--rtol=-1e-3"), "1e-12"),
        ((*WAVES, "--rtol", "0.5"), "1e-12"),
        ((*WAVES, "--rtol", "inf"), "1e-12"),
        ((*WAVES, "--rtol", "fine"), "1e-12"),
    ],
)
def test_margins_and_waves(
    refused: Refused, written: Path, untouched: Untouched, arguments: tuple[str, ...], says: str
) -> None:
    assert says in refused(*(argument.replace("{folder}", written.parent.name) for argument in arguments))
    assert untouched()


@pytest.mark.parametrize("command", ["compare", "causes"])
@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ((), "WHAT"),
        (("buzzer",), "N"),
        (("buzzer", "1"), "1 revision where 2"),
        (("buzzer", "1", "1"), "stands twice"),
        (("buzzer", "1", "r1"), "stands twice"),
        (("buzzer", "1", "two"), "not a revision"),
        (("buzzer", "1", "0"), "not a revision"),
        (("buzzer", "1", "1.0"), "not a revision"),
        (("buzzer", "1", "9" * 5000), "not a revision"),
        (("buzzer", "1", "7"), "no revision r7"),
        (("buzzer", "1", "2", "3", "4", "5", "6", "7"), "7 revisions where 2"),
        (("buzzer.json", "1", "2"), "is a file"),
        (("./buzzer", "1", "2"), "is a file"),
        (("nothing", "1", "2"), "no design"),
        (("buz\x1b[2Jzer", "1", "2"), "no design"),
        (("buzzer", "1", "2", "--yaml"), "--yaml"),
        (("buzzer", "1", "2", "--store", "."), "not a file"),
    ],
)
def test_compare_and_causes(
    refused: Refused,
    shelve: Callable[..., None],
    untouched: Untouched,
    command: str,
    arguments: tuple[str, ...],
    says: str,
) -> None:
    shelve({})
    assert says in refused(command, *arguments)
    assert untouched()


def test_causes_takes_two_revisions(refused: Refused, shelve: Callable[..., None]) -> None:
    shelve({}, {"R1": "2k2"}, {"R1": "3k3"})
    assert "3 revisions where 2 are asked for" in refused("causes", "buzzer", 1, 2, 3)


@pytest.mark.parametrize("command", [("margins",), ("waves", "--csv", "o.csv")])
@pytest.mark.parametrize(
    ("content", "says"),
    [
        (b"", "not JSON"),
        (b'{"stagebook": 1,', "not JSON at line 1"),
        (b"\xff\xfe", "UTF-8"),
        (b"[]", "not an object"),
        (b'{"a":' * 5000 + b"1" + b"}" * 5000, "nested too deep"),
        (b" " * 1_000_001, "bytes"),
        (b'{"stagebook": 1, "name": "x", "sequences": {"alarm": {"ends": "soon"}}}', "ends"),
    ],
)
def test_a_document_that_cannot_be_read(
    refused: Refused, tmp_path: Path, command: tuple[str, ...], content: bytes, says: str
) -> None:
    (tmp_path / "bad.json").write_bytes(content)
    line = refused(command[0], "bad.json", *command[1:])
    assert "bad.json" in line
    assert says in line
    assert os.listdir(tmp_path) == ["bad.json"]


def _leads_nowhere(document: dict[str, Any]) -> None:
    del document["stages"][0]["parts"][1]
    del document["stages"][0]["roles"]["base_resistor"]


def _unknown_kind(document: dict[str, Any]) -> None:
    document["stages"][0]["parts"][1]["kind"] = "resister"


def _unknown_class(document: dict[str, Any]) -> None:
    document["stages"][0]["parts"][3]["class"] = "best npn"


def _window_upside_down(document: dict[str, Any]) -> None:
    document["requirements"][0].update(min="2 s", max="1 s")


def _unknown_part_in_a_sequence(document: dict[str, Any]) -> None:
    document["sequences"]["alarm"]["events"][1]["part"] = "S9"


def _two_ideal_sources(document: dict[str, Any]) -> None:
    waveform = {"steps": [["0 s", "1 V"], ["1 s", "1 V"]]}
    document["stages"][0]["parts"] += [
        {"ref": ref, "kind": "generator", "pins": {"plus": "base", "minus": "0V"}, "waveform": waveform}
        for ref in ("G1", "G2")
    ]


@pytest.mark.parametrize(
    ("spoil", "says"),
    [
        (_leads_nowhere, "call"),
        (_unknown_kind, "'resistor'"),
        (_unknown_class, "best npn"),
        (_unknown_part_in_a_sequence, "S9"),
        (_two_ideal_sources, "in parallel"),
    ],
)
def test_a_circuit_that_cannot_be_computed(
    refused: Refused, document: dict[str, Any], written: Path, spoil: Callable[[dict[str, Any]], None], says: str
) -> None:
    spoil(document)
    (written.parent / "spoilt.json").write_text(json.dumps(document))
    for command in (("margins", "spoilt.json"), ("waves", "spoilt.json", "--csv", "o.csv")):
        assert says in refused(*command)
    assert not (written.parent / "o.csv").exists()


def test_a_requirement_that_cannot_be_computed(refused: Refused, document: dict[str, Any], written: Path) -> None:
    _window_upside_down(document)
    written.write_text(json.dumps(document))
    assert "min 2 s is not below max 1 s" in refused("margins", written)


def test_a_database_is_never_written_over(
    refused: Refused, shelve: Callable[..., None], written: Path, tmp_path: Path
) -> None:
    shelve({})
    before = (tmp_path / "shelf.sqlite3").read_bytes()
    assert "is a database" in refused("waves", written, "--csv", "shelf.sqlite3")
    assert "is a database" in refused("waves", "buzzer", "--csv", "shelf.sqlite3")
    assert "is a database" in refused("export", "buzzer", "shelf.sqlite3")
    assert (tmp_path / "shelf.sqlite3").read_bytes() == before


def test_an_export_does_not_replace_the_document_it_reads(refused: Refused, written: Path) -> None:
    before = written.read_bytes()
    assert "is the design that is read" in refused("export", written, "buzzer.json")
    assert written.read_bytes() == before


def test_a_file_without_permission_to_write(
    refused: Refused, written: Path, untouched: Untouched, monkeypatch: pytest.MonkeyPatch
) -> None:
    # Root may write everything, therefore the question is answered for it.
    monkeypatch.setattr(os, "access", lambda path, mode: False)
    assert "no permission to write" in refused("waves", written, "--csv", "o.csv")
    assert untouched()


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="a device that is always full, of Linux")
def test_a_full_device_is_told_in_one_line(refused: Refused, written: Path) -> None:
    assert "No space left" in refused("waves", written, "--csv", "/dev/full")


def test_a_full_disk_leaves_what_was_there(
    refused: Refused, written: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "o.csv").write_text("older")

    def full(source: Path, target: Path) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "replace", full)
    assert "No space left" in refused("waves", written, "--csv", "o.csv")
    assert (tmp_path / "o.csv").read_text() == "older"
    assert sorted(os.listdir(tmp_path)) == ["buzzer.json", "o.csv"]
