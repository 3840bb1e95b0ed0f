"""One line for a document that is refused: stage, part, field, what is wrong, what to write instead."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from difflib import get_close_matches
from types import UnionType
from typing import Annotated, Any, Final, Literal, Union, get_args, get_origin

from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from .clause import REMEDIES

Loc = tuple[int | str, ...]
LONGEST: Final = 600
"""Characters of a complaint; what the document holds is repeated in it."""


def complaint(refusal: ValidationError, document: Mapping[str, Any], model: type[BaseModel]) -> str:
    """The most telling of pydantic's errors as one line; the number of further ones is added."""
    errors = refusal.errors(include_url=False)
    chosen = min(errors, key=lambda error: error["type"] != "extra_forbidden")
    path, owner = _followed(chosen, document, model)
    where = f"{_place(path, document)}: " if path else ""
    more = f" (and {len(errors) - 1} more)" if len(errors) > 1 else ""
    words = _plain(f"{where}{_words(chosen, owner, path[-1] if path else '')}", LONGEST)
    return " ".join(f"{words}{more}".split())


def _followed(error: ErrorDetails, document: Mapping[str, Any], model: type[BaseModel]) -> tuple[Loc, _Owner]:
    """The path of an error as the document has it, without pydantic's own tags, and the clause that it ends in."""
    value: Any = document
    types: list[Any] = [model]
    path: list[int | str] = []
    owner = _Owner(types, None)
    for place, step in enumerate(error["loc"]):
        inside = isinstance(value, Mapping) and step in value
        inside = inside or (isinstance(value, list | tuple) and isinstance(step, int) and step < len(value))
        if inside or (error["type"] == "missing" and place == len(error["loc"]) - 1):
            owner = _Owner(types, step)
            types = [found for each in types for found in _stepped(each, step)]
            value = value[step] if inside else None
            path.append(step)
        else:
            types = [each for each in types if _tagged(each, step)] or types
    return tuple(path), owner


class _Owner:
    """The clauses that may stand around a field, and the field itself where one of them knows it."""

    def __init__(self, types: Sequence[Any], step: int | str | None) -> None:
        self.clauses = [each for each in types if isinstance(each, type) and issubclass(each, BaseModel)]
        self.known = [name for clause in self.clauses for name in _named(clause)]
        self.field = next((_named(clause)[str(step)] for clause in self.clauses if str(step) in _named(clause)), None)

    @property
    def example(self) -> str:
        examples = list(self.field.examples or ()) if self.field else []
        if self.field and not examples:
            examples = [e for info in self.field.metadata if isinstance(info, FieldInfo) for e in info.examples or ()]
        return _shown(examples[0]) if examples else ""


def _named(clause: type[BaseModel]) -> dict[str, FieldInfo]:
    return {field.alias or name: field for name, field in clause.model_fields.items()}


def _members(annotation: Any) -> Iterator[Any]:
    """The simple types in an annotation, with unions and metadata taken apart."""
    origin = get_origin(annotation)
    if origin is Annotated:
        yield from _members(get_args(annotation)[0])
    elif origin in (Union, UnionType):
        for each in get_args(annotation):
            yield from _members(each)
    else:
        yield annotation


def _stepped(annotation: Any, step: int | str) -> list[Any]:
    """What may stand at ``step`` (a field, a key, an index) of a value of this type."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        field = _named(annotation).get(str(step))
        return [] if field is None else list(_members(field.annotation))
    arguments = get_args(annotation)
    origin = get_origin(annotation)
    if origin is dict:
        return list(_members(arguments[1]))
    if origin is tuple and arguments:
        index = step if isinstance(step, int) and Ellipsis not in arguments else 0
        return list(_members(arguments[min(index, len(arguments) - 1)]))
    return []


def _tagged(annotation: Any, tag: object) -> bool:
    if not (isinstance(annotation, type) and issubclass(annotation, BaseModel)):
        return False
    fields = annotation.model_fields.values()
    return any(get_origin(f.annotation) is Literal and tag in get_args(f.annotation) for f in fields)


def _place(path: Loc, document: Mapping[str, Any]) -> str:
    """Where a path leads, in the user's words: ``stage driver, part R7, field value``."""
    words: list[str] = []
    rest = list(path)
    value: Any = document
    while len(rest) > 1 and rest[0] in _HOLDERS:
        holder, step = str(rest[0]), rest[1]
        value = value[holder]
        value = value[step] if isinstance(value, Mapping) and step in value else _item(value, step)
        words.append(f"{_HOLDERS[holder]} {_label(holder, step, value)}")
        rest = rest[2:]
    if rest:
        field = ".".join(f"entry {step + 1}" if isinstance(step, int) else _plain(step) for step in rest)
        words.append(f"field {field}")
    return ", ".join(words) or "the document"


_HOLDERS = {
    "stages": "stage",
    "parts": "part",
    "sequences": "sequence",
    "events": "event",
    "moments": "moment",
    "requirements": "requirement",
    "strays": "stray",
}


def _item(value: Any, step: int | str) -> Any:
    return value[step] if isinstance(value, list | tuple) and isinstance(step, int) and step < len(value) else None


