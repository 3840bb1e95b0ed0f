"""What a lane does after an iterate: begin, the end of a step, the next step, a jump into the next segment, its end."""

from __future__ import annotations

from .compiled import part
from .course import begin_lane, next_segment, set_sources, set_switches, trace
from .guards import move_guards, next_due, rest_guards
from .layout import (
    DONE,
    FAMILIES,
    GUARD,
    OVERWORKED,
    SEEN,
    STOPPED,
    Control,
    Floats,
    Ints,
    Program,
    Results,
    Rows,
    Topology,
)
from .outcome import GLANCES, JUMP
from .rows import close_rows, open_rows
from .steps import GAMMA, A
from .work import (
    AGAIN,
    AH,
    ARRIVED,
    ASKED,
    BASE,
    CARRY,
    END,
    FINISHED,
    GLANCE,
    HELD,
    LEAP,
    LEFT,
    LENGTH,
    LONGEST,
    LOOKED,
    MAY,
    MOST,
    NEXT,
    NOTHING,
    NOW,
    PAUSE,
    PAUSE_AT,
    PAUSED,
    REACH,
    ROUND,
    SPAN,
    STAGE,
    STAGED,
    STARTS,
    STOP,
    Columns,
    Guarding,
    Solving,
    Stepping,
    Watching,
    Work,
)

TINY = 1e-12  # s, moves that lie no further apart are one
NOT_ENDED = -1


@part
def begin(
    top: Topology,
    table: Floats,
    starts: Floats,
    program: Program,
    rows: Rows,
    control: Control,
    results: Results,
    work: Work,
    w: int,
    lane: int,
) -> None:
    """Put a lane into column w, at the start of its program."""
    columns, solving, _, watching, guarding = work
    clock, x, p = columns.clock, solving.x, solving.p
    columns.lane[w] = lane
    begin_lane(w, lane, table, starts, program.sine, p, x, solving.seen, results.work, clock)
    open_rows(
        rows.row, rows.offset, w, lane, watching.window, results.value, results.time, results.status, watching.best
    )
    watching.listed_until[w] = -1.0
    segment = min(next_segment(program.length, lane, -1), program.length.shape[1] - 1)
    columns.segment[w] = segment
    clock[MOST, w] = GLANCES
    clock[SPAN, w] = program.length[lane, segment]
    clock[PAUSE, w] = control.bounds[4]
    set_switches(program.switched, program.switch, lane, segment, 0.0, w, p)
    if top.group[GUARD] < top.group[FAMILIES]:
        rest_guards(top.element, top.group, w, x, p, guarding.told, guarding.due, guarding.left)
    columns.phase[w] = GLANCE


@part
def onward(top: Topology, program: Program, rows: Rows, control: Control, results: Results, work: Work, w: int) -> bool:
    """Set the lane in column w off to what comes next, or end it; return whether a conductance of it changed."""
    columns, solving, stepping, watching, guarding = work
    clock, came, phase = columns.clock, columns.came, columns.phase
    if came[w] == STAGED:
        phase[w] = END
        now = clock[NOW, w] + clock[LENGTH, w]
        turned = now
        switches = columns.moving[w] != 0
        moved = False
    else:
        how = seen_of(rows, results, columns, stepping, watching, w)
        goes_on = how == NOT_ENDED and came[w] != LOOKED
        leaps = came[w] == LOOKED or (came[w] == AGAIN and clock[NEXT, w] == 0.0)
        moved = False
        if goes_on and clock[NOW, w] >= clock[SPAN, w]:
            goes_on = next_begins(program.length, control.bounds, results.work, columns, w)
            if goes_on:
                leaps = program.restart[columns.segment[w]] == 1
            else:
                how = DONE
        if goes_on and contacts_move(top, solving, stepping, guarding, clock, w):
            leaps = moved = True
        if how == NOT_ENDED and not leaps:
            how = bounded(control.bounds, results.work, columns, w)
        if how != NOT_ENDED:
            end(rows, results, columns, watching, w, how)
        if came[w] == FINISHED or came[w] == NOTHING:
            return moved
        came[w] = STARTS
        turned = clock[NOW, w]
        if leaps:
            phase[w] = LEAP
            clock[MOST, w] = control.bounds[2]
            reach(clock, w, JUMP, 0.0, 0.0)
            now = turned + JUMP
            switches = True
        else:
            phase[w] = STAGE
            clock[MOST, w] = control.bounds[1]
            switches = columns.moving[w] != 0 or turned == 0.0
            stop = clock[SPAN, w]
            if guarding.due.shape[1] > 0:
                stop = min(stop, next_due(guarding.due, w) - clock[BASE, w])
            length = next_length(clock, w, stop)
            reach(clock, w, A * length, A * length, GAMMA * length)
            now = turned + GAMMA * length
            turned = now
    # What stands at that instant.
    clock[ROUND, w] = 0.0
    lane, segment = columns.lane[w], columns.segment[w]
    if switches:
        columns.moving[w] = set_switches(program.switched, program.switch, lane, segment, turned, w, solving.p)
    free = top.size[1]
    known = top.size[2] - free - top.size[4]
    set_sources(
        program.source, program.sine, lane, segment, clock[BASE, w], now, free, known, w, solving.source, solving.x
    )
    return moved or (switches and program.switched.size > 0)


