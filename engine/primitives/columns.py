"""Columns of the lane table: every number of a design that may differ from lane to lane, and the lanes made of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from enum import Enum

import numpy as np

from ..kernel.layout import Floats, Ints


class Group(Enum):
    """What moves a column: a part's own tolerance, the gain of all transistors together, or a condition."""

    TOLERANCE = "tolerance"
    GAIN = "gain"
    LEAKAGE = "leakage"
    CONDITION = "condition"


@dataclass(frozen=True, slots=True)
class Column:
    """One number: nominal and extremes in SI (temperature in deg C). ``logarithmic``: drawn evenly on a log scale."""

    ref: str
    datum: str
    nominal: float
    low: float
    high: float
    group: Group = Group.TOLERANCE
    logarithmic: bool = False

    @property
    def key(self) -> tuple[str, str]:
        """(reference, datum), the name under which laws read the column."""
        return self.ref, self.datum

    @property
    def varies(self) -> bool:
        """Whether the extremes differ from each other."""
        return self.low != self.high


CONDITIONS = "conditions"
SUPPLY = (CONDITIONS, "supply")
AMBIENT = (CONDITIONS, "ambient")
SOURCE_RESISTANCE = (CONDITIONS, "source_resistance")
LEAKAGE_STATE = (CONDITIONS, "leakage")  # 0 conditioned .. 1 as specified


class Lanes:
    """Values of all columns in a number of lanes: ``lanes["R8", "value"]`` is a (lanes,) array."""

    def __init__(self, columns: Sequence[Column], values: Floats) -> None:
        """``values`` has shape (columns, lanes)."""
        self.columns = tuple(columns)
        self.values = values
        self.count = int(values.shape[1])
        self._place = {column.key: n for n, column in enumerate(self.columns)}

    @classmethod
    def nominal(cls, columns: Sequence[Column], count: int = 1) -> Lanes:
        """``count`` copies of the nominal design."""
        return cls(columns, np.repeat(np.array([[c.nominal] for c in columns], dtype=float), count, axis=1))

    def __getitem__(self, key: tuple[str, str]) -> Floats:
        column: Floats = self.values[self._place[key]]
        return column

    def __contains__(self, key: tuple[str, str]) -> bool:
        return key in self._place

    def place(self, key: tuple[str, str]) -> int:
        """Row of a column in ``values``."""
        return self._place[key]

    def take(self, index: Sequence[int] | Ints) -> Lanes:
        """The lanes with these numbers, in this order."""
        return Lanes(self.columns, np.ascontiguousarray(self.values[:, np.asarray(index, dtype=np.int64)]))

    def replaced(self, changes: Mapping[tuple[str, str], float | Floats]) -> Lanes:
        """A copy with some columns set."""
        values = self.values.copy()
        for key, value in changes.items():
            values[self._place[key]] = value
        return Lanes(self.columns, values)

    @property
    def ambient(self) -> Floats:
        """Ambient temperature in deg C, (lanes,)."""
        return self[AMBIENT]
