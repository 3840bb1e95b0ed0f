"""``stagebook waves``: a file of times and voltages. The format is the project's own contract for its commands."""

from __future__ import annotations

import csv
import json
import os
from collections.abc import Callable
from math import exp
from pathlib import Path
from typing import Any

import pytest

Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def charging(tmp_path: Path) -> Path:
    """10 V on 100 k and 1 uF from t = 0, after 0.3 s off again in the sequence ``twice``."""
    document = {
        "stagebook": 1,
        "name": "charging",
        "conditions": {"supply": "10 V", "source_resistance": "0R"},
        "stages": [
            {
                "name": "rc",
                "parts": [
                    {"ref": "R1", "kind": "resistor", "pins": {"a": "supply", "b": "top"}, "value": "100k"},
                    {"ref": "C1", "kind": "capacitor", "pins": {"a": "top", "b": "0V"}, "value": "1u"},
                    {"ref": "R2", "kind": "resistor", "pins": {"a": "supply", "b": "half"}, "value": "1k"},
                    {"ref": "R3", "kind": "resistor", "pins": {"a": "half", "b": "0V"}, "value": "1k"},
                ],
            }
        ],
        "sequences": {
            "alarm": {"ends": "0.5 s", "events": [{"at": "0 s", "event": "connect supply", "rise": "1 us"}]},
            "late": {"ends": "0.5 s", "events": [{"at": "0.2 s", "event": "connect supply", "rise": "1 us"}]},
        },
    }
    file = tmp_path / "charging.json"
    file.write_text(json.dumps(document))
    return file


def read(file: str | Path) -> tuple[list[str], list[list[float]]]:
    with open(file, newline="", encoding="utf-8") as lines:
        head, *rows = csv.reader(lines)
    return head, [[float(cell) for cell in row] for row in rows]


def charged(time: float) -> float:
    """The charging law of an RC (closed form of the first-order linear equation), from the middle of the rise on."""
    return 10 * (1 - exp(-(time - 0.5e-6) / 0.1))


def test_a_capacitor_charges_by_its_closed_form(stagebook: Run, charging: Path) -> None:
    done = stagebook("waves", charging, "--nets", "top,half", "--at", "10ms,50 ms,0.1,300ms,0.5 s", "--csv", "o.csv")
    assert done == (0, "", "")
    head, rows = read("o.csv")
    assert head == ["time", "top", "half"]
    assert [row[0] for row in rows] == [0.01, 0.05, 0.1, 0.3, 0.5]
    for time, top, half in rows:
        assert top == pytest.approx(charged(time), abs=0.02)
        assert half == pytest.approx(5, abs=1e-3)


def test_a_finer_tolerance_comes_closer(stagebook: Run, charging: Path) -> None:
    worst = []
    for tolerance in ("1e-2", "1e-6"):
        stagebook("waves", charging, "--nets", "top", "--rtol", tolerance, "--csv", "o.csv")
        worst.append(max(abs(top - charged(time)) for time, top in read("o.csv")[1] if time > 1e-5))
    assert worst[1] < 5e-4 < 5e-3 < worst[0]


def test_every_step_and_every_net_by_default(stagebook: Run, charging: Path) -> None:
    stagebook("waves", charging, "--csv", "o.csv")
    head, rows = read("o.csv")
    assert head[0] == "time"
    assert set(head[1:]) == {"supply", "top", "half"}
    times = [row[0] for row in rows]
    assert times == sorted(times)
    assert (times[0], times[-1]) == (0.0, 0.5)
    assert len(times) > 20


def test_numbers_lose_nothing_on_the_way(stagebook: Run, charging: Path) -> None:
    stagebook("waves", charging, "--nets", "top", "--csv", "o.csv")
    text = Path("o.csv").read_bytes().decode()
    assert "\r" not in text
    for line in text.splitlines()[1:]:
        for cell in line.split(","):
            assert cell == f"{float(cell):.17g}"


def test_times_stand_in_the_order_they_were_asked_in(stagebook: Run, charging: Path) -> None:
    stagebook("waves", charging, "--nets", "top,top", "--at", "0.3,0,0.1,0.3", "--csv", "o.csv")
    head, rows = read("o.csv")
    assert head == ["time", "top", "top"]
    assert [row[0] for row in rows] == [0.3, 0.0, 0.1, 0.3]
    assert rows[0] == rows[3]
    assert rows[1][1] == 0.0


def test_another_sequence(stagebook: Run, charging: Path) -> None:
    stagebook("waves", charging, "--sequence", "late", "--nets", "top", "--at", "0.19,0.3", "--csv", "o.csv")
    (_, before), (_, after) = read("o.csv")[1]
    assert before == pytest.approx(0, abs=1e-3)
    assert after == pytest.approx(charged(0.1), abs=0.02)


def test_a_latch_stays_on_until_its_timer_runs_out(stagebook: Run, bell: Path) -> None:
    stagebook("waves", bell, "--nets", "low", "--at", "0.19,0.25,2,7.9", "--csv", "o.csv")
    off, pushed, sounding, silent = (low for _, low in read("o.csv")[1])
    assert pushed < 0.7
    assert sounding < 0.7
    assert off == pytest.approx(6, abs=0.05)
    assert silent == pytest.approx(6, abs=0.05)


def test_a_revision_and_the_draft(stagebook: Run, shelve: Callable[..., None]) -> None:
    shelve({"R2": "10k"}, {"R2": "100R"})
    found = []
    for which in (("--revision", 1), ("--draft",), ()):
        assert stagebook("waves", "buzzer", *which, "--nets", "low", "--at", "0.2", "--csv", "o.csv")[0] == 0
        found.append(read("o.csv")[1][0][1])
    assert found[0] < 1 < found[1]
    assert found[1] == found[2]


def test_a_file_that_is_there_is_replaced_and_keeps_its_mode(stagebook: Run, charging: Path, tmp_path: Path) -> None:
    old, link = tmp_path / "old.csv", tmp_path / "link.csv"
    old.write_text("old " * 100_000)
    old.chmod(0o600)
    link.symlink_to(old)
    assert stagebook("waves", charging, "--nets", "top", "--at", "0.1", "--csv", link)[0] == 0
    assert link.is_symlink()
    assert len(read(old)[1]) == 1
    assert old.stat().st_mode & 0o777 == 0o600
    assert sorted(os.listdir(tmp_path)) == ["charging.json", "link.csv", "old.csv"]


def test_a_net_name_that_needs_quotes_is_quoted(stagebook: Run, charging: Path, tmp_path: Path) -> None:
    document: dict[str, Any] = json.loads(charging.read_text().replace('"top"', '"t\\"op"'))
    charging.write_text(json.dumps(document))
    assert stagebook("waves", charging, "--nets", 't"op', "--at", "0.1", "--csv", "o.csv")[0] == 0
    assert read("o.csv")[0] == ["time", 't"op']