@part
def seen_of(rows: Rows, results: Results, columns: Columns, stepping: Stepping, watching: Watching, w: int) -> int:
    """Keep the state where states are traced; return STOPPED where what ends the lane was seen."""
    clock, came = columns.clock, columns.came
    if came[w] == AGAIN:
        return NOT_ENDED
    if results.trace_time.size > 0:
        more = trace(
            stepping.x0, watching.s0, watching.best, watching.best_at, w, clock[BASE, w] + clock[NOW, w],
            results.trace_time, results.trace_value, results.trace_used,
        )  # fmt: skip
        if not more and came[w] != LOOKED:
            clock[PAUSE_AT, w] = 0.0
    stop = rows.stop_row[0]
    if stop >= 0 and came[w] == ARRIVED and results.status[columns.lane[w], stop] == SEEN:
        if clock[HELD, w] == 0.0:
            return STOPPED
        clock[PAUSE_AT, w] = 0.0
    return NOT_ENDED


@part
def next_begins(spans: Floats, bounds: Ints, counts: Ints, columns: Columns, w: int) -> bool:
    """Whether a next segment begins for the lane, which is at the end of one."""
    clock, lane = columns.clock, columns.lane[w]
    clock[BASE, w] += clock[SPAN, w]
    clock[NOW, w] = 0.0
    segment = next_segment(spans, lane, columns.segment[w])
    columns.segment[w] = segment
    if segment == spans.shape[1]:
        return False
    clock[SPAN, w] = spans[lane, segment]
    clock[PAUSE, w] = float(counts[lane, 0] + bounds[4])
    columns.moving[w] = 0
    return True


@part
def contacts_move(
    top: Topology, solving: Solving, stepping: Stepping, guarding: Guarding, clock: Floats, w: int
) -> bool:
    """Whether contacts move now, which they do."""
    told, due, left = guarding
    if due.shape[1] == 0:
        return False
    instant = next_due(due, w)
    if instant - clock[BASE, w] > clock[NOW, w]:
        return False
    move_guards(top.element, top.group, instant + TINY, w, stepping.x0, solving.x, solving.p, told, due, left)
    return True


@part
def bounded(bounds: Ints, counts: Ints, columns: Columns, w: int) -> int:
    """Count another step, or have the lane wait; return OVERWORKED where it may take no more."""
    clock, lane = columns.clock, columns.lane[w]
    if counts[lane, 0] >= clock[PAUSE, w] or clock[BASE, w] + clock[NOW, w] >= clock[PAUSE_AT, w]:
        columns.phase[w] = PAUSED
        columns.came[w] = NOTHING
        return NOT_ENDED
    counts[lane, 0] += 1
    may = clock[MAY, w]
    return OVERWORKED if counts[lane, 0] > may * bounds[0] or counts[lane, 2] > may * bounds[3] else NOT_ENDED


@part
def next_length(clock: Floats, w: int, stop: float) -> float:
    """Return the length of the next step, which must not go beyond ``stop``, nor leave a crumb before it."""
    rest: float = stop - clock[NOW, w]
    length: float = min(clock[NEXT, w], clock[LONGEST, w])
    clock[STOP, w] = stop
    clock[LEFT, w] = rest
    clock[ASKED, w] = length
    if length >= rest * 0.999999:
        length = rest
    elif length > 0.5 * rest:
        length = 0.5 * rest
    clock[LENGTH, w] = length
    return length


@part
def reach(clock: Floats, w: int, ah: float, carry: float, ahead: float) -> None:
    """Note what the next iterates solve for: a h, what the start counts of it, and how far ahead."""
    clock[AH, w] = ah
    clock[CARRY, w] = carry
    clock[REACH, w] = ahead


@part
def end(rows: Rows, results: Results, columns: Columns, watching: Watching, w: int, how: int) -> None:
    """End a lane where it stands."""
    lane, now = columns.lane[w], columns.clock[BASE, w] + columns.clock[NOW, w]
    if how != OVERWORKED:
        close_rows(
            rows.row, watching.window, now, w, lane, results.value, results.time, results.status,
            watching.best, watching.best_at,
        )  # fmt: skip
    results.ended[lane, 0] = how
    results.ended[lane, 1] = 0
    results.ended_at[lane] = now
    columns.came[w] = FINISHED
