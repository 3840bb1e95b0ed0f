"""Check 12, arrival: the threshold against the final value V R_L/(R + R_L), R_L being the capacitor's leakage."""

from __future__ import annotations

import pytest

from stagebook.engine.results import Verdict

from ..circuits import capacitor, resistor, two
from .sheets import design, exact, margin, sounder
from .timers import ROLES, timer


def test_the_worked_timer_never_gets_there() -> None:
    # 220 uF / 16 V, 0.01 C V = 35.2 uA at 16 V (455k), 470k from 9 V: final value 4.42 V, never 6 V, margin -36 %.
    # The leakage is twice as large at 50 C as at 20 C; here it is 20 C.
    found = margin(timer("35.2 uA"), "arrival", "C1")
    assert found.demand == pytest.approx(6.0, rel=1e-3)
    assert found.capability == pytest.approx(4.42, abs=0.005)
    assert found.margin == pytest.approx(-0.36, abs=0.005)
    assert (found.verdict, found.reason) == (Verdict.FAIL, "demand is above capability")


def test_the_worked_timer_gets_there() -> None:
    # With 2 uA at 16 V (8M) the final value is 8.50 V: 1 - 6/8.50 = 29.4 %, a little less than the customary 30 %.
    found = margin(timer("2 uA"), "arrival", "C1")
    assert found.capability == pytest.approx(8.50, abs=0.005)
    assert found.margin == pytest.approx(1.0 - 6.0 / 8.50, abs=0.002)
    assert found.verdict is Verdict.THIN
    assert found.hand == pytest.approx(found.margin, abs=1e-9)


def test_without_leakage_only_the_rail_counts() -> None:
    found = margin(timer(None), "arrival", "C1")
    assert found.capability == pytest.approx(9.0, rel=1e-4)
    assert (found.margin, found.verdict) == (pytest.approx(1.0 / 3.0, abs=1e-3), Verdict.PASS)


def test_leakage_by_class_grows_with_temperature() -> None:
    # Electrolytic: max(0.01 C V, 3 uA) at 20 C, common practice; doubled at 50 C it is 227k: 9 V 227/(470 + 227).
    parts = [
        exact(resistor("R1", "supply", "tc", "470k")),
        {
            "ref": "C1",
            "kind": "capacitor",
            "pins": {"plus": "tc", "minus": "0V"},
            "value": "220u",
            "tolerance": "0 %",
            "voltage": "16 V",
            "class": "electrolytic",
        },
        sounder("LS1", "supply", "tc", "1 pA", "3 V"),
    ]
    found = margin(design(*parts, roles=ROLES, ambient="50 C", ends="600 s"), "arrival", "C1")
    leak = 16.0 / (2.0 * 35.2e-6)
    assert found.capability == pytest.approx(9.0 * leak / (470e3 + leak), rel=1e-3)


def test_a_sequence_that_ends_too_early() -> None:
    found = margin(timer(None, ends="60 s"), "arrival", "C1")
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)
    assert found.outcome == "does not run out within the sequence, even without leakage"


def test_a_timer_that_is_never_started() -> None:
    found = margin(timer(None, below_supply="9.5 V"), "arrival", "C1")
    assert (found.margin, found.outcome) == (-1.0, "'LS1 on' never happened, after which the timer is looked at")


def test_a_resistor_that_is_not_at_the_capacitor() -> None:
    parts = [
        exact(resistor("R1", "supply", "far", "1k")),
        exact(resistor("R2", "far", "tc", "1k")),
        exact(capacitor("C1", "tc", "0V", "1u")),
        sounder("LS1", "supply", "0V", "10 mA", "3 V"),
    ]
    found = margin(design(*parts, roles=ROLES), "arrival", "C1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, "missing: a net shared by R1 and C1")


def test_without_a_load_the_threshold_is_not_known() -> None:
    parts = [exact(resistor("R1", "supply", "tc", "470k")), exact(two("capacitor", "C1", "tc", "0V", "220u"))]
    roles = {"timing_resistor": "R1", "timing_capacitor": "C1"}
    found = margin(design(*parts, roles=roles), "arrival", "C1")
    assert found.verdict is Verdict.UNKNOWN
    assert found.reason is not None
    assert found.reason.startswith("missing: operating_minimum of the part in the role load")


def test_the_load_of_the_timers_own_stage_tells_when_it_runs_out() -> None:
    # Another stage, which comes first, has a load that is on for ever.
    document = timer(None).dump()
    other = {"name": "lamp", "parts": [sounder("LS9", "supply", "0V", "10 mA", "3 V")], "roles": {"load": "LS9"}}
    of = type(timer(None)).load({**document, "stages": [other, *document["stages"]]})
    found = margin(of, "arrival", "C1")
    assert (found.margin, found.outcome) == (pytest.approx(1.0 / 3.0, abs=1e-3), None)


def test_its_window_may_be_given_where_no_load_tells_it() -> None:
    # As above, watched from and to levels of the capacitor itself: D = 6 V, C = 9 V without leakage.
    window = {"check": "arrival", "of": "C1", "from": "tc above 0.1 V", "to": "tc above 6 V"}
    found = margin(timer(None, requirements=[window], below_supply="1 V"), "arrival", "C1")
    assert found.margin == pytest.approx(1.0 - 6.0 / 9.0, abs=2e-3)
    # Without it the load tells, which goes off at 8 V.
    assert margin(timer(None, below_supply="1 V"), "arrival", "C1").margin == pytest.approx(1.0 / 9.0, abs=2e-3)
