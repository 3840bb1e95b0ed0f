"""All figures that a part has, each with limits, test condition and who says it: what a data page shows."""

from __future__ import annotations

from dataclasses import dataclass

from ..design.datum import Datum, as_datum
from ..design.datum_text import written
from ..design.part import Leakage, Part
from ..errors import CircuitError
from . import kinds
from .class_figure import ClassFigure
from .figures import class_figures, class_points

NOT_SAID = "not said"


@dataclass(frozen=True, slots=True)
class PartDatum:
    """One datum as texts, as typed; '' where there is none. ``own``: the part gives it, and not its class.

    ``name`` is the field that an edit writes, ``text`` the own datum in one line as datum_text.py writes it. ``about``
    says what the kind reads it for, ``beside`` its points, or why corners keep its typical value where they do.
    """

    name: str
    minimum: str
    typical: str
    maximum: str
    condition: str
    source: str
    own: bool
    about: str
    text: str = ""
    beside: str = ""


def part_data(part: Part) -> tuple[PartDatum, ...]:
    """Every datum that the kind reads, in its order, then what stands under ``law``."""
    kind = kinds().get(part.kind)
    if kind is None:
        return ()
    try:
        of_class = class_figures(part)
    except CircuitError:
        of_class = {}
    found = []
    for key, entry in {**kind.fields, **kind.data}.items():
        if key == "class":
            continue
        own = part.entry(key)
        if isinstance(own, Leakage):
            for inner in ("specified", "conditioned"):
                datum = part.datum(key, inner)
                found.append(_row(f"{key}.{inner}", datum, entry.about) if datum else _none(f"{key}.{inner}", ""))
        elif own is not None:
            datum = as_datum(own)
            row = _listed(key, written(own), entry.about) if datum is None else _row(key, datum, entry.about)
            found.append(row)
        elif key in of_class:
            found.append(_of_class(part, key, of_class[key], entry.about))
        elif (points := class_points(part, key)) is not None:
            said = f"{points.source}, class {part.entry('class')}"
            beside = ", ".join(f"{x} {y}" for x, y in points.points)
            count = f"{len(points.points)} points"
            found.append(PartDatum(key, "", count, "", points.at, said, False, entry.about, beside=beside))
        else:
            found.append(_none(key, entry.about))
    for key, law in part.law.items():
        datum = as_datum(law)
        if datum is not None:
            found.append(_row(f"law.{key}", datum, kind.law[key].about if key in kind.law else ""))
    return tuple(found)


def _of_class(part: Part, key: str, given: ClassFigure, about: str) -> PartDatum:
    """A figure of the class; what corners keep at its typical value says why."""
    low, typical, high = (text or "" for text in (given.minimum, given.typical, given.maximum))
    at = given.at if given.of is None else f"for {given.of.replace('_', ' ')}"
    said = f"{given.source}, class {part.entry('class')}"
    beside = f"corners keep it typical: {given.held}" if given.held else ""
    return PartDatum(key, low, typical, high, at, said, False, about, beside=beside)


def _row(name: str, datum: Datum, about: str) -> PartDatum:
    low, typical, high = ("" if value is None else str(value) for value in (datum.min, datum.typical, datum.max))
    source = datum.source or NOT_SAID
    return PartDatum(name, low, typical, high, datum.condition or "", source, True, about, written(datum))


def _listed(name: str, text: str, about: str) -> PartDatum:
    return PartDatum(name, "", text, "", "", NOT_SAID, True, about, text)


def _none(name: str, about: str) -> PartDatum:
    return PartDatum(name, "", "", "", "", "", False, about)
