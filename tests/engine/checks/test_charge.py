"""Check 29, charge: current into a stand-by battery at both ends (3 % a month: class, from memory)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import design, exact, margin

MONTH = 365.25 * 86400 / 12


def trickle(ohms: str = "100R", limit: str | None = "50 mA", load: str | None = None, **data: Any) -> Design:
    """15 V through a resistor into a battery of 12.5 V at rest (7 Ah): 25 mA through 100 ohm."""
    given: Json = {"voltage": "12.5 V", "capacity": "7 Ah", "data": {"self_discharge": "3 %/month", **data}}
    given["data"] = {key: value for key, value in given["data"].items() if value is not None}
    if limit is not None:
        given["charge_limits"] = {"current": limit}
    wanted = [] if load is None else [{"check": "charge_upkeep", "of": "G1", "load": load}]
    return design(
        exact(resistor("R1", "supply", "cell", ohms)),
        two("battery", "G1", "cell", "0V", **given),
        supply={"min": "14 V", "nominal": "15 V", "max": "16 V"},
        roles={"standby_battery": "G1", "charge_resistor": "R1"},
        requirements=wanted,
    )


@pytest.mark.parametrize(("ohms", "expected"), [("100R", 0.3), ("50R", -0.4)])
def test_the_largest_current(ohms: str, expected: float) -> None:
    # (16 - 12.5) V / 100 ohm = 35 mA of 50 mA, / 50 ohm = 70 mA.
    found = margin(trickle(ohms), "charge_current", "G1")
    assert found.margin == pytest.approx(expected, abs=2e-3)
    assert (found.corner, found.hand) == ("high supply", pytest.approx(expected))
    assert found.verdict is (Verdict.PASS if expected > 0 else Verdict.FAIL)


def test_the_least_current() -> None:
    # 7 Ah x 3 % a month = 0.288 mA of (14 - 12.5) V / 100 ohm = 15 mA.
    found = margin(trickle(), "charge_upkeep", "G1")
    assert found.demand == pytest.approx(7.0 * 3600 * 0.03 / MONTH, rel=1e-6)
    assert found.demand == pytest.approx(0.2875e-3, rel=1e-3)
    assert found.capability == pytest.approx(15e-3, rel=2e-3)
    assert found.hand == pytest.approx(found.margin, abs=1e-3)
    assert found.verdict is Verdict.PASS


def test_a_load_that_takes_more_than_the_charge() -> None:
    found = margin(trickle(load="20 mA"), "charge_upkeep", "G1")
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - 20.29 / 15.0, abs=0.01))


def test_a_contact_that_closes_charges_capacitances_and_no_battery() -> None:
    # 1 uF at 15 V behind the contact meets 12.5 V across 1 ohm: 2.5 A for microseconds; then (15 - 12.5) V / 100 ohm.
    of = trickle(resistance="1 ohm").dump()
    of["stages"][0]["parts"][0]["pins"]["b"] = "top"
    of["stages"][0]["parts"] += [
        two("contact", "S1", "top", "cell"),
        two("capacitor", "C1", "top", "0V", "1u", tolerance="0 %"),
    ]
    of["sequences"]["alarm"]["events"].append({"at": "0.5 s", "event": "close", "part": "S1"})
    found = margin(Design.load(of), "charge_current", "G1")
    assert (found.demand, found.verdict) == (pytest.approx(35e-3, rel=0.02), Verdict.PASS)


def test_batteries_in_series_count_together_by_hand() -> None:
    of = trickle().dump()
    of["conditions"]["supply"] = {"min": "27 V", "nominal": "28 V", "max": "29 V"}
    first = of["stages"][0]["parts"][1]
    first["pins"] = {"plus": "cell", "minus": "middle"}
    of["stages"][0]["parts"].append({**first, "ref": "G2", "pins": {"plus": "middle", "minus": "0V"}})
    of["stages"][0]["roles"]["standby_battery_2"] = "G2"
    found = margin(Design.load(of), "charge_current", "G1")
    assert found.margin == pytest.approx(1.0 - (29.0 - 25.0) / 100.0 / 0.05, abs=2e-3)
    assert found.hand == pytest.approx(found.margin, abs=1e-3)


def test_what_is_missing_is_named() -> None:
    # A battery that must not be charged has no limit to write: it stays unknown.
    assert margin(trickle(limit=None), "charge_current", "G1").reason == "missing: charge_limits current of G1"
    found = margin(trickle(self_discharge=None), "charge_upkeep", "G1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, "missing: self_discharge of G1")
