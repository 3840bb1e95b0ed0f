"""Margins that are shipped with the demos are those the engine computes, and tell the story of the notes.

Otherwise run ``python -m stagebook.tui.demo.recompute tui/demo``. The stories are this project's own.
"""

from __future__ import annotations

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import CheckResult, MarginSheet, Verdict
from stagebook.engine.studies.margins import study
from stagebook.tui.demo import DEMOS
from stagebook.tui.demo.history import Demo

FLAWS = {"flood": {"supply_slew:latch:Q5"}}

revisions = pytest.mark.parametrize(
    ("design", "shipped"),
    [
        pytest.param(design, sheet, id=f"{demo.name}-r{number}")
        for demo in DEMOS
        for number, (design, sheet) in enumerate(zip(demo.designs(), demo.sheets(), strict=True), 1)
    ],
)


def held(check: CheckResult) -> float:
    """The margin as shares and trends count it, within -1 .. 1."""
    assert check.margin is not None, check.reason
    return max(-1.0, min(1.0, check.margin))


@revisions
def test_shipped_margins_are_those_of_the_engine(design: Design, shipped: MarginSheet) -> None:
    assert shipped.content == design.content
    before = {check.id: check for check in shipped.checks}
    now = {check.id: check for check in study(design).checks}
    assert set(before) == set(now)
    assert {name: check.verdict for name, check in before.items()} == {n: check.verdict for n, check in now.items()}
    # A trial is bisected to about a percent of its knob; everything else repeats to the bit.
    assert {n: held(check) for n, check in before.items()} == pytest.approx(
        {n: held(check) for n, check in now.items()}, abs=0.02
    )


@pytest.mark.parametrize("demo", DEMOS, ids=lambda demo: demo.name)
def test_the_first_revision_has_the_flaw_and_the_last_has_none(demo: Demo) -> None:
    first, *_, last = demo.sheets()
    assert {check.id for check in first.checks if check.verdict is not Verdict.PASS} == FLAWS[demo.name]
    assert [check.id for check in last.checks if check.verdict is not Verdict.PASS] == []
