"""What the store must hold after keys on the bench: the same pure edits as the program's, and what the screen says."""

from __future__ import annotations

import random
from collections.abc import Sequence
from dataclasses import dataclass, replace

from stagebook.engine import edit
from stagebook.engine.design.document import Design

REF = "R1"
VALUES = ("4k7", "6k8", "22k", "47k", "82k", "120k", "330k")
Content = tuple[str, tuple[tuple[str, str], ...]]


def divider(name: str, value: str = "10k") -> Design:
    """Two resistors: its figures are there at once, uncompiled too."""
    document = {
        "stagebook": 1,
        "name": name,
        "conditions": {"supply": "6 V", "ambient": "25 C"},
        "stages": [
            {
                "name": "divider",
                "kind": "free",
                "parts": [
                    {"ref": REF, "kind": "resistor", "pins": {"a": "supply", "b": "half"}, "value": value},
                    {"ref": "R2", "kind": "resistor", "pins": {"a": "half", "b": "0V"}, "value": "10k"},
                ],
            }
        ],
        "sequences": {"alarm": {"events": [{"at": "0 s", "event": "connect supply", "rise": "1 us"}], "ends": "1 ms"}},
    }
    return Design.load(document)


@dataclass(frozen=True)
class Bench:
    """A draft, what undo and redo lead to, and the revisions as (content, line of the note)."""

    design: Design
    past: tuple[Design, ...] = ()
    future: tuple[Design, ...] = ()
    saved: tuple[tuple[str, str], ...] = ()

    @property
    def content(self) -> Content:
        """What can be read from a store."""
        return self.design.content, self.saved

    def edited(self, after: Design) -> Bench:
        """After an edit."""
        return replace(self, design=after, past=(*self.past, self.design), future=())


@dataclass(frozen=True)
class Deed:
    """Keys, what the screen says when it is done, and the bench then. ``saves`` may ask whether to wait for figures."""

    keys: str
    says: str
    after: Bench
    saves: bool = False


def deed(chance: random.Random, bench: Bench, kind: str, said: Sequence[str]) -> Deed:
    """A deed of this kind where it can be done, else a value; never one that says what was ``said`` before: the screen
    may pass over what comes between, and the older words would be taken for the newer ones."""
    ways = {"type": _typed, "step": _stepped, "undo": _undone, "redo": _redone, "save": _saved}
    for way in (ways[kind], *[_typed] * 20):
        found = way(chance, bench)
        if found is not None and found.says not in said:
            return found
    raise AssertionError("twenty values in a row were there before")


def _value(design: Design) -> str:
    return design.part(REF).value or ""


def _typed(chance: random.Random, bench: Bench) -> Deed | None:
    value = chance.choice([value for value in VALUES if value != _value(bench.design)])
    return Deed(f"{value}\r", f" {REF} {value} ", bench.edited(edit.with_value(bench.design, REF, value)))


def _stepped(chance: random.Random, bench: Bench) -> Deed | None:
    key, direction = chance.choice(((".", 1), (",", -1)))
    after = edit.stepped_value(bench.design, REF, direction)
    return Deed(key, f" {REF} {_value(after)} ", bench.edited(after))


def _undone(chance: random.Random, bench: Bench) -> Deed | None:
    if not bench.past:
        return None
    *past, before = bench.past
    after = replace(bench, design=before, past=tuple(past), future=(bench.design, *bench.future))
    return Deed("u", f" taken back: {REF} {_value(bench.design)} ", after)


def _redone(chance: random.Random, bench: Bench) -> Deed | None:
    if not bench.future:
        return None
    again, *future = bench.future
    after = replace(bench, design=again, past=(*bench.past, bench.design), future=tuple(future))
    return Deed("r", f" done again: {REF} {_value(again)} ", after)


def _saved(chance: random.Random, bench: Bench) -> Deed | None:
    if bench.saved and bench.saved[-1][0] == bench.design.content:
        return None  # asked twice where nothing has changed
    line = f"because {chance.randrange(10**6)}"  # in place of what an earlier sitting may have begun
    after = replace(bench, saved=(*bench.saved, (bench.design.content, line)))
    return Deed(f"s\x15{line}\r", f" saved as r{len(after.saved)}", after, saves=True)
