"""Check 5, reset pulse: a contact that discharges the tank of a latch, t = R C ln(V/V_hold) (closed form)."""

from __future__ import annotations

import math

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import capacitor, resistor
from .latches import latch
from .sheets import exact, margin

V, HOLD = 12.0, 6.19  # V, supply at which the latch lets go, see check 5


def reset(least: str | None = "5 ms", short: str = "1R", set_late: bool = True) -> Design:
    """The latch of ``latches.py``, fed from a tank of 10 uF behind 1k and set at 0.1 s, when that is charged; S2
    empties it through ``short``."""
    asked = {"check": "reset_pulse", "of": "S2", **({} if least is None else {"min": least})}
    filtered = [exact(resistor("R6", "supply", "tank", "1k")), exact(capacitor("C1", "tank", "0V", "10u"))]
    document = latch(extra=filtered, requirements=[asked], moments={"latched": "0.15 s"}, ends="0.2 s").dump()
    parts = {part["ref"]: part for part in document["stages"][0]["parts"]}
    parts["R1"]["pins"]["a"] = "tank"
    parts["S2"]["pins"]["a"] = "tank"
    parts["R5"]["value"] = short
    if set_late:
        for event in document["sequences"]["alarm"]["events"]:
            event["at"] = {"1 ms": "100 ms", "2 ms": "101 ms"}.get(event["at"], event["at"])
    return Design.load(document)


def expected(ohms: float) -> float:
    """The tank stands at 12 V - 1k 1.03 mA and falls towards 12 V ohms/(ohms + 1k) with the parallel resistance."""
    begin, low = V - 1e3 * (V - 0.75) / 11e3, V * ohms / (ohms + 1e3)
    return 10e-6 * ohms * 1e3 / (ohms + 1e3) * math.log((begin - low) / (HOLD - low))


def test_the_tank_must_be_emptied_to_the_hold_voltage() -> None:
    found = margin(reset(short="100R"), "reset_pulse", "S2")
    assert found.demand == pytest.approx(expected(100.0), rel=0.08)
    assert found.margin == pytest.approx(1.0 - expected(100.0) / 5e-3, abs=0.02)
    assert found.verdict is Verdict.PASS


def test_a_reset_that_is_too_short_fails() -> None:
    found = margin(reset("0.3 ms", short="100R"), "reset_pulse", "S2")
    assert (found.verdict, found.outcome) == (Verdict.FAIL, None)
    assert found.margin == pytest.approx(1.0 - expected(100.0) / 0.3e-3, rel=0.15)


def test_a_reset_too_weak_does_not_let_go() -> None:
    # 4k7 against 1k leave 9.9 V.
    found = margin(reset(short="4k7"), "reset_pulse", "S2")
    assert (found.margin, found.outcome) == (-1.0, "did not let go: not by a reset of thirty times that length either")


def test_a_latch_that_was_never_set_is_an_outcome() -> None:
    # At 1 ms the tank has a tenth of its voltage.
    found = margin(reset(short="100R", set_late=False), "reset_pulse", "S2")
    assert (found.margin, found.outcome) == (-1.0, "the latch was never set")


def test_the_shortest_reset_is_named_where_it_is_missing() -> None:
    found = margin(reset(None), "reset_pulse", "S2")
    assert (found.margin, found.verdict) == (None, Verdict.UNKNOWN)
    assert found.reason == "missing: min, the shortest true reset, in the requirement reset_pulse of S2"
