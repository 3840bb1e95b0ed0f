"""The tree of edits: undo and redo across sittings, against a model of plain lists."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable
from contextlib import closing
from dataclasses import dataclass, field
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from stagebook.engine.design.document import Design
from stagebook.storage import Note, NothingToRedo, NothingToUndo, Store, StoreUnreadable, verify

Plain = Callable[[BaseException], str]


def test_undo_and_redo_walk_along_the_edits(flood: Store, design: Callable) -> None:
    flood.edit("flood", "R8 22k", design("22k"))
    draft = flood.edit("flood", "R8 33k", design("33k"))
    assert (draft.edits, draft.undo_label, draft.redo_label) == (2, "R8 33k", None)
    draft = flood.undo("flood")
    assert (draft.design, draft.undo_label, draft.redo_label) == (design("22k"), "R8 22k", "R8 33k")
    draft = flood.undo("flood")
    assert (draft.design, draft.undo_label, draft.redo_label) == (design(), None, "R8 22k")
    draft = flood.redo("flood")
    assert (draft.design, draft.edits) == (design("22k"), 1)


def test_an_edit_that_changes_nothing_is_none(flood: Store, design: Callable) -> None:
    assert flood.edit("flood", "R8 10k", design()).can_undo is False


def test_ends_are_told_in_one_line(flood: Store, design: Callable, plain: Plain) -> None:
    with pytest.raises(NothingToUndo) as refusal:
        flood.undo("flood")
    assert "nothing to undo" in plain(refusal.value)
    flood.edit("flood", "R8 22k", design("22k"))
    with pytest.raises(NothingToRedo) as refusal:
        flood.redo("flood")
    assert "nothing to redo" in plain(refusal.value)
    assert flood.draft("flood").design == design("22k")


def test_redo_follows_the_child_used_last_not_the_youngest(flood: Store, design: Callable) -> None:
    flood.edit("flood", "older", design("22k"))
    flood.edit("flood", "leaf", design("27k"))
    flood.undo("flood")
    flood.undo("flood")
    flood.edit("flood", "younger", design("33k"))
    flood.undo("flood")
    assert flood.draft("flood").redo_label == "younger"


def test_an_edit_after_undo_loses_nothing(flood: Store, design: Callable, sheet: Callable) -> None:
    """Two ways from r1: going back to r1 by way of r2 makes the way to r2 the one that redo follows."""
    flood.save("flood", Note("r1"), sheet(design()))
    flood.edit("flood", "a", design("22k"))
    flood.save("flood", Note("r2"), sheet(design("22k")))
    flood.branch("flood", 1)
    flood.edit("flood", "b", design("33k"))
    flood.edit("flood", "c", design("39k"))
    flood.branch("flood", 2)
    assert flood.undo("flood").redo_label == "a"
    flood.branch("flood", 1)
    assert flood.redo("flood").design == design("22k")


def test_unsaved_edits_come_back_after_a_look_at_another_revision(
    flood: Store, design: Callable, sheet: Callable
) -> None:
    flood.save("flood", Note("r1"), sheet(design()))
    flood.edit("flood", "a", design("22k"))
    flood.save("flood", Note("r2"), sheet(design("22k")))
    flood.edit("flood", "unsaved", design("33k"))
    assert flood.branch("flood", 1).edits == 0
    flood.branch("flood", 2)
    assert flood.redo("flood").design == design("33k")


def test_undo_goes_past_a_save(flood: Store, design: Callable, sheet: Callable) -> None:
    flood.edit("flood", "a", design("22k"))
    flood.save("flood", Note("r1"), sheet(design("22k")))
    draft = flood.undo("flood")
    assert (draft.design, draft.base_revision, draft.edits) == (design(), 1, 1)


def test_pending_edits_are_counted_between_branches(flood: Store, design: Callable, sheet: Callable) -> None:
    flood.edit("flood", "a", design("22k"))
    flood.edit("flood", "b", design("27k"))
    flood.save("flood", Note("r1"), sheet(design("27k")))
    flood.undo("flood")
    draft = flood.edit("flood", "c", design("33k"))
    assert draft.edits == 2
    assert flood.designs()[0].edits_pending == 2


def test_designs_do_not_share_edits(flood: Store, design: Callable) -> None:
    flood.create("frost", design("47k"))
    flood.edit("flood", "R8 22k", design("22k"))
    assert flood.draft("frost").can_redo is False
    with pytest.raises(NothingToUndo):
        flood.undo("frost")


def test_a_damaged_edit_moves_nothing(path: Path, flood: Store, design: Callable, plain: Plain) -> None:
    flood.edit("flood", "R8 22k", design("22k"))
    with closing(sqlite3.connect(path)) as raw, raw:
        raw.execute("""UPDATE edit SET inverse = '[{"op":"remove","path":"/nowhere"}]'""")
    with pytest.raises(StoreUnreadable) as refusal:
        flood.undo("flood")
    assert "'flood'" in plain(refusal.value)
    assert flood.draft("flood").design == design("22k")


@dataclass
class Model:
    """The tree in plain lists: the way to the present state, every edit's value, and the last child used of each."""

    way: list[int] = field(default_factory=list)
    values: dict[int, str] = field(default_factory=dict)
    used: dict[tuple[int, ...], int] = field(default_factory=dict)
    saved: list[list[int]] = field(default_factory=list)
    base: int | None = None

    @property
    def value(self) -> str:
        return self.values[self.way[-1]] if self.way else "10k"

    def edit(self, value: str) -> None:
        if value != self.value:
            number = len(self.values)
            self.values[number] = value
            self.used[tuple(self.way)] = number
            self.way.append(number)

    def undo(self) -> bool:
        return bool(self.way) and self.way.pop() >= 0

    def redo(self) -> bool:
        child = self.used.get(tuple(self.way))
        if child is not None:
            self.way.append(child)
        return child is not None

    def save(self) -> None:
        self.saved.append(list(self.way))
        self.base = len(self.saved)

    def branch(self, number: int) -> None:
        self.way = list(self.saved[number - 1])
        for at, child in enumerate(self.way):
            self.used[tuple(self.way[:at])] = child
        self.base = number

    @property
    def pending(self) -> int:
        there = self.saved[self.base - 1] if self.base else []
        common = sum(1 for one, other in zip(self.way, there, strict=False) if one == other)
        return len(self.way) + len(there) - 2 * common


