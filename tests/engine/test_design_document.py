"""The design document: what goes in comes out, the canonical bytes are stable, and every refusal is one useful line.

Expected values here are the document's own contract; there is no outside source for them.
"""

from __future__ import annotations

import copy
import hashlib
import json
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from stagebook.engine.design.document import Datum, Design, Levels, Limits
from stagebook.engine.errors import DesignError

EXAMPLE: dict[str, Any] = json.loads(Path(__file__).with_name("example.json").read_text("utf-8"))

texts = st.sampled_from(["4k7", "680R", "1M0", "220u", "  10 k ", "0.25 W", "µ 3", "5 %"])
numbers = st.one_of(st.integers(-(10**6), 10**6), st.floats(-1e9, 1e9))
scalars = st.one_of(texts, numbers, st.booleans())
data = st.builds(
    lambda limits, source, condition: {**limits, **source, **condition},
    st.dictionaries(st.sampled_from(["min", "typical", "max"]), scalars, min_size=1),
    st.sampled_from([{}, {"source": "datasheet"}, {"source": "memory"}]),
    st.sampled_from([{}, {"condition": "at 25 C"}]),
)
keys = st.sampled_from(["gain", "v_be", "threshold_voltage", "i_off"])
entries = st.one_of(
    scalars,
    data,
    st.dictionaries(keys, st.one_of(scalars, data), min_size=1, max_size=3),
    st.lists(st.one_of(scalars, data, st.lists(scalars, min_size=1, max_size=3)), min_size=1, max_size=3),
)
nets = st.sampled_from(["0V", "supply", "base", "latch/hold", "+9V", "1"])
parts = st.fixed_dictionaries(
    {"kind": st.sampled_from(["resistor", "npn", "sounder"]), "pins": st.dictionaries(keys, nets, min_size=1)},
    optional={
        "value": texts,
        "tolerance": texts,
        "class": texts,
        "rating": entries,
        "leakage": st.dictionaries(st.sampled_from(["specified", "conditioned"]), st.one_of(scalars, data)),
        "data": st.dictionaries(keys, entries, max_size=3),
        "law": st.dictionaries(keys, entries, max_size=3),
        "waveform": st.just({"steps": [["0 s", 0], [0.5, "6 V"]]}),
        "bounce": st.sampled_from(["2 ms", {"for": "2 ms", "times": 3}]),
    },
)


@st.composite
def documents(draw: st.DrawFn) -> dict[str, Any]:
    """A document with random parts in two stages; fields are left out, or given as what left out means."""
    document = copy.deepcopy(EXAMPLE)
    drawn = [{"ref": f"X{n}", **part} for n, part in enumerate(draw(st.lists(parts, max_size=4)))]
    document["stages"].append({"name": "more", "parts": drawn})
    for name, empty in (("strays", []), ("requirements", []), ("purpose", ""), ("conditions", {}), ("derating", {})):
        choice = draw(st.sampled_from(["as it is", "empty", "left out"]))
        if choice == "empty":
            document[name] = empty
        elif choice == "left out":
            document.pop(name, None)
    return document


def shuffled(value: Any, random: Any) -> Any:
    """The same JSON value with the keys of every object in another order."""
    if isinstance(value, dict):
        items = [(key, shuffled(inner, random)) for key, inner in value.items()]
        random.shuffle(items)
        return dict(items)
    return [shuffled(inner, random) for inner in value] if isinstance(value, list) else value


@given(documents())
def test_what_is_loaded_is_dumped_unchanged(document: dict[str, Any]) -> None:
    design = Design.load(document)
    assert design.dump() == document
    assert Design.load(json.dumps(document)).dump() == document
    assert Design.load(design.canonical()) == design


@given(documents(), st.randoms(use_true_random=False))
def test_canonical_bytes_do_not_depend_on_the_order_of_keys(document: dict[str, Any], random: Any) -> None:
    first, second = Design.load(document), Design.load(shuffled(document, random))
    assert first.canonical() == second.canonical()
    assert first.content == second.content == hashlib.sha256(first.canonical()).hexdigest()


