"""The course of a sequence in a lane: its segments, what sources and events set in them, states that are kept."""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import SEEN, Floats, Ints
from .work import AH, BASE, HELD, LONGEST, MAY, NOW, PAUSE_AT, ROUND


@leaf
def set_sources(
    source: Floats,
    sine: Floats,
    lane: int,
    segment: int,
    base: float,
    t: float,
    n_free: int,
    known: int,
    w: int,
    out: Floats,
    x: Floats,
) -> None:
    """Set every source to its value at t seconds after the segment's start at base, and the known nets in x to it."""
    for k in range(out.shape[0]):
        v = source[lane, segment, k, 0] + source[lane, segment, k, 1] * t
        if sine[lane, k, 0] != 0.0:
            v += sine[lane, k, 0] * math.sin(2.0 * math.pi * sine[lane, k, 1] * (base + t) + sine[lane, k, 2])
        out[k, w] = v
        if k < known:
            x[n_free + k, w] = v


@leaf
def set_switches(switched: Ints, switch: Floats, lane: int, segment: int, t: float, w: int, p: Floats) -> int:
    """Set the parameters that events move; return 1 where any of them moves within this segment."""
    moving = 0
    for k in range(switched.size):
        if switch[lane, segment, k, 1] != 0.0:
            moving = 1
        p[switched[k], w] = switch[lane, segment, k, 0] + switch[lane, segment, k, 1] * t
    return moving


@leaf
def keep_states(
    keep_row: Ints, status: Ints, x: Floats, at_time: float, w: int, lane: int, kept: Floats, kept_at: Floats
) -> None:
    """Keep the state at the end of the step in which a row was seen for which that was asked."""
    for k in range(keep_row.size):
        if kept_at[lane, k] < 0.0 and status[lane, keep_row[k]] == SEEN:
            kept_at[lane, k] = at_time
            for n in range(x.shape[0]):
                kept[lane, k, n] = x[n, w]


@leaf
def trace(
    x: Floats,
    signals: Floats,
    best: Floats,
    best_at: Floats,
    w: int,
    when: float,
    times: Floats,
    values: Floats,
    used: Ints,
) -> bool:
    """Keep a point of the lane in column w, its unknowns and, where there is room for them, its signals and lasting
    rows; return False where that was the last. Nothing is kept while ``used`` is below 0."""
    n = used[w]
    if n < 0:
        return True
    if n < times.shape[1]:
        times[w, n] = when
        for k in range(x.shape[0]):
            values[w, n, k] = x[k, w]
        if values.shape[2] > x.shape[0]:
            behind = x.shape[0]
            for k in range(signals.shape[0]):
                values[w, n, behind + k] = signals[k, w]
            behind += signals.shape[0]
            for k in range(best.shape[0]):
                values[w, n, behind + 2 * k] = best[k, w]
                values[w, n, behind + 2 * k + 1] = best_at[k, w]
        used[w] = n + 1
    return not used[w] >= times.shape[1]


@leaf
def next_segment(length: Floats, lane: int, after: int) -> int:
    """Return the next segment that takes time, or as many as there are."""
    k = after + 1
    while k < length.shape[1] and length[lane, k] <= 0.0:
        k += 1
    return k


@leaf
def begin_lane(
    w: int,
    lane: int,
    table: Floats,
    starts: Floats,
    sine: Floats,
    p: Floats,
    x: Floats,
    seen: Floats,
    counts: Ints,
    clock: Floats,
) -> None:
    """Fill column w with a lane at the begin of its sequence; a sine caps its steps at a twentieth of the period."""
    for k in range(p.shape[0]):
        p[k, w] = table[lane, k]
    for k in range(x.shape[0]):
        x[k, w] = starts[lane, k]
    for k in range(seen.shape[0]):
        seen[k, w] = 0.0
    for k in range(counts.shape[1]):
        counts[lane, k] = 0
    fastest = 0.0
    for k in range(sine.shape[1]):
        if sine[lane, k, 0] != 0.0:
            fastest = max(fastest, sine[lane, k, 1])
    clock[LONGEST, w] = 0.05 / fastest if fastest > 0.0 else math.inf
    clock[BASE, w] = 0.0
    clock[NOW, w] = 0.0
    clock[PAUSE_AT, w] = math.inf
    clock[HELD, w] = 0.0
    clock[MAY, w] = 1.0
    clock[AH, w] = 0.0
    clock[ROUND, w] = 0.0
