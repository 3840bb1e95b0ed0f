"""Check 22, self-dip: Ohm's law on the source resistance against the supply at which a latch lets go."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, two
from .latches import latch
from .sheets import margin, sounder

ON: Json = {"at": "20 ms", "event": "close", "part": "S3"}


def loaded(current: str = "1 A", source: str = "1R", events: tuple[Json, ...] = (ON,), **more: Any) -> Design:
    """The latch of ``latches.py``, fed by 10k from 12 V; S3 puts a load on the same supply at 20 ms."""
    load = sounder("LS1", "hot", "0V", current, "3 V", "12 V")
    contact = two("contact", "S3", "supply", "hot", data={"resistance": "1 mohm"})
    return latch(extra=[contact, load], events=events, source=source, **more)


def with_role(of: Design) -> Design:
    document = of.dump()
    document["stages"][0]["roles"]["load"] = "LS1"
    return Design.load(document)


def test_the_dip_by_ohms_law() -> None:
    # 12 ohm behind 1 ohm: D = 12/13 V. It lets go at 0.5485 mA (check 5): at 10k 0.5485 mA + 0.7 V = 6.19 V; the
    # trial stops within 1 % of the supply. C = 12 - 6.19 V.
    found = margin(with_role(loaded()), "self_dip", "Q1")
    assert found.demand == pytest.approx(12.0 / 13.0, rel=2e-3)
    assert found.capability == pytest.approx(12.0 - 6.19, abs=0.12)
    assert found.margin == pytest.approx(1.0 - 0.923 / 5.81, abs=0.01)
    assert found.hand == pytest.approx(found.margin, abs=0.02)
    assert found.verdict is Verdict.PASS


def test_a_soft_source_dips_too_far() -> None:
    # 12 ohm behind 12 ohm take 6 V: less than 6.19 V is left.
    found = margin(with_role(loaded(source="12R")), "self_dip", "Q1")
    assert found.demand == pytest.approx(6.0, rel=2e-3)
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - 6.0 / 5.81, abs=0.04))


def test_a_spike_is_no_dip() -> None:
    # 1 uF behind the contact takes 12 V for a moment, with 1 ohm and 1 uF for some microseconds: only 0.92 V last.
    of = with_role(loaded()).dump()
    of["stages"][0]["parts"].append(capacitor("C9", "hot", "0V", "1u"))
    assert margin(Design.load(of), "self_dip", "Q1").demand == pytest.approx(12.0 / 13.0, rel=2e-3)


def test_what_happens_to_the_supply_is_no_dip_of_its_own() -> None:
    away: Json = {"at": "50 ms", "event": "disconnect supply"}
    found = margin(with_role(loaded(events=(ON, away))), "self_dip", "Q1")
    assert found.demand == pytest.approx(12.0 / 13.0, rel=2e-3)


def test_a_stiff_source_does_not_dip() -> None:
    found = margin(with_role(loaded(source="0R")), "self_dip", "Q1")
    assert (found.demand, found.margin) == (pytest.approx(0.0, abs=1e-6), pytest.approx(1.0, abs=1e-6))


def test_a_load_that_never_comes_on() -> None:
    found = margin(with_role(loaded(events=())), "self_dip", "Q1")
    assert (found.margin, found.outcome) == (-1.0, "the load never came on")


def test_without_a_source_resistance_it_is_unknown() -> None:
    document = with_role(loaded()).dump()
    del document["conditions"]["source_resistance"]
    found = margin(Design.load(document), "self_dip", "Q1")
    assert (found.margin, found.verdict) == (None, Verdict.UNKNOWN)
    assert found.reason == "missing: source_resistance under conditions (0R where there is none)"


def test_without_a_load_it_is_not_asked() -> None:
    with pytest.raises(AssertionError, match="self_dip:unit:Q1 is not among"):
        margin(loaded(), "self_dip", "Q1")
