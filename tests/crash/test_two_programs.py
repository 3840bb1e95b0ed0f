"""Two windows on one design, as two programs in terminals of their own: told, looked at, taken over, killed."""

from __future__ import annotations

from pathlib import Path

import pytest

from stagebook.storage import Store, verify

from .bench_model import divider
from .program import Nursery, Program

pytestmark = pytest.mark.skipif(not Path("/proc/self/stat").exists(), reason="processes are watched as on Linux")


def step(program: Program, key: str, *answers: str) -> int:
    """Presses and waits until one of the answers is drawn."""
    at = len(program.text)
    program.press(key)
    return program.until(*answers, after=at)


def test_two_windows_write_over_nothing_of_each_other(tmp_path: Path, nursery: Nursery) -> None:
    path = tmp_path / "shelf.sqlite3"
    with Store.open(path) as store:
        store.create("flood", divider("flood"))
    with (
        Program("--store", path, home=tmp_path, start=nursery) as first,
        Program("--store", path, home=tmp_path, start=nursery) as second,
    ):
        for program in (first, second):
            program.until("> flood")
        step(first, "\r", " higher 11k")
        step(first, ".", " R1 11k ")

        step(second, "\r", "t take over")
        assert "is open in another sitting since" in second.text
        step(second, "l", "flood (only looked at)")
        step(second, ".", "Go on here")
        step(second, "n", " higher 12k")
        step(first, ".", " R1 12k ")
        step(second, ".", "Go on here")
        step(second, "y", " higher 13k")  # the newest state of the other, not the one that was looked at
        step(second, ".", " R1 13k ")

        step(first, "22k\r", "was taken over by another sitting")
        step(first, "y", "taken over; this is the state")
        step(first, "\x07", " higher 15k")  # what was being written is left
        step(first, "u", "taken back: R1 13k")
        step(second, ",", "was taken over by another sitting")
        second.press("n")

        first.kill()
        step(second, ".", "Go on here")  # whoever was overtaken reads the state anew, also when the other is dead
        step(second, "y", " higher 13k")
        second.press("\x11")
        assert second.ended() == 0

    with Program("--store", path, home=tmp_path, start=nursery) as third:
        third.until("> flood")
        step(third, "\r", " higher 13k")  # nobody is asked about
        step(third, "r", "done again: R1 13k")
        third.press("\x11")
        assert third.ended() == 0
    with Store.open(path) as store:
        draft = store.draft("flood")
        assert (draft.design.part("R1").value, draft.edits) == ("13k", 3)
        assert verify(store) == []
    assert not list(tmp_path.glob("*-sitting-*"))
