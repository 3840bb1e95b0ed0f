"""What observation rows ask of a stride, and what they note of it.

Windows neither open nor close within a stride. Integrals get their mean rate times its length, crossings that are
counted as many as there are in every period, and what lags comes as near to its end as it would have. Extremes and
slopes stand as the periods before left them; those after it add theirs.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from ..kernel.layout import (
    NOT_YET,
    R_CROSSING,
    R_INTEGRAL,
    R_LAGGED,
    ROW_DIRECTION,
    ROW_KIND,
    ROW_LASTING,
    ROW_NTH,
    ROW_SIGNAL,
    SEEN,
    Floats,
    Ints,
)
from .column import Column
from .measure import CERTAIN, at_instants, parabola
from .periods import Period

APPROACH = 0.6  # of the way to where a signal would cross its level, in one stride
SPARE = 3  # counted crossings that are left to be seen


@dataclass(frozen=True)
class Noted:
    """What the rows of a lane did over some periods.

    ``reach`` s is the longest stride they allow. ``waiting`` are open rows whose level was not reached; ``counted`` are
    those whose level is crossed so many times a period. ``rates`` are those of the integrals at ``middle``, by
    row, and how they change. ``rests`` are
    where the lags, by row, would come to rest in this phase of a period, and ``lags`` where they are.
    """

    middle: float
    reach: float
    waiting: tuple[int, ...]
    counted: dict[int, int]
    rates: dict[int, tuple[float, float | None]]
    rests: dict[int, float]
    lags: dict[int, float]


def next_edge(column: Column) -> float:
    """The next instant, in s, at which a window opens or closes; inf where none does."""
    now = column.now
    window = column.work.watching.window[column.w][column.results.status[column.lane] != SEEN]
    ahead = window[(window > now) & np.isfinite(window)]
    return float(ahead.min()) if ahead.size else math.inf


def noted(column: Column, time: Floats, trail: Floats, period: Period) -> Noted | None:
    """What the rows of a lane did over these periods, the lane standing at the end of ``trail``; None where an open row
    is not yet under way. ``trail`` (points, ...) holds what the kernel's trace holds."""
    rows, work, results, w, lane = column.rows, column.work, column.results, column.w, column.lane
    instants, now = period.instants, float(time[-1])
    signals = work.solving.x.shape[0]
    lasting = signals + work.watching.s0.shape[0]
    reach, waiting, counted = math.inf, [], {}
    rates: dict[int, tuple[float, float | None]] = {}
    rests: dict[int, float] = {}
    lags: dict[int, float] = {}
    first = np.clip(np.searchsorted(time, instants, side="right") - 1, 0, len(time) - 2)
    opened = (
        (work.watching.window[w, :, 0] <= now) & (work.watching.window[w, :, 1] >= now) & (results.status[lane] != SEEN)
    )
    for r in np.flatnonzero(opened):
        kind, place = int(rows.row[r, ROW_KIND]), int(rows.row[r, ROW_LASTING])
        if kind == R_CROSSING and results.status[lane, r] == NOT_YET:
            way = float(rows.row[r, ROW_DIRECTION])
            over = way * (trail[:, signals + int(rows.row[r, ROW_SIGNAL])] - rows.level[r])
            each = _crossings(over, first)
            if not each.any():
                waiting.append(int(r))
                reach = min(reach, _approach(over, first, instants))
            elif np.ptp(each) > 0:
                return None
            else:
                counted[int(r)] = int(each[0])
                left = float(rows.row[r, ROW_NTH]) - results.value[lane, r]
                reach = min(reach, (left / each[0] - SPARE) * period.length)
        elif place >= 0:
            own = lasting + 2 * place
            if kind == R_INTEGRAL:
                sums = at_instants(time, trail[:, own : own + 1], instants)
                if not np.isfinite(sums).all():
                    return None
                means = np.diff(sums, axis=0) / np.diff(instants)[:, None]
                _, slope, doubt, _, _ = parabola(0.5 * (instants[1:] + instants[:-1]), means)
                mean = float((sums[-1, 0] - sums[0, 0]) / (instants[-1] - instants[0]))
                rates[int(r)] = mean, float(slope[0]) if abs(slope[0]) > CERTAIN * doubt[0] else None
            elif kind == R_LAGGED:
                if not math.isfinite(trail[first[0], own]):
                    return None
                lags[int(r)] = float(trail[-1, own + 3])
                begin, end = at_instants(time, trail[:, own + 3 : own + 4], instants[[0, -1]])[:, 0]
                gone = -math.expm1(-float(instants[-1] - instants[0]) / rows.level[r])
                # So much it lacked at the end of the last period, and less by now.
                lacks = (end - begin) * (1.0 / gone - 1.0) * math.exp(-(now - float(instants[-1])) / rows.level[r])
                rests[int(r)] = lags[int(r)] + float(lacks)
    middle = 0.5 * float(instants[0] + instants[-1])
    return Noted(middle, reach, tuple(waiting), counted, rates, rests, lags)


