"""Check 24, surge: the exponential of the clamp through its stand-off and clamping points, and Ohm's law before it."""

from __future__ import annotations

import math
from typing import Any

import pytest
from scipy import optimize

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor, transistor, two
from .sheets import CONNECT, design, exact, margin

SURGE: Json = {"at": "0.5 s", "event": "surge", "to": "60 V", "for": "1 ms", "edge": "1 us", "impedance": "10R"}
STANDOFF, CLAMPS, PULSE, LEAK = 15.0, 24.0, 600.0 / 24.0, 5e-6
SLOPE = (CLAMPS - STANDOFF) / math.log(PULSE / LEAK)


def clamped(surge: float = 60.0, impedance: float = 10.0) -> float:
    """Where (V_surge - v)/R = I_R exp((v - V_R)/slope)."""
    return float(
        optimize.brentq(
            lambda v: (surge - v) / impedance - LEAK * math.exp((v - STANDOFF) / SLOPE), STANDOFF, 1.1 * CLAMPS
        )
    )


def entry(surge: Json | None = SURGE, rating: str | None = "50 V", roles: Json | None = None, **more: Any) -> Design:
    """A 15 V clamp at the rail, a transistor of 45 V and a capacitor on it."""
    rated = {} if rating is None else {"voltage": rating}
    return design(
        two("clamp", "D1", "0V", "supply", **{"class": "15 V surge clamp"}),
        exact(capacitor("C1", "supply", "0V", "1n", **rated)),
        exact(resistor("R1", "supply", "0V", "10k")),
        exact(resistor("R2", "base", "0V", "10k")),
        transistor("Q1", "supply", "base", "0V", **{"class": "small npn"}),
        supply="12 V",
        source="0R1",
        roles=roles or {},
        events=[CONNECT, *([] if surge is None else [surge])],
        **more,
    )


def test_the_clamp_holds_below_the_lowest_rating() -> None:
    # 3.8 A: 22.9 V; 0.6 of 50 V of the capacitor and 0.8 of 45 V of the transistor: 30 V count.
    found = margin(entry(), "surge_voltage", "D1")
    assert found.demand == pytest.approx(clamped(), rel=3e-3)
    assert found.capability == pytest.approx(30.0)
    assert found.margin == pytest.approx(1.0 - clamped() / 30.0, abs=3e-3)
    assert found.hand == pytest.approx(1.0 - 24.0 / 30.0)
    assert found.verdict is Verdict.PASS


def test_a_low_rating_behind_it_fails() -> None:
    found = margin(entry(rating="25 V"), "surge_voltage", "D1")
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - clamped() / 15.0, abs=6e-3))


def test_its_energy_against_the_rated_pulse() -> None:
    # 22.9 V 3.7 A 1 ms = 85 mJ of 600 W 1 ms.
    found = margin(entry(), "surge_energy", "D1")
    energy = clamped() * (60.0 - clamped()) / 10.0 * 1e-3
    assert found.capability == pytest.approx(0.6)
    assert found.demand == pytest.approx(energy, rel=5e-3)
    assert found.hand == pytest.approx(found.margin, abs=0.02)
    assert found.verdict is Verdict.PASS


def test_a_long_surge_through_little_burns_it() -> None:
    # 40 ms through 0R5: it bears the root of 1 ms 10 ms, 1.9 J.
    surge = {**SURGE, "for": "40 ms", "impedance": "0R5"}
    found = margin(entry(surge), "surge_energy", "D1")
    energy = clamped(60.0, 0.5) * (60.0 - clamped(60.0, 0.5)) / 0.5 * 40e-3
    assert found.capability == pytest.approx(600.0 * math.sqrt(1e-3 * 10e-3))
    assert (found.verdict, found.demand) == (Verdict.FAIL, pytest.approx(energy, rel=0.01))


@pytest.mark.parametrize(
    ("of", "slug", "missing"),
    [
        (entry(rating=None), "surge_voltage", "voltage of C1"),
        (entry(None, roles={"clamp": "D1"}), "surge_voltage", "an event surge in a sequence"),
        (entry(None, roles={"clamp": "D1"}), "surge_energy", "an event surge in a sequence"),
    ],
)
def test_what_is_missing_is_named(of: Design, slug: str, missing: str) -> None:
    found = margin(of, slug, "D1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, f"missing: {missing}")


def test_without_a_surge_or_its_role_it_is_not_asked() -> None:
    with pytest.raises(AssertionError, match="surge_voltage:unit:D1 is not among"):
        margin(entry(None), "surge_voltage", "D1")
