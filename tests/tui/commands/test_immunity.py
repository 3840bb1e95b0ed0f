"""``stagebook immunity``: its table and its JSON, on a net whose charge Q = C V is worked by hand."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def held(document: dict[str, Any], tmp_path: Path) -> Path:
    """The door buzzer with nothing but a load that is on above 3 V on 10 nF: 30 nC."""
    driver = document["stages"][0]
    pins = {"plus": "n", "minus": "0V"}
    data = {"current": "1 nA", "operating_minimum": "3 V", "rated_voltage": "6 V"}
    driver["parts"] = [
        {"ref": "LS1", "kind": "sounder", "pins": pins, "data": data},
        {"ref": "C1", "kind": "capacitor", "pins": {"a": "n", "b": "0V"}, "value": "10n", "tolerance": "0 %"},
        {"ref": "R1", "kind": "resistor", "pins": {"a": "n", "b": "0V"}, "value": "100k", "tolerance": "0 %"},
        {"ref": "R2", "kind": "resistor", "pins": {"a": "supply", "b": "0V"}, "value": "1k", "tolerance": "0 %"},
    ]
    driver["roles"] = {"load": "LS1"}
    document["requirements"] = []
    document["sequences"] = {"alarm": {"events": [{"at": "0 s", "event": "connect supply"}], "ends": "1 s"}}
    file = tmp_path / "held.json"
    file.write_text(json.dumps(document))
    return file


def test_json_is_the_contract(stagebook: Run, held: Path) -> None:
    status, out, err = stagebook("immunity", held, "--json")
    found = json.loads(out)
    assert (status, err) == (0, "")
    assert (found["design"], found["revision"]) == ("buzzer", None)
    first = found["nets"][0]
    assert set(first) == {"net", "charge", "sign", "condition"}
    assert (first["net"], first["sign"], first["condition"]) == ("n", 1, "nominal")
    assert first["charge"] == pytest.approx(30e-9, rel=0.05)
    assert found["slew"] == {"limit": None, "condition": "no latch that the supply could trip"}


def test_the_table_has_the_weakest_net_first(stagebook: Run, held: Path) -> None:
    status, out, _ = stagebook("immunity", held)
    lines = out.splitlines()
    assert status == 0
    assert lines[0] == "buzzer: least charge within 100 ns that trips an alarm in stand-by"
    assert lines[1] == "  steepest supply that trips none: no latch that the supply could trip".lstrip()
    rows = lines[lines.index("") + 2 :]
    assert rows[0].split()[:4] in (["n", "+29", "nC", "nominal"], ["n", "+30", "nC", "nominal"])
    assert rows[1].split() == ["supply", *["over", "1", "uC", "nothing", "trips", "it,", "in", "any", "corner"]]
    assert max(map(len, lines)) <= 80


def test_without_an_alarm_it_is_refused_in_one_line(refused: Callable[..., str], held: Path) -> None:
    document = json.loads(held.read_text())
    document["stages"][0]["roles"] = {}
    held.write_text(json.dumps(document))
    assert "nothing tells of an alarm" in refused("immunity", held)
