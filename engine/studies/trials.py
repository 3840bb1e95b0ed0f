"""The one bisection behind every trial: several knob values a lane and round, all lanes in one run."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from ..checks.trial import Edge, Mask, Trial
from ..circuit.circuit import Circuit
from ..circuit.timeline import Timeline
from ..kernel.layout import Floats, Ints
from ..primitives.columns import Lanes
from ..primitives.signals import Row, level, voltage
from ..run import Observed, never, run
from .sequences import program_of, starts_of

AT_ONCE, MOST_POINTS = 64, 8  # lanes of a round that is worth its while, and knob values of one lane in it
LOOK = 4.0  # ratio of the knob values at which the whole range is looked at first
NEAR = 1.6  # half the width, as a ratio, of a search around a known edge


def begin_of(trial: Trial) -> Row | None:
    """The row at which the state is kept that a trial goes on from; None when it begins with the empty circuit."""
    return None if trial.start is None else level(voltage("0V"), trial.start)


class TrialRun:
    """A trial made ready in the given lanes: the state it starts from is computed once."""

    def __init__(
        self,
        circuit: Circuit,
        trial: Trial,
        lanes: Lanes,
        cancelled: Callable[[], bool] = never,
        kept: tuple[Floats, Floats] | None = None,
    ) -> None:
        """``kept`` are states and times of ``begin_of(trial)`` in these lanes, where a run has kept them already."""
        self.circuit, self.trial, self.lanes, self.cancelled = circuit, trial, lanes, cancelled
        self.missing = np.zeros(lanes.count, dtype=bool)
        self._table = circuit.table(lanes)
        self._state: Floats | None = None
        self._at = np.zeros(lanes.count)
        begin = begin_of(trial)
        if begin is not None:
            if kept is None:
                _, program = program_of(circuit, lanes, trial.sequence)
                starts = starts_of(circuit, trial.sequence, program)
                run_up = run(circuit, lanes, program, [], start=starts, stop=begin, keep=[begin], cancelled=cancelled)
                kept = run_up.state(begin)
            self._state, self._at = kept
            self.missing = self._at < 0.0

    def tried(self, index: Sequence[int] | Ints, knob: Floats) -> Observed:
        """Run lanes ``index`` (with repeats) with one knob value each."""
        chosen = np.asarray(index, dtype=np.int64)
        lanes = self.lanes.take(chosen)
        table = None if self.trial.vary is not None else np.ascontiguousarray(self._table[chosen])
        if self.trial.vary is not None:
            lanes = self.trial.vary(lanes, knob)
        start = None
        if self._state is None:
            line = Timeline(self.circuit, lanes)
        else:
            before, _ = program_of(self.circuit, lanes, self.trial.sequence)
            line = Timeline.resumed(before, self._at[chosen], self.trial.onward)
            start = np.ascontiguousarray(self._state[chosen])
        self.trial.drive(line, knob)
        program = line.program(self.trial.ends)
        return run(self.circuit, lanes, program, self.trial.rows, start=start, table=table, cancelled=self.cancelled)

    def holds(self, index: Sequence[int] | Ints, knob: Floats) -> Mask:
        """Whether each lane holds at its knob value; a lane that could not be solved does not."""
        return self._held(index, self.tried(index, knob))

    def _held(self, index: Sequence[int] | Ints, observed: Observed) -> Mask:
        return np.asarray(~(self.trial.gives_in(self.lanes.take(index), observed) | observed.failed))

    def spare(self, knob: float) -> Floats:
        """How far from giving in every lane stays at one knob value."""
        everyone = np.arange(self.lanes.count)
        return self._spare(everyone, self.tried(everyone, np.full(self.lanes.count, knob)))

    def _spare(self, index: Sequence[int] | Ints, observed: Observed) -> Floats:
        if self.trial.spare is None:
            return np.zeros(len(index))
        return self.trial.spare(self.lanes.take(index), observed)

    def edge(self, resolution: float | None = None, around: float | None = None) -> Edge:
        """Bisect all lanes at once, to the trial's own resolution or a coarser one; ``around`` narrows the search to
        knob values near this one, and what lies outside counts as ``never`` or ``always``.

        All knob values are those of one grid, so that a lane ends at the same one whatever lanes are beside it.
        """
        enough = np.log(self.trial.resolution if resolution is None else resolution)
        count = self.lanes.count
        everyone = np.arange(count)
        ends = (self.trial.safe, self.trial.severe) if around is None else (around / NEAR, around * NEAR)
        # A circuit may give in at a middle value and hold at a severer one: look along the whole range first.
        width = np.log(ends[1] / ends[0])
        spans = int(np.ceil(width / np.log(LOOK))) if around is None else 1
        per_span = max(1, int(np.ceil(width / (spans * enough))))
        grid = np.geomspace(*ends, spans * per_span + 1)
        scanned = np.arange(spans + 1) * per_span
        index = np.repeat(everyone, scanned.size)
        looked = self.tried(index, np.tile(grid[scanned], count))
        held = self._held(index, looked).reshape(count, -1)
        spare = self._spare(index, looked).reshape(count, -1)
        least = np.argmin(np.nan_to_num(spare, nan=np.inf), axis=1)
        never_gives_in = held.all(axis=1)
        always = ~held[:, 0]
        first = np.where(never_gives_in, spans, np.maximum(1, np.argmin(held, axis=1)))
        low, high = scanned[first - 1], scanned[first]
        open_lanes = ~(always | never_gives_in | self.missing)
        while True:
            chosen = np.flatnonzero(open_lanes & (high - low > 1))
            if chosen.size == 0:
                break
            points = int(np.clip(AT_ONCE // chosen.size, 1, MOST_POINTS))
            shares = np.arange(1, points + 1) / (points + 1)
            below, above = low[chosen, None], high[chosen, None]
            places = np.clip(np.rint(below + (above - below) * shares).astype(np.int64), below + 1, above - 1)
            held = self.holds(np.repeat(chosen, points), grid[places].ravel()).reshape(-1, points)
            # The first knob value that does not hold bounds the edge, whatever lies beyond it.
            first = np.where(held.all(axis=1), points, np.argmin(held, axis=1))
            padded = np.concatenate([below, places, above], axis=1)
            rows = np.arange(chosen.size)
            low[chosen], high[chosen] = padded[rows, first], padded[rows, first + 1]
        knob = np.where(never_gives_in, ends[1], grid[low])
        knob = np.where(always, ends[0], knob)
        final = self.tried(everyone, knob)
        values = {row: final.value(row) for row in self.trial.rows}
        tried = np.ones(count, dtype=bool)
        weakest = spare[everyone, least], grid[scanned][least]
        return Edge(knob, values, never_gives_in & ~self.missing, always & ~self.missing, self.missing, tried, *weakest)
