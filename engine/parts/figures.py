"""Reading the figures of a part: from its own data first, then from its class, with words for what is missing."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..errors import CircuitError
from ..quantity import read
from .class_figure import ClassPoints, Figures
from .classes import CLASSES, POINTS

if TYPE_CHECKING:
    from ..design.document import Part


@dataclass(frozen=True, slots=True)
class Figure:
    """One datum in SI (temperature in deg C) with its extremes and where it comes from."""

    low: float
    typical: float
    high: float
    source: str

    @property
    def limits(self) -> tuple[float, float, float]:
        """(typical, low, high), the order in which a builder's column takes them."""
        return self.typical, self.low, self.high


def class_figures(part: Part) -> Figures:
    """The generic class a part names. Raises CircuitError when the name is not known for its kind."""
    name = part.entry("class")
    if name is None:
        return {}
    known = CLASSES.get(part.kind, {})
    if name not in known:
        offered = ", ".join(f"'{k}'" for k in known) or "none; give the figures under 'data'"
        raise CircuitError(f"part {part.ref}, class: '{name}' is no class of kind {part.kind}; write one of {offered}")
    return known[name]


def class_points(part: Part, key: str) -> ClassPoints | None:
    """The points that the class of a part gives under a name."""
    return POINTS.get(str(part.entry("class")), {}).get(key)


def figure(part: Part, key: str, unit: str) -> Figure | None:
    """The datum ``key`` of a part, None where neither the part nor its class gives it."""
    found = part.limits(key, unit)
    if found is not None:
        given = [v for v in (found.min, found.typical, found.max) if v is not None]
        typical = found.typical
        if typical is None:
            typical = given[0] if len(given) == 1 else (given[0] * given[-1]) ** 0.5 if given[0] > 0 else given[0]
        low = typical if found.min is None else found.min
        high = typical if found.max is None else found.max
        datum = part.datum(key)
        return Figure(low, typical, high, (datum.source if datum is not None else None) or "datasheet")
    given_by_class = class_figures(part).get(key)
    if given_by_class is None:
        return None
    low, typical, high = (read(text, unit) for text in given_by_class.texts)
    return Figure(low, typical, high, "class")


def needed(part: Part, key: str, unit: str, example: str) -> Figure:
    """As :func:`figure`; raises CircuitError that names the missing datum."""
    found = figure(part, key, unit)
    if found is None:
        raise CircuitError(f'part {part.ref}, {key}: missing; write it like "{key}": "{example}" or name a class')
    return found


def typical(part: Part, key: str, unit: str, default: float) -> float:
    """The typical value of a datum, ``default`` where it is not given."""
    found = figure(part, key, unit)
    return default if found is None else found.typical


def valued(part: Part, unit: str, tolerance: float) -> Figure:
    """Value and tolerance of a part; ``tolerance`` is the customary one where neither it nor its class gives one."""
    found = part.limits("value", unit)
    if found is None or found.typical is None:
        raise CircuitError(f'part {part.ref}, value: missing; write it like "value": "4k7"')
    spread = typical(part, "tolerance", "%", tolerance)
    if not 0.0 <= spread < 1.0:
        raise CircuitError(f'part {part.ref}, tolerance: {spread:.0%} cannot be; write it like "5 %"')
    value = found.typical
    if value < 0.0:
        raise CircuitError(f"part {part.ref}, value: {part.value} is below zero; write a positive value")
    return Figure(value * (1.0 - spread), value, value * (1.0 + spread), "datasheet")
