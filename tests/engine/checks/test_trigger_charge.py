"""Check 4, trigger charge: a step dV through C_t to a base that C_b holds comes to dV C_t/(C_t + C_b) (closed form)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor, two
from .sheets import exact, margin, sounder
from .test_supply_slew import TRIP, coupled

NODE, STEP = 1e-9, 6.0
LEAST = NODE * TRIP / (STEP - TRIP)  # 67.6 pF bring the base to 0.38 V


def triggered(farads: str = "330p", roles: bool = True, events: tuple[Json, ...] = (), **more: Any) -> Design:
    """The latch of check 6 with 1 nF and 1M at its base; S1 steps C2 to the supply at 0.5 s."""
    document = coupled("1M", stray="1 fF", held="1n", rise="10 ms", **more).dump()
    document["stages"][0]["parts"] += [
        two("contact", "S1", "supply", "trig"),
        exact(resistor("R8", "trig", "0V", "100k")),
        exact(capacitor("C2", "trig", "base", farads)),
    ]
    if roles:
        document["stages"][0]["roles"]["trigger_capacitor"] = "C2"
    document["sequences"]["alarm"]["events"] += events or [{"at": "0.5 s", "event": "close", "part": "S1"}]
    return Design.load(document)


def test_the_smallest_capacitor_that_fires() -> None:
    # 6 % for the trip level, which moves with what the pnp needs, and 3 % of the trial.
    found = margin(triggered(), "trigger_charge", "C2")
    assert found.capability == pytest.approx(330e-12 * STEP, rel=1e-3)
    assert found.demand == pytest.approx(LEAST * STEP, rel=0.1)
    assert found.margin == pytest.approx(1.0 - LEAST / 330e-12, abs=0.02)
    assert found.hand == pytest.approx(found.margin, abs=0.02)
    assert found.verdict is Verdict.PASS


def test_too_small_a_capacitor_does_not_fire() -> None:
    # 47 pF come to 0.27 V.
    found = margin(triggered("47p"), "trigger_charge", "C2")
    assert (found.verdict, found.outcome) == (Verdict.FAIL, None)
    assert found.margin == pytest.approx(1.0 - LEAST / 47e-12, abs=0.15)


def test_a_hopeless_trigger_is_an_outcome() -> None:
    found = margin(triggered("1p"), "trigger_charge", "C2")
    assert (found.margin, found.outcome) == (-1.0, "never fired: not with thirty times the capacitor either")


def test_a_bouncing_contact_fires_too() -> None:
    bounce = {"at": "0.5 s", "event": "close", "part": "S1", "bounce": {"for": "2 ms", "times": 3}}
    found = margin(triggered(events=(bounce,)), "trigger_charge", "C2")
    assert found.margin == pytest.approx(1.0 - LEAST / 330e-12, abs=0.03)


def test_without_a_latch_the_roles_are_named() -> None:
    document = triggered().dump()
    del document["stages"][0]["roles"]["latch_pnp"]
    found = margin(Design.load(document), "trigger_charge", "C2")
    assert (found.margin, found.verdict) == (None, Verdict.UNKNOWN)
    assert found.reason == "missing: the roles latch_npn and latch_pnp, or a load with operating_minimum"


def test_without_a_latch_the_load_tells() -> None:
    # C2 leads to a net of its own: 6 V C/(C + 1 nF) above 2 V needs 500 pF. 1k make the step last some 0.3 us.
    document = triggered("1n", roles=True).dump()
    del document["stages"][0]["roles"]["latch_pnp"]
    document["stages"][0]["parts"][-1]["pins"] = {"a": "slow", "b": "n"}
    document["stages"][0]["parts"] += [
        exact(resistor("R10", "trig", "slow", "1k")),
        exact(capacitor("C3", "n", "0V", "1n")),
        exact(resistor("R9", "n", "0V", "10M")),
        sounder("LS1", "n", "0V", "1 nA", "2 V", "6 V"),
    ]
    document["stages"][0]["roles"]["load"] = "LS1"
    found = margin(Design.load(document), "trigger_charge", "C2")
    assert found.margin == pytest.approx(0.5, abs=0.02)
    assert found.hand is None


def test_without_an_event_it_is_unknown() -> None:
    document = triggered().dump()
    document["sequences"]["alarm"]["events"].pop()
    found = margin(Design.load(document), "trigger_charge", "C2")
    assert found.reason == (
        "missing: an event in sequence alarm that raises the alarm, or its time as from in the requirement"
    )


def test_without_its_role_it_is_not_asked() -> None:
    with pytest.raises(AssertionError, match="trigger_charge:unit:C2 is not among"):
        margin(triggered(roles=False), "trigger_charge", "C2")
