"""Check 15, order of events: two RC timers from one start, t = R C ln(V/(V - V_th)) (any circuits textbook)."""

from __future__ import annotations

import math
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict
from stagebook.engine.studies.margins import study

from ..circuits import Json, capacitor, mosfet, resistor, two
from .sheets import CONNECT, design, exact, margin


def pair(second: str = "20k", tolerance: str = "0 %", at: str | None = "go above 4.5 V", **requirement: Any) -> Design:
    """At 10 s S1 lets C1 charge through 10k and C2 through ``second``, both 100 uF, to 6 V of 9 V."""
    parts: list[Json] = [two("contact", "S1", "supply", "go", data={"resistance": "1 mohm", "insulation": "1000G"})]
    parts.append(exact(resistor("R9", "go", "0V", "1k")))
    for n, ohms in (("1", "10k"), ("2", second)):
        parts.append({**resistor(f"R{n}", "go", f"t{n}", ohms), "tolerance": tolerance})
        parts.append(exact(capacitor(f"C{n}", f"t{n}", "0V", "100u")))
    wanted = {"check": "order", "of": "C1", "from": "t1 above 6 V", "to": "t2 above 6 V", "at": at, **requirement}
    return design(
        *parts,
        events=[CONNECT, {"at": "10 s", "event": "close", "part": "S1"}],
        ends="20 s",
        requirements=[{k: v for k, v in wanted.items() if v is not None}],
    )


def test_two_timers_by_hand() -> None:
    # 10k 100u ln 3 = 1.0986 s and 2.197 s: half is left.
    found = margin(pair(), "order", "C1")
    assert found.demand == pytest.approx(math.log(3.0), rel=2e-3)
    assert found.margin == pytest.approx(0.5, abs=2e-3)
    assert (found.verdict, found.unit) == (Verdict.PASS, "s")


def test_opposite_ends_of_the_tolerances() -> None:
    # The first 10 % slow, the second 10 % quick: 1.1/1.8; with 12k 1.1/1.08: they race.
    found = margin(pair(tolerance="10 %"), "order", "C1")
    assert found.margin == pytest.approx(1.0 - 1.1 / 1.8, abs=3e-3)
    assert set(found.corner.split(", ")) == {"R1 high", "R2 low"}
    race = margin(pair("12k", tolerance="10 %"), "order", "C1")
    assert (race.verdict, race.margin) == (Verdict.FAIL, pytest.approx(1.0 - 1.1 / 1.08, abs=3e-3))


def test_without_a_start_time_counts_from_the_beginning() -> None:
    found = margin(pair(at=None), "order", "C1")
    assert found.demand == pytest.approx(10.0 + math.log(3.0), rel=1e-3)


@pytest.mark.parametrize(("end", "event"), [("from", "t1 above 8.9999 V"), ("to", "t2 above 8.9999 V")])
def test_an_event_that_never_comes_is_an_outcome(end: str, event: str) -> None:
    found = margin(pair(**{end: event}), "order", "C1")
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)
    assert found.outcome == f"'{event}' never came"


def named_timers() -> Design:
    """The pair with each timer in a stage of its own, which the requirement names."""
    document = pair(first_timer="one", second_timer="two").dump()
    (unit,) = document["stages"]
    parts = {part["ref"]: part for part in unit["parts"]}
    document["stages"] = [
        {"name": "entry", "parts": [parts["S1"], parts["R9"]]},
        *(
            {
                "name": name,
                "parts": [parts[f"R{n}"], parts[f"C{n}"]],
                "roles": {"timing_resistor": f"R{n}", "timing_capacitor": f"C{n}"},
            }
            for name, n in (("one", 1), ("two", 2))
        ),
    ]
    return Design.load(document)


def test_by_hand_where_the_timers_are_named() -> None:
    (found,) = study(named_timers(), only="order:one:C1").checks
    assert found.margin == pytest.approx(0.5, abs=2e-3)
    assert found.hand == pytest.approx(0.5, abs=5e-3)
    assert not found.disagrees


@pytest.mark.parametrize("tolerance", ["0 %", "10 %"])
def test_a_first_event_that_keeps_the_second_from_coming(tolerance: str) -> None:
    # Q1 holds t2 down from 5 V at t1 on, at 10k 100u ln(9/4) = 0.811 s, long before t2 would be at 6 V after 2.197 s.
    # C1 may be 2.197/0.811 = 2.71 times as large; with both resistors 10 % wrong 0.9/1.1 of that. Known within 3 %.
    document = pair(tolerance=tolerance, vary="C1").dump()
    law = {"threshold": "5 V", "transconductance": "1 A/V2"}
    document["stages"][0]["parts"].append(mosfet("Q1", "t2", "t1", "0V", law=law))
    found = margin(Design.load(document), "order", "C1")
    worst = 1.0 if tolerance == "0 %" else 1.1 / 0.9
    assert found.margin == pytest.approx(1.0 - worst * math.log(9 / 4) / (2 * math.log(3.0)), abs=0.02)
    assert found.verdict is Verdict.PASS
    if tolerance != "0 %":
        assert set(found.corner.split(", ")) == {"R1 high", "R2 low"}
    # Without the trial there is nothing to compare with.
    del document["requirements"][0]["vary"]
    assert margin(Design.load(document), "order", "C1").outcome == "'t2 above 6 V' never came"


def test_a_part_to_vary_that_is_none_is_named() -> None:
    with pytest.raises(CircuitError, match="field vary: 'S1' is no part with a value"):
        margin(pair(vary="S1"), "order", "C1")


@pytest.mark.parametrize(
    ("changed", "words"),
    [({"from": None}, 'write "of", "from"'), ({"first_timer": "unit", "second_timer": "unit"}, "is no stage with")],
)
def test_a_requirement_that_cannot_be_read(changed: dict[str, Any], words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        margin(pair(**changed), "order", "C1")
