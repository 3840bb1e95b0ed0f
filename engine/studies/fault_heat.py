"""Which parts overheat: mean power over the windows of a sequence, against what a part may turn to heat for long."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import pairwise

import numpy as np

from ..checks.resistor_power import permitted
from ..checks.view import View
from ..design.part import Part
from ..kernel.layout import Floats
from ..parts import kinds
from ..parts.figures import figure
from ..primitives.signals import Anchor, Row, integral
from ..quantity import read
from ..run import Observed

HOTTEST_JUNCTION = 150.0  # deg C, silicon, from memory
LEAST_WINDOW = 0.02  # share of a sequence over which heat is averaged at least


def limit(part: Part, ambient: float) -> float | None:
    """What a part may turn to heat for long in W, at an ambient temperature; None where no datum says."""
    kind = kinds()[part.kind]
    known = {**kind.fields, **kind.data}
    if "rating" in known and known["rating"].unit == "W":
        rating = figure(part, "rating", "W")
        return None if rating is None else float(permitted(rating.low, np.array(ambient)))
    if "thermal_resistance" in known:
        resistance = figure(part, "thermal_resistance", "K/W")
        if resistance is not None and resistance.high > 0.0:
            return (HOTTEST_JUNCTION - ambient) / resistance.high
    if "power" in known and known["power"].unit == "W":
        power = figure(part, "power", "W")
        return None if power is None else power.low
    return None


class Heat:
    """Rows for the heat of every part that has a limit, and the share of it that each lane comes to."""

    def __init__(self, view: View) -> None:
        self._view = view
        self._windows: dict[str, dict[tuple[str, Row], float]] = {}

    def rows(self, sequence: str, instants: Iterable[float]) -> list[Row]:
        """What to observe in a sequence: energy between its events and ``instants``, merged where they lie close."""
        ends = self._view.ends(sequence)
        least = LEAST_WINDOW * ends
        events = self._view.design.sequences[sequence].events
        bounds = [0.0]
        for cut in sorted({*instants, *(read(event.at, "s") for event in events)}):
            if cut - bounds[-1] >= least and ends - cut >= least:
                bounds.append(cut)
        bounds.append(ends)
        found = []
        for part in self._view.design.parts:
            power = self._view.bench(part.ref).power
            if power is None or limit(part, 25.0) is None:
                continue
            for low, high in pairwise(bounds):
                row = integral(power, Anchor(low), Anchor(high))
                self._windows.setdefault(part.ref, {})[sequence, row] = high - low
                found.append(row)
        return found

    def shares(self, observed: dict[str, Observed], ambient: float) -> dict[str, Floats]:
        """Part by part, the largest mean power of all windows over the limit, (lanes,); above 1 it overheats."""
        found = {}
        for ref, windows in self._windows.items():
            most = limit(self._view.design.part(ref), ambient)
            means = [observed[name].value(row) / lasts for (name, row), lasts in windows.items()]
            largest = np.max(np.nan_to_num(means), axis=0)
            found[ref] = np.asarray(largest / most if most else np.where(largest > 0.0, np.inf, 0.0))
        return found
