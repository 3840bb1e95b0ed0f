"""Check 21, trip window and hysteresis in the sensor's own quantity: a divider trips where its ratio says so.

A probe from 9 V into 100k: 3 V at 200k, 2.5 V at 260k (by hand). A thermistor follows R25 exp(B (1/T - 1/298.15)).
"""

from __future__ import annotations

import math
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, exact, margin


def probe(check: str, tolerance: str = "0 %", **requirement: Any) -> Design:
    """The probe goes from 400k to 100k within 20 s and back within 20 s."""
    events: list[Json] = [
        CONNECT,
        {"at": "1 s", "event": "ramp", "part": "B1", "to": "100k", "for": "20 s"},
        {"at": "21 s", "event": "ramp", "part": "B1", "to": "400k", "for": "20 s"},
    ]
    wanted = {"check": check, "of": "B1", **requirement}
    return design(
        two("probe", "B1", "supply", "sense", "400k"),
        resistor("R1", "sense", "0V", "100k", tolerance=tolerance),
        events=events,
        ends="45 s",
        roles={"bridge_resistor": "R1"},
        requirements=[{k: v for k, v in wanted.items() if v is not None}],
    )


def window(**more: Any) -> Design:
    return probe("trip_window", **{"at": "sense above 3 V", "min": "150k", "max": "250k", **more})


def test_the_level_at_the_trip() -> None:
    found = margin(window(), "trip_window", "B1")
    assert (found.low, found.high) == (pytest.approx(200e3, rel=2e-3), pytest.approx(200e3, rel=2e-3))
    assert (found.limits, found.unit) == ((150e3, 250e3), "ohm")
    assert (found.margin, found.verdict) == (pytest.approx(1.0, abs=0.01), Verdict.PASS)


def test_it_moves_with_the_divider() -> None:
    # 2 x 110k = 220k and 180k: 30k or more from the limits, of 50k.
    found = margin(window(tolerance="10 %"), "trip_window", "B1")
    assert (found.low, found.high) == (pytest.approx(180e3, rel=2e-3), pytest.approx(220e3, rel=2e-3))
    assert found.margin == pytest.approx(0.6, abs=0.01)
    late = margin(window(tolerance="10 %", max="210k"), "trip_window", "B1")
    assert (late.verdict, late.reason) == (Verdict.FAIL, "above the upper limit")


def test_a_trip_that_never_comes() -> None:
    found = margin(window(at="sense above 8 V"), "trip_window", "B1")
    assert (found.margin, found.outcome) == (-1.0, "'sense above 8 V' never came")


EVENTS = {"from": "sense above 3 V", "to": "sense below 2.5 V"}


@pytest.mark.parametrize(
    # 260k - 200k = 60k between both events.
    ("limits", "expected"),
    [({"min": "20k", "max": "100k"}, 1.0), ({"min": "50k", "max": "150k"}, 0.2), ({"min": "80k", "max": "120k"}, -1.0)],
)
def test_hysteresis_between_limits(limits: dict[str, str], expected: float) -> None:
    found = margin(probe("hysteresis_window", **EVENTS, **limits), "hysteresis_window", "B1")
    assert found.low == pytest.approx(60e3, rel=5e-3)
    assert found.margin == pytest.approx(expected, abs=0.02)
    assert (found.verdict is Verdict.FAIL) == (expected < 0.0)


@pytest.mark.parametrize(("ripple", "verdict"), [("12k", Verdict.PASS), ("70k", Verdict.FAIL)])
def test_hysteresis_against_ripple(ripple: str, verdict: Verdict) -> None:
    levels = {"trip_level": "3 V", "release_level": "2.5 V"}
    found = margin(probe("hysteresis", **EVENTS, **levels, ripple=ripple), "hysteresis", "B1")
    assert found.capability == pytest.approx(60e3, rel=5e-3)
    assert found.hand == pytest.approx(1.0 - (12.0 if ripple == "12k" else 70.0) / 60.0, abs=1e-6)
    assert found.verdict is verdict


def test_ripple_is_asked_for() -> None:
    found = margin(probe("hysteresis", **EVENTS), "hysteresis", "B1")
    assert (found.verdict, found.reason) == (
        Verdict.UNKNOWN,
        "missing: ripple of B1, peak to peak (requirement field ripple)",
    )


def thermistor(**more: Any) -> Design:
    """10k, B 3950 against 30k: 4.5 V of 9 V where the thermistor has 30k."""
    events: list[Json] = [
        CONNECT,
        {"at": "0 s", "event": "set", "part": "tunnel", "to": "10 C"},
        {"at": "1 s", "event": "ramp", "part": "tunnel", "to": "-5 C", "for": "30 s"},
    ]
    wanted = {"check": "trip_window", "of": "tunnel", "at": "sense above 4.5 V", "min": "0 C", "max": "4 C", **more}
    wanted["trip_level"] = "50 %"
    return design(
        exact(resistor("R1", "supply", "sense", "30k")),
        exact(two("thermistor", "RT1", "sense", "0V", "10k", follows="tunnel", data={"beta": "3950 K"})),
        events=events,
        ends="35 s",
        requirements=[wanted],
        roles={"sensor": "RT1", "bridge_resistor": "R1"},
    )


def test_a_temperature_by_the_thermistors_law() -> None:
    celsius = 1.0 / (1.0 / 298.15 + math.log(3.0) / 3950.0) - 273.15
    found = margin(thermistor(), "trip_window", "RT1")
    assert (found.low, found.unit) == (pytest.approx(celsius, abs=0.02), "degC")
    assert found.margin == pytest.approx((4.0 - celsius) / 2.0, abs=0.02)
    assert found.hand == pytest.approx((4.0 - celsius) / 2.0, abs=1e-6)


@pytest.mark.parametrize(
    ("changed", "words"),
    [({"of": "R1"}, 'as "of"'), ({"min": "5 C"}, "is not below max"), ({"at": None}, 'write "at"')],
)
def test_a_requirement_that_cannot_be_read(changed: dict[str, Any], words: str) -> None:
    document = thermistor().dump()
    wanted = {**document["requirements"][0], **changed}
    document["requirements"] = [{k: v for k, v in wanted.items() if v is not None}]
    with pytest.raises(CircuitError, match=words):
        margin(Design.load(document), "trip_window", "RT1")


@pytest.mark.parametrize(("level", "expected"), [("10 %", None), ("5 V", -2.05 / 2.0)])
def test_by_hand_only_where_the_ramp_comes(level: str, expected: float | None) -> None:
    # 10 % is 3k3, some 50 C, which no event sets; 5 V of 9 V are 37k5, ln 3.75 and -2.05 C.
    document = thermistor().dump()
    document["requirements"][0]["trip_level"] = level
    found = margin(Design.load(document), "trip_window", "RT1")
    assert found.hand == (None if expected is None else pytest.approx(expected, abs=0.005))


def test_both_events_of_a_hysteresis_are_asked_for() -> None:
    with pytest.raises(CircuitError, match='write "from"'):
        margin(probe("hysteresis", ripple="1k"), "hysteresis", "B1")
