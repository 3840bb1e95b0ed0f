"""Check 17, bounce and acceptance: an RC debounce into a single transistor, t = -R C ln(1 - V_th/V) (closed form)."""

from __future__ import annotations

import math
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor, two
from .sheets import design, exact, margin, sounder

V, VTH = 6.0, 3.5
REACH = 10e-3 * math.log(V / (V - VTH))  # 8.75 ms with 100k and 100n


def debounced(*requirements: Json, farads: str = "100n", **more: Any) -> Design:
    """S1 charges C1 through R1, R2 drains it; an ideal comparator would do, here the load is the capacitor's voltage.

    The load draws a nanoampere, and is on above 3.5 V: it sits across the capacitor itself.
    """
    return design(
        two("contact", "S1", "supply", "line", data={"insulation": "1000G"}),
        exact(resistor("R1", "line", "n", "100k")),
        exact(resistor("R2", "line", "0V", "1k")),
        exact(capacitor("C1", "n", "0V", farads)),
        sounder("LS1", "n", "0V", "1 nA", f"{VTH} V", "6 V"),
        supply="6 V",
        roles={"load": "LS1"},
        events=[{"at": "0 s", "event": "connect supply"}, {"at": "0.5 s", "event": "close", "part": "S1"}],
        requirements=requirements,
        **more,
    )


def test_a_burst_is_half_an_event() -> None:
    # Closed for half of the time in pieces that are short against 10 ms it comes to 3 V and some ripple, not to 6 V.
    asked = {"check": "contact_bounce", "of": "S1", "max": "1 ms", "times": 100}
    found = margin(debounced(asked), "contact_bounce", "S1")
    assert (found.margin, found.outcome) == (1.0, "no burst raises an alarm, however long")


def test_the_longest_piece_of_a_burst_decides() -> None:
    # One interruption: closed for half the burst, open for the other half. 8.75 ms closed are 17.5 ms of burst.
    asked = {"check": "contact_bounce", "of": "S1", "max": "5 ms", "times": 1}
    found = margin(debounced(asked), "contact_bounce", "S1")
    assert found.demand == pytest.approx(5e-3)
    assert found.capability == pytest.approx(2.0 * REACH, rel=0.035)
    assert found.margin == pytest.approx(1.0 - 5e-3 / (2.0 * REACH), abs=0.025)
    assert found.verdict is Verdict.PASS


def test_a_small_capacitor_lets_the_bounce_through() -> None:
    asked = {"check": "contact_bounce", "of": "S1", "max": "5 ms", "times": 1}
    found = margin(debounced(asked, farads="22n"), "contact_bounce", "S1")
    assert found.margin == pytest.approx(1.0 - 5e-3 / (0.22 * 2.0 * REACH), abs=0.045)
    assert found.verdict is Verdict.FAIL


def test_an_event_that_is_long_enough_is_accepted() -> None:
    # Without a bounce it takes 8.75 ms.
    found = margin(debounced({"check": "acceptance", "of": "S1", "min": "20 ms"}), "acceptance", "S1")
    assert found.demand == pytest.approx(REACH, rel=0.035)
    assert found.margin == pytest.approx(1.0 - REACH / 20e-3, abs=0.015)
    assert found.verdict is Verdict.PASS


def test_a_bounce_at_its_beginning_delays_it() -> None:
    # 4 ms of bounce in four turns are 2 ms closed: half of 2 ms is lost, and what the open halves drain.
    asked = {"check": "acceptance", "of": "S1", "min": "20 ms", "max": "4 ms"}
    found = margin(debounced(asked), "acceptance", "S1")
    assert found.demand is not None
    assert REACH + 2e-3 < found.demand < REACH + 4e-3


def test_an_event_that_is_too_short_is_missed() -> None:
    found = margin(debounced({"check": "acceptance", "of": "S1", "min": "5 ms"}), "acceptance", "S1")
    assert found.margin == pytest.approx(1.0 - REACH / 5e-3, abs=0.06)
    assert found.verdict is Verdict.FAIL


def test_a_contact_that_does_nothing_never_fires() -> None:
    of = debounced({"check": "acceptance", "of": "S1", "min": "20 ms"}).dump()
    of["stages"][0]["parts"][1]["value"] = "10G"
    found = margin(Design.load(of), "acceptance", "S1")
    assert (found.margin, found.outcome) == (-1.0, "never fired: not by an event of thirty times that length either")


@pytest.mark.parametrize(
    ("slug", "missing"),
    [
        ("contact_bounce", "bounce of S1, or max in the requirement contact_bounce"),
        ("acceptance", "min, the shortest true event, in the requirement acceptance of S1"),
    ],
)
def test_what_is_missing_is_named(slug: str, missing: str) -> None:
    found = margin(debounced({"check": slug, "of": "S1"}), slug, "S1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, f"missing: {missing}")


def test_a_part_that_is_no_contact_is_refused() -> None:
    with pytest.raises(CircuitError, match="requirement acceptance of R1: it is no contact that events move"):
        margin(debounced({"check": "acceptance", "of": "R1", "min": "20 ms"}), "acceptance", "S1")


def test_a_spike_across_the_load_is_no_alarm() -> None:
    # A capacitor from the line to the load's net lifts it at once to 6 V: 100 nF and 10k for 0.5 ms, an alarm as soon
    # as the contact stays closed for 20 us, an eighth of a burst of 0.16 ms; 10 pF only for 0.05 us.
    found = margin(coupled_load("100n"), "contact_bounce", "S1")
    assert found.capability == pytest.approx(160e-6, rel=0.04)
    found = margin(coupled_load("10p"), "contact_bounce", "S1")
    assert (found.margin, found.outcome) == (1.0, "no burst raises an alarm, however long")


def coupled_load(farads: str) -> Design:
    of = debounced({"check": "contact_bounce", "of": "S1", "max": "0.1 ms", "times": 4}, farads=farads).dump()
    parts = {part["ref"]: part for part in of["stages"][0]["parts"]}
    parts["C1"]["pins"] = {"a": "line", "b": "n"}
    parts["R1"] |= {"pins": {"a": "n", "b": "0V"}, "value": "10k"}
    return Design.load(of)
