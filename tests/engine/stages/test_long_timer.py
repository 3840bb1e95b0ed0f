"""Long RC timer: T = R C ln(V/(V - V_th)) (RC charging law), delay and interval, and when it cannot get there."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.errors import DesignError
from stagebook.engine.primitives.columns import AMBIENT
from stagebook.engine.primitives.signals import Anchor, minimum, voltage

from .made import PIEZO, begins, choice, load_goes, made, run, seconds, value

CALL = choice("contact_no", "call", held="60 s")


def timed(
    time: str, share: str = "0.3", supply: tuple[str, str, str] = ("11 V", "12 V", "14 V")
) -> tuple[float, float]:
    """Simulated time, and R C ln(V/(V - V_th)) with the values that were put in."""
    design = made(choice("long_timer", "timer", time=time, threshold=share), PIEZO, supply=supply)
    volts = float(supply[1].split()[0])
    seen = run(design, on := load_goes(True, supply=volts))
    tau = value(design, "timer", "timing_resistor") * value(design, "timer", "timing_capacitor", "F")
    threshold = float(share) * volts + (1.0 if "emitter_diode" in design.stage("timer").roles else 0.5)
    return seconds(seen, on), tau * math.log(volts / (volts - threshold))


@pytest.mark.parametrize("time", ["2 s", "60 s"])
@pytest.mark.parametrize("supply", [("11 V", "12 V", "14 V"), ("5 V", "6 V", "7 V")])
def test_the_delay_is_near_what_was_asked_for(time: str, supply: tuple[str, str, str]) -> None:
    simulated, closed = timed(time, supply=supply)
    wanted = float(time.split()[0])
    assert closed == pytest.approx(wanted, rel=0.02)  # R of E96 makes up for C of E6
    # V_EB is taken as 0.5 V and leakage is left out when sizing.
    assert simulated == pytest.approx(wanted, rel=0.1)


@pytest.mark.parametrize("supply", [("11 V", "12 V", "14 V"), ("22 V", "27 V", "29 V")])
def test_a_delay_that_an_edge_starts_does_not_trip_the_latch_behind_it(supply: tuple[str, str, str]) -> None:
    # From the project's own vault alarm, which fired as the door opened: hot, low V_BE, the contact closes in no time.
    row = (CALL, choice("long_timer", "timer", time="20 s"), choice("complementary_latch", "latch"), PIEZO)
    design = made(*row, supply=supply)
    low = {(p.ref, "v_be"): 0.58 for p in design.stage("timer").parts if p.kind in ("npn", "pnp")}
    on = load_goes(True, supply=float(supply[1].split()[0]))
    seen = run(design, on, changes={**low, AMBIENT: 45.0})
    assert seconds(seen, on) - begins(design) == pytest.approx(20.0, rel=0.15)


def test_the_threshold_sets_resistor_and_capacitor_but_not_the_time() -> None:
    low, high = timed("20 s", "0.2")[0], timed("20 s", "0.5")[0]
    assert low == pytest.approx(20.0, rel=0.1)
    assert high == pytest.approx(20.0, rel=0.1)


def test_an_interval_begins_with_its_signal_and_ends_by_itself() -> None:
    design = made(CALL, choice("long_timer", "timer", mode="interval", time="10 s"), PIEZO)
    seen = run(design, on := load_goes(True), off := load_goes(False, Anchor(begins(design) + 0.1)))
    assert seconds(seen, on) == pytest.approx(begins(design), abs=1e-2)
    assert seconds(seen, off) - seconds(seen, on) == pytest.approx(10.0, rel=0.1)


def test_the_emitter_diode_keeps_the_reverse_from_the_threshold_transistor() -> None:
    # 0.3 x 14 V is more than 3.5 V: without the diode the base would stand 3.6 V above the empty capacitor.
    design = made(choice("long_timer", "timer", time="2 s"), PIEZO)
    lowest = minimum(voltage("timer/watched", "timer/ref"))
    seen = run(design, lowest)
    assert seen.value(lowest)[0] > -1.0
    assert (
        "emitter_diode"
        not in made(choice("long_timer", "timer"), PIEZO, supply=("5 V", "6 V", "7 V")).stage("timer").roles
    )


def test_leakage_beyond_what_the_resistor_gives_keeps_it_from_ever_arriving() -> None:
    # A 0.01 C V capacitor leaks C/100 s per volt: with R C = 450 s it rests at V/(1 + 4.5), below 0.3 V + 1 V.
    row = choice("long_timer", "timer", time="240 s", capacitor="electrolytic")
    design = made(row, PIEZO)
    seen = run(design, on := load_goes(True), changes={("conditions", "leakage"): 1.0})
    assert np.isnan(seconds(seen, on))
    tau = value(design, "timer", "timing_resistor") * value(design, "timer", "timing_capacitor", "F")
    assert 12.0 / (1.0 + 0.01 * tau) < 0.3 * 12.0 + 1.0


def test_an_interval_without_a_start_and_a_reset_without_a_latch_are_refused() -> None:
    with pytest.raises(DesignError, match="stage timer, setting mode: an interval needs something that starts it"):
        made(choice("long_timer", "timer", mode="interval"), PIEZO)
    with pytest.raises(DesignError, match="stage timer, setting mode: there is no latch before it to reset"):
        made(CALL, choice("long_timer", "timer", mode="reset"), PIEZO)
    with pytest.raises(
        DesignError, match="stage timer, setting mode: 'later' is none of them; write delay or interval"
    ):
        made(choice("long_timer", "timer", mode="later"), PIEZO)
