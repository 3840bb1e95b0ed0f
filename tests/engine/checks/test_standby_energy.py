"""Check 27, stand-by energy: I_standby h + I_alarm h against Ah x age x cold x (1 - self-discharge)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, exact, margin, sounder

HOUR = 3600.0
CELLS: Json = {"capacity": "2.5 Ah", "standby_time": "8760 h", "alarm_time": "10 h", "age": "80 %", "cold": "80 %"}
MOMENTS: Json = {"standby": "0.5 s", "sounding": {"after": "LS1 on", "by": "0.1 s"}}


def unit(ohms: str = "100k", moments: Json = MOMENTS, source: str = "1R", calls: bool = True, **cells: Any) -> Design:
    """6 V that feed ``ohms`` for ever, and a load of 12 mA from 1 s on."""
    call: list[Json] = [{"at": "1 s", "event": "close", "part": "S1"}] if calls else []
    return design(
        exact(resistor("R1", "supply", "0V", ohms)),
        two("contact", "S1", "supply", "fed", data={"insulation": "1000G"}),
        sounder("LS1", "fed", "0V", "12 mA", "3 V", rated="6 V"),
        supply="6 V",
        source=source,
        events=[CONNECT, *call],
        moments=moments,
        roles={"load": "LS1"},
        ends="2 s",
        requirements=[{"check": "standby_energy", "of": "LS1", **{k: v for k, v in cells.items() if v is not None}}],
    )


def test_a_year_of_stand_by_by_hand() -> None:
    # 60 uA x 8760 h = 0.5256 Ah, 12 mA and the 60 uA x 10 h = 0.1206 Ah; 2.5 Ah x 0.8 x 0.8 = 1.6 Ah: 59.6 %.
    found = margin(unit(**CELLS), "standby_energy", "LS1")
    assert found.demand == pytest.approx((0.5256 + 0.1206) * HOUR, rel=3e-3)
    assert found.capability == pytest.approx(1.6 * HOUR)
    assert found.margin == pytest.approx(0.596, abs=0.002)
    assert found.hand == pytest.approx(0.596, abs=0.002)
    assert (found.verdict, found.unit) == (Verdict.PASS, "Ah")


def test_self_discharge_takes_its_part() -> None:
    found = margin(unit(**CELLS, self_discharge="25 %"), "standby_energy", "LS1")
    assert found.capability == pytest.approx(1.2 * HOUR)


def test_too_much_standing_current_fails() -> None:
    # 6 V / 20k = 300 uA: 2.63 Ah of 1.6 Ah.
    found = margin(unit("20k", **CELLS), "standby_energy", "LS1")
    assert found.margin == pytest.approx(1.0 - (2.628 + 0.123) / 1.6, abs=0.01)
    assert (found.verdict, found.reason) == (Verdict.FAIL, "demand is above capability")


def test_an_alarm_that_never_sounds_is_an_outcome() -> None:
    found = margin(unit(calls=False, **CELLS), "standby_energy", "LS1")
    assert (found.margin, found.outcome, found.verdict) == (-1.0, "the alarm never sounded", Verdict.FAIL)


@pytest.mark.parametrize(
    ("changed", "missing"),
    [
        ({"capacity": None}, "capacity of the cells (requirement field capacity)"),
        ({"standby_time": None}, "stand-by time (requirement field standby_time)"),
        ({"source": "0R"}, "source_resistance in the conditions, through which the current is seen"),
        (
            {"moments": {"standby": "0.5 s"}},
            "moment sounding of the sequence alarm, at which the alarm current is read",
        ),
    ],
)
def test_what_is_missing_is_named(changed: Json, missing: str) -> None:
    found = margin(unit(**{**CELLS, **changed}), "standby_energy", "LS1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, f"missing: {missing}")


def test_without_an_alarm_time_no_moment_is_asked_for() -> None:
    found = margin(unit(moments={"standby": "0.5 s"}, **{**CELLS, "alarm_time": None}), "standby_energy", "LS1")
    assert found.demand == pytest.approx(0.5256 * HOUR, rel=3e-3)
