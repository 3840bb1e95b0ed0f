"""Two sittings at one store: real processes, a fencing token, numbers without gaps or doubles."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from stagebook.storage import Note, Store, TakenOver, verify

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
        assert '"flood" has been edited in another sitting since' in plain(refusal.value)
    draft = flood.draft("flood")
    assert (draft.design, draft.edits) == (design("33k"), 2)

    assert flood.take_over("flood").design == design("33k")
    flood.edit("flood", "R8 47k", design("47k"))
    other.stdin.write("go on\n")
    other.stdin.flush()
    assert next_line(other).startswith('"flood" has been edited in another sitting')
    assert next_line(other) == "47k"
    assert verify(flood) == []


def test_an_edit_never_goes_over_a_state_that_was_not_seen(path: Path, flood: Store, design: Callable) -> None:
    """The first write claims the design only if its draft is where this sitting saw it."""
    with Store.open(path) as other:
        other.draft("flood")
        flood.edit("flood", "R8 22k", design("22k"))
        with pytest.raises(TakenOver):
            other.edit("flood", "R8 33k", design("33k"))
        assert flood.draft("flood").design == design("22k")
        other.draft("flood")
        assert other.edit("flood", "R8 33k", design("33k")).edits == 2
    with pytest.raises(TakenOver):
        flood.edit("flood", "R8 47k", design("47k"))


def test_sittings_do_not_meet_on_different_designs(path: Path, flood: Store, design: Callable) -> None:
    with Store.open(path) as other:
        other.create("frost", design())
        flood.edit("flood", "R8 22k", design("22k"))
        other.edit("frost", "R8 33k", design("33k"))
        flood.edit("flood", "R8 27k", design("27k"))
        assert [row.edits_pending for row in flood.designs()] == [2, 1]


def test_who_edits_is_told(path: Path, flood: Store, design: Callable) -> None:
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
    path: Path, child: Callable, next_line: Callable, design: Callable
) -> None:
    process = child('store = Store.open(path); store.create("flood", design()); say("done"); sys.stdin.read()')
    assert next_line(process) == "done"
    process.kill()
    process.wait(10)
    with Store.open(path) as store:
        assert store.sitting("flood") is not None
        assert store.draft("flood").can_undo is False
        assert store.edit("flood", "R8 22k", design("22k")).can_undo


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
