"""Check 7, reverse base-emitter: the largest reverse voltage of all sequences against 0.8 V_EBO (from memory)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor, transistor, two
from .sheets import CONNECT, design, exact, margin

DATA: Json = {"gain": "200", "v_be": "0.64 V", "v_ebo": "5 V"}
KICK: Json = {"at": "0.5 s", "event": "close", "part": "S1"}


def differentiator(supply: str, events: list[Json], data: Json = DATA, kind: str = "npn", **more: Any) -> Design:
    """100 nF, charged to the supply within 0.1 s, whose far end S1 pulls down (npn) or up (pnp) at the base."""
    rail, common = ("supply", "0V") if kind == "npn" else ("0V", "supply")
    return design(
        exact(resistor("R1", rail, "far", "10k")),
        two("contact", "S1", "far", common),
        exact(capacitor("C1", "far", "base", "100n")),
        exact(resistor("R2", "base", common, "100k")),
        exact(resistor("R3", rail, "out", "10k")),
        transistor("Q1", "out", "base", common, kind, data=data),
        supply=supply,
        ambient="25 C",
        events=[CONNECT, *events],
        **more,
    )


@pytest.mark.parametrize("kind", ["npn", "pnp"])
@pytest.mark.parametrize(("supply", "expected"), [("3 V", 1.0 - 3.0 / 4.0), ("9 V", 1.0 - 9.0 / 4.0)])
def test_a_differentiator_kicks_the_base_by_the_supply(kind: str, supply: str, expected: float) -> None:
    # The capacitor carries the whole step: D is the supply, C = 0.8 x 5 V.
    found = margin(differentiator(supply, [KICK], kind=kind), "reverse_base_emitter", "Q1")
    assert found.margin == pytest.approx(expected, abs=0.005)
    assert found.capability == pytest.approx(4.0)
    assert found.verdict is (Verdict.PASS if expected > 0.0 else Verdict.FAIL)


def test_the_worst_of_all_sequences_counts() -> None:
    of = differentiator("9 V", [])
    assert margin(of, "reverse_base_emitter", "Q1").margin == pytest.approx(1.0, abs=0.01)
    both = Design.load(
        {
            **of.dump(),
            "sequences": {
                "alarm": {"ends": "1 s", "events": [CONNECT]},
                "kick": {"ends": "1 s", "events": [CONNECT, KICK]},
            },
        }
    )
    assert margin(both, "reverse_base_emitter", "Q1").margin == pytest.approx(1.0 - 9.0 / 4.0, abs=0.005)


def test_the_simulation_breaks_down_at_the_typical_value_and_is_judged_by_the_rating() -> None:
    # Breakdown 8 V typical, rated 5 V: the spike stops near 8 V and is a failure all the same.
    found = margin(
        differentiator("20 V", [KICK], {**DATA, "base_emitter_breakdown": "8 V"}), "reverse_base_emitter", "Q1"
    )
    assert found.demand is not None
    assert 8.0 < found.demand < 9.0
    assert found.verdict is Verdict.FAIL


def test_derating_of_the_design_and_of_the_requirement() -> None:
    table = differentiator("3 V", [KICK], derating={"v_ebo": "1.0"})
    assert margin(table, "reverse_base_emitter", "Q1").margin == pytest.approx(1.0 - 3.0 / 5.0, abs=0.005)
    own = differentiator(
        "3 V", [KICK], derating={"v_ebo": "1.0"}, requirements=[{"check": "reverse_base_emitter", "derating": "0.9"}]
    )
    assert margin(own, "reverse_base_emitter", "Q1").margin == pytest.approx(1.0 - 3.0 / 4.5, abs=0.005)


def test_without_the_rating_it_is_unknown() -> None:
    data = {key: text for key, text in DATA.items() if key != "v_ebo"}
    found = margin(differentiator("3 V", [KICK], data), "reverse_base_emitter", "Q1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, "missing: v_ebo of Q1")
