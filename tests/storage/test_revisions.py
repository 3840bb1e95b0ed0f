"""Saving, branching, notes, and the hash of a revision."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable
from dataclasses import asdict

import pytest
from hypothesis import given
from hypothesis import strategies as st

from stagebook.storage import (
    ADDABLE,
    MarginsRefused,
    Note,
    NoteEntry,
    NoteRefused,
    RevisionMissing,
    Store,
    verify,
)
from stagebook.storage.seal import revision_hash

Plain = Callable[[BaseException], str]


def test_a_save_keeps_document_note_and_margins(flood: Store, design: Callable, sheet: Callable) -> None:
    margins = sheet(design(), driver=0.2, latch=None)
    note = Note("as built", symptom="trips by itself", prediction="holds\nfor a day")
    saved = flood.save("flood", note, margins)
    assert (saved.number, saved.parent, saved.note, saved.added) == (1, None, note, ())
    assert (saved.design, saved.sheet, saved.content) == (design(), margins, design().content)
    assert saved.saved.startswith("2026-12-01T09:")
    assert saved.saved.endswith("+00:00")
    assert flood.revision("flood") == flood.revision("flood", 1) == saved
    draft = flood.draft("flood")
    assert (draft.base_revision, draft.edits) == (1, 0)


def test_numbers_and_parents_follow_the_branches(flood: Store, design: Callable, sheet: Callable) -> None:
    flood.save("flood", Note("a"), sheet(design()))
    flood.edit("flood", "R8", design("22k"))
    flood.save("flood", Note("b"), sheet(design("22k")))
    assert flood.branch("flood", 1).design == design()
    flood.edit("flood", "R8", design("33k"))
    flood.save("flood", Note("c"), sheet(design("33k")))
    flood.save("flood", Note("d, the same again"), sheet(design("33k")))
    found = flood.revisions("flood")
    assert [(r.number, r.parent, r.note.line) for r in found] == [
        (1, None, "a"),
        (2, 1, "b"),
        (3, 1, "c"),
        (4, 3, "d, the same again"),
    ]
    assert len({r.hash for r in found}) == 4
    assert flood.revision("flood").number == 4


def test_numbers_of_two_designs_are_apart(flood: Store, design: Callable, sheet: Callable) -> None:
    flood.create("frost", design("47k"))
    assert flood.save("flood", Note("a"), sheet(design())).number == 1
    assert flood.save("frost", Note("a"), sheet(design("47k"))).number == 1
    assert [r.design for r in flood.revisions("frost")] == [design("47k")]


def test_a_missing_revision_says_which_there_are(flood: Store, design: Callable, sheet: Callable, plain: Plain) -> None:
    with pytest.raises(RevisionMissing) as refusal:
        flood.revision("flood")
    assert "no revision yet" in plain(refusal.value)
    flood.save("flood", Note("a"), sheet(design()))
    with pytest.raises(RevisionMissing) as refusal:
        flood.branch("flood", 2)
    assert "only r1" in plain(refusal.value)
    flood.save("flood", Note("b"), sheet(design()))
    for number in (0, -1, 3, 10**30, -(10**30)):
        with pytest.raises(RevisionMissing) as refusal:
            flood.revision("flood", number)
        assert "r1 to r2" in plain(refusal.value)


def test_margins_of_another_state_are_refused(flood: Store, design: Callable, sheet: Callable, plain: Plain) -> None:
    stale = sheet(design(), driver=0.2)
    flood.edit("flood", "R8", design("22k"))
    with pytest.raises(MarginsRefused) as refusal:
        flood.save("flood", Note("a"), stale)
    assert "compute them again" in plain(refusal.value)
    assert flood.revisions("flood") == []
    assert flood.draft("flood").edits == 1


@pytest.mark.parametrize(
    ("note", "says"),
    [
        (Note(""), "one line"),
        (Note("  \n "), "one line"),
        (Note("two\nlines"), "one line"),
        (Note("a", symptom="bell \x07"), "symptom holds a control character"),
        (Note("a", next="\ud800"), "next holds a control character"),
    ],
)
def test_a_note_that_cannot_be_kept_saves_nothing(
    flood: Store, design: Callable, sheet: Callable, plain: Plain, note: Note, says: str
) -> None:
    with pytest.raises(NoteRefused) as refusal:
        flood.save("flood", note, sheet(design()))
    assert says in plain(refusal.value)
    assert flood.revisions("flood") == []


def test_results_are_added_below_and_the_hash_stays(flood: Store, design: Callable, sheet: Callable) -> None:
    saved = flood.save("flood", Note("a", prediction="91 s"), sheet(design()))
    flood.add_note("flood", 1, "result", "93 s at 20 C")
    again = flood.add_note("flood", 1, "result", "97 s at 40 C")
    again = flood.add_note("flood", 1, "prediction", " 95 s at 40 C ")
    assert again.note.result == "93 s at 20 C\n97 s at 40 C"
    assert again.note.prediction == "91 s\n95 s at 40 C"
    assert [entry.text for entry in again.added] == ["93 s at 20 C", "97 s at 40 C", "95 s at 40 C"]
    assert isinstance(again.added[0], NoteEntry)
    assert again.added[0].added < again.added[1].added
    assert (again.hash, again.saved) == (saved.hash, saved.saved)
    assert flood.revisions("flood") == [again]
    assert verify(flood) == []


@pytest.mark.parametrize(
    ("number", "field", "text", "refusal"),
    [
        (1, "line", "x", NoteRefused),
        (1, "id", "x", NoteRefused),
        (1, "result", "  ", NoteRefused),
        (1, "result", "\x1b[2J", NoteRefused),
        (2, "result", "x", RevisionMissing),
    ],
)
def test_an_addition_that_cannot_be_kept_adds_nothing(
    flood: Store, design: Callable, sheet: Callable, plain: Plain, number: int, field: str, text: str, refusal: type
) -> None:
    flood.save("flood", Note("a"), sheet(design()))
    with pytest.raises(refusal) as raised:
        flood.add_note("flood", number, field, text)
    assert plain(raised.value)
    assert flood.revision("flood").added == ()


def test_every_place_but_the_first_line_can_be_added_to() -> None:
    assert ("line", *ADDABLE) == tuple(asdict(Note("x")))


def test_the_hash_can_be_computed_without_the_program(flood: Store, design: Callable, sheet: Callable) -> None:
    """SHA-256 (FIPS 180-4) over each text after its length as 8 bytes: what an auditor would write down again."""
    flood.save("flood", Note("a"), sheet(design(), driver=0.2))
    flood.edit("flood", "R8", design("22k"))
    flood.save("flood", Note("b", symptom="Ωhm"), sheet(design("22k"), driver=0.3))
    parent = ""
    for revision in flood.revisions("flood"):
        note = json.dumps(asdict(revision.note), sort_keys=True, separators=(",", ":"), ensure_ascii=False)
        margins = json.dumps(revision.sheet.as_json(), sort_keys=True, separators=(",", ":"), ensure_ascii=False)
        document = revision.design.canonical().decode()
        data = b""
        for text in ("revision", parent, str(revision.number), revision.saved, document, note, margins):
            data += len(text.encode()).to_bytes(8, "big") + text.encode()
        assert revision.hash == hashlib.sha256(data).hexdigest()
        parent = revision.hash


@given(st.lists(st.text(max_size=3), min_size=5, max_size=5), st.lists(st.text(max_size=3), min_size=5, max_size=5))
def test_different_texts_have_different_hashes(one: list[str], other: list[str]) -> None:
    def sealed(texts: list[str]) -> str:
        parent, saved, document, note, margins = texts
        return revision_hash(parent, 1, saved, document, note, margins)

    assert (sealed(one) == sealed(other)) == (one == other)
    shifted = [one[0] + "x", *one[1:]], [one[0], "x" + one[1], *one[2:]]
    assert sealed(shifted[0]) != sealed(shifted[1])