def _label(holder: str, step: int | str, value: Any) -> str:
    """A name for one entry of a list or table: its own where it has one, else its number."""
    if isinstance(step, str):
        return _plain(step)
    entry = value if isinstance(value, Mapping) else {}
    names = {
        "stages": [entry.get("name")],
        "parts": [entry.get("ref")],
        "events": [entry.get("event"), entry.get("part")],
        "requirements": [entry.get("check"), entry.get("of")],
        "strays": list(entry["between"]) if isinstance(entry.get("between"), list | tuple) else [],
    }.get(holder, [])
    known = " ".join(_plain(name) for name in names if isinstance(name, str) and name.strip())
    if holder in ("stages", "parts") and known:
        return known
    return f"{step + 1} ({known})" if known else f"number {step + 1}"


def _words(error: ErrorDetails, owner: _Owner, step: int | str) -> str:
    """What is wrong and what to write; ``step`` is the last of the path."""
    kind, context, given, name = error["type"], error.get("ctx", {}), error["input"], str(step)
    example = f" such as {owner.example}" if owner.example else ""
    if kind == "missing" and isinstance(step, int):
        return f"an entry is missing; write at least {step + 1}"
    if kind == "union_tag_not_found" and "'event'" in str(context["discriminator"]) and isinstance(given, Mapping):
        return '\'event\' is missing; write "event": "close" or another of the events'
    if kind == "missing":
        written = owner.example or "..."
        return f"'{name}' is missing; write \"{name}\": {written}"
    if kind == "extra_forbidden":
        return _unknown(name, owner.known)
    if kind == "value_error":
        return str(context["error"])
    if kind in ("literal_error", "union_tag_invalid"):
        return _not_among(given, context, owner)
    if kind == "string_pattern_mismatch":
        return f"{_shown(given)} cannot stand here; {REMEDIES.get(str(context['pattern']), 'write another text')}"
    if kind == "string_too_long":
        return f"the text has {len(given)} characters; write at most {context['max_length']}"
    if kind == "too_long":
        return f"there are {context['actual_length']} entries; write at most {context['max_length']}"
    if kind == "too_short":
        return f"there are too few entries; write at least {context['min_length']}{example}"
    if kind == "union_tag_not_found":
        return f"{_shown(given)} cannot stand here; write {_shape_wanted(str(context['discriminator']))}"
    wanted = _WANTED.get(kind, "another value").format(**context)
    return f"{_shown(given)} cannot stand here; write {wanted}{example}"


def _unknown(name: str, known: Sequence[str]) -> str:
    near = get_close_matches(name, known, 1, 0.6)
    if near:
        return f"unknown field '{_plain(name)}'; write '{near[0]}'"
    listed = ", ".join(known[:14]) + (" ..." if len(known) > 14 else "")
    under = ", or put it under 'data'" if "data" in known else ""
    return f"unknown field '{_plain(name)}'; leave it out{under} (known here: {listed})"


def _not_among(given: Any, context: Mapping[str, Any], owner: _Owner) -> str:
    allowed = context.get("expected") or context.get("expected_tags") or ""
    told = context.get("tag", given)
    near = get_close_matches(str(told), str(allowed).replace("'", "").replace(" or ", ", ").split(", "), 1, 0.6)
    meant = f"'{near[0]}' (one of {allowed})" if near else allowed
    if owner.field is not None and "stagebook" in owner.known and allowed == "1":
        meant = "1, the version of the document that this program reads"
    return f"{_shown(told)} is not known here; write {meant}"


_WANTED = {
    "string_type": "a text in quotes",
    "string_unicode": "a text in valid UTF-8",
    "int_type": "a whole number",
    "bool_type": "true or false",
    "dict_type": "an object {{...}}",
    "model_type": "an object {{...}}",
    "model_attributes_type": "an object {{...}}",
    "tuple_type": "a list [...]",
    "finite_number": "a finite number",
    "greater_than_equal": "a number from {ge} on",
    "less_than_equal": "a number up to {le}",
}
_SHAPES = {
    "_entry_shape": 'a text such as "150 mA", a number, or {"typical": ..., "max": ..., "source": ...}',
    "_condition_shape": 'a text such as "6 V", or {"min": ..., "nominal": ..., "max": ...}',
    "_moment_shape": 'a time such as "0.9 s", or {"after": "LS1 on", "by": "0.5 s"}',
}
"""What to write where several shapes are taken, by the function that tells the shapes apart."""


def _shape_wanted(discriminator: str) -> str:
    return next((words for shape, words in _SHAPES.items() if shape in discriminator), "a text in quotes")


def _shown(value: Any) -> str:
    """A value as the document writes it, cut to a readable length."""
    try:
        text = json.dumps(value, ensure_ascii=False)
    except (TypeError, ValueError):
        text = type(value).__name__
    return _plain(text)


def _plain(text: object, most: int = 100) -> str:
    """A text that fits into one line of any terminal."""
    shown = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in str(text))
    return shown if len(shown) <= most else shown[: most - 3] + "..."
