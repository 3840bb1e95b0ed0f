"""The questions that make or change a part: which kind, which reference, which nets; which field, which text."""

from __future__ import annotations

import json
from collections.abc import Callable

from textual.app import App

from ...engine import edit
from ...engine.design.document import Design
from ...engine.design.part import Part, Stage
from ...engine.errors import EngineError
from ...engine.parts import kinds
from ...engine.parts.kind import Kind
from ..shown import fit
from .dialog import Answers, Field, Form, Pick


def ask_new_part(app: App[None], design: Design, stage: Stage, put: Callable[[str, Design], None]) -> None:
    """Asks for the kind, then for reference, value and nets; calls ``put`` with the reference and the new design."""

    def chosen(name: str | None) -> None:
        if name is not None:
            _ask_kind(app, design, stage, kinds()[name], put)

    rows = [(name, f"{fit(name.replace('_', ' '), 18)} {' '.join(kind.pins[0])}") for name, kind in _kinds()]
    app.push_screen(Pick(f"a part for {stage.name}: which kind?", rows), chosen)


def _kinds() -> list[tuple[str, Kind]]:
    return sorted(kinds().items())


def _ask_kind(app: App[None], design: Design, stage: Stage, kind: Kind, put: Callable[[str, Design], None]) -> None:
    nets = ", ".join(design.nets) or "supply, 0V"
    fields = [Field("ref", "reference", free_reference(design, kind))]
    fields += [
        Field(name, name, "", entry.about) for name, entry in kind.fields.items() if _asked_for(name, entry.needed)
    ]
    fields += [Field(f"pin-{pin}", f"pin {pin} on", "", f"a net: {nets}") for pin in kind.pins[0]]
    made: list[tuple[str, Design]] = []

    def refusal(answers: Answers) -> str | None:
        ref = answers["ref"].strip()
        if design.has_part(ref):
            return f"there is a part {ref} already; write another reference, or change that part with e"
        part = {
            "ref": ref,
            "kind": kind.name,
            "pins": {pin: answers[f"pin-{pin}"].strip() for pin in kind.pins[0]},
        }
        given = {name: answers[name].strip() for name in kind.fields if answers.get(name, "").strip()}
        try:
            made.append((ref, edit.with_part(design, stage.name, {**part, **given})))
        except EngineError as error:
            return str(error)
        return None

    def done(answers: Answers | None) -> None:
        if answers is not None and made:
            put(*made[-1])

    app.push_screen(Form(f"{kind.name.replace('_', ' ')} for {stage.name}", fields, refusal), done)


def _asked_for(name: str, needed: bool) -> bool:
    return needed or name in {"value", "tolerance", "class"}


def free_reference(design: Design, kind: Kind) -> str:
    """The first letter code of the kind with the lowest number that no part has."""
    number = 1
    while design.has_part(f"{kind.letters[0]}{number}"):
        number += 1
    return f"{kind.letters[0]}{number}"


def ask_field(app: App[None], part: Part, write: Callable[[str, str], bool]) -> None:
    """Asks for a field of the part and its new text; ``write`` says whether it was taken."""
    rows = [(name, f"{fit(name, 28)} {text}") for name, text in field_texts(part)]

    def chosen(name: str | None) -> None:
        if name is not None:
            _ask_text(app, part, name, dict(field_texts(part))[name], write)

    app.push_screen(Pick(f"{part.ref}: which field?", rows), chosen)


def _ask_text(app: App[None], part: Part, name: str, text: str, write: Callable[[str, str], bool]) -> None:
    def done(answers: Answers | None) -> None:
        if answers is not None:
            write(name, answers["text"].strip())

    app.push_screen(Form(f"{part.ref}, {name}", [Field("text", name, text)]), done)


def field_texts(part: Part) -> list[tuple[str, str]]:
    """Every field and datum that the part has or its kind reads, with its text as typed; '' where it is not given."""
    dumped = part.model_dump(mode="json", by_alias=True, exclude_unset=True)
    for name in ("ref", "kind", "pins"):
        dumped.pop(name, None)
    found: dict[str, str] = {}
    for name, entry in dumped.items():
        if name in {"data", "law"}:
            for key, inner in entry.items():
                found.update(_texts(f"{name}.{key}", inner))
        else:
            found.update(_texts(name, entry))
    kind = kinds().get(part.kind)
    if kind is not None:
        for name in kind.fields:
            if not any(each == name or each.startswith(f"{name}.") for each in found):
                found[name] = ""
        for key in kind.data:
            known = f"data.{key}"
            if key not in found and not any(each == known or each.startswith(f"{known}.") for each in found):
                found[known] = ""
    return list(found.items())


def _texts(name: str, entry: object) -> dict[str, str]:
    """A field as one line of text, or one line for each text inside of it."""
    if isinstance(entry, dict):
        found: dict[str, str] = {}
        for key, inner in entry.items():
            found.update(_texts(f"{name}.{key}", inner))
        return found
    return {name: entry if isinstance(entry, str) else json.dumps(entry)}
