"""A demo's history as steps, and how it is put on the shelf: every edit and save through the store's own functions."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from importlib.resources import files
from typing import Any

from ...engine import edit
from ...engine.design.document import Design
from ...engine.results import MarginSheet
from ...storage import Note, Store

Edit = Callable[[Design], Design]


def set_value(ref: str, value: str) -> tuple[str, Edit]:
    """The edit that gives a part another value, with its label."""
    return f"{ref} {value}", lambda design: edit.with_value(design, ref, value)


def with_fields(design: Design, ref: str, fields: Mapping[str, object]) -> Design:
    """A copy with several fields of a part written."""
    for field, value in fields.items():
        design = edit.with_field(design, ref, field, value)
    return design


def with_another(design: Design, stage: str, role: str, part: dict[str, Any]) -> Design:
    """A copy with another part in the place of the one of its designator, in the role that this had."""
    ref = part["ref"]
    return edit.with_role(edit.with_part(edit.without_part(design, ref), stage, part), stage, role, ref)


@dataclass(frozen=True)
class Step:
    """One revision: the revision it goes on from (None for the first), its edits with their labels, and its note."""

    note: Note
    edits: tuple[tuple[str, Edit], ...] = ()
    parent: int | None = None


@dataclass(frozen=True)
class Demo:
    """A demo design: its name, also that of its first document, and the steps that led to the last revision.

    ``lanes`` are the random units of its shipped margins.
    """

    name: str
    steps: Sequence[Step]
    lanes: int = 1000

    def first(self) -> Design:
        """The document of the first revision."""
        return Design.load(_text(f"{self.name}.json"))

    def designs(self) -> Iterator[Design]:
        """The document of every revision in order."""
        made: list[Design] = []
        for step in self.steps:
            design = self.first() if step.parent is None else made[step.parent - 1]
            for _, change in step.edits:
                design = change(design)
            made.append(design)
            yield design

    def sheets(self) -> list[MarginSheet]:
        """The margins of every revision, computed by ``recompute`` and shipped, so that opening needs no solver."""
        return [MarginSheet.from_json(sheet) for sheet in json.loads(_text(f"{self.name}_margins.json"))]

    def put_on(self, store: Store) -> bool:
        """Make the history in the store; False, with nothing done, when the shelf has a design of that name.

        A history of which only the beginning is there, because its making was cut off, is carried on.
        """
        made = 0
        if any(row.name == self.name for row in store.designs()):
            kept = [revision.content for revision in store.revisions(self.name)]
            made = len(kept)
            ours = [design.content for design in self.designs()]
            cut_off = made < len(ours) and kept == ours[:made]
            if not cut_off or (made == 0 and store.draft(self.name).design.content != ours[0]):
                return False
        else:
            store.create(self.name, self.first())
        for number, (step, sheet) in enumerate(zip(self.steps, self.sheets(), strict=True), 1):
            if number <= made:
                continue
            if step.parent is not None and (step.parent != number - 1 or number == made + 1):
                store.branch(self.name, step.parent)
            for label, change in step.edits:
                store.edit(self.name, label, change(store.draft(self.name).design))
            store.save(self.name, step.note, sheet)
        return True


def _text(name: str) -> str:
    return (files(__package__) / name).read_text("utf-8")
