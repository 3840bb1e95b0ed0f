"""Inspection of a design before it is computed. The rules are the project's own; kinds here are small stand-ins.

With the stand-ins a rule is tested apart from what the real kinds happen to read.
"""

from __future__ import annotations

import copy
import json
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.circuit.inspection import found_faults, inspect
from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.parts.kind import Entry, Kind
from stagebook.engine.parts.suitability import FLAG, TEXT

EXAMPLE: dict[str, Any] = json.loads(Path(__file__).with_name("example.json").read_text("utf-8"))


def kind(name: str, pins: str, paths: str = "", **entries: Any) -> Kind:
    sets = tuple(tuple(each.split()) for each in pins.split("|"))
    pairs = tuple((one, other) for one, other in (pair.split("-") for pair in paths.split()))
    return Kind(name, ("X",), sets, pairs, lambda part, builder: None, **entries)


OHMS = Entry("ohm", needed=True)
KINDS = {
    each.name: each
    for each in (
        kind("resistor", "a b", "a-b", fields={"value": OHMS, "tolerance": Entry("%"), "rating": Entry("W")}),
        kind("capacitor", "a b|plus minus", fields={"value": Entry("F", needed=True), "leakage": Entry("A")}),
        kind("contact", "a b", "a-b", fields={"operated_by": Entry(TEXT), "resistance": Entry("ohm")}),
        kind("coil", "a b", "a-b", data={"resistance": OHMS}),
        kind(
            "npn",
            "collector base emitter",
            "base-emitter collector-base",
            data={"gain": Entry("", needed=True)},
            law={"saturation_current": Entry("A", needed=True), "collector_junction": Entry(FLAG)},
        ),
        kind("sounder", "plus minus", "plus-minus", data={"current": Entry("A"), "operating_minimum": Entry("V")}),
        kind("generator", "plus minus", "plus-minus", fields={"waveform": Entry(TEXT), "resistance": Entry("ohm")}),
        kind("probe", "a b", "a-b", fields={"value": OHMS, "follows": Entry(TEXT)}),
    )
}


def faults(edit: Any) -> list[str]:
    """What inspection finds in the example after an edit of its document."""
    document = copy.deepcopy(EXAMPLE)
    edit(document)
    found = list(found_faults(Design.load(document), KINDS))
    assert all(line.isprintable() and ("write" in line or "leave" in line) for line in found)
    return found


def add(**part: Any) -> Any:
    """An edit that adds a part to the driver stage."""
    return lambda document: document["stages"][0]["parts"].append(part)


def put(*path: Any, to: Any) -> Any:
    """An edit that writes one place of the document; ``...`` takes it out."""

    def edit(document: Any) -> None:
        *inner, last = path
        for step in inner:
            document = document[step]
        if to is ...:
            del document[last]
        else:
            document[last] = to

    return edit


PARTS = ("stages", 0, "parts")
ALARM = ("sequences", "alarm")
GENERATOR = {"ref": "G1", "kind": "generator", "waveform": {"steps": [["0 s", "1 V"]]}}


def test_the_example_of_the_document_contract_is_sound() -> None:
    assert faults(lambda document: None) == []
    inspect(Design.load(EXAMPLE), KINDS)


def test_inspect_raises_the_first_fault_and_counts_the_others() -> None:
    document = copy.deepcopy(EXAMPLE)
    add(ref="R9", kind="resistr", pins={"a": "base", "b": "0V"})(document)
    add(ref="R10", kind="resistor", pins={"a": "base", "b": "0V"})(document)
    with pytest.raises(CircuitError) as refusal:
        inspect(Design.load(document), KINDS)
    words = "stage driver, part R9, field kind: there is no kind 'resistr'; write 'resistor' (and 1 more)"
    assert str(refusal.value) == words


R7, Q3 = "stage driver, part R7, field ", "stage driver, part Q3, field "


@pytest.mark.parametrize(
    ("edit", "expected"),
    [
        (
            put(*PARTS, 1, "pins", to={"a": "call", "plus": "base"}),
            R7 + "pins: pins a, plus are not those of a resistor",
        ),
        (put(*PARTS, 1, "value", to=...), R7 + 'value: \'value\' is missing; write "value": "4k7"'),
        (put(*PARTS, 1, "value", to="4q7"), R7 + "value: '4q7' "),
        (put(*PARTS, 1, "value", to="4 V"), R7 + "value: '4 V' is a voltage where a resistance is asked for; write"),
        (
            put(*PARTS, 1, "tempco", to="50 ppm/K"),
            R7 + "tempco: a resistor has no 'tempco'; leave it out (it has value",
        ),
        (put(*PARTS, 1, "data", to={"ratng": "1 W"}), R7 + "data.ratng: a resistor has no 'ratng'; write 'rating'"),
        (put(*PARTS, 3, "class", to=...), Q3 + 'data.gain: \'gain\' is missing; write "gain": "200"'),
        (put(*PARTS, 3, "law", to={"collector_junction": 1}), Q3 + "law.collector_junction: 1 is neither yes nor no"),
        (
            put(*PARTS, 3, "law", to={"collector_junction": False}),
            Q3 + "law.saturation_current: 'saturation_current' is",
        ),
        (put(*PARTS, 3, "law", to={"gain": 3}), Q3 + "law.gain: an npn has no 'gain'"),
        (
            put(*PARTS, 4, "data", "current", "max", to="100 mA"),
            "part LS1, field data.current: the limits are not in order; write min, typical and max",
        ),
        (
            add(
                ref="C1",
                kind="capacitor",
                pins={"plus": "low", "minus": "0V"},
                value="1u",
                leakage={"specified": "3 V"},
            ),
            "part C1, field leakage.specified: '3 V' is a voltage where a current is asked for",
        ),
    ],
)
def test_parts_that_do_not_suit_their_kind(edit: Any, expected: str) -> None:
    assert any(expected in line for line in faults(edit))