def test_canonical_bytes_are_sorted_compact_and_leave_unset_fields_out() -> None:
    document = {"name": "m", "stagebook": 1, "sequences": {"alarm": {"ends": "1 s"}}, "purpose": "", "strays": []}
    assert Design.load(document).canonical() == b'{"name":"m","sequences":{"alarm":{"ends":"1 s"}},"stagebook":1}'


def test_number_without_fraction_is_the_same_content_as_an_integer() -> None:
    one, other = copy.deepcopy(EXAMPLE), copy.deepcopy(EXAMPLE)
    one["stages"][0]["parts"][3]["law"] = {"forward_gain": 99}
    other["stages"][0]["parts"][3]["law"] = {"forward_gain": 99.0}
    assert Design.load(one).content == Design.load(other).content


def test_parts_are_found_by_their_designator() -> None:
    design = Design.load(EXAMPLE)
    assert [part.ref for part in design.parts] == ["S1", "R7", "R8", "Q3", "LS1"]
    assert design.part("Q3").class_ == "0.5 A driver npn"
    assert design.stage_of("LS1").name == "driver"
    assert design.nets == ("supply", "call", "base", "0V", "low")
    with pytest.raises(DesignError, match="no part 'R9'"):
        design.part("R9")


def test_a_datum_is_found_as_a_field_or_under_data() -> None:
    document = copy.deepcopy(EXAMPLE)
    contact, resistor = document["stages"][0]["parts"][:2]
    contact["resistance"] = {"typical": "0.1 ohm", "max": "10 ohm"}
    resistor["leakage"] = {"specified": {"max": "3 uA"}, "conditioned": "0.2 uA"}
    design = Design.load(document)
    assert design.part("LS1").limits("current", "A") == Limits(None, 0.15, 0.2)
    assert design.part("LS1").datum("operating_minimum") == Datum(typical="3 V")
    assert design.part("S1").limits("resistance", "ohm") == Limits(None, 0.1, 10.0)
    assert design.part("R7").limits("leakage", "A", "specified") == Limits(None, None, 3e-6)
    assert design.part("R7").limits("leakage", "A", "conditioned") == Limits(None, 2e-7, None)
    assert design.part("R7").datum("tempco") is None
    with pytest.raises(DesignError, match=r"^part LS1, field current: .*"):
        design.part("LS1").limits("current", "ohm")


def test_conditions_are_read_in_si_with_the_nominal_value_for_an_open_end() -> None:
    document = {**EXAMPLE, "conditions": {"supply": {"nominal": "6 V", "max": "6.4 V"}, "ambient": "20 C"}}
    conditions = Design.load(document).conditions
    assert conditions.levels("supply") == Levels(6.0, 6.0, 6.4)
    assert conditions.levels("ambient") == Levels(20.0, 20.0, 20.0)
    assert conditions.levels("source_resistance") is None
    assert conditions.leakage_states == ("conditioned", "specified")


def test_starts_of_a_sequence_stand_over_those_of_the_design() -> None:
    document = copy.deepcopy(EXAMPLE)
    assert Design.load(document).starts_of("alarm") is None
    document["starts"] = {"base": "1 V", "low": "2 V"}
    document["sequences"]["alarm"]["starts"] = {"low": "3 V"}
    assert Design.load(document).starts_of("alarm") == {"base": "1 V", "low": "3 V"}


