"""Check 23, brown-out: how long a filter capacitor feeds a latch while the supply is away (RC, worked by hand)."""

from __future__ import annotations

import math
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor
from .latches import latch
from .sheets import exact, margin
from .test_supply_slew import coupled


def dipped(to: str = "0 V", during: str = "3 ms", farads: str = "10u", **more: Any) -> Design:
    """A latch behind 100R and a tank: 10k from it feed the latch, and it is set at 1 ms; the dip comes at 30 ms."""
    dip = {"at": "30 ms", "event": "dip", "to": to, "for": during, "edge": "1 us"}
    filtered = [exact(resistor("R6", "supply", "tank", "100R")), exact(capacitor("C1", "tank", "0V", farads))]
    document = latch(extra=filtered, events=[dip], source="0R1", **more).dump()
    parts = document["stages"][0]["parts"]
    next(part for part in parts if part["ref"] == "R1")["pins"]["a"] = "tank"
    document["stages"][0]["roles"]["filter_capacitor"] = "C1"
    return Design.load(document)


def test_a_tank_feeds_the_latch_for_a_while() -> None:
    # The tank falls towards 0 V with R C = 1 ms (100R and 10 uF); the latch lets go at 6.19 V, see check 22:
    # t = 1 ms ln(12/6.19) = 0.66 ms, less 1 % for the latch's own current and 3 % of the trial.
    found = margin(dipped(during="0.1 ms"), "brown_out", "Q1")
    expected = 1e-3 * math.log(12.0 / 6.19)
    assert found.demand == pytest.approx(0.1e-3)
    assert found.capability == pytest.approx(expected, rel=0.07)
    assert found.margin == pytest.approx(1.0 - 0.1e-3 / expected, abs=0.03)
    assert found.verdict is Verdict.PASS


def test_a_longer_dip_drops_it() -> None:
    found = margin(dipped(during="3 ms"), "brown_out", "Q1")
    expected = 1e-3 * math.log(12.0 / 6.19)
    assert found.verdict is Verdict.FAIL
    assert found.margin == pytest.approx(1.0 - 3e-3 / expected, rel=0.07)


def test_a_deep_enough_dip_only() -> None:
    # At 10 V it holds for ever.
    found = margin(dipped(to="10 V", during="3 ms"), "brown_out", "Q1")
    assert (found.margin, found.verdict) == (1.0, Verdict.PASS)
    assert found.outcome == "a dip to there changes nothing, however long"


def test_the_deepest_dip_of_that_length() -> None:
    # After 0.5 ms of 1 ms the tank is at 12 - u (1 - exp(-0.5)) V: it comes to 6.19 V for u = 14.8 V, more than there
    # is. After 3 ms: u = 5.81/0.950 = 6.1 V.
    found = margin(dipped(during="0.5 ms"), "brown_out_depth", "Q1")
    assert (found.margin, found.outcome) == (1.0, "a dip of that length changes nothing, however deep")
    found = margin(dipped(to="8 V", during="3 ms"), "brown_out_depth", "Q1")
    assert found.demand == pytest.approx(4.0)
    assert found.capability == pytest.approx(5.81 / -math.expm1(-3.0), rel=0.05)
    assert found.verdict is Verdict.PASS
    assert margin(dipped(to="4 V", during="3 ms"), "brown_out_depth", "Q1").verdict is Verdict.FAIL


def test_a_latch_at_rest_must_stay_at_rest() -> None:
    # 6 V coming back within 1 us through 10 pF to a base with 1M: 0.038 V/us are enough (check 6).
    document = coupled(rise="1 s", ends="2 s").dump()
    dip = {"at": "1.5 s", "event": "dip", "to": "0 V", "for": "3 ms", "edge": "1 us"}
    document["sequences"]["alarm"]["events"].append(dip)
    found = margin(Design.load(document), "brown_out", "Q1")
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)
    assert found.outcome == "the alarm changes with the least dip, or by itself"


def test_a_requirement_without_a_dip_names_it() -> None:
    asked: Json = {"check": "brown_out", "of": "Q1"}
    found = margin(latch(requirements=[asked]), "brown_out", "Q1")
    assert (found.margin, found.reason) == (None, "missing: an event dip in sequence alarm")


def test_without_a_dip_it_is_not_asked() -> None:
    with pytest.raises(AssertionError, match="brown_out:unit:Q1 is not among"):
        margin(latch(), "brown_out", "Q1")
