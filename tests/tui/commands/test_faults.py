"""``stagebook faults``: its table and its JSON, on the door buzzer whose faults can be said by reasoning."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

Run = Callable[..., tuple[int, str, str]]


def test_silent_faults_head_the_table(stagebook: Run, written: Path) -> None:
    status, out, err = stagebook("faults", written)
    assert (status, err) == (0, "")
    head, *rows = out.splitlines()
    # Two each of S1, R1, R2 and LS1, six of Q1, and weak cells. R1 shorted pulls the supply down through the base.
    assert head == "buzzer: 15 single faults: 10 no alarm, 3 endless, 2 still alarm"
    outcomes = [row for row in rows if row[:1] in ("X", "!", "=", "?")]
    assert "no alarm when due" in outcomes[0]
    assert outcomes[-1].startswith("=")
    assert "still alarms" in outcomes[-1]
    assert max(map(len, out.splitlines())) <= 80


def test_json_is_one_object_in_the_order_of_the_table(stagebook: Run, written: Path) -> None:
    status, out, _ = stagebook("faults", written, "--json")
    found: dict[str, Any] = json.loads(out)
    assert status == 0
    assert (found["design"], found["revision"], len(found["faults"])) == ("buzzer", None, 15)
    outcomes = {(fault["part"], fault["fault"]): fault["outcome"] for fault in found["faults"]}
    # A contact that never closes sounds nothing; one that never opens, or a shorted switch, sounds to the end.
    assert outcomes["S1", "stuck open"] == "silent"
    assert outcomes["S1", "stuck closed"] == "runs on for ever"
    assert outcomes["Q1", "collector to emitter short"] == "runs on for ever"
    assert outcomes["supply", "weak cells"] == "still alarms"
    assert found["faults"][0]["outcome"] == "silent"


def test_a_design_without_a_load_is_refused_in_one_line(
    refused: Callable[..., str], document: dict[str, Any], tmp_path: Path
) -> None:
    driver = document["stages"][0]
    del driver["parts"][-1]["data"]["operating_minimum"]
    document["requirements"] = []
    file = tmp_path / "mute.json"
    file.write_text(json.dumps(document))
    assert "operating_minimum" in refused("faults", file)
