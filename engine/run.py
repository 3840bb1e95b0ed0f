"""The one way to compute: run K variants of one circuit through a sequence and note what was asked for.

Blocks of lanes are handed to one thread per core; progress and cancelling fall between blocks. A lane in a block gives
the same bits as the lane alone, whatever the number of threads.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from concurrent.futures import FIRST_COMPLETED, ThreadPoolExecutor, wait
from dataclasses import dataclass, field, replace
from functools import cache

import numpy as np
from numpy.typing import NDArray

from .carry.carried import Carried
from .carry.carrier import LINGERS, Carrier, with_room
from .carry.carrier import keep as keep_steps
from .carry.kept import Kept
from .circuit.circuit import Circuit
from .circuit.cost import iterate_cost
from .errors import Cancelled
from .kernel import layout
from .kernel.layout import Control, Floats, Program, Results, ints
from .kernel.march import end_traced, march
from .kernel.vectors import WIDTH
from .primitives.columns import Lanes
from .primitives.signals import Row
from .quantity import write
from .row_table import RowTable

RELATIVE = 1e-3
ABSOLUTE = 1e-4  # V
ABSOLUTE_CURRENT = 1e-6  # A
ABSOLUTE_RISE = 0.01  # K
# Factors on nets that carry timing capacitors: an interval's error is that of a slow voltage, not of what it triggers.
TIGHT, TIGHT_ABSOLUTE = 0.03, 0.2
BLOCK = 64  # most lanes handed to a thread at a time
MOST_STEPS = 200_000
MOST_SECONDS = 10.0  # that a lane may take on one core, by circuit/cost.py
ITERATES = 2.2  # a step, about: one for its stage, one for its end, and some more where laws bend
MOST_ITERATIONS = 8
MOST_AT_JUMP = 200
NEVER = 1 << 62  # steps, after which a lane that may not be carried is paused

ENDED = {
    layout.UNSOLVED: "could not be solved",
    layout.OVERWORKED: "took too many steps",
    layout.TRACE_FULL: "kept too many points",
}


def never() -> bool:
    """A run that nobody cancels."""
    return False


def silent(done: int, total: int) -> None:
    """Progress that nobody watches."""


@dataclass(frozen=True)
class Observed:
    """What a run noted. Arrays have one entry per lane; NaN where an observation has no value."""

    circuit: Circuit
    rows: dict[Row, int]
    results: Results
    keep: tuple[Row, ...] = ()
    carried: Carried = field(default_factory=lambda: Carried.none(0))

    def value(self, row: Row) -> Floats:
        """Value of an observation: the time of a crossing, a level, an extreme, an integral."""
        k = self.rows[row]
        return np.where(self.results.status[:, k] == layout.SEEN, self.results.value[:, k], np.nan)

    def time(self, row: Row) -> Floats:
        """When it was observed, in s from the start of the sequence."""
        k = self.rows[row]
        return np.where(self.results.status[:, k] == layout.SEEN, self.results.time[:, k], np.nan)

    def seen(self, row: Row) -> NDArray[np.bool_]:
        """Whether it was observed at all."""
        found: NDArray[np.bool_] = self.results.status[:, self.rows[row]] == layout.SEEN
        return found

    @property
    def failed(self) -> NDArray[np.bool_]:
        """Lanes that ended before their time: nothing they say may be believed."""
        how = self.results.ended[:, 0]
        bad: NDArray[np.bool_] = (how != layout.DONE) & (how != layout.STOPPED)
        return bad

    def failure(self, lane: int) -> str | None:
        """Why a lane ended early, in words with time and net; None for a lane that was solved."""
        how = int(self.results.ended[lane, 0])
        if how not in ENDED:
            return None
        net = self.circuit.unknown_name(int(self.results.ended[lane, 1]))
        return f"{ENDED[how]} at {self.results.ended_at[lane]:.6g} s near net {net}"

    def carried_forward(self, lane: int) -> str | None:
        """Over how much of an oscillation a lane was carried forward, in words; None where every step was taken."""
        carried = self.carried
        if lane >= carried.net.size or carried.net[lane] < 0:
            return None
        net, hertz = self.circuit.unknown_name(int(carried.net[lane])), write(float(carried.hertz[lane]), "Hz")
        over = f"{carried.periods[lane]:,.0f} of its periods ({write(float(carried.seconds[lane]), 's')})"
        return f"oscillates near net {net} at {hertz}; {over} were carried forward from those before and after them"

    def state(self, row: Row) -> tuple[Floats, Floats]:
        """State (lanes, n_all) just after a kept row was seen, and when: -1 in lanes where it never was."""
        k = self.keep.index(row)
        return np.ascontiguousarray(self.results.kept[:, k]), self.results.kept_at[:, k]

    @property
    def final(self) -> Floats:
        """The state at the end, (lanes, n_all): the ``start`` of a run that goes on from here."""
        return self.results.final


def most_steps(circuit: Circuit, rows: int = 0) -> int:
    """How many steps a lane may take, with so many rows watched: fewer in a large circuit, where each costs more."""
    return int(min(MOST_STEPS, MOST_SECONDS / (ITERATES * iterate_cost(circuit.topology, rows))))


def most_iterates(circuit: Circuit, rows: int = 0) -> int:
    """How many iterates a lane may take in all: what bounds its work, however many of them a step needs."""
    return int(MOST_SECONDS / iterate_cost(circuit.topology, rows))


def control(circuit: Circuit, relative: float = RELATIVE, rows: int = 0) -> Control:
    """Tolerances of every unknown, tighter on nets that carry timing capacitors, and bounds of the work of a lane."""
    nets, free = int(circuit.topology.size[0]), int(circuit.topology.size[1])
    scale = relative / RELATIVE
    rtol = np.full(free, relative)
    atol = np.full(free, ABSOLUTE * scale)
    atol[nets:] = ABSOLUTE_CURRENT * scale
    atol[free - len(circuit.builder.temperatures) :] = ABSOLUTE_RISE * scale
    for stage in circuit.design.stages:
        for role, ref in stage.roles.items():
            if role.startswith("timing_capacitor"):
                for net in circuit.design.part(ref).pins.values():
                    place = circuit.index(net)
                    if place < nets:
                        rtol[place] = relative * TIGHT
                        atol[place] = ABSOLUTE * scale * TIGHT_ABSOLUTE
    bounds = most_steps(circuit, rows), MOST_ITERATIONS, MOST_AT_JUMP, most_iterates(circuit, rows), LINGERS
    return Control(rtol, atol, ints(bounds))


def _traced(results: Results, kept: Kept, n_all: int) -> Results:
    """Results of a lane alone with all its steps that were kept."""
    keep_steps(kept, results, 0, n_all)
    return results._replace(
        trace_time=np.concatenate(kept.time)[None],
        trace_value=np.concatenate(kept.states)[None],
        trace_used=ints([kept.count]),
    )


@cache
def _pool(workers: int) -> ThreadPoolExecutor:
    """The threads that all runs share: starting some for each run took longer than a short one."""
    return ThreadPoolExecutor(workers, "kernel")


def run(
    circuit: Circuit,
    lanes: Lanes,
    program: Program,
    rows: Sequence[Row],
    *,
    start: Floats | None = None,
    table: Floats | None = None,
    stop: Row | None = None,
    keep: Sequence[Row] = (),
    relative: float = RELATIVE,
    trace: int = 0,
    carry: bool | None = None,
    threads: int | None = None,
    progress: Callable[[int, int], None] = silent,
    cancelled: Callable[[], bool] = never,
) -> Observed:
    """Run all lanes through a program.

    ``start`` (lanes, n_all) are the voltages before t = 0, all zero by default; ``table`` is ``circuit.table(lanes)``
    where that is at hand; ``stop`` ends a lane once it is seen;
    ``keep`` are rows at which the state is kept;
    ``trace`` keeps so many points of the only lane; ``carry`` says whether lanes that oscillate steadily may be carried
    forward, which those that are traced are not unless it is said; ``relative`` scales all tolerances.

    Raises Cancelled.
    """
    asked = RowTable(circuit)
    for row in (*rows, *keep, *(() if stop is None else (stop,))):
        asked.add(row)
    made = asked.arrays(stop, keep)
    count, n_all = lanes.count, int(circuit.topology.size[2])
    results = Results(
        value=layout.zeros(count, len(asked.places)),
        time=layout.zeros(count, len(asked.places)),
        status=np.zeros((count, len(asked.places)), dtype=np.int64),
        ended=np.zeros((count, 2), dtype=np.int64),
        ended_at=layout.zeros(count),
        work=np.zeros((count, 4), dtype=np.int64),
        final=layout.zeros(count, n_all),
        kept=layout.zeros(count, len(keep), n_all),
        kept_at=np.full((count, len(keep)), -1.0),
        trace_time=layout.zeros(min(count, WIDTH), trace),
        trace_value=layout.zeros(min(count, WIDTH), trace, n_all),
        trace_used=np.zeros(min(count, WIDTH), dtype=np.int64),
    )
    starts = layout.zeros(count, n_all) if start is None else np.ascontiguousarray(start)
    laws = circuit.table(lanes) if table is None else table
    bounds = control(circuit, relative, len(asked.places))
    carries = trace == 0 if carry is None else carry
    if not carries:
        bounds.bounds[4] = NEVER
    kept = Kept(trace) if trace > 0 and carries else None
    if kept is not None:
        results = with_room(results, n_all, made.signal.size - 1, made.lasting.size)
        results.trace_used[:] = 0
    arguments = (circuit.topology, laws, starts, program, made, bounds, results)
    carried = Carried.none(count)

    def some(low: int, high: int) -> None:
        carrier = Carrier(circuit.topology, program, made, bounds, carried, kept)
        march(*arguments, low, high, cancel, go_on=carrier.go_on if carries else end_traced)

    cancel = np.zeros(1, dtype=np.uint8)
    workers = threads or os.cpu_count() or 1
    blocks = workers * -(-count // (workers * BLOCK))  # as many for each thread
    block = min(BLOCK, WIDTH * -(-count // (blocks * WIDTH)))
    if count <= block or workers == 1:
        for low in range(0, count, block):
            if cancelled():
                raise Cancelled("stopped")
            some(low, min(low + block, count))
            progress(min(low + block, count), count)
        if kept is not None:
            results = _traced(results, kept, n_all)
            carried = replace(carried, gaps=tuple(kept.gaps))
        return Observed(circuit, asked.places, results, tuple(keep), carried)
    waiting = {_pool(workers).submit(some, low, min(low + block, count)) for low in range(0, count, block)}
    blocks = len(waiting)
    try:
        while waiting:
            done, waiting = wait(waiting, timeout=0.05, return_when=FIRST_COMPLETED)
            for future in done:
                future.result()
            progress(min(count, (blocks - len(waiting)) * block), count)
            if cancelled():
                raise Cancelled("stopped")
    finally:
        # Whatever ends the waiting, an interrupt too, ends the work.
        cancel[0] = 1
        for future in waiting:
            future.cancel()
    return Observed(circuit, asked.places, results, tuple(keep), carried)
