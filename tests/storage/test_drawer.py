"""Parts in the drawer: versions that never change. The rules of names and versions are the project's own."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path
from typing import Any

import pytest

from stagebook.engine.errors import DesignError
from stagebook.storage import PartMissing, PartRefused, Store, verify

LOW_LEAK: dict[str, Any] = {"kind": "npn", "class": "small npn", "data": {"gain": {"typical": "180"}}}
FILM: dict[str, Any] = {"kind": "resistor", "value": "470k", "tolerance": "1 %", "rating": "0.6 W"}


@pytest.fixture
def store(tmp_path: Path) -> Iterator[Store]:
    with Store.open(tmp_path / "s.sqlite3") as opened:
        yield opened


def test_a_part_is_there_after_opening_again(store: Store, tmp_path: Path) -> None:
    kept = store.keep_part("low-leak npn", LOW_LEAK)
    store.keep_part("film", FILM)
    assert (kept.version, kept.kind, kept.document, kept.title) == (1, "npn", LOW_LEAK, "low-leak npn, version 1")
    with Store.open(tmp_path / "s.sqlite3") as again:
        assert [(made.kind, made.name) for made in again.drawer()] == [("npn", "low-leak npn"), ("resistor", "film")]
        assert verify(again) == []


def test_what_differs_is_another_version_and_what_does_not_is_none(store: Store) -> None:
    store.keep_part("low-leak npn", LOW_LEAK)
    assert store.keep_part("low-leak npn", dict(reversed(LOW_LEAK.items()))).version == 1
    other = {**LOW_LEAK, "data": {"gain": {"typical": "200"}}}
    assert store.keep_part(" low-leak npn ", other).version == 2
    assert [made.document for made in store.part_versions("low-leak npn")] == [LOW_LEAK, other]
    assert [made.version for made in store.drawer()] == [2]


def test_what_is_no_part_is_refused_and_nothing_is_kept(store: Store) -> None:
    with pytest.raises(DesignError, match="gain"):
        store.keep_part("odd", {"kind": "npn", "class": "small npn", "data": {"gain": "many"}})
    store.keep_part("film", FILM)
    with pytest.raises(PartRefused, match="is a resistor and no npn"):
        store.keep_part("film", LOW_LEAK)
    for name in ("", "  ", "x" * 61, "a\nb"):
        with pytest.raises(PartRefused):
            store.keep_part(name, FILM)
    assert [made.name for made in store.drawer()] == ["film"]


def test_a_name_that_is_not_there_is_met_with_the_nearest(store: Store) -> None:
    store.keep_part("low-leak npn", LOW_LEAK)
    with pytest.raises(PartMissing, match="did you mean 'low-leak npn'"):
        store.part_versions("low leak npn")


@pytest.mark.parametrize(
    "statement",
    [
        "UPDATE made_part SET document = '{}'",
        "DELETE FROM made_part",
        "INSERT OR REPLACE INTO made_part (id, name, version, kind, document, made) VALUES (1, 'a', 1, 'b', 'c', 'd')",
        "INSERT OR REPLACE INTO made_part (name, version, kind, document, made) VALUES ('film', 1, 'b', 'c', 'd')",
    ],
)
def test_a_version_never_changes(store: Store, tmp_path: Path, statement: str) -> None:
    store.keep_part("film", FILM)
    with (
        closing(sqlite3.connect(tmp_path / "s.sqlite3", isolation_level=None)) as raw,
        pytest.raises(sqlite3.IntegrityError, match="never changed"),
    ):
        raw.execute(statement)
    assert [made.document for made in store.drawer()] == [FILM]
