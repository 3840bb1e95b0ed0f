"""Questions about a stage of the catalogue: which kind, and what is asked of it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from textual.app import App

from ...engine import edit
from ...engine.design.document import Design
from ...engine.errors import DesignError, EngineError
from ...engine.stages.kind import Wire
from ...engine.stages.making import place_after, with_catalogue_stage
from ...engine.stages.row import SUPPLY, Choice, checked, kind_named, usual_name
from ..stage_text import hint, kind_choices, setting_label
from .design_questions import Put, ask_design
from .dialog import Answers, Field, Form, Pick

_FREE = "free"
_PORT = "port-"
_SETTING = "asked-"


def ask_kind(app: App[Any], title: str, chosen: Callable[[str], None], *, free: bool = False) -> None:
    """Which kind of the catalogue; the free stage where ``free``."""
    rows = [(_FREE, "free stage                 without parts: they are put in by hand")] if free else []

    def picked(key: str | None) -> None:
        if key is not None:
            chosen(key)

    app.push_screen(Pick(title, [*rows, *kind_choices()]), picked)


def ask_settings(
    app: App[Any],
    choice: Choice,
    chosen: Callable[[Choice], None],
    tried: Callable[[Choice], object] = checked,
) -> None:
    """Name and settings of a stage; those that cannot be read, or that ``tried`` raises EngineError for, keep the form
    open."""
    made: list[Choice] = []

    def refusal(answers: Answers) -> str | None:
        try:
            made.append(checked(_choice(choice.kind, answers)))
            tried(made[-1])
        except EngineError as error:
            return str(error)
        return None

    def done(answers: Answers | None) -> None:
        if answers is not None:
            chosen(made[-1])

    app.push_screen(Form(kind_named(choice.kind).title, setting_fields(choice), refusal), done)


def setting_fields(choice: Choice) -> list[Field]:
    """A line for the name and one for each setting, with what is usual where nothing was said yet."""
    kind = kind_named(choice.kind)
    fields = [Field("name", "name", choice.title(), "", "the stage's name in the chain; its nets begin with it")]
    for each in kind.settings:
        text = choice.settings.get(each.name, each.usual)
        fields.append(Field(_SETTING + each.name, setting_label(each.name), text, each.about, hint(kind, each.name)))
    return fields


def _choice(kind: str, answers: Answers) -> Choice:
    prefix = len(_SETTING)
    settings = {k[prefix:]: v.strip() for k, v in answers.items() if k.startswith(_SETTING) and v.strip()}
    return Choice(kind, answers["name"].strip(), settings)


def ask_stage(app: App[Any], design: Design, put: Put) -> None:
    """A stage at the end of the chain: of the catalogue, connected to what stands before it, or a free one."""

    def chosen(kind: str) -> None:
        if kind == _FREE:
            _ask_free_stage(app, design, put)
        else:
            _ask_catalogue_stage(app, design, kind, put)

    ask_kind(app, "a stage at the end of the chain: which kind?", chosen, free=True)


def _ask_free_stage(app: App[Any], design: Design, put: Put) -> None:
    def make(answers: Answers) -> tuple[str, Design]:
        name = answers["name"]
        if name in {stage.name for stage in design.stages}:
            raise DesignError(f"there is a stage {name} already; write another name")
        return f"with stage {name}", edit.with_stage(design, {"name": name, "kind": "free"})

    fields = [Field("name", "name", "", "latch, timer, driver")]
    ask_design(app, design, "A free stage at the end of the chain", fields, make, put)


def _ask_catalogue_stage(app: App[Any], design: Design, kind: str, put: Put) -> None:
    found, place = kind_named(kind), place_after(design)
    taken = {stage.name for stage in design.stages}
    name = free_name(usual_name(kind), taken)
    nets = {Wire.IN: place.signal or place.quiet, Wire.RAIL: place.rail, Wire.QUIET: place.quiet, Wire.BASE: place.base}
    known = ", ".join(design.nets) or SUPPLY
    fields = setting_fields(Choice(kind, name))
    for port in found.ports:
        if port.wire in nets:
            words = f"{port.name}: {port.about}; a net: {known}"
            fields.append(Field(_PORT + port.name, f"{port.name} on net", nets[port.wire] or "", "", words))

    def make(answers: Answers) -> tuple[str, Design]:
        choice = checked(_choice(kind, answers))
        written = {k.removeprefix(_PORT): v for k, v in answers.items() if k.startswith(_PORT) and v}
        return f"with stage {choice.title()}", with_catalogue_stage(design, choice, written)

    ask_design(app, design, f"{found.title} at the end of the chain", fields, make, put)


def free_name(name: str, taken: set[str]) -> str:
    """The name itself, or with the lowest number that makes it a new one."""
    number = 1
    while (f"{name}-{number}" if number > 1 else name) in taken:
        number += 1
    return f"{name}-{number}" if number > 1 else name
