"""``stagebook margins`` on small circuits. Keys and statuses: the project's own contract for its commands."""

from __future__ import annotations

import json
from collections.abc import Callable
from math import log
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.design.document import Design

from .conftest import part_of

Run = Callable[..., tuple[int, str, str]]

CHECK_KEYS = {
    *("id", "number", "title", "stage", "part", "sequence", "demand", "capability", "unit", "limits", "low", "high"),
    *("margin", "required", "verdict", "outcome", "reason", "corner", "conditions", "nominal", "hand", "spread"),
}


def computed(stagebook: Run, *arguments: object) -> dict[str, Any]:
    status, out, err = stagebook("margins", *arguments, "--json")
    assert (status, err) == (0, "")
    found: dict[str, Any] = json.loads(out)
    return found


def test_a_spread_that_would_take_too_long_is_of_fewer_lanes_and_says_so(
    stagebook: Run, bell: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("stagebook.engine.studies.effort.MOST_SPREAD", 0.0)
    status, out, err = stagebook("margins", bell, "--lanes", 50_000, "--json")
    assert status == 0
    assert json.loads(out)["lanes"] == 20
    assert err == ("margins: the spread is of 20 lanes: more of them would take over an hour of one processor core\n")


def by_id(found: dict[str, Any]) -> dict[str, dict[str, Any]]:
    return {check["id"]: check for check in found["checks"]}


def test_a_latch_with_timer_and_sounder_as_json(stagebook: Run, bell: Path) -> None:
    found = computed(stagebook, bell, "--lanes", 24, "--seed", 7)
    assert (found["design"], found["revision"], found["lanes"], found["seed"]) == ("bell", None, 24, 7)
    assert found["content"] == Design.load(bell.read_bytes()).content
    assert isinstance(found["engine"], str)
    assert found["seconds"] > 0
    checks = by_id(found)
    assert len(checks) == len(found["checks"])
    assert {"latch_hold:latch:Q1", "supply_slew:latch:Q2", "arrival:timer:C1", "duration:driver:LS1"} <= set(checks)
    for name, check in checks.items():
        assert set(check) >= CHECK_KEYS, name
        slug, stage, part = name.split(":")
        assert (stage, part) == (check["stage"], check["part"])
        assert slug
        assert check["spread"] is None or set(check["spread"]) == {"p05", "p50", "p95", "passing", "interval"}
        if check["limits"] is None:
            # The convention of this project: m = 1 - D/C, -1 where C <= 0 or the event did not happen.
            assert (check["low"], check["high"]) == (None, None)
            if check["margin"] not in (-1.0, 1.0):
                assert check["margin"] == pytest.approx(1 - check["demand"] / check["capability"])
        else:
            assert (check["demand"], check["capability"]) == (None, None)
        expected = "FAIL" if check["margin"] < 0 else "PASS" if check["margin"] >= check["required"] else "THIN"
        assert check["verdict"] == expected
        assert check["margin"] <= check["nominal"] + 1e-9
        assert (check["reason"] is not None) == (check["verdict"] == "FAIL")


def test_the_duration_is_that_of_an_rc_timer(stagebook: Run, bell: Path) -> None:
    """t = RC ln(V / (V - V_threshold)), the first-order charging law of any circuits textbook; the threshold lies a
    base-emitter voltage above half the rail, 0.5 V within 0.1 V at so small a current (common practice, no source)."""
    low, high = (100e3 * 47e-6 * log(5.93 / (5.93 / 2 - v_be)) for v_be in (0.4, 0.6))
    duration = by_id(computed(stagebook, bell, "--lanes", 0))["duration:driver:LS1"]
    lower, upper = duration["limits"]
    assert (lower, upper) == (2.0, 5.0)
    nominal = upper - duration["nominal"] * (upper - lower) / 2
    assert low < nominal < high


def test_base_overdrive_is_that_of_the_hand_formula(stagebook: Run, written: Path) -> None:
    """1 - I_C/h_FE over the base current net of the base-emitter resistor: common practice, no source. The class
    gives h_FE from 100 and V_BE up to 0.72 V at 10 mA; 0.1 allows for temperature and the contact."""
    base_current = (4.0 - 0.72) / 1.05e3 - 0.72 / 9.5e3
    check = by_id(computed(stagebook, written, "--lanes", 0))["base_overdrive:driver:Q1"]
    assert check["margin"] == pytest.approx(1 - 40e-3 / 100 / base_current, abs=0.1)
    assert check["conditions"]["supply"] == 4.0
    assert check["conditions"]["ambient"] == 0.0
    assert "low supply" in check["corner"]


def test_no_lanes_no_spread(stagebook: Run, written: Path) -> None:
    found = computed(stagebook, written, "--lanes", 0)
    assert found["lanes"] == 0
    assert all(check["spread"] is None for check in found["checks"])


def test_the_seed_decides_the_spread_and_nothing_else(stagebook: Run, written: Path) -> None:
    one, again, other = (by_id(computed(stagebook, written, "--lanes", 30, "--seed", seed)) for seed in (1, 1, 2))
    assert one == again
    name = "base_overdrive:driver:Q1"
    assert one[name]["spread"]["p50"] != other[name]["spread"]["p50"]
    assert {**one[name], "spread": None} == {**other[name], "spread": None}


def test_the_newest_revision_an_older_one_and_the_draft(
    stagebook: Run, shelve: Callable[..., None], document: dict[str, Any]
) -> None:
    shelve({"R1": "1k"}, {"R1": "1k5"})
    contents = []
    for value in ("1k", "1k5"):
        part_of(document, "R1")["value"] = value
        contents.append(Design.load(document).content)
    newest = computed(stagebook, "buzzer", "--lanes", 0)
    older = computed(stagebook, "buzzer", "--revision", 1, "--lanes", 0)
    draft = computed(stagebook, "buzzer", "--draft", "--lanes", 0)
    assert [found["revision"] for found in (newest, older, draft)] == [2, 1, None]
    assert [found["content"] for found in (newest, older, draft)] == [contents[1], contents[0], contents[1]]


@pytest.mark.parametrize(
    ("changed", "verdict", "status"),
    [
        ({"value": "1k"}, "PASS", 0),
        ({"value": "10k"}, "FAIL", 1),
        ({"value": "4k7"}, "THIN", 0),
        ({"rating": None}, "UNKNOWN", 1),
    ],
)
def test_strict_tells_by_its_status(
    stagebook: Run, document: dict[str, Any], tmp_path: Path, changed: dict[str, str], verdict: str, status: int
) -> None:
    part = part_of(document, "R1")
    part.update(changed)
    for field in [field for field, value in part.items() if value is None]:
        del part[field]
    file = tmp_path / "changed.json"
    file.write_text(json.dumps(document))
    assert stagebook("margins", file, "--lanes", 0, "--strict")[0] == status
    verdicts = {check["verdict"] for check in computed(stagebook, file, "--lanes", 0)["checks"]}
    assert verdict in verdicts
    assert verdicts <= {verdict, "PASS"}


def test_what_is_unknown_has_no_margin_and_names_what_is_missing(
    stagebook: Run, document: dict[str, Any], tmp_path: Path
) -> None:
    del part_of(document, "R1")["rating"]
    file = tmp_path / "changed.json"
    file.write_text(json.dumps(document))
    check = by_id(computed(stagebook, file, "--lanes", 10))["resistor_power:driver:R1"]
    assert (check["verdict"], check["margin"], check["spread"]) == ("UNKNOWN", None, None)
    assert "rating" in check["reason"]


def test_what_never_happens_has_its_words(stagebook: Run, document: dict[str, Any], tmp_path: Path) -> None:
    events = document["sequences"]["alarm"]["events"]
    document["sequences"]["alarm"]["events"] = [event for event in events if event["event"] != "close"]
    file = tmp_path / "silent.json"
    file.write_text(json.dumps(document))
    check = by_id(computed(stagebook, file, "--lanes", 0))["duration:driver:LS1"]
    assert (check["verdict"], check["margin"]) == ("FAIL", -1.0)
    assert "LS1 on" in check["outcome"]
    assert check["reason"]
    said = " ".join(stagebook("margins", file, "--lanes", 0)[1].split())
    assert check["outcome"] in said


def test_the_table_has_room_in_eighty_columns(stagebook: Run, bell: Path) -> None:
    status, out, err = stagebook("margins", bell, "--lanes", 5)
    lines = out.splitlines()
    assert (status, err) == (0, "")
    assert max(map(len, lines)) <= 80
    assert "bell: " in lines[0]
    assert "5 lanes with seed 1" in lines[0]
    figures = [line for line in lines if line[:1] in "X!=?" and line[:1]]
    words = [line.split()[1] for line in figures]
    assert set(words) <= {"PASS", "THIN", "FAIL", "UNKNOWN"}
    assert words.index("THIN") < words.index("PASS")


def test_text_of_a_document_cannot_steer_the_terminal(stagebook: Run, document: dict[str, Any], tmp_path: Path) -> None:
    document["stages"][0]["name"] = "dri\u202ever"
    file = tmp_path / "hostile.json"
    file.write_text(json.dumps(document))
    status, out, _ = stagebook("margins", file, "--lanes", 0)
    assert status == 0
    assert "\u202e" not in out
    assert "<U+202E>" in out


def test_one_margin_explained_as_json(stagebook: Run, written: Path) -> None:
    """h_FE of the lane and the load current divide to the demand; figures as in the hand formula above."""
    status, out, err = stagebook("margins", written, "--explain", "base_overdrive", "--json")
    assert (status, err) == (0, "")
    found = json.loads(out)
    check, why = found["check"], found["explanation"]
    assert check["id"] == why["id"] == "base_overdrive:driver:Q1"
    assert why["margin"] == pytest.approx(check["margin"], abs=1e-9)
    used = {each["what"]: each for each in why["used"]}
    assert used["Q1 gain"]["value"] == 100.0
    assert "from memory" in used["Q1 gain"]["source"]
    assert used["LS1 current"]["source"] == "datasheet"
    base = next(each for each in why["observed"] if each["what"].startswith("current into Q1 base"))
    assert base["value"] == pytest.approx(check["capability"])
    assert base["at"] > 0
    assert why["required"]["source"] == "customary: common practice, from memory"


def test_one_margin_explained_in_words(stagebook: Run, written: Path) -> None:
    status, out, _ = stagebook("margins", written, "--explain", "resistor_power:driver:R1")
    assert status == 0
    assert max(map(len, out.splitlines())) <= 80
    words = " ".join(out.split())
    for expected in (
        "stage driver: resistor power R1",
        "m = 1 - D/C = 1 - ",
        "power of R1",
        "R1 rating 250 mW",
        "derating",
    ):
        assert expected in words


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("resistor_power", "could be several margins; write one of resistor_power:driver:R1"),
        ("base_overdrife:driver:Q1", "is no margin of this design; write one of base_overdrive:driver:Q1"),
    ],
)
def test_a_margin_that_is_not_meant_clearly(stagebook: Run, written: Path, text: str, words: str) -> None:
    status, out, err = stagebook("margins", written, "--explain", text)
    assert (status, out) == (2, "")
    assert words in err
    assert len(err.splitlines()) == 1
