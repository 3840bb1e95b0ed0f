"""Symmetric pairs: found by what is connected to what, and looked at in mirrored lanes at power-up.

Expected states: common practice, no source.
"""

from __future__ import annotations

from collections.abc import Sequence

import pytest

from stagebook.engine.circuit.pairs import pairs
from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, Verdict
from stagebook.engine.run import never
from stagebook.engine.studies.margins import study
from stagebook.engine.studies.mirrored import undefined

from ..circuits import Json, Setup, capacitor, resistor, setup, transistor, two
from . import units

NPN: Json = {"class": "small npn"}


def bistable(*extra: Json, rise: str = "1 us", names: Sequence[str] = ("Q1", "Q2"), tolerance: str = "5 %") -> Setup:
    """Two transistors with equal halves; R2 is the load of the second."""
    first, second = names
    alike = {"tolerance": tolerance}
    return setup(
        resistor("R1", "supply", "c1", "1k", **alike),
        resistor("R2", "supply", "c2", "1k", **alike),
        resistor("R3", "c1", "b2", "10k", **alike),
        resistor("R4", "c2", "b1", "10k", **alike),
        resistor("R5", "b1", "0V", "10k", **alike),
        resistor("R6", "b2", "0V", "10k", **alike),
        transistor(first, "c1", "b1", "0V", **NPN),
        transistor(second, "c2", "b2", "0V", **NPN),
        *extra,
        events=[{"at": "0 s", "event": "connect supply", "rise": rise}],
        ends=0.1,
    )


def astable() -> Setup:
    return setup(
        resistor("R1", "supply", "c1", "1k"),
        resistor("R2", "supply", "b1", "47k"),
        resistor("R3", "supply", "b2", "47k"),
        resistor("R4", "supply", "c2", "1k"),
        capacitor("C1", "c1", "b2", "10n"),
        capacitor("C2", "c2", "b1", "10n"),
        transistor("Q1", "c1", "b1", "0V", **NPN),
        transistor("Q2", "c2", "b2", "0V", **NPN),
        ends=10e-3,
    )


def monostable() -> Setup:
    return setup(
        resistor("R1", "supply", "c1", "1k"),
        resistor("R2", "supply", "c2", "1k"),
        capacitor("C1", "c1", "b2", "10n"),
        resistor("R3", "supply", "b2", "47k"),
        resistor("R4", "c2", "b1", "10k"),
        transistor("Q1", "c1", "b1", "0V", **NPN),
        transistor("Q2", "c2", "b2", "0V", **NPN),
        ends=10e-3,
    )


def schmitt() -> Setup:
    return setup(
        resistor("R1", "supply", "b1", "10k"),
        resistor("R2", "supply", "c1", "10k"),
        resistor("R3", "c1", "b2", "10k"),
        resistor("R4", "b2", "0V", "22k"),
        resistor("R5", "supply", "c2", "2k2"),
        resistor("R6", "e", "0V", "1k"),
        transistor("Q1", "c1", "b1", "e", **NPN),
        transistor("Q2", "c2", "b2", "e", **NPN),
        ends=10e-3,
    )


def pairs_of(design: Design) -> list[tuple[str, str, bool]]:
    return [(p.first.transistor, p.second.transistor, p.holds) for p in pairs(Setup(design).circuit)]


def test_pairs_are_found_by_their_cross_coupling() -> None:
    assert pairs_of(bistable().design) == [("Q1", "Q2", True)]
    assert pairs_of(bistable(names=("Q7", "Q3")).design) == [("Q7", "Q3", True)]
    assert pairs_of(bistable(capacitor("C1", "c1", "b2", "1n"), capacitor("C2", "c2", "b1", "1n")).design) == [
        ("Q1", "Q2", True)
    ]
    assert pairs_of(astable().design) == [("Q1", "Q2", False)]


@pytest.mark.parametrize(
    "circuit", [monostable(), schmitt(), Setup(units.load(units.latch()))], ids=["monostable", "schmitt", "latch"]
)
def test_what_has_one_state_at_rest_is_no_pair(circuit: Setup) -> None:
    assert pairs_of(circuit.design) == []


def test_what_is_known_of_both_halves() -> None:
    pair = next(iter(pairs(bistable().circuit)))
    assert (pair.first.collector, pair.first.base) == ("c1", "b1")
    assert (pair.first.coupling, pair.first.bleed, pair.first.bias) == (("R4",), ("R5",), ())
    assert "R1" in pair.first.load


def said(circuit: Setup) -> str | None:
    found = undefined(circuit.circuit, "alarm", next(iter(pairs(circuit.circuit))), never)
    return None if found is None else found.words


@pytest.mark.parametrize("rise", ["1 us", "50 ms"])
@pytest.mark.parametrize("tolerance", ["5 %", "0 %"])
def test_a_bistable_of_equal_halves_is_undefined_at_power_up(rise: str, tolerance: str) -> None:
    assert said(bistable(rise=rise, tolerance=tolerance)) == "undefined at power-up: Q1 or Q2 comes on first"


def test_a_capacitor_at_one_base_decides_a_fast_rise_only() -> None:
    # 1 uF holds the base of Q1 for some 5 ms: Q2 is on by then, whatever the halves are; but not when the supply takes
    # ten times as long to rise as the capacitor to charge.
    held = capacitor("C1", "b1", "0V", "1u")
    assert said(bistable(held, rise="1 us")) is None
    assert said(bistable(capacitor("C1", "b1", "0V", "1n"), rise="50 ms")) is not None


def test_an_astable_runs_whichever_half_comes_first() -> None:
    assert said(astable()) is None


def of(circuit: Setup, requirement: Json) -> CheckResult:
    document = circuit.design.dump()
    document["requirements"] = [requirement]
    found = {check.id: check for check in study(Design.load(document)).checks}
    return found[f"{requirement['check']}:all:{requirement['of']}"]


LAMP: Json = two(
    "sounder", "LS1", "supply", "c2", data={"current": "5 mA", "rated_voltage": "6 V"}, operating_minimum="3 V"
)
ON: Json = {"check": "duration", "of": "LS1", "from": "supply above 1 V", "to": "LS1 on", "min": "0 s", "max": "50 ms"}


def test_a_requirement_that_hangs_on_the_state_fails_with_the_words() -> None:
    # The sounder hangs on the collector of Q2: it is on at power-up or not, as chance has it.
    found = of(bistable(LAMP), ON)
    assert found.outcome == "undefined at power-up: Q1 or Q2 comes on first"
    assert (found.verdict, found.margin) == (Verdict.FAIL, -1.0)


def test_a_requirement_of_a_defined_state_is_judged_as_ever() -> None:
    found = of(bistable(LAMP, capacitor("C1", "b1", "0V", "1u")), ON)
    assert found.outcome is None
    assert found.margin is not None


def test_a_margin_that_both_states_keep_says_it_beside_the_verdict() -> None:
    document = bistable().design.dump()
    checks = {check.id: check for check in study(Design.load(document)).checks}
    found = checks["peak_collector_emitter:all:Q2"]
    assert found.verdict is Verdict.PASS
    assert found.reason == "alarm: undefined at power-up: Q1 or Q2 comes on first"
