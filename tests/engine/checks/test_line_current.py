"""Check 20: leakage of a wet lead or probe against what trips, and a contact's current against what keeps it clean.

Common practice, no source; least currents 10 uA for gold, 1 mA for silver (from memory).
"""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, exact, margin, sounder


def wet(insulation: str | None = "2M", ramp: str = "10k", **requirement: Any) -> Design:
    """A probe from 9 V into 100k; "trips" where the sense net passes 3 V, that is 30 uA and 200k."""
    events: list[Json] = [CONNECT, {"at": "1 s", "event": "ramp", "part": "B1", "to": ramp, "for": "8 s"}]
    wanted = {"check": "wet_lead", "of": "B1", "insulation": insulation, "at": "sense above 3 V", **requirement}
    return design(
        two("probe", "B1", "supply", "sense", "10M"),
        exact(resistor("R1", "sense", "0V", "100k")),
        events=events,
        ends="10 s",
        roles={"pull_down": "R1"},
        requirements=[{k: v for k, v in wanted.items() if v is not None}],
    )


@pytest.mark.parametrize(
    # 9 V / 2M = 4.5 uA of 30 uA; 9 V / 250k = 36 uA: dirt alone trips it.
    ("insulation", "expected", "verdict"),
    [("2M", 1.0 - 4.5 / 30.0, Verdict.PASS), ("250k", 1.0 - 36.0 / 30.0, Verdict.FAIL)],
)
def test_a_probe_by_hand(insulation: str, expected: float, verdict: Verdict) -> None:
    found = margin(wet(insulation), "wet_lead", "B1")
    # Dry it is 10M with 100k below: 1 % of the supply is missing across it.
    assert found.margin == pytest.approx(expected, abs=0.02)
    assert found.capability == pytest.approx(30e-6, rel=0.01)
    assert found.verdict is verdict


def test_it_never_trips() -> None:
    found = margin(wet(ramp="1M"), "wet_lead", "B1")
    assert (found.margin, found.outcome, found.verdict) == (-1.0, "it never tripped", Verdict.FAIL)


def test_a_contact_whose_line_trips_at_a_level() -> None:
    # 9 V through 100k down to 3 V: 60 uA; 9 V / 1M = 9 uA.
    of = design(
        two("contact", "S1", "line", "0V", data={"insulation": "1000G"}),
        exact(resistor("R1", "supply", "line", "100k")),
        roles={"pull_up": "R1"},
        requirements=[{"check": "wet_lead", "of": "S1", "insulation": "1M", "trip_level": "3 V"}],
    )
    found = margin(of, "wet_lead", "S1")
    assert found.margin == pytest.approx(1.0 - 9.0 / 60.0, abs=1e-3)
    assert found.hand == pytest.approx(found.margin, abs=1e-3)


@pytest.mark.parametrize(
    ("changed", "missing"),
    [
        ({"insulation": None}, "insulation at which it must not trip (requirement field insulation)"),
        (
            {"at": None},
            "event with which it trips (requirement field at), or the level of its line at which it does (trip_level)",
        ),
    ],
)
def test_what_is_missing_is_named(changed: dict[str, Any], missing: str) -> None:
    found = margin(wet(**changed), "wet_lead", "B1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, f"missing: {missing}")


def test_a_wet_lead_needs_a_part() -> None:
    with pytest.raises(CircuitError, match='write the probe or contact as "of"'):
        margin(wet(of="sense"), "wet_lead", "B1")


def contact(ohms: str = "4k7", least: str | None = "1 mA", closes: bool = True, role: bool = True) -> Design:
    """9 V through a resistor and a contact that is closed from 0.2 s to 0.6 s and discharges 1 uF at first."""
    moves: list[Json] = [
        {"at": "0.2 s", "event": "close", "part": "S1"},
        {"at": "0.6 s", "event": "open", "part": "S1"},
    ]
    return design(
        exact(resistor("R1", "supply", "line", ohms)),
        two("contact", "S1", "line", "0V", data={} if least is None else {"minimum_current": least}),
        exact(two("capacitor", "C1", "line", "0V", "1u", voltage="25 V")),
        sounder("LS1", "supply", "0V", "10 mA", "3 V"),
        events=[CONNECT, *(moves if closes else [])],
        roles={"contact": "S1", "pull_up": "R1"} if role else {},
    )


@pytest.mark.parametrize(("ohms", "verdict"), [("4k7", Verdict.PASS), ("47k", Verdict.FAIL)])
def test_wetting_current_by_hand(ohms: str, verdict: Verdict) -> None:
    # 9 V / 4k7 = 1.91 mA, / 47k = 0.19 mA, of 1 mA for silver. What the capacitor gives at first does not count.
    current = 9.0 / (4700.0 if ohms == "4k7" else 47000.0)
    found = margin(contact(ohms), "wetting_current", "S1")
    assert found.capability == pytest.approx(current, rel=1e-3)
    assert found.margin == pytest.approx(1.0 - 1e-3 / current, abs=2e-3)
    assert found.hand == pytest.approx(1.0 - 1e-3 / current)
    assert found.verdict is verdict


def test_a_contact_that_never_closes() -> None:
    found = margin(contact(closes=False), "wetting_current", "S1")
    assert (found.margin, found.outcome) == (-1.0, "S1 is never closed in the sequence")


def test_its_least_current_must_be_known_only_where_it_is_a_sensor() -> None:
    assert margin(contact(least=None), "wetting_current", "S1").reason == "missing: minimum_current of S1"
    with pytest.raises(AssertionError, match="wetting_current:unit:S1 is not among"):
        margin(contact(least=None, role=False), "wetting_current", "S1")
    assert margin(contact(role=False), "wetting_current", "S1").verdict is Verdict.PASS
