"""Where a margin comes from: what the check read, with value, instant and source. Figures by hand on small circuits."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from stagebook.engine.checks.check import Judged, ratio
from stagebook.engine.design.document import Design
from stagebook.engine.errors import CircuitError
from stagebook.engine.results import CheckResult
from stagebook.engine.studies.explanation import Explanation, _put_in, explain
from stagebook.engine.studies.margins import study

from ..checks.latches import latch
from ..checks.sheets import design, exact, margin, sounder
from ..checks.timers import timer
from ..circuits import resistor


def explained(of: Design, slug: str, part: str) -> tuple[CheckResult, Explanation]:
    result = margin(of, slug, part)
    found = explain(of, result)
    assert found.margin == pytest.approx(result.margin, abs=1e-9)
    return result, found


def heated(**more: object) -> Design:
    """9 V across 1k of 0.25 W: 81 mW of 0.6 x 0.25 W = 150 mW."""
    return design(
        exact(resistor("R1", "supply", "0V", "1k", rating="0.25 W")),
        supply={"min": "6 V", "nominal": "7 V", "max": "9 V"},
        **more,  # type: ignore[arg-type]
    )


def test_values_put_in_observation_data_and_factor() -> None:
    result, found = explained(heated(), "resistor_power", "R1")
    assert found.put_in == "m = 1 - D/C = 1 - 81 mW / 150 mW = +46 %"
    assert found.formula == result.formula
    (power,) = found.observed
    assert (power.what, power.unit, power.sequence, power.at) == ("power of R1 at 500 ms", "W", "alarm", 0.5)
    assert power.value == pytest.approx(81e-3)
    used = {each.what: each for each in found.used}
    rating = used["R1 rating"]
    assert (rating.value, rating.unit, rating.source) == (0.25, "W", "the part's own figure, source not said")
    factor = used["derating of the power rating of resistors at the ambient temperature"]
    assert (factor.value, factor.source) == (0.6, "customary: common practice, from memory")
    supply = used["supply"]
    assert (supply.value, supply.low, supply.high, supply.source) == (9.0, 6.0, 9.0, "conditions of the design")
    assert (found.required.value, found.required.source) == (0.0, "customary: common practice, from memory")


def test_a_changed_factor_and_requirement_say_who_changed_them_and_why() -> None:
    of = heated(
        derating={"resistor_power": "0.8"},
        required={"resistor_power": "5 %"},
        reasons={"resistor_power": "ventilated"},
    )
    _, found = explained(of, "resistor_power", "R1")
    factor = next(each for each in found.used if each.what.startswith("derating"))
    assert (factor.value, factor.source) == (0.8, "the design's table: ventilated")
    assert (found.required.value, found.required.source) == (0.05, "the design's table: ventilated")
    own = {"check": "resistor_power", "of": "R1", "derating": "0.9", "reason": "on a heat sink"}
    _, found = explained(heated(requirements=[own]), "resistor_power", "R1")
    factor = next(each for each in found.used if each.what.startswith("derating"))
    assert (factor.value, factor.source) == (0.9, "the requirement: on a heat sink")


def test_a_window_and_its_events() -> None:
    # R C ln 3 = 103.4 ohm s x 1.0986 = 113.6 s.
    _, found = explained(timer(None), "duration", "LS1")
    assert found.put_in.startswith("m = min(140 s - 113.6 s, 113.6 s - 100 s) / ((140 s - 100 s)/2) = +")
    ends = {each.what: each.value for each in found.observed}
    assert ends["time of LS1 off, from LS1 on"] == pytest.approx(113.6, rel=1e-3)
    assert "largest voltage of tc, from LS1 on to LS1 off" in ends


def test_the_leakage_of_a_capacitor_has_its_source() -> None:
    _, found = explained(timer("35.2 uA"), "arrival", "C1")
    used = {each.what: each for each in found.used}
    assert used["C1 leakage specified, at rated voltage and 20 C"].value == pytest.approx(35.2e-6)
    assert used["C1 voltage"].value == 16.0
    assert used["R1 value"].source == "the part's value, 0 %"


def test_a_trial_shows_its_edge() -> None:
    result, found = explained(latch(), "latch_hold", "Q1")
    edge = next(each for each in found.observed if each.what.startswith("trial latch hold"))
    assert edge.value is not None
    assert edge.value > 1.0
    at_edge = next(each for each in found.observed if each.what.startswith("in the trial: current into Q1 emitter"))
    assert at_edge.value == pytest.approx(result.demand)


def test_a_missing_datum_leaves_the_formula_empty() -> None:
    of = design(resistor("R1", "supply", "0V", "1k"))
    result = margin(of, "resistor_power", "R1")
    found = explain(of, result)
    assert (found.put_in, found.margin, found.observed) == ("", None, ())


def test_a_margin_that_the_design_has_not() -> None:
    of = design(sounder("LS1", "supply", "0V", "10 mA", "3 V"))
    stranger = margin(heated(), "resistor_power", "R1")
    with pytest.raises(CircuitError, match="the design has no margin resistor_power:unit:R1"):
        explain(of, stranger)


def test_only_one_margin_is_studied_where_only_one_is_asked_for() -> None:
    sheet = study(timer(None), only="arrival:unit:C1")
    assert [check.id for check in sheet.checks] == ["arrival:unit:C1"]
    assert sheet.checks[0] == margin(timer(None), "arrival", "C1")


def judged(demand: float, capability: float, outcomes: tuple[tuple[np.ndarray, str], ...] = ()) -> Judged:
    return ratio(np.array([demand]), np.array([capability]), outcomes)


def test_figures_put_in_are_those_that_stand_above_and_rounded_alike() -> None:
    result, _ = explained(heated(), "resistor_power", "R1")
    # 1 - 1.333 = -33.3 %: whole percent, towards the worse, as wherever a margin is shown.
    worse = replace(result, demand=4.0, capability=3.0, margin=1.0 - 4.0 / 3.0)
    assert _put_in(judged(4.0, 3.0), "V", worse) == "m = 1 - D/C = 1 - 4 V / 3 V = -34 %"
    # Computed again it came out 0.01 % different: the same margin, so its own figures.
    assert _put_in(judged(4.0003, 3.0), "V", worse) == "m = 1 - D/C = 1 - 4 V / 3 V = -34 %"
    assert _put_in(judged(4.5, 3.0), "V", worse) == "m = 1 - D/C = 1 - 4.5 V / 3 V = -50 %"


def test_a_margin_that_stands_for_an_outcome_is_not_put_down_to_figures() -> None:
    result, _ = explained(heated(), "resistor_power", "R1")
    lost = judged(1.048e-3, 2.583e-6, ((np.array([True]), "did not let go"),))
    told = replace(result, margin=-1.0, outcome="did not let go", demand=1.048e-3, capability=2.583e-6)
    assert _put_in(lost, "A", told) == "m = -100 %, which stands for: did not let go"
