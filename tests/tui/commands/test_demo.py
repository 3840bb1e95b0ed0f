"""``stagebook demo``: the demo designs on the shelf. The contract is the project's own."""

from __future__ import annotations

import json
import os
from collections.abc import Callable
from pathlib import Path

import pytest

from stagebook.engine.results import MarginSheet
from stagebook.storage import Note, Revision, Store
from stagebook.tui.demo import DEMOS

Run = Callable[..., tuple[int, str, str]]
Refused = Callable[..., str]


def test_every_demo_comes_with_its_history(stagebook: Run) -> None:
    status, out, err = stagebook("demo", "--only-store")
    assert (status, err) == (0, "")
    designs = {entry["name"]: entry for entry in json.loads(stagebook("list", "--json")[1])["designs"]}
    assert set(designs) == {demo.name for demo in DEMOS}
    for demo in DEMOS:
        assert demo.name in out
        assert designs[demo.name]["revisions"] == len(demo.steps) >= 4
        numbers = range(1, min(len(demo.steps), 6) + 1)
        status, compared, err = stagebook("compare", demo.name, *numbers)
        assert (status, err) == (0, "")
        assert max(map(len, compared.splitlines())) <= 80
        assert "got worse" in compared


def test_what_is_there_stays(stagebook: Run, written: Path) -> None:
    stagebook("import", written, "--as", DEMOS[0].name)
    stagebook("demo", "--only-store")
    designs = {entry["name"]: entry for entry in json.loads(stagebook("list", "--json")[1])["designs"]}
    assert designs[DEMOS[0].name]["revisions"] == 0
    assert "already" in stagebook("demo", "--only-store")[1]


def test_nothing_is_stored_where_the_shelf_cannot_be_shown(refused: Refused, tmp_path: Path) -> None:
    assert "need a terminal" in refused("demo")
    assert os.listdir(tmp_path) == []


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        (("--only-store", "flood"), "flood"),
        (("--only-stores",), "--only-stores"),
        (("--only-store", "--store", "."), "not a file"),
        (("--only-store", "--store", "buzzer.json"), "not a Stagebook store"),
        (("--only-store", "--store", "buzzer.json/inside"), "cannot be opened"),
    ],
)
def test_wrong_input_is_one_line(refused: Refused, written: Path, arguments: tuple[str, ...], says: str) -> None:
    before = written.read_bytes()
    assert says in refused("demo", *arguments)
    assert written.read_bytes() == before


@pytest.mark.parametrize("saved", [0, 1, 3])
def test_a_history_that_was_cut_off_is_carried_on(tmp_path: Path, saved: int) -> None:
    demo = DEMOS[0]

    class CutOff(Exception):
        pass

    class Interrupted(Store):
        def save(self, name: str, note: Note, sheet: MarginSheet) -> Revision:
            if len(self.revisions(name)) == saved:
                raise CutOff
            return super().save(name, note, sheet)

    with Interrupted.open(tmp_path / "store.sqlite3") as store, pytest.raises(CutOff):
        demo.put_on(store)
    with Store.open(tmp_path / "store.sqlite3") as store:
        assert len(store.revisions(demo.name)) == saved
        assert demo.put_on(store)
        kept = store.revisions(demo.name)
        assert [revision.content for revision in kept] == [design.content for design in demo.designs()]
        assert [revision.parent for revision in kept] == [step.parent for step in demo.steps]
        assert not demo.put_on(store)
