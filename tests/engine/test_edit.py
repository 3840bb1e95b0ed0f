"""Edits of a design: each makes a new document, leaves the old one alone, and refuses in one line.

Preferred values: IEC 60063. Which series suits which tolerance: IEC 60063 as well; for values without a tolerance
common practice, no source.
"""

from __future__ import annotations

import copy
import json
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine import edit
from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.parts.kind import Entry, Kind

EXAMPLE: dict[str, Any] = json.loads(Path(__file__).with_name("example.json").read_text("utf-8"))


def expands_to_nothing(part: Any, builder: Any) -> None:
    """Stands in for the primitives of a part, which edits never ask for."""


@pytest.fixture(autouse=True)
def stand_in_kinds(monkeypatch: pytest.MonkeyPatch) -> None:
    """Edits ask a kind only for the units of its fields; a resistor says enough."""
    fields = {"value": Entry("ohm"), "tolerance": Entry("%")}
    resistor = Kind("resistor", ("R",), (("a", "b"),), (("a", "b"),), expands_to_nothing, fields=fields)
    monkeypatch.setattr(edit, "kinds", lambda: {"resistor": resistor})


def design() -> Design:
    return Design.load(EXAMPLE)


def with_dip(design: Design) -> Design:
    return edit.with_sequence(design, "dip", {"ends": "1 s"})


def dumped(result: Design, ref: str) -> dict[str, Any]:
    parts = [part for stage in result.dump()["stages"] for part in stage["parts"]]
    found: dict[str, Any] = next(part for part in parts if part["ref"] == ref)
    return found


def test_a_value_is_kept_as_typed_and_the_old_design_stays() -> None:
    old = design()
    new = edit.with_value(old, "R8", "12 kohm")
    assert new.part("R8").value == "12 kohm"
    assert old.dump() == EXAMPLE
    assert edit.with_value(new, "R8", "10k").dump() == EXAMPLE


@pytest.mark.parametrize(
    ("ref", "field", "text", "where", "expected"),
    [
        ("R7", "tolerance", "1 %", ["tolerance"], "1 %"),
        ("R7", "tolerance", None, ["tolerance"], None),
        ("R7", "pins.b", "mid", ["pins", "b"], "mid"),
        ("LS1", "current.max", "250 mA", ["data", "current", "max"], "250 mA"),
        ("LS1", "operating_minimum", "4 V", ["data", "operating_minimum"], "4 V"),
        ("LS1", "operating_minimum.max", "4 V", ["data", "operating_minimum"], {"typical": "3 V", "max": "4 V"}),
        ("LS1", "weight", "20", ["data", "weight"], "20"),
        ("Q3", "law.forward_gain", 99, ["law"], {"forward_gain": 99}),
        ("R7", "rating", "0.25 W", ["rating"], "0.25 W"),
    ],
)
def test_a_field_is_written_where_the_part_has_it(
    ref: str, field: str, text: Any, where: list[str], expected: Any
) -> None:
    found: Any = dumped(edit.with_field(design(), ref, field, text), ref)
    for step in where:
        found = found.get(step)
    assert found == expected


def test_taking_the_last_datum_out_leaves_no_empty_object() -> None:
    with_law = edit.with_field(design(), "Q3", "law.forward_gain", 99)
    assert edit.with_field(with_law, "Q3", "law.forward_gain", None).dump() == EXAMPLE


@pytest.mark.parametrize(
    ("tolerance", "steps", "expected"),
    [
        ("5 %", 1, "11k"),
        ("5 %", -1, "9k1"),
        ("10 %", 1, "12k"),
        ("1 %", 1, "10k2"),
        (None, 2, "12k"),
        ("20 %", -1, "6k8"),
    ],
)
def test_a_value_steps_through_the_series_of_its_tolerance(tolerance: str | None, steps: int, expected: str) -> None:
    """IEC 60063: E24 for 5 %, E12 for 10 %, E96 for 1 %, E6 for 20 %; E24 for a resistor without a tolerance."""
    start = edit.with_field(design(), "R8", "tolerance", tolerance)
    assert edit.stepped_value(start, "R8", steps).part("R8").value == expected


def test_a_part_is_added_and_written_anew_in_its_place() -> None:
    added = edit.with_part(design(), "driver", {"ref": "C1", "kind": "capacitor", "pins": {"a": "base", "b": "0V"}})
    assert [part.ref for part in added.parts] == ["S1", "R7", "R8", "Q3", "LS1", "C1"]
    changed = edit.with_part(added, "driver", {**dumped(added, "R7"), "value": "1k"})
    assert [part.ref for part in changed.parts] == [part.ref for part in added.parts]
    assert changed.part("R7").value == "1k"


def test_a_part_goes_with_all_that_is_about_it() -> None:
    without = edit.without_part(edit.without_part(design(), "LS1"), "S1")
    assert without.stages[0].roles == {"driver": "Q3", "base_resistor": "R7"}
    assert [event.event for event in without.sequences["alarm"].events] == ["connect supply"]
    assert set(without.sequences["alarm"].moments) == {"standby"}
    assert without.requirements == ()


def test_a_stage_goes_with_its_parts() -> None:
    more = edit.with_stage(
        design(), {"name": "filter", "parts": [{"ref": "C1", "kind": "capacitor", "pins": {"a": "x"}}]}
    )
    assert more.stage_of("C1").name == "filter"
    assert edit.without_stage(more, "filter") == design()
    assert edit.without_stage(design(), "driver").requirements == ()


