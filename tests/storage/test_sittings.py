"""Two sittings at one store: real processes, a fencing token, numbers without gaps or doubles."""

from __future__ import annotations

import os
import sqlite3
from collections.abc import Callable
from contextlib import closing
from pathlib import Path

import pytest

from stagebook.storage import DesignOpen, Note, Store, TakenOver, presence, verify

Plain = Callable[[BaseException], str]


def test_a_stale_token_is_refused_between_two_processes(
    flood: Store, child: Callable, next_line: Callable, design: Callable, sheet: Callable, plain: Plain
) -> None:
    flood.edit("flood", "R8 22k", design("22k"))
    other = child("""
store = Store.open(path)
store.take_over("flood")
store.edit("flood", "R8 33k", design("33k"))
say("taken over")
sys.stdin.readline()
try:
    store.edit("flood", "R8 56k", design("56k"))
except TakenOver as refusal:
    say(refusal)
say(store.draft("flood").design.part("R8").value)
""")
    assert next_line(other) == "taken over"
    for write in (
        lambda: flood.edit("flood", "R8 47k", design("47k")),
        lambda: flood.undo("flood"),
        lambda: flood.redo("flood"),
        lambda: flood.save("flood", Note("x"), sheet(design("33k"))),
        lambda: flood.branch("flood", 1),
        lambda: flood.add_note("flood", 1, "result", "x"),
    ):
        with pytest.raises(TakenOver) as refusal:
            write()
        assert "'flood' was taken over by another sitting since" in plain(refusal.value)
    draft = flood.draft("flood")
    assert (draft.design, draft.edits) == (design("33k"), 2)

    assert flood.take_over("flood").design == design("33k")
    flood.edit("flood", "R8 47k", design("47k"))
    other.stdin.write("go on\n")
    other.stdin.flush()
    assert next_line(other).startswith("'flood' was taken over by another sitting")
    assert next_line(other) == "47k"
    assert verify(flood) == []


def test_an_edit_never_goes_over_a_state_that_was_not_seen(path: Path, flood: Store, design: Callable) -> None:
    """The first write claims the design only if its draft is where this sitting saw it."""
    with Store.open(path) as other:
        other.draft("flood")
        flood.edit("flood", "R8 22k", design("22k"))
        with pytest.raises(TakenOver, match="has been edited in another sitting"):
            other.edit("flood", "R8 33k", design("33k"))
        flood.leave("flood")
        with pytest.raises(TakenOver, match="has been edited in another sitting"):
            other.edit("flood", "R8 33k", design("33k"))
        assert flood.draft("flood").design == design("22k")
        other.draft("flood")
        assert other.edit("flood", "R8 33k", design("33k")).edits == 2
        flood.draft("flood")
        with pytest.raises(TakenOver, match="is open in another sitting"):
            flood.edit("flood", "R8 47k", design("47k"))
    assert flood.edit("flood", "R8 47k", design("47k")).edits == 3


def test_sittings_do_not_meet_on_different_designs(path: Path, flood: Store, design: Callable) -> None:
    with Store.open(path) as other:
        other.create("frost", design())
        flood.edit("flood", "R8 22k", design("22k"))
        other.edit("frost", "R8 33k", design("33k"))
        flood.edit("flood", "R8 27k", design("27k"))
        assert [row.edits_pending for row in flood.designs()] == [2, 1]


def test_who_edits_is_told(path: Path, flood: Store, design: Callable) -> None:
    assert flood.sitting("flood") is None
    flood.sit_down("flood")
    mine = flood.sitting("flood")
    assert mine is not None
    assert mine.here
    with Store.open(path) as other:
        theirs = other.sitting("flood")
        assert theirs is not None
        assert not theirs.here
        assert theirs.since == mine.since
        flood.close()
        assert other.sitting("flood") is None
        other.draft("flood")
        other.edit("flood", "R8 22k", design("22k"))
        assert other.sitting("flood") is not None


def test_closing_does_not_give_back_what_another_has(path: Path, flood: Store) -> None:
    with Store.open(path) as other:
        other.take_over("flood")
        flood.close()
        sitting = other.sitting("flood")
        assert sitting is not None
        assert sitting.here


def test_a_sitting_left_by_a_crash_is_no_hindrance(
    path: Path, child: Callable, next_line: Callable, design: Callable, plain: Plain
) -> None:
    process = child("""
store = Store.open(path, terminal="pts/7")
store.create("flood", design())
store.sit_down("flood")
say("done")
sys.stdin.read()
""")
    assert next_line(process) == "done"
    with Store.open(path) as store:
        sitting = store.sitting("flood")
        assert sitting is not None
        assert (sitting.here, sitting.who.endswith(", pts/7")) == (False, True)
        with pytest.raises(DesignOpen) as refusal:
            store.sit_down("flood")
        assert refusal.value.sitting == sitting
        assert f"'flood' is open in another sitting since {sitting.since[:10]}" in plain(refusal.value)
        assert sitting.who in str(refusal.value)
        process.kill()
        process.wait(10)
        assert store.sitting("flood") is None
        assert store.sit_down("flood").can_undo is False
        assert store.edit("flood", "R8 22k", design("22k")).can_undo
        locks = list(path.parent.glob(f"{path.name}-sitting-*"))
        assert len(locks) == 1  # that of the dead process is gone
        assert locks[0].stat().st_mode & 0o777 == 0o600
    assert [file.name for file in path.parent.iterdir()] == [path.name]


