"""Check 10, peak current: the load's inrush against rating and h_FE I_B (common practice, no source)."""

from __future__ import annotations

import math

import pytest
from scipy import constants

from stagebook.engine.design.document import Design
from stagebook.engine.results import Verdict
from stagebook.engine.studies.margins import study

from ..circuits import Json, mosfet, resistor, transistor, two
from .sheets import design, exact, margin, sounder

VT = constants.k * 298.15 / constants.e
ROLES = {"driver": "Q1", "base_resistor": "R1", "load": "LS1"}


def driver(ohms: str = "270R", surge: str | None = "400 mA", rated: str | None = "0.5 A", gain: float = 40.0) -> Design:
    """250 mA at 8.2 V from an npn with V_BE 0.7 V at that current, driven from 8.4 V through ``ohms``."""
    law: Json = {"saturation_current": 0.25 / math.expm1(0.7 / VT), "forward_gain": gain, "reverse_gain": 1}
    load = sounder("LS1", "supply", "low", "250 mA", "3 V", rated="8.2 V")
    if surge is not None:
        load["data"]["surge"] = surge
    ratings = {} if rated is None else {"data": {"i_c_max": rated}}
    return design(
        exact(resistor("R1", "supply", "base", ohms)),
        transistor("Q1", "low", "base", "0V", law=law, **ratings),
        load,
        supply="8.4 V",
        ambient="25 C",
        roles=ROLES,
    )


def test_the_rating_limits() -> None:
    # 400 mA at 8.2 V, some 0.1 V more where the transistor drops less; 40 x 28.5 mA = 1.14 A: 0.5 A is the smaller.
    found = margin(driver(), "peak_current", "Q1")
    assert found.demand == pytest.approx(0.4, rel=0.02)
    assert found.capability == pytest.approx(0.5)
    assert (found.verdict, found.margin) == (Verdict.THIN, pytest.approx(0.2, abs=0.02))


def test_the_base_current_limits() -> None:
    # 7.7 V / 1k x 40 = 308 mA for 400 mA.
    found = margin(driver("1k"), "peak_current", "Q1")
    assert found.capability == pytest.approx(0.308, rel=0.01)
    assert found.margin == pytest.approx(1.0 - 0.4 / 0.308, abs=0.02)
    assert found.verdict is Verdict.FAIL
    assert found.hand == pytest.approx(found.margin, abs=0.02)


def test_a_lower_rating_fails() -> None:
    found = margin(driver(rated="0.3 A"), "peak_current", "Q1")
    assert (found.verdict, found.margin) == (Verdict.FAIL, pytest.approx(1.0 - 0.4 / 0.3, abs=0.03))


