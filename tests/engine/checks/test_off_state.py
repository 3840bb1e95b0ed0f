"""Check 3, hot off-state: leakage through the base-emitter resistor against V_BE at the permitted off-current."""

from __future__ import annotations

import math
from typing import Any

import pytest
from scipy import constants

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict

from ..circuits import Json, resistor, transistor
from .sheets import design, exact, margin

DATA: Json = {"gain": "200", "v_be": "0.64 V", "v_be_current": "2 mA", "i_cbo": "1 uA", "i_cbo_doubling": "10 K"}
ROLES = {"trip_device": "Q1", "base_emitter_resistor": "R1"}


def base_voltage(amperes: float, celsius: float) -> float:
    """V_BE(T) = V_G0 (1 - T/T0) + (T/T0) V_BE0 - eta (kT/q) ln(T/T0) + (kT/q) ln(I/I0) (Tsividis 1980, from memory)."""
    t, t0 = celsius + 273.15, 298.15
    vt = constants.k * t / constants.e
    return 1.206 * (1.0 - t / t0) + t / t0 * 0.64 - 3.0 * vt * math.log(t / t0) + vt * math.log(amperes / 2e-3)


def off(ohms: str, data: Json | None = None, ambient: str = "55 C", kind: str = "npn", **more: Any) -> Design:
    """A transistor that nothing turns on, its load 10k, a resistor from base to emitter."""
    rail, common = ("supply", "0V") if kind == "npn" else ("0V", "supply")
    return design(
        exact(resistor("R1", "base", common, ohms)),
        exact(resistor("R2", rail, "out", "10k")),
        transistor("Q1", "out", "base", common, kind, data=DATA if data is None else data),
        ambient=ambient,
        roles=ROLES,
        **more,
    )


@pytest.mark.parametrize("kind", ["npn", "pnp"])
def test_leakage_that_has_doubled_three_times(kind: str) -> None:
    # 1 uA at 25 C is 8 uA at 55 C: 80 mV across 10k, against V_BE at 1 uA, 0.38 V.
    allowed = base_voltage(1e-6, 55.0)
    found = margin(off("10k", kind=kind), "hot_off_state", "Q1")
    assert found.demand == pytest.approx(8e-6 * 10e3, rel=0.01)
    assert found.capability == pytest.approx(allowed, abs=0.5e-3)
    assert found.margin == pytest.approx(1.0 - 0.08 / allowed, abs=0.005)
    assert found.verdict is Verdict.PASS
    # By hand, the base taking nothing.
    assert found.hand == pytest.approx(found.margin, abs=0.005)


def test_a_resistor_too_large_fails() -> None:
    # 100k: eight microamperes would be 0.8 V. The junction holds it at less, but above V_BE at 1 uA.
    found = margin(off("100k"), "hot_off_state", "Q1")
    assert found.verdict is Verdict.FAIL
    assert found.hand == pytest.approx(1.0 - 0.8 / base_voltage(1e-6, 55.0), abs=0.005)


def test_the_permitted_current_is_the_requirements() -> None:
    of = off("10k", requirements=[{"check": "hot_off_state", "of": "Q1", "off_current": "10 uA"}])
    found = margin(of, "hot_off_state", "Q1")
    assert found.capability == pytest.approx(base_voltage(10e-6, 55.0), abs=0.5e-3)


def test_cold_it_is_no_question() -> None:
    found = margin(off("10k", ambient="-15 C"), "hot_off_state", "Q1")
    assert found.demand == pytest.approx(1e-6 / 16.0 * 10e3, rel=0.01)


@pytest.mark.parametrize(
    "fields",
    [
        {"data": {key: text for key, text in DATA.items() if not key.startswith("i_cbo")}},
        {"law": {"saturation_current": "10 fA", "forward_gain": "100"}},
    ],
)
def test_without_a_leakage_figure_it_is_unknown(fields: Json) -> None:
    parts = [exact(resistor("R1", "base", "0V", "10k")), exact(resistor("R2", "supply", "out", "10k"))]
    of = design(*parts, transistor("Q1", "out", "base", "0V", **fields), roles=ROLES)
    found = margin(of, "hot_off_state", "Q1")
    assert (found.margin, found.verdict, found.reason) == (None, Verdict.UNKNOWN, "missing: i_cbo of Q1")
