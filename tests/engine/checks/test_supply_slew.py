"""Check 6, supply slew: coupled through C_c into R at the base, v = s R C_c (1 - exp(-V/(s R C))), C all at the base.

Derived in closed form; worked by hand: 10 pF, 1 M, trip at 0.38 V: 0.038 V/us. 100k and 10 nF: immune at any slew.
"""

from __future__ import annotations

import math
from typing import Any

import pytest
from scipy import constants

from stagebook.engine import edit
from stagebook.engine.circuit.circuit import build
from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict
from stagebook.engine.studies.evaluate import asks_of, judge, look
from stagebook.tui.demo.flood import FLOOD

from ..circuits import Json, capacitor, resistor, transistor
from .sheets import design, exact, margin

VT = constants.k * 298.15 / constants.e
TRIP = 0.38  # V at which 10 uA flow
ROLES = {"latch_pnp": "Q1", "latch_npn": "Q2", "base_emitter_resistor_npn": "R1", "base_emitter_resistor_pnp": "R2"}


def law(capacitance: str | None = "1 fF") -> Json:
    given = {} if capacitance is None else {"base_collector_capacitance": capacitance}
    return {"saturation_current": 10e-6 / math.expm1(TRIP / VT), "forward_gain": 200, "reverse_gain": 1, **given}


def coupled(
    ohms: str = "1M",
    stray: str = "10 pF",
    held: str | None = None,
    rise: str = "0.6 us",
    pnp_resistor: str = "47k",
    transistors: Json | None = None,
    **more: Any,
) -> Design:
    """A latch whose npn base has ``ohms`` to 0V and ``stray`` to the supply; the pnp turns on with 8 uA in 47k."""
    parts = [
        transistor("Q1", "base", "mid", "supply", "pnp", **(transistors or {"law": law()})),
        transistor("Q2", "low", "base", "0V", **(transistors or {"law": law()})),
        exact(resistor("R1", "base", "0V", ohms)),
        exact(resistor("R2", "supply", "mid", pnp_resistor)),
        exact(resistor("R3", "mid", "low", "10k")),
    ]
    roles = dict(ROLES)
    if held is not None:
        parts.append(exact(capacitor("C1", "base", "0V", held)))
        roles["base_capacitor"] = "C1"
    return design(
        *parts,
        supply="6 V",
        ambient="25 C",
        roles=roles,
        strays=[("supply", "base", stray)],
        events=[{"at": "0 s", "event": "connect supply", "rise": rise}],
        **more,
    )


def test_the_worked_slew() -> None:
    # 0.6 us to 6 V are 10 V/us; the trip level moves with what the pnp needs: 6 % of 0.38 V.
    found = margin(coupled(), "supply_slew", "Q2")
    assert found.demand == pytest.approx(10e6, rel=1e-3)
    assert found.capability == pytest.approx(0.038e6, rel=0.08)
    assert found.margin == pytest.approx(1.0 - 10.0 / 0.038, rel=0.08)
    assert (found.verdict, found.outcome) == (Verdict.FAIL, None)


@pytest.mark.parametrize("ohms", ["1M", "470k", "220k"])
def test_the_hand_formula_agrees_with_the_simulation(ohms: str) -> None:
    # Capability by hand and by trial within 10 %: 3 % resolution, and the trip level.
    found = margin(coupled(ohms), "supply_slew", "Q2")
    assert found.hand is not None
    assert found.margin is not None
    assert (1.0 - found.hand) == pytest.approx(1.0 - found.margin, rel=0.1)


def test_a_slow_connection_passes() -> None:
    # 6 V within 1 ms are 0.006 V/us of 0.038.
    found = margin(coupled(rise="1 ms"), "supply_slew", "Q2")
    assert found.margin == pytest.approx(1.0 - 0.006 / 0.038, abs=0.02)
    assert found.verdict is Verdict.PASS


def test_a_capacitor_at_the_base_makes_immune() -> None:
    # 10 pF against 10 nF divide 6 V to 6 mV, however fast.
    found = margin(coupled("100k", held="10n"), "supply_slew", "Q2")
    assert (found.margin, found.hand, found.verdict) == (1.0, 1.0, Verdict.PASS)
    assert found.outcome == "immune at any slew"
    assert found.reason is None


def test_a_latch_that_leakage_trips_is_an_outcome() -> None:
    # 4.7M from the supply put more into 1M than it takes to turn on: no slew is slow enough.
    of = coupled()
    document = of.dump()
    document["stages"][0]["parts"].append(exact(resistor("R9", "supply", "base", "4M7")))
    found = margin(Design.load(document), "supply_slew", "Q2")
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)
    assert found.outcome == found.reason == "trips however slowly the supply is connected"


@pytest.mark.parametrize("interval", ["80 ms", "1 s"])
def test_a_latch_with_a_timer_is_caught_before_it_runs_out(interval: str) -> None:
    # The flaw of the demo's first revision, with its timer made short: the trip is over long before 10 s.
    flood = FLOOD.first()
    farads = {"80 ms": "100n", "1 s": "1u"}[interval]
    circuit = build(edit.with_value(flood, "C5", farads))
    ask = next(ask for ask in asks_of(circuit) if ask.check.slug == "supply_slew")
    assert ask.trial is not None
    seen = look(circuit, [ask], circuit.nominal(), trials={ask.trial.key: [0]}, resolution=1.3)
    judged, _ = judge(ask, seen)
    assert judged.outcome(0) is None
    assert judged.margin[0] < -10.0


@pytest.mark.parametrize(
    ("transistors", "missing"),
    [
        ({"law": law(None)}, "base_collector_capacitance in the law of Q2"),
        ({"data": {"gain": "200", "v_be": "0.64 V"}}, "c_ob of Q2"),
    ],
)
def test_without_its_capacitance_it_is_unknown(transistors: Json, missing: str) -> None:
    found = margin(coupled(transistors=transistors), "supply_slew", "Q2")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, f"missing: {missing}")


def test_a_latch_whose_pnp_does_not_saturate_is_seen_to_hold() -> None:
    # The pnp feeds the npn's base directly and keeps 5.5 V; only the npn is saturated. It holds until the supply is
    # too low for 0.4 V across the npn's base and the pnp's 47k: far below 3 V.
    found = margin(coupled(moments={"latched": "10 ms"}), "latch_hold", "Q1")
    assert found.outcome is None
    assert found.margin is not None
    assert found.margin > 0.5