def _crossings(over: Floats, first: Ints) -> Ints:
    """How often a signal rises above 0 in each period; ``first`` are the steps in which periods begin."""
    above = over > 0.0
    ups = np.concatenate([[0], np.cumsum(above[1:] & ~above[:-1])])
    each: Ints = np.diff(ups[first])
    return each


def _approach(over: Floats, first: Ints, instants: Floats) -> float:
    """The longest stride in s that does not bring a signal to 0: its highest values in each period from below, or its
    lowest from above."""
    inner = over[: first[-1] + 1]
    if inner[-1] > 0.0:
        inner = -inner
    highest = np.maximum.reduceat(inner, first[:-1] + 1)
    middles = 0.5 * (instants[1:] + instants[:-1])
    away = middles - middles.mean()
    rise = float(away @ highest) / float(away @ away)
    return APPROACH * -float(highest.max()) / rise if rise > 0.0 else math.inf


def _integrals(before: Noted, after: Noted, r: int, begin: float, end: float) -> tuple[float, float]:
    """What integral row ``r`` gets from ``begin`` to ``end`` by its rates at two middles: on the straight line through
    them, and on the cubic that has their slopes too. ``after`` is ``before`` where only that is known."""
    (first, slope), (second, later) = before.rates[r], after.rates[r]
    width, length = after.middle - before.middle, end - begin
    if after is before:
        rise = 0.0 if slope is None else slope
        found = length * (first + rise * (0.5 * (begin + end) - before.middle))
        return found, found
    steady = (second - first) / width
    from_first = (steady if slope is None else slope) - steady
    from_second = (steady if later is None else later) - steady

    def rate(at: float) -> tuple[float, float]:
        s = (at - before.middle) / width
        line = first + s * (second - first)
        return line, line + width * (s * (1.0 - s) ** 2 * from_first - s * s * (1.0 - s) * from_second)

    # Simpson's rule, exact for cubics.
    ends, middle = np.add(rate(begin), rate(end)), np.array(rate(0.5 * (begin + end)))
    line, cubic = length / 6.0 * (ends + 4.0 * middle)
    return float(line), float(cubic)


def bent(column: Column, before: Noted, after: Noted, begin: float, end: float) -> float:
    """By how much a stride took integrals for straight that are not: the largest difference, in parts of what they come
    to."""
    most = 0.0
    for r in before.rates:
        if r in after.rates:
            line, cubic = _integrals(before, after, r, begin, end)
            place = column.rows.row[r, ROW_LASTING]
            sum_now = np.nan_to_num(
                column.work.watching.best[place, column.w], nan=column.results.value[column.lane, r]
            )
            most = max(most, abs(cubic - line) / max(abs(sum_now), abs(cubic), 1e-300))
    return most


def note_stride(column: Column, before: Noted, seconds: float, periods: int) -> None:
    """Note in the rows of a lane what a stride brings by the rates before it."""
    rows, work, results, w, lane = column.rows, column.work, column.results, column.w, column.lane
    for r, count in before.counted.items():
        results.value[lane, r] += count * periods
    for r in before.rates:
        work.watching.best[rows.row[r, ROW_LASTING], w] += _integrals(
            before, before, r, column.now, column.now + seconds
        )[1]
    for r, rest in before.rests.items():
        left = math.exp(-seconds / rows.level[r])
        work.watching.best_at[rows.row[r, ROW_LASTING] + 1, w] = rest + (before.lags[r] - rest) * left


def correct_stride(column: Column, before: Noted, after: Noted, begin: float, end: float) -> None:
    """Mend what was noted of a stride from ``begin`` to ``end`` by what the periods behind it say."""
    rows, work, results, w, lane = column.rows, column.work, column.results, column.w, column.lane
    span = after.middle - before.middle
    for r in before.rates:
        if r not in after.rates:
            continue
        more = _integrals(before, after, r, begin, end)[1] - _integrals(before, before, r, begin, end)[1]
        place = rows.row[r, ROW_LASTING]
        if math.isnan(work.watching.best[place, w]):
            results.value[lane, r] += more
        else:
            work.watching.best[place, w] += more
    for r, rest in before.rests.items():
        if r in after.rests:
            # As if the rest had moved evenly.
            lag = rows.level[r]
            gone = -math.expm1(-(end - begin) / lag)
            away = begin - before.middle
            more = (after.rests[r] - rest) / span * (end - begin - lag * gone + away * gone)
            work.watching.best_at[rows.row[r, ROW_LASTING] + 1, w] += more * math.exp(-(column.now - end) / lag)
