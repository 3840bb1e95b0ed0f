"""Check 14, re-arm, repeatability and re-power: an RC pulse timer in closed form, a latch against its own check 6."""

from __future__ import annotations

import math
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor, two
from .sheets import CONNECT, design, exact, margin, sounder
from .test_supply_slew import coupled

V, VTH, TAU, BACK = 6.0, 3.0, 1.0, 1.1  # V, V, s of 100k and 10 uF, s of 110k
CHARGED = V * -math.expm1(-4.0 / TAU)  # after 4 s closed
LEAST = 0.55  # s that an alarm must last
REST = BACK * math.log(CHARGED / (V - VTH * math.exp(LEAST / TAU)))  # 2.2 s


def contact(at: float, event: str) -> Json:
    return {"at": f"{at!r} s", "event": event, "part": "S1"}


def pulse(
    *requirements: Json, events: tuple[Json, ...] = (contact(1.0, "close"), contact(5.0, "open")), **more: Any
) -> Design:
    """S1 steps C1 into R1: an alarm as long as R1 has more than 3 V; open, C1 empties through R1 and R2."""
    return design(
        two("contact", "S1", "supply", "line", data={"insulation": "1000G"}),
        exact(resistor("R2", "line", "0V", "10k")),
        exact(capacitor("C1", "line", "n", "10u")),
        exact(resistor("R1", "n", "0V", "100k")),
        sounder("LS1", "n", "0V", "1 nA", f"{VTH} V", "6 V"),
        supply="6 V",
        roles={"load": "LS1"},
        events=[CONNECT, *events],
        ends="6 s",
        requirements=[{"check": "duration", "of": "LS1", "min": f"{LEAST} s", "max": "0.8 s"}, *requirements],
        **more,
    )


def test_the_rest_that_empties_the_capacitor() -> None:
    # v falls with 1.1 s; the next alarm lasts ln((6 - v)/3) s. The trial has steps of 5 %.
    asked = {"check": "rearm", "of": "LS1", "from": "5 s", "max": "4 s"}
    found = margin(pulse(asked), "rearm", "LS1")
    assert found.demand == pytest.approx(REST, rel=0.05)
    assert found.margin == pytest.approx(1.0 - REST / 4.0, abs=0.03)
    assert found.verdict is Verdict.PASS


def test_too_little_time_is_allowed() -> None:
    found = margin(pulse({"check": "rearm", "of": "LS1", "from": "5 s", "max": "2 s"}), "rearm", "LS1")
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - REST / 2.0, abs=0.06))


def test_never_ready_is_an_outcome() -> None:
    # Without R2 the capacitor keeps its charge.
    document = pulse({"check": "rearm", "of": "LS1", "from": "5 s", "max": "2 s"}).dump()
    document["stages"][0]["parts"][1]["value"] = "1G"
    found = margin(Design.load(document), "rearm", "LS1")
    assert (found.margin, found.outcome) == (-1.0, "not ready again after four times the time allowed")


def test_the_allowed_time_is_named_where_it_is_missing() -> None:
    found = margin(pulse({"check": "rearm", "of": "LS1"}), "rearm", "LS1")
    assert (found.margin, found.verdict) == (None, Verdict.UNKNOWN)
    assert found.reason == "missing: max, the time allowed, in the requirement rearm of LS1"


def test_a_requirement_without_a_load_is_refused() -> None:
    with pytest.raises(CircuitError, match='requirement rearm: write "of", the load that tells of an alarm'):
        margin(pulse({"check": "rearm", "max": "2 s"}), "rearm", "LS1")


def twice(rest: float, ends: str) -> Design:
    events = [contact(t, e) for t, e in ((1, "close"), (5, "open"), (5 + rest, "close"), (9 + rest, "open"))]
    document = pulse({"check": "repeatability", "of": "LS1"}, events=tuple(events)).dump()
    document["sequences"]["alarm"]["ends"] = ends
    return Design.load(document)


@pytest.mark.parametrize(("rest", "verdict"), [(2.0, Verdict.FAIL), (6.0, Verdict.PASS)])
def test_the_warm_alarm_against_the_first(rest: float, verdict: Verdict) -> None:
    left = CHARGED * math.exp(-rest / BACK)
    first, second = math.log(V / VTH), math.log((V - left) / VTH)
    found = margin(twice(rest, "20 s"), "repeatability", "LS1")
    assert found.demand == pytest.approx(1.0 - second / first, abs=0.003)
    assert found.margin == pytest.approx(1.0 - (1.0 - second / first) / 0.1, abs=0.03)
    assert found.verdict is verdict


def test_a_second_alarm_that_never_comes() -> None:
    found = margin(pulse({"check": "repeatability", "of": "LS1"}), "repeatability", "LS1")
    assert (found.margin, found.outcome) == (-1.0, "the second alarm never came")


ASKED: Json = {"check": "repower"}


def test_a_bare_base_trips_as_the_supply_comes_back() -> None:
    # From 1 V or 2 V the stray's 10 pF bring 38 nA into 1M at 0.038 V/us as from 0 V: the capability of check 6.
    of = coupled("1M", rise="1 ms", moments={"standby": "0.5 s"}, requirements=[ASKED])
    again, first = margin(of, "repower", "Q2"), margin(of, "supply_slew", "Q2")
    assert again.capability == pytest.approx(first.capability, rel=0.08)
    assert again.verdict is Verdict.PASS
    fast = coupled("1M", rise="10 us", moments={"standby": "0.5 s"}, requirements=[ASKED])
    assert margin(fast, "repower", "Q2").verdict is Verdict.FAIL


def test_a_held_base_is_immune() -> None:
    of = coupled("100k", held="10n", moments={"standby": "0.5 s"}, requirements=[ASKED])
    found = margin(of, "repower", "Q2")
    assert (found.margin, found.outcome) == (1.0, "immune at any slew")


def test_re_power_is_not_asked_without_a_requirement() -> None:
    with pytest.raises(AssertionError, match="repower:unit:Q2 is not among"):
        margin(coupled(), "repower", "Q2")
