"""Piecewise linear courses over time, one for all lanes or one per lane, and where to break a ramp into pieces."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import pairwise
from typing import Any

import numpy as np

from ..kernel.layout import Floats

Number = Floats | float

LEAST_PIECES, MOST_PIECES = 16, 128
PIECE = 0.14  # a conductance that grows e-fold by this much within a straight piece is 0.25 % off in its middle


class Wave:
    """A piecewise linear course: points of time and value, each one number for all lanes or one per lane."""

    def __init__(self, value: Number) -> None:
        self.times: list[Number] = [0.0]
        self.values: list[Number] = [value]

    def step(self, at: Number, value: Number) -> None:
        """Jump to a value."""
        self.cut(at)
        self.times += [at, at]
        self.values += [self.values[-1], value]

    def ramp(self, at: Number, during: Number, value: Number) -> None:
        """Move evenly to a value."""
        self.cut(at)
        self.times += [at, np.add(at, during)]
        self.values += [self.values[-1], value]

    def cut(self, at: Number) -> None:
        """Forget what was to happen after ``at``: the next event overrides a bounce or a ramp that is not over."""
        # Points are in the order of their times in every lane: the last of them tells.
        if not np.any(np.greater(self.times[-1], at)):
            return
        middles = np.reshape(np.asarray(at, dtype=float), (-1, 1))
        now = self.pieces(middles, middles)[0][:, 0]
        self.values = [np.where(np.greater(t, at), now, v) for t, v in zip(self.times, self.values, strict=True)]
        self.times = [np.minimum(t, at) for t in self.times]

    def later(self, at: Floats) -> Wave:
        """The same course with ``at`` (one instant per lane) as its t = 0."""
        middles = np.asarray(at, dtype=float)[:, None]
        now = self.pieces(middles, middles)[0][:, 0]
        wave = Wave(now)
        for time, value in zip(self.times, self.values, strict=True):
            wave.times.append(np.maximum(np.subtract(time, at), 0.0))
            wave.values.append(np.where(np.greater(time, at), value, now))
        return wave

    def pieces(self, starts: Floats, middles: Floats) -> tuple[Floats, Floats]:
        """Value at the start of each segment and slope within it; arrays are (lanes or 1, segments)."""
        if len(self.times) == 1:
            value = np.reshape(np.asarray(self.values[0], dtype=float), (-1, 1))
            shape = np.broadcast_shapes(value.shape, starts.shape)
            return np.broadcast_to(value, shape), np.zeros(shape)
        times, values = stacked(self.times), stacked(self.values)
        if times.shape[0] == values.shape[0] == middles.shape[0] == 1:
            place = np.searchsorted(times[0], middles, side="right") - 1
            of_time: Any = 0
            of_value: Any = 0
        else:
            place = np.sum(times[:, None, :] <= middles[:, :, None], axis=2) - 1
            lane = np.arange(place.shape[0])[:, None]
            of_time, of_value = (lane if points.shape[0] > 1 else 0 for points in (times, values))
            if values.shape[0] > 1 and place.shape[0] == 1:
                of_value = np.arange(values.shape[0])[:, None]
        after = np.minimum(place + 1, times.shape[1] - 1)
        t0, t1 = times[of_time, place], times[of_time, after]
        v0, v1 = values[of_value, place], values[of_value, after]
        rises = t1 > t0
        slope = np.where(rises, (v1 - v0) / np.where(rises, t1 - t0, 1.0), 0.0)
        return v0 + slope * (starts - t0), slope


def stacked(points: Sequence[Number]) -> Floats:
    """Points as (lanes or 1, points)."""
    if not any(isinstance(point, np.ndarray) for point in points):
        return np.array([points], dtype=float)
    table = np.empty((max(np.size(point) for point in points), len(points)))
    for k, point in enumerate(points):
        table[:, k] = point
    return table


def ramp_shares(conductance: Callable[[float], Number]) -> Floats:
    """The shares of a ramp at which to break it into straight pieces of conductance, the last of them 1.

    ``conductance`` gives siemens at a share of the ramp. What moves evenly in its own quantity (1 M to 100 ohm, say)
    does most of its change of conductance in an instant: there the pieces are short.
    """
    near = np.geomspace(1e-6, 0.5, 80)
    shares = np.concatenate([[0.0], near, 1.0 - near[-2::-1], [1.0]])
    course = [np.atleast_1d(np.log(conductance(float(share)))) for share in shares]
    steps = np.array([float(np.max(np.abs(b - a))) for a, b in pairwise(course)])
    covered = np.concatenate([[0.0], np.cumsum(steps + np.diff(shares))])
    count = int(np.clip(np.ceil(covered[-1] / PIECE), LEAST_PIECES, MOST_PIECES))
    found = np.interp(covered[-1] * np.arange(1, count + 1) / count, covered, shares)
    found[-1] = 1.0
    return np.asarray(found)
