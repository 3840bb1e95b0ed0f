"""Rows of the catalogue pass their own requirements as made (the project's own rows; margins: customary, from memory).

Four of them with every run of the tests, which between them hold all that went wrong at first; all on request:
``pytest -m benchmark tests/engine/stages/test_trial_rows.py``.
"""

from __future__ import annotations

import pytest

from stagebook.engine.results import Verdict
from stagebook.engine.stages import stage_kinds
from stagebook.engine.stages.making import doubts
from stagebook.engine.studies.margins import study

from .trial_rows import ROWS, conditions, made_row

ALWAYS = ("pulse_4_cells", "latch_2_cells", "backed_up", "delay_10min")


def amiss(name: str) -> dict[str, tuple[str, float | None, float | None, str | None]]:
    """What of the sheet is no PASS, or not as its hand formula says: its verdict, both margins, and the reason."""
    sheet = study(made_row(name))
    found = [check for check in sheet.checks if check.verdict is not Verdict.PASS or check.disagrees]
    return {check.id: (check.verdict.name, check.margin, check.hand, check.reason) for check in found}


def test_every_kind_stands_in_a_row() -> None:
    assert {choice.kind for _, row in ROWS.values() for choice in row} == set(stage_kinds())


@pytest.mark.parametrize("name", ROWS)
def test_no_row_is_doubted(name: str) -> None:
    assert doubts(conditions(name), ROWS[name][1]) == {}


@pytest.mark.parametrize("name", ALWAYS)
def test_a_row_holds_as_made(name: str) -> None:
    assert amiss(name) == {}


@pytest.mark.benchmark
@pytest.mark.parametrize("name", sorted(set(ROWS) - set(ALWAYS)))
def test_the_other_rows_hold_as_made(name: str) -> None:
    assert amiss(name) == {}
