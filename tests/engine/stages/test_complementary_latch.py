"""Complementary latch: it trips, holds, is reset, and does not trip when the supply is snapped on.

Loop condition B1 B2 >= 1 after Ebers (1952) and Moll et al. (1956), from memory; sizing is common practice, no source.
"""

from __future__ import annotations

import numpy as np
import pytest

from stagebook.engine.design.document import Design

from ..circuits import Setup
from .made import PIEZO, at, begins, choice, load_goes, made, run, seconds, value

ROW = (choice("contact_no", "call", held="0.2 s"), choice("complementary_latch", "latch"), PIEZO)


def test_it_trips_and_holds_after_the_contact_has_opened() -> None:
    design = made(*ROW)
    before, after = at("latch.out", 0.9), at("latch.out", begins(design) + 1.5)
    seen = run(design, before, after, on := load_goes(True), off := load_goes(False))
    assert seen.value(before)[0] == pytest.approx(0.0, abs=0.05)
    assert seen.value(after)[0] == pytest.approx(12.0 - 0.1, abs=0.2)
    assert seconds(seen, on) == pytest.approx(begins(design), abs=5e-3)
    assert np.isnan(seconds(seen, off))


def test_it_holds_at_the_lowest_supply_in_the_cold_with_the_least_gain() -> None:
    design = made(*ROW)
    weak = {("Q1", "gain"): 200.0, ("Q2", "gain"): 200.0, ("Q3", "gain"): 200.0}
    cold = {("conditions", "supply"): 11.0, ("conditions", "ambient"): 0.0}
    seen = run(design, after := at("latch.out", begins(design) + 1.5), changes={**weak, **cold})
    assert seen.value(after)[0] > 10.5


def test_snapping_the_supply_on_does_not_trip_it() -> None:
    document = made(*ROW).dump()
    document["sequences"]["alarm"] = document["sequences"]["snap"]
    document["strays"] = [{"between": ["supply", "latch.base"], "value": "10 pF"}]
    seen = Setup(Design.load(document)).run(after := at("latch.out", 1.5))
    assert seen.value(after)[0] < 0.1


def test_feedback_and_collector_resistor_follow_from_the_output_current() -> None:
    design = made(*ROW)
    gain = 200.0 * (1.0 - 0.005 * 25.0)  # class minimum at 0 C, +0.5 %/K (common practice)
    wanted = 3.0 * 12e-3 / gain  # what the driver's base takes; its base-emitter resistor, 33k, takes V_BE/R_BE more
    upper_base = 3.0 * (wanted + 0.65 / 31.6e3) / gain
    bleed = min(100e3, 0.65 / (0.1 * upper_base))
    collector = upper_base + 0.65 / bleed
    exact = (11.0 - 0.8) / collector
    assert 0.9 * exact < value(design, "latch", "collector_resistor") <= exact  # next lower of E24
    held = 3.0 * (collector / gain + 0.65 / 100e3)
    exact = (11.0 - 0.8) / held
    assert 0.9 * exact < value(design, "latch", "feedback_resistor") <= exact


def test_the_base_capacitors_divide_the_step_to_a_third_of_v_be() -> None:
    # 15 pF x 14 V / (0.3 x 0.65 V) = 1.08 nF, next higher of E6: 1.5 nF.
    assert value(made(*ROW), "latch", "base_capacitor", "F") == pytest.approx(1.5e-9)


def test_a_timer_resets_it() -> None:
    reset = choice("long_timer", "timer", mode="reset", time="5 s")
    design = made(*ROW[:2], reset, PIEZO)
    seen = run(design, on := load_goes(True), off := load_goes(False))
    assert seconds(seen, off) - seconds(seen, on) == pytest.approx(5.0, rel=0.1)
