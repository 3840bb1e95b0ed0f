"""Check 31, stray immunity: Q = C V into what hangs on the base (closed form, worked by hand below)."""

from __future__ import annotations

from typing import Any

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json
from .sheets import margin
from .test_supply_slew import coupled


def stray(held: str | None = "1n", slew: str | None = "10 V/us", **more: Any) -> Design:
    """10 pF from the supply of 6 V, connected slowly, to a base that ``held`` and 100k tie to 0V; trip at 0.38 V."""
    document = coupled(more.pop("ohms", "100k"), held=held, rise="10 ms", moments={"standby": "0.5 s"}, **more).dump()
    if slew is not None:
        document["strays"][0]["slew"] = slew
    return Design.load(document)


def test_a_held_base_takes_what_a_stray_brings() -> None:
    # D = 10 pF 6 V = 60 pC; C = 0.38 V (1 nF + 10 pF) = 384 pC, and 3 % for the 0.6 us of the pulse through 100k.
    found = margin(stray(), "stray_immunity", "base")
    assert found.demand == pytest.approx(60e-12, rel=1e-3)
    assert found.capability == pytest.approx(390e-12, rel=0.09)
    assert found.margin == pytest.approx(1.0 - 60.0 / 390.0, abs=0.015)
    assert found.hand == pytest.approx(1.0 - 60.0 / 384.0, abs=0.015)
    assert (found.verdict, found.sequence) == (Verdict.PASS, "alarm")


def test_a_bare_base_trips() -> None:
    # Only the stray's own 10 pF hang on the base: 0.38 V 10 pF = 3.8 pC, and 0.6 us 0.38 V/1M on the way.
    found = margin(stray(None, ohms="1M"), "stray_immunity", "base")
    assert found.capability == pytest.approx(3.8e-12, rel=0.15)
    assert found.margin == pytest.approx(1.0 - 60.0 / 4.0, rel=0.15)
    assert found.verdict is Verdict.FAIL


def test_a_slow_stray_is_drained_by_the_resistor() -> None:
    # 6 V within 6 ms: 60 pC are 10 nA, 1 mV in 100k. To lift it by 0.38 V takes 3.8 uA, 23 nC: more than is tried.
    found = margin(stray(slew="0.001 V/us"), "stray_immunity", "base")
    assert (found.margin, found.outcome) == (1.0, "immune to any charge that strays can bring")


def test_a_stated_charge_needs_no_stray() -> None:
    asked: Json = {"check": "stray_immunity", "of": "mid", "charge": "1 nC", "width": "1 us"}
    found = margin(stray(slew=None, requirements=[asked]), "stray_immunity", "mid")
    # The pnp's base has 47k and next to no capacitance: 0.37 V / 47k for 1 us is 8 pC, but by 1 us the npn's base,
    # fed by the pnp, must be there as well.
    assert found.demand == pytest.approx(1e-9)
    assert found.verdict is Verdict.FAIL


@pytest.mark.parametrize(
    ("requirement", "net", "missing"),
    [
        ({"of": "base"}, "base", "slew of the stray between supply and base"),
        ({"of": "mid"}, "mid", "a stray with its slew to net mid, or charge in the requirement stray_immunity of mid"),
        ({"of": "supply"}, "supply", "a net that no source holds in place of supply"),
    ],
)
def test_what_is_missing_is_named(requirement: Json, net: str, missing: str) -> None:
    of = stray(slew=None, requirements=[{"check": "stray_immunity", **requirement}])
    found = margin(of, "stray_immunity", net)
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, f"missing: {missing}")


def test_without_a_stated_slew_it_is_not_asked() -> None:
    with pytest.raises(AssertionError, match="stray_immunity:unit:base is not among"):
        margin(stray(slew=None), "stray_immunity", "base")
