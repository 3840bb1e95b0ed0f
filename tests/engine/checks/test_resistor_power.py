"""Check 30, resistor power: V^2/R against 0.6 of the power permitted at the ambient temperature.

Metal film: full power to 70 C, linear to nothing at 155 C; factor 0.6; both from memory.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from stagebook.engine.checks.resistor_power import permitted
from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, two
from .sheets import CONNECT, design, exact, margin, sounder


@pytest.mark.parametrize(
    ("celsius", "share"), [(-40.0, 1.0), (70.0, 1.0), (112.5, 0.5), (138.0, 0.2), (155.0, 0.0), (200.0, 0.0)]
)
def test_power_permitted_at_a_temperature(celsius: float, share: float) -> None:
    assert permitted(0.25, np.array([celsius]))[0] == pytest.approx(0.25 * share, abs=1e-12)


def loaded(ambient: str = "25 C", ohms: str = "1k", rating: str | None = "0.25 W", **more: Any) -> Design:
    """9 V across one resistor."""
    fields = {} if rating is None else {"rating": rating}
    return design(exact(resistor("R1", "supply", "0V", ohms, **fields)), ambient=ambient, **more)


@pytest.mark.parametrize(
    ("ambient", "expected", "verdict"),
    [
        # 81 mW against 0.6 x 0.25 W = 150 mW, at 112.5 C against 75 mW.
        ("25 C", 1.0 - 81.0 / 150.0, Verdict.PASS),
        ("70 C", 1.0 - 81.0 / 150.0, Verdict.PASS),
        ("112.5 C", 1.0 - 81.0 / 75.0, Verdict.FAIL),
    ],
)
def test_standing_power_by_hand(ambient: str, expected: float, verdict: Verdict) -> None:
    found = margin(loaded(ambient), "resistor_power", "R1")
    assert found.margin == pytest.approx(expected, abs=1e-6)
    assert (found.demand, found.verdict) == (pytest.approx(81e-3), verdict)
    assert found.hand == pytest.approx(expected, abs=1e-6)


def test_nothing_is_permitted_at_155_degrees() -> None:
    found = margin(loaded("155 C"), "resistor_power", "R1")
    assert (found.capability, found.margin, found.verdict) == (0.0, -1.0, Verdict.FAIL)


def test_without_the_rating_it_is_unknown() -> None:
    found = margin(loaded(rating=None), "resistor_power", "R1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, "missing: rating of R1")


def test_a_link_has_no_power() -> None:
    of = design(resistor("R1", "supply", "fed", "0R"), exact(resistor("R2", "fed", "0V", "1k", rating="0.25 W")))
    assert margin(of, "resistor_power", "R2").demand == pytest.approx(81e-3)
    with pytest.raises(AssertionError, match="resistor_power:unit:R1 is not among"):
        margin(of, "resistor_power", "R1")


def timed(*moments: str) -> Design:
    """100 ohm in series with a load of 8.9 V / 10 mA while S1 is closed, 1 s to 3 s."""
    events: list[Json] = [
        CONNECT,
        {"at": "1 s", "event": "close", "part": "S1"},
        {"at": "3 s", "event": "open", "part": "S1"},
    ]
    return design(
        exact(resistor("R1", "supply", "top", "100R", rating="0.25 W")),
        two("contact", "S1", "top", "fed", data={"resistance": "1 mohm", "insulation": "1000G"}),
        sounder("LS1", "fed", "0V", "10 mA", "3 V", rated="8 V"),
        events=events,
        ends="5 s",
        roles={"load": "LS1"},
        moments={name: name for name in moments},
    )


@pytest.mark.parametrize("moments", [("0.5 s",), ("0.5 s", "2 s"), ("2 s",), ("4 s",)])
def test_power_averaged_over_the_alarm_counts_where_no_moment_sees_it(moments: tuple[str, ...]) -> None:
    # 8 V / 10 mA are 800 ohm: 10 mA flow from 9 V, 10 mW in 100 ohm, over the whole two seconds.
    found = margin(timed(*moments), "resistor_power", "R1")
    assert found.demand == pytest.approx(10e-3, rel=2e-3)


def test_no_moment_that_ever_came_is_an_outcome() -> None:
    of = loaded(moments={"sounding": {"after": "LS1 on"}})
    silent = Design.load(
        {
            **of.dump(),
            "stages": [
                {
                    "name": "unit",
                    "parts": [*of.dump()["stages"][0]["parts"], sounder("LS1", "supply", "0V", "10 mA", "12 V")],
                }
            ],
        }
    )
    found = margin(silent, "resistor_power", "R1")
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)
    assert found.outcome == "none of the moments at which its power is read ever came"
