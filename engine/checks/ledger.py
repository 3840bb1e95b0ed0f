"""What a check read while it was judging: data with their sources, factors, fields, columns and observations.

Every answer that a view or a set of lanes gives is noted here, so that a margin can say where it comes from without
a line of code in its check.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from ..design.part import Part
from ..kernel.layout import Floats
from ..parts.figures import Figure
from ..primitives.columns import Lanes
from ..primitives.signals import Row
from .seen import Seen


@dataclass(frozen=True, slots=True)
class Datum:
    """A datum of a part as it was read, in SI."""

    ref: str
    key: str
    unit: str
    figure: Figure


@dataclass(frozen=True, slots=True)
class Setting:
    """A number that the design or a requirement sets: a factor, a required margin, a field of a requirement."""

    name: str
    value: float
    unit: str
    source: str


@dataclass
class Ledger:
    """What was read since it was last emptied, each thing once and in the order in which it was first read."""

    data: dict[tuple[str, str], Datum] = field(default_factory=dict)
    settings: dict[str, Setting] = field(default_factory=dict)
    columns: dict[tuple[str, str], None] = field(default_factory=dict)
    rows: dict[tuple[Row, str], None] = field(default_factory=dict)

    def clear(self) -> None:
        """Forget everything."""
        for kept in (self.data, self.settings, self.columns, self.rows):
            kept.clear()

    def datum(self, part: Part, key: str, unit: str, figure: Figure) -> None:
        """A datum of a part."""
        self.data[part.ref, key] = Datum(part.ref, key, unit, figure)

    def factor(self, name: str, value: float, about: str, source: str) -> None:
        """A derating factor."""
        self.settings[f"derating {name}"] = Setting(f"derating of the {about}", value, "", source)

    def required(self, value: float, source: str) -> None:
        """The required margin; ``source`` is empty where it is the customary one."""
        self.settings["required"] = Setting("required margin", value, "%", source)

    def other(self, what: str, value: float, unit: str, source: str) -> None:
        """A number from elsewhere: what a requirement or an event says, a stray, what is customary."""
        self.settings[f"other {what}"] = Setting(what, value, unit, source)

    def field(self, key: str, value: float, unit: str) -> None:
        """A field that a requirement brings along."""
        self.settings[f"field {key}"] = Setting(key.replace("_", " "), value, unit, "the requirement")


class NotedLanes(Lanes):
    """Lanes that note which columns are read."""

    def __init__(self, lanes: Lanes, ledger: Ledger) -> None:
        super().__init__(lanes.columns, lanes.values)
        self._ledger = ledger

    def __getitem__(self, key: tuple[str, str]) -> Floats:
        self._ledger.columns[key] = None
        return super().__getitem__(key)


@dataclass(frozen=True)
class NotedSeen(Seen):
    """Observations that note which rows are read, and in which sequence."""

    ledger: Ledger = field(default_factory=Ledger)

    def value(self, row: Row, sequence: str) -> Floats:
        """As in :class:`Seen`."""
        self.ledger.rows[row, sequence] = None
        return super().value(row, sequence)

    def time(self, row: Row, sequence: str) -> Floats:
        """As in :class:`Seen`."""
        self.ledger.rows[row, sequence] = None
        return super().time(row, sequence)

    def seen(self, row: Row, sequence: str) -> NDArray[np.bool_]:
        """As in :class:`Seen`."""
        self.ledger.rows[row, sequence] = None
        return super().seen(row, sequence)


def noted(seen: Seen, ledger: Ledger) -> NotedSeen:
    """The same observations and lanes; what is read of them is noted."""
    lanes = NotedLanes(seen.lanes, ledger)
    return NotedSeen(seen.circuit, lanes, seen.observed, seen.edges, seen.again, ledger)
