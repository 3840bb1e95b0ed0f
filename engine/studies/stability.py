"""Watch for a loss of stability that long steps walk past.

An L-stable method damps what grows within a step, so a state that has become unstable may be followed as if it were
not, and no tolerance tells. At the states that long steps reached the circuit is linearised; where a growing mode was
skipped, the run is repeated with steps that resolve it, from where the growth begins until it must have shown.
Growing modes: eigenvalues of the linearised circuit (Lyapunov's first method); that an implicit method is stable
where the equation is not: Hairer, Wanner, Solving Ordinary Differential Equations II (1996), IV.3. Both from memory.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from ..circuit.circuit import Circuit
from ..kernel import layout
from ..kernel.layout import Floats, Program
from ..primitives.columns import CONDITIONS, Lanes
from ..primitives.signals import Row
from ..quantity import write
from ..run import Observed, most_steps, never, run
from .sequences import program_of, starts_of
from .skipped import ALIKE, FINE, Skipped, skipped

CERTAIN = 30.0  # e-folds that take round-off to volts
PER_PERIOD = 24  # steps in a period of the mode, once it is resolved
AFTER = 30  # periods that are still resolved after it must have shown
TOO_SLOW = 0.01  # growth in parts of |s| that steps of that length still damp out
PIECES = 32  # of the step in which the growth began, to find where
ROUNDS = 8  # repeated runs of one lane
TOGETHER = 1.5  # times the steps that a lane may take, for all of them
MOST_STOPS = 30_000  # the work bound: steps that a repetition may be asked to take
FIRST_POINTS, MOST_POINTS = 4096, 250_000
BALANCES = "balances"
MISMATCH = 1e-4  # by which parts are made unequal where equal ones balance
VISIBLE = 0.02  # V, swing that counts as an oscillation
CYCLES = 2  # whole ones, of that swing at least


@dataclass(frozen=True)
class Watched:
    """A lane after the watch: ``observed`` is the run to believe, ``words`` what must be said of it.

    ``unknown``: the repetition was beyond the work bound, and nothing that the run says after ``words`` is certain.
    """

    observed: Observed
    words: str | None = None
    unknown: bool = False


def traced(
    circuit: Circuit,
    lane: Lanes,
    sequence: str,
    rows: Sequence[Row],
    keep: Sequence[Row] = (),
    stops: Floats | None = None,
    cancelled: Callable[[], bool] = never,
) -> tuple[Observed, Program]:
    """One lane with all its steps kept; with none where it takes so many that it must be carried forward, and nothing
    can be seen of what they skipped."""
    _, program = program_of(circuit, lane, sequence, stops)
    starts = starts_of(circuit, sequence, program)
    points = FIRST_POINTS + (0 if stops is None else 2 * len(stops))
    while True:
        observed = run(circuit, lane, program, rows, start=starts, keep=keep, trace=points, cancelled=cancelled)
        how = int(observed.results.ended[0, 0])
        if stops is None and (how == layout.OVERWORKED or (how == layout.TRACE_FULL and points >= MOST_POINTS)):
            untraced = run(circuit, lane, program, rows, start=starts, keep=keep, cancelled=cancelled)
            return (observed if untraced.failed[0] else untraced), program
        if how != layout.TRACE_FULL or points >= MOST_POINTS:
            return observed, program
        points = min(8 * points, MOST_POINTS)


def _resolving(found: Skipped) -> Floats | None:
    """Instants that steps must hit to resolve the mode until it has shown; None beyond the work bound."""
    widths = np.diff(found.time)
    folds = np.concatenate([[0.0], np.cumsum(0.5 * (found.growth[1:] + found.growth[:-1]) * widths)])
    visible = found.growth > TOO_SLOW * found.speed
    for begin in (0, int(np.argmax(visible)) if visible.any() else 0):
        shown = int(np.searchsorted(folds, folds[begin] + CERTAIN))
        speed = float(found.speed[begin : shown + 2].max())
        if shown < folds.size:
            # Within the step in which it shows, growth is taken to go straight from one state to the next.
            share = np.linspace(0.0, 1.0, 1001)
            g0, g1 = found.growth[shown - 1], found.growth[shown]
            within = folds[shown - 1] + (g0 * share + 0.5 * (g1 - g0) * share**2) * widths[shown - 1]
            k = min(int(np.searchsorted(within, folds[begin] + CERTAIN)), 1000)
            end = float(found.time[shown - 1] + share[k] * widths[shown - 1])
        else:
            end = float(found.time[-1])
        period = 2.0 * math.pi / speed
        end = max(end, float(found.time[begin])) + AFTER * period
        if (end - found.time[begin]) / period * PER_PERIOD <= MOST_STOPS:
            return np.arange(float(found.time[begin]), end, period / PER_PERIOD)
    return None


def _swings(observed: Observed, place: int, begin: float) -> tuple[float, float, float] | None:
    """Frequency, size and beginning of an oscillation of one unknown after ``begin``; None where there is none."""
    used = int(observed.results.trace_used[0])
    time, value = observed.results.trace_time[0, :used], observed.results.trace_value[0, :used, place]
    after = time >= begin
    turns: list[tuple[float, float]] = []
    for t, v in zip(time[after], value[after], strict=True):
        if not turns:
            turns.append((t, v))
            continue
        rising = len(turns) > 1 and turns[-1][1] > turns[-2][1]
        if len(turns) > 1 and (v > turns[-1][1]) == rising and v != turns[-1][1]:
            turns[-1] = (t, v)
        elif abs(v - turns[-1][1]) > VISIBLE:
            turns.append((t, v))
    # The first and the last turn are where the window begins and what the circuit came to rest at.
    inner = turns[1:-1]
    if len(inner) < 2 * CYCLES + 1:
        return None
    cycles = inner[: 2 * (len(inner) // 2) + 1]
    gaps = np.diff([t for t, _ in cycles])
    usual = float(np.median(gaps))
    size = max(abs(b[1] - a[1]) for a, b in pairwise(inner))
    return 0.5 / usual, size, inner[0][0]


def watched(
    circuit: Circuit,
    lane: Lanes,
    sequence: str,
    rows: Sequence[Row],
    keep: Sequence[Row] = (),
    cancelled: Callable[[], bool] = never,
) -> Watched:
    """Run one lane and, where a growing mode was skipped, repeat it with steps that resolve it."""
    observed, program = traced(circuit, lane, sequence, rows, keep, cancelled=cancelled)
    tipped = _tipped(circuit, lane, program, observed, sequence, rows, keep, cancelled)
    if tipped is not None:
        return tipped
    plain, stops, said = observed, np.zeros(0), None
    work = 0
    for turn in range(ROUNDS):
        found = None if observed.failed[0] else skipped(circuit, lane, program, observed, ALIKE if turn == 0 else FINE)
        if found is None:
            break
        if said is None:
            said = found
        widths = np.diff(found.time)
        if found.growth[1] * widths[0] > CERTAIN and turn < ROUNDS // 2:
            more = np.linspace(found.time[0], found.time[1], PIECES + 1)[1:-1]
        else:
            resolving = _resolving(found)
            if resolving is None or turn == ROUNDS - 1:
                return Watched(plain, f"{_where(found)}: {_BEYOND}", True)
            said, more = found, resolving
        stops = np.unique(np.concatenate([stops, more]))
        stops = stops[(stops > 0.0) & (stops < program.length[0].sum())]
        if stops.size > MOST_STOPS or work > TOGETHER * most_steps(circuit):
            return Watched(plain, f"{_where(found)}: {_BEYOND}", True)
        observed, program = traced(circuit, lane, sequence, rows, keep, stops, cancelled)
        work += int(observed.results.work[0, 0])
    if said is None:
        return Watched(observed)
    swings = _swings(observed, circuit.index(said.net), float(said.time[0]))
    if observed.failed[0]:
        return Watched(plain, f"{_where(said, swings)}: {_BEYOND}", True)
    if swings is None and not _departs(plain, observed, float(said.time[0])):
        return Watched(observed)
    return Watched(observed, f"{_where(said, swings)} (followed with short steps)")


def _tipped(
    circuit: Circuit,
    lane: Lanes,
    program: Program,
    observed: Observed,
    sequence: str,
    rows: Sequence[Row],
    keep: Sequence[Row],
    cancelled: Callable[[], bool],
) -> Watched | None:
    """The run of parts that differ by a little, where exactly equal ones balance; None where that is not it."""
    found = None if observed.failed[0] else skipped(circuit, lane, program, observed)
    if found is None or found.mode.s.imag != 0.0:
        return None
    place = np.arange(len(lane.columns))
    parts = np.array([column.ref != CONDITIONS for column in lane.columns])
    values = lane.values * np.where(parts, 1.0 + MISMATCH * np.cos(place), 1.0)[:, None]
    unequal = Lanes(lane.columns, np.ascontiguousarray(values))
    other, program = traced(circuit, unequal, sequence, rows, keep, cancelled=cancelled)
    if other.failed[0] or skipped(circuit, unequal, program, other) is not None:
        return None
    at = write(float(found.time[0]), "s", 4)
    return Watched(other, f"{BALANCES} near net {found.net} after {at}; here parts that differ by 0.01 % tip it over")


def _departs(plain: Observed, observed: Observed, begin: float) -> bool:
    """Whether a repeated run goes another way than the plain one did."""
    (t0, x0), (t1, x1) = (
        (
            r.results.trace_time[0, : int(r.results.trace_used[0])],
            r.results.trace_value[0, : int(r.results.trace_used[0])],
        )
        for r in (plain, observed)
    )
    after = t1 >= begin
    return any(
        np.max(np.abs(x1[after, k] - np.interp(t1[after], t0, x0[:, k])), initial=0.0) > VISIBLE
        for k in range(int(plain.circuit.topology.size[0]))
    )


_BEYOND = "to follow it takes more steps than are allowed, what comes later is not known"


def _where(found: Skipped, swings: tuple[float, float, float] | None = None) -> str:
    """Where, when and how fast, in words."""
    at = float(found.time[0]) if swings is None else swings[2]
    if swings is None and found.mode.s.imag == 0.0:
        return f"leaves an unstable balance near net {found.net} after {write(at, 's', 4)}"
    frequency = found.mode.s.imag / (2.0 * math.pi) if swings is None else swings[0]
    return f"oscillates near net {found.net} from {write(at, 's', 4)} on, at about {write(frequency, 'Hz')}"
