"""Check 19, supervised loop: 4.7k end of line and pull-up, 1 %, thresholds 0.35 and 0.65 of the supply +/- 0.03, a line
of up to 100 ohm with leakage down to 50k leave about 62 % (worked by hand, no source):

normal, leaky, end low and pull-up high: 4653 || 50k = 4257 of 9004: 0.4728; 0.4728 - 0.38 of 0.15 is 62 %.
"""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, margin

GOOD = {"data": {"resistance": "1 mohm", "insulation": "100G"}}


def loop(
    leak: str = "50k", tolerance: str = "1 %", end: str = "4k7", moments: Json | None = None, **requirement: Any
) -> Design:
    """Pull-up, 100 m of line, and at its end the resistor in series with S1 (normally closed); S2 shorts the line."""
    wanted = {"check": "supervised_loop", "of": "line", "low": "35 %", "high": "65 %", "drift": "3 %", **requirement}
    events: list[Json] = [
        CONNECT,
        {"at": "0.2 s", "event": "open", "part": "S1"},
        {"at": "0.4 s", "event": "close", "part": "S1"},
        {"at": "0.6 s", "event": "close", "part": "S2"},
    ]
    return design(
        resistor("R1", "supply", "line", "4k7", tolerance=tolerance),
        two(
            "lead",
            "W1",
            "line",
            "far",
            length="100 m",
            resistance={"min": "1 mohm/m", "typical": "1 mohm/m", "max": "1 ohm/m"},
            insulation={"min": leak, "typical": "100G", "max": "100G"},
        ),
        two("contact", "S1", "far", "end", form="break", **GOOD),
        resistor("R2", "end", "0V", end, tolerance=tolerance),
        two("contact", "S2", "far", "0V", **GOOD),
        supply="12 V",
        events=events,
        moments={"normal": "0.1 s", "open": "0.3 s", "short": "0.7 s"} if moments is None else moments,
        roles={"pull_up": "R1", "end_of_line": "R2"},
        requirements=[{k: v for k, v in wanted.items() if v is not None}],
    )


def test_the_worked_loop() -> None:
    found = margin(loop(), "supervised_loop", "line")
    assert found.margin == pytest.approx(0.62, abs=0.005)
    assert found.verdict is Verdict.PASS
    # The gap between the normal level and the lower threshold, 0.15 of 12 V.
    assert found.capability == pytest.approx(1.8, rel=2e-3)
    assert {"R1 high", "R2 low", "W1 insulation low"} <= set(found.corner.split(", "))
    assert found.hand == pytest.approx(found.margin, abs=0.02)


def test_without_spread_only_the_drift_counts() -> None:
    # 0.03 of 0.15.
    found = margin(loop(leak="100G", tolerance="0 %"), "supervised_loop", "line")
    assert found.nominal == pytest.approx(0.8, abs=1e-3)


def test_a_wet_line_fails() -> None:
    # 5k across 4k7: 2423 of 7123 is 0.34, below the threshold.
    found = margin(loop(leak="5k"), "supervised_loop", "line")
    assert found.verdict is Verdict.FAIL
    assert found.margin is not None
    assert found.margin < 0.0


def test_thresholds_in_volts() -> None:
    found = margin(loop(low="4.2 V", high="7.8 V", drift="0.36 V"), "supervised_loop", "line")
    assert found.margin == pytest.approx(0.62, abs=0.005)


def test_a_threshold_read_off_an_event() -> None:
    # As the line goes open, its level at that event is 7.8 V.
    found = margin(loop(high="line above 7.8 V", leak="100G", tolerance="0 %"), "supervised_loop", "line")
    assert found.nominal == pytest.approx(0.8, abs=2e-3)


def test_what_trips_may_hold_the_line_near_its_threshold() -> None:
    # A diode to 8.4 V holds the open line at about 9 V of 12 V: what counts is where it stood before, as by hand.
    held = loop().dump()
    parts = held["stages"][0]["parts"]
    parts += [
        resistor("R8", "supply", "ref", "3R", tolerance="0 %"),
        resistor("R9", "ref", "0V", "7R", tolerance="0 %"),
        two("diode", "D1", "line", "ref", law={"saturation_current": "1e-12 A"}),
    ]
    found = margin(Design.load(held), "supervised_loop", "line")
    assert found.margin == pytest.approx(0.62, abs=0.01)


def test_a_loop_to_the_supply() -> None:
    # Mirrored: R2 and the line to the supply, the pull resistor to 0V, beside which the line leaks.
    document = loop().dump()
    for part in document["stages"][0]["parts"]:
        part["pins"] = {pin: {"supply": "0V", "0V": "supply"}.get(net, net) for pin, net in part["pins"].items()}
    document["stages"][0]["roles"] = {"pull_down": "R1", "end_of_line": "R2"}
    found = margin(Design.load(document), "supervised_loop", "line")
    assert found.margin == pytest.approx(found.hand, abs=0.02)
    # R1 4653 || 50k = 4257, R2 and line 4847: 0.4676, 0.0876 of 0.15 above 0.38.
    assert found.margin == pytest.approx(0.0876 / 0.15, abs=0.01)


def test_a_moment_that_never_comes_is_an_outcome() -> None:
    moments = {"normal": "0.1 s", "open": {"after": "line above 20 V", "by": "1 ms"}, "short": "0.7 s"}
    found = margin(loop(moments=moments), "supervised_loop", "line")
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)
    assert str(found.outcome).endswith("never came")


@pytest.mark.parametrize(
    ("changed", "missing"),
    [
        (
            {"moments": {"normal": "0.1 s", "open": "0.3 s"}},
            "moment short of the sequence alarm, at which the level of the loop is read",
        ),
        ({"low": None}, "low threshold of the loop (requirement field: 35 %, 2 V or an event)"),
    ],
)
def test_what_is_missing_is_named(changed: dict[str, Any], missing: str) -> None:
    found = margin(loop(**changed), "supervised_loop", "line")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, f"missing: {missing}")


def test_a_loop_needs_a_net() -> None:
    with pytest.raises(CircuitError, match='write the net of the loop as "of"'):
        margin(loop(of="R1"), "supervised_loop", "line")
