"""Check 18, line pulse: a charge into a line, divided by R and C into a filter (closed form, worked by hand)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from ..circuits import Json, capacitor, resistor
from .sheets import design, exact, margin, sounder

PULSE: Json = {"at": "0.5 s", "event": "inject", "net": "line", "charge": "100 nC", "width": "1 us"}
CONNECT: Json = {"at": "0 s", "event": "connect supply"}


def filtered(*requirements: Json, pulse: Json | None = PULSE, farads: str = "100n", **more: Any) -> Any:
    """A line of 1 nF with 10k to 0V, then 1k and C1 with 100k: an alarm is 3 V at C1, read by a load of nothing."""
    return design(
        exact(resistor("R1", "line", "0V", "10k")),
        exact(capacitor("C2", "line", "0V", "1n")),
        exact(resistor("R2", "line", "in", "1k")),
        exact(capacitor("C1", "in", "0V", farads)),
        exact(resistor("R3", "in", "0V", "100k")),
        exact(resistor("R9", "supply", "0V", "1M")),
        sounder("LS1", "in", "0V", "1 nA", "3 V", "6 V"),
        supply="6 V",
        roles={"load": "LS1"},
        events=[CONNECT, *([] if pulse is None else [pulse])],
        requirements=requirements or ({"check": "line_pulse", "of": "in"},),
        **more,
    )


def test_the_filter_divides_the_pulse() -> None:
    # 100 nC on 1 nF, shared with 100 nF through 1k: 100 nC / 101 nF = 0.99 V, less what 10k beside 1k takes, 9 %, and
    # what the tail loses. 3 V come with 3 / 0.9 times the charge.
    found = margin(filtered(), "line_pulse", "in")
    assert found.demand == pytest.approx(0.9, rel=0.02)
    assert found.capability == pytest.approx(3.0, rel=0.035)
    assert found.margin == pytest.approx(1.0 - 0.9 / 3.0, abs=0.015)
    # By hand nothing leaks away: 0.99 V.
    assert found.hand == pytest.approx(1.0 - 100.0 / 101.0 / (found.capability or 0.0), abs=0.002)
    assert found.verdict is Verdict.PASS


def test_a_small_capacitor_lets_it_through() -> None:
    # 10 nF: 100 nC / 11 nF = 9 V, less 8 %; a load must be on for 20 us, while 10 nF empty into 11k: 3 V exp(20/110).
    found = margin(filtered(farads="10n"), "line_pulse", "in")
    assert found.demand == pytest.approx(8.3, rel=0.05)
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - 8.3 / 3.6, abs=0.1))


def test_a_pulse_the_other_way_raises_nothing() -> None:
    found = margin(filtered(pulse={**PULSE, "charge": "-100 nC"}), "line_pulse", "in")
    assert found.demand == pytest.approx(0.9, rel=0.02)
    assert (found.margin, found.outcome) == (1.0, "no pulse raises an alarm, up to three hundred times the charge")


def test_without_a_pulse_it_is_unknown() -> None:
    found = margin(filtered(pulse=None), "line_pulse", "in")
    assert (found.margin, found.verdict) == (None, Verdict.UNKNOWN)
    missing = "an event inject in sequence alarm, with the charge that a pulse brings into the line"
    assert found.reason == f"missing: {missing}"


def test_without_a_net_it_is_refused() -> None:
    with pytest.raises(CircuitError, match='requirement line_pulse: write "of", the net behind the input filter'):
        margin(filtered({"check": "line_pulse"}), "line_pulse", "in")
