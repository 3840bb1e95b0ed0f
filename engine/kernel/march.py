"""Lanes from power-up to the end: exact events, a step length and a Newton iteration for each lane.

The lanes of a row advance together, one iterate at a time, each in its own phase of its own step: no lane waits for
another, and a lane that ends makes room for the next.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from . import machine_code
from .assemble import evaluate, linear_matrices
from .compiled import COMPILED, leaf
from .course import begin_lane, keep_states, next_segment, set_sources, set_switches, trace
from .elimination import factor, substitute, substitute_two
from .guards import move_guards, next_due, rest_guards, watch_guards
from .lasting import note_lasting
from .layout import (
    DONE,
    FAMILIES,
    GUARD,
    OVERWORKED,
    SEEN,
    STOPPED,
    TRACE_FULL,
    UNSOLVED,
    Bytes,
    Control,
    Floats,
    Program,
    Results,
    Rows,
    Topology,
)
from .newton import advance, residual, solved_by, worst_unknown
from .rows import close_rows, open_rows, read_signals, watch
from .steps import GAMMA, A, begin_end, begin_stage, error_of, growth, keep_parabola, left_over, surprise, take
from .tangents import extrapolate
from .vectors import WIDTH, any_of, at, flag, put, same, where
from .work import (
    AH,
    ASKED,
    BASE,
    BEGAN,
    CARRY,
    ERROR,
    GREW,
    GROWTH,
    HELD,
    LAST,
    LAST_WORK,
    LEFT,
    LENGTH,
    LIMITED,
    LONGEST,
    LOST,
    MOST,
    NEXT,
    NOW,
    PAUSE,
    PAUSE_AT,
    REACH,
    ROUND,
    SPAN,
    STOP,
    SURPRISE,
    TOOK,
    Work,
)

JUMP = 1e-12  # s, the backward-Euler step that takes in a jump
FIRST = 1e-10  # s, the first step after it
ROUGHLY = 100.0  # times the tolerance, the error of that step: what settles in less than it would ring
SMALLEST = 1e-16  # s
SNAP = 0.2  # V, a step whose end was expected further away is taken again, shorter, unless it is shorter than
SNAPPED = 1e-9  # s
MOST_GREW = 4.0  # an error below a hundredth of the allowed one says little about the next
TINY = 1e-12  # s, moves that lie no further apart are one
GLANCES = 12  # looks at the start until junctions, limited in each, have their charges at any sensible voltage

# What a lane is doing: nothing; looking at its start; solving a jump, the stage of a step, its end; waiting between two
# steps, until it is told to go on.
IDLE, GLANCE, LEAP, STAGE, END, PAUSED, GOES_ON = 0, 1, 2, 3, 4, 5, 6
# What came of an iterate.
NOTHING, LOOKED, LEAPT, STAGED, ARRIVED, AGAIN, STARTS, FINISHED = 0, 1, 2, 3, 4, 5, 6, 7
NOT_ENDED = -1


@leaf
def march_rows(
    top: Topology,
    table: Floats,
    starts: Floats,
    program: Program,
    rows: Rows,
    control: Control,
    results: Results,
    work: Work,
    low: int,
    high: int,
    cancel: Bytes,
) -> None:
    """Step lanes low .. high-1, WIDTH of them at a time; stop where ``cancel[0]`` is set, or where all lanes that are
    left are paused. Called again with the same ``work`` it goes on."""
    element, group = top.element, top.group
    pivot, entry, update, left = top.pivot, top.entry, top.update, top.left
    nets, free = top.size[0], top.size[1]
    known = top.size[2] - top.size[1] - top.size[4]
    relative, absolute, bounds = control.relative, control.absolute, control.bounds
    x, q, i = work.x, work.q, work.i
    x0, q0, i0 = work.x0, work.q0, work.i0
    xg, qg, ig = work.xg, work.qg, work.ig
    first, second, constant, tolerance = work.first, work.second, work.constant, work.tolerance
    step, bend, error, noise, allowed = work.step, work.bend, work.error, work.noise, work.allowed
    slope, expected = work.slope, work.expected
    di, dq, nothing = work.di, work.dq, work.nothing
    a, c, g = work.a, work.c, work.g
    seen, seen0, flow, flow0, flow_g = work.seen, work.seen0, work.flow, work.flow0, work.flow_g
    p, source, clock = work.p, work.source, work.clock
    s0, sg, s1, window = work.s0, work.sg, work.s1, work.window
    listed, listed_until, best, best_at = work.listed, work.listed_until, work.best, work.best_at
    phase, came, failed, lane_of, segment_of = work.phase, work.came, work.failed, work.lane, work.segment
    moving, diagonal, begun = work.moving, work.diagonal, work.begun
    told, due, toggles = work.told, work.due, work.left
    guarded = group[GUARD] < group[FAMILIES]
    # Taken out of their tuples once: every look into a tuple counts references, with two atomic operations.
    spans, restart, given, sine = program.length, program.restart, program.source, program.sine
    switched, switch = program.switched, program.switch
    row, level, offset, lasting, keep_row = rows.row, rows.level, rows.offset, rows.lasting, rows.keep_row
    term, weight, signal = rows.term, rows.factor, rows.signal
    value, time, status, counts = results.value, results.time, results.status, results.work
    ended, ended_at, final = results.ended, results.ended_at, results.final
    kept, kept_at = results.kept, results.kept_at
    trace_time, trace_value, trace_used = results.trace_time, results.trace_value, results.trace_used
    stop_row = rows.stop_row[0]
    tracing = trace_time.size > 0

    upcoming = low + begun[0]
    running = 0
    for w in range(WIDTH):
        if phase[w] == IDLE:
            came[w] = FINISHED
        elif phase[w] != PAUSED:
            running += 1
    while True:
        # Lanes that ended make room; what is left over idles on the last one's numbers.
        dirty = False
        for w in range(WIDTH):
            if came[w] == FINISHED:
                came[w] = NOTHING
                phase[w] = IDLE
                if upcoming < high:
                    lane = upcoming
                    upcoming += 1
                    begun[0] += 1
                    running += 1
                    lane_of[w] = lane
                    begin_lane(w, lane, table, starts, sine, p, x, seen, counts, clock)
                    open_rows(row, offset, w, lane, window, value, time, status, best)
                    listed_until[w] = -1.0
                    clock[MOST, w] = GLANCES
                    segment_of[w] = min(next_segment(spans, lane, -1), spans.shape[1] - 1)
                    clock[SPAN, w] = spans[lane, segment_of[w]]
                    clock[PAUSE, w] = bounds[4]
                    set_switches(switched, switch, lane, segment_of[w], 0.0, w, p)
                    if guarded:
                        rest_guards(element, group, w, x, p, told, due, toggles)
                    phase[w] = GLANCE
                    dirty = True
        if running == 0 or cancel[0] != 0:
            return
        if dirty:
            linear_matrices(element, group, p, c, g)

        ah = at(clock, AH)
        h = at(clock, LENGTH)
        limited = evaluate(element, group, p, source, c, g, ah, x, i, q, a, seen, flow, slope)
        residual(nets, ah, x, i, q, a, diagonal, constant, tolerance, noise, allowed, step)
        factor(a, ah, pivot, entry, update)
        substitute(a, step, pivot, entry, left)
        busy = same(phase, LEAP) | same(phase, STAGE) | same(phase, END)
        advance(busy, step, x)
        far = extrapolate(element, group, p, ah, nothing, step, seen, slope, i, q, flow, di, dq, bend)
        ends = same(phase, END)
        if any_of(ends):
            left_over(h, i0, ig, i, noise, error)
            substitute_two(a, bend, error, pivot, entry, left)
        else:
            substitute(a, bend, pivot, entry, left)
        solved, astray = solved_by(ah, i, q, constant, allowed, tolerance, bend)
        solved = busy & ~limited & ~far & solved
        rounds = at(clock, ROUND) + 1.0
        most = at(clock, MOST)
        hopeless = astray & ~same(phase, LEAP) & (rounds >= 0.5 * most)
        spent = busy & ~solved & (hopeless | (rounds >= most))
        ends = ends & solved
        if any_of(ends):
            put(clock, SURPRISE, surprise(nets, expected, x))
            size = error_of(relative, absolute, x0, x, error)
            put(clock, ERROR, size)
            put(clock, GROWTH, growth(size))
            read_signals(term, weight, signal, p, xg, flow_g, sg)
        watched = ends | (solved & same(phase, LEAP))
        if any_of(watched | same(phase, GLANCE)):
            read_signals(term, weight, signal, p, x, flow, s1)
        put(clock, LIMITED, where(limited, 1.0, 0.0 * h))
        put(clock, ROUND, rounds)
        flag(solved, came)
        flag(spent, failed)

        # What came of it, lane by lane.
        for w in range(WIDTH):
            doing = phase[w]
            lane = lane_of[w]
            if doing == GLANCE:
                if clock[LIMITED, w] == 0.0 or clock[ROUND, w] >= GLANCES:
                    came[w] = LOOKED
            elif doing == IDLE or doing == PAUSED:
                came[w] = NOTHING
            elif doing == GOES_ON:
                came[w] = AGAIN
            elif came[w] != 0:
                if doing == STAGE:
                    counts[lane, 2] += int(clock[ROUND, w])
                    came[w] = STAGED
                elif doing == LEAP:
                    counts[lane, 0] += 1
                    counts[lane, 2] += int(clock[ROUND, w])
                    came[w] = LEAPT
                    begin = clock[BASE, w] + clock[NOW, w]
                    length = min(JUMP, 0.5 * (clock[SPAN, w] - clock[NOW, w]))
                    clock[NOW, w] += length
                    clock[BEGAN, w] = begin
                    clock[TOOK, w] = length
                    if guarded:
                        watch_guards(element, group, begin, length, 0.0, w, x0, x, x, p, told, due)
                    watch(
                        row, level, offset, window, begin, length, 0.0, w, lane,
                        s0, s1, s1, value, time, status, listed, listed_until, best, best_at,
                    )  # fmt: skip
                    keep_states(keep_row, status, x, begin + length, w, lane, kept, kept_at)
                    clock[NEXT, w] = FIRST
                    clock[LAST, w] = 0.0
                else:
                    counts[lane, 2] += int(clock[ROUND, w])
                    length = clock[LENGTH, w]
                    grow = clock[GROWTH, w]
                    # The first step after a jump is judged roughly: what a step of 1 ps leaves in the last digits of a
                    # large charge counts as a current there, and shorter steps would only make it larger.
                    is_first = clock[LAST, w] == 0.0
                    if clock[ERROR, w] > (ROUGHLY if is_first else 1.0) and length > JUMP:
                        # Nothing here is quicker than a picosecond but a junction that has lost its last charge.
                        counts[lane, 1] += 1
                        clock[NEXT, w] = max(length * max(0.1, grow), JUMP)
                        came[w] = AGAIN
                        continue
                    if is_first:
                        grow = max(grow, 1.0)
                    if clock[LAST, w] > 0.0 and clock[SURPRISE, w] > SNAP and length > SNAPPED:
                        counts[lane, 1] += 1
                        clock[NEXT, w] = max(0.1 * length, SNAPPED)
                        came[w] = AGAIN
                        continue
                    begin = clock[BASE, w] + clock[NOW, w]
                    if guarded and watch_guards(element, group, begin, length, GAMMA, w, x0, xg, x, p, told, due):
                        # Something moves within this step: it is taken again, up to there.
                        counts[lane, 1] += 1
                        clock[NEXT, w] = length
                        came[w] = AGAIN
                        continue
                    came[w] = ARRIVED
                    clock[BEGAN, w] = begin
                    clock[TOOK, w] = length
                    watch(
                        row, level, offset, window, begin, length, GAMMA, w, lane,
                        s0, sg, s1, value, time, status, listed, listed_until, best, best_at,
                    )  # fmt: skip
                    keep_states(keep_row, status, x, begin + length, w, lane, kept, kept_at)
                    # Predictive control: where steps must get shorter and shorter, the next is not as long as the
                    # error of this one alone would have it (Gustafsson, ACM Trans. Math. Softw. 20 (1994) 496).
                    if clock[LAST, w] > 0.0:
                        grow = min(grow, grow * grow / clock[GREW, w] * length / clock[LAST, w])
                    clock[GREW, w] = min(clock[GROWTH, w], MOST_GREW)
                    clock[LAST, w] = length
                    clock[NOW, w] = clock[STOP, w] if length == clock[LEFT, w] else clock[NOW, w] + length
                    wanted = max(length * min(3.0, grow), JUMP)
                    asked = clock[ASKED, w]
                    clock[NEXT, w] = wanted if length == asked else max(wanted, min(asked, 3.0 * length))
            elif failed[w] != 0:
                counts[lane, 2] += int(clock[ROUND, w])
                counts[lane, 3] += 1
                clock[NEXT, w] = clock[LENGTH, w] * 0.1
                came[w] = AGAIN
                if doing != LEAP and clock[NEXT, w] < SMALLEST:
                    # There is no way on from here however short the step: what has lost its balance jumps.
                    clock[NEXT, w] = 0.0
                elif doing == LEAP and clock[HELD, w] > 0.0:
                    came[w] = NOTHING
                    phase[w] = PAUSED
                    clock[HELD, w] = LOST
                    running -= 1
                elif doing == LEAP:
                    came[w] = FINISHED
                    ended[lane, 0] = UNSOLVED
                    ended[lane, 1] = worst_unknown(tolerance, bend, step, w)
                    ended_at[lane] = clock[BASE, w] + clock[NOW, w]

        staged = same(came, STAGED)
        if any_of(staged):
            take(staged, x, xg)
            take(staged, q, qg)
            take(staged, i, ig)
            take(staged, flow, flow_g)
        arrived = same(came, ARRIVED)
        leapt = same(came, LEAPT) | same(came, LOOKED)
        settles = arrived | leapt
        if any_of(settles):
            note_lasting(
                row, level, lasting, arrived, same(came, LEAPT), at(clock, BEGAN), at(clock, TOOK),
                s0, sg, s1, best, best_at,
            )  # fmt: skip
            keep_parabola(arrived, leapt, h, x0, xg, x, first, second)
            take(settles, x, x0)
            take(settles, q, q0)
            take(settles, i, i0)
            take(settles, flow, flow0)
            take(settles, seen, seen0)
            take(settles, s1, s0)
        again = same(came, AGAIN)
        if any_of(again):
            take(again, seen0, seen)

        # What each lane does next.
        dirty = False
        for w in range(WIDTH):
            if came[w] == NOTHING or came[w] == FINISHED:
                continue
            lane = lane_of[w]
            segment = segment_of[w]
            base = clock[BASE, w]
            if came[w] == STAGED:
                phase[w] = END
                clock[ROUND, w] = 0.0
                now = clock[NOW, w] + clock[LENGTH, w]
                if moving[w] != 0:
                    set_switches(switched, switch, lane, segment, now, w, p)
                    dirty = True
                set_sources(given, sine, lane, segment, base, now, free, known, w, source, x)
                continue
            how = NOT_ENDED
            if came[w] == ARRIVED or came[w] == LEAPT:
                if tracing and not trace(
                    x0, s0, best, best_at, w, base + clock[NOW, w], trace_time, trace_value, trace_used
                ):
                    clock[PAUSE_AT, w] = 0.0
                if stop_row >= 0 and came[w] == ARRIVED and status[lane, stop_row] == SEEN:
                    if clock[HELD, w] > 0.0:
                        clock[PAUSE_AT, w] = 0.0
                    else:
                        how = STOPPED
            elif came[w] == LOOKED and tracing:
                trace(x0, s0, best, best_at, w, base + clock[NOW, w], trace_time, trace_value, trace_used)
            leaps = came[w] == LOOKED or (came[w] == AGAIN and clock[NEXT, w] == 0.0)
            if came[w] != LOOKED and how == NOT_ENDED and clock[NOW, w] >= clock[SPAN, w]:
                base += clock[SPAN, w]
                clock[BASE, w] = base
                clock[NOW, w] = 0.0
                segment = next_segment(spans, lane, segment)
                segment_of[w] = segment
                if segment == spans.shape[1]:
                    how = DONE
                else:
                    clock[SPAN, w] = spans[lane, segment]
                    clock[PAUSE, w] = float(counts[lane, 0] + bounds[4])
                    leaps = restart[segment] == 1
                    moving[w] = 0
            if guarded and how == NOT_ENDED and came[w] != LOOKED and next_due(due, w) - base <= clock[NOW, w]:
                move_guards(element, group, next_due(due, w) + TINY, w, x0, x, p, told, due, toggles)
                dirty = True
                leaps = True
            if how == NOT_ENDED and not leaps:
                if counts[lane, 0] >= clock[PAUSE, w] or base + clock[NOW, w] >= clock[PAUSE_AT, w]:
                    phase[w] = PAUSED
                    came[w] = NOTHING
                    running -= 1
                    continue
                counts[lane, 0] += 1
                if counts[lane, 0] > bounds[0] or counts[lane, 2] > bounds[3]:
                    how = OVERWORKED
            if how != NOT_ENDED:
                if how == DONE or how == STOPPED:
                    close_rows(row, window, base + clock[NOW, w], w, lane, value, time, status, best, best_at)
                ended[lane, 0] = how
                ended[lane, 1] = 0
                ended_at[lane] = base + clock[NOW, w]
                came[w] = FINISHED
                continue
            clock[ROUND, w] = 0.0
            if leaps:
                now = clock[NOW, w]
                moving[w] = set_switches(switched, switch, lane, segment, now, w, p)
                dirty = dirty or switched.size > 0
                phase[w] = LEAP
                clock[MOST, w] = bounds[2]
                clock[AH, w] = JUMP
                clock[CARRY, w] = 0.0
                clock[REACH, w] = 0.0
                now += JUMP
            else:
                stop = clock[SPAN, w]
                if guarded:
                    stop = min(stop, next_due(due, w) - base)
                clock[STOP, w] = stop
                rest = stop - clock[NOW, w]
                length = min(clock[NEXT, w], clock[LONGEST, w])
                clock[ASKED, w] = length
                if length >= rest * 0.999999:
                    length = rest
                elif length > 0.5 * rest:
                    length = 0.5 * rest
                phase[w] = STAGE
                clock[MOST, w] = bounds[1]
                clock[LEFT, w] = rest
                clock[LENGTH, w] = length
                clock[AH, w] = A * length
                clock[CARRY, w] = A * length
                clock[REACH, w] = GAMMA * length
                now = clock[NOW, w] + GAMMA * length
                if moving[w] != 0 or clock[NOW, w] == 0.0:
                    moving[w] = set_switches(switched, switch, lane, segment, now, w, p)
                    dirty = dirty or switched.size > 0
            set_sources(given, sine, lane, segment, base, now, free, known, w, source, x)
            came[w] = STARTS
        starting = same(came, STARTS)
        if any_of(starting):
            begin_stage(
                starting, relative, absolute, at(clock, REACH), at(clock, CARRY), x0, q0, i0, first, second,
                x, constant, tolerance,
            )  # fmt: skip
        staged = same(came, STAGED)
        if any_of(staged):
            begin_end(
                staged, at(clock, REACH), h, at(clock, LAST), x0, q0, xg, qg, first, second, x, constant, expected
            )
        if dirty:
            linear_matrices(element, group, p, c, g)
        for w in range(WIDTH):
            if came[w] == FINISHED:
                running -= 1
                for k in range(x.shape[0]):
                    final[lane_of[w], k] = x0[k, w]


GoOn = Callable[[Work, list[int], Results], Results]
"""What is done when all lanes of a row that are not at their end are paused, in these columns: it ends some of them
(:func:`end_lane`), lets others go on (``GOES_ON``, or ``GLANCE`` from another state), and returns what to fill in."""


def end_lane(work: Work, w: int, results: Results, how: int) -> None:
    """End the paused lane in column ``w`` where it stands."""
    lane = work.lane[w]
    results.ended[lane] = how, 0
    results.ended_at[lane] = work.clock[BASE, w] + work.clock[NOW, w]
    results.final[lane] = work.x0[:, w]
    work.phase[w] = IDLE


def end_traced(work: Work, columns: list[int], results: Results) -> Results:
    """Nothing pauses but a trace without more room: there the lane ends."""
    for w in columns:
        end_lane(work, w, results, TRACE_FULL)
    return results


def march(
    top: Topology,
    table: Floats,
    starts: Floats,
    program: Program,
    rows: Rows,
    control: Control,
    results: Results,
    low: int,
    high: int,
    cancel: Bytes,
    go_on: GoOn = end_traced,
) -> None:
    """Step lanes low .. high-1; stop where ``cancel[0]`` is set."""
    held = LAST_WORK.take(top, table, program, rows)
    while True:
        arguments = (top, table, starts, program, rows, control, results, held.taken, low, high, cancel)
        if COMPILED:
            machine_code.bound("march", arguments)()
        else:
            with np.errstate(all="ignore"):
                march_rows(*arguments)
        paused = [w for w in range(WIDTH) if held.work.phase[w] == PAUSED]
        if cancel[0] != 0 or not paused:
            LAST_WORK.held = held
            return
        results = go_on(held.work, paused, results)
