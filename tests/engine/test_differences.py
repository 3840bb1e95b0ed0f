"""Differences between two designs: complete, separable, and told per part. The contract is the project's own."""

from __future__ import annotations

import copy
import json
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from stagebook.engine.design.differences import Change, apply, differences
from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError

EXAMPLE: dict[str, Any] = json.loads(Path(__file__).with_name("example.json").read_text("utf-8"))
REFS = ["R1", "R2", "Q1", "S1"]
STAGES = ["entry", "latch", "driver"]
NETS = ["0V", "supply", "base"]


def some(keys: list[str], values: st.SearchStrategy[Any]) -> st.SearchStrategy[dict[str, Any]]:
    return st.dictionaries(st.sampled_from(keys), values)


def some_of(members: list[Any]) -> st.SearchStrategy[list[Any]]:
    return st.permutations(members).flatmap(lambda order: st.integers(0, len(order)).map(lambda n: list(order[:n])))


def either(*fields: dict[str, Any]) -> st.SearchStrategy[dict[str, Any]]:
    return st.sampled_from([{}, *fields])


parts = st.builds(
    lambda kind, pins, *fields: {"kind": kind, "pins": pins, **{k: v for field in fields for k, v in field.items()}},
    st.sampled_from(["resistor", "npn"]),
    st.fixed_dictionaries({"a": st.sampled_from(NETS)}, optional={"b": st.sampled_from(NETS)}),
    either({"value": "1k"}, {"value": "2k"}, {"data": {"value": "1k", "rating": True}}, {"data": {"rating": 1}}),
    either({"tolerance": "5 %"}, {"tolerance": "1 %"}),
    either({"class": "film"}, {"law": {"forward_gain": 99}}, {"law": {}}),
)
events = st.sampled_from(
    [
        {"at": "0 s", "event": "connect supply"},
        {"at": "1 s", "event": "close", "part": "S1"},
        {"at": "2 s", "event": "open", "part": "S1"},
    ]
)
sequences = st.fixed_dictionaries(
    {"ends": st.sampled_from(["5 s", "6 s"])},
    optional={"events": st.lists(events, max_size=3), "moments": some(["standby"], st.just("1 s"))},
)
requirements = st.builds(
    lambda check, *fields: {"check": check, **{k: v for field in fields for k, v in field.items()}},
    st.sampled_from(["duration", "arrival"]),
    either({"of": "R1"}, {"of": "Q1"}),
    either({"sequence": "alarm"}),
    either({"min": "1 s"}, {"min": "2 s", "level": 3}),
)
strays = [
    {"between": ["a", "b"], "value": "1 pF"},
    {"between": ["b", "c"], "value": "2 pF"},
    {"between": ["c", "a"], "value": "3 pF"},
]


@st.composite
def designs(draw: st.DrawFn) -> Design:
    """Designs out of one small pool, so that any two share some of everything."""
    stages = draw(some_of(STAGES).filter(bool))
    order = draw(some_of(REFS))
    homes = {ref: draw(st.sampled_from(stages)) for ref in order}
    document = {
        "stagebook": 1,
        "name": draw(st.sampled_from(["one", "two"])),
        "sequences": {"alarm": draw(sequences), **draw(some(["dip"], sequences))},
        "stages": [
            {
                "name": name,
                **draw(either({"kind": "latch"}, {"settings": {"hold": "1 mA"}})),
                "roles": draw(some(["driver", "load"], st.sampled_from(REFS))),
                "parts": [{"ref": ref, **draw(parts)} for ref in order if homes[ref] == name],
            }
            for name in stages
        ],
        "strays": [{**stray, **draw(either({"value": "9 pF"}))} for stray in draw(some_of(strays))],
        "requirements": draw(st.lists(requirements, max_size=4)),
        "conditions": draw(some(["supply"], st.sampled_from(["6 V", {"nominal": "6 V", "max": "7 V"}]))),
        "required": draw(some(["duration", "arrival"], st.sampled_from(["5 %", "10 %"]))),
        "derating": draw(some(["voltage"], st.just("0.8"))),
        **draw(either({"purpose": "to test"}, {"purpose": ""})),
        **draw(either({"starts": {}}, {"starts": {"base": "1 V"}})),
    }
    return Design.load(document)


@settings(max_examples=50)
@given(designs(), designs())
def test_all_changes_make_the_new_design_and_none_leave_the_old_one(old: Design, new: Design) -> None:
    changes = differences(old, new)
    assert apply(old, new, changes) == new
    assert apply(old, new, changes).content == new.content
    assert apply(old, new, ()) == old
    assert apply(old, new, ()).content == old.content


@settings(max_examples=50)
@given(designs(), designs())
def test_there_are_differences_exactly_when_the_contents_differ(old: Design, new: Design) -> None:
    changes = differences(old, new)
    assert bool(changes) == (old.content != new.content)
    assert differences(old, old) == ()
    assert len({(change.what, change.kind) for change in changes}) == len(changes)
    for change in changes:
        assert change.before != change.after or change.before is not None
        assert all(text is None or text.isprintable() for text in (change.before, change.after))


