"""Revisions side by side: what got worse comes first. The order is the project's own."""

from __future__ import annotations

from dataclasses import replace

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, Depth, MarginSheet, Verdict
from stagebook.engine.studies.comparison import Side, compare

from .units import changed, load, timer

OLD, NEW = load(timer()), load(changed(timer(), R7="1k", C1="22u"))


def check(name: str, margin: float | None, required: float = 0.3, corner: str = "cold") -> CheckResult:
    verdict = Verdict.UNKNOWN
    if margin is not None:
        verdict = Verdict.FAIL if margin < 0.0 else Verdict.THIN if margin < required else Verdict.PASS
    return CheckResult(
        id=name, number=1, title=name, stage="unit", part="R1", sequence="alarm", demand=None, capability=None,
        unit="A", limits=None, low=None, high=None, margin=margin, required=required, verdict=verdict, outcome=None,
        reason=None, corner=corner, conditions={}, nominal=margin, hand=None, spread=None,
    )  # fmt: skip


def side(label: str, design: Design = OLD, **margins: float | None) -> Side:
    checks = tuple(check(name, margin) for name, margin in margins.items())
    return Side(label, MarginSheet("unit", design.content, "1", 1, 0, 0.0, Depth.CORNERS, checks), design)


def order(*sides: Side, chosen: int | None = None) -> list[str]:
    return [row.id for row in compare(sides, chosen).rows]


def test_fallen_verdicts_come_before_losses_and_losses_before_the_rest() -> None:
    before = side("r1", lost=0.9, same=0.5, thin=0.35, fails=0.4, gained=-0.2, least=0.31)
    after = side("r2", lost=0.5, same=0.5, thin=0.2, fails=-0.1, gained=0.6, least=0.31)
    # Of the fallen ones the larger loss first; what rose in verdict comes right after what got worse.
    assert order(before, after) == ["fails", "thin", "lost", "gained", "least", "same"]


def test_a_small_loss_is_no_loss_but_a_small_fall_of_the_verdict_is_one() -> None:
    before = side("r1", steady=0.5, edge=0.301, other=0.9)
    after = side("r2", steady=0.496, edge=0.299, other=0.9)
    comparison = compare([before, after])
    worse = {row.id: row.against(1).worse for row in comparison.rows}
    assert worse == {"edge": True, "steady": False, "other": False}
    assert comparison.rows[0].id == "edge"


def test_a_margin_that_became_unknown_has_fallen_and_has_no_change() -> None:
    row = compare([side("r1", a=0.9), side("r2", a=None)]).rows[0]
    assert (row.against(1).fell, row.against(1).worse, row.against(1).change) == (True, True, None)


def test_a_failure_is_the_lowest_verdict() -> None:
    ranks = [None, -0.1, 0.1, 0.9]
    fell = {(a, b): compare([side("r1", x=a), side("r2", x=b)]).rows[0].against(1).fell for a in ranks for b in ranks}
    assert fell[0.9, 0.1]
    assert fell[0.1, None]
    assert fell[None, -0.1]
    assert not any(fell[a, a] for a in ranks)
    assert all(fell[a, b] is not fell[b, a] for a in ranks for b in ranks if a != b)


def test_checks_of_one_side_only() -> None:
    comparison = compare([side("r1", old=0.4, both=0.4), side("r2", new=0.9, both=0.4)])
    rows = {row.id: row for row in comparison.rows}
    assert set(rows) == {"old", "new", "both"}
    assert rows["old"].cells[1] is None
    assert rows["new"].cells[0] is None
    assert not rows["old"].against(1).worse
    assert not rows["new"].against(1).worse


def test_columns_are_compared_with_the_first() -> None:
    sides = [side("r1", a=0.9, b=0.9), side("r2", a=0.5, b=0.9), side("r3", a=0.9, b=0.4)]
    assert order(*sides) == ["b", "a"]
    assert order(*sides, chosen=1) == ["a", "b"]
    comparison = compare(sides)
    assert comparison.labels == ("r1", "r2", "r3")
    assert [row.against(2).change for row in comparison.rows] == [pytest.approx(-0.5), 0.0]


def test_changes_are_those_from_the_first_column() -> None:
    comparison = compare([side("r1"), side("r2", NEW), side("r3", OLD)])
    assert comparison.changed[0] == ()
    assert [change.what for change in comparison.changed[1]] == ["R7", "C1"]
    assert comparison.changed[2] == ()


def test_a_moved_corner_is_told() -> None:
    before, after = side("r1", a=0.5), side("r2", a=0.5)
    moved = replace(after, sheet=replace(after.sheet, checks=(check("a", 0.5, corner="hot"),)))
    assert compare([before, moved]).rows[0].against(1).corner_moved
    assert not compare([before, after]).rows[0].against(1).corner_moved


def test_as_json() -> None:
    plain = compare([side("r1", a=0.9), side("r2", NEW, a=-0.1, b=0.5)]).as_json()
    assert plain["revisions"] == ["r1", "r2"]
    assert plain["changed"][1][0] == {"what": "R7", "kind": "value", "before": "680R", "after": "1k"}
    assert [entry["id"] for entry in plain["checks"]] == ["a", "b"]
    assert plain["checks"][0]["worse"] is True
    before, after = plain["checks"][0]["columns"]
    assert (before["difference"], after["difference"]) == (None, pytest.approx(-1.0))
    assert (after["margin"], after["verdict"]) == (-0.1, "FAIL")
    assert plain["checks"][1]["columns"][0] is None
