"""Observation rows: what is noted while a lane is stepped, so that no trace has to be kept.

A step offers every signal at its start, its stage and its end; between them a signal is the parabola through the three.
"""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import (
    E_A,
    E_B,
    E_C,
    E_PARAMETER,
    JUNCTION,
    NOT_YET,
    OPEN,
    R_CROSSING,
    R_INTEGRAL,
    R_LEVEL,
    R_MAXIMUM,
    R_MINIMUM,
    R_SLEW,
    ROW_DIRECTION,
    ROW_FROM,
    ROW_KIND,
    ROW_NTH,
    ROW_SIGNAL,
    ROW_TO,
    S_BASE_CURRENT,
    S_CHANNEL_POWER,
    S_COLLECTOR_CURRENT,
    S_CONDUCTANCE_CURRENT,
    S_CONDUCTANCE_POWER,
    S_DRAIN_CURRENT,
    S_JUNCTION_CURRENT,
    S_JUNCTION_POWER,
    S_UNKNOWN,
    S_WARM_CURRENT,
    S_WARM_POWER,
    SEEN,
    TRANSPORT,
    Floats,
    Ints,
    Places,
)
from .vectors import Flags, any_of, at, put

GAMMA = 2.0 - math.sqrt(2.0)


@leaf
def read_signals(
    element: Places,
    group: Places,
    term: Ints,
    factor: Floats,
    signal: Ints,
    p: Floats,
    x: Floats,
    flow: Floats,
    out: Floats,
) -> None:
    """Set out (signals, WIDTH) to the signals at x, ``flow`` being the currents of junctions and transistors there."""
    for s in range(signal.size - 1):
        total = 0.0 * at(x, 0)
        for t in range(signal[s], signal[s + 1]):
            kind = term[t, 0]
            k = term[t, 1]
            v = total
            if kind == S_UNKNOWN:
                v = at(x, k)
            elif kind == S_CONDUCTANCE_CURRENT or kind == S_CONDUCTANCE_POWER:
                across = at(x, element[k, E_A]) - at(x, element[k, E_B])
                v = at(p, element[k, E_PARAMETER]) * across
                if kind == S_CONDUCTANCE_POWER:
                    v = v * across
            elif kind == S_JUNCTION_CURRENT or kind == S_JUNCTION_POWER:
                v = at(flow, k - group[JUNCTION])
                if kind == S_JUNCTION_POWER:
                    v = v * (at(x, element[k, E_A]) - at(x, element[k, E_B]))
            elif kind == S_DRAIN_CURRENT or kind == S_CHANNEL_POWER or kind == S_WARM_CURRENT or kind == S_WARM_POWER:
                own = 2 * (k - group[TRANSPORT]) - group[JUNCTION] + group[TRANSPORT]
                v = at(flow, own)
                if kind == S_CHANNEL_POWER or kind == S_WARM_POWER:
                    v = v * (at(x, element[k, E_A]) - at(x, element[k, E_C]))
            else:
                own = 2 * (k - group[TRANSPORT]) - group[JUNCTION] + group[TRANSPORT]
                ic = at(flow, own)
                ib = at(flow, own + 1)
                if kind == S_COLLECTOR_CURRENT:
                    v = ic
                elif kind == S_BASE_CURRENT:
                    v = ib
                else:
                    ve = at(x, element[k, E_C])
                    v = ic * (at(x, element[k, E_A]) - ve) + ib * (at(x, element[k, E_B]) - ve)
            total = total + factor[t] * v
        put(out, s, total)


@leaf
def parabola(y0: float, yg: float, y1: float, u: float, gamma: float) -> float:
    """Return the value at fraction u of the step of the parabola through (0, y0), (gamma, yg), (1, y1)."""
    if gamma <= 0.0:
        return y0 + (y1 - y0) * u
    d1 = (yg - y0) / gamma
    d2 = (y1 - yg) / (1.0 - gamma) - d1
    return y0 + u * (d1 + (u - gamma) * d2)


@leaf
def area(y0: float, yg: float, y1: float, u0: float, u1: float, gamma: float) -> float:
    """Return the integral of :func:`parabola` from u0 to u1 (Simpson's rule, exact for parabolas)."""
    mid = parabola(y0, yg, y1, 0.5 * (u0 + u1), gamma)
    ends = parabola(y0, yg, y1, u0, gamma) + parabola(y0, yg, y1, u1, gamma)
    return (u1 - u0) * (ends + 4.0 * mid) / 6.0


