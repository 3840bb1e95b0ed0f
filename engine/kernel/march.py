"""Lanes from power-up to the end: TR-BDF2 with limited Newton, exact events, per-lane step control.

TR-BDF2: Bank, Coughran, Fichtner, Grosse, Rose, Smith, IEEE Trans. CAD 4 (1985) 436; embedded third-order error and
the filter through the iteration matrix: Hosea, Shampine, Appl. Numer. Math. 20 (1996) 21. Both stages share C + a h G.
"""

from __future__ import annotations

import math

import numpy as np

from .assemble import evaluate, linear_matrix
from .compiled import compiled, leaf
from .elimination import copy, substitute
from .layout import (
    DONE,
    OVERWORKED,
    SEEN,
    STOPPED,
    TRACE_FULL,
    UNSOLVED,
    Bytes,
    Control,
    Floats,
    Ints,
    Places,
    Program,
    Results,
    Rows,
    Topology,
)
from .newton import ROUND_OFF, solve
from .rows import GAMMA, close_rows, keep_signals, open_rows, watch

A = 1.0 - 0.5 * math.sqrt(2.0)
TO_STAGE = 1.0 / (GAMMA * (2.0 - GAMMA))
TO_START = (1.0 - GAMMA) * (1.0 - GAMMA) / (GAMMA * (2.0 - GAMMA))
ERROR_START = (math.sqrt(2.0) - 1.0) / 3.0
ERROR_STAGE = -1.0 / 3.0
ERROR_END = 2.0 * A / 3.0

JUMP = 1e-12  # s, the backward-Euler step that takes in a jump
FIRST = 1e-10  # s, the first step after it
SMALLEST = 1e-16  # s
GLANCES = 12  # looks at the start until junctions, limited in each, have their charges at any sensible voltage


@leaf
def set_sources(source: Floats, sine: Floats, base: float, t: float, n_free: int, out: Floats, x: Floats) -> None:
    """Set every source to its value at t seconds after the segment's start at base, and the known nets in x to it."""
    known = x.size - n_free
    for k in range(out.size):
        v = source[k, 0] + source[k, 1] * t
        if sine[k, 0] != 0.0:
            v += sine[k, 0] * math.sin(2.0 * math.pi * sine[k, 1] * (base + t) + sine[k, 2])
        out[k] = v
        if k < known:
            x[n_free + k] = v


@leaf
def set_switches(switched: Ints, switch: Floats, t: float, p: Floats) -> bool:
    """Set the parameters that events move; return whether any of them moves within this segment."""
    moving = False
    for k in range(switched.size):
        moving = moving or switch[k, 1] != 0.0
        p[switched[k]] = switch[k, 0] + switch[k, 1] * t
    return moving


@leaf
def error_of(
    relative: Floats,
    absolute: Floats,
    pivot: Places,
    entry: Places,
    factors: Floats,
    rhs: Floats,
    x0: Floats,
    x1: Floats,
    i0: Floats,
    ig: Floats,
    i1: Floats,
    q1: Floats,
    a: Floats,
    diagonal: Places,
    h: float,
) -> float:
    """Return the largest filtered error of the step in parts of the tolerance (1 = just allowed)."""
    for k in range(rhs.size):
        r = h * (ERROR_START * i0[k] + ERROR_STAGE * ig[k] + ERROR_END * i1[k])
        if abs(r) <= 4.0 * ROUND_OFF * (abs(q1[k]) + abs(a[diagonal[k]] * x1[k])):
            r = 0.0
        rhs[k] = r
    substitute(factors, rhs, pivot, entry)
    largest = 0.0
    for k in range(rhs.size):
        size = max(abs(x0[k]), abs(x1[k]))
        largest = max(largest, abs(rhs[k]) / (relative[k] * size + absolute[k]))
    return largest


@leaf
def keep_states(keep_row: Ints, status: Ints, x: Floats, at: float, kept: Floats, kept_at: Floats) -> None:
    """Keep the state at the end of the step in which a row was seen for which that was asked."""
    for k in range(keep_row.size):
        if kept_at[k] < 0.0 and status[keep_row[k]] == SEEN:
            kept_at[k] = at
            for n in range(x.size):
                kept[k, n] = x[n]


@leaf
def keep_parabola(x0: Floats, xg: Floats, x1: Floats, h: float, first: Floats, second: Floats) -> None:
    """Keep the parabola of an accepted step, about its end, for the predictor of the next."""
    for k in range(first.size):
        end = (x1[k] - xg[k]) / ((1.0 - GAMMA) * h)
        bend = (end - (xg[k] - x0[k]) / (GAMMA * h)) / h
        first[k] = end + bend * (1.0 - GAMMA) * h
        second[k] = bend


