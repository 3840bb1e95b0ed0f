"""The parts in the drawer as lines. Pure."""

from __future__ import annotations

from collections.abc import Sequence

from ..engine.design.datum_text import written
from ..storage.values import MadePart
from .shown import Line, Span, columns, fit, line
from .widgets.row_list import Row

_KIND, _NAME, _VERSION = 15, 28, 4


def made_key(made: MadePart) -> str:
    """What names a version on the screen."""
    return f"{made.version} {made.name}"


def drawer_heading() -> Line:
    """The column heads."""
    return line(
        Span(columns((_KIND, _NAME, _VERSION, 12), ("kind", "part", "ver.", "what it says")).rstrip(), "strong")
    )


def drawer_rows(parts: Sequence[MadePart], kind: str | None, width: int) -> list[Row]:
    """One row a version; parts of the kind that is asked for stand first, the others are dim."""
    room = max(8, width - 2 - _KIND - _NAME - _VERSION - 3)
    ranked = sorted(parts, key=lambda made: made.kind != kind)
    rows = []
    for made in ranked:
        texts = (made.kind.replace("_", " "), made.name, str(made.version))
        tone = "" if kind is None or made.kind == kind else "dim"
        cells = columns((_KIND, _NAME, _VERSION), texts)
        rows.append(Row(made_key(made), line(Span(f"{cells} ", tone), Span(fit(says(made), room), tone))))
    return rows


def says(made: MadePart) -> str:
    """Class and own figures of a made part in one line."""
    document, part = made.document, made.part
    plain = [str(document[key]) for key in ("value", "tolerance") if key in document]
    name = [f"class {document['class']}"] if "class" in document else []
    own = [f"{key.replace('_', ' ')} {written(part.datum(key))}" for key in document.get("data", {})]
    return ", ".join([*plain, *name, *own])


def drawer_lines(made: MadePart) -> tuple[Line, Line]:
    """Two lines about one version."""
    first = f" {made.title}: {made.kind.replace('_', ' ')}, made {made.made}"
    return line(Span(first, "strong")), line(f" {says(made)}")
