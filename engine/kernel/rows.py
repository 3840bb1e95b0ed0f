"""Observation rows: what is noted while a lane is stepped, so that no trace has to be kept.

A step offers every signal at its start, its stage and its end; between them a signal is the parabola through the three.
"""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import (
    NOT_YET,
    OPEN,
    R_CROSSING,
    R_INTEGRAL,
    R_LAGGED,
    R_LEVEL,
    R_MAXIMUM,
    R_MINIMUM,
    R_SLEW,
    READ_CONDUCTANCE_POWER,
    READ_FLOW,
    READ_FLOW_POWER,
    READ_LEVEL,
    ROW_DIRECTION,
    ROW_FROM,
    ROW_KIND,
    ROW_LASTING,
    ROW_NTH,
    ROW_SIGNAL,
    ROW_TO,
    SEEN,
    Floats,
    Ints,
    Places,
)
from .vectors import at, put

GAMMA = 2.0 - math.sqrt(2.0)


@leaf
def read_signals(term: Places, factor: Floats, signal: Places, p: Floats, x: Floats, flow: Floats, out: Floats) -> None:
    """Set out (signals, WIDTH) to the signals at x, ``flow`` being the currents of junctions and transistors there."""
    for s in range(out.shape[0]):
        total = 0.0 * at(x, 0)
        for t in range(signal[s], signal[s + 1]):
            kind = term[t, 0]
            v = at(x, term[t, 1])
            if kind != READ_LEVEL:
                across = v - at(x, term[t, 2])
                if kind == READ_FLOW:
                    v = at(flow, term[t, 3])
                elif kind == READ_FLOW_POWER:
                    v = at(flow, term[t, 3]) * across
                else:
                    v = at(p, term[t, 3]) * across
                    if kind == READ_CONDUCTANCE_POWER:
                        v = v * across
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
def lagging(before: float, y0: float, ym: float, y1: float, a: float) -> float:
    """As :func:`.lasting.lagging`, for one lane."""
    if a < 1e-2:
        flat = a * (1.0 - a * (1.0 / 2.0 - a * (1.0 / 6.0 - a / 24.0)))
        rising = a * (1.0 / 2.0 - a * (1.0 / 6.0 - a * (1.0 / 24.0 - a / 120.0)))
        bent = a * (1.0 / 3.0 - a * (1.0 / 12.0 - a * (1.0 / 60.0 - a / 360.0)))
    else:
        flat = 1.0 - math.exp(-a)
        rising = 1.0 - flat / a
        bent = 1.0 - 2.0 * rising / a
    return before * (1.0 - flat) + y0 * flat + (4.0 * ym - 3.0 * y0 - y1) * rising + 2.0 * (y0 + y1 - 2.0 * ym) * bent


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
    for n in range(best.shape[0]):
        best[n, w] = math.nan
    for r in range(row.shape[0]):
        value[lane, r] = 0.0
        time[lane, r] = 0.0
        status[lane, r] = NOT_YET
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
    w: int,
    lane: int,
    r: int,
    place: int,
    value: Floats,
    time: Floats,
    status: Ints,
    best_at: Floats,
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
    elif kind == R_LAGGED:
        lag = best_at[place + 1, w] if status[lane, r] == OPEN else 0.0
        first = parabola(y0, yg, y1, u0, gamma)
        middle = parabola(y0, yg, y1, 0.5 * (u0 + u1), gamma)
        lag = lagging(lag, first, middle, parabola(y0, yg, y1, u1, gamma), (u1 - u0) * h / level)
        best_at[place + 1, w] = lag
        if status[lane, r] == NOT_YET or lag > value[lane, r]:
            value[lane, r] = lag
            time[lane, r] = begin + u1 * h
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
def hand_back(
    kind: int,
    place: int,
    r: int,
    w: int,
    lane: int,
    when: float,
    best: Floats,
    best_at: Floats,
    value: Floats,
    time: Floats,
) -> None:
    """Take row r back from :func:`.lasting.note_lasting`, which has kept it up to the instant ``when``."""
    value[lane, r] = -best[place, w] if kind == R_MINIMUM else best[place, w]
    time[lane, r] = when if kind == R_INTEGRAL else best_at[place, w]
    best[place, w] = math.nan


