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
    R_SLEW,
    ROW_DIRECTION,
    ROW_FROM,
    ROW_KIND,
    ROW_NTH,
    ROW_SIGNAL,
    ROW_TO,
    S_BASE_CURRENT,
    S_COLLECTOR_CURRENT,
    S_CONDUCTANCE_CURRENT,
    S_CONDUCTANCE_POWER,
    S_JUNCTION_CURRENT,
    S_JUNCTION_POWER,
    S_UNKNOWN,
    SEEN,
    TRANSPORT,
    Floats,
    Ints,
    Places,
)

GAMMA = 2.0 - math.sqrt(2.0)


@leaf
def read_signal(
    element: Places,
    group: Places,
    term: Ints,
    factor: Floats,
    first: int,
    last: int,
    p: Floats,
    x: Floats,
    flow: Floats,
) -> float:
    """Return the sum of terms first .. last-1 at x, ``flow`` being the currents of junctions and transistors there."""
    total = 0.0
    for t in range(first, last):
        kind = term[t, 0]
        k = term[t, 1]
        v = 0.0
        if kind == S_UNKNOWN:
            v = x[k]
        elif kind == S_CONDUCTANCE_CURRENT or kind == S_CONDUCTANCE_POWER:
            across = x[element[k, E_A]] - x[element[k, E_B]]
            v = p[element[k, E_PARAMETER]] * across
            if kind == S_CONDUCTANCE_POWER:
                v *= across
        elif kind == S_JUNCTION_CURRENT or kind == S_JUNCTION_POWER:
            v = flow[k - group[JUNCTION]]
            if kind == S_JUNCTION_POWER:
                v *= x[element[k, E_A]] - x[element[k, E_B]]
        else:
            own = 2 * (k - group[TRANSPORT]) - group[JUNCTION] + group[TRANSPORT]
            ic = flow[own]
            ib = flow[own + 1]
            if kind == S_COLLECTOR_CURRENT:
                v = ic
            elif kind == S_BASE_CURRENT:
                v = ib
            else:
                ve = x[element[k, E_C]]
                v = ic * (x[element[k, E_A]] - ve) + ib * (x[element[k, E_B]] - ve)
        total += factor[t] * v
    return total


@leaf
def keep_signals(
    element: Places,
    group: Places,
    term: Ints,
    factor: Floats,
    signal: Ints,
    p: Floats,
    x: Floats,
    flow: Floats,
    now: int,
    end: Floats,
    read_at: Ints,
) -> None:
    """Read all signals at the end of step ``now``, before an event changes what they are made of."""
    for s in range(end.size):
        end[s] = read_signal(element, group, term, factor, signal[s], signal[s + 1], p, x, flow)
        read_at[s] = now


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
def open_rows(row: Ints, offset: Floats, window: Floats, value: Floats, time: Floats, status: Ints) -> None:
    """Reset all rows of a lane and set the windows that do not wait for another row."""
    value[:] = 0.0
    time[:] = 0.0
    status[:] = NOT_YET
    for r in range(row.shape[0]):
        window[r, 0] = offset[r, 0] if row[r, ROW_FROM] < 0 else math.inf
        window[r, 1] = offset[r, 1] if row[r, ROW_TO] < 0 else math.inf


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
    window: Floats,
    r: int,
    value: Floats,
    time: Floats,
    status: Ints,
) -> None:
    """Update row r with a signal that is y0, yg, y1 at start, stage and end of the step, within the row's window."""
    u0 = (window[r, 0] - begin) / h if window[r, 0] > begin else 0.0
    u1 = (window[r, 1] - begin) / h if window[r, 1] < begin + h else 1.0
    if kind == R_LEVEL:
        value[r] = parabola(y0, yg, y1, min(u0, 1.0), gamma)
        time[r] = window[r, 0]
        status[r] = SEEN
    elif kind == R_CROSSING:
        u = crossing(y0, yg, y1, level, rising, u0, gamma)
        if 0.0 <= u <= u1:
            # Crossings before the wanted one are counted in the value.
            value[r] += 1.0
            if value[r] >= nth:
                value[r] = begin + u * h
                time[r] = begin + u * h
                status[r] = SEEN
    elif kind == R_INTEGRAL:
        value[r] += h * area(y0, yg, y1, u0, u1, gamma)
        time[r] = begin + h
        status[r] = OPEN
    elif kind == R_SLEW:
        steepest = abs(y1 - y0) / h
        if gamma > 0.0:
            steepest = max(abs(yg - y0) / (gamma * h), abs(y1 - yg) / ((1.0 - gamma) * h))
        if status[r] == NOT_YET or steepest > value[r]:
            value[r] = steepest
            time[r] = begin + h
            status[r] = OPEN
    else:
        sign = 1.0 if kind == R_MAXIMUM else -1.0
        if u0 == 0.0 and u1 == 1.0 and status[r] == OPEN and sign * value[r] >= max(sign * y0, sign * yg, sign * y1):
            return
        for n in range(3):
            u = u0
            if n == 1:
                u = min(max(gamma, u0), u1)
            elif n == 2:
                u = u1
            y = parabola(y0, yg, y1, u, gamma)
            if status[r] == NOT_YET or sign * y > sign * value[r]:
                value[r] = y
                time[r] = begin + u * h
                status[r] = OPEN