def test_a_law_or_a_class_makes_data_superfluous() -> None:
    def edit(document: dict[str, Any]) -> None:
        del document["stages"][0]["parts"][3]["class"]
        document["stages"][0]["parts"][3]["law"] = {"saturation_current": "1e-14 A", "collector_junction": False}

    assert faults(edit) == []


@pytest.mark.parametrize(
    ("edit", "expected"),
    [
        (
            add(ref="R9", kind="resistor", pins={"a": "base", "b": "nowhere"}, value="1k"),
            ["stage driver, part R9, pin b: nothing else is on net 'nowhere'; write the net it belongs to, or 0V"],
        ),
        (
            lambda document: [
                add(ref="C1", kind="capacitor", pins={"a": "base", "b": "mid"}, value="1u")(document),
                add(ref="C2", kind="capacitor", pins={"plus": "mid", "minus": "0V"}, value="1u")(document),
            ],
            ["net mid (C1 b, C2 plus) has no path for direct current to 0V or supply; write a part that conducts"],
        ),
        (
            lambda document: [
                add(ref="C1", kind="capacitor", pins={"a": "base", "b": "mid"}, value="1u")(document),
                add(ref="R9", kind="resistor", pins={"a": "mid", "b": "end"}, value="1k")(document),
                add(ref="C2", kind="capacitor", pins={"a": "end", "b": "0V"}, value="1u")(document),
            ],
            ["net mid with end (C1 b, R9 a) has no path for direct current to 0V or supply; write"],
        ),
        (
            lambda document: [put(*PARTS, i, "pins", p, to="gnd")(document) for i, p in ((2, "b"), (3, "emitter"))],
            ["no pin is on 0V; write '0V' as the net of the return"],
        ),
        (put("conditions", "supply", to=...), ["field conditions.supply is missing; write"]),
        (
            add(**GENERATOR, pins={"plus": "supply", "minus": "0V"}),
            [],
        ),
        (
            lambda document: [
                put("conditions", "source_resistance", to="0R")(document),
                add(**GENERATOR, pins={"plus": "supply", "minus": "0V"})(document),
            ],
            ["part G1 is an ideal source in parallel with the supply; write a resistor between them"],
        ),
        (
            lambda document: [
                add(**GENERATOR, pins={"plus": "low", "minus": "0V"})(document),
                add(**{**GENERATOR, "ref": "G2"}, pins={"plus": "base", "minus": "0V"})(document),
                add(ref="R9", kind="resistor", pins={"a": "low", "b": "base"}, value="0R")(document),
            ],
            ["part G2 is an ideal source in parallel with part G1; write"],
        ),
        (
            lambda document: [
                add(**GENERATOR, pins={"plus": "low", "minus": "0V"})(document),
                add(**{**GENERATOR, "ref": "G2"}, resistance="50R", pins={"plus": "low", "minus": "0V"})(document),
            ],
            [],
        ),
        (
            add(**GENERATOR, pins={"plus": "low", "minus": "low"}),
            ["part G1 is an ideal source shorted; write"],
        ),
        (add(ref="R9", kind="resistor", pins={"a": "base", "b": "call"}, value="0R"), []),
    ],
)
def test_nets(edit: Any, expected: list[str]) -> None:
    found = faults(edit)
    assert len(found) == len(expected)
    for line, words in zip(found, expected, strict=True):
        assert line.startswith(words)


def test_a_net_between_two_contacts_is_not_floating() -> None:
    """A contact conducts through its insulation when it is open."""

    def edit(document: dict[str, Any]) -> None:
        add(ref="S2", kind="contact", pins={"a": "supply", "b": "mid"})(document)
        add(ref="C1", kind="capacitor", pins={"a": "mid", "b": "0V"}, value="1u")(document)

    assert faults(edit) == []


