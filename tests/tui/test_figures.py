"""Which figures a bench shows while a study runs: contract of this project (interface.md), no outside source."""

from __future__ import annotations

from stagebook.engine.results import Depth
from stagebook.tui.figures import Figures

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


def test_a_check_that_a_part_took_along_is_not_shown_any_more() -> None:
    shorter = sheet(check("duration:timer:LS1", 0.5), depth=Depth.CORNERS)
    assert [row.check.id for row in known().edited().arrived(shorter).rows()] == ["duration:timer:LS1"]
