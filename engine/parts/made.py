"""Parts that the user makes of datasheet points, to be used in any design: what is kept, tried and copied.

A made part is a part of a document without its designator and its nets. What it does not say for itself it has from a
generic class; using it copies both into the design, each figure with its source, so that no later change of the class
or of the made part moves an old revision.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from ..design.document import Design
from ..design.part import Part
from ..errors import DesignError
from ..primitives.builder import Builder
from . import kinds
from .class_figure import SOURCE, ClassFigure
from .classes import CLASSES, POINTS, is_condition
from .figures import class_figures, class_points
from .kind import TEXT
from .suitability import unsuitable

OF_THE_PLACE = ("ref", "pins", "drawer", "operated_by", "follows", "setting", "waveform")
"""What a part has from its place in a design, not from its making."""
_PLAIN = ("value", "tolerance")
_STAND_IN = {"ohm": "1k", "F": "1u", "V": "6 V", "H": "1 mH"}


def kept(part: Part) -> dict[str, Any]:
    """A part of a design as a made part: what is its own, without what was copied from its class."""
    document = part.model_dump(mode="json", by_alias=True, exclude_unset=True)
    of_class = {} if _class_unknown(part) else class_figures(part)
    data = {
        key: datum
        for key, datum in document.pop("data", {}).items()
        if (key not in of_class or datum != _datum(of_class[key])) and not _copied(part, key, datum)
    }
    found = {key: value for key, value in document.items() if key not in OF_THE_PLACE}
    return found | ({"data": data} if data else {})


def _copied(part: Part, key: str, datum: Any) -> bool:
    """Whether points are those of the class."""
    points = class_points(part, key)
    return points is not None and datum == [list(point) for point in points.points]


def _class_unknown(part: Part) -> bool:
    return part.class_ not in (None, *CLASSES.get(part.kind, {}))


def tried(document: Mapping[str, Any]) -> Part:
    """The made part as a part, after its law was made once. Raises DesignError or CircuitError in one line."""
    part = as_design(document).parts[0]
    kind = kinds()[part.kind]
    for field, words in unsuitable(part, kind):
        raise DesignError(f"field {field}: {words}")
    kind.expand(part, Builder(12.0))
    return part


def as_design(document: Mapping[str, Any]) -> Design:
    """The made part as the only part of a design, so that edits of designs edit it. Raises DesignError.

    A value that its kind needs and it does not have is there as a stand-in.
    """
    name = document.get("kind")
    kind = kinds().get(str(name))
    if kind is None:
        raise DesignError(f"there is no part kind '{name}'; write one of {', '.join(sorted(kinds()))}")
    pins = {pin: f"n{at}" for at, pin in enumerate(kind.pins[-1] if _polarised(document) else kind.pins[0])}
    whole = {**document, "ref": f"{kind.letters[0]}1", "pins": pins}
    value = kind.fields.get("value")
    if value is not None and value.needed and "value" not in whole:
        whole["value"] = _STAND_IN.get(value.unit, "1")
    stage = {"name": "drawer", "parts": [whole]}
    return Design.load({"stagebook": 1, "name": "drawer", "stages": [stage], "sequences": {"alarm": {"ends": "1 s"}}})


def _polarised(document: Mapping[str, Any]) -> bool:
    return document.get("class") == "electrolytic"


def resolved(document: Mapping[str, Any]) -> dict[str, Any]:
    """The made part with all figures of its class written out, each as from memory with its test condition.

    Raises CircuitError for a class that the kind does not have.
    """
    part = as_design(document).parts[0]
    kind = kinds()[part.kind]
    known = {**kind.fields, **kind.data}
    fields = {key: value for key, value in document.items() if key != "data"}
    data = dict(document.get("data", {}))
    for key, given in class_figures(part).items():
        if key not in known or known[key].unit == TEXT or part.entry(key) is not None:
            continue
        if key in _PLAIN:
            fields[key] = given.texts[1]
        else:
            data[key] = _datum(given)
    for key, points in POINTS.get(str(part.entry("class")), {}).items():
        if key in known and part.entry(key) is None:
            data[key] = [list(point) for point in points.points]
    return fields | ({"data": data} if data else {})


def _datum(given: ClassFigure) -> dict[str, Any]:
    limits = {"min": given.minimum, "typical": given.typical, "max": given.maximum, "condition": given.at or None}
    return {key: text for key, text in limits.items() if text is not None} | {"source": given.source}


def from_memory(part: Part) -> tuple[str, ...]:
    """The keys of a part's figures that come from memory: of its class, or written out as such. Conditions of a figure
    are none of their own."""
    kind = kinds().get(part.kind)
    if kind is None:
        return ()
    given = {} if _class_unknown(part) else class_figures(part)
    found = []
    for key, entry in {**kind.fields, **kind.data}.items():
        if entry.unit == TEXT or is_condition(part.kind, key):
            continue
        datum = part.datum(key)
        if (datum is None and part.entry(key) is None and key in given) or (datum and datum.source == SOURCE):
            found.append(key)
    return tuple(found)