@settings(max_examples=50)
@given(designs(), designs(), st.data())
def test_any_subset_gives_a_design_that_lies_between(old: Design, new: Design, data: st.DataObject) -> None:
    changes = differences(old, new)
    subset = [change for change in changes if data.draw(st.booleans())]
    between = apply(old, new, subset)
    for change in changes:
        if change.what not in REFS:
            continue
        here = next((part for part in between.parts if part.ref == change.what), None)
        side = new if change in subset else old
        there = next((part for part in side.parts if part.ref == change.what), None)
        if change.kind in ("added", "removed"):
            assert here == there
        elif change.kind == "value":
            assert here is not None
            assert there is not None
            assert here.value == there.value


def changed(edit: Any) -> tuple[Change, ...]:
    """The differences that an edit of the example makes."""
    document = copy.deepcopy(EXAMPLE)
    edit(document)
    return differences(Design.load(EXAMPLE), Design.load(document))


def part(document: dict[str, Any], ref: str) -> dict[str, Any]:
    found: dict[str, Any] = next(part for part in document["stages"][0]["parts"] if part["ref"] == ref)
    return found


def test_changes_of_one_part_are_grouped_into_value_datum_and_net() -> None:
    def edit(document: dict[str, Any]) -> None:
        part(document, "R7").update(value="1k", tolerance="1 %", rating="0.5 W")
        part(document, "R7")["pins"]["b"] = "b2"
        part(document, "Q3")["data"] = {"gain": "100", "hot_leakage": {"max": "5 uA"}}

    assert changed(edit) == (
        Change("R7", "value", "680R", "1k"),
        Change("R7", "datum", "rating 0.25 W, tolerance 5 %", "rating 0.5 W, tolerance 1 %"),
        Change("R7", "net", "b base", "b b2"),
        Change("Q3", "datum", None, "data gain 100, hot_leakage max 5 uA"),
    )


def test_parts_that_come_and_go_and_change_kind() -> None:
    def edit(document: dict[str, Any]) -> None:
        document["stages"][0]["parts"].remove(part(document, "R8"))
        part(document, "S1")["kind"] = "resistor"
        document["stages"].append(
            {
                "name": "timer",
                "parts": [{"ref": "C4", "kind": "capacitor", "pins": {"a": "low", "b": "0V"}, "value": "1u"}],
            }
        )

    assert changed(edit) == (
        Change("S1", "net", "contact, a supply, b call", "resistor, a supply, b call"),
        Change("R8", "removed", "resistor, 10k, a base, b 0V", None),
        Change("C4", "added", None, "capacitor, 1u, a low, b 0V"),
        Change("stage timer", "added", None, "name timer"),
    )


def test_everything_that_is_not_a_part() -> None:
    def edit(document: dict[str, Any]) -> None:
        document["name"] = "other"
        document["purpose"] = "to try"
        document["conditions"]["supply"]["max"] = "7 V"
        document["stages"][0]["roles"]["load"] = "R7"
        document["strays"][0]["value"] = "9 pF"
        document["sequences"]["alarm"]["events"][2]["at"] = "4 s"
        document["sequences"]["dip"] = {"ends": "1 s"}
        document["requirements"][0]["max"] = "3 s"
        document["required"] = {"duration": "20 %"}
        document["derating"] = {"resistor_power": "0.5"}

    assert changed(edit) == (
        Change("design name", "datum", "example", "other"),
        Change("design purpose", "datum", "sounds while a push button is held", "to try"),
        Change("conditions.supply", "condition", "max 6.4 V", "max 7 V"),
        Change(
            "sequence alarm", "sequence", "events at 3 s, event open, part S1", "events at 4 s, event open, part S1"
        ),
        Change("roles driver", "datum", "load LS1", "load R7"),
        Change("stray base supply", "value", "value 5 pF", "value 9 pF"),
        Change("requirement duration LS1", "requirement", "max 2.2 s", "max 3 s"),
        Change("sequence dip", "sequence", None, "ends 1 s"),
        Change("required duration", "requirement", None, "20 %"),
        Change("derating resistor_power", "requirement", None, "0.5"),
    )


def test_order_alone_is_a_change() -> None:
    def edit(document: dict[str, Any]) -> None:
        parts = document["stages"][0]["parts"]
        parts[1], parts[2] = parts[2], parts[1]

    assert changed(edit) == (Change("order of parts in driver", "datum", "S1, R7, R8, Q3, LS1", "S1, R8, R7, Q3, LS1"),)


def test_what_names_a_part_goes_with_it() -> None:
    document = copy.deepcopy(EXAMPLE)
    document["stages"][0]["parts"].remove(part(document, "LS1"))
    document["stages"][0]["parts"].remove(part(document, "S1"))
    document["stages"][0]["roles"] = {}
    document["requirements"] = []
    document["sequences"]["alarm"]["events"] = []
    document["purpose"] = "nothing sounds"
    old, new = Design.load(EXAMPLE), Design.load(document)
    result = apply(old, new, [change for change in differences(old, new) if change.kind == "removed"])
    assert result.stages[0].roles == {"driver": "Q3", "base_resistor": "R7"}
    assert result.requirements == ()
    assert [event.event for event in result.sequences["alarm"].events] == ["connect supply"]
    assert result.purpose == old.purpose


def test_a_change_of_other_designs_is_refused() -> None:
    design = Design.load(EXAMPLE)
    with pytest.raises(DesignError, match="R9: no such change"):
        apply(design, design, [Change("R9", "value", "1k", "2k")])
