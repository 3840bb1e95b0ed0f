"""Parts made of datasheet points: what is copied into a design, and that it computes as the figures say.

Class figures: the project's own table of customary figures, from memory.
"""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine import edit
from stagebook.engine.circuit.circuit import build
from stagebook.engine.design.differences import apply, differences
from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError, DesignError
from stagebook.engine.parts import kinds
from stagebook.engine.parts.class_figure import spread
from stagebook.engine.parts.classes import CLASSES
from stagebook.engine.parts.figures import class_figures, figure, valued
from stagebook.engine.parts.kind import TEXT
from stagebook.engine.parts.made import from_memory, kept, resolved, tried
from stagebook.engine.parts.part_data import part_data

from .circuits import resistor, setup, transistor

LOW_LEAK: dict[str, Any] = {
    "kind": "npn",
    "class": "small npn",
    "data": {
        "gain": {"min": "110", "typical": "180", "max": "300", "condition": "2 mA", "source": "datasheet"},
        "v_ce_sat": {"typical": "90 mV", "max": "0.2 V", "condition": "10 mA / 0.5 mA", "source": "datasheet"},
    },
}


def follower(**fields: object) -> Design:
    return setup(
        resistor("R1", "supply", "base", "100k"),
        transistor("Q1", "supply", "base", "out", **{"class": "small npn"} | fields),
        resistor("R2", "out", "0V", "1k"),
        ends=1.0,
    ).design


def test_own_figures_win_and_the_class_gives_the_rest_from_memory() -> None:
    used = edit.with_made_part(follower(), "Q1", LOW_LEAK, "low leak, version 1").part("Q1")
    assert figure(used, "gain", "") == figure(tried(LOW_LEAK), "gain", "")
    assert used.datum("gain").source == "datasheet"  # type: ignore[union-attr]
    leak = used.datum("i_cbo")
    assert leak is not None
    assert (leak.max, leak.source, leak.condition) == ("15 nA", "memory", "30 V, 25 C")
    assert used.drawer == "low leak, version 1"
    assert used.pins == {"collector": "supply", "base": "base", "emitter": "out"}


def test_a_copied_part_computes_as_one_that_names_the_class() -> None:
    plain = edit.with_made_part(follower(), "Q1", {"kind": "npn", "class": "small npn"}, "plain, version 1")
    columns = {c.key: (c.low, c.nominal, c.high) for c in build(follower()).columns}
    assert {c.key: (c.low, c.nominal, c.high) for c in build(plain).columns} == columns


def test_a_later_change_of_the_class_moves_no_copy(monkeypatch: pytest.MonkeyPatch) -> None:
    used = edit.with_made_part(follower(), "Q1", LOW_LEAK, "low leak, version 1")
    altered = {**CLASSES["npn"]["small npn"], "v_be": spread("0.1 V", "0.2 V", "0.3 V", "2 mA")}
    monkeypatch.setitem(CLASSES["npn"], "small npn", altered)  # type: ignore[arg-type]
    assert figure(used.part("Q1"), "v_be", "V").typical == pytest.approx(0.64)  # type: ignore[union-attr]
    assert figure(follower().part("Q1"), "v_be", "V").typical == pytest.approx(0.2)  # type: ignore[union-attr]


def test_a_value_of_the_place_stays_where_the_made_part_has_none() -> None:
    design = follower()
    film = {"kind": "resistor", "rating": "0.6 W", "data": {"tempco": "50 ppm/K"}}
    used = edit.with_made_part(design, "R1", film, "film, version 2").part("R1")
    assert (used.value, used.rating, used.drawer) == ("100k", "0.6 W", "film, version 2")
    with_value = edit.with_made_part(design, "R1", {**film, "value": "91k"}, "film, version 3")
    assert with_value.part("R1").value == "91k"


def test_what_is_kept_of_a_part_can_be_used_again() -> None:
    design = edit.with_made_part(follower(), "Q1", LOW_LEAK, "low leak, version 1")
    again = edit.with_made_part(follower(), "Q1", kept(design.part("Q1")), "low leak, version 1")
    assert again == design
    # What came from the class is not its own: kept and used, it is the same version.
    assert kept(design.part("Q1")) == LOW_LEAK


@pytest.mark.parametrize(
    ("document", "says"),
    [
        ({"kind": "valve"}, "no part kind 'valve'"),
        ({"kind": "npn", "data": {"gian": "200"}}, "gain"),
        ({"kind": "npn", "class": "small npn", "data": {"gain": "many"}}, "gain"),
        ({"kind": "npn", "class": "huge npn"}, "small npn"),
        # No junction falls in voltage as its current rises.
        (
            {
                "kind": "diode",
                "class": "signal diode",
                "data": {"forward_high": "0.3 V", "forward_high_current": "1 A"},
            },
            "rise in voltage",
        ),
    ],
)
def test_a_part_that_cannot_be_is_refused_in_one_line(document: dict[str, Any], says: str) -> None:
    with pytest.raises((DesignError, CircuitError), match=says) as refusal:
        tried(document)
    assert "\n" not in str(refusal.value)


def test_a_part_of_another_kind_is_refused() -> None:
    with pytest.raises(DesignError, match="it is a resistor and no npn"):
        edit.with_made_part(follower(), "R1", LOW_LEAK, "low leak, version 1")


