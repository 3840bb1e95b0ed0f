"""Lasting rows: extremes and integrals that take part in every step of their window, for all lanes of a row at once.

:func:`.rows.watch` hands a row over once a whole step lies in its window, and takes it back for the step in which the
window ends. Until then its extreme (of a minimum the negative) or its sum so far is kept here, NaN in all other lanes.
"""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import R_INTEGRAL, R_MAXIMUM, ROW_KIND, ROW_SIGNAL, Floats, Ints
from .vectors import Flags, Numbers, any_of, at, put, where

GAMMA = 2.0 - math.sqrt(2.0)
# Of the parabola through start, stage and end of a step, integrated over it.
OF_START = 0.5 - 1.0 / (6.0 * GAMMA)
OF_STAGE = 1.0 / (6.0 * GAMMA * (1.0 - GAMMA))
OF_END = 0.5 - 1.0 / (6.0 * (1.0 - GAMMA))


@leaf
def note_lasting(
    row: Ints,
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
        if kind == R_INTEGRAL:
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
