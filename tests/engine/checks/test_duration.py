"""Check 11, duration window. The closed form t = tau ln(V_inf / (V_inf - V_th)), tau = (R || R_L) C, is exact."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict
from stagebook.engine.studies.margins import study

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, exact, margin, sounder
from .timers import timer

EXAMPLE = json.loads(Path(__file__).parent.with_name("example.json").read_text("utf-8"))
INTERVAL = 1e-3  # stated accuracy of a simulated interval, measured 2e-4 to 4e-4


def interval(resistance: float, capacitance: float, supply: float, threshold: float, leak: float = math.inf) -> float:
    final = supply * leak / (resistance + leak) if math.isfinite(leak) else supply
    return resistance * final / supply * capacitance * math.log(final / (final - threshold))


@pytest.mark.parametrize(
    ("leakage", "leak", "worked"),
    [(None, math.inf, 113.6), ("2 uA", 8e6, 119.5)],
)
def test_the_worked_timer(leakage: str | None, leak: float, worked: float) -> None:
    # Worked by hand for 220 uF, 470k, 9 V to 6 V: 113.6 s without leakage, 119.5 s with 2 uA at 16 V.
    exact_interval = interval(470e3, 220e-6, 9.0, 6.0, leak)
    found = margin(timer(leakage), "duration", "LS1")
    assert found.low == pytest.approx(exact_interval, rel=INTERVAL)
    assert found.high == pytest.approx(exact_interval, rel=INTERVAL)
    # m = min(140 - x, x - 100) / 20
    assert found.margin == pytest.approx(1.0 - abs(exact_interval - 120.0) / 20.0, abs=INTERVAL * 6)
    assert found.limits == (100.0, 140.0)
    assert found.verdict is Verdict.PASS
    assert (found.demand, found.capability, found.outcome, found.reason) == (None, None, None, None)


@pytest.mark.parametrize("leakage", [None, "2 uA"])
def test_the_hand_formula_agrees_with_the_simulation(leakage: str | None) -> None:
    # Rail and threshold are those of the simulation, so only the interval itself is compared: 1e-3 of 120 s in 20 s.
    found = margin(timer(leakage), "duration", "LS1")
    assert found.margin is not None
    assert found.hand == pytest.approx(found.margin, abs=INTERVAL * 6)


@pytest.mark.parametrize(
    ("low", "high", "verdict", "reason"),
    [
        ("100 s", "115 s", Verdict.PASS, None),
        ("110 s", "115 s", Verdict.PASS, None),
        ("80 s", "114 s", Verdict.THIN, None),
        ("80 s", "113 s", Verdict.FAIL, "above the upper limit"),
        ("114 s", "130 s", Verdict.FAIL, "below the lower limit"),
    ],
)
def test_verdict_and_reason_of_a_window(low: str, high: str, verdict: Verdict, reason: str | None) -> None:
    # 113.6 s; required is the customary 10 %.
    found = margin(timer(None, low, high), "duration", "LS1")
    assert (found.verdict, found.reason) == (verdict, reason)


def test_a_timer_that_never_runs_out_runs_on() -> None:
    # 35.2 uA at 16 V is 455k: the final value 9 V 455/(470 + 455) = 4.42 V stays below 6 V.
    found = margin(timer("35.2 uA"), "duration", "LS1")
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)
    assert found.outcome == found.reason == "'LS1 off' never came: it runs on"
    assert (found.low, found.high, found.hand) == (None, None, None)


def test_a_load_that_never_comes_on() -> None:
    found = margin(timer(None, below_supply="9.5 V"), "duration", "LS1")
    assert (found.margin, found.verdict, found.outcome) == (-1.0, Verdict.FAIL, "'LS1 on' never came")


def test_the_level_of_a_load_is_asked_for() -> None:
    with pytest.raises(CircuitError, match=r"LS1 has no level .* write its operating_minimum"):
        study(
            design(
                sounder("LS1", "supply", "0V", "10 mA", None),
                requirements=[{"check": "duration", "of": "LS1", "min": "1 s", "max": "2 s"}],
            )
        )


@pytest.mark.parametrize(
    ("requirement", "says"),
    [
        ({"of": "LS1", "min": "1 s"}, 'write "of", "min" and "max"'),
        ({"of": "LS1", "min": "2 s", "max": "2 s"}, "min 2 s is not below max 2 s"),
    ],
)
def test_a_window_must_be_one(requirement: Json, says: str) -> None:
    with pytest.raises(CircuitError, match=says):
        study(
            design(
                sounder("LS1", "supply", "0V", "10 mA", "3 V"),
                requirements=[{"check": "duration", **requirement}],
            )
        )


def test_interval_between_two_levels_of_a_net() -> None:
    # From 2 V to 6 V: tau ln((9 - 2)/(9 - 6)) = 87.61 s.
    of = timer(None, requirements=[{"check": "duration", "of": "tc", "from": "tc above 2 V", "to": "tc above 6 V",
                                    "min": "80 s", "max": "100 s"}])  # fmt: skip
    found = margin(of, "duration", "tc")
    assert found.low == pytest.approx(470e3 * 220e-6 * math.log(7.0 / 3.0), rel=INTERVAL)


# Contact bounce


def switched(bounce: Json | None, opens: str = "3 s", after: str | None = None, low: str = "1.8 s") -> Design:
    """A contact that feeds a load: closed at 1 s, open at ``opens``; a capacitor across the load where given."""
    close = {"at": "1 s", "event": "close", "part": "S1"} | ({} if bounce is None else {"bounce": bounce})
    slow = [] if after is None else [two("capacitor", "C1", "fed", "0V", after, tolerance="0 %")]
    return design(
        two("contact", "S1", "supply", "fed"),
        sounder("LS1", "fed", "0V", "10 mA", "3 V"),
        *slow,
        events=[CONNECT, close, {"at": opens, "event": "open", "part": "S1"}],
        ends="5 s",
        requirements=[{"check": "duration", "of": "LS1", "min": low, "max": "2.2 s"}],
    )


@pytest.mark.parametrize(
    "bounce", [None, {"for": "2 ms", "times": 4}, {"for": "5 ms", "times": 1}, {"for": "20 ms", "times": 50}]
)
def test_a_load_that_chatters_with_its_contact_is_on_from_the_first_time(bounce: Json | None) -> None:
    found = margin(switched(bounce), "duration", "LS1")
    assert found.low == pytest.approx(2.0, abs=1e-5)
    assert found.margin == pytest.approx(1.0, abs=1e-4)


def test_an_interval_shorter_than_the_chatter_is_seen() -> None:
    # Closed at 1 s, opened 1 ms later for good: with a bounce of 5 ms it is neither on for 2 s nor does it run on.
    found = margin(switched({"for": "5 ms", "times": 2}, opens="1.001 s"), "duration", "LS1")
    assert (found.verdict, found.reason) == (Verdict.FAIL, "below the lower limit")
    assert found.high is not None
    assert found.high < 5e-3


def test_a_load_that_is_held_over_the_bounce() -> None:
    # 10 uF on 900 ohm holds the load through gaps of 0.25 ms, and 9 ms ln(9/3) = 9.9 ms beyond the opening.
    found = margin(switched({"for": "2 ms", "times": 4}, after="10u"), "duration", "LS1")
    assert found.low == pytest.approx(2.0 + 9e-3 * math.log(3.0), rel=INTERVAL)


def test_the_example_of_the_document() -> None:
    # A push button held for 2 s with a bounce of 2 ms: the window 1.8 .. 2.2 s is met in the middle.
    document: dict[str, Any] = EXAMPLE
    found = {check.id: check for check in study(Design.load(document)).checks}["duration:driver:LS1"]
    assert found.low == pytest.approx(2.0, abs=1e-4)
    assert found.high == pytest.approx(2.0, abs=1e-4)
    assert (found.verdict, found.margin) == (Verdict.PASS, pytest.approx(1.0, abs=1e-3))


def test_a_relay_s_time_is_from_its_going_in_to_its_going_out() -> None:
    # i = (U/R)(1 - exp(-t R/L)) up to 8.4 V/400 ohm: 3.0 ms; 40k across the coil, from 30 mA down to 2.4 V/400 ohm:
    # 40 us; both armature times are 5 ms (textbook forms of an RL circuit).
    coil = {
        "inductance": "1 H",
        "resistance": "400R",
        "pick_up": "8.4 V",
        "drop_out": "2.4 V",
        "armature_delay": "5 ms",
    }
    wanted = {"check": "duration", "of": "LS1", "from": "K1 in", "to": "K1 out", "min": "80 ms", "max": "100 ms"}
    relay = design(
        two("coil", "K1", "supply", "low", **coil),
        two("contact", "S1", "low", "0V", data={"resistance": "1 mohm", "insulation": "1000G"}),
        exact(resistor("R1", "supply", "low", "40k")),
        two("contact", "S2", "supply", "out", operated_by="K1"),
        sounder("LS1", "out", "0V", "10 mA", "6 V", rated="12 V"),
        supply="12 V",
        events=(
            CONNECT,
            {"at": "10 ms", "event": "close", "part": "S1"},
            {"at": "100 ms", "event": "open", "part": "S1"},
        ),
        requirements=[wanted],
        ends="0.2 s",
    )
    goes_in = 10e-3 - 1.0 / 400.0 * math.log(1.0 - 8.4 / 12.0) + 5e-3
    goes_out = 100e-3 + 1.0 / 40.4e3 * math.log(12.0 / 2.4) + 5e-3
    found = margin(relay, "duration", "LS1")
    assert found.low == found.high == pytest.approx(goes_out - goes_in, rel=INTERVAL)
