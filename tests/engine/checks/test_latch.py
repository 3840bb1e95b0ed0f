"""Check 5, latch hold and latch reset, by the trial that lowers the supply until the latch lets go.

Held while alpha1 + alpha2 >= 1 (Ebers, Proc. IRE 40 (1952) 1361, from memory). Exact active-mode holding current for
B = 50 and 100, I_S 1e-14 A, 300 K, 1k at the second base only: 0.5485 mA.
"""

from __future__ import annotations

import pytest
from scipy import constants

from stagebook.engine.circuit.circuit import build
from stagebook.engine.results import Verdict
from stagebook.engine.studies.evaluate import asks_of
from stagebook.engine.studies.trials import TrialRun

from ..circuits import Json, capacitor, resistor, two
from .latches import latch
from .sheets import exact, margin

HOLDING = 0.5485e-3
RESET: Json = {"at": "20 ms", "event": "close", "part": "S2"}


def test_the_worked_holding_current_by_a_fine_trial() -> None:
    # Fed through R the latch lets go where dI/dV = -1/R. Both transistors, still a little saturated, carry I_H and
    # something that falls as exp(-V/V_T): V_T/R more than I_H, 2.6 uA for 10k.
    expected = HOLDING + constants.k * 300.0 / constants.e / 10e3
    circuit = build(latch())
    ask = next(ask for ask in asks_of(circuit) if ask.check.slug == "latch_hold")
    assert ask.trial is not None
    edge = TrialRun(circuit, ask.trial, circuit.nominal()).edge(resolution=1.0001)
    current = edge.values[ask.trial.rows[0]]
    assert current == pytest.approx(expected, rel=2e-3)
    # The supply at which it lets go: 0.5485 mA x 10k and the latch's own drop of one junction and V_CE(sat).
    assert 12.0 / edge.knob == pytest.approx(5.485 + 0.7, abs=0.1)
    assert not (edge.never | edge.always | edge.missing).any()


def test_hold_margin_of_the_worked_latch() -> None:
    # 12 V through 10k carry about 1.13 mA. The trial stops within 3 % of the supply, 3.4 % of the current.
    found = margin(latch(), "latch_hold", "Q1")
    assert found.demand is not None
    assert found.capability is not None
    assert HOLDING * 0.999 <= found.demand <= HOLDING * 1.035
    assert found.capability == pytest.approx((12.0 - 0.75) / 10e3, rel=0.01)
    assert found.margin == pytest.approx(1.0 - HOLDING / found.capability, abs=0.02)
    assert (found.verdict, found.outcome) == (Verdict.PASS if found.margin >= 0.5 else Verdict.THIN, None)


@pytest.mark.parametrize(("feed", "verdict"), [("4k7", Verdict.PASS), ("18k", Verdict.THIN)])
def test_hold_by_feed(feed: str, verdict: Verdict) -> None:
    # 2.4 mA and 0.63 mA against 0.55 mA.
    assert margin(latch(feed), "latch_hold", "Q1").verdict is verdict


def test_a_battery_that_would_keep_it_on_is_lowered_with_the_supply() -> None:
    # 12 V of a battery behind 10k and a diode keep 1 mA in it, whatever becomes of the supply: twice what it takes.
    cell = two("battery", "BT1", "cell", "0V", voltage="12 V", resistance="1R")
    blocking = two("diode", "D1", "cell", "behind", **{"class": "signal diode"})
    of = latch(extra=[cell, blocking, exact(resistor("R6", "behind", "top", "10k"))])
    found = margin(of, "latch_hold", "Q1")
    assert found.demand is not None
    assert HOLDING * 0.999 <= found.demand <= HOLDING * 1.05
    assert found.capability == pytest.approx(2.1e-3, rel=0.05)


def test_the_hand_formula_for_both_resistors() -> None:
    # V_BE,N/R_N + V_BE,P/R_P with V_BE at 0.1 mA, an estimate: within 20 % of the current.
    found = margin(latch("2k2", npn="1k", pnp="1k"), "latch_hold", "Q1")
    assert found.margin is not None
    assert found.hand is not None
    assert (1.0 - found.hand) == pytest.approx(1.0 - found.margin, rel=0.2)


def test_a_latch_that_was_never_set_is_an_outcome() -> None:
    # The moment hangs on an event that does not come.
    of = latch(fired=False, moments={"latched": {"after": "gate above 0.5 V", "by": "1 ms"}})
    found = margin(of, "latch_hold", "Q1")
    words = "'gate above 0.5 V' never happened, after which the latch is looked at"
    assert (found.margin, found.verdict, found.outcome) == (-1.0, Verdict.FAIL, words)


def test_a_latch_that_lets_go_by_itself_is_an_outcome() -> None:
    # Fed through 1M, which is far too little, and for some milliseconds from 10 uF that was charged before.
    of = latch("1M", extra=[exact(resistor("R6", "top", "tank", "1k")), exact(capacitor("C1", "tank", "0V", "10u"))])
    charged = of.dump() | {"starts": {"tank": "11 V", "top": "11 V"}}
    document = type(of).load({**charged, "sequences": {"alarm": {**charged["sequences"]["alarm"], "events": [
        event for event in charged["sequences"]["alarm"]["events"] if event["event"] != "connect supply"
    ]}}})  # fmt: skip
    found = margin(document, "latch_hold", "Q1")
    assert (found.margin, found.outcome) == (-1.0, "the latch lets go by itself")


def test_reset_leaves_nothing() -> None:
    of = latch(events=[RESET], moments={"latched": "10 ms", "reset": "25 ms"})
    found = margin(of, "latch_reset", "Q1")
    assert found.demand == pytest.approx(0.0, abs=1e-6)
    assert found.margin == pytest.approx(1.0, abs=1e-2)
    assert found.verdict is Verdict.PASS


def test_a_reset_too_weak_does_not_let_go() -> None:
    # 4k7 beside the latch takes 0.17 mA of 1.13 mA: the latch keeps more than its holding current.
    of = latch(events=[RESET], reset="4k7", moments={"latched": "10 ms", "reset": "25 ms"})
    found = margin(of, "latch_reset", "Q1")
    assert (found.margin, found.verdict, found.outcome) == (-1.0, Verdict.FAIL, "did not let go")
    assert found.demand is not None
    assert found.capability is not None
    assert found.demand > found.capability


def test_a_reset_whose_moment_never_came() -> None:
    of = latch(events=[RESET], moments={"latched": "10 ms", "reset": {"after": "gate above 3 V"}})
    found = margin(of, "latch_reset", "Q1")
    assert (found.margin, found.outcome) == (-1.0, "the instant of the reset never came")


def test_without_a_moment_of_reset_it_is_not_asked() -> None:
    with pytest.raises(AssertionError, match="latch_reset:unit:Q1 is not among"):
        margin(latch(), "latch_reset", "Q1")


def test_half_a_latch_is_none() -> None:
    of = latch()
    document = of.dump()
    del document["stages"][0]["roles"]["latch_pnp"]
    with pytest.raises(AssertionError, match="latch_hold:unit:Q1 is not among"):
        margin(type(of).load(document), "latch_hold", "Q1")
