"""Drivers and loads: base resistors by overdrive, and that the load gets its voltage (common practice, no source)."""

from __future__ import annotations

import pytest

from stagebook.engine.errors import DesignError
from stagebook.engine.results import Verdict
from stagebook.engine.stages.making import doubts, with_catalogue_stage
from stagebook.engine.studies.margins import study

from .made import at, begins, choice, conditions, made, run, value

CALL = choice("contact_no", "call", held="2 s")


def test_the_base_resistor_gives_three_times_the_least_base_current() -> None:
    # Small npn at 30 mA: h_FE,min 200 x 0.875 at 0 C = 175; I_B = 3 x 30 mA/175 = 0.51 mA; R_BE = 0.65/0.051 mA = 12k6.
    # R_B = (11 - 0.65) V / (0.51 + 0.05) mA = 18.3k, next lower of E24: 18k.
    design = made(CALL, choice("low_side_driver", "driver", load="piezo", current="30 mA"))
    assert value(design, "driver", "base_resistor") == 18e3
    assert value(design, "driver", "base_emitter_resistor") == pytest.approx(12.6e3, rel=0.05)


def test_the_resistance_of_the_stage_before_counts() -> None:
    # As above, 0.565 mA, but through the pull-up of a normally closed contact, which may lose a tenth of 11 V to that:
    # at most 1.95k, so 1k8; 18.3k - 1.8k = 16.5k, next lower: 16k.
    driver = choice("low_side_driver", "driver", load="piezo", current="30 mA")
    assert value(made(choice("contact_nc", "call"), driver), "driver", "base_resistor") == 16e3


@pytest.mark.parametrize(
    ("kind", "current", "pin", "drop"),
    [
        ("low_side_driver", "150 mA", "driver.low", 0.4),
        ("darlington_driver", "1 A", "driver.low", 1.3),
        ("high_side_driver", "300 mA", "driver.high", 0.6),
        ("high_side_driver", "1 A", "driver.high", 0.8),
    ],
)
def test_the_load_gets_the_rail_less_the_driver(kind: str, current: str, pin: str, drop: float) -> None:
    design = made(CALL, choice(kind, "driver", current=current))
    on, off = at(pin, begins(design) + 1.0), at(pin, 0.9)
    feed = at("supply", begins(design) + 1.0)
    seen = run(design, on, off, feed)
    rail, rests = (float(seen.value(row)[0]) for row in (feed, off))
    active = float(seen.value(on)[0])
    across = rail - active if pin == "driver.low" else active
    assert rail - drop < across < rail
    assert rests == pytest.approx(12.0 if pin == "driver.low" else 0.0, abs=0.05)


def test_a_driver_takes_the_load_of_the_stage_behind_it() -> None:
    design = made(CALL, choice("low_side_driver", "driver", load="none"), choice("piezo", current="12 mA"))
    assert design.part("LS1").pins == {"plus": "supply", "minus": "driver.low"}
    # Sized for 12 mA, not for the 150 mA that it would take alone: 10.35 V / 0.226 mA = 45.7k.
    assert value(design, "driver", "base_resistor") == 43e3


def test_a_load_on_the_high_side_lies_to_0v() -> None:
    design = made(CALL, choice("high_side_driver", "driver", load="none"), choice("sounder"))
    assert design.part("LS1").pins == {"plus": "driver.high", "minus": "0V"}


def test_a_base_that_would_starve_is_refused() -> None:
    with pytest.raises(
        DesignError, match=r"stage driver, setting current: its base current of .* take a Darlington driver"
    ):
        made(choice("light_front_end"), choice("low_side_driver", "driver", current="150 mA"))
    with pytest.raises(DesignError, match=r"setting current: an inrush of 1\.4 A is more than the 400 mA that"):
        made(CALL, choice("low_side_driver", "driver", current="600 mA"))


@pytest.mark.parametrize("check", ["load_voltage", "junction_temperature"])
def test_what_a_darlington_drops_is_counted_by_hand(check: str) -> None:
    # V_CE(sat) of the first transistor and V_BE of the second, 1.1 V in the cold: 0.3 V alone was 5 % of 11 V off.
    design = made(CALL, choice("darlington_driver", "driver", current="0.8 A"))
    (found,) = (c for c in study(design).checks if c.id.startswith(f"{check}:driver:"))
    assert (found.apart, found.disagrees) == (None, False)
    assert found.hand is not None


