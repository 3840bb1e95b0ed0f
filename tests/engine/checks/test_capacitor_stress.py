"""Check 13, capacitor stress: peak, reverse and ripple (factors and the 1 V of reverse: common practice, no source)."""

from __future__ import annotations

import math
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor, sine, steps
from .sheets import design, exact, margin, sounder


def polarised(value: str = "1u", **fields: Any) -> Json:
    pins = {"plus": "n", "minus": "0V"}
    base = {"ref": "C1", "kind": "capacitor", "pins": pins, "value": value, "tolerance": "0 %"}
    return {**base, "voltage": "25 V", "leakage": {"specified": "1 nA"}, **fields}


def charged(part: Json) -> Design:
    supply = {"min": "6 V", "nominal": "9 V", "max": "12 V"}
    return design(exact(resistor("R1", "supply", "n", "10k")), part, supply=supply)


def test_a_charged_capacitor_stands_at_the_supply() -> None:
    # 10k and 1 uF: after 1 s, a hundred time constants, 12 V of 0.6 x 25 V: 1 - 12/15 = 20 %.
    found = margin(charged(exact(capacitor("C1", "n", "0V", "1u", voltage="25 V"))), "capacitor_voltage", "C1")
    assert found.margin == pytest.approx(0.2, abs=1e-3)
    assert (found.verdict, found.corner) == (Verdict.PASS, "high supply")
    assert found.hand == pytest.approx(0.2)


def test_an_electrolytic_has_another_factor() -> None:
    # 12 V of 0.8 x 25 V = 20 V; of a 12 V type 9.6 V: it fails.
    assert margin(charged(polarised()), "capacitor_voltage", "C1").margin == pytest.approx(0.4, abs=1e-3)
    found = margin(charged(polarised(voltage="12 V")), "capacitor_voltage", "C1")
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - 12.0 / 9.6, abs=1e-3))


def test_a_missing_rating_is_named() -> None:
    found = margin(charged(capacitor("C1", "n", "0V", "1u")), "capacitor_voltage", "C1")
    assert (found.verdict, found.margin, found.reason) == (Verdict.UNKNOWN, None, "missing: voltage of C1")


@pytest.mark.parametrize(("volts", "verdict"), [(-0.6, Verdict.PASS), (-1.5, Verdict.FAIL)])
def test_the_wrong_way_round(volts: float, verdict: Verdict) -> None:
    of = design(
        steps("G1", "drive", "0V", (0.0, 0.0), (0.1, 5.0), (0.2, 5.0), (0.3, volts), (1.0, volts)),
        exact(resistor("R1", "drive", "n", "1k")),
        polarised(),
        events=(),
    )
    found = margin(of, "capacitor_reverse", "C1")
    assert found.demand == pytest.approx(-volts, rel=1e-2)
    assert (found.capability, found.verdict) == (1.0, verdict)


def test_an_unpolarised_capacitor_has_no_wrong_way() -> None:
    of = charged(exact(capacitor("C1", "n", "0V", "1u", voltage="25 V")))
    with pytest.raises(AssertionError, match="capacitor_reverse:unit:C1 is not among"):
        margin(of, "capacitor_reverse", "C1")


def rippled(rating: str | None = "50 mA", resistance: str | None = "1R", **more: Any) -> Design:
    """1 V at 50 Hz, its middle at 5 V, through 9 ohm into 100 uF and its resistance."""
    given = {"ripple_rating": rating, "series_resistance": resistance}
    fields = {key: value for key, value in given.items() if value is not None}
    return design(
        sine("G1", "drive", "0V", 1.0, 50.0, 5.0),
        exact(resistor("R1", "drive", "n", "9R")),
        polarised("100u", **fields),
        roles={"filter_capacitor": "C1"},
        events=(),
        **more,
    )


def test_ripple_of_a_sine_by_hand() -> None:
    # Z = 10 ohm and 1/(2 pi 50 100 uF) = 31.8 ohm: 1 V / 33.4 ohm / sqrt 2 = 21.2 mA of 50 mA. 2 % for the steps.
    found = margin(rippled(), "capacitor_ripple", "C1")
    reactance = 1.0 / (2.0 * math.pi * 50.0 * 100e-6)
    assert found.demand == pytest.approx(1.0 / math.hypot(10.0, reactance) / math.sqrt(2.0), rel=0.02)
    assert (found.capability, found.verdict) == (pytest.approx(0.05), Verdict.PASS)
    assert margin(rippled("15 mA"), "capacitor_ripple", "C1").verdict is Verdict.FAIL


@pytest.mark.parametrize(
    ("left_out", "missing"), [("rating", "ripple_rating of C1"), ("resistance", "series_resistance of C1")]
)
def test_ripple_needs_rating_and_resistance(left_out: str, missing: str) -> None:
    found = margin(rippled(**{left_out: None}), "capacitor_ripple", "C1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, f"missing: {missing}")


def test_ripple_of_an_alarm_that_does_not_end() -> None:
    # The load is on from the connection to the end: 9 V through 9 ohm and a load of 9 mA has no ripple to speak of.
    of = design(
        exact(resistor("R1", "supply", "n", "9R")),
        polarised("100u", ripple_rating="50 mA", series_resistance="1R"),
        sounder("LS1", "n", "0V", "9 mA", "3 V"),
        roles={"filter_capacitor": "C1", "load": "LS1"},
    )
    found = margin(of, "capacitor_ripple", "C1")
    assert found.verdict is Verdict.PASS
    assert found.demand == pytest.approx(0.0, abs=1e-3)
