"""Check 28, sound level: 20 log10 of the distance from a point source (ISO 9613-2 without absorption)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from .sheets import design, margin, sounder


def loud(level: str | None = "88 dB", supply: Any = "9 V", least: str = "3 V", **requirement: Any) -> Design:
    """A sounder of 9 V across the supply."""
    load = sounder("LS1", "supply", "0V", "20 mA", least)
    if level is not None:
        load["data"]["sound_level"] = level
    wanted = {"check": "sound_level", "of": "LS1", "min": "80 dB", "distance": "1 m", **requirement}
    return design(load, supply=supply, requirements=[{k: v for k, v in wanted.items() if v is not None}])


@pytest.mark.parametrize(
    ("distance", "expected", "verdict"),
    [
        # 88 dB at 1 m; 20 log10 2 = 6.02 dB; 20 log10 10 = 20 dB.
        ("1 m", 0.8, Verdict.PASS),
        ("2 m", (88 - 6.0206 - 80) / 10, Verdict.THIN),
        ("10 m", (88 - 20 - 80) / 10, Verdict.FAIL),
    ],
)
def test_the_distance(distance: str, expected: float, verdict: Verdict) -> None:
    found = margin(loud(distance=distance), "sound_level", "LS1")
    assert found.margin == pytest.approx(expected, abs=1e-3)
    assert (found.verdict, found.demand, found.unit) == (verdict, 80.0, "dB")


def test_half_the_voltage_is_six_decibels_less() -> None:
    found = margin(loud(supply={"min": "4.5 V", "nominal": "9 V", "max": "9 V"}), "sound_level", "LS1")
    assert found.margin == pytest.approx((88 - 6.0206 - 80) / 10, abs=2e-3)
    assert found.capability == pytest.approx(82, abs=0.05)
    assert found.corner == "low supply"
    assert found.hand == pytest.approx(found.margin, abs=1e-3)


def test_silence_is_an_outcome() -> None:
    found = margin(loud(least="12 V"), "sound_level", "LS1")
    assert (found.margin, found.outcome) == (-1.0, "LS1 never came on")


@pytest.mark.parametrize(
    ("given", "missing"),
    [
        ({"level": None}, "sound_level of LS1"),
        ({"distance": None}, "distance at which it is to be heard (requirement field distance)"),
    ],
)
def test_what_is_missing_is_named(given: dict[str, Any], missing: str) -> None:
    found = margin(loud(**given), "sound_level", "LS1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, f"missing: {missing}")


@pytest.mark.parametrize(("given", "words"), [({"min": None}, 'write "of" and "min"'), ({"distance": "0 m"}, "above")])
def test_a_requirement_that_cannot_be_read(given: dict[str, Any], words: str) -> None:
    with pytest.raises(CircuitError, match=words):
        margin(loud(**given), "sound_level", "LS1")
