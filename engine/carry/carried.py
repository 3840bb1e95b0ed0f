"""How far lanes were carried forward, and in which words that is told."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..kernel import layout
from ..kernel.layout import Floats, Ints


@dataclass(frozen=True)
class Carried:
    """How far lanes were carried, one entry per lane: over how many periods and seconds, in how many strides, how many
    more were taken back; how fast the last of them oscillated, and near which unknown (-1: none). ``gaps`` are the
    strides of a lane that was traced, in s."""

    periods: Floats
    seconds: Floats
    strides: Floats
    taken_back: Floats
    hertz: Floats
    net: Ints
    gaps: tuple[tuple[float, float], ...] = ()

    @classmethod
    def none(cls, count: int) -> Carried:
        """Nothing was carried yet."""
        periods, seconds, strides, taken_back, hertz = layout.zeros(5, count)
        return cls(periods, seconds, strides, taken_back, hertz, np.full(count, -1, dtype=np.int64))

    def tally(self, lane: int, periods: int, seconds: float, hertz: float, net: int) -> None:
        """Note a stride that stands."""
        self.periods[lane] += periods
        self.seconds[lane] += seconds
        self.strides[lane] += 1
        self.hertz[lane] = hertz
        self.net[lane] = net