@leaf
def list_open(
    row: Ints,
    window: Floats,
    begin: float,
    finish: float,
    w: int,
    lane: int,
    value: Floats,
    time: Floats,
    status: Ints,
    listed: Ints,
    listed_until: Floats,
    best: Floats,
    best_at: Floats,
) -> None:
    """List the rows whose window has begun by ``finish``, their count first, and note when that changes.

    Lasting rows with the whole step in their window are handed over to :func:`.lasting.note_lasting` instead.
    """
    count = 0
    until = math.inf
    for r in range(window.shape[1]):
        opens = window[w, r, 0]
        if opens > finish:
            until = min(until, opens)
            continue
        place = row[r, ROW_LASTING]
        if place >= 0:
            lasts = best[place, w] == best[place, w]
            if status[lane, r] == OPEN and window[w, r, 1] >= finish:
                if not lasts:
                    best[place, w] = -value[lane, r] if row[r, ROW_KIND] == R_MINIMUM else value[lane, r]
                    best_at[place, w] = time[lane, r]
                until = min(until, window[w, r, 1])
                continue
            if lasts:
                hand_back(row[r, ROW_KIND], place, r, w, lane, begin, best, best_at, value, time)
        count += 1
        listed[w, count] = r
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
    best_at: Floats,
) -> None:
    """Update every row of the lane in column w with a step from ``begin`` to ``begin + h``; ``gamma`` 0: no stage.

    ``start``, ``stage`` and ``end`` are the signals there. Rows that wait for another one are looked at only in a step
    in which some row was seen.
    """
    finish = begin + h
    if finish >= listed_until[w]:
        list_open(row, window, begin, finish, w, lane, value, time, status, listed, listed_until, best, best_at)
    for turn in range(2):
        news = False
        for n in range(listed[w, 0] if turn == 0 else row.shape[0]):
            r = n
            if turn == 0:
                r = listed[w, n + 1]
                if window[w, r, 0] > finish:
                    continue
            else:
                place = row[r, ROW_LASTING]
                if place >= 0 and best[place, w] == best[place, w]:
                    ends = row[r, ROW_TO]
                    if ends < 0 or window[w, r, 1] < math.inf or status[lane, ends] != SEEN:
                        continue
                    window[w, r, 1] = time[lane, ends] + offset[r, 1]
                    if window[w, r, 1] >= finish:
                        continue
                    hand_back(row[r, ROW_KIND], place, r, w, lane, begin, best, best_at, value, time)
                else:
                    after = row[r, ROW_FROM]
                    if after < 0 or window[w, r, 0] < math.inf or status[lane, r] == SEEN:
                        continue
                    if status[lane, after] != SEEN:
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
                window[w, r, 0], window[w, r, 1], w, lane, r, row[r, ROW_LASTING], value, time, status, best_at,
            )  # fmt: skip
            if row[r, ROW_LASTING] >= 0:
                listed_until[w] = -1.0
            if status[lane, r] == SEEN:
                news = True
                window[w, r, 0] = math.inf
        if not news:
            return
        listed_until[w] = -1.0


@leaf
def close_rows(
    row: Ints,
    window: Floats,
    finish: float,
    w: int,
    lane: int,
    value: Floats,
    time: Floats,
    status: Ints,
    best: Floats,
    best_at: Floats,
) -> None:
    """End of a lane at ``finish``: extremes and integrals are complete whose window reaches the end or closed by it."""
    for r in range(row.shape[0]):
        place = row[r, ROW_LASTING]
        if place >= 0 and best[place, w] == best[place, w]:
            hand_back(row[r, ROW_KIND], place, r, w, lane, finish, best, best_at, value, time)
        if status[lane, r] == OPEN and (row[r, ROW_TO] < 0 or window[w, r, 1] <= finish):
            status[lane, r] = SEEN
