"""Lasting rows: extremes and integrals that take part in every step of their window, for all lanes of a row at once.

:func:`.rows.watch` hands a row over once a whole step lies in its window, and takes it back for the step in which the
window ends. Until then its extreme (of a minimum the negative) or its sum so far is kept here, NaN in all other lanes.
A row that lags has two places: its largest value so far is kept at the first, and where the lag itself stands as the
instant of the second.
"""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import R_INTEGRAL, R_LAGGED, R_MAXIMUM, ROW_KIND, ROW_LASTING, ROW_SIGNAL, Floats, Ints
from .vectors import Flags, Numbers, any_of, at, exp, greater, put, where

GAMMA = 2.0 - math.sqrt(2.0)
# Of the parabola through start, stage and end of a step, integrated over it.
OF_START = 0.5 - 1.0 / (6.0 * GAMMA)
OF_STAGE = 1.0 / (6.0 * GAMMA * (1.0 - GAMMA))
OF_END = 0.5 - 1.0 / (6.0 * (1.0 - GAMMA))
# And half way through.
MID_START = 0.5 * (GAMMA - 0.5) / GAMMA
MID_STAGE = 0.25 / (GAMMA * (1.0 - GAMMA))
MID_END = 0.5 * (0.5 - GAMMA) / (1.0 - GAMMA)
LONG = -600.0  # time constants after which nothing is left of what was


@leaf
def lagging(before: Numbers, y0: Numbers, ym: Numbers, y1: Numbers, a: Numbers) -> Numbers:
    """Return what a first-order lag comes to over an interval of a time constants, ``before`` at its start, in which
    the signal is the parabola through its start, its middle and its end (y' = (signal - y) / time constant, exactly).
    """
    short = a < 1e-2
    flat = a * (1.0 - a * (1.0 / 2.0 - a * (1.0 / 6.0 - a * (1.0 / 24.0))))
    rising = a * (1.0 / 2.0 - a * (1.0 / 6.0 - a * (1.0 / 24.0 - a * (1.0 / 120.0))))
    bent = a * (1.0 / 3.0 - a * (1.0 / 12.0 - a * (1.0 / 60.0 - a * (1.0 / 360.0))))
    b = greater(a, 1e-2)
    long_flat = 1.0 - exp(greater(-b, LONG))
    long_rising = 1.0 - long_flat / b
    flat = where(short, flat, long_flat)
    rising = where(short, rising, long_rising)
    bent = where(short, bent, 1.0 - 2.0 * long_rising / b)
    return before * (1.0 - flat) + y0 * flat + (4.0 * ym - 3.0 * y0 - y1) * rising + 2.0 * (y0 + y1 - 2.0 * ym) * bent


@leaf
def note_lasting(
    row: Ints,
    level: Floats,
    lasting: Ints,
    stepped: Flags,
    jumped: Flags,
    begin: Numbers,
    h: Numbers,
    start: Floats,
    stage: Floats,
    end: Floats,
    best: Floats,
    best_at: Floats,
) -> None:
    """Update the lasting rows in lanes that took a step, or a jump, which has no stage, of length h from ``begin``."""
    chosen = stepped | jumped
    of_start = where(jumped, 0.5, OF_START) * h
    of_stage = where(jumped, 0.0, OF_STAGE) * h
    of_end = where(jumped, 0.5, OF_END) * h
    finish = begin + h
    middle = begin + where(jumped, h, GAMMA * h)
    for n in range(lasting.size):
        r = lasting[n]
        s = row[r, ROW_SIGNAL]
        kind = row[r, ROW_KIND]
        held = at(best, n)
        y1 = at(end, s)
        yg = where(jumped, y1, at(stage, s))
        if kind == R_LAGGED:
            if row[r, ROW_LASTING] == n:
                y0 = at(start, s)
                ym = where(jumped, 0.5 * (y0 + y1), MID_START * y0 + MID_STAGE * yg + MID_END * y1)
                lag = lagging(at(best_at, n + 1), y0, ym, y1, h / level[r])
                kept = chosen & (held == held)
                put(best_at, n + 1, where(kept, lag, at(best_at, n + 1)))
                beaten = kept & (lag > held)
                put(best, n, where(beaten, lag, held))
                put(best_at, n, where(beaten, finish, at(best_at, n)))
        elif kind == R_INTEGRAL:
            more = of_start * at(start, s) + of_stage * yg + of_end * y1
            put(best, n, where(chosen, held + more, held))
        else:
            if kind != R_MAXIMUM:
                y1 = -y1
                yg = -yg
            beaten = chosen & ((yg > held) | (y1 > held))
            if any_of(beaten):
                first = yg >= y1
                put(best, n, where(beaten, where(first, yg, y1), held))
                put(best_at, n, where(beaten, where(first, middle, finish), at(best_at, n)))
