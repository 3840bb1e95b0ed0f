"""Check 25, reversal: the largest reverse voltage against V_RRM (common practice, no source)."""

from __future__ import annotations

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, exact, margin

SUPPLY = {"min": "9 V", "nominal": "12 V", "max": "16 V"}


def entry(rating: str | None, reversed_: bool, role: bool = True) -> Design:
    """A series diode before 1k."""
    law: Json = {"saturation_current": "1e-12 A"}
    ratings = {} if rating is None else {"data": {"v_rrm": rating}}
    events: list[Json] = [{"at": "0 s", "event": "reverse supply"}] if reversed_ else [CONNECT]
    return design(
        two("diode", "D1", "supply", "fed", law=law, **ratings),
        exact(resistor("R1", "fed", "0V", "1k")),
        supply=SUPPLY,
        source="1R",
        events=events,
        roles={"reverse_diode": "D1"} if role else {},
    )


@pytest.mark.parametrize("reversed_", [True, False])
@pytest.mark.parametrize(("rating", "expected"), [("40 V", 1.0 - 16.0 / 40.0), ("12 V", 1.0 - 16.0 / 12.0)])
def test_the_entry_diode_takes_the_supply(rating: str, expected: float, reversed_: bool) -> None:
    found = margin(entry(rating, reversed_), "reversal", "D1")
    assert found.margin == pytest.approx(expected, abs=2e-3)
    assert found.verdict is (Verdict.PASS if expected > 0 else Verdict.FAIL)
    assert found.corner == "high supply"
    assert found.hand == pytest.approx(expected)


def test_another_diode_has_what_the_sequences_show() -> None:
    found = margin(entry("40 V", reversed_=False, role=False), "reversal", "D1")
    assert found.margin == pytest.approx(1.0, abs=1e-3)
    assert margin(entry("40 V", reversed_=True, role=False), "reversal", "D1").demand == pytest.approx(16.0, rel=1e-3)


def test_a_factor_of_the_design() -> None:
    of = Design.load({**entry("40 V", True).dump(), "derating": {"v_rrm": "0.5"}})
    assert margin(of, "reversal", "D1").margin == pytest.approx(1.0 - 16.0 / 20.0, abs=2e-3)


def test_without_a_rating_it_is_unknown() -> None:
    found = margin(entry(None, True), "reversal", "D1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, "missing: v_rrm of D1")