@leaf
def crossing(y0: float, yg: float, y1: float, level: float, rising: float, after: float, gamma: float) -> float:
    """Return the fraction of the step at which the parabola first crosses the level beyond ``after``, or -1."""
    low = after
    ylow = parabola(y0, yg, y1, after, gamma) - level
    for part in range(2):
        high = gamma if part == 0 else 1.0
        if high <= low:
            continue
        yhigh = (yg if part == 0 else y1) - level
        if rising * ylow <= 0.0 and rising * yhigh > 0.0:
            for _ in range(50):
                mid = 0.5 * (low + high)
                if rising * (parabola(y0, yg, y1, mid, gamma) - level) > 0.0:
                    high = mid
                else:
                    low = mid
            return high
        low = high
        ylow = yhigh
    return -1.0


@leaf
def open_rows(
    row: Ints,
    offset: Floats,
    w: int,
    lane: int,
    window: Floats,
    value: Floats,
    time: Floats,
    status: Ints,
    best: Floats,
) -> None:
    """Reset all rows of a lane and set the windows that do not wait for another row."""
    for r in range(row.shape[0]):
        value[lane, r] = 0.0
        time[lane, r] = 0.0
        status[lane, r] = NOT_YET
        best[r, w] = math.inf
        window[w, r, 0] = offset[r, 0] if row[r, ROW_FROM] < 0 else math.inf
        window[w, r, 1] = offset[r, 1] if row[r, ROW_TO] < 0 else math.inf


@leaf
def note(
    kind: int,
    rising: float,
    nth: int,
    level: float,
    y0: float,
    yg: float,
    y1: float,
    begin: float,
    h: float,
    gamma: float,
    opens: float,
    closes: float,
    lane: int,
    r: int,
    value: Floats,
    time: Floats,
    status: Ints,
) -> None:
    """Update row r with a signal that is y0, yg, y1 at start, stage and end of the step, within the row's window."""
    u0 = (opens - begin) / h if opens > begin else 0.0
    u1 = (closes - begin) / h if closes < begin + h else 1.0
    if kind == R_LEVEL:
        value[lane, r] = parabola(y0, yg, y1, min(u0, 1.0), gamma)
        time[lane, r] = opens
        status[lane, r] = SEEN
    elif kind == R_CROSSING:
        u = crossing(y0, yg, y1, level, rising, u0, gamma)
        if 0.0 <= u <= u1:
            # Crossings before the wanted one are counted in the value.
            value[lane, r] += 1.0
            if value[lane, r] >= nth:
                value[lane, r] = begin + u * h
                time[lane, r] = begin + u * h
                status[lane, r] = SEEN
    elif kind == R_INTEGRAL:
        value[lane, r] += h * area(y0, yg, y1, u0, u1, gamma)
        time[lane, r] = begin + h
        status[lane, r] = OPEN
    elif kind == R_SLEW:
        steepest = abs(y1 - y0) / h
        if gamma > 0.0:
            steepest = max(abs(yg - y0) / (gamma * h), abs(y1 - yg) / ((1.0 - gamma) * h))
        if status[lane, r] == NOT_YET or steepest > value[lane, r]:
            value[lane, r] = steepest
            time[lane, r] = begin + h
            status[lane, r] = OPEN
    else:
        sign = 1.0 if kind == R_MAXIMUM else -1.0
        for n in range(3):
            u = u0
            if n == 1:
                u = min(max(gamma, u0), u1)
            elif n == 2:
                u = u1
            y = parabola(y0, yg, y1, u, gamma)
            if status[lane, r] == NOT_YET or sign * y > sign * value[lane, r]:
                value[lane, r] = y
                time[lane, r] = begin + u * h
                status[lane, r] = OPEN


@leaf
def find_beaten(row: Ints, watched: Flags, stage: Floats, end: Floats, best: Floats, beaten: Ints) -> None:
    """List the extremes over a window without end that a step of some watched lane exceeds, their count first."""
    count = 0
    for r in range(row.shape[0]):
        kind = row[r, ROW_KIND]
        if kind == R_MAXIMUM or kind == R_MINIMUM:
            s = row[r, ROW_SIGNAL]
            sign = 1.0 if kind == R_MAXIMUM else -1.0
            most = at(best, r)
            if any_of(watched & ((sign * at(stage, s) > most) | (sign * at(end, s) > most))):
                count += 1
                beaten[count] = r
    beaten[0] = count


