"""Relay, field-effect drivers, lamp and LC filter: sizing (common practice, from memory), and that they do it.

Coil current and pick-up follow copper, R20 (234.5 + T)/254.5 (common form); LC steps follow the resonant circuit.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.primitives.signals import maximum, voltage

from ..circuits import Setup
from .made import PIEZO, at, begins, choice, made, passing, run, seconds, value

CALL = choice("contact_no", "call", held="2 s")
SOUNDER = choice("sounder", current="150 mA")


def test_the_relay_driver_is_sized_by_the_cold_coil_at_the_highest_supply() -> None:
    # 14 V / (400R x 0.9 x 234.5/254.5) = 42.2 mA; h_FE,min 200 x 0.875 at 0 C = 175: I_B = 3 x 42.2/175 = 0.72 mA;
    # R_BE = 0.65/0.072 mA = 9k0; R_B = (11 - 0.65)/(0.72 + 0.07) mA = 13.0k, next lower: 13k.
    design = made(CALL, choice("relay_driver", "relay"), SOUNDER)
    assert value(design, "relay", "base_resistor") == 13e3
    coil = design.part(design.stage("relay").roles["load"])
    contact = design.part(design.stage("relay").roles["relay_contact"])
    assert (contact.operated_by, contact.form) == (coil.ref, "make")
    assert design.part("LS1").pins == {"plus": "relay.out", "minus": "0V"}


@pytest.mark.parametrize(("mode", "at_rest", "alarmed"), [("pulls in", 0.0, 12.0), ("fail-safe", 0.0, 12.0)])
def test_the_load_is_on_while_there_is_an_alarm(mode: str, at_rest: float, alarmed: float) -> None:
    design = made(CALL, choice("relay_driver", "relay", mode=mode), SOUNDER)
    on, off = at("relay.out", begins(design) + 1.0), at("relay.out", 0.9)
    low, idle = at("relay/low", begins(design) + 1.0), at("relay/low", 0.9)
    seen = run(design, on, off, low, idle)
    assert seen.value(off)[0] == pytest.approx(at_rest, abs=0.1)
    assert seen.value(on)[0] == pytest.approx(alarmed, abs=0.3)
    # The coil is without current in the alarm where it is fail-safe, and only then.
    pulled, let_go = (idle, low) if mode == "fail-safe" else (low, idle)
    assert seen.value(pulled)[0] < 0.4
    assert seen.value(let_go)[0] == pytest.approx(12.0, abs=0.3)


def test_moments_of_a_relay_are_told_by_the_load_behind_it() -> None:
    design = made(CALL, choice("relay_driver", "relay", mode="fail-safe"), SOUNDER)
    assert design.sequences["alarm"].moments["sounding"].after == "LS1 on"  # type: ignore[union-attr]


def test_a_quick_release_has_a_zener_and_may_be_asked_for() -> None:
    design = made(CALL, choice("relay_driver", "relay", clamp="zener", release="20 ms"))
    assert design.part(design.stage("relay").roles["flyback_zener"]).value == "12 V"
    # A 24 V coil at 29 V: (0.8 x 45 V - 29 V - 1 V)/1.1 = 5.45 V, next lower of E24: 5.1 V.
    row = (CALL, choice("relay_driver", "relay", clamp="zener", rated="24 V", coil="1440R"))
    high = made(*row, supply=("27 V", "28 V", "29 V"))
    assert high.part(high.stage("relay").roles["flyback_zener"]).value == "5.1 V"
    with pytest.raises(DesignError, match="33 V leave no room for a zener"):
        made(*row, supply=("27 V", "28 V", "33 V"))
    (asked,) = [each for each in design.requirements if each.check == "release"]
    assert (asked.of, asked.max) == (design.stage("relay").roles["load"], "20 ms")


def test_a_gate_is_divided_to_what_it_bears_and_needs_enough() -> None:
    # At 14 V of 0.8 x 20 V = 16 V no divider is needed: 1k. At 28 V: 1.1 x 100k (28/16 - 1) = 82.5k, next higher: 91k.
    assert value(made(CALL, choice("mosfet_driver", "driver")), "driver", "gate_resistor") == 1e3
    high = made(CALL, choice("mosfet_driver", "driver"), supply=("21 V", "24 V", "28 V"))
    assert value(high, "driver", "gate_resistor") == 91e3
    # 4 V x 100k/101k is below 2.5 V + 2 V.
    with pytest.raises(DesignError, match=r"a gate of 4 V does not turn it fully on, it takes 4\.5 V"):
        made(CALL, choice("mosfet_driver", "driver"), supply=("4 V", "5 V", "6 V"))
    with pytest.raises(DesignError, match=r"inrush of 1\.4 A is more than the 0\.24 A it bears"):
        made(CALL, choice("mosfet_driver", "driver", current="0.6 A"))


@pytest.mark.parametrize(
    ("kind", "pin", "current", "drop"),
    [("mosfet_driver", "driver.low", "100 mA", 0.3), ("p_channel_driver", "driver.high", "600 mA", 0.2)],
)
def test_the_load_gets_the_rail_less_the_channel(kind: str, pin: str, current: str, drop: float) -> None:
    # 2 ohm x 0.1 A (less at 12 V than at the 10 V of the figure), 0.1 ohm x 0.6 A.
    design = made(CALL, choice(kind, "driver", current=current))
    on, off, feed = at(pin, begins(design) + 1.0), at(pin, 0.9), at("supply", begins(design) + 1.0)
    seen = run(design, on, off, feed)
    active, rail = seen.value(on)[0], seen.value(feed)[0]
    across = rail - active if pin == "driver.low" else active
    assert rail - drop < across < rail
    assert seen.value(off)[0] == pytest.approx(12.0 if pin == "driver.low" else 0.0, abs=0.05)


def test_a_driver_is_made_for_the_inrush_of_the_lamp_behind_it() -> None:
    # 2 W / 12 V x 1.1 = 183 mA; cold 14 times: 2.57 A, at 14 V 2.99 A; with 20 % to spare 3.74 A. Darlington h_FE,min
    # 750 x 0.875 at 0 C: I_B = 5.7 mA, R_BE = 1.3 V/0.57 mA = 2k28, R_B = 9.7 V / 6.3 mA = 1k54, next lower 1k5.
    design = made(CALL, choice("darlington_driver", "driver", load="none"), choice("lamp", power="2 W"))
    assert value(design, "driver", "base_resistor") == 1.5e3
    lamp = design.part(design.stage("lamp").roles["load"])
    assert lamp.limits("current", "A").typical == pytest.approx(2.0 / 12.0, rel=0.01)  # type: ignore[union-attr]
    assert lamp.pins == {"a": "supply", "b": "driver.low"}
    with pytest.raises(DesignError, match=r"an inrush of 2\.99 A is more than the 400 mA that"):
        made(CALL, choice("low_side_driver", "driver", load="none"), choice("lamp", power="2 W"))


def snapped_on(**settings: str) -> Design:
    """An LC filter alone before a piezo driver, its supply snapped on within 1 us."""
    design = made(choice("lc_filter", **settings), CALL, PIEZO).dump()
    design["sequences"]["alarm"]["events"][0]["rise"] = "1 us"
    return Design.load(design)


def test_the_lc_filter_is_damped_and_sized_by_ripple() -> None:
    # R = 0.5 V / 50 mA - 1R5 = 8R5, next lower of E24: 8R2. C: 4 x 1 mH/9.7^2 = 43 uF.
    # Ripple: tan d 0.15 at 100 Hz is 1.5 at 1 kHz, 10 sqrt(1 + 1.5^2)/((2 pi 1 kHz)^2 1 mH) = 457 uF, largest: 470 uF.
    design = made(choice("lc_filter"), CALL, PIEZO)
    assert value(design, "filter", "filter_resistor") == 8.2
    assert value(design, "filter", "filter_capacitor", "F") == pytest.approx(470e-6)
    # Slew of 5 V/ms: 2200 uF have 0.11 ohm, 0.11 x 14 V/1 mH + 14 V/(e sqrt(1 mH 2200 uF)) = 1.5 + 3.5 V/ms.
    slow = made(choice("lc_filter", slew="5 V/ms"), CALL, PIEZO)
    assert value(slow, "filter", "filter_capacitor", "F") == pytest.approx(2200e-6)


def test_the_lc_filter_neither_overshoots_nor_rises_faster_than_asked_for() -> None:
    design = snapped_on(slew="50 V/ms", weaker="1.1")
    most = maximum(voltage("filter.quiet"))
    volts = [1.0 + 0.5 * n for n in range(20)]
    passed = [passing("filter.quiet", each, rising=True) for each in volts]
    seen = Setup(design).run(most, *passed)
    assert seen.value(most)[0] < 12.0 * 1.01
    # 0.15/(2 pi 100 Hz C) in series: a bound, because resistance slows it from the beginning.
    steepest = 0.5 / min(np.diff([seconds(seen, row) for row in passed]))
    farads = value(design, "filter", "filter_capacitor", "F")
    bound = 12.0 * (0.15 / (200.0 * math.pi * farads) / 1e-3 + 1.0 / (math.e * math.sqrt(1e-3 * farads)))
    assert 0.4 * bound < steepest < bound < 50e3


def test_a_choke_that_loses_too_much_is_refused() -> None:
    with pytest.raises(DesignError, match=r"setting drop: the winding alone, 1\.8 ohm, loses more"):
        made(choice("lc_filter", small_current="0.4 A", drop="0.5 V"), CALL, PIEZO)
    with pytest.raises(DesignError, match=r"setting small_current: it is more than the 0\.5 A of the choke"):
        made(choice("lc_filter", small_current="0.6 A"), CALL, PIEZO)