@compiled
def march_lane(
    top: Topology,
    table: Floats,
    starts: Floats,
    program: Program,
    rows: Rows,
    control: Control,
    results: Results,
    lane: int,
) -> tuple[int, int, float]:
    """Step one lane through all its segments; return how it ended, near which unknown, and when."""
    element = top.element
    group = top.group
    pivot = top.pivot
    entry = top.entry
    update = top.update
    nets = top.size[0]
    free = top.size[1]
    n_all = top.size[2]
    entries = top.size[3]
    sine = program.sine[lane]
    length = program.length[lane]
    relative = control.relative
    absolute = control.absolute
    bounds = control.bounds
    value = results.value[lane]
    time = results.time[lane]
    status = results.status[lane]
    counts = results.work[lane]
    x0 = results.final[lane]
    kept = results.kept[lane]
    kept_at = results.kept_at[lane]
    row = rows.row
    stop_row = rows.stop_row[0]
    tracing = results.trace_time.size > 0

    p = table[lane].copy()
    copy(starts[lane], x0)
    # Start, stage and end of a step: voltages, charges, currents. One array each is much quicker to compile.
    states = np.zeros((8, n_all))
    xg, x1, q0, qg = states[0], states[1], states[2], states[3]
    q1, i0, ig, i1 = states[4], states[5], states[6], states[7]
    vectors = np.zeros((5, free))
    first, second, constant, tolerance, rhs = vectors[0], vectors[1], vectors[2], vectors[3], vectors[4]
    matrices = np.zeros((3, entries + 1))
    a, factors, linear = matrices[0], matrices[1], matrices[2]
    devices = np.zeros((5, np.int64(group[4]) - np.int64(group[3]) + 2 * (np.int64(group[5]) - np.int64(group[4]))))
    seen, seen0, flow0, flow_g, flow = devices[0], devices[1], devices[2], devices[3], devices[4]
    signals = np.zeros((3, rows.signal.size - 1))
    s0, sg, s1 = signals[0], signals[1], signals[2]
    read_at = np.zeros(rows.signal.size - 1, dtype=np.int64)
    now = 1
    source = np.zeros(program.source.shape[2])
    window = np.zeros((row.shape[0], 2))
    diagonal = np.zeros(free, dtype=np.uint32)
    for n in range(free):
        diagonal[pivot[n, 0]] = pivot[n, 1]

    fastest = 0.0
    for k in range(sine.shape[0]):
        if sine[k, 0] != 0.0:
            fastest = max(fastest, sine[k, 1])
    longest = 0.05 / fastest if fastest > 0.0 else math.inf

    open_rows(row, rows.offset, window, value, time, status)
    counts[:] = 0
    base = 0.0
    h = FIRST
    last = 0.0
    fresh = True
    worst = 0
    for segment in range(length.size):
        span = length[segment]
        if span <= 0.0:
            continue
        sources = program.source[lane, segment]
        switch = program.switch[lane, segment]
        t = 0.0
        if program.restart[segment] == 1 or fresh:
            if fresh:
                # What the signals are before anything happens.
                set_switches(program.switched, switch, 0.0, p)
                for _ in range(GLANCES):
                    if evaluate(element, group, p, source, linear, 0.0, x0, i0, q0, a, seen, flow, True) < math.inf:
                        break
                copy(flow, flow0)
                if tracing:
                    copy(x0, results.trace_value[0])
                    results.trace_used[0] = 1
                fresh = False
            keep_signals(element, group, rows.term, rows.factor, rows.signal, p, x0, flow0, now, s1, read_at)
            set_switches(program.switched, switch, 0.0, p)
            linear_matrix(element, group, p, JUMP, linear)
            # The charges at the start are those of its voltages, whatever the sources did meanwhile.
            evaluate(element, group, p, source, linear, JUMP, x0, i0, q0, a, seen, flow, True)
            copy(x0, x1)
            set_sources(sources, sine, base, JUMP, free, source, x1)
            for k in range(free):
                constant[k] = -q0[k]
                tolerance[k] = relative[k] * abs(x0[k]) + absolute[k]
            used, worst = solve(
                element, group, pivot, entry, update, nets, p, source, linear, constant, tolerance, diagonal,
                x1, i1, q1, a, factors, rhs, seen, flow, JUMP, bounds[2],
            )  # fmt: skip
            if used < 0:
                return UNSOLVED, worst, base
            counts[0] += 1
            counts[2] += used
            t = min(JUMP, 0.5 * span)
            now += 1
            watch(
                element, group, rows.term, rows.factor, rows.signal, row, rows.level, rows.offset, window, p,
                x0, x1, x1, flow0, flow, flow, base, t, 0.0, now, s0, sg, s1, read_at, value, time, status,
            )  # fmt: skip
            keep_states(rows.keep_row, status, x1, base + t, kept, kept_at)
            first[:] = 0.0
            second[:] = 0.0
            h = FIRST
            last = 0.0
            copy(x1, x0)
            copy(i1, i0)
            copy(q1, q0)
            copy(flow, flow0)
            copy(seen, seen0)
            if tracing:
                n = results.trace_used[0]
                if n >= results.trace_time.size:
                    return TRACE_FULL, 0, base
                results.trace_time[n] = base + t
                copy(x0, results.trace_value[n])
                results.trace_used[0] = n + 1
        while t < span:
            left = span - t
            h = min(h, longest)
            asked = h
            if h >= left * 0.999999:
                h = left
            elif h > 0.5 * left:
                h = 0.5 * left
            counts[0] += 1
            if counts[0] > bounds[0]:
                return OVERWORKED, worst, base + t

            # Stage at gamma h by the trapezoidal rule, from the parabola of the step before.
            ah = A * h
            d = GAMMA * h
            moving = set_switches(program.switched, switch, t + d, p)
            linear_matrix(element, group, p, ah, linear)
            set_sources(sources, sine, base, t + d, free, source, xg)
            for k in range(free):
                xg[k] = x0[k] + d * (first[k] + d * second[k])
                x1[k] = xg[k]
                constant[k] = -q0[k] + ah * i0[k]
                tolerance[k] = relative[k] * abs(x0[k]) + absolute[k]
            used, worst = solve(
                element, group, pivot, entry, update, nets, p, source, linear, constant, tolerance, diagonal,
                xg, ig, qg, a, factors, rhs, seen, flow, ah, bounds[1],
            )  # fmt: skip
            again = -1
            if used >= 0:
                copy(flow, flow_g)
                # End by the second backward difference, from the cubic through the parabola and the stage.
                if moving:
                    set_switches(program.switched, switch, t + h, p)
                    linear_matrix(element, group, p, ah, linear)
                set_sources(sources, sine, base, t + h, free, source, x1)
                reach = 1.0 / GAMMA
                if last > 0.0:
                    before = (1.0 - GAMMA) * last
                    reach = h * (h + last) * (h + before) / (d * (d + last) * (d + before))
                for k in range(free):
                    miss = xg[k] - x1[k]
                    x1[k] = x0[k] + h * (first[k] + h * second[k]) + miss * reach
                    constant[k] = TO_START * q0[k] - TO_STAGE * qg[k]
                again, worst = solve(
                    element, group, pivot, entry, update, nets, p, source, linear, constant, tolerance, diagonal,
                    x1, i1, q1, a, factors, rhs, seen, flow, ah, bounds[1],
                )  # fmt: skip
            if again < 0:
                counts[3] += 1
                copy(seen0, seen)
                h *= 0.1
                if h < SMALLEST:
                    return UNSOLVED, worst, base + t
                continue
            counts[2] += used + again

            error = error_of(relative, absolute, pivot, entry, factors, rhs, x0, x1, i0, ig, i1, q1, a, diagonal, h)
            factor_h = 0.85 * error ** (-1.0 / 3.0) if error > 1e-6 else 85.0
            if last == 0.0:
                # The first step after a jump is not judged: what a step of 1 ps leaves in the last digits of a large
                # charge counts as a current there, and shorter steps would only make it larger.
                factor_h = max(factor_h, 1.0)
            elif error > 1.0 and h > JUMP:
                # Nothing here is quicker than a picosecond but a junction that has lost its last charge.
                counts[1] += 1
                copy(seen0, seen)
                h = max(h * max(0.1, factor_h), JUMP)
                continue

            now += 1
            watch(
                element, group, rows.term, rows.factor, rows.signal, row, rows.level, rows.offset, window, p,
                x0, xg, x1, flow0, flow_g, flow, base + t, h, GAMMA, now, s0, sg, s1, read_at, value, time, status,
            )  # fmt: skip
            keep_states(rows.keep_row, status, x1, base + t + h, kept, kept_at)
            keep_parabola(x0, xg, x1, h, first, second)
            copy(x1, x0)
            copy(i1, i0)
            copy(q1, q0)
            copy(flow, flow0)
            copy(seen, seen0)
            last = h
            t = span if h == left else t + h
            if tracing:
                n = results.trace_used[0]
                if n >= results.trace_time.size:
                    return TRACE_FULL, 0, base + t
                results.trace_time[n] = base + t
                copy(x0, results.trace_value[n])
                results.trace_used[0] = n + 1
            if stop_row >= 0 and status[stop_row] == SEEN:
                close_rows(row, window, base + t, status)
                return STOPPED, 0, base + t
            wanted = h * min(3.0, factor_h)
            h = max(wanted, JUMP) if h == asked else max(wanted, min(asked, 3.0 * h), JUMP)
        base += span
    close_rows(row, window, base, status)
    return DONE, 0, base


@compiled
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
) -> None:
    """Step lanes low .. high-1; stop between lanes when ``cancel[0]`` is set."""
    for lane in range(low, high):
        if cancel[0] != 0:
            return
        how, worst, at = march_lane(top, table, starts, program, rows, control, results, lane)
        results.ended[lane, 0] = how
        results.ended[lane, 1] = worst
        results.ended_at[lane] = at
