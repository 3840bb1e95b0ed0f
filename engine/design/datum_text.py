"""A datum as one line of text, as a form shows and takes it: ``200 .. 300 .. 450 at 2 mA (datasheet)``.

Three numbers are min, typical and max, two are min and max, one is typical; ``<= 5 uA`` is a max and ``>= 60`` a min
alone. A place between the dots may stay empty: ``.. 0.1 V .. 0.25 V`` has no min.
"""

from __future__ import annotations

import json
from typing import Any, get_args

from ..errors import DesignError
from .datum import Datum, Entry, Source

SOURCES: tuple[str, ...] = get_args(Source)


def written(entry: Entry | None) -> str:
    """The entry as one line; what is no datum stands as JSON, a missing one as ''."""
    if entry is None:
        return ""
    if isinstance(entry, Datum):
        return _datum(entry)
    if isinstance(entry, str):
        return entry
    return json.dumps(entry, default=lambda inner: inner.model_dump(mode="json", exclude_unset=True))


def _datum(datum: Datum) -> str:
    low, typical, high = ("" if value is None else str(value) for value in (datum.min, datum.typical, datum.max))
    if typical and not low and not high:
        text = typical
    elif low and high and not typical:
        text = f"{low} .. {high}"
    elif not typical and (low or high):
        text = f">= {low}" if low else f"<= {high}"
    else:
        text = f"{low} .. {typical} .. {high}"
    condition = "" if datum.condition is None else f" at {datum.condition}"
    source = "" if datum.source is None else f" ({datum.source})"
    return " ".join(f"{text}{condition}{source}".split())


def understood(text: str, source: Source | None = None) -> dict[str, Any]:
    """The datum that a line says, as a document holds it; ``source`` is whose it is where the line does not say.

    Raises DesignError that says how to write it.
    """
    body, said = text.strip(), source
    if body.endswith(")") and "(" in body:
        body, _, mark = body[:-1].rpartition("(")
        if mark.strip() not in SOURCES:
            raise DesignError(f"source '{mark.strip()}' is not known; write one of {', '.join(SOURCES)}")
        said = mark.strip()  # type: ignore[assignment]
    body, _, condition = body.strip().partition(" at ")
    found: dict[str, Any] = {}
    if body.startswith(("<=", ">=")):
        found["max" if body[0] == "<" else "min"] = body[2:].strip()
    else:
        places = [place.strip() for place in body.split("..")]
        names = {1: ("typical",), 2: ("min", "max"), 3: ("min", "typical", "max")}.get(len(places))
        if names is None:
            raise DesignError(f"{text!r} has {len(places)} numbers; write min .. typical .. max")
        found.update({name: place for name, place in zip(names, places, strict=True) if place})
    if not any(found.values()):
        raise DesignError(f"{text!r} holds no number; write it like 200 .. 300 .. 450 at 2 mA (datasheet)")
    if condition.strip():
        found["condition"] = condition.strip()
    if said is not None:
        found["source"] = said
    return found