def test_leaving_gives_the_design_back(path: Path, flood: Store, design: Callable) -> None:
    flood.sit_down("flood")
    flood.sit_down("flood")  # going on here is no take-over
    with Store.open(path) as other:
        with pytest.raises(DesignOpen):
            other.sit_down("flood")
        flood.leave("flood")
        other.sit_down("flood")
        other.leave("flood")
        flood.leave("flood")
        assert flood.sitting("flood") is None
        assert flood.edit("flood", "R8 22k", design("22k")).edits == 1


def test_without_locks_the_tokens_still_keep_sittings_apart(
    path: Path, flood: Store, design: Callable, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A file system or a machine without flock: nobody is known to be there, and nothing is written over."""
    monkeypatch.setattr(presence, "_HAS_LOCKS", False)
    flood.sit_down("flood")
    with Store.open(path) as other:
        assert other.sit_down("flood").edits == 0
        other.edit("flood", "R8 22k", design("22k"))
        with pytest.raises(TakenOver):
            flood.edit("flood", "R8 33k", design("33k"))
        assert other.draft("flood").design == design("22k")
    assert [file.name for file in path.parent.iterdir() if "sitting" in file.name] == []


SAVES = """
store = Store.open(path)
say("ready")
sys.stdin.readline()
numbers = []
while len(numbers) < 12:
    try:
        numbers.append(store.save("flood", Note(sys.argv[0]), sheet_of(design())).number)
    except TakenOver:
        store.take_over("flood")
say(*numbers)
"""


def test_two_processes_saving_at_once_give_numbers_without_gaps_or_doubles(
    flood: Store, child: Callable, next_line: Callable
) -> None:
    processes = [child(SAVES), child(SAVES)]
    for process in processes:
        assert next_line(process) == "ready"
    for process in processes:
        process.stdin.write("go\n")
        process.stdin.flush()
    found = [[int(number) for number in next_line(process).split()] for process in processes]
    assert [len(numbers) for numbers in found] == [12, 12]
    assert sorted(found[0] + found[1]) == list(range(1, 25))
    revisions = flood.revisions("flood")
    assert [r.number for r in revisions] == list(range(1, 25))
    assert [r.parent for r in revisions] == [None, *range(1, 24)]
    assert verify(flood) == []


def test_two_processes_can_make_one_store(path: Path, child: Callable, next_line: Callable) -> None:
    code = """
say("ready")
sys.stdin.readline()
store = Store.open(path)
store.create(sys.stdin.readline().strip(), design())
say("made")
"""
    processes = [child(code) for _ in range(3)]
    for process in processes:
        assert next_line(process) == "ready"
    for number, process in enumerate(processes):
        process.stdin.write(f"go\nunit {number}\n")
        process.stdin.flush()
    assert [next_line(process) for process in processes] == ["made"] * 3
    with Store.open(path) as store:
        assert [row.name for row in store.designs()] == ["unit 0", "unit 1", "unit 2"]
        assert verify(store) == []


EDITS = """
store = Store.open(path)
store.draft("flood")
say("ready")
mine = sys.stdin.readline().strip()
draft, took = store.draft("flood"), 0
for number in range(1, 41):
    while True:
        try:
            document = draft.design.dump()
            for part in document["stages"][0]["parts"]:
                if part["ref"] == mine:
                    part["value"] = f"{number}k"
            draft = store.edit("flood", f"{mine} {number}", Design.load(document))
            break
        except TakenOver:
            draft, took = store.take_over("flood"), took + 1
say(took)
"""


def test_two_processes_editing_at_once_lose_no_update(flood: Store, child: Callable, next_line: Callable) -> None:
    """Each writes a value of its own and leaves the other's as it was read: a state written over would bring it back.

    Every edit has to be in the tree, on top of a state in which the other's value is the newest.
    """
    processes = {ref: child(EDITS) for ref in ("R7", "R8")}
    for process in processes.values():
        assert next_line(process) == "ready"
    for ref, process in processes.items():
        process.stdin.write(f"{ref}\n")
        process.stdin.flush()
    took = [int(next_line(process)) for process in processes.values()]
    assert all(process.wait(10) == 0 for process in processes.values())
    assert sum(took) >= 1  # they did meet
    draft = flood.draft("flood")
    assert [draft.design.part(ref).value for ref in processes] == ["40k", "40k"]
    assert draft.edits == 80
    labels = []
    while draft.undo_label is not None:
        labels.append(draft.undo_label)
        ref, number = draft.undo_label.split()
        assert draft.design.part(ref).value == f"{number}k"
        other = next(each for each in processes if each != ref)
        before = draft.design.part(other).value
        draft = flood.undo("flood")
        assert draft.design.part(other).value == before
    assert sorted(labels) == sorted(f"{ref} {number}" for ref in processes for number in range(1, 41))
    assert verify(flood) == []


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="named pipes are of POSIX systems")
@pytest.mark.parametrize("seat", ["/../pipe", "pipe", "\0", "", "\u00e9" * 300])
def test_a_store_with_a_foreign_seat_hinders_nobody(path: Path, flood: Store, seat: str) -> None:
    flood.sit_down("flood")
    flood.close()
    os.mkfifo(path.parent / "pipe")
    os.mkfifo(path.parent / f"{path.name}-sitting-pipe")
    with closing(sqlite3.connect(path)) as raw:
        raw.execute("UPDATE sitting SET closed = 0, seat = ?", (seat,))
        raw.commit()
    with Store.open(path) as store:
        assert store.sitting("flood") is None
        assert store.sit_down("flood").edits == 0
