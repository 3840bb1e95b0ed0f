"""Outcomes that the tests of the checks themselves do not come to: every event that did not happen has its own words.

Each circuit is one of those tests with what keeps the event from coming (worked by hand: Ohm's law, R and C).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor
from . import (
    test_brown_out,
    test_capacitor_stress,
    test_contact_bounce,
    test_fuse,
    test_line_pulse,
    test_load_voltage,
    test_order,
    test_rearm,
    test_resistor_power,
    test_stray_immunity,
    test_supervised_loop,
    test_supply_slew,
)
from .sheets import design, exact, sounder
from .test_hand_formulas import changed, judged

NEVER: Json = {"after": "supply above 100 V", "by": "1 ms"}
"""A moment relative to what does not come."""


def waiting(of: Design, *moments: str) -> Design:
    """The design with these moments, and none else, at an instant that does not come."""
    document = of.dump()
    document["sequences"]["alarm"]["moments"] = dict.fromkeys(moments, NEVER)
    return Design.load(document)


def deaf(of: Design, level: str = "20 V", ref: str = "LS1") -> Design:
    """The design with a load that no voltage there is turns on."""
    document = of.dump()
    for part in document["stages"][0]["parts"]:
        if part["ref"] == ref:
            part["data"]["operating_minimum"] = level
    return Design.load(document)


def rearming() -> Design:
    return deaf(test_rearm.pulse({"check": "rearm", "of": "LS1", "max": "4 s"}))


def twice(ends: str) -> Design:
    """A second alarm from 11 s on, which lasts 0.69 s."""
    events = tuple(test_rearm.contact(at, event) for at, event in ((1.0, "close"), (5.0, "open"), (11.0, "close")))
    document = test_rearm.pulse({"check": "repeatability", "of": "LS1"}, events=events).dump()
    document["sequences"]["alarm"]["ends"] = ends
    return Design.load(document)


def lifted(**more: Any) -> Design:
    """A latch whose npn base a divider lifts to half of the supply."""
    of = test_supply_slew.coupled("1M", moments={"standby": "0.5 s"}, **more)
    return changed(of, parts=(exact(resistor("R8", "supply", "base", "1M")),))


def bouncing(check: str, **more: str) -> Design:
    return test_contact_bounce.debounced({"check": check, "of": "S1", **more})


def pulled_up() -> Design:
    """101k below and 10k above: 5.5 V stand where 3.5 V are an alarm."""
    return changed(bouncing("contact_bounce", max="1 ms"), parts=(exact(resistor("R8", "supply", "n", "10k")),))


def charged() -> Design:
    """A micro-coulomb into 1 nF: a thousandth of it lifts the base by a volt."""
    asked = {"check": "stray_immunity", "of": "base", "charge": "1 uC"}
    return test_stray_immunity.stray(slew=None, requirements=[asked])


def rippling() -> Design:
    return design(
        exact(resistor("R1", "supply", "n", "9R")),
        test_capacitor_stress.polarised("100u", ripple_rating="50 mA", series_resistance="1R"),
        sounder("LS1", "n", "0V", "9 mA", "20 V"),
        roles={"filter_capacitor": "C1", "load": "LS1"},
    )


def unlevelled(of: Design) -> Design:
    document = of.dump()
    document["requirements"] = [each for each in document["requirements"] if each["check"] == "repeatability"]
    for part in document["stages"][0]["parts"]:
        part.get("data", {}).pop("operating_minimum", None)
    return Design.load(document)


def unsupplied() -> Design:
    document = test_supply_slew.coupled("1M", moments={"standby": "0.5 s"}, requirements=[test_rearm.ASKED]).dump()
    document["conditions"]["supply"] = "2 V"
    return Design.load(document)


@pytest.mark.parametrize(
    ("name", "make", "words"),
    [
        (
            "load_off:LS1",
            lambda: waiting(test_load_voltage.fed("10R"), "standby"),
            "none of the moments at which it must be off ever came",
        ),
        ("capacitor_ripple:C1", rippling, "the load that ripples never came on"),
        ("rearm:LS1", rearming, "the alarm never ended"),
        ("repeatability:LS1", lambda: deaf(twice("12 s")), "the first alarm never came to an end"),
        ("repeatability:LS1", lambda: twice("11.3 s"), "the second alarm never came to an end"),
        (
            "repower:Q2",
            lambda: waiting(test_supply_slew.coupled("1M", requirements=[test_rearm.ASKED]), "standby"),
            "stand-by never came",
        ),
        (
            "repower:Q2",
            lambda: lifted(requirements=[test_rearm.ASKED]),
            "trips however slowly the supply comes back",
        ),
        # C1 is tried down to a thirtieth: 10k 3.3 uF ln 90 = 0.15 s to 8.9 V; 20k 100 uF come to 0.1 V in 22 ms.
        (
            "order:C1",
            lambda: test_order.pair(vary="C1", **{"from": "t1 above 8.9 V", "to": "t2 above 0.1 V"}),
            "'t2 above 0.1 V' comes first, however small C1 is",
        ),
        ("acceptance:S1", lambda: waiting(bouncing("acceptance", min="20 ms"), "standby"), "stand-by never came"),
        (
            "contact_bounce:S1",
            lambda: waiting(bouncing("contact_bounce", max="1 ms"), "standby"),
            "stand-by never came",
        ),
        ("contact_bounce:S1", pulled_up, "there is an alarm with the shortest burst, or by itself"),
        # 1 uC of 100 uC on 101 nF are 9.9 V of 3 V.
        (
            "line_pulse:in",
            lambda: test_line_pulse.filtered(pulse={**test_line_pulse.PULSE, "charge": "100 uC"}),
            "a hundredth of the pulse raises an alarm",
        ),
        (
            "supervised_loop:line",
            lambda: waiting(test_supervised_loop.loop(), "short", "normal", "open"),
            "one of the moments at which the loop is read, or an event of a threshold, never came",
        ),
        (
            "fuse_load:F1",
            lambda: waiting(test_fuse.fused(), "sounding"),
            "none of the moments at which its current is read ever came",
        ),
        (
            "stray_immunity:base",
            lambda: waiting(test_stray_immunity.stray(), "standby"),
            "stand-by never came",
        ),
        ("stray_immunity:base", charged, "trips at a thousandth of that charge or less"),
        # At 155 C nothing of the rated power is permitted.
        (
            "resistor_power:R1",
            lambda: test_resistor_power.loaded("155 C"),
            "nothing is left to bear the demand: the capability is not above zero",
        ),
    ],
)
def test_what_did_not_happen_is_said(name: str, make: Callable[[], Design], words: str) -> None:
    slug, part = name.split(":")
    found = judged(make(), slug, part)
    assert found.outcome == words
    assert (found.margin, found.verdict) == (-1.0, Verdict.FAIL)


@pytest.mark.parametrize(
    ("name", "make", "missing"),
    [
        (
            "brown_out_depth:Q1",
            lambda: test_brown_out.latch(requirements=[{"check": "brown_out_depth", "of": "Q1"}]),
            "an event dip in sequence alarm",
        ),
        ("load_off:LS1", lambda: test_load_voltage.fed("10R", least=None), "operating_minimum of LS1"),
        (
            "repeatability:LS1",
            lambda: unlevelled(twice("12 s")),
            "operating_minimum of LS1",
        ),
        ("repower:Q2", unsupplied, "a supply above 2 V under conditions"),
    ],
)
def test_a_missing_datum_is_named(name: str, make: Callable[[], Design], missing: str) -> None:
    slug, part = name.split(":")
    found = judged(make(), slug, part)
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, f"missing: {missing}")