ACTIONS = st.lists(
    st.sampled_from(["10k", "22k", "33k", "47k"])
    | st.sampled_from(["undo", "redo", "undo", "redo", "reopen", "save"])
    | st.integers(1, 4),
    max_size=30,
)


@settings(max_examples=40, deadline=None)
@given(actions=ACTIONS)
def test_the_tree_is_that_of_plain_lists_across_sittings(
    actions: list[str | int], design: Callable, sheet: Callable
) -> None:
    model = Model()
    with TemporaryDirectory() as folder:
        path = Path(folder) / "s.sqlite3"
        store = Store.open(path)
        try:
            store.create("flood", design())
            for action in actions:
                if action == "undo":
                    _same_end(model.undo(), store.undo, NothingToUndo)
                elif action == "redo":
                    _same_end(model.redo(), store.redo, NothingToRedo)
                elif action == "reopen":
                    store.close()
                    store = Store.open(path)
                elif action == "save":
                    model.save()
                    assert store.save("flood", Note("x"), sheet(design(model.value))).number == model.base
                elif isinstance(action, str):
                    model.edit(action)
                    store.edit("flood", action, design(action))
                elif action <= len(model.saved):
                    model.branch(action)
                    store.branch("flood", action)
                draft = store.draft("flood")
                assert _value(draft.design) == model.value
                assert (draft.can_undo, draft.can_redo) == (bool(model.way), tuple(model.way) in model.used)
                assert (draft.edits, draft.base_revision) == (model.pending, model.base)
            assert verify(store) == []
        finally:
            store.close()


def _value(design: Design) -> str:
    value = design.dump()["stages"][0]["parts"][2]["value"]
    assert isinstance(value, str)
    return value


def _same_end(moved: bool, attempt: Callable[[str], object], refusal: type[Exception]) -> None:
    if moved:
        attempt("flood")
    else:
        with pytest.raises(refusal):
            attempt("flood")


def test_the_beginning_is_what_was_put_on_the_shelf(flood: Store, design: Callable) -> None:
    first = flood.draft("flood").design
    assert flood.beginning("flood") == first
    for value in ("22k", "33k", "47k"):
        flood.edit("flood", "R8", design(value))
    flood.undo("flood")
    assert flood.beginning("flood") == first
    assert flood.draft("flood").design == design("33k")