def test_a_load_without_surge_is_not_judged_by_what_the_transistor_lets_through() -> None:
    found = margin(driver(surge=None), "peak_current", "Q1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, "missing: surge of LS1")


def test_without_a_rating() -> None:
    assert margin(driver(rated=None), "peak_current", "Q1").reason == "missing: i_c_max of Q1"


def test_a_resistor_as_load_shows_its_current() -> None:
    # 8.4 V less 0.1 V across 82 ohm: 0.1 A of 0.5 A.
    law: Json = {"saturation_current": 0.25 / math.expm1(0.7 / VT), "forward_gain": 100, "reverse_gain": 1}
    of = design(
        exact(resistor("R1", "supply", "base", "1k")),
        transistor("Q1", "low", "base", "0V", law=law, data={"i_c_max": "0.5 A"}),
        exact(resistor("R2", "supply", "low", "82R")),
        supply="8.4 V",
        roles={"driver": "Q1", "load": "R2"},
    )
    found = margin(of, "peak_current", "Q1")
    assert found.demand == pytest.approx(0.101, rel=0.02)
    assert found.verdict is Verdict.PASS


@pytest.mark.parametrize(
    ("gate", "rated", "capability", "verdict"),
    [("8.4 V", "2 A", 2.0, Verdict.PASS), ("8.4 V", "0.3 A", 0.3, Verdict.FAIL), ("3 V", "2 A", 0.25, Verdict.FAIL)],
)
def test_of_a_field_effect_transistor_the_gate_voltage_counts(
    gate: str, rated: str, capability: float, verdict: Verdict
) -> None:
    # Square law (Shichman, Hodges 1968): K/2 (V_GS - V_T)^2 = 0.25 A/V2 x 1 V2 at 3 V, 10 A at 8.4 V; inrush 400 mA.
    load = sounder("LS1", "supply", "low", "250 mA", "1 V", rated="8.2 V")
    load["data"]["surge"] = "400 mA"
    law: Json = {"threshold": "2 V", "transconductance": "0.5 A/V2"}
    of = design(
        load,
        mosfet("Q1", "low", "gate", "0V", law=law, data={"i_d_max": rated}),
        exact(resistor("R1", "gate", "0V", "100k")),
        exact(resistor("R2", "supply", "gate", repr(100e3 * (8.4 / float(gate.split()[0]) - 1.0) + 1.0))),
        supply="8.4 V",
        ambient="25 C",
        roles={"driver": "Q1", "load": "LS1"},
    )
    found = margin(of, "peak_current", "Q1")
    assert found.capability == pytest.approx(capability, rel=0.01)
    assert found.demand == pytest.approx(0.4, rel=0.03)
    assert found.verdict is verdict


def test_a_channel_without_a_rating() -> None:
    load = sounder("LS1", "supply", "low", "250 mA", "3 V", rated="8.2 V")
    load["data"]["surge"] = "400 mA"
    data = {"threshold": "2 V", "resistance_on": "0.1 ohm"}
    of = design(load, mosfet("Q1", "low", "supply", "0V", data=data), roles={"driver": "Q1", "load": "LS1"})
    assert margin(of, "peak_current", "Q1").reason == "missing: i_d_max of Q1"


def two_loads(second: Json, *more: Json, ohms: str = "100R", first: str = "150 mA", surge: str = "300 mA") -> Design:
    """A driver of 0.5 A at 8.4 V with a sounder and a second load beside it, which no role names unless one does."""
    law: Json = {"saturation_current": 0.25 / math.expm1(0.7 / VT), "forward_gain": 40, "reverse_gain": 1}
    load = sounder("LS1", "supply", "low", first, "3 V", rated="8.2 V")
    load["data"]["surge"] = surge
    return design(
        exact(resistor("R1", "supply", "base", ohms)),
        transistor("Q1", "low", "base", "0V", law=law, data={"i_c_max": "0.5 A"}),
        load,
        second,
        *more,
        supply="8.4 V",
        ambient="25 C",
        roles=ROLES,
    )


def beside(low: str = "low", surge: str | None = "300 mA", plus: str = "supply") -> Json:
    found = sounder("LS2", plus, low, "150 mA", "3 V", rated="8.2 V")
    if surge is not None:
        found["data"]["surge"] = surge
    return found


def test_loads_in_parallel_come_on_together() -> None:
    # Kirchhoff's current law: 300 mA and 300 mA at 8.2 V, of the 0.5 A that it is rated for; one alone is 40 % within.
    found = margin(two_loads(beside()), "peak_current", "Q1")
    assert found.demand == pytest.approx(0.6, rel=0.02)
    assert (found.capability, found.verdict) == (pytest.approx(0.5), Verdict.FAIL)
    assert found.margin == pytest.approx(1.0 - 0.6 / 0.5, abs=0.03)
    assert found.hand == pytest.approx(found.margin, abs=0.02)


def test_of_one_of_two_loads_its_surge_is_not_known() -> None:
    found = margin(two_loads(beside(surge=None)), "peak_current", "Q1")
    assert (found.verdict, found.reason) == (Verdict.UNKNOWN, "missing: surge of LS2")


def test_a_load_behind_a_lead_is_driven_too_and_one_that_is_not_switched_is_not() -> None:
    lead = two("lead", "W1", "far", "low", length="1 m", resistance="0.01 ohm/m")
    lead["pins"] = {"from": "far", "to": "low"}
    behind = margin(two_loads(beside("far"), lead), "peak_current", "Q1")
    assert behind.demand == pytest.approx(0.6, rel=0.02)
    elsewhere = margin(two_loads(beside("0V")), "peak_current", "Q1")
    assert elsewhere.demand == pytest.approx(0.3, rel=0.02)
    # From the switched net to the return of the driver: it draws while the driver is off.
    across = margin(two_loads(beside("0V", plus="low")), "peak_current", "Q1")
    assert across.demand == pytest.approx(0.3, rel=0.02)


def test_a_resistor_beside_a_sounder_counts_with_its_own_current() -> None:
    # 300 mA of surge, and 8.3 V across 82 ohm: 0.1 A, in the role of a load of its own.
    of = two_loads(exact(resistor("R2", "supply", "low", "82R")))
    document = of.dump()
    roles = document["stages"][0]["roles"]
    for first, second in (("LS1", "R2"), ("R2", "LS1")):
        roles["load"], roles["load_2"] = first, second
        found = margin(Design.load(document), "peak_current", "Q1")
        assert found.demand == pytest.approx(0.3 + 8.3 / 82.0, rel=0.02)


def test_a_driver_whose_load_is_another_stage_is_judged_by_that_one() -> None:
    # Two drivers: the first switches 300 mA of inrush, the second 700 mA in a stage that brings no load of its own.
    law: Json = {"saturation_current": 0.25 / math.expm1(0.7 / VT), "forward_gain": 40, "reverse_gain": 1}
    other = beside("low2", surge="700 mA")
    of = two_loads(other).dump()
    (unit,) = of["stages"]
    unit["parts"].remove(next(part for part in unit["parts"] if part["ref"] == "LS2"))
    second = [
        exact(resistor("R12", "supply", "base2", "100R")),
        transistor("Q2", "low2", "base2", "0V", law=law, data={"i_c_max": "0.5 A"}),
    ]
    of["stages"] += [
        {"name": "second", "parts": second, "roles": {"driver": "Q2", "base_resistor": "R12"}},
        {"name": "siren", "parts": [other], "roles": {"load": "LS2"}},
    ]
    found = {check.id: check for check in study(Design.load(of)).checks}
    assert found["peak_current:unit:Q1"].demand == pytest.approx(0.3, rel=0.02)
    assert found["peak_current:second:Q2"].demand == pytest.approx(0.7, rel=0.02)
    assert found["peak_current:second:Q2"].verdict is Verdict.FAIL
    # 150 mA each at 8.2 V, of the second alone: 3.75 mA of base current.
    assert found["base_overdrive:second:Q2"].demand == pytest.approx(0.15 / 40.0, rel=0.02)
