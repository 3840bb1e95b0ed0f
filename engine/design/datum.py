"""A datum as a field holds it: a text, a bare number, limits with their source, a group of data or a list of points."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Annotated, Any, Literal

from pydantic import Discriminator, Field, Tag, model_validator

from ..errors import QuantityError
from ..quantity import read
from .clause import Clause, Key, Number, Scalar, Text

Source = Literal["datasheet", "class", "measured", "memory"]


@dataclass(frozen=True, slots=True)
class Limits:
    """The numbers of a datum in SI (temperature in deg C); None where the document gives none."""

    min: float | None
    typical: float | None
    max: float | None


class Datum(Clause):
    """One number about a part: what is guaranteed, what is usual, under which condition, and who says so."""

    min: Scalar | None = None
    typical: Scalar | None = None
    max: Scalar | None = None
    source: Source | None = None
    condition: Text | None = None

    @model_validator(mode="after")
    def _says_something(self) -> Datum:
        if self.min is None and self.typical is None and self.max is None:
            raise ValueError("no number is given; write at least one of 'min', 'typical', 'max'")
        return self

    def limits(self, unit: str) -> Limits:
        """The three numbers, read in ``unit``. Raises QuantityError."""
        return Limits(*(None if value is None else number(value, unit) for value in (self.min, self.typical, self.max)))


def number(value: Scalar, unit: str) -> float:
    """A scalar in SI (temperature in deg C): a text is read in ``unit``, a bare number is SI already."""
    if isinstance(value, bool):
        raise QuantityError(f"{value} is not a value; write a text such as '6 V'")
    return read(value, unit) if isinstance(value, str) else float(value)


def _is_datum(value: Mapping[str, Any]) -> bool:
    known = tuple(Datum.model_fields)
    keys = [key for key in value if isinstance(key, str)]
    return any(key in known for key in keys) or any(get_close_matches(key, known, 1, 0.75) for key in keys[:4])


def _entry_shape(value: object) -> str | None:
    if isinstance(value, str):
        return "text"
    if isinstance(value, bool):
        return "yes or no"
    if isinstance(value, int | float):
        return "number"
    if isinstance(value, Datum):
        return "datum"
    if isinstance(value, Mapping):
        return "datum" if _is_datum(value) else "group"
    return "points" if isinstance(value, list | tuple) else None


Single = Annotated[
    Annotated[Text, Tag("text")]
    | Annotated[bool, Tag("yes or no")]
    | Annotated[Number, Tag("number")]
    | Annotated[Datum, Tag("datum")],
    Discriminator(_entry_shape),
]
Row = Annotated[tuple[Scalar, ...], Field(min_length=1, max_length=10)]
Point = Annotated[
    Annotated[Text, Tag("text")]
    | Annotated[bool, Tag("yes or no")]
    | Annotated[Number, Tag("number")]
    | Annotated[Datum, Tag("datum")]
    | Annotated[Row, Tag("points")],
    Discriminator(_entry_shape),
]
Group = Annotated[dict[Key, Single], Field(min_length=1, max_length=40)]
Points = Annotated[tuple[Point, ...], Field(min_length=1, max_length=200)]
Entry = Annotated[
    Annotated[Text, Tag("text")]
    | Annotated[bool, Tag("yes or no")]
    | Annotated[Number, Tag("number")]
    | Annotated[Datum, Tag("datum")]
    | Annotated[Group, Tag("group")]
    | Annotated[Points, Tag("points")],
    Discriminator(_entry_shape),
]
"""What a field or a key of ``data`` and ``law`` may hold."""


def as_datum(entry: Entry | None, inner: str | None = None) -> Datum | None:
    """The datum that an entry is, with ``inner`` that of a group; a plain text or number is its typical value.

    None where there is no such datum, or where the entry is a list of points. A text that stands for a whole group
    answers for every ``inner`` name.
    """
    if isinstance(entry, dict):
        return as_datum(entry.get(inner)) if inner is not None else None
    if entry is None or isinstance(entry, tuple):
        return None
    return entry if isinstance(entry, Datum) else Datum(typical=entry)