STAGE = "stage driver, part R7, "
REFUSALS: list[tuple[list[Any], Any, str]] = [
    (["stages", 0, "parts", 1, "valeu"], "1k", STAGE + "field valeu: unknown field 'valeu'; write 'value'"),
    (["stages", 0, "parts", 1, "value"], 680, STAGE + "field value: 680 cannot stand here; write a text in quotes"),
    (["stages", 0, "parts", 1, "pins"], ..., STAGE + "field pins: 'pins' is missing; write \"pins\": {"),
    (["stages", 0, "parts", 1, "pins", "a"], "x y", STAGE + 'field pins.a: "x y" cannot stand here; write a net name'),
    (["stages", 0, "parts", 1, "ref"], "R8", "stage driver, part R8, field ref: 2 parts have it"),
    (["stages", 0, "parts", 1, "class_"], "film", STAGE + "field class_: unknown field 'class_'; write 'class'"),
    (["stages", 0, "parts", 1, "tolerance"], "\ud800", STAGE + "field tolerance: "),
    (["stages", 0, "parts", 1, "leakage"], {"spec": "1 A"}, "unknown field 'spec'; write 'specified'"),
    (["stages", 0, "parts", 1, "data"], {"value": "1k"}, STAGE.rstrip(", ") + ": 'value' is given twice; write it"),
    (
        ["stages", 0, "parts", 4, "data", "current", "mx"],
        "3 A",
        "field data.current.mx: unknown field 'mx'; write 'max'",
    ),
    (["stages", 0, "parts", 4, "data", "current"], {"typcal": "3 A"}, "unknown field 'typcal'; write 'typical'"),
    (
        ["stages", 0, "parts", 4, "data", "current"],
        {"source": "memory"},
        "field data.current: no number is given; write",
    ),
    (["stages", 0, "parts", 4, "data", "current", "source"], "hearsay", "write 'datasheet', 'class', 'measured' or"),
    (["stages", 0, "name"], "a/b", 'stage a/b, field name: "a/b" cannot stand here; write a name without spaces'),
    (["conditions", "supply", "min"], "7 V", "field conditions.supply: the values are not in order; write"),
    (["conditions", "supply", "min"], "4 A", "field conditions.supply: '4 A' is a current where a voltage"),
    (["conditions", "source_resistance", "min"], "-1 ohm", "field conditions.source_resistance: a source_resistance"),
    (["conditions", "leakage"], ["conditioned"] * 2, "field conditions.leakage: a state is named twice; write"),
    (["sequences", "alarm", "ends"], "5 V", "sequence alarm, field ends: '5 V' is a voltage where a time is asked for"),
    (["conditions", "ambient"], "1e9 C", "no law of a part holds beyond -100 C to 250 C"),
    (["sequences", "alarm", "ends"], "-5 s", "sequence alarm, field ends: '-5 s' is below 0 s; write"),
    (
        ["sequences", "alarm", "events", 1, "rise"],
        "1 s",
        "sequence alarm, event 2 (close S1), field rise: unknown field",
    ),
    (
        ["sequences", "alarm", "events", 1, "event"],
        "colse",
        "event 2 (colse S1): \"colse\" is not known here; write 'close'",
    ),
    (["sequences", "alarm", "events", 1, "event"], ..., "sequence alarm, event 2 (S1): 'event' is missing; write"),
    (
        ["sequences", "alarm", "events", 1, "part"],
        ...,
        "event 2 (close), field part: 'part' is missing; write \"part\"",
    ),
    (
        ["sequences", "alarm", "events", 1, "bounce", "times"],
        0,
        "field bounce.times: 0 cannot stand here; write a number from 1 on",
    ),
    (
        ["sequences", "alarm", "moments", "standby"],
        3,
        "sequence alarm, moment standby: 3 cannot stand here; write a time",
    ),
    (
        ["sequences", "alarm", "moments", "sounding", "after"],
        "LS1 rings",
        "moment sounding, field after: 'LS1 rings' names no",
    ),
    (["sequences"], {"arm": {"ends": "1 s"}}, "field sequences: there is no sequence 'alarm'; write one"),
    (["requirements", 0, "requred"], "1 %", "requirement 1 (duration LS1): unknown field 'requred'; write 'required'"),
    (["requirements", 0, "required"], "ten", "requirement 1 (duration LS1), field required: 'ten'"),
    (["strays", 0, "value"], "5 V", "stray 1 (supply base), field value: '5 V' is a voltage where a capacitance"),
    (["strays", 0, "between"], ["base", "base"], "stray 1 (base base), field between: both nets are 'base'; name two"),
    (["strays", 0, "between"], ["base"], "field between.entry 2: an entry is missing; write at least 2"),
    (["starts"], {"base": "3 F"}, "field starts.base: '3 F' is a capacitance where a voltage is asked for"),
    (["name"], "a/b", 'field name: "a/b" cannot stand here; write a name without /'),
    (["name"], "a.json", "field name: 'a.json' would be taken for a file; leave '.json' out"),
    (["stagebook"], 2, "field stagebook: 2 is not known here; write 1, the version of the document"),
    (["stages"], 3, "field stages: 3 cannot stand here; write a list"),
    (["stages", 0, "parts"], [None], "stage driver, part number 1: null cannot stand here; write an object"),
    (["strange\nname"], 3, "field strange\\nname: unknown field"),
]


