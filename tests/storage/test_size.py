"""A large shelf: 200 designs with 10,000 revisions. Timings run on request: ``pytest -m benchmark -s``.

The limits are the project's own: shelf 1 s, history 0.3 s, comparison 0.1 s. Each time is the least of nine, as other
programs only add to it.
"""

from __future__ import annotations

import json
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from stagebook.engine.design.document import Design
from stagebook.engine.results import MarginSheet
from stagebook.engine.studies.comparison import Side, compare
from stagebook.storage import Note, Store
from stagebook.storage.seal import canonical
from stagebook.storage.tables import StoredMargin, triggers

pytestmark = pytest.mark.benchmark

DESIGNS, REVISIONS = 200, 10_000
DEMO = Path(__file__).parents[2] / "tui" / "demo"


@pytest.fixture(scope="module")
def large(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    """The demo design in 200 copies of 50 revisions each, with the demo's sheet of margins.

    The first revision of each is saved by the store; the others are its rows again, put in by SQL: 10,000 saves of
    their own would take minutes.
    """
    document = json.loads((DEMO / "flood.json").read_text("utf-8"))
    design = Design.load(document)
    sheets = json.loads((DEMO / "flood_margins.json").read_text("utf-8"))
    stored = next(sheet for sheet in (sheets.values() if isinstance(sheets, dict) else sheets) if sheet["checks"])
    stored["content"] = design.content
    sheet = MarginSheet.from_json(stored)
    each = REVISIONS // DESIGNS
    path = tmp_path_factory.mktemp("large") / "s.sqlite3"
    with Store.open(path) as store:
        for number in range(DESIGNS):
            name = f"design {number}"
            store.create(name, design)
            store.save(name, Note("first", symptom="what was seen " * 10), sheet)
        with store.reading() as session:
            raw = session.connection()
            for name in triggers():
                raw.exec_driver_sql(f"DROP TRIGGER {name}")
            raw.exec_driver_sql(
                f"""
                WITH RECURSIVE more(n) AS (SELECT 2 UNION ALL SELECT n + 1 FROM more WHERE n < {each})
                INSERT INTO revision
                (design_id, number, parent_id, edit_id, saved, note, document, margins, content, hash)
                SELECT design_id, n, id, edit_id, saved, note, document, margins, content, hash FROM revision, more
                """
            )
            columns = [column.name for column in StoredMargin.metadata.tables["margin"].columns]
            raw.exec_driver_sql(
                f"""
                INSERT INTO margin ({", ".join(columns)})
                SELECT {", ".join("r.id" if c == "revision_id" else f"m.{c}" for c in columns)}
                FROM revision AS r
                JOIN revision AS f ON f.design_id = r.design_id AND f.number = 1
                JOIN margin AS m ON m.revision_id = f.id
                WHERE r.number > 1
                """
            )
            for sql in triggers().values():
                raw.exec_driver_sql(sql)
            session.commit()
        yield store
    path.unlink()  # a gigabyte, which pytest would keep


def least(deed: Callable[[], object]) -> float:
    times = []
    for _ in range(9):
        began = time.perf_counter()
        deed()
        times.append(time.perf_counter() - began)
    return min(times)


def told(name: str, seconds: float) -> float:
    print(f"\nfigure: {name} = {seconds:.3f} s")
    return seconds


def test_the_shelf_is_listed_within_a_second(large: Store) -> None:
    rows = large.designs()
    assert (len(rows), sum(row.revisions for row in rows)) == (DESIGNS, REVISIONS)
    assert all(row.worst is not None for row in rows)
    assert told("shelf of 200 designs and 10000 revisions", least(large.designs)) <= 1.0


def test_a_history_is_read_within_0_3_seconds(large: Store) -> None:
    def history() -> None:
        """What the screen asks for: every revision with its sheet."""
        for revision in large.revisions("design 77"):
            assert revision.sheet.checks
            assert revision.note.line

    history()
    assert len(large.revisions("design 77")) == REVISIONS // DESIGNS
    assert told("history of 50 revisions among 10000", least(history)) <= 0.3


def test_a_comparison_is_made_within_0_1_seconds(large: Store) -> None:
    def comparison() -> None:
        found = [large.revision("design 123", number) for number in (1, 25, 50)]
        compared = compare([Side(f"r{one.number}", one.sheet, one.design) for one in found])
        assert canonical([row.id for row in compared.rows])

    comparison()
    assert told("comparison of 3 revisions among 10000", least(comparison)) <= 0.1
