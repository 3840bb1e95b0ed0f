"""The period of an oscillation, found in the steps of a lane by a section through one net.

A section is where the net rises through the middle of its swing, having been near its low end since the last time: what
the field calls a Poincare section, with hysteresis.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..kernel.layout import Floats

VISIBLE = 0.05  # V, swing that counts as an oscillation
LOW, HIGH = 0.3, 0.7  # of the swing, between which a net must have been for a rise to count
ALIKE = 0.05  # by which periods may differ, of the usual one
RESOLVED = 1e4  # last digits of its instants that a period must be long
SAME = 0.02  # of a swing, by which it may change while it is looked at
MOST_TOGETHER = 4  # rises that may make one period: one of two heights, say, that take turns


@dataclass(frozen=True)
class Period:
    """One way to cut a stretch into periods: the unknown that tells, how many of its rises make a period, and the
    instants in s at which the periods of the stretch begin, the last one's end too."""

    net: int
    together: int
    instants: Floats

    @property
    def length(self) -> float:
        """Mean period in s."""
        return float((self.instants[-1] - self.instants[0]) / (len(self.instants) - 1))

    def last(self, count: int) -> Period:
        """The same with no more than the last ``count`` periods."""
        return Period(self.net, self.together, self.instants[-count - 1 :])


def rises(time: Floats, value: Floats) -> Floats:
    """Instants in s at which a net rises through the middle of its swing; none where it does not swing."""
    low, high = float(value.min()), float(value.max())
    if high - low < VISIBLE:
        return np.zeros(0)
    state = (value > low + HIGH * (high - low)).astype(np.int8) - (value < low + LOW * (high - low))
    told = np.flatnonzero(state)
    ups = np.flatnonzero(np.diff(state[told]) == 2)
    middle = 0.5 * (low + high)
    found = np.empty(len(ups))
    for n, (down, up) in enumerate(zip(told[ups], told[ups + 1], strict=True)):
        k = int(down) + int(np.argmax(value[down : up + 1] > middle))
        share = (middle - value[k - 1]) / (value[k] - value[k - 1])
        found[n] = time[k - 1] + share * (time[k] - time[k - 1])
    return found


def periods_by(net: int, time: Floats, value: Floats, together: int) -> Period | None:
    """The periods that a known section cuts a stretch into; None where there is not even one."""
    found = rises(time, value)[::-1][::together][::-1]
    return Period(net, together, found) if len(found) > 1 else None


def candidates(time: Floats, values: Floats, count: int) -> list[Period]:
    """Ways to cut the end of a stretch of all nets, (points, nets), into ``count`` periods alike: the longest first,
    and the widest swing."""
    swings = np.ptp(values, axis=0)
    found: list[tuple[float, float, Period]] = []
    for net in np.argsort(-swings):
        rising = rises(time, values[:, net])
        for together in range(1, MOST_TOGETHER + 1):
            instants = rising[::-1][::together][: count + 1][::-1]
            if len(instants) <= count:
                break
            lengths = np.diff(instants)
            if float(lengths.min()) <= RESOLVED * float(np.spacing(time[-1])):
                break
            if np.ptp(lengths) <= ALIKE * float(np.median(lengths)):
                period = Period(int(net), together, instants)
                found.append((-period.length, -float(swings[net]), period))
                break
    # What differs in the last digits only is one period, of which the widest swing tells best.
    found.sort(key=lambda each: (round(np.log(-each[0]) / ALIKE), each[1]))
    return [period for *_, period in reversed(_grouped(found))]


def lasts(time: Floats, values: Floats, period: float, tolerance: Floats) -> bool:
    """Whether the swings of all nets, (points, nets), are the same at the end of a stretch as at its begin: what rings
    is not carried."""
    count = int((time[-1] - time[0]) / period)
    begins = np.searchsorted(time, time[-1] - period * np.arange(count, 0, -1))
    swings = np.maximum.reduceat(values, begins, axis=0) - np.minimum.reduceat(values, begins, axis=0)
    third = max(1, count // 3)
    first, last = swings[:third].mean(axis=0), swings[-third:].mean(axis=0)
    most = np.maximum(first, last)
    return bool(np.all((most < VISIBLE) | (np.abs(last - first) <= SAME * most + 3.0 * tolerance)))


def _grouped(found: list[tuple[float, float, Period]]) -> list[tuple[float, float, Period]]:
    """One period of each length, that of the widest swing, the shortest first."""
    kept: dict[int, tuple[float, float, Period]] = {}
    for each in found:
        kept.setdefault(round(np.log(-each[0]) / ALIKE), each)
    return [kept[key] for key in sorted(kept)]
