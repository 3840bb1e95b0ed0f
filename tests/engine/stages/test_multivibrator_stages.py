"""Astable, monostable, bistable: closed forms of the textbooks (Millman, Taub 1965, from memory)."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.primitives.signals import Anchor, minimum, voltage
from stagebook.engine.stages.making import doubts

from ..circuits import Setup
from .made import PIEZO, at, begins, choice, conditions, load_goes, made, passing, run, seconds, value


def astable(period: str, supply: tuple[str, str, str]) -> tuple[float, float]:
    """Simulated period over three periods, and R C of one half."""
    design = made(choice("astable", "astable", period=period), PIEZO, supply=supply)
    half = 0.5 * float(supply[1].split()[0])
    first, fourth = (passing("astable.out", half, rising=True, start=Anchor(1.0), nth=n) for n in (1, 4))
    seen = run(design, first, fourth)
    ohms, farads = (
        value(design, "astable", f"timing_{p}_two", u) for p, u in (("resistor", "ohm"), ("capacitor", "F"))
    )
    return (seconds(seen, fourth) - seconds(seen, first)) / 3.0, ohms * farads


@pytest.mark.parametrize("supply", [("11 V", "12 V", "14 V"), ("23 V", "24 V", "26 V")])
def test_the_period_of_the_astable_is_about_1_386_rc(supply: tuple[str, str, str]) -> None:
    period, tau = astable("0.5 s", supply)
    assert period == pytest.approx(0.5, rel=0.06)
    # A base and its diode take some of the swing: 2 ln((2V - 1.02 - 0.15)/(V - 0.81)), 1.427 at 12 V and 1.406 at 24 V.
    volts = float(supply[1].split()[0])
    exact = 2.0 * math.log((2.0 * volts - 1.17) / (volts - 0.81))
    assert exact == pytest.approx(1.386, rel=0.04)
    assert period / tau == pytest.approx(exact, rel=0.04)


def test_the_astable_without_diodes_at_a_low_supply() -> None:
    period, tau = astable("0.5 s", ("3 V", "3.3 V", "3.6 V"))
    assert period == pytest.approx(0.5, rel=0.06)
    # The class has V_BE 0.64 V at 2 mA. On, with 0.33 mA: 0.59 V; switching begins at V_T/R_C, 2.6 uA: 0.47 V.
    on, begins_at = (0.64 + 0.0257 * math.log(current / 2e-3) for current in (0.33e-3, 0.0257 / 10e3))
    assert period / tau == pytest.approx(2.0 * math.log((6.6 - on - 0.1) / (3.3 - begins_at)), rel=0.04)


def test_no_base_of_the_astable_goes_far_into_reverse() -> None:
    design = made(choice("astable", "astable", period="0.5 s"), PIEZO)
    lowest = minimum(voltage(design.part(design.stage("astable").roles["flasher_one"]).pins["base"]))
    assert run(design, lowest).value(lowest)[0] > -1.0


MONO = choice("monostable", "shot", time="1 s")
WET = choice("contact_no", "call", held="0.1 s", bounce="0 s")


def test_the_pulse_of_the_monostable_has_its_length_whatever_the_contact_does() -> None:
    for held in ("0.1 s", "3 s"):
        design = made(choice("contact_no", "call", held=held, bounce="0 s"), MONO, PIEZO)
        seen = run(design, on := load_goes(True), off := load_goes(False))
        assert seconds(seen, on) == pytest.approx(begins(design), abs=1e-3)
        assert seconds(seen, off) - seconds(seen, on) == pytest.approx(1.0, rel=0.06)


def test_the_monostable_is_sized_by_the_logarithm() -> None:
    design = made(WET, MONO, PIEZO)
    tau = value(design, "shot", "timing_resistor") * value(design, "shot", "timing_capacitor", "F")
    # On: V_BE + V_D = 1.02 V; switching begins at 0.81 V (class).
    assert tau * math.log((24.0 - 1.02 - 0.15) / (12.0 - 0.81)) == pytest.approx(1.0, rel=0.02)


def test_the_monostable_waits_for_its_edge() -> None:
    document = made(WET, MONO, PIEZO).dump()
    document["sequences"]["alarm"]["events"] = document["sequences"]["alarm"]["events"][:1]
    seen = Setup(Design.load(document)).run(on := load_goes(True))
    assert np.isnan(seconds(seen, on))


BISTABLE = choice("bistable", "kept", acknowledged="2 s")


def test_the_bistable_comes_up_reset_is_set_and_acknowledged() -> None:
    design = made(WET, BISTABLE, PIEZO)
    rests = at("kept.out", 0.9)
    off = load_goes(False, Anchor(begins(design)))
    seen = run(design, rests, on := load_goes(True), off)
    assert seen.value(rests)[0] == pytest.approx(0.0, abs=0.05)
    assert seconds(seen, on) == pytest.approx(begins(design), abs=0.05)
    assert seconds(seen, off) == pytest.approx(begins(design) + 2.0, abs=0.05)


def test_the_loop_of_the_bistable_saturates_with_the_least_gain() -> None:
    design = made(WET, BISTABLE, PIEZO)
    gain = 200.0 * (1.0 - 0.005 * 25.0)
    for name, other in (("set", "rest"), ("rest", "set")):
        ring = value(design, "kept", f"collector_resistor_{other}") + value(design, "kept", f"base_resistor_{name}")
        base = (11.0 - 0.65) / ring - 0.65 / 100e3
        assert base * gain > 2.5 * 14.0 / value(design, "kept", f"collector_resistor_{name}")


@pytest.mark.parametrize(("period", "cure"), [("1000000 s", "or shorter"), ("1 ns", "or longer")])
def test_a_flasher_whose_capacitors_nobody_sells_is_doubted(period: str, cure: str) -> None:
    # A user's period of 1000000 s got 4.7 F, one of 1 ns 0.0047 pF, and nothing was said. 100 pF to 100 uF of film:
    # common practice, no source.
    (said,) = doubts(conditions(), (choice("astable", period=period), PIEZO))["flasher"]
    assert said.startswith("sizing: timing capacitor is to have ")
    assert f"is period {period} meant? write" in said
    assert cure in said
    # What it tells to write can be bought.
    told = said.split("meant? write ")[1].split(" or")[0]
    other = doubts(conditions(), (choice("astable", period=told), PIEZO)).get("flasher", ())
    assert not any(words.startswith("sizing: timing capacitor") for words in other)
