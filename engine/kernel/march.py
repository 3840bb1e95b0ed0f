"""Lanes from power-up to the end: exact events, a step length and a Newton iteration for each lane.

The lanes of a row advance together, one iterate at a time, each in its own phase of its own step: no lane waits for
another, and a lane that ends makes room for the next.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from . import machine_code
from .assemble import linear_matrices
from .compiled import COMPILED, leaf
from .iterate import iterate, set_off, settle
from .layout import TRACE_FULL, Bytes, Control, Floats, Program, Results, Rows, Topology
from .onward import begin, onward
from .outcome import outcome
from .vectors import WIDTH, any_of, same
from .work import (
    BASE,
    FINISHED,
    IDLE,
    LAST_WORK,
    NOTHING,
    NOW,
    PAUSED,
    Work,
)


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
    columns, solving, stepping, _, _ = work
    phase, came = columns.phase, columns.came
    for w in range(WIDTH):
        came[w] = FINISHED if phase[w] == IDLE else NOTHING
    if any_of(~same(phase, IDLE)):
        linear_matrices(top.element, top.group, solving.p, solving.c, solving.g)  # lanes may have been put back
    while True:
        # Lanes that ended make room; what is left over idles on the last one's numbers.
        dirty = False
        for w in range(WIDTH):
            if came[w] == FINISHED:
                came[w] = NOTHING
                phase[w] = IDLE
                lane = low + columns.begun[0]
                if lane < high:
                    columns.begun[0] += 1
                    begin(top, table, starts, program, rows, control, results, work, w, lane)
                    dirty = True
        if cancel[0] != 0 or not any_of(~(same(phase, IDLE) | same(phase, PAUSED))):
            return
        if dirty:
            linear_matrices(top.element, top.group, solving.p, solving.c, solving.g)
        iterate(top, rows, control, work)
        for w in range(WIDTH):
            came[w] = outcome(top, rows, results, work, w)
        settle(rows, work)
        dirty = False
        for w in range(WIDTH):
            if came[w] != NOTHING and came[w] != FINISHED:
                changed = onward(top, program, rows, control, results, work, w)
                dirty = dirty or changed
        set_off(control, work)
        if dirty:
            linear_matrices(top.element, top.group, solving.p, solving.c, solving.g)
        for w in range(WIDTH):
            if came[w] == FINISHED:
                for k in range(solving.x.shape[0]):
                    results.final[columns.lane[w], k] = stepping.x0[k, w]


GoOn = Callable[[Work, list[int], Results], Results]
"""What is done when all lanes of a row that are not at their end are paused, in these columns: it ends some of them
(:func:`end_lane`), lets others go on (``GOES_ON``, or ``GLANCE`` from another state), and returns what to fill in."""


def end_lane(work: Work, w: int, results: Results, how: int) -> None:
    """End the paused lane in column ``w`` where it stands."""
    lane = work.columns.lane[w]
    results.ended[lane] = how, 0
    results.ended_at[lane] = work.columns.clock[BASE, w] + work.columns.clock[NOW, w]
    results.final[lane] = work.stepping.x0[:, w]
    work.columns.phase[w] = IDLE


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
        paused = [w for w in range(WIDTH) if held.work.columns.phase[w] == PAUSED]
        if cancel[0] != 0 or not paused:
            LAST_WORK.held = held
            return
        results = go_on(held.work, paused, results)
