"""Which figures a bench shows while a study runs: contract of this project (interface.md), no outside source."""

from __future__ import annotations

from dataclasses import replace

from stagebook.engine.results import Depth
from stagebook.tui.bench_text import standing_words, worse_words
from stagebook.tui.figures import Figures
from stagebook.tui.margin_text import corner_words

from .sheets import check, nominal, sheet

BEFORE = sheet(check("duration:timer:LS1", 0.4), check("arrival:timer:C4", 0.3))
AFTER = sheet(check("duration:timer:LS1", 0.5), check("arrival:timer:C4", -1.0, outcome="never timed out"))


def known() -> Figures:
    return Figures(nominal=BEFORE, worst=BEFORE, before=BEFORE, nominal_old=False, worst_old=False)


def test_an_edit_makes_figures_old_and_blanks_none() -> None:
    rows = known().edited().rows("timer")
    assert [row.check.margin for row in rows] == [0.3, 0.4]
    assert all(row.worst_old and row.nominal_old for row in rows)


def test_a_nominal_figure_never_stands_where_a_worst_one_is_read() -> None:
    figures = known().edited().arrived(nominal(AFTER))
    row = next(row for row in figures.rows() if row.check.id == "duration:timer:LS1")
    assert (row.nominal, row.nominal_old) == (0.6, False)
    assert (row.check.margin, row.worst_old) == (0.4, True)
    first = Figures().arrived(nominal(AFTER))
    assert all(not row.worst_known for row in first.rows())


def test_what_got_worse_comes_first() -> None:
    figures = known().edited().arrived(AFTER)
    first, second = figures.rows("timer")
    assert first.check.id == "arrival:timer:C4"
    assert first.against.worse
    assert first.against.change == -1.3
    assert not second.against.worse


def test_frozen_figures_arrive_when_they_are_thawed() -> None:
    frozen = known().freeze().edited().arrived(nominal(AFTER)).arrived(AFTER)
    assert [row.check.margin for row in frozen.rows()] == [0.3, 0.4]
    assert frozen.newest is AFTER
    thawed = frozen.thaw()
    assert thawed.worst is AFTER
    assert not thawed.worst_old


def test_figures_held_back_are_dropped_by_a_newer_edit() -> None:
    assert known().freeze().edited().arrived(AFTER).edited().newest is None


def test_a_corner_that_does_not_fit_begins_with_conditions_and_counts_the_rest() -> None:
    each = replace(check("duration:timer:LS1", 0.4), corner="cold, low supply, R1 high, weak h_FE, LS1 current low")
    assert corner_words(each, 99) == "cold, low supply, weak h_FE, LS1 current low, R1 high"
    assert corner_words(each, 30) == "cold, low supply, weak h_FE +2"
    assert corner_words(each, 10) == "cold +4"
    assert corner_words(each, 3) == "co."


def standing(*margins: float | None, same: bool = False) -> str:
    of = sheet(*(check(f"hold:timer:R{at}", margin) for at, margin in enumerate(margins)))
    return worse_words(Figures(nominal=of, worst=of, before=of, nominal_old=False, worst_old=False), "r6", same)[0]


def test_nothing_worse_is_not_said_without_how_the_design_stands() -> None:
    assert standing(0.4, 0.2) == "nothing is worse than in r6; every margin holds"
    assert standing(0.4, 0.03, same=True) == "the same as r6; 1 thin: hold R1 +3"
    assert standing(0.03, -0.2, None, same=True) == "the same as r6; 1 FAIL, 1 thin, 1 unknown: hold R2 ?"


def test_a_check_that_a_part_took_along_is_not_shown_any_more() -> None:
    shorter = sheet(check("duration:timer:LS1", 0.5), depth=Depth.CORNERS)
    assert [row.check.id for row in known().edited().arrived(shorter).rows()] == ["duration:timer:LS1"]


def test_what_explains_an_outcome_stands_above_it() -> None:
    # A load that gets 4 % too little never counts as on: seven margins say so, and none of them can be mended.
    silent = [
        replace(check(f"{slug}:driver:Q8", -1.0), outcome="LS1 never came on", required=0.5)
        for slug in ("base_overdrive", "peak_current")
    ]
    other = replace(check("latch_hold:latch:Q4", -0.9), required=0.5)
    of = sheet(check("load_voltage:driver:LS1", -0.04), *silent, other, check("sound_level:driver:LS1", 0.1))
    rows = Figures().arrived(of).rows()
    assert [row.check.id.split(":")[0] for row in rows] == [
        "load_voltage",
        "base_overdrive",
        "peak_current",
        "latch_hold",
        "sound_level",
    ]
    assert standing_words(of.checks)[0] == "4 FAIL: load_voltage LS1 -4"
    # A figure about another part explains nothing here, nor does what holds.
    held = sheet(check("load_voltage:driver:LS1", 0.04), *silent, check("load_voltage:driver:LS12", -0.04))
    assert [row.check.id.split(":")[0] for row in Figures().arrived(held).rows()][:2] == [
        "base_overdrive",
        "peak_current",
    ]
