"""The arrays of observation rows: what the kernel reads, where each row looks, and which rows it waits for."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from .circuit.circuit import Circuit
from .kernel import layout
from .kernel.layout import Rows, ints, places
from .primitives.signals import BRANCH_CURRENT, Anchor, Row, Signal

Read = tuple[tuple[int, int, int, int], float]
"""How the kernel reads a term, and the factor it has."""

LASTING = {layout.R_MAXIMUM, layout.R_MINIMUM, layout.R_INTEGRAL, layout.R_LAGGED}
POWERS = {
    layout.S_CONDUCTANCE_POWER,
    layout.S_JUNCTION_POWER,
    layout.S_TRANSPORT_POWER,
    layout.S_CHANNEL_POWER,
    layout.S_WARM_POWER,
}
FAMILY = {
    layout.S_CONDUCTANCE_CURRENT: layout.CONDUCTANCE,
    layout.S_CONDUCTANCE_POWER: layout.CONDUCTANCE,
    layout.S_JUNCTION_CURRENT: layout.JUNCTION,
    layout.S_JUNCTION_POWER: layout.JUNCTION,
    layout.S_COLLECTOR_CURRENT: layout.TRANSPORT,
    layout.S_BASE_CURRENT: layout.TRANSPORT,
    layout.S_TRANSPORT_POWER: layout.TRANSPORT,
    layout.S_DRAIN_CURRENT: layout.CHANNEL,
    layout.S_CHANNEL_POWER: layout.CHANNEL,
    layout.S_WARM_CURRENT: layout.WARM,
    layout.S_WARM_POWER: layout.WARM,
}


class RowTable:
    """Turns rows into arrays, each row once and after the rows it waits for."""

    def __init__(self, circuit: Circuit) -> None:
        self.circuit = circuit
        self.places: dict[Row, int] = {}
        self.signals: dict[Signal, int] = {}

    def add(self, row: Row) -> int:
        """Take a row in, and what it waits for; return its place."""
        if row in self.places:
            return self.places[row]
        for anchor in (row.start, row.end):
            if anchor is not None and anchor.row is not None:
                self.add(anchor.row)
        self.signals.setdefault(row.signal, len(self.signals))
        return self.places.setdefault(row, len(self.places))

    def arrays(self, stop: Row | None, keep: Sequence[Row]) -> Rows:
        """All rows as arrays; a lane ends once ``stop`` is seen, and states are kept where a row of ``keep`` is."""
        terms: list[tuple[int, ...]] = []
        scales: list[float] = []
        bounds = [0]
        for signal in self.signals:
            for kind, index, factor in signal.terms:
                for term, scale in self._reads(kind, index, factor):
                    terms.append(term)
                    scales.append(scale)
            bounds.append(len(terms))
        rows: list[tuple[int, ...]] = []
        lasting: list[int] = []
        offsets: list[tuple[float, float]] = []
        for row in self.places:
            start, after = self._window(row.start)
            end, until = self._window(row.end)
            place = -1
            if row.kind in LASTING:
                place = len(lasting)
                lasting += [len(rows)] * (2 if row.kind == layout.R_LAGGED else 1)
            rows.append((row.kind, self.signals[row.signal], 1 if row.rising else -1, row.nth, start, end, place))
            offsets.append((after, until))
        return Rows(
            term=places(terms, len(terms), 4),
            factor=np.array(scales, dtype=float),
            signal=places(bounds),
            row=ints(rows, len(rows), 7),
            lasting=ints(lasting),
            level=np.array([row.level for row in self.places], dtype=float),
            offset=np.ascontiguousarray(np.array(offsets, dtype=float).reshape(len(rows), 2)),
            stop_row=ints([-1 if stop is None else self.places[stop]]),
            keep_row=ints([self.places[row] for row in keep]),
        )

    def _reads(self, kind: int, index: int | str, scale: float) -> list[Read]:
        """What the kernel reads for a term."""
        circuit = self.circuit
        if isinstance(index, str):
            return [((layout.READ_LEVEL, circuit.index(index), 0, 0), scale)]
        if kind == BRANCH_CURRENT:
            branch = circuit.element(layout.BRANCH, index)
            return [((layout.READ_LEVEL, int(circuit.topology.element[branch, layout.E_C]), 0, 0), scale)]
        family = FAMILY[kind]
        k = circuit.element(family, index)
        element, group = circuit.topology.element[k], circuit.topology.group
        a, b, c = (int(element[place]) for place in (layout.E_A, layout.E_B, layout.E_C))
        if family == layout.CONDUCTANCE:
            of = layout.READ_CONDUCTANCE_POWER if kind in POWERS else layout.READ_CONDUCTANCE
            return [((of, a, b, int(element[layout.E_PARAMETER])), scale)]
        if family == layout.JUNCTION:
            of = layout.READ_FLOW_POWER if kind in POWERS else layout.READ_FLOW
            return [((of, a, b, k - int(group[layout.JUNCTION])), scale)]
        flow = 2 * (k - int(group[layout.TRANSPORT])) + int(group[layout.TRANSPORT]) - int(group[layout.JUNCTION])
        if kind not in POWERS:
            return [((layout.READ_FLOW, a, b, flow + (kind == layout.S_BASE_CURRENT)), scale)]
        power: list[Read] = [((layout.READ_FLOW_POWER, a, c, flow), scale)]
        if kind == layout.S_TRANSPORT_POWER:
            power.append(((layout.READ_FLOW_POWER, b, c, flow + 1), scale))
        return power

    def _window(self, anchor: Anchor | None) -> tuple[int, float]:
        if anchor is None:
            return -1, np.inf
        return (-1 if anchor.row is None else self.places[anchor.row]), anchor.by
