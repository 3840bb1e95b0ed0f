"""Questions whose answers make another design. A refused answer stays on the screen to be corrected."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping, Sequence
from typing import Any

from textual.app import App

from ...engine import edit
from ...engine.design.conditions import UNITS
from ...engine.design.document import Design
from ...engine.design.part import Part, Stage
from ...engine.errors import DesignError, EngineError
from ...engine.parts import kinds
from ...engine.parts.classes import CLASSES
from ...engine.parts.edited import same_pins
from ...engine.parts.kind import Kind
from ...engine.parts.suitability import unsuitable
from ...engine.results import CheckResult
from ...storage.values import MadePart
from ..drafting import refuse_newly_wrong
from ..refusal_text import for_form
from ..shown import fit, percent
from .dialog import Answers, Field, Form, Pick

Put = Callable[[str, Design], None]
"""Told what was done, in words, and the design that came of it."""

_ENDS = ("min", "nominal", "max")


def ask_design(
    app: App[Any],
    before: Design,
    title: str,
    fields: Sequence[Field],
    make: Callable[[Answers], tuple[str, Design]],
    put: Put,
) -> None:
    """A form whose answers ``make`` turns into words and a design; its refusals keep the form open, and so does what
    is wrong with that design and was not with the one ``before``."""
    made: list[tuple[str, Design]] = []

    def refusal(answers: Answers) -> str | None:
        try:
            words, after = make({name: text.strip() for name, text in answers.items()})
            refuse_newly_wrong(before, after)
        except EngineError as error:
            return for_form(str(error))
        made.append((words, after))
        return None

    def done(answers: Answers | None) -> None:
        if answers is not None:
            put(*made[-1])

    app.push_screen(Form(title, fields, refusal), done)


def ask_new_part(app: App[Any], design: Design, stage: Stage, put: Put, drawer: Sequence[MadePart] = ()) -> None:
    """A part: first its kind, then reference, value and nets. Its class may be the name of a part in the drawer."""

    choices = {f"{name} {' '.join(pins)}": (kind, pins) for name, kind in sorted(kinds().items()) for pins in kind.pins}

    def chosen(key: str | None) -> None:
        if key is not None:
            kind, pins = choices[key]
            made = {each.name: each for each in drawer if each.kind == kind.name}
            _ask_part(app, design, stage, kind, pins, put, made)

    rows = [(key, f"{fit(kind.name.replace('_', ' '), 18)} {' '.join(pins)}") for key, (kind, pins) in choices.items()]
    app.push_screen(Pick(f"a part for {stage.name}: which kind?", rows), chosen)


def _ask_part(
    app: App[Any],
    design: Design,
    stage: Stage,
    kind: Kind,
    pins: Sequence[str],
    put: Put,
    made: Mapping[str, MadePart],
) -> None:
    nets = ", ".join(design.nets) or "supply, 0V"
    asked = [name for name, entry in kind.fields.items() if entry.needed or name in {"value", "tolerance", "class"}]
    fields = [Field("ref", "reference", free_reference(design, kind))]
    classes = ", ".join([*CLASSES.get(kind.name, ()), *(f"{name} (drawer)" for name in made)])
    classes = f"such as {classes}" if classes else "a name of your own"
    fields += [Field(name, name, "", classes if name == "class" else kind.fields[name].about) for name in asked]
    fields += [Field(f"pin-{pin}", f"pin {pin} on", "", f"a net: {nets}") for pin in pins]

    def make(answers: Answers) -> tuple[str, Design]:
        ref = answers["ref"]
        if design.has_part(ref):
            raise DesignError(f"there is a part {ref} already; write another reference, or change that part with e")
        part = {"ref": ref, "kind": kind.name, "pins": {pin: answers[f"pin-{pin}"] for pin in pins}}
        given = {name: written(answers[name]) for name in asked if answers[name]}
        of_drawer = made.get(str(given.get("class", "")).removesuffix(" (drawer)"))
        if of_drawer is not None:
            del given["class"]
        plain = edit.with_part(design, stage.name, part)
        for name, text in given.items():
            plain = edit.with_field(plain, ref, name, text)
        if of_drawer is None:
            for field, words in unsuitable(plain.part(ref), kind):
                if field in asked:
                    raise DesignError(words)
            return f"with {ref}", plain
        return f"with {ref}", edit.with_made_part(plain, ref, of_drawer.document, of_drawer.title)

    ask_design(app, design, f"{kind.name.replace('_', ' ')} for {stage.name}", fields, make, put)


def free_reference(design: Design, kind: Kind) -> str:
    """The first letter code of the kind with the lowest number that no part has."""
    number = 1
    while design.has_part(f"{kind.letters[0]}{number}"):
        number += 1
    return f"{kind.letters[0]}{number}"


def ask_field(app: App[Any], design: Design, ref: str, put: Put) -> None:
    """Another field or datum of a part; an empty text takes it out."""
    part = design.part(ref)
    texts, examples = field_texts(part), {"class": _classes_words(part.kind)}
    others = same_pins(part, kinds())
    if others:
        texts["kind"], examples["kind"] = part.kind, f"with these pins also {', '.join(others)}"

    def chosen(name: str | None) -> None:
        if name is None:
            return

        def make(answers: Answers) -> tuple[str, Design]:
            text = answers["text"]
            return f"{ref} {name} {text or '-'}", edit.with_field(design, ref, name, written(text))

        example = examples.get(name) or "empty takes it out"
        hint = examples.get(name, "")
        ask_design(app, design, f"{ref}, {name}", [Field("text", name, texts[name], example, hint)], make, put)

    app.push_screen(Pick(f"{ref}: which field?", _rows(texts)), chosen)


def _classes_words(kind: str) -> str:
    """The generic classes of a kind, for a hint."""
    classes = CLASSES.get(kind)
    return f"such as {', '.join(classes)}; empty takes it out" if classes else ""


def field_texts(part: Part) -> dict[str, str]:
    """Every field and datum that the part has or its kind reads, with its text as typed; '' where it is not given."""
    dumped = part.model_dump(mode="json", by_alias=True, exclude_unset=True)
    found: dict[str, str] = {}
    for name, entry in dumped.items():
        if name in {"data", "law"}:
            for key, inner in entry.items():
                found.update(_texts(f"{name}.{key}", inner))
        elif name not in {"ref", "kind"}:
            found.update(_texts(name, entry))
    kind = kinds().get(part.kind)
    known = [] if kind is None else [*kind.fields, *(f"data.{key}" for key in kind.data if key not in kind.fields)]
    for name in known:
        if not any(each == name or each.startswith(f"{name}.") for each in found):
            found[name] = ""
    return found


def written(text: str) -> object:
    """What a text in a form stands for: a list or an object where it is written as one, None where it is empty."""
    if text[:1] in {"[", "{"} or text in {"true", "false"}:
        try:
            return json.loads(text)
        except ValueError as error:
            raise DesignError(f"{text!r} is not closed or quoted as JSON ({error}); write it like [1, 2]") from error
    return text or None


def _texts(name: str, entry: object) -> dict[str, str]:
    """A field as one line of text, or one line for each text inside of it."""
    if isinstance(entry, dict):
        return {key: text for inner in entry for key, text in _texts(f"{name}.{inner}", entry[inner]).items()}
    return {name: entry if isinstance(entry, str) else json.dumps(entry)}


def ask_condition(app: App[Any], design: Design, put: Put) -> None:
    """One end of a condition."""
    texts = condition_texts(design)

    def chosen(name: str | None) -> None:
        if name is None:
            return

        def make(answers: Answers) -> tuple[str, Design]:
            text = answers["text"]
            return f"{name} {text or '-'}", edit.with_condition(design, name, text or None)

        ask_design(app, design, name, [Field("text", name, texts[name], "empty takes it out")], make, put)

    app.push_screen(Pick("conditions that the design is judged in: which one?", _rows(texts)), chosen)


def condition_texts(design: Design) -> dict[str, str]:
    """Every end of every condition with its text as typed; '' where it is not given."""
    given = design.dump().get("conditions", {})
    found = {}
    for name in UNITS:
        condition = given.get(name, {})
        ends = {"nominal": condition} if isinstance(condition, str) else condition
        found.update({f"{name}.{end}": ends.get(end, "") for end in _ENDS})
    return found


def ask_required(app: App[Any], design: Design, check: CheckResult, put: Put) -> None:
    """The margin that this design requires of a kind of check; empty returns to the customary one."""
    slug = check.id.split(":")[0]
    now = f"{percent(check.required).lstrip('+')} %"
    _ask_entry(app, design, "required", slug, now, f"{check.title}: the margin that this design requires", put)


def _ask_entry(app: App[Any], design: Design, table: str, name: str, now: str, title: str, put: Put) -> None:
    """One entry of the tables of required margins and derating factors, with the reason why it differs."""
    reason = design.reasons.get(name, "")
    change = edit.with_required if table == "required" else edit.with_derating

    def make(answers: Answers) -> tuple[str, Design]:
        text = answers["text"]
        if (text, answers["reason"]) == (now, reason):
            return f"{table} {name} stays {now}", design
        return f"{table} {name} {text or '-'}", change(design, name, text or None, answers["reason"] or None)

    fields = [
        Field(
            "text", "required margin" if table == "required" else "factor", now, "empty returns to the customary one"
        ),
        Field("reason", "reason", reason, "why it may differ from the customary one"),
    ]
    ask_design(app, design, title, fields, make, put)


def ask_tables(app: App[Any], design: Design, put: Put) -> None:
    """A required margin or a derating factor of this design."""
    rows = table_rows(design)

    def chosen(key: str | None) -> None:
        if key is not None:
            table, name = key.split(" ")
            now, about = next((now, about) for of, each, now, about in rows if (of, each) == (table, name))
            _ask_entry(app, design, table, name, now.removesuffix(_CUSTOMARY).strip(), f"{about}: {table}", put)

    listed = [
        (f"{table} {name}", f"{fit(f'{table} {name}', 32)} {fit(now, 18)} {about}") for table, name, now, about in rows
    ]
    app.push_screen(Pick("derating factors and required margins of this design: which one?", listed), chosen)


_CUSTOMARY = " customary"


def table_rows(design: Design) -> list[tuple[str, str, str, str]]:
    """Table, name, what holds now, and what it is about: every derating factor, then every check's required margin."""
    # Imported here: the checks load the compiler.
    from ...engine.checks import catalogue
    from ...engine.checks.factors import FACTORS

    def now(table: Mapping[str, str], name: str, customary: str) -> str:
        return table.get(name) or customary + _CUSTOMARY

    rows = [("derating", n, now(design.derating, n, f"{f.customary:g}"), f.about) for n, f in FACTORS.items()]
    for check in catalogue().values():
        held = now(design.required, check.slug, f"{check.required * 100:.0f} %")
        rows.append(("required", check.slug, held, f"{check.number} {check.title}"))
    return rows


def _rows(texts: dict[str, str]) -> list[tuple[str, str]]:
    return [(name, f"{fit(name, 28)} {text}") for name, text in texts.items()]