@pytest.mark.parametrize(
    ("edit", "expected"),
    [
        (put("stages", 0, "roles", "load", to="LS2"), "stage driver, role load: there is no part 'LS2'; write LS1"),
        (
            put("strays", 0, "between", to=["supply", "bse"]),
            "stray 1, field between: there is no net 'bse'; write base",
        ),
        (put("starts", to={"bas": "1 V"}), "field starts: there is no net 'bas'; write base"),
        (put("starts", to={"0V": "1 V"}), "field starts: 0V is the return and stands at 0 V; leave it out"),
        (put(*ALARM, "starts", to={"bas": "1 V"}), "sequence alarm, field starts: there is no net 'bas'; write base"),
        (
            put(*ALARM, "events", 1, "part", to="S2"),
            "sequence alarm, event 2 (close), field part: there is no part 'S2'",
        ),
        (put(*ALARM, "events", 1, "part", to="R7"), "field part: R7 is a resistor, not a contact; write S1"),
        (
            put(
                *ALARM,
                "events",
                1,
                to={"at": "1 s", "event": "inject", "net": "bse", "charge": "1 pC", "width": "1 us"},
            ),
            "event 2 (inject), field net: there is no net 'bse'; write base",
        ),
        (
            put(*ALARM, "events", 1, to={"at": "1 s", "event": "set", "part": "B1", "to": "1k"}),
            "event 2 (set), field part: there is no part or followed quantity 'B1'; write ",
        ),
        (put(*ALARM, "events", 1, "at", to="6 s"), "event 2 (close), field at: it is over 1 s after the end; write"),
        (
            put(*ALARM, "events", 1, to={"at": "4 s", "event": "dip", "to": "3 V", "for": "2 s"}),
            "event 2 (dip), field at: it is over 1 s after the end; write an earlier time or a later 'ends'",
        ),
        (put(*ALARM, "moments", "standby", to="6 s"), "sequence alarm, moment standby: 6 s lies after the end at 5 s"),
        (
            put(*ALARM, "moments", "sounding", "after", to="LS2 on"),
            "sequence alarm, moment sounding, field after: there is no part 'LS2'; write LS1",
        ),
        (
            put(*ALARM, "moments", "sounding", "after", to="LS1 in"),
            "field after: LS1 is a sounder, and only a coil goes in and out; write one after adding a coil",
        ),
        (put(*ALARM, "moments", "sounding", "after", to="bse above 2 V"), "there is no net 'bse'; write base"),
        (
            put("requirements", 0, "of", to="LS2"),
            "requirement 1 (duration LS2), field of: there is no part, net or stage",
        ),
        (put("requirements", 0, "stage", to="drver"), "field stage: there is no stage 'drver'; write driver"),
        (put("requirements", 0, "sequence", to="alrm"), "field sequence: there is no sequence 'alrm'; write alarm"),
        (put("requirements", 0, "from", to="LS2 on"), "field from: there is no part 'LS2'; write LS1"),
        (put("requirements", 0, "to", to="silence"), "field to: 'silence' names no event; write 'LS1 on'"),
        (
            add(ref="S2", kind="contact", pins={"a": "supply", "b": "base"}, operated_by="K1"),
            "stage driver, part S2, field operated_by: there is no coil 'K1'; write one after adding a coil",
        ),
    ],
)
def test_names_that_are_not_there(edit: Any, expected: str) -> None:
    found = faults(edit)
    assert len(found) == 1
    assert expected in found[0]


def test_events_that_only_fit_a_powered_design() -> None:
    def edit(document: dict[str, Any]) -> None:
        for part in document["stages"][0]["parts"]:
            part["pins"] = {pin: "feed" if net == "supply" else net for pin, net in part["pins"].items()}
        document["strays"] = []
        add(**GENERATOR, pins={"plus": "feed", "minus": "0V"})(document)

    assert faults(edit) == [
        "sequence alarm, event 1 (connect supply), no pin is on 'supply', so nothing would feel it;"
        " write 'supply' as a net or leave the event out"
    ]


def test_what_may_be_set_and_what_a_requirement_may_name() -> None:
    def edit(document: dict[str, Any]) -> None:
        add(ref="B1", kind="probe", pins={"a": "base", "b": "0V"}, value="1M", follows="dampness")(document)
        events = document["sequences"]["alarm"]["events"]
        events.append({"at": "2 s", "event": "set", "part": "dampness", "to": "20 %"})
        events.append({"at": "2 s", "event": "ramp", "part": "B1", "to": "200k", "for": "3 s"})
        document["requirements"][0].update({"from": "standby", "to": "net base below 0.5 V", "of": "driver"})

    assert faults(edit) == []


def test_the_level_of_a_probe_is_a_resistance() -> None:
    def edit(document: dict[str, Any]) -> None:
        add(ref="B1", kind="probe", pins={"a": "base", "b": "0V"}, value="1M")(document)
        document["sequences"]["alarm"]["events"].append({"at": "2 s", "event": "set", "part": "B1", "to": "2 V"})

    assert faults(edit) == [
        "sequence alarm, event 4 (set), field to: '2 V' is a voltage where a resistance is asked for;"
        " write it like 4k7 or 330 ohm"
    ]


def test_an_operated_contact_is_not_for_events() -> None:
    def edit(document: dict[str, Any]) -> None:
        add(ref="K1", kind="coil", pins={"a": "supply", "b": "low"}, data={"resistance": "400R"})(document)
        document["stages"][0]["parts"][0]["operated_by"] = "K1"

    assert all("field part: S1 is operated by K1; write one after adding a contact" in line for line in faults(edit))
    assert len(faults(edit)) == 2
