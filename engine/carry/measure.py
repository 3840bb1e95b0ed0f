"""What drifts beneath an oscillation: means over whole periods, and by how much they change from one to the next."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..kernel.layout import Floats
from .periods import Period

CERTAIN = 5.0  # standard errors beyond which a drift is one
SPREAD = 0.02  # of its swing, by which an unknown's means may scatter about their line, and the same for its extremes
FAR = 50.0  # times e: no rate is followed further
STEEP = 25.0  # times: two rates further apart are not joined by an exponential
ROUGH = 3.0  # tolerances by which they may scatter however small the swing


@dataclass(frozen=True)
class Drift:
    """Means over periods of every quantity, fitted by a parabola. Arrays have one entry per quantity.

    At ``middle`` s it is at ``mean`` and rises by ``rate`` a second, with the standard error ``doubt``; the means
    scatter about it by ``scatter``. The rate falls by the factor e in 1 / ``fall`` s where it is seen to fall (below 0:
    to grow), else 0. ``low`` and ``high`` are the mean extremes of a period at ``middle``, ``lower`` and ``higher``
    what they change by in a second, with doubts of their own.
    """

    middle: float
    length: float
    mean: Floats
    rate: Floats
    doubt: Floats
    fall: Floats
    scatter: Floats
    low: Floats
    lower: Floats
    doubt_low: Floats
    high: Floats
    higher: Floats
    doubt_high: Floats
    steady: bool

    @property
    def swing(self) -> Floats:
        """Mean swing within a period."""
        return self.high - self.low

    @property
    def drifts(self) -> NDArray[np.bool_]:
        """Which quantities drift beyond doubt."""
        found: NDArray[np.bool_] = np.abs(self.rate) > CERTAIN * self.doubt
        return found


def at_instants(time: Floats, values: Floats, instants: Floats) -> Floats:
    """Values (points, quantities) at instants, on straight lines from step to step."""
    k = np.clip(np.searchsorted(time, instants, side="right") - 1, 0, len(time) - 2)
    width = time[k + 1] - time[k]
    share = np.where(width > 0.0, (instants - time[k]) / np.where(width > 0.0, width, 1.0), 0.0)[:, None]
    found: Floats = values[k] + share * (values[k + 1] - values[k])
    return found


def drift(time: Floats, values: Floats, period: Period, tolerance: Floats) -> Drift:
    """Fit the means of ``values`` (points, quantities) over the periods; ``tolerance`` is that of each quantity."""
    instants = period.instants
    widths = np.diff(time)
    areas = np.concatenate(
        [np.zeros((1, values.shape[1])), np.cumsum(0.5 * widths[:, None] * (values[1:] + values[:-1]), 0)]
    )
    k = np.clip(np.searchsorted(time, instants, side="right") - 1, 0, len(time) - 2)
    into = (instants - time[k])[:, None]
    there = at_instants(time, values, instants)
    sums = areas[k] + 0.5 * into * (values[k] + there)
    means = np.diff(sums, axis=0) / np.diff(instants)[:, None]
    inner = values[: k[-1] + 1]
    highs = np.maximum.reduceat(inner, k[:-1] + 1, axis=0)
    lows = np.minimum.reduceat(inner, k[:-1] + 1, axis=0)
    middles = 0.5 * (instants[1:] + instants[:-1])
    mean, rate, doubt, bend, scatter = parabola(middles, means)
    high, higher, doubt_high, _, rough_high = parabola(middles, highs)
    low, lower, doubt_low, _, rough_low = parabola(middles, lows)
    fall = np.where((bend != 0.0) & (np.abs(rate) > CERTAIN * doubt), -bend / np.where(rate != 0.0, rate, 1.0), 0.0)
    fall = np.clip(fall, -1.0 / period.length, 1.0 / period.length)
    allowed = SPREAD * (high - low) + ROUGH * tolerance
    steady = bool(np.all(scatter <= allowed) and np.all(np.maximum(rough_high, rough_low) <= 3.0 * allowed))
    return Drift(
        float(middles.mean()), period.length, mean, rate, doubt, fall, scatter, low, lower, doubt_low, high, higher,
        doubt_high, steady,
    )  # fmt: skip


def parabola(at: Floats, values: Floats) -> tuple[Floats, Floats, Floats, Floats, Floats]:
    """Mean, slope at the middle, its standard error, how the slope changes (0 where that is in doubt), and the scatter
    about parabolas through values (instants, quantities)."""
    away = at - at.mean()
    square = float(away @ away)
    bow = away * away - square / len(at)
    bow = bow - (bow @ away) / square * away
    mean = values.mean(axis=0)
    slope = away @ values / square
    bend = bow @ values / float(bow @ bow)
    rest = values - mean - away[:, None] * slope - bow[:, None] * bend
    scatter = np.sqrt(np.sum(rest * rest, axis=0) / max(len(at) - 3, 1))
    sure = np.abs(bend) * np.sqrt(float(bow @ bow)) > CERTAIN * scatter
    return mean, slope, scatter / np.sqrt(square), np.where(sure, 2.0 * bend, 0.0), scatter


def mean_rate(rates: tuple[Floats, Floats], middles: tuple[float, float], begin: float, end: float) -> Floats:
    """What a rate, known at two instants, is on the average from ``begin`` to ``end``: on the exponential through both,
    as what charges goes towards its end, or on the straight line where there is none."""
    first, second = rates
    width = middles[1] - middles[0]
    straight = first + (0.5 * (begin + end) - middles[0]) / width * (second - first)
    alike = (first * second > 0.0) & (np.abs(first) < STEEP * np.abs(second)) & (np.abs(second) < STEEP * np.abs(first))
    if not alike.any():
        return straight
    fall = np.log(np.where(alike, second / np.where(alike, first, 1.0), 1.0)) / width
    over = np.clip(fall * (end - begin), -FAR, FAR)
    level = np.abs(over) < 1e-6
    spread = np.where(level, 1.0, np.expm1(over) / np.where(level, 1.0, over))
    found: Floats = np.where(alike, first * np.exp(np.clip(fall * (begin - middles[0]), -FAR, FAR)) * spread, straight)
    return found
