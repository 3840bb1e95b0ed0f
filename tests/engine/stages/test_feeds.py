"""Supply entry, RC filter and battery backup: sizing by the trade's formulas, and what the made rail does.

Sizing formulas are common practice, no source; what a rail does follows from the RC step response.
"""

from __future__ import annotations

import math

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.errors import DesignError
from stagebook.engine.primitives.signals import maximum, slew, voltage
from stagebook.engine.stages.making import doubts

from ..circuits import Setup
from .made import PIEZO, at, begins, choice, conditions, made, passing, run, seconds, value

CALL = choice("contact_no", "call")


def test_the_entry_is_sized_by_drop_and_slew() -> None:
    # R = 0.3 V / 3 mA = 100R; C = 14 V / (100R x 5 V/ms) = 28 uF, next higher of E6: 33 uF.
    design = made(choice("entry", drop="0.3 V", small_current="3 mA", slew="5 V/ms"), CALL, PIEZO)
    assert value(design, "entry", "filter_resistor") == 100.0
    assert value(design, "entry", "filter_capacitor", "F") == pytest.approx(33e-6)


def test_the_filtered_rail_rises_no_faster_than_asked_for() -> None:
    design = made(choice("entry", slew="5 V/ms", small_current="3 mA"), CALL, PIEZO).dump()
    design["sequences"]["alarm"]["events"][0]["rise"] = "1 us"
    setup = Setup(Design.load(design))
    begin, end = (passing("entry.quiet", volts, rising=True) for volts in (2.0, 3.0))
    steepest = slew(voltage("entry.rail"))
    seen = setup.run(begin, end, steepest)
    # (V - v)/(R C) with what the diode leaves of 12 V: (11.4 - 2.5) V / (107R x 33 uF) = 2.5 V/ms. The first 0.8 V come
    # at once, across the capacitor's series resistance of 7.2 ohm.
    found = 1.0 / (seconds(seen, end) - seconds(seen, begin))
    assert found == pytest.approx(2.5e3, rel=0.1)
    assert found < 5e3 < seen.value(steepest)[0]


def test_loads_hang_on_the_rail_behind_the_diode_and_small_stages_on_the_filtered_one() -> None:
    design = made(choice("entry"), CALL, PIEZO)
    assert design.part("LS1").pins["plus"] == "entry.rail"
    assert design.part("S1").pins["a"] == "entry.quiet"


def test_the_entry_may_do_without_a_diode() -> None:
    design = made(choice("entry", diode="none", fuse="none"), CALL, PIEZO)
    assert design.part("LS1").pins["plus"] == "supply"
    assert "reverse_diode" not in design.stage("entry").roles


def test_the_entry_is_sized_by_what_the_row_draws() -> None:
    # The piezo element takes 12 mA x 14/12 = 14 mA, small stages 2 mA and the driver's base current: a fuse of 0.1 A.
    design = made(choice("entry"), CALL, PIEZO)
    assert design.part(design.stage("entry").roles["fuse"]).limits("rated_current", "A").typical == 0.1  # type: ignore[union-attr]
    # 0.7 A x 14/12 + 6 mA over 0.75 (1 - 0.003 x 20) = 1.17 A, next of R10: 1.25 A.
    loud = choice("darlington_driver", "driver", current="0.7 A")
    design = made(choice("entry"), CALL, loud)
    assert design.part(design.stage("entry").roles["fuse"]).limits("rated_current", "A").typical == 1.25  # type: ignore[union-attr]
    # Its base current comes through the filter: 2 mA + 3 x 0.7 A/(750 x cold) = 4.8 mA and 10 %: 0.3 V/5.1 mA = 59R.
    assert 47.0 <= value(design, "entry", "filter_resistor") <= 62.0


def test_what_follows_gets_less_by_the_drop_of_the_diode() -> None:
    # 1 A rectifier: 0.65 V at 10 mA, at most 1.1 V at 1 A (class); log-interpolated at 0.7 A x 14/12 = 0.82 A: 1.08 V,
    # and 50 mV more at 0 C; 2 ohm of source and 80 mohm of fuse take 1.7 V: of 11 V 8.2 V are left, and 1.1 V in the
    # driver.
    loud = choice("darlington_driver", "driver", current="0.7 A", works_from="7 V")
    words = doubts(conditions(), (choice("entry"), CALL, loud))["driver"]
    assert any(each.startswith("load_voltage: of 11 V 7.06 V are left") for each in words), words
    assert "driver" not in doubts(conditions(), (choice("entry"), CALL, choice("low_side_driver", "driver")))


def test_the_fuse_carries_the_loads_when_hot() -> None:
    # (0.3 A + 3 mA) / (0.75 (1 - 0.003/K x 20 K)) = 0.43 A, next of R10: 0.5 A (IEC 60127, from memory).
    design = made(choice("entry", load_current="0.3 A"), CALL, PIEZO)
    fuse = design.part(design.stage("entry").roles["fuse"])
    assert fuse.kind == "fuse"
    assert fuse.limits("rated_current", "A").typical == 0.5  # type: ignore[union-attr]
    assert fuse.pins["a"] == "supply"
    assert "fuse" not in made(choice("entry", fuse="none"), CALL, PIEZO).stage("entry").roles


