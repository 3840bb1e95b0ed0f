"""Check 2, load voltage: what the load needs against what it gets (common practice, no source)."""

from __future__ import annotations

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, transistor, two
from .sheets import CONNECT, design, exact, margin, sounder


def fed(ohms: str, least: str | None = "6 V", **more: object) -> Design:
    """9 V feed a load of 100 mA at 9 V (90 ohm) through S1 and a resistor from 0.2 s to 0.8 s."""
    events: list[Json] = [
        CONNECT,
        {"at": "0.2 s", "event": "close", "part": "S1"},
        {"at": "0.8 s", "event": "open", "part": "S1"},
    ]
    return design(
        two("contact", "S1", "supply", "top", data={"resistance": "1 mohm", "insulation": "1000G"}),
        exact(resistor("R1", "top", "load", ohms)),
        sounder("LS1", "load", "0V", "100 mA", least),
        roles={"load": "LS1"},
        events=events,
        moments={"standby": "0.1 s", "sounding": "0.5 s", "silent": "0.9 s"},
        **more,  # type: ignore[arg-type]
    )


@pytest.mark.parametrize(
    ("ohms", "expected", "verdict"),
    [
        # 9 V 90/100 = 8.1 V: 1 - 6/8.1; 9 V 90/130 = 6.23 V: 3.7 %; 9 V 90/180 = 4.5 V: -33 %.
        ("10R", 1.0 - 6.0 / 8.1, Verdict.PASS),
        ("40R", 1.0 - 6.0 / (9.0 * 90 / 130), Verdict.THIN),
        ("90R", 1.0 - 6.0 / 4.5, Verdict.FAIL),
    ],
)
def test_a_divider_by_hand(ohms: str, expected: float, verdict: Verdict) -> None:
    found = margin(fed(ohms), "load_voltage", "LS1")
    assert found.margin == pytest.approx(expected, abs=1e-3)
    assert (found.verdict, found.demand, found.outcome) == (verdict, 6.0, None)


def test_less_than_half_of_what_it_needs_is_no_voltage_at_all() -> None:
    found = margin(fed("1k"), "load_voltage", "LS1")
    assert (found.margin, found.outcome) == (-1.0, "LS1 was never switched on")


def test_source_and_lead_resistance_by_hand() -> None:
    # 9 V / 90 ohm: 0.1 A across 5 ohm of source and 10 m of 0.1 ohm/m: 9 - 0.6 V, or a little more.
    of = design(
        two("lead", "W1", "supply", "far", length="10 m", resistance="0.1 ohm/m"),
        sounder("LS1", "far", "0V", "100 mA", "6 V"),
        roles={"load": "LS1"},
        source="5R",
    )
    found = margin(of, "load_voltage", "LS1")
    assert found.capability == pytest.approx(9.0 * 90 / 96, rel=1e-3)
    assert found.hand == pytest.approx(1.0 - 6.0 / 8.4)
    assert found.margin is not None
    assert not found.disagrees


def test_it_is_let_go_of() -> None:
    # 1 G across 90 ohm and 10 ohm: nothing is left.
    found = margin(fed("10R"), "load_off", "LS1")
    assert (found.verdict, found.margin) == (Verdict.PASS, pytest.approx(1.0, abs=1e-3))


def test_what_leaks_past_an_open_contact_keeps_it_on() -> None:
    # 20 ohm past the contact: 9 V 90/(90 + 10 + 20) = 6.75 V of 6 V.
    of = fed("10R").dump()
    of["stages"][0]["parts"].append(exact(resistor("R2", "supply", "top", "20R")))
    found = margin(Design.load(of), "load_off", "LS1")
    assert found.margin == pytest.approx(1.0 - 6.75 / 6.0, abs=1e-3)
    assert found.verdict is Verdict.FAIL


def test_a_load_without_a_level_is_unknown() -> None:
    found = margin(fed("10R", least=None), "load_voltage", "LS1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, "missing: operating_minimum of LS1")


def test_what_leaks_through_a_hot_driver() -> None:
    # 10 uA at 25 C, twice for every 10 K: 320 uA at 75 C through 90 ohm: 28.8 mV of 6 V, less what h_FE adds to it.
    law = {"v_be": "0.65 V", "gain": "100", "i_cbo": "10 uA", "i_cbo_doubling": "10 K"}
    of = design(
        transistor("Q1", "low", "base", "0V", data=law),
        exact(resistor("R1", "base", "0V", "100R")),
        sounder("LS1", "supply", "low", "100 mA", "6 V"),
        roles={"driver": "Q1", "load": "LS1"},
        ambient="75 C",
        moments={"standby": "0.5 s"},
    )
    found = margin(of, "load_off", "LS1")
    assert found.demand == pytest.approx(320e-6 * 90, rel=0.03)
    assert found.hand == pytest.approx(1.0 - 0.0288 / 6.0, abs=1e-4)
    assert not found.disagrees