@leaf
def list_open(window: Floats, finish: float, w: int, best: Floats, listed: Ints, listed_until: Floats) -> None:
    """List the rows whose window has begun by ``finish``, their count first, and note when the next one begins.

    Extremes that :func:`find_beaten` watches are not listed.
    """
    count = 0
    until = math.inf
    for r in range(window.shape[1]):
        if window[w, r, 0] <= finish:
            if best[r, w] == math.inf:
                count += 1
                listed[w, count] = r
        else:
            until = min(until, window[w, r, 0])
    listed[w, 0] = count
    listed_until[w] = until


@leaf
def watch(
    row: Ints,
    level: Floats,
    offset: Floats,
    window: Floats,
    begin: float,
    h: float,
    gamma: float,
    w: int,
    lane: int,
    start: Floats,
    stage: Floats,
    end: Floats,
    value: Floats,
    time: Floats,
    status: Ints,
    listed: Ints,
    listed_until: Floats,
    best: Floats,
    beaten: Ints,
) -> None:
    """Update every row of the lane in column w with a step from ``begin`` to ``begin + h``; ``gamma`` 0: no stage.

    ``start``, ``stage`` and ``end`` are the signals there. Rows that wait for another one are looked at only in a step
    in which some row was seen.
    """
    finish = begin + h
    if finish >= listed_until[w]:
        list_open(window, finish, w, best, listed, listed_until)
    for turn in range(2):
        news = False
        open_ones = listed[w, 0]
        for n in range(open_ones + beaten[0] if turn == 0 else row.shape[0]):
            r = n
            if turn == 0:
                r = listed[w, n + 1] if n < open_ones else beaten[n - open_ones + 1]
                if n >= open_ones and best[r, w] == math.inf:
                    continue
                if window[w, r, 0] > finish:
                    continue
            else:
                after = row[r, ROW_FROM]
                if after < 0 or window[w, r, 0] < math.inf or status[lane, r] == SEEN or status[lane, after] != SEEN:
                    continue
                window[w, r, 0] = time[lane, after] + offset[r, 0]
                if window[w, r, 0] > finish:
                    continue
            until = row[r, ROW_TO]
            if until >= 0 and window[w, r, 1] == math.inf and status[lane, until] == SEEN:
                window[w, r, 1] = time[lane, until] + offset[r, 1]
            if begin > window[w, r, 1]:
                if status[lane, r] == OPEN:
                    status[lane, r] = SEEN
                news = news or status[lane, r] == SEEN
                window[w, r, 0] = math.inf
                continue
            s = row[r, ROW_SIGNAL]
            y0 = start[s, w]
            yg = stage[s, w]
            y1 = end[s, w]
            kind = row[r, ROW_KIND]
            # Most steps are far from any level and exceed no extreme.
            if kind == R_CROSSING:
                rising = float(row[r, ROW_DIRECTION])
                if max(rising * y0, rising * yg, rising * y1) <= rising * level[r]:
                    continue
            elif kind == R_MAXIMUM or kind == R_MINIMUM:
                sign = 1.0 if kind == R_MAXIMUM else -1.0
                if status[lane, r] == OPEN and max(sign * y0, sign * yg, sign * y1) <= sign * value[lane, r]:
                    continue
            note(
                kind, float(row[r, ROW_DIRECTION]), row[r, ROW_NTH], level[r], y0, yg, y1, begin, h, gamma,
                window[w, r, 0], window[w, r, 1], lane, r, value, time, status,
            )  # fmt: skip
            extreme = kind == R_MAXIMUM or kind == R_MINIMUM
            if extreme and row[r, ROW_TO] < 0 and status[lane, r] == OPEN:
                if best[r, w] == math.inf:
                    listed_until[w] = -1.0
                best[r, w] = value[lane, r] if kind == R_MAXIMUM else -value[lane, r]
            if status[lane, r] == SEEN:
                news = True
                window[w, r, 0] = math.inf
        if not news:
            return
        listed_until[w] = -1.0


@leaf
def close_rows(row: Ints, window: Floats, finish: float, w: int, lane: int, status: Ints) -> None:
    """End of a lane at ``finish``: extremes and integrals are complete whose window reaches the end or closed by it."""
    for r in range(row.shape[0]):
        if status[lane, r] == OPEN and (row[r, ROW_TO] < 0 or window[w, r, 1] <= finish):
            status[lane, r] = SEEN