@pytest.mark.parametrize(("path", "value", "expected"), REFUSALS, ids=[line for *_, line in REFUSALS])
def test_a_refusal_is_one_line_that_says_where_and_what_to_write(path: list[Any], value: Any, expected: str) -> None:
    document = copy.deepcopy(EXAMPLE)
    *inner, last = path
    place: Any = document
    for step in inner:
        place = place[step]
    if value is ...:
        del place[last]
    else:
        place[last] = value
    with pytest.raises(DesignError) as refusal:
        Design.load(document)
    line = str(refusal.value)
    assert expected in line
    assert line.isprintable()


@pytest.mark.parametrize(
    ("source", "expected"),
    [
        ('{"name": "a", "name": "b"}', "the field 'name' stands twice in one object"),
        ('{"name": }', "not JSON at line 1, column 10"),
        ('{"name": NaN}', "NaN is not a value; write a finite number"),
        (b"\xff", "not UTF-8 text at byte 0; save it as UTF-8"),
        ("[" * 100_000, "nested too deep"),
        ('{"a": ' * 20 + "1" + "}" * 20, "nested too deep; write at most"),
        ("3", 'not an object; write {"stagebook": 1'),
        ('{"a": ' + "9" * 5000 + "}", "has 5000 digits"),
        (" " * 1_000_001, "has 1000001 bytes; write one of at most"),
        ({"a": [0] * 100_001}, "more than 100000 values"),
    ],
)
def test_a_source_that_is_no_document_is_refused_in_one_line(source: Any, expected: str) -> None:
    with pytest.raises(DesignError) as refusal:
        Design.load(source)
    assert expected in str(refusal.value)
    assert str(refusal.value).isprintable()


json_values = st.recursive(
    st.none() | st.booleans() | numbers | st.text(max_size=8),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=8), inner, max_size=3),
    max_leaves=6,
)


def refusal_of(document: dict[str, Any]) -> str:
    """The line by which a document is refused; empty where it is taken, and then it is dumped unchanged."""
    try:
        design = Design.load(document)
    except DesignError as refusal:
        return str(refusal)
    assert design.dump() == document
    return ""


@given(st.data(), json_values)
def test_any_value_anywhere_is_either_taken_or_refused_in_one_line(draw: st.DataObject, value: Any) -> None:
    document = copy.deepcopy(EXAMPLE)
    place: Any = document
    while True:
        step = draw.draw(st.sampled_from(sorted(place) if isinstance(place, dict) else range(len(place))))
        if not isinstance(place[step], dict | list) or not place[step] or draw.draw(st.booleans()):
            break
        place = place[step]
    place[step] = value
    line = refusal_of(document)
    assert line.isprintable()
    assert any(remedy in line for remedy in ("write", "leave", "give", "name two")) or not line
