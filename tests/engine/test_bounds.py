"""What a document may hold at most: sizes, counts, ranges, length of sequences, work of a lane.

The bounds are the project's own. A refusal is one line with a remedy, and comes at once.
"""

from __future__ import annotations

import copy
import json
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from stagebook.engine.circuit.circuit import build
from stagebook.engine.circuit.inspection import inspect
from stagebook.engine.circuit.wave import Wave
from stagebook.engine.circuit.work_inspection import MOST_COURSE_POINTS, MOST_MOVES, course_points
from stagebook.engine.design.document import MOST_PARTS, Design
from stagebook.engine.errors import EngineError
from stagebook.engine.studies.evaluate import asks_of

EXAMPLE: dict[str, Any] = json.loads(Path(__file__).with_name("example.json").read_text("utf-8"))
AT_ONCE = 5.0
"""Seconds, on a busy machine; what was refused slowly took minutes."""

Spoil = Callable[[dict[str, Any]], None]


def resistors(count: int, first: int = 100) -> list[dict[str, Any]]:
    return [
        {"ref": f"R{first + k}", "kind": "resistor", "pins": {"a": "base", "b": "0V"}, "value": "1M"}
        for k in range(count)
    ]


def stages(*parts: list[dict[str, Any]]) -> Spoil:
    return lambda document: document["stages"].extend({"name": f"s{k}", "parts": p} for k, p in enumerate(parts))


def alarm(**fields: Any) -> Spoil:
    return lambda document: document["sequences"]["alarm"].update(fields)


def generator(**waveform: Any) -> Spoil:
    pins = {"plus": "tone", "minus": "0V"}
    tone = {"ref": "G1", "kind": "generator", "pins": pins, "waveform": waveform}
    feed = {"ref": "R90", "kind": "resistor", "pins": {"a": "tone", "b": "base"}, "value": "1M"}
    return lambda document: document["stages"].append({"name": "tone", "parts": [tone, feed]})


def bounces(count: int, times: int) -> list[dict[str, Any]]:
    bounce = {"for": "9 ms", "times": times}
    return [
        {"at": f"{10 * k + 1} ms", "event": ("open", "close")[k % 2], "part": "S1", "bounce": bounce}
        for k in range(count)
    ]


CASES: dict[str, tuple[Spoil, str]] = {
    "parts in all": (stages(resistors(200), resistors(200, 500)), "405 parts in all; write at most 400"),
    "parts of a stage": (stages(resistors(201)), "field parts: there are 201 entries; write at most 200"),
    "stages": (stages(*[[]] * 60), "there are 61 entries; write at most 60"),
    "one designator for all": (
        stages(*[[resistors(1, 8)[0]] * 190] * 2),
        "381 parts have it (in driver, s0, s0, s0, s0, s0 ...)",
    ),
    "fields of a requirement": (
        lambda document: document["requirements"][0].update({f"x{k}": 1 for k in range(21)}),
        "there are 21 fields that no check reads; write at most 20",
    ),
    "the name of a field": (
        lambda document: document["requirements"][0].update({"x\x9b\u202e" + "y" * 5000: 1}),
        "unknown field 'x\\x9b\\u202eyyyy",
    ),
    "a field a thousand times over": (
        lambda document: document["requirements"][0].update({f"x{k}": 1 for k in range(60_000)}),
        "write at most 20",
    ),
    "refused parts": (
        lambda document: document["stages"][0].update(parts=[None] * 90_000),
        "null cannot stand here; write an object",
    ),
    "a field of a megabyte": (lambda document: document.update({"x" * 900_000: 1}), "unknown field"),
    "number": (
        lambda document: document["stages"][0]["parts"][1].update(law={"gain": 1e31}),
        "too large; write one up to 1e+30",
    ),
    "value": (
        lambda document: document["stages"][0]["parts"][1].update(value="1e21 ohm"),
        "far outside of what a part can be",
    ),
    "events": (alarm(events=bounces(201, 1)), "there are 201 entries; write at most 200"),
    "bounces": (alarm(events=bounces(11, 100)), "2211 moves of 3 contacts, levels and sources; write at most 2000"),
    "bounces of all sequences": (
        lambda document: document["sequences"].update(
            {f"s{k}": {"ends": "5 s", "events": bounces(9, 100)} for k in range(6)}
        ),
        "in all; write at most 10000",
    ),
    "courses": (
        lambda document: (
            stages([{"ref": f"S{k}", "kind": "contact", "pins": {"a": "base", "b": "0V"}} for k in range(2, 60)])(
                document
            ),
            alarm(events=bounces(3, 100))(document),
        ),
        "603 moves of 61 contacts, levels and sources; write at most 491",
    ),
    "steps of a generator": (
        generator(steps=[[k * 1e-3, 0] for k in range(2001)]),
        "there are 2001 entries; write at most 2000",
    ),
    "a sine": (
        generator(sine={"amplitude": "1 V", "frequency": "1 MHz"}),
        "generator G1 swings 5e+06 times until 5 s; write a lower frequency or an earlier 'ends'",
    ),
    "a sine in numbers": (generator(sine={"amplitude": 1, "frequency": 1e30}), "swings 5e+30 times"),
}


