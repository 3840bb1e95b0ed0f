"""Required margins and derating factors of a design, each with a reason; and what a hand formula is worth."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest

from stagebook.engine import edit
from stagebook.engine.checks import catalogue
from stagebook.engine.checks.factors import FACTORS
from stagebook.engine.design.differences import apply, differences
from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError, DesignError

from ..circuits import resistor
from .sheets import design, exact, margin


def heated(**more: Any) -> Design:
    """9 V across 1k of 0.25 W: 81 mW of 0.6 x 0.25 W = 150 mW, 46 %."""
    return design(exact(resistor("R1", "supply", "0V", "1k", rating="0.25 W")), **more)


def test_a_factor_of_the_design_moves_the_margin() -> None:
    of = edit.with_derating(heated(), "resistor_power", "0.4", "sealed box")
    assert margin(of, "resistor_power", "R1").margin == pytest.approx(1.0 - 0.081 / 0.1)
    assert dict(of.reasons) == {"resistor_power": "sealed box"}
    back = edit.with_derating(of, "resistor_power", None)
    assert (dict(back.derating), dict(back.reasons)) == ({}, {})
    assert margin(back, "resistor_power", "R1").margin == pytest.approx(0.46)


def test_a_reason_for_nothing_is_refused() -> None:
    with pytest.raises(DesignError, match="reasons: v_ceo stands neither under required nor under derating"):
        heated(reasons={"v_ceo": "because"})


@pytest.mark.parametrize(
    ("table", "name", "meant"), [("derating", "v_cee", "'v_ceo'"), ("required", "resistr_power", "'resistor_power'")]
)
def test_a_table_entry_that_nothing_reads_is_refused(table: str, name: str, meant: str) -> None:
    with pytest.raises(CircuitError, match=f"field {table}: there is no '{name}'; write {meant}"):
        margin(heated(**{table: {name: "0.5"}}), "resistor_power", "R1")


def test_a_table_entry_and_its_reason_change_together() -> None:
    old, new = heated(), edit.with_derating(heated(), "resistor_power", "0.4", "sealed box")
    (change,) = differences(old, new)
    assert (change.what, change.before, change.after) == ("derating resistor_power", None, "is 0.4, because sealed box")
    assert apply(old, new, [change]) == new
    assert apply(old, new, []) == old
    (other,) = differences(new, edit.with_derating(new, "resistor_power", "0.4", "open frame"))
    assert (other.before, other.after) == ("because sealed box", "because open frame")


def test_every_check_says_what_it_is_worth() -> None:
    for check in catalogue().values():
        assert check.source
        assert check.worst, check.slug
        assert (check.accuracy is None) or check.by_hand, check.slug
    assert all(0.0 < factor.customary <= 1.0 and factor.source for factor in FACTORS.values())


@pytest.mark.parametrize(
    ("hand", "accuracy", "expected"),
    [(0.41, 0.1, False), (0.35, 0.1, True), (0.35, None, False), (None, 0.1, False), (0.57, 0.1, True)],
)
def test_a_hand_formula_disagrees_beyond_its_accuracy(
    hand: float | None, accuracy: float | None, expected: bool
) -> None:
    found = replace(margin(heated(), "resistor_power", "R1"), hand=hand, accuracy=accuracy, bound=False)
    assert found.margin == pytest.approx(0.46)
    assert found.disagrees is expected
    assert not replace(found, apart="no latch").disagrees
    # A bound is wrong only where it is too good; of a window the accuracy is a share of the value.
    assert replace(found, bound=True).disagrees is (expected and hand is not None and hand > 0.46)
    assert not replace(found, hand_scale=4.0).disagrees


def test_of_an_overrun_the_demand_counts() -> None:
    # D/C = 10 and by hand 10.8: 8 % of the demand.
    found = replace(margin(heated(), "resistor_power", "R1"), margin=-9.0, hand=-9.8, accuracy=0.1, bound=False)
    assert not found.disagrees
    assert replace(found, hand=-10.5).disagrees


@pytest.mark.parametrize(
    ("requirement", "words"),
    [
        ({"check": "sound_levle", "of": "R1"}, "there is no check 'sound_levle'; write 'sound_level'"),
        ({"check": "duration", "of": "R1", "distence": "1 m"}, "the check does not read it; leave it out"),
        ({"check": "sound_level", "of": "R1", "min": "80 dB", "distence": "1 m"}, "does not read it; write 'distance'"),
    ],
)
def test_a_requirement_that_nothing_reads_is_refused(requirement: dict[str, str], words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        margin(heated(requirements=[requirement]), "resistor_power", "R1")
