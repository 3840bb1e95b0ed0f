"""Check 16, release of a coil: closed form of a current through its clamp (required margin: common practice)."""

from __future__ import annotations

import math

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from ..circuits import Json, two
from .sheets import CONNECT, design, margin


def relay(clamp: str = "diode", allowed: str | None = "20 ms", **data: str) -> Design:
    """12 V on 400 ohm and 1 H through a contact that opens at 0.5 s; lets go at 2 V / 400 ohm = 5 mA, armature 2 ms."""
    coil = {"resistance": "400R", "inductance": "1 H", "pick_up": "9 V", "drop_out": "2 V", **data}
    forward = {"forward_low": "0.7 V", "forward_low_current": "10 mA"}
    parts: list[Json] = [
        two("contact", "S1", "supply", "top"),
        two("coil", "K1", "top", "0V", **coil),
        two("diode", "D1", "0V", "back", data=forward),
    ]
    if clamp == "zener":
        parts.append(two("zener", "D2", "top", "back", "12 V", tolerance="0 %", data=forward))
    else:
        parts[-1]["pins"]["cathode"] = "top"
    requirements: list[Json] = [] if allowed is None else [{"check": "release", "of": "K1", "max": allowed}]
    events = [CONNECT, {"at": "0.1 s", "event": "close", "part": "S1"}, {"at": "0.5 s", "event": "open", "part": "S1"}]
    return design(*parts, supply="12 V", events=events, ends="0.7 s", requirements=requirements)


@pytest.mark.parametrize(("clamp", "volts"), [("diode", 0.69), ("zener", 12.75)])
def test_the_current_goes_on_through_the_clamp(clamp: str, volts: float) -> None:
    # L/R ln((I_0 R + V_k)/(I_d R + V_k)) + 2 ms, I_0 R = 12 V, I_d R = 2 V: 2.5 ms ln(12.69/2.69) + 2 ms = 5.88 ms with
    # the diode, 2.5 ms ln(24.75/14.75) + 2 ms = 3.29 ms with the zener. The clamp's voltage falls a little meanwhile.
    expected = 2.5e-3 * math.log((12.0 + volts) / (2.0 + volts)) + 2e-3
    found = margin(relay(clamp, armature_delay="2 ms"), "release", "K1")
    assert found.demand == pytest.approx(expected, rel=0.03)
    assert (found.capability, found.verdict) == (pytest.approx(20e-3), Verdict.PASS)
    assert found.hand == pytest.approx(found.margin, abs=0.02)
    assert not found.disagrees


def test_a_slow_release_fails() -> None:
    found = margin(relay(allowed="5 ms", armature_delay="2 ms"), "release", "K1")
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - 5.88 / 5.0, abs=0.04))
    thin = margin(relay(allowed="7 ms", armature_delay="2 ms"), "release", "K1")
    assert thin.verdict is Verdict.THIN


def test_a_coil_that_holds_is_told_in_words() -> None:
    # Lets go at 5 mV / 400 ohm: the sequence ends before the current has fallen so far.
    data = {"armature_delay": "2 ms", "drop_out": "1e-30 V"}
    found = margin(relay(**data), "release", "K1")
    assert (found.verdict, found.outcome) == (Verdict.FAIL, "K1 did not let go")


def test_a_missing_delay_is_named() -> None:
    found = margin(relay(), "release", "K1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, "missing: armature_delay of K1")


def test_without_a_limit_the_requirement_is_refused() -> None:
    of = relay(armature_delay="2 ms").dump()
    del of["requirements"][0]["max"]
    with pytest.raises(CircuitError, match='requirement release of K1: write "max", the time allowed'):
        margin(Design.load(of), "release", "K1")
