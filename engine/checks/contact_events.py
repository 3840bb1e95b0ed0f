"""Contacts that requirements are about: which ones, how long they bounce, and which of their states is the event."""

from __future__ import annotations

from collections.abc import Iterator

from ..design.part import Part
from ..design.requirement import Requirement
from ..design.sequence import ContactEvent
from ..errors import CircuitError
from ..quantity import read
from .check import Check
from .view import View


def contacts(check: Check, view: View) -> Iterator[tuple[Requirement, Part]]:
    """The contact that a requirement names; one that names none is about every contact that has the role."""
    for requirement in view.design.requirements:
        if requirement.check != check.slug:
            continue
        if requirement.of is None:
            found = [part for _, _, part in view.with_role("contact") if part.kind == "contact"]
            yield from ((requirement, part) for part in found if part.operated_by is None)
            continue
        if not view.design.has_part(requirement.of):
            raise CircuitError(f'requirement {check.slug}: write "of", the contact it is about, such as "S1"')
        part = view.design.part(requirement.of)
        if part.kind != "contact" or part.operated_by is not None:
            raise CircuitError(f"requirement {check.slug} of {part.ref}: it is no contact that events move; name one")
        yield requirement, part


def longest_bounce(view: View, requirement: Requirement | None, part: Part) -> float | None:
    """Of the requirement, of the contact's data, or of an event of the contact in any sequence."""
    if requirement is not None and requirement.max is not None:
        return view.limit(requirement, "max", "s")
    datum = view.datum(part, "bounce", "s")
    if datum is not None:
        return datum.high
    events = [e for s in view.design.sequences.values() for e in s.events if isinstance(e, ContactEvent)]
    lasting = [read(e.bounce.for_, "s") for e in events if e.part == part.ref and e.bounce is not None]
    return view.noted(f"bounce of {part.ref}", max(lasting), "s", "its events") if lasting else None


def states(view: View, sequence: str, part: Part) -> tuple[str, str]:
    """The states of a contact in its event and at rest: what the sequence first does with it, else its form says."""
    for event in view.design.sequences[sequence].events:
        if isinstance(event, ContactEvent) and event.part == part.ref:
            return ("closed", "open") if event.event == "close" else ("open", "closed")
    return ("open", "closed") if part.form == "break" else ("closed", "open")
