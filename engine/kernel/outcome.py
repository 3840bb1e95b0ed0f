"""What came of an iterate, lane by lane: a step is taken, begun again shorter, or given up."""

from __future__ import annotations

from .compiled import part
from .course import keep_states
from .guards import watch_guards
from .layout import UNSOLVED, Floats, Ints, Results, Rows, Topology
from .newton import worst_unknown
from .rows import watch
from .steps import GAMMA
from .work import (
    AGAIN,
    ARRIVED,
    ASKED,
    BASE,
    BEGAN,
    ERROR,
    FINISHED,
    GLANCE,
    GOES_ON,
    GREW,
    GROWTH,
    HELD,
    IDLE,
    LAST,
    LEAP,
    LEAPT,
    LEFT,
    LENGTH,
    LIMITED,
    LOOKED,
    LOST,
    NEXT,
    NOTHING,
    NOW,
    PAUSED,
    ROUND,
    SPAN,
    STAGE,
    STAGED,
    STOP,
    SURPRISE,
    TOOK,
    Columns,
    Solving,
    Work,
)

JUMP = 1e-12  # s, the backward-Euler step that takes in a jump
FIRST = 1e-10  # s, the first step after it
ROUGHLY = 100.0  # times the tolerance, the error of that step: what settles in less than it would ring
SMALLEST = 1e-16  # s
SNAP = 0.2  # V, a step whose end was expected further away is taken again, shorter, unless it is shorter than
SNAPPED = 1e-9  # s
MOST_GROWN = 3.0
MOST_GREW = 4.0  # an error below a hundredth of the allowed one says little about the next
GLANCES = 12  # looks at the start until junctions, limited in each, have their charges at any sensible voltage


@part
def outcome(top: Topology, rows: Rows, results: Results, work: Work, w: int) -> int:
    """Return what came of the iterate for the lane in column w, whose rows, guards and next step are told of it."""
    columns, solving, stepping, watching, guarding = work
    clock, came, failed = columns.clock, columns.came[w], columns.failed[w]
    lane, doing = columns.lane[w], columns.phase[w]
    if doing == GLANCE:
        return LOOKED if clock[LIMITED, w] == 0.0 or clock[ROUND, w] >= GLANCES else NOTHING
    if doing == GOES_ON:
        return AGAIN
    if doing == IDLE or doing == PAUSED or (came == 0 and failed == 0):
        return NOTHING
    counts = results.work
    counts[lane, 2] += int(clock[ROUND, w])
    if came == 0:
        counts[lane, 3] += 1
        return given_up(columns, solving, results.ended, results.ended_at, w)
    if doing == STAGE:
        return STAGED
    gamma = 0.0 if doing == LEAP else GAMMA
    length = min(JUMP, 0.5 * (clock[SPAN, w] - clock[NOW, w])) if doing == LEAP else clock[LENGTH, w]
    begin = clock[BASE, w] + clock[NOW, w]
    again = 0.0 if doing == LEAP else shorter(clock, w)
    if again == 0.0 and guarding.due.shape[1] > 0:
        moves = watch_guards(
            top.element, top.group, begin, length, gamma, w, stepping.x0,
            solving.x if doing == LEAP else stepping.xg, solving.x, solving.p, guarding.told, guarding.due,
        )  # fmt: skip
        if moves and doing != LEAP:
            # Something moves within this step: it is taken again, up to there.
            again = length
    if again > 0.0:
        counts[lane, 1] += 1
        clock[NEXT, w] = again
        return AGAIN
    clock[BEGAN, w] = begin
    clock[TOOK, w] = length
    watch(
        rows.row, rows.level, rows.offset, watching.window, begin, length, gamma, w, lane,
        watching.s0, watching.s1 if doing == LEAP else watching.sg, watching.s1,
        results.value, results.time, results.status,
        watching.listed, watching.listed_until, watching.best, watching.best_at,
    )  # fmt: skip
    keep_states(rows.keep_row, results.status, solving.x, begin + length, w, lane, results.kept, results.kept_at)
    if doing == LEAP:
        counts[lane, 0] += 1
        clock[NOW, w] += length
        clock[NEXT, w] = FIRST
        clock[LAST, w] = 0.0
        return LEAPT
    go_ahead(clock, w)
    return ARRIVED


@part
def shorter(clock: Floats, w: int) -> float:
    """Return the length with which the step must be taken again, 0 where it is good."""
    length: float = clock[LENGTH, w]
    # The first step after a jump is judged roughly: what a step of 1 ps leaves in the last digits of a large charge
    # counts as a current there, and shorter steps would only make it larger.
    is_first = clock[LAST, w] == 0.0
    if clock[ERROR, w] > (ROUGHLY if is_first else 1.0) and length > JUMP:
        # Nothing here is quicker than a picosecond but a junction that has lost its last charge.
        shortest: float = clock[GROWTH, w]
        return max(length * max(0.1, shortest), JUMP)
    if not is_first and clock[SURPRISE, w] > SNAP and length > SNAPPED:
        return max(0.1 * length, SNAPPED)
    return 0.0


@part
def go_ahead(clock: Floats, w: int) -> None:
    """The step is taken: where the lane stands now, and how long the next step may be."""
    length, last, grow = clock[LENGTH, w], clock[LAST, w], clock[GROWTH, w]
    # Predictive control: where steps must get shorter and shorter, the next is not as long as the error of this one
    # alone would have it (Gustafsson, ACM Trans. Math. Softw. 20 (1994) 496).
    grow = max(grow, 1.0) if last == 0.0 else min(grow, grow * grow / clock[GREW, w] * length / last)
    clock[GREW, w] = min(clock[GROWTH, w], MOST_GREW)
    clock[LAST, w] = length
    clock[NOW, w] = clock[STOP, w] if length == clock[LEFT, w] else clock[NOW, w] + length
    wanted = max(length * min(MOST_GROWN, grow), JUMP)
    asked = clock[ASKED, w]
    clock[NEXT, w] = wanted if length == asked else max(wanted, min(asked, MOST_GROWN * length))


@part
def given_up(columns: Columns, solving: Solving, ended: Ints, ended_at: Floats, w: int) -> int:
    """Return what a lane does whose iterates found no solution."""
    clock, lane = columns.clock, columns.lane[w]
    clock[NEXT, w] = clock[LENGTH, w] * 0.1
    if columns.phase[w] != LEAP:
        if clock[NEXT, w] < SMALLEST:
            # There is no way on from here however short the step: what has lost its balance jumps.
            clock[NEXT, w] = 0.0
        return AGAIN
    if clock[HELD, w] > 0.0:
        columns.phase[w] = PAUSED
        clock[HELD, w] = LOST
        return NOTHING
    ended[lane, 0] = UNSOLVED
    ended[lane, 1] = worst_unknown(solving.tolerance, solving.bend, solving.step, w)
    ended_at[lane] = clock[BASE, w] + clock[NOW, w]
    return FINISHED
