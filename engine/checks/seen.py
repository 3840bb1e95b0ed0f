"""What a set of lanes showed: observations by sequence and results of trials."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..circuit.circuit import Circuit
from ..kernel.layout import Floats
from ..primitives.columns import Lanes
from ..primitives.signals import Row
from ..run import Observed
from .trial import Edge


@dataclass(frozen=True)
class Seen:
    """Observations of all lanes. ``edges`` are results of trials by their key; empty where trials were not run.

    ``again(sequence, rows, lanes)`` runs some lanes once more, for checks that must look at altered values.
    """

    circuit: Circuit
    lanes: Lanes
    observed: Mapping[str, Observed]
    edges: Mapping[str, Edge]
    again: Callable[[str, tuple[Row, ...], Lanes], Observed]

    def value(self, row: Row, sequence: str) -> Floats:
        """Value of an observation per lane, NaN where it was not seen."""
        return self.observed[sequence].value(row)

    def time(self, row: Row, sequence: str) -> Floats:
        """Time of an observation per lane."""
        return self.observed[sequence].time(row)

    def seen(self, row: Row, sequence: str) -> NDArray[np.bool_]:
        """Whether it was seen, per lane."""
        return self.observed[sequence].seen(row)

    def rerun(
        self,
        sequence: str,
        rows: tuple[Row, ...],
        changes: Mapping[tuple[str, str], float],
        where: NDArray[np.bool_],
    ) -> dict[Row, Floats]:
        """Observations of the lanes in ``where`` with some columns changed; NaN in all other lanes."""
        chosen = np.flatnonzero(where)
        observed = self.again(sequence, rows, self.lanes.take(chosen).replaced(changes))
        found = {}
        for row in rows:
            found[row] = np.full(self.lanes.count, np.nan)
            found[row][chosen] = observed.value(row)
        return found
