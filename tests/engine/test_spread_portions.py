"""Lanes of a spread are run in portions; how many at a time changes no number. The rule is the project's own."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import Spread
from stagebook.engine.studies import spread
from stagebook.engine.studies.margins import study

LANES = 37


def test_portions_change_no_number(monkeypatch: pytest.MonkeyPatch) -> None:
    file = Path(__file__).parents[1] / "tui" / "commands" / "bell.json"
    design = Design.load(json.loads(file.read_text(encoding="utf-8")))
    told: list[tuple[int, int]] = []

    def spreads() -> dict[str, Spread | None]:
        told.clear()
        sheet = study(design, lanes=LANES, seed=3, progress=lambda done, total: told.append((done, total)))
        return {check.id: check.spread for check in sheet.checks}

    whole = spreads()
    monkeypatch.setattr(spread, "PORTION", 10)
    portions = spreads()
    assert portions == whole
    assert any(found is not None and found.p50 is None for found in whole.values())  # a trial, which has no quantiles
    assert any(found is not None and found.p50 is not None for found in whole.values())
    ours = [(done, total) for done, total in told if total == LANES]
    assert ours[-1] == (LANES, LANES)
    assert [done for done, _ in ours] == sorted(done for done, _ in ours)
