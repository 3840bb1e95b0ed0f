"""One margin at its worst, or in the nominal lane."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..checks.check import Judged
from ..checks.trial import Edge
from ..primitives.columns import Lanes
from .lanes import Setting


@dataclass(frozen=True)
class Corner:
    """One ask at its worst: the setting, what was judged there, and in which lane.

    ``reach`` are the extremes of a window's value in all corners that were tried; ``remark`` is said beside
    the verdict.
    """

    setting: Setting
    words: str
    judged: Judged
    lane: int
    lanes: Lanes
    broken: str | None
    edge: Edge | None = None
    reach: tuple[float | None, float | None] = (None, None)
    remark: str | None = None

    @property
    def margin(self) -> float:
        """The margin there, NaN where it is not known."""
        return float(self.judged.margin[self.lane])

    @property
    def rank(self) -> float:
        """The margin there; what is not known is worse than all that is."""
        return -np.inf if np.isnan(self.margin) else self.margin
