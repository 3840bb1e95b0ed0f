"""Check 1, base overdrive: I_C/h_FE against the base current, less what the base-emitter resistor takes.

Common practice, no source: R = (V_drive - V_BE)/(I_C/h_FE,min). The invented example: 250 mA, h_FE 40, 8.4 V, 0.7 V ask
for 6.25 mA and 1232 ohm; 1k2 leaves 2.6 %, 1k leaves 19 %.
"""

from __future__ import annotations

import math

import pytest
from scipy import constants

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, transistor, two
from .sheets import CONNECT, design, exact, margin, sounder

VT = constants.k * 298.15 / constants.e  # at 25 C, where laws and gains are given
ROLES = {"driver": "Q1", "base_resistor": "R1", "load": "LS1", "base_emitter_resistor": "R2"}


def driver(ohms: str, bleed: str = "1G", least: str | None = "3 V", gain: float = 40.0, **more: object) -> Design:
    """250 mA at 8.2 V from an npn with V_BE 0.7 V at that current, driven from 8.4 V through ``ohms``."""
    law: Json = {"saturation_current": 0.25 / math.expm1(0.7 / VT), "forward_gain": gain, "reverse_gain": 1}
    return design(
        exact(resistor("R1", "supply", "base", ohms)),
        exact(resistor("R2", "base", "0V", bleed)),
        transistor("Q1", "low", "base", "0V", law=law),
        sounder("LS1", "supply", "low", "250 mA", least, rated="8.2 V"),
        supply="8.4 V",
        ambient="25 C",
        roles=ROLES,
        **more,  # type: ignore[arg-type]
    )


@pytest.mark.parametrize(("ohms", "amperes", "worked"), [("1k2", 7.7 / 1200, 0.026), ("1k", 7.7 / 1000, 0.19)])
def test_the_worked_base_resistor(ohms: str, amperes: float, worked: float) -> None:
    # The drop across the transistor and V_BE move with the base current: 1 % of each current.
    found = margin(driver(ohms), "base_overdrive", "Q1")
    assert found.demand == pytest.approx(6.25e-3, rel=0.01)
    assert found.capability == pytest.approx(amperes, rel=0.01)
    assert found.margin == pytest.approx(worked, abs=0.01)
    assert found.verdict is Verdict.THIN


def test_the_hand_formula_agrees_with_the_simulation() -> None:
    for ohms in ("470R", "820R", "1k", "1k2"):
        found = margin(driver(ohms, bleed="1k"), "base_overdrive", "Q1")
        assert found.margin is not None
        assert found.hand == pytest.approx(found.margin, abs=0.005)


def test_a_high_side_driver() -> None:
    # The mirror image: pnp, emitter at the supply, base resistor to 0V. The load's own plus is the collector.
    law: Json = {"saturation_current": 0.25 / math.expm1(0.7 / VT), "forward_gain": 40, "reverse_gain": 1}
    of = design(
        exact(resistor("R1", "base", "0V", "1k")),
        exact(resistor("R2", "base", "supply", "1G")),
        transistor("Q1", "high", "base", "supply", "pnp", law=law),
        sounder("LS1", "high", "0V", "250 mA", "3 V", rated="8.2 V"),
        supply="8.4 V",
        ambient="25 C",
        roles=ROLES,
    )
    found = margin(of, "base_overdrive", "Q1")
    assert found.margin == pytest.approx(0.19, abs=0.01)
    assert found.hand == pytest.approx(found.margin, abs=0.005)


def test_the_base_emitter_resistor_takes_its_part() -> None:
    # 0.7 V across 1k is 0.7 mA of 7.7 mA: 1 - 6.25/7.0.
    found = margin(driver("1k", bleed="1k"), "base_overdrive", "Q1")
    assert found.margin == pytest.approx(1.0 - 6.25 / 7.0, abs=0.01)


def test_a_starved_base_fails() -> None:
    # 3.5 mA of the 6.25 mA that 250 mA ask for: what the transistor cannot carry counts as demand all the same.
    found = margin(driver("2k2"), "base_overdrive", "Q1")
    assert found.margin == pytest.approx(1.0 - 6.25 / 3.5, abs=0.02)
    assert (found.verdict, found.reason) == (Verdict.FAIL, "demand is above capability")


def test_a_load_that_never_comes_on_is_an_outcome() -> None:
    found = margin(driver("22k"), "base_overdrive", "Q1")
    assert (found.margin, found.outcome, found.verdict) == (-1.0, "LS1 never came on", Verdict.FAIL)


def test_enough_overdrive_passes() -> None:
    # 270 ohm: 28 mA for 6.25 mA.
    found = margin(driver("270R"), "base_overdrive", "Q1")
    assert found.margin == pytest.approx(1.0 - 6.25 / (7.7 / 0.27), abs=0.01)
    assert found.verdict is Verdict.PASS


def test_a_requirement_moves_the_required_margin() -> None:
    of = driver("1k", requirements=[{"check": "base_overdrive", "of": "Q1", "required": "15 %"}])
    assert margin(of, "base_overdrive", "Q1").verdict is Verdict.PASS


def test_a_load_without_a_level_is_unknown() -> None:
    found = margin(driver("1k", least=None), "base_overdrive", "Q1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, "missing: operating_minimum of LS1")


@pytest.mark.parametrize(("current", "said"), [("20 mA", True), ("150 mA", False), ("450 mA", True)])
def test_a_gain_beyond_its_points_is_marked(current: str, said: bool) -> None:
    # The class gives h_FE at 100 mA and 300 mA (from memory); 6 V, S1 drives the base through 100 ohm.
    of = design(
        two("contact", "S1", "supply", "call"),
        exact(resistor("R1", "call", "base", "100R")),
        transistor("Q1", "low", "base", "0V", **{"class": "0.5 A driver npn"}),
        sounder("LS1", "supply", "low", current, "3 V", rated="6 V"),
        supply="6 V",
        events=[CONNECT, {"at": "0.1 s", "event": "close", "part": "S1"}],
        roles={"driver": "Q1", "load": "LS1"},
    )
    found = margin(of, "base_overdrive", "Q1")
    assert found.extrapolated == ("h_FE of Q1 extrapolated, given at 100 mA .. 300 mA" if said else None)


def test_loads_in_parallel_ask_for_base_current_together() -> None:
    # 250 mA and 150 mA at 8.2 V, some more where less drops across the transistor: 400 mA / 40 = 10 mA of the 7.7 mA
    # that 1k gives, where the first alone asks for 6.25 mA (Kirchhoff's current law).
    document = driver("1k").dump()
    document["stages"][0]["parts"].append(sounder("LS2", "supply", "low", "150 mA", "3 V", rated="8.2 V"))
    found = margin(Design.load(document), "base_overdrive", "Q1")
    assert found.demand == pytest.approx(10e-3, rel=0.02)
    assert found.capability == pytest.approx(7.7e-3, rel=0.01)
    assert found.margin == pytest.approx(1.0 - 10.0 / 7.7, abs=0.03)
    assert found.verdict is Verdict.FAIL
    assert found.hand == pytest.approx(found.margin, abs=0.01)
