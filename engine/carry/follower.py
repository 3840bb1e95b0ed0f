"""Follows one lane that lingers: looks whether it oscillates steadily, takes it ahead in strides, and takes them back.

Some periods are kept, cut and compared. Where they are alike the lane goes ahead by many of them in one stride
(:mod:`.strides`), settles, and is looked at again. What the periods behind the stride do not bear out is taken back,
with all that was noted, and a shorter stride is tried. A lane that does not oscillate evenly goes on as if nobody had
looked.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ..kernel.layout import SEEN, Control, Floats, Topology
from ..kernel.work import HELD, MAY, NOW, PAUSE, SPAN
from .carried import Carried
from .column import Column, Snapshot, go_on, leap, put_back, taken
from .measure import Drift, at_instants, drift
from .noted import Noted, bent, correct_stride, next_edge, note_stride, noted
from .periods import Period, candidates, lasts, periods_by
from .strides import FORESIGHT, Quantities, Stride, change_of, in_phase, judged, longest, quantities, with_sines

PERIODS, MOST_PERIODS = 5, 64  # that are compared
POINTS, MORE_PERIODS = 1000, 24  # or as many as take so many steps, up to so many
ENOUGH, MEMORY = 40_000, 3_000_000  # points, and numbers, in which there must be periods enough
SETTLE = 2  # periods that a lane settles in after a stride
STATES = 32  # of a period, at which the circuit is linearised
LONG = 0.5  # of the longest step: a lane is taken ahead between two long ones, not while it switches over
NARROW = 0.1  # by which the period may change in a stride
FIRST_STRIDE = 2.0  # times the periods that were looked at
GIVE_UP = 12  # strides in turn that were taken back
BUSY = 4  # times the usual steps, behind a stride
BOWS = 3e-3  # by which the course of an integral may differ from the straight one
TURNS = 0.03  # of its swing, by which a net that grows or dies does so within the periods that are compared
STILL = 1.3  # periods, within which the last one must have ended
SHORTEN = 0.8  # of a stride that was too long
CLOSE = 3.0  # shortest strides before what one went beyond, that are stepped
EVIDENCE = 2000  # points in which swings must be the same: many periods where they have few, as what rings has
WORTH = 0.2  # of the tolerance, which is mended even where no stride follows
MORE, LONGER_WORK = 4.0, 3.0  # times the bounds of steps and of work, for a lane that is seen to oscillate
ITERATES = 2.5  # a step, at most usually


@dataclass(frozen=True)
class Regime:
    """A steady oscillation: its periods, what drifts beneath it, what the rows note of it."""

    period: Period
    drift: Drift
    rows: Noted


@dataclass
class Venture:
    """A stride that is not judged yet, and what it takes to go back: the lane as it was, what was kept of it, and how
    many steps it had taken."""

    stride: Stride
    rows: Noted
    snapshot: Snapshot
    time: list[Floats]
    trail: list[Floats]
    steps: int
    pieces: int  # of what is kept of a traced lane
    prolonged: bool = False


class Follower:
    """What is known of a lane, and what it is to do next."""

    def __init__(self, top: Topology, control: Control, carried: Carried, column: Column) -> None:
        self.top, self.control, self.carried = top, control, carried
        self.lane, self.segment = column.lane, column.segment
        self.quantities = self._quantities(column, column.work.stepping.x0[:, column.w : column.w + 1].T.copy())
        self.regime: Regime | None = None
        self.earlier: Drift | None = None
        self.venture: Venture | None = None
        self.wanted = PERIODS
        self.length: float | None = None  # s, of the next stride
        self.missed: Floats | None = None  # of the last stride, to be mended with the next
        self.late = 0.0  # s, by which the oscillation is ahead of where it would be by now
        self.wall = math.inf  # s, where a stride landed in vain
        self.in_vain = 0  # strides in turn
        self._aligned = False  # the lane is on its way to where a stride begins
        self._until = math.inf
        self._edge = math.inf  # s, where a window opens or closes, or the segment ends
        self._time: list[Floats] = []
        self._trail: list[Floats] = []

    def go_on(self, column: Column) -> bool:
        """Decide what the paused lane does next; return False where there is nothing to follow any more."""
        venture = self.venture
        if venture is not None and (column.lost or self.segment != column.segment):
            return self._take_back(column, venture)
        if self.segment != column.segment:
            return False
        self._keep(column)
        if venture is not None:
            if column.now >= self._until or column.stopped:
                return self._judge(column, venture)
            if column.steps >= column.work.columns.clock[PAUSE, column.w]:
                return self._take_back(column, venture)
            go_on(column, self._until)
        elif column.now < self._until < math.inf:
            go_on(column, self._until, math.inf)
        elif self._aligned:
            return self._stride(column)
        else:
            return self._look(column)
        return True

    def give_up(self, column: Column) -> None:
        """Follow the lane no further for now, from where it stood before a stride that is not judged yet."""
        if self.venture is not None:
            self._put_back(column, self.venture)
        self._rest(column)

    def _put_back(self, column: Column, venture: Venture) -> None:
        put_back(column, venture.snapshot)
        if column.kept is not None:
            column.kept.back_to(venture.pieces)
        column.results.trace_used[column.w] = 0
        self.venture = None

    def watch(self, column: Column, until: float = math.inf) -> None:
        """Run on plainly, all steps kept from here on."""
        self._begin(column, until)
        go_on(column, until, math.inf)

    def _begin(self, column: Column, until: float) -> None:
        self._time, self._trail = [], []
        self._aligned, self._until = False, until
        column.results.trace_used[column.w] = 0

    def _keep(self, column: Column) -> None:
        """Take over what the kernel has kept."""
        results, w = column.results, column.w
        used = int(results.trace_used[w])
        if used > 0:
            self._time.append(results.trace_time[w, :used].copy())
            self._trail.append(results.trace_value[w, :used].copy())
        results.trace_used[w] = 0

    def _kept(self) -> tuple[Floats, Floats]:
        return np.concatenate(self._time), np.concatenate(self._trail)

    def _rest(self, column: Column) -> bool:
        """Nothing is to be gained here: run on plainly, for as many steps again as were taken."""
        column.unwatched()
        go_on(column, steps=2.0 * column.steps)
        self.segment = -1
        return True

    def _quantities(self, column: Column, states: Floats) -> Quantities:
        parameters = column.work.solving.p[:, column.w]
        return quantities(self.top, parameters, states, column.program.source.shape[2], self.control)

    def _look(self, column: Column) -> bool:
        """Find the period in what was kept, and how long a stride may be."""
        time, trail = self._kept()
        known = None if self.regime is None else self.regime.period
        found = self._found(column, time, trail, known)
        if found is None and known is not None:
            found, self.regime = self._found(column, time, trail, None), None
        if found is None:
            self.regime = None
            if len(time) >= min(ENOUGH, MEMORY // trail.shape[1]):
                return self._rest(column)
            go_on(column, steps=math.inf)
            return True
        period, drifting = found
        if self.regime is None:
            if len(time) < EVIDENCE:
                go_on(column, steps=math.inf)
                return True
            nets = int(self.top.size[0])
            tolerance = self.quantities.tolerance(drifting.mean)[:nets]
            if not lasts(time, trail[:, :nets], period.length, tolerance):
                self.watch(column)
                return True
            # Where a period takes few steps more of them are looked at: that costs little, and tells means better.
            more = int(POINTS * (time[-1] - time[0]) / (len(time) * period.length))
            usual, self.wanted = self.wanted, int(np.clip(more, self.wanted, MORE_PERIODS))
            again = self._found(column, time, trail, period)
            if again is None:
                self.wanted = usual
            else:
                period, drifting = again
        self.earlier = None if self.regime is None else self.regime.drift
        sampled = np.linspace(period.instants[-2], period.instants[-1], STATES, endpoint=False)
        self.quantities = self._quantities(
            column, at_instants(time, trail[:, : column.work.solving.x.shape[0]], sampled)
        )
        rows = noted(column, time, trail, period)
        if rows is None:
            self.watch(column, column.now + (self.wanted + 1) * period.length)
            return True
        self.regime = Regime(period, drifting, rows)
        return self._plan(column, self.regime, time)

    def _found(self, column: Column, time: Floats, trail: Floats, known: Period | None) -> tuple[Period, Drift] | None:
        """The last periods of what was kept, cut as they were before where that is known, and what drifts in them."""
        if known is not None:
            again = periods_by(known.net, time, trail[:, known.net], known.together)
            tried = [] if again is None or len(again.instants) <= self.wanted else [again.last(self.wanted)]
        else:
            tried = candidates(time, trail[:, : int(self.top.size[0])], self.wanted)
        followed = self.quantities.of(trail)
        tolerance = self.quantities.tolerance(followed[-1])
        if tried:
            bounds = self.control.bounds
            more = LONGER_WORK * bounds[3] / (ITERATES * bounds[0])
            column.work.columns.clock[MAY, column.w] = min(max(more, 1.0), MORE)
        for period in tried:
            if time[-1] - period.instants[-1] > STILL * period.length:
                continue  # it has ended since
            measured = drift(time, followed, period, tolerance)
            turn = float(abs(measured.higher[period.net] - measured.lower[period.net])) * (self.wanted * period.length)
            if measured.steady and turn <= TURNS * float(measured.swing[period.net]):
                return period, measured
        return None

    def _least(self, period: Period) -> float:
        """The shortest stride in s that is worth its while."""
        return (self.wanted + SETTLE) * period.length

    def _plan(self, column: Column, regime: Regime, time: Floats) -> bool:
        """Choose the next stride; go to a quiet moment first, or on plainly where there is nothing to gain."""
        length = regime.period.length
        if self._longest(column, regime) < self._least(regime.period):
            self._wait(column, regime)
            return True
        # A lane is taken ahead where its steps are long.
        widths = np.diff(time)
        last = int(np.searchsorted(time, time[-1] - length))
        widest = last + int(np.argmax(widths[last:]))
        if widths[-1] >= LONG * widths[widest]:
            return self._stride(column)
        quiet = float(time[widest + 1] - 0.5 * widths[widest])
        self._until = quiet + length * math.ceil((column.now - quiet) / length)
        self._aligned = True
        go_on(column, self._until, math.inf)
        return True

    def _longest(self, column: Column, regime: Regime) -> float:
        """How long the next stride may be, in s."""
        work, w, here, length = column.work, column.w, column.now, regime.period.length
        wanted = FIRST_STRIDE * self.wanted * length if self.length is None else self.length
        wanted = min(max(wanted, self._least(regime.period) + 0.5 * length), regime.rows.reach)
        if self.wall > here:
            # Near to it there is less to be gained than may have to be taken back.
            wanted = (
                0.0 if self.wall - here < CLOSE * self._least(regime.period) else min(wanted, 0.5 * (self.wall - here))
            )
        due = work.guarding.due[w]
        later = due[(due > here + 2.0 * length) & np.isfinite(due)]
        ends = here + float(work.columns.clock[SPAN, w] - work.columns.clock[NOW, w])
        self._edge = min(next_edge(column), ends, float(later.min(initial=math.inf)))
        wanted = min(wanted, self._edge - here - self._least(regime.period) - 2.0 * length)
        if wanted <= 0.0:
            return 0.0
        tolerance = self.quantities.tolerance(regime.drift.mean)
        wanted = longest(self.quantities, regime.drift, tolerance, wanted)
        return with_sines(column.program.sine[self.lane], wanted, length)

    def _wait(self, column: Column, regime: Regime) -> None:
        """Go on plainly: to the next edge of a window, or for some periods more."""
        here, length, least = column.now, regime.period.length, self._least(regime.period)
        tolerance = self.quantities.tolerance(regime.drift.mean)
        if longest(self.quantities, regime.drift, tolerance, least) < least:
            self.wanted = min(2 * self.wanted, MOST_PERIODS)
        until, edge = here + (self.wanted + 1) * length, next_edge(column)
        if here < edge <= here + 2.0 * (least + length):
            until = max(until, edge + 0.5 * length)
        missed, self.missed = self.missed, None
        if missed is not None and np.any(np.abs(missed) > WORTH * tolerance):
            self._begin(column, until)
            leap(column, 0.0, self.quantities.spread @ missed, here, until, math.inf)
        else:
            self.watch(column, until)

    def _stride(self, column: Column) -> bool:
        """Take a stride from here, which may be later than where it was planned."""
        assert self.regime is not None
        period, drifting = self.regime.period, self.regime.drift
        time, trail = self._kept()
        rows = noted(column, time, trail, period)
        here, seconds = column.now, 0.0
        if rows is not None:
            self.regime = Regime(period, drifting, rows)
            seconds = self._longest(column, self.regime)
        if rows is None or seconds < self._least(period):
            self.watch(column, here + (self.wanted + 1) * period.length)
            return True
        snapshot = taken(column)
        seconds, periods = in_phase(column.program.sine[self.lane], drifting, self.earlier, here, seconds, self.late)
        over = here + seconds + self._least(period) + period.length - self._edge
        if over > 0.0:
            fewer = math.ceil(over / period.length)
            periods, seconds = periods - fewer, seconds * (1.0 - fewer / periods)
        tolerance = self.quantities.tolerance(drifting.mean)
        change = change_of(self.quantities, drifting, tolerance, self.earlier, here, seconds)
        stride = Stride(here, seconds, periods, change, drifting, self._foresees(drifting, seconds))
        self.venture = Venture(stride, rows, snapshot, self._time, self._trail, column.steps, 0)
        if column.kept is not None:
            self.venture.pieces = len(column.kept.time)
        note_stride(column, rows, seconds, periods)
        # Where it lands amid something quick it may not get there.
        usual = int(np.count_nonzero(time >= time[-1] - period.length))
        steps = column.steps + BUSY * usual * (self.wanted + SETTLE)
        self._begin(column, here + seconds + self._least(period))
        whole = change if self.missed is None else change + self.missed
        leap(column, seconds, self.quantities.spread @ whole, here + 2.0 * period.length, self._until, steps)
        column.work.columns.clock[HELD, column.w] = 1.0
        return True

    def _foresees(self, drifting: Drift, seconds: float) -> bool:
        return self.earlier is not None and FORESIGHT * (drifting.middle - self.earlier.middle) > seconds

    def _judge(self, column: Column, venture: Venture) -> bool:
        """Judge the last stride by the periods behind it; take it back, or plan the next."""
        assert self.regime is not None
        stride, known, results = venture.stride, self.regime.period, column.results
        landed = stride.begin + stride.seconds
        if any(
            results.status[self.lane, r] == SEEN and results.time[self.lane, r] <= landed + known.length
            for r in venture.rows.waiting
        ):
            return self._take_back(column, venture)  # it went beyond
        time, trail = self._kept()
        found = self._found(column, time, trail, known)
        later = column.now + self.wanted * known.length
        if found is None and not venture.prolonged and not column.stopped and later < self._edge:
            venture.prolonged, self._until = True, later
            go_on(column, self._until, column.work.columns.clock[PAUSE, column.w] + column.steps - venture.steps)
            return True
        if found is None or abs(found[0].length / stride.before.length - 1.0) > NARROW:
            return self._take_back(column, venture)
        period, after = found
        verdict = judged(self.quantities, stride, after, self.quantities.tolerance(after.mean))
        rows = noted(column, time, trail, period)
        bows = 0.0 if rows is None else bent(column, venture.rows, rows, stride.begin, landed)
        if not verdict.stands or bows > BOWS or (rows is None and not column.stopped):
            factor = min(verdict.factor, SHORTEN if verdict.alike else 0.5)
            return self._take_back(column, venture, factor, beyond=not verdict.alike)
        self.venture = None
        column.work.columns.clock[HELD, column.w] = 0.0
        if column.kept is not None:
            column.kept.gaps.append((stride.begin, landed))
        rises = period.together
        self.carried.tally(self.lane, rises * stride.periods, stride.seconds, rises / period.length, period.net)
        if rows is None or column.stopped:
            return self._rest(column)
        correct_stride(column, venture.rows, rows, stride.begin, landed)
        share = (0.5 * (stride.begin + landed) - stride.before.middle) / (after.middle - stride.before.middle)
        usual = stride.before.length + share * (after.length - stride.before.length)
        # A phase knows no whole periods.
        self.late = math.remainder(self.late + stride.periods * usual - stride.seconds, period.length)
        self.missed = verdict.missed
        factor = min(verdict.factor, (BOWS / max(bows, 1e-9)) ** (1.0 / 3.0))
        self.length = stride.seconds * (factor if self.in_vain == 0 else min(1.0, factor))
        self.in_vain = 0
        self.wall = self.wall if self.wall > column.now else math.inf
        self.earlier, self.regime = stride.before, Regime(period, after, rows)
        return self._plan(column, self.regime, time)

    def _take_back(self, column: Column, venture: Venture, factor: float = 0.5, beyond: bool = True) -> bool:
        """Go back to before the stride, and try a shorter one. ``beyond``: it landed where things are otherwise."""
        assert self.regime is not None
        period, stride = self.regime.period, venture.stride
        self._put_back(column, venture)
        self.carried.taken_back[self.lane] += 1
        if beyond:
            self.wall = stride.begin + stride.seconds
        self.length = max(factor * stride.seconds, self._least(period))
        self.in_vain += 1
        if self.in_vain >= GIVE_UP:
            return self._rest(column)
        if self.length > self._least(period):
            # The drift before it is still known: only how far it may be trusted is not.
            self._time, self._trail = venture.time, venture.trail
            column.results.trace_used[column.w] = 0
            return self._stride(column)
        self.missed = None
        self.watch(column, column.now + 2.0 * self._least(period))
        return True
