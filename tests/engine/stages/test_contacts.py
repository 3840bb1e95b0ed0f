"""Contacts, debounce, differentiator: sizing and what the made stages do (common practice, no source)."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.errors import DesignError
from stagebook.engine.primitives.signals import maximum, voltage
from stagebook.engine.stages.making import doubts

from .made import PIEZO, at, begins, choice, conditions, load_goes, made, run, seconds, value


def test_the_pull_resistor_carries_the_wetting_current_at_the_lowest_supply() -> None:
    # 11 V / 1.1 mA = 10k and 11 V / 0.99 mA = 11.1k, next lower of E24: 11k. A tenth is there for the tolerance.
    assert value(made(choice("contact_no", "call", wetting="1 mA"), PIEZO), "call", "pull_down") == 10e3
    assert value(made(choice("contact_no", "call", wetting="0.9 mA"), PIEZO), "call", "pull_down") == 11e3
    # What follows draws through a pull-up: the driver 10.35 V / 45.7k = 0.226 mA, a tenth of 11 V over that is 4.9k.
    assert value(made(choice("contact_nc", "call", wetting="0.9 mA"), PIEZO), "call", "pull_up") == 4.7e3


def test_a_pull_up_that_feeds_a_delay_is_doubted_and_the_entry_carries_it() -> None:
    # A delay takes all that its output gives through it: 140 mA flow while the contact is closed at rest.
    row = (choice("entry"), choice("contact_nc", "call"), choice("long_timer", time="10 s"), choice("low_side_driver"))
    (said,) = doubts(conditions(), row)["call"]
    assert said.startswith("stand-by current: what follows takes")
    design = made(*row)
    rests = 14.0 / value(design, "call", "pull_up")
    assert rests > 0.1
    # The filter loses its 0.3 V, a little more at a rail that is not as low as reckoned: it is sized for that.
    assert value(design, "entry", "filter_resistor") * rests < 0.33
    assert doubts(conditions(), (row[0], row[1], choice("schmitt_trigger"), *row[2:])) == {}


@pytest.mark.parametrize(("kind", "rests", "active"), [("contact_no", 0.0, 12.0), ("contact_nc", 0.0, 10.4)])
def test_a_contact_is_active_high(kind: str, rests: float, active: float) -> None:
    design = made(choice(kind, "call", held="2 s", bounce="0 s"), PIEZO)
    before, during, after = (at("call.out", t) for t in (0.9, 2.0, 4.0))
    seen = run(design, before, during, after, on := load_goes(True), off := load_goes(False))
    assert seen.value(before)[0] == pytest.approx(rests, abs=0.05)
    assert seen.value(after)[0] == pytest.approx(rests, abs=0.05)
    # A normally closed contact gives what its pull-up leaves of the rail.
    assert seen.value(during)[0] == pytest.approx(active, rel=0.15)
    assert seconds(seen, off) - seconds(seen, on) == pytest.approx(2.0, abs=1e-3)


def test_a_lead_brings_its_resistance() -> None:
    design = made(choice("contact_no", "call", lead="10 m"), PIEZO)
    lead = design.part(design.stage("call").roles["lead"])
    assert (lead.kind, lead.pins) == ("lead", {"from": "call.out", "to": "call/far"})


def debounced(**held: str) -> tuple[float, float]:
    """When the latch behind a debounce trips after the contact closes, and the tau of the debounce."""
    row = (
        choice("contact_no", "call", **held),
        choice("debounce", bounce="5 ms", event="200 ms"),
        choice("complementary_latch", "latch"),
        PIEZO,
    )
    design = made(*row)
    seen = run(design, on := load_goes(True))
    ohms = value(design, "debounce", "debounce_resistor")
    return seconds(seen, on) - begins(design), ohms * value(design, "debounce", "debounce_capacitor", "F")


def test_a_debounce_acts_between_bounce_and_event() -> None:
    acts, _ = debounced(held="1 s", bounce="2 ms")
    # The geometric middle of 5 ms and 200 ms is 32 ms; the latch trips a little above what it says.
    assert 5e-3 < acts < 200e-3
    assert acts == pytest.approx(math.sqrt(5e-3 * 200e-3), rel=0.5)


def test_an_event_that_is_shorter_than_the_bounce_does_not_count() -> None:
    acts, _ = debounced(held="5 ms", bounce="0 s")
    assert np.isnan(acts)


def test_tau_follows_from_the_middle_and_the_threshold() -> None:
    # tau = sqrt(5 ms x 200 ms) / ln(1/(1-p)), p = (V_BE + V_D)/V_min = 1.3/11: 32 ms / 0.126 = 0.25 s, within E6 steps.
    _, tau = debounced()
    assert tau == pytest.approx(math.sqrt(1e-3) / -math.log1p(-1.3 / 11.0), rel=0.25)


def test_an_event_must_be_longer_than_a_bounce() -> None:
    with pytest.raises(DesignError, match="stage debounce, setting event: 5 ms is not longer than the bounce of 5 ms"):
        made(choice("contact_no"), choice("debounce", event="5 ms"), PIEZO)


def edge(held: str) -> tuple[float, float]:
    row = (
        choice("contact_no", "call", held=held),
        choice("differentiator", "edge"),
        choice("complementary_latch", "latch"),
    )
    design = made(*row, PIEZO)
    peak = maximum(voltage("edge.out").scaled(-1.0))
    seen = run(design, on := load_goes(True), peak)
    return seconds(seen, on), float(seen.value(peak)[0])


def test_an_edge_sets_the_latch_and_its_end_does_no_harm() -> None:
    on, reverse = edge("0.5 s")
    assert on == pytest.approx(1.0, abs=1e-3)
    assert reverse < 1.0


def test_the_trigger_capacitor_carries_three_times_the_charge() -> None:
    # (2 nF x 0.65 V + 2 mA x 10 us) x 3 / (11 - 1.3) V = 6.6 nF: 10 nF is the least; with 10 mA 31 nF, next 33 nF.
    row = (choice("contact_no"), choice("differentiator", "edge", draw="10 mA"), choice("complementary_latch"), PIEZO)
    assert value(made(*row), "edge", "trigger_capacitor", "F") == pytest.approx(33e-9)
    row = (choice("contact_no"), choice("differentiator", "edge", draw="2 mA"), choice("complementary_latch"), PIEZO)
    assert value(made(*row), "edge", "trigger_capacitor", "F") == pytest.approx(10e-9)


def test_a_pulse_is_refused_where_a_level_is_wanted() -> None:
    with pytest.raises(DesignError, match="stage driver: a low-side driver does not take a pulse signal"):
        made(choice("contact_no"), choice("differentiator"), PIEZO)


def test_a_stage_that_needs_a_signal_says_so() -> None:
    with pytest.raises(DesignError, match="stage debounce: a debounce needs a signal; put a contact or a sensor"):
        made(choice("debounce"), PIEZO)
