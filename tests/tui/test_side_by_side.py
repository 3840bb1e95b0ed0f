"""Revisions side by side as lines: order after this project's margins convention ("What a comparison shows")."""

from __future__ import annotations

from stagebook.engine.design.document import Design
from stagebook.tui.shown import plain
from stagebook.tui.side_by_side import Column, causes_line, columns_in_sight, order, verdict_lines
from stagebook.tui.solver import Share

from .conftest import document
from .sheets import check, sheet

DESIGN = Design.load(document())
OLD = {"a:s:R1": 0.5, "b:s:R2": 0.5, "c:s:R3": 0.2, "d:s:R4": 0.3}
NEW = {"a:s:R1": 0.3, "b:s:R2": 0.6, "c:s:R3": 0.05, "e:s:R5": 0.4}
BEFORE = Column("r1", sheet(*(check(name, margin) for name, margin in OLD.items())), DESIGN)
AFTER = Column("r2", sheet(*(check(name, margin) for name, margin in NEW.items())), DESIGN)


def test_fallen_verdicts_come_before_losses_before_the_rest_by_slack() -> None:
    # c falls from pass to thin, a loses most, d and e stand on one side only, b gained.
    assert order([BEFORE, AFTER], 1) == ["c:s:R3", "a:s:R1", "d:s:R4", "e:s:R5", "b:s:R2"]


def test_a_check_on_one_side_only_is_said_so() -> None:
    first, second = verdict_lines([BEFORE, AFTER], 1, "e:s:R5")
    assert "does not have this check" in plain(first)
    assert "+40 pass" in plain(second)


def test_causes_are_listed_from_the_largest_with_what_they_do_together() -> None:
    share = Share(before=0.4, after=0.03, shares={"C4": -0.05, "R8": -0.32}, interaction=-0.02)
    assert plain(causes_line(share)) == " causes: R8 -32   C4 -5   together -2"
    assert "one side only" in plain(causes_line(None))


def test_the_first_column_stays_in_sight_beside_the_chosen_one() -> None:
    assert columns_in_sight(6, 5, 78, 30) == [0, 4, 5]
    assert columns_in_sight(6, 1, 78, 30) == [0, 1, 2]
    assert columns_in_sight(3, 1, 120, 30) == [0, 1, 2]