def test_a_sounder_that_is_too_far_away_is_told() -> None:
    # 95 dB + 20 log10((11 V - 0.3 V - 2R x 150 mA)/12 V) - 20 log10 5 = 79.8 dB (free-field law); 88 dB and a little
    # for what is left out: 104 dB.
    driver = choice("low_side_driver", "driver", heard="85 dB", distance="5 m")
    (words,) = doubts(conditions(), (CALL, driver))["driver"]
    assert words.startswith("sound_level: at the lowest supply 79.8 dB arrive at 5 m")
    assert "write sound_level 104 dB" in words
    louder = choice("low_side_driver", "driver", heard="85 dB", distance="5 m", sound_level="104 dB")
    assert doubts(conditions(), (CALL, louder)) == {}


@pytest.mark.parametrize("kind", ["low_side_driver", "darlington_driver", "high_side_driver", "p_channel_driver"])
def test_a_driver_with_its_own_load_is_sized_for_the_loads_behind_it_too(kind: str) -> None:
    driver = choice(kind, "driver", current="60 mA")
    row = (CALL, choice("complementary_latch"), driver, choice("sounder", "siren", current="80 mA"))
    assert doubts(conditions(), row) == {}
    design = made(*row)
    bad = [
        c.id
        for c in study(design).checks
        if c.part in design.stage("driver").roles.values() and c.verdict is not Verdict.PASS
    ]
    assert bad == []
    if kind != "p_channel_driver":
        # One driver for both and one for a load of their sum have the same base resistor.
        one = made(*row[:2], choice(kind, "driver", current="140 mA"))
        assert value(design, "driver", "base_resistor") == value(one, "driver", "base_resistor")


def test_an_inrush_of_all_loads_together_is_refused() -> None:
    with pytest.raises(
        DesignError, match=r"an inrush of 700 mA is more than the 400 mA.*; write load none, it switches"
    ):
        made(CALL, choice("low_side_driver", "driver"), choice("sounder", "siren"))
    # What it tells to write is enough; a single load has no other load to leave out.
    assert doubts(conditions(), (CALL, choice("low_side_driver", "driver", load="none"), choice("sounder"))) == {}
    with pytest.raises(DesignError, match=r"used for; take a Darlington driver"):
        made(CALL, choice("low_side_driver", "driver", current="300 mA"))


def test_two_loads_on_one_driver_fail_where_one_passes() -> None:
    # 150 mA at 12 V each with twice that as surge (from memory), at up to 13 V: 2 x 325 mA of the 500 mA of the class.
    alone = made(CALL, choice("low_side_driver", "driver"))
    both, one = (
        next(c for c in study(design).checks if c.id.startswith("peak_current:driver"))
        for design in (with_catalogue_stage(alone, choice("sounder", "siren")), alone)
    )
    assert one.demand is not None
    assert both.demand == pytest.approx(2.0 * one.demand, rel=0.02)
    assert (one.verdict is Verdict.FAIL, both.verdict is Verdict.FAIL) == (False, True)


def test_a_lamp_needs_a_share_of_its_rated_voltage_and_says_so() -> None:
    # A user's lamp for 6 V passed at 3.6 V. 0.6 of the rated voltage leaves 0.6^3.4 = 0.18 of its light (common
    # practice, no source).
    row = (CALL, choice("darlington_driver", "driver", load="none"), choice("lamp"))
    low = made(*row, supply=("4.5 V", "6 V", "7 V"))
    part = low.part(low.stage("lamp").roles["load"])
    limits = part.limits("operating_minimum", "V")
    assert limits is not None
    assert limits.typical == pytest.approx(3.6)
    assert study(low, only=f"load_voltage:lamp:{part.ref}").checks[0].verdict is not Verdict.PASS
    (said,) = doubts(conditions("4.5 V", "6 V", "7 V"), row)["lamp"]
    assert said.startswith("load_voltage: of 4.5 V 3.4 V are left for the load, which needs 4 V")
    told = said.split("write works_from ")[1].split(" or")[0]
    assert doubts(conditions("4.5 V", "6 V", "7 V"), (*row[:2], choice("lamp", works_from=told))) == {}
