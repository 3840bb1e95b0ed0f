"""Revisions side by side as lines: order after this project's margins convention ("What a comparison shows")."""

from __future__ import annotations

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.studies.causes import Cause, CausesSheet
from stagebook.engine.studies.comparison import Side, compare
from stagebook.tui import side_by_side
from stagebook.tui.shown import plain

from .conftest import document
from .sheets import check, sheet

DESIGN = Design.load(document())
OLD = {"a:s:R1": 0.5, "b:s:R2": 0.5, "c:s:R3": 0.2, "d:s:R4": 0.3}
NEW = {"a:s:R1": 0.3, "b:s:R2": 0.6, "c:s:R3": 0.05, "e:s:R5": 0.4}
BEFORE = Side("r1", sheet(*(check(name, margin) for name, margin in OLD.items())), DESIGN)
AFTER = Side("r2", sheet(*(check(name, margin) for name, margin in NEW.items())), DESIGN)


def test_rows_keep_the_order_of_the_comparison_and_show_the_difference() -> None:
    rows = side_by_side.compare_rows(compare([BEFORE, AFTER], 1), [BEFORE, AFTER], [0, 1], 20)
    assert [row.key for row in rows[:2]] == ["c:s:R3", "a:s:R1"]
    assert plain(rows[0].spans).split() == ["c", "R3", "(timer)", "=", "+20", "!", "+5", "-15"]


def test_what_did_not_change_is_folded_behind_its_count() -> None:
    old = {"a:s:R1": 0.5, "b:s:R2": 0.3, "c:s:R3": None, "d:s:R4": 0.0996}
    new = {"a:s:R1": 0.3, "b:s:R2": 0.304, "c:s:R3": None, "d:s:R4": 0.1004}
    sides = [
        Side(label, sheet(*(check(name, margin) for name, margin in margins.items())), DESIGN)
        for label, margins in (("r1", old), ("r2", new))
    ]
    compared = compare(sides, 1)
    # R4 stayed within half a percent, but it has become a pass (10 % are required).
    rows = side_by_side.compare_rows(compared, sides, [0, 1], 20, fold=True)
    assert [row.key for row in rows] == ["a:s:R1", "d:s:R4", side_by_side.FOLDED]
    assert plain(rows[-1].spans) == "2 margins did not change: m shows them"
    assert len(side_by_side.compare_rows(compared, sides, [0, 1], 20)) == 4


def test_a_check_on_one_side_only_is_said_so() -> None:
    first, second = side_by_side.side_lines(compare([BEFORE, AFTER], 1), 1, "e:s:R5", 80)
    assert "does not have this check" in plain(first)
    assert "+40 pass" in plain(second)


def causes(**more: object) -> CausesSheet:
    known = {"shares": {"C4": -0.05, "R8": -0.32}, "interaction": -0.02, "error": None, "formula": None, **more}
    cause = Cause("a:s:R1", 0.4, 0.03, alone={}, reverted={}, **known)  # type: ignore[arg-type]
    return CausesSheet("flood", ("C4", "R8"), (cause,), ("new:s:R9",), (), ("dark:s:R3",))


def test_causes_are_listed_from_the_largest_with_what_they_do_together() -> None:
    assert plain(side_by_side.causes_line(causes(), "a:s:R1")) == " causes: R8 -32   C4 -5   (together -2)"


def test_sampled_causes_carry_their_error_and_newer_formulas_stand_apart() -> None:
    said = plain(side_by_side.causes_line(causes(error={"C4": 0.01, "R8": 0.02}, formula=0.03), "a:s:R1"))
    assert said == " causes: R8 -32 (+/-2)   C4 -5 (+/-1)   newer formulas +3   (together -2)"


def test_a_check_without_causes_says_why() -> None:
    assert "one side only" in plain(side_by_side.causes_line(causes(), "new:s:R9"))
    assert "unknown" in plain(side_by_side.causes_line(causes(), "dark:s:R3"))


def test_the_first_column_stays_in_sight_beside_the_chosen_one() -> None:
    assert side_by_side.columns_in_sight(6, 5, 78, 30) == [0, 4, 5]
    assert side_by_side.columns_in_sight(6, 1, 78, 30) == [0, 1, 2]
    assert side_by_side.columns_in_sight(3, 1, 120, 30) == [0, 1, 2]


@pytest.mark.parametrize("width", [60, 80, 100, 120])
@pytest.mark.parametrize("count", [2, 3, 6])
def test_no_column_in_sight_is_cut(count: int, width: int) -> None:
    margins = [{**OLD, "a:s:R1": -12.0 * at, "b:s:R2": 0.5 + at} for at in range(count)]
    sides = [
        Side(f"r{at}", sheet(*(check(name, margin) for name, margin in each.items())), DESIGN)
        for at, each in enumerate(margins, 1)
    ]
    title = side_by_side.title_cells(count, width)
    sight = side_by_side.columns_in_sight(count, count - 1, width, title)
    rows = side_by_side.compare_rows(compare(sides, count - 1), sides, sight, title)
    lines = [plain(side_by_side.compare_heading(sides, sight, count - 1, title)), *(plain(row.spans) for row in rows)]
    assert len(sight) >= 2
    assert max(len(text.rstrip()) for text in lines) <= width - 2
    assert any(text.endswith(" <-999") for text in lines)
