"""Reading a list of pairs that a part gives: a curve, or a law at several points."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import TYPE_CHECKING, Any

from ..design.datum import Datum, number
from ..errors import CircuitError, QuantityError
from .figures import class_points

if TYPE_CHECKING:
    from ..design.document import Part

Curve = Sequence[tuple[float, float]]


def points_of(part: Part, key: str, units: tuple[str, str], example: str) -> Curve | None:
    """A list of pairs as a part or its class gives it, rising in its first number; None where neither does."""
    entry = part.entry(key)
    if entry is None:
        of_class = class_points(part, key)
        entry = None if of_class is None else of_class.points
    if not isinstance(entry, tuple):
        return None
    rows: list[tuple[Any, Any]] = []
    for row in entry:
        if isinstance(row, str | Datum | bool | int | float) or len(row) != 2:
            raise CircuitError(f'part {part.ref}, {key}: each point has two numbers; write "{key}": {example}')
        rows.append((row[0], row[1]))
    try:
        points = sorted((number(x, units[0]), number(y, units[1])) for x, y in rows)
    except QuantityError as refusal:
        raise CircuitError(f"part {part.ref}, {key}: {refusal}") from refusal
    if any(a[0] == b[0] for a, b in pairwise(points)):
        raise CircuitError(f'part {part.ref}, {key}: two points have one place; write "{key}": {example}')
    return points