def test_conditions_roles_sequences_strays_and_tables() -> None:
    new = edit.with_condition(design(), "supply.min", "3.5 V")
    new = edit.with_condition(new, "ambient", "20 C")
    new = edit.with_condition(new, "ambient.max", "50 C")
    new = edit.with_condition(new, "source_resistance", None)
    new = edit.with_role(new, "driver", "load", None)
    new = edit.with_role(new, "driver", "bleed", "R8")
    new = edit.with_sequence(new, "dip", {"ends": "1 s"})
    new = edit.with_stray(new, "base", "supply", "9 pF")
    new = edit.with_stray(new, "low", "0V", "3 pF")
    new = edit.with_required(new, "duration", "20 %")
    new = edit.with_derating(new, "resistor_power", "0.5")
    new = edit.with_purpose(edit.with_name(new, "bell"), "rings")
    document = new.dump()
    assert document["conditions"]["supply"] == {"min": "3.5 V", "nominal": "6 V", "max": "6.4 V"}
    assert document["conditions"]["ambient"] == {"nominal": "20 C", "max": "50 C"}
    assert "source_resistance" not in document["conditions"]
    assert document["stages"][0]["roles"] == {"driver": "Q3", "base_resistor": "R7", "bleed": "R8"}
    assert document["sequences"]["dip"] == {"ends": "1 s"}
    assert document["strays"] == [
        {"between": ["supply", "base"], "value": "9 pF"},
        {"between": ["low", "0V"], "value": "3 pF"},
    ]
    assert (document["required"], document["derating"]) == ({"duration": "20 %"}, {"resistor_power": "0.5"})
    assert (document["name"], document["purpose"]) == ("bell", "rings")
    assert edit.with_stray(new, "0V", "low", None).strays[0].value == "9 pF"
    assert "required" not in edit.with_required(new, "duration", None).dump()


def test_a_requirement_replaces_the_one_it_is_about() -> None:
    wider = {**EXAMPLE["requirements"][0], "max": "3 s"}
    new = edit.with_requirement(design(), wider)
    assert new.dump()["requirements"] == [wider]
    two = edit.with_requirement(new, {"check": "arrival", "of": "LS1"})
    assert [each.check for each in two.requirements] == ["duration", "arrival"]
    assert edit.without_requirement(two, 0).dump()["requirements"] == [{"check": "arrival", "of": "LS1"}]


@pytest.mark.parametrize(
    ("refused", "expected"),
    [
        (lambda d: edit.with_value(d, "R9", "1k"), "there is no part 'R9' in the design; write"),
        (lambda d: edit.with_value(d, "R7", "-5k"), "stage driver, part R7, field value: -5k is below zero; write"),
        (lambda d: edit.with_value(d, "R7", "4 V"), "stage driver, part R7, field value: '4 V' is a voltage where"),
        (
            lambda d: edit.with_field(d, "R7", "leakage.conditioned", "1 uA"),
            "stage driver, part R7, field leakage: a resistor has no 'leakage'; leave it out (it has value, ",
        ),
        (lambda d: edit.with_field(d, "R7", "kind", "npn"), "stage driver, part R7, field kind: with these pins it"),
        (lambda d: edit.with_field(d, "R7", "ref", "R9"), "stage driver, part R7, field ref: a designator stays; add"),
        (
            lambda d: edit.with_field(d, "R7", "pins.b", "a b"),
            'stage driver, part R7, field pins.b: "a b" cannot stand',
        ),
        (
            lambda d: edit.with_field(d, "R7", "pins", None),
            "stage driver, part R7, field pins: 'pins' is missing; write",
        ),
        (
            lambda d: edit.stepped_value(d, "LS1", 1),
            "stage driver, part LS1, field value: it has no value to step; write",
        ),
        (lambda d: edit.stepped_value(edit.with_value(d, "R7", "0R"), "R7", 1), "stage driver, part R7, field value: "),
        (lambda d: edit.with_part(d, "timer", {}), "there is no stage 'timer'; write one of driver"),
        (lambda d: edit.with_part(d, "driver", {}), "stage driver, part number 6, field ref: 'ref' is missing; write"),
        (lambda d: edit.with_condition(d, "supply.min", "9 V"), "field conditions.supply: the values are not in order"),
        (
            lambda d: edit.with_sequence(with_dip(d), "alarm", None),
            "there is no sequence 'alarm'; write one of that name",
        ),
        (lambda d: edit.without_requirement(d, 1), "there is no requirement 2; write a number from 1 to 1"),
        (lambda d: edit.with_name(d, ""), 'field name: "" cannot stand here; write a name'),
    ],
)
def test_an_edit_that_makes_no_document_is_refused_in_one_line(refused: Any, expected: str) -> None:
    with pytest.raises(DesignError) as refusal:
        refused(design())
    assert expected in str(refusal.value)
    assert str(refusal.value).isprintable()


@pytest.mark.parametrize("ref", ["S1", "R7", "R8", "Q3", "LS1"])
def test_taking_a_part_out_and_putting_it_back_keeps_the_part(ref: str) -> None:
    part = copy.deepcopy(dumped(design(), ref))
    assert edit.with_part(edit.without_part(design(), ref), "driver", part).part(ref) == design().part(ref)


def test_a_requirement_is_written_anew_in_its_place() -> None:
    two = design()
    for subject in ("R7", "R8"):
        two = edit.with_requirement(two, {"check": "order", "of": subject})
    at = next(n for n, each in enumerate(two.requirements) if each.of == "R7")
    after = edit.with_requirement_at(two, at, {"check": "order", "of": "Q3", "from": "LS1 on"})
    assert [each.of for each in after.requirements][at : at + 2] == ["Q3", "R8"]
    with pytest.raises(DesignError, match="there is no requirement 99"):
        edit.with_requirement_at(two, 98, {"check": "order"})