@leaf
def watch(
    element: Places,
    group: Places,
    term: Ints,
    factor: Floats,
    signal: Ints,
    row: Ints,
    level: Floats,
    offset: Floats,
    window: Floats,
    p: Floats,
    x0: Floats,
    xg: Floats,
    x1: Floats,
    flow0: Floats,
    flow_g: Floats,
    flow1: Floats,
    begin: float,
    h: float,
    gamma: float,
    now: int,
    start: Floats,
    stage: Floats,
    end: Floats,
    read_at: Ints,
    value: Floats,
    time: Floats,
    status: Ints,
) -> None:
    """Update every row of a lane with step number ``now``, from ``begin`` to ``begin + h``; ``gamma`` 0: no stage.

    A signal is read only where a row wants it: ``start``, ``stage`` and ``end`` keep it, ``read_at`` tells the step.
    Rows that wait for another one are looked at only in a step in which some row was seen.
    """
    finish = begin + h
    for turn in range(2):
        news = False
        for r in range(row.shape[0]):
            if turn == 0:
                if window[r, 0] > finish:
                    continue
            else:
                after = row[r, ROW_FROM]
                if after < 0 or window[r, 0] < math.inf or status[r] == SEEN or status[after] != SEEN:
                    continue
                window[r, 0] = time[after] + offset[r, 0]
                if window[r, 0] > finish:
                    continue
            until = row[r, ROW_TO]
            if until >= 0 and window[r, 1] == math.inf and status[until] == SEEN:
                window[r, 1] = time[until] + offset[r, 1]
            if begin > window[r, 1]:
                if status[r] == OPEN:
                    status[r] = SEEN
                news = news or status[r] == SEEN
                window[r, 0] = math.inf
                continue
            s = row[r, ROW_SIGNAL]
            if read_at[s] != now:
                first = signal[s]
                last = signal[s + 1]
                if read_at[s] == now - 1:
                    start[s] = end[s]
                else:
                    start[s] = read_signal(element, group, term, factor, first, last, p, x0, flow0)
                stage[s] = read_signal(element, group, term, factor, first, last, p, xg, flow_g)
                end[s] = read_signal(element, group, term, factor, first, last, p, x1, flow1)
                read_at[s] = now
            note(
                row[r, ROW_KIND], float(row[r, ROW_DIRECTION]), row[r, ROW_NTH], level[r], start[s], stage[s], end[s],
                begin, h, gamma, window, r, value, time, status,
            )  # fmt: skip
            if status[r] == SEEN:
                news = True
                window[r, 0] = math.inf
        if not news:
            return


@leaf
def close_rows(row: Ints, window: Floats, finish: float, status: Ints) -> None:
    """End of a lane at ``finish``: extremes and integrals are complete whose window reaches the end or closed by it."""
    for r in range(row.shape[0]):
        if status[r] == OPEN and (row[r, ROW_TO] < 0 or window[r, 1] <= finish):
            status[r] = SEEN
