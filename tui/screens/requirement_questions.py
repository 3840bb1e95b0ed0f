"""Questions about the requirements of a design: what is wanted of a duration, an order, a sound level and so on."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from textual.app import App

from ...engine import edit
from ...engine.design.document import Design
from ...engine.design.requirement import Requirement
from ...engine.errors import DesignError
from ..shown import fit
from .design_questions import Put, ask_design, written
from .dialog import Answers, Field, Pick

COMMON = {"sequence": "alarm", "required": "10 %", "derating": "0.8", "reason": "why one of these differs"}
"""Fields that every requirement may have, with an example."""
_NEW = "new "


def ask_requirement(app: App[Any], design: Design, put: Put) -> None:
    """A requirement to change, or a check that one is to be written for."""
    # Imported here: the checks load the compiler.
    from ...engine.checks import catalogue

    checks = catalogue()
    rows = [(str(at), f"{at + 1} {words(each)}") for at, each in enumerate(design.requirements)]
    rows += [
        (
            f"{_NEW}{check.slug}",
            f"{fit(f'{_NEW}{check.slug}', 24)} {check.number} {check.title}: {', '.join(check.reads)}",
        )
        for check in checks.values()
        if check.reads
    ]

    def chosen(key: str | None) -> None:
        if key is None:
            return
        at = None if key.startswith(_NEW) else int(key)
        slug = key.removeprefix(_NEW) if at is None else design.requirements[at].check
        check = checks.get(slug)
        title = slug if check is None else f"{check.number} {check.title}"
        _ask_fields(app, design, slug, title, {} if check is None else check.reads, at, put)

    app.push_screen(Pick("requirements of this design: which one?", rows), chosen)


def words(requirement: Requirement) -> str:
    """A requirement in one line: ``duration LS1  min 60 s  max 120 s``."""
    given = _given(requirement)
    head = " ".join(filter(None, (given.pop("check"), given.pop("of", ""))))
    return "  ".join((head, *(f"{name} {text}" for name, text in given.items())))


def _given(requirement: Requirement) -> dict[str, str]:
    dumped = requirement.model_dump(mode="json", by_alias=True, exclude_unset=True)
    return {name: str(entry) for name, entry in dumped.items() if entry is not None}


def _ask_fields(
    app: App[Any], design: Design, slug: str, title: str, reads: Mapping[str, str], at: int | None, put: Put
) -> None:
    known = {} if at is None else _given(design.requirements[at])
    own = {**reads, **COMMON}
    others = {name: "" for name in known if name not in own and name != "check"}
    fields = [Field(name, name, known.get(name, ""), example) for name, example in {**own, **others}.items()]

    def make(answers: Answers) -> tuple[str, Design]:
        given = {name: written(text) for name, text in answers.items() if text}
        if not given and at is None:
            raise DesignError(
                "nothing is written; fill in what is wanted, as the examples in brackets show, or leave with Esc"
            )
        if at is None:
            return f"wanted: {slug}", edit.with_requirement(design, {"check": slug, **given})
        if not given:
            return f"no longer wanted: {slug}", edit.without_requirement(design, at)
        return f"wanted: {slug}", edit.with_requirement_at(design, at, {"check": slug, **given})

    ask_design(app, design, f"{title}: what is wanted? Leaving all empty takes it out", fields, make, put)