@pytest.mark.parametrize(("spoil", "says"), CASES.values(), ids=CASES)
def test_what_is_too_much_is_refused_at_once(spoil: Spoil, says: str) -> None:
    document = copy.deepcopy(EXAMPLE)
    spoil(document)
    text = json.dumps(document)
    began = time.perf_counter()
    with pytest.raises(EngineError) as refusal:
        inspect(Design.load(text))
    assert time.perf_counter() - began < AT_ONCE
    assert says in str(refusal.value)
    assert str(refusal.value).isprintable()
    assert len(str(refusal.value)) < 700


def test_a_field_that_stands_twice_among_many_is_found_at_once() -> None:
    fields = ",".join(f'"a{k}":1' for k in range(60_000))
    began = time.perf_counter()
    with pytest.raises(EngineError, match="the field 'a59999' stands twice"):
        Design.load("{" + fields + ',"a59999":2}')
    assert time.perf_counter() - began < AT_ONCE


def test_what_is_within_the_bounds_is_taken() -> None:
    document = copy.deepcopy(EXAMPLE)
    stages(resistors(200), resistors(MOST_PARTS - 207, 500))(document)
    alarm(events=bounces(9, 100), ends="5 s")(document)
    generator(sine={"amplitude": "1 V", "frequency": "1.5 kHz"})(document)
    inspect(Design.load(document))


def test_the_points_of_a_lane_are_counted() -> None:
    document = copy.deepcopy(EXAMPLE)
    alarm(events=[{"at": "0 s", "event": "connect supply"}, *bounces(2, 10)])(document)
    assert course_points(Design.load(document)) == 3 * (1 + 2 * 21)
    assert MOST_MOVES * 15 == MOST_COURSE_POINTS


def test_a_long_course_is_made_in_a_time_that_grows_with_its_length() -> None:
    """Each step used to look at all points before it: 4,000 of them took most of a minute."""
    wave = Wave(0.0)
    began = time.perf_counter()
    for k in range(4_000):
        wave.step(k * 1e-3, float(k % 2))
    assert time.perf_counter() - began < 2.0
    wave.step(1.0005, 9.0)  # what was to happen after that is overridden
    assert float(np.max(wave.times)) == 1.0005
    assert wave.values[-1] == 9.0


@pytest.mark.parametrize("name", ["a\x9b2Jb", "a\x85b", "\x80", "a\x1bb", "a\x7fb", "a\nb"])
def test_no_name_or_text_holds_a_control_character(name: str) -> None:
    """C0, DEL and the C1 set (ECMA-48): 0x9B alone begins a command to a terminal."""
    for place in ("name", "purpose"):
        with pytest.raises(EngineError) as refusal:
            Design.load({**EXAMPLE, place: name})
        assert str(refusal.value).isprintable()
    document = copy.deepcopy(EXAMPLE)
    document["stages"][0]["parts"][1]["pins"]["a"] = name
    with pytest.raises(EngineError):
        Design.load(document)


def test_a_value_that_nothing_could_be_divided_by_is_refused_or_taken_as_the_least() -> None:
    """What the fuzzing of 20,000 documents found: divisions by a rating, a rise and a battery of nothing."""
    capacitor = {"ref": "C1", "kind": "capacitor", "pins": {"plus": "base", "minus": "0V"}, "value": "10u"}
    document = copy.deepcopy(EXAMPLE)
    document["stages"][0]["parts"].append({**capacitor, "voltage": "0 V"})
    with pytest.raises(EngineError, match="part C1, voltage: a rating of 0 V cannot be; write it like '16 V'"):
        build(Design.load(document))
    bell = json.loads((Path(__file__).parents[1] / "tui" / "commands" / "bell.json").read_text("utf-8"))
    bell["sequences"]["alarm"]["events"][0]["rise"] = "0 s"
    assert asks_of(build(Design.load(bell)))
    bell["requirements"][0]["min"] = "3 H"
    with pytest.raises(EngineError, match="requirement duration: '3 H' is an inductance where a time is asked for"):
        asks_of(build(Design.load(bell)))