def test_a_made_part_is_one_change_by_its_name() -> None:
    before = follower()
    after = edit.with_made_part(before, "Q1", LOW_LEAK, "low leak, version 1")
    (change,) = differences(before, after)
    assert (change.what, change.kind, change.before, change.after) == (
        "Q1",
        "datum",
        "small npn",
        "low leak, version 1",
    )
    assert apply(before, after, [change]) == after


def test_memory_is_told_until_it_is_replaced() -> None:
    before = follower()
    assert "gain" in from_memory(before.part("Q1"))
    after = edit.with_field(before, "Q1", "gain", {"typical": "250", "source": "measured"})
    assert "gain" not in from_memory(after.part("Q1"))
    assert from_memory(before.part("R1")) == ()


def test_the_data_page_lists_every_figure_with_who_says_it() -> None:
    rows = {row.name: row for row in part_data(follower().part("Q1"))}
    gain = rows["gain"]
    assert (gain.minimum, gain.typical, gain.maximum, gain.condition) == ("200", "300", "450", "2 mA, 5 V")
    assert (gain.source, gain.own) == ("memory, class small npn", False)
    assert rows["v_be_high"].source == ""
    own = {row.name: row for row in part_data(edit.with_field(follower(), "Q1", "gain", "250").part("Q1"))}["gain"]
    assert (own.typical, own.source, own.own) == ("250", "not said", True)


def test_every_class_can_be_copied_and_computes() -> None:
    for name, classes in CLASSES.items():
        for of_class in classes:
            document: dict[str, Any] = {"kind": name, "class": of_class}
            if name == "capacitor":
                document["voltage"] = "16 V"
            part = tried(resolved(document))
            known = {**kinds()[name].fields, **kinds()[name].data}
            for key in class_figures(part):
                if key in known and known[key].unit != TEXT:
                    assert figure(part, key, known[key].unit) is not None, (name, of_class, key)


@pytest.mark.parametrize(
    ("kind", "name", "key", "unit", "low", "typical", "high"),
    [
        ("npn", "small npn", "gain", "", 200, None, 450),
        ("npn", "small npn", "v_be", "V", 0.58, None, 0.70),
        ("pnp", "small pnp", "v_ce_sat", "V", None, 0.1, 0.25),
        ("npn", "small npn", "f_t", "Hz", 150e6, None, 300e6),
        ("npn", "small npn", "thermal_resistance", "K/W", 200, 200, 200),
        ("npn", "0.5 A driver npn", "v_ce_sat", "V", None, None, 0.7),
        ("pnp", "2 A pnp", "v_ceo", "V", 60, 60, 60),
        ("pnp", "2 A pnp", "gain", "", 40, None, None),
        ("darlington_npn", "power Darlington", "gain", "", 750, None, None),
        ("diode", "signal diode", "reverse_current", "A", None, None, 25e-9),
        ("schottky", "1 A Schottky", "reverse_current", "A", None, None, 0.5e-3),
        ("battery", "9 V block", "aged_resistance", "ohm", 10, 10, 10),
        ("battery", "AA cell", "resistance", "ohm", None, 0.15, None),
        ("thermistor", "ntc", "beta", "K", None, 3950, None),
        ("resistor", "film 1 %", "tempco", "1/K", -50e-6, 0.0, 50e-6),
        ("contact", "gold contact", "minimum_current", "A", 10e-6, 10e-6, 10e-6),
        ("contact", "silver contact", "resistance", "ohm", None, 0.1, 10),
        ("sounder", "siren 12 V", "current", "A", 0.2, None, 1.0),
        ("piezo", "piezo 12 V", "sound_level", "dB", 85, None, 105),
    ],
)
def test_classes_hold_the_customary_figures(
    kind: str, name: str, key: str, unit: str, low: float | None, typical: float | None, high: float | None
) -> None:
    # The customary figures of the trade, from memory: the project's table of part data.
    found = figure(tried({"kind": kind, "class": name}), key, unit)
    assert found is not None
    for expected, value in ((low, found.low), (typical, found.typical), (high, found.high)):
        if expected is not None:
            assert value == pytest.approx(expected)


@pytest.mark.parametrize(
    ("kind", "name", "value", "low", "high"),
    [
        ("resistor", "film 1 %", "10k", 9.9e3, 10.1e3),
        ("capacitor", "film", "100n", 90e-9, 110e-9),
        ("capacitor", "C0G", "1n", 0.95e-9, 1.05e-9),
    ],
)
def test_a_class_gives_the_tolerance_where_the_part_has_none(
    kind: str, name: str, value: str, low: float, high: float
) -> None:
    part = tried({"kind": kind, "class": name, "value": value})
    unit = "ohm" if kind == "resistor" else "F"
    found = valued(part, unit, 0.5)
    assert (found.low, found.high) == (pytest.approx(low), pytest.approx(high))
    own = valued(tried({"kind": kind, "class": name, "value": value, "tolerance": "2 %"}), unit, 0.5)
    assert own.low == pytest.approx(0.98 * found.typical)


def test_a_class_stands_for_what_a_load_needs() -> None:
    # 12 mA at 12 V, from memory: a class is enough to draw it.
    design = setup(
        {"ref": "LS1", "kind": "piezo", "pins": {"plus": "supply", "minus": "low"}, "class": "piezo 12 V"},
        resistor("R1", "low", "0V", "1R"),
        supply="12 V",
        ends=1.0,
    )
    assert design.final("low") == pytest.approx(12e-3, rel=2e-3)
    with pytest.raises(DesignError, match="'current' is missing"):
        tried({"kind": "piezo"})