def test_a_clamp_holds_a_surge() -> None:
    design = made(choice("entry", surge="40 V"), CALL, PIEZO).dump()
    design["sequences"]["alarm"], design["requirements"] = design["sequences"]["surge"], []
    behind, before = maximum(voltage("entry.rail")), maximum(voltage("supply"))
    seen = Setup(Design.load(design)).run(behind, before)
    # A clamp of 15 V stand-off clamps at 1.6 times, 24 V, at its pulse current (class, from memory).
    assert seen.value(behind)[0] < 24.0 < seen.value(before)[0]
    with pytest.raises(DesignError, match="setting surge: no clamp stands off 28 V"):
        made(choice("entry", surge="40 V"), CALL, PIEZO, supply=("20 V", "24 V", "28 V"))


def test_a_reversed_supply_stays_away_from_what_follows() -> None:
    design = made(choice("entry"), CALL, PIEZO).dump()
    design["sequences"]["alarm"]["events"] = [{"at": "0 s", "event": "reverse supply"}]
    highest = maximum(voltage("entry.rail").scaled(-1.0))
    seen = Setup(Design.load(design)).run(highest)
    assert seen.value(highest)[0] < 0.5


def test_the_filter_bridges_a_dip_behind_a_diode() -> None:
    # C = I t / dV = 3 mA x 40 ms / (0.2 x 11 V) = 54.5 uF, next higher of E6: 68 uF.
    design = made(choice("rc_filter", bridge="40 ms", sag="0.2", slew="100 V/ms"), CALL, PIEZO)
    assert value(design, "filter", "filter_capacitor", "F") == pytest.approx(68e-6)


BACKUP = choice("battery_backup", "backup", trickle="5 mA")
SUPPLY = ("15 V", "15.5 V", "16 V")


def test_the_trickle_resistor_leaves_the_trickle_at_full_charge() -> None:
    # (15.5 V - 0.65 V - 13.6 V) / 5 mA = 250R, next higher of E24: 270R (float 2.27 V a cell: from memory).
    assert value(made(BACKUP, CALL, PIEZO, supply=SUPPLY), "backup", "charge_resistor") == 270.0


def test_the_battery_takes_over_when_the_supply_is_lost() -> None:
    design = made(BACKUP, CALL, PIEZO, supply=SUPPLY).dump()
    design["sequences"]["alarm"] = design["sequences"]["supply_lost"]
    design["requirements"] = []
    before, after = at("backup.rail", 1.9), at("backup.rail", 3.5)
    seen = Setup(Design.load(design)).run(before, after)
    assert seen.value(before)[0] == pytest.approx(15.5 - 0.6, abs=0.4)
    # A full lead-acid battery of 12.8 V (class, from memory) less a Schottky diode.
    assert seen.value(after)[0] == pytest.approx(12.8 - 0.2, abs=0.25)


def test_a_supply_that_cannot_charge_is_refused() -> None:
    with pytest.raises(DesignError, match=r"stage backup, setting battery: 12 V cannot charge it to 13\.6 V"):
        made(BACKUP, CALL, PIEZO)


def test_settling_takes_five_time_constants() -> None:
    # 99 % after 5 tau of an RC: common practice. The alarm waits for it.
    design = made(choice("entry", drop="3 V", slew="0.05 V/ms"), CALL, PIEZO)
    tau = value(design, "entry", "filter_resistor") * value(design, "entry", "filter_capacitor", "F")
    assert begins(design) >= 5.0 * tau
    seen = run(design, late := at("entry.quiet", 5.0 * tau), end := at("entry.quiet", 0.999 * begins(design)))
    assert seen.value(late)[0] / seen.value(end)[0] == pytest.approx(-math.expm1(-5.0), abs=0.02)


def test_two_batteries_in_series_are_one_part_of_twice_the_figures() -> None:
    # A net between two batteries has neither conductance nor capacitance, which the solver wants of every net.
    design = made(choice("battery_backup", battery="lead-acid 24 V"), CALL, PIEZO, supply=("29 V", "30 V", "31 V"))
    part = design.part("BT1")
    assert part.entry("voltage")[0] == ("0 %", "23.2 V")  # type: ignore[index]
    assert part.limits("resistance", "ohm").typical == pytest.approx(0.06)  # type: ignore[union-attr]
    seen = run(design, rail := at("backup.rail", 0.9))
    # The higher of supply and battery: 30 V less the rectifier at next to nothing.
    assert seen.value(rail)[0] == pytest.approx(29.5, abs=0.3)


def test_a_stand_by_battery_has_its_fuse_at_its_terminal() -> None:
    # The caution of the program itself: fuse at the battery terminal. 14 mA + 2 mA + base current: 0.1 A.
    design = made(choice("battery_backup"), CALL, PIEZO, supply=("15 V", "15.5 V", "16 V"))
    fuse = design.part(design.stage("backup").roles["fuse"])
    assert fuse.pins["a"] == design.part("BT1").pins["plus"]
    assert [part.ref for part in design.parts if fuse.pins["a"] in part.pins.values()] == [fuse.ref, "BT1"]
    assert fuse.limits("rated_current", "A").typical == 0.1  # type: ignore[union-attr]
