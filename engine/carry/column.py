"""One paused lane of a row of the kernel: taken down, put back, and moved to another state at a later time."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..kernel.layout import SEEN, Floats, Program, Results, Rows
from ..kernel.outcome import GLANCES
from ..kernel.work import AH, BASE, GLANCE, GOES_ON, HELD, LOST, MOST, NOW, PAUSE, PAUSE_AT, ROUND, Work
from .kept import Kept

STATE = {
    "columns": ("clock",),
    "solving": ("x", "p"),
    "stepping": ("x0", "q0", "i0", "seen0", "flow0", "first", "second"),
    "watching": ("s0", "best", "best_at"),
}
OWN = {
    "columns": ("segment", "moving"),
    "watching": ("window", "listed", "listed_until"),
    "guarding": ("told", "due", "left"),
}
NOTED = ("value", "time", "status", "kept", "kept_at")


@dataclass(frozen=True)
class Column:
    """A column of a row of lanes, with the lane that is in it."""

    work: Work
    w: int
    results: Results
    program: Program
    rows: Rows
    kept: Kept | None = None

    def unwatched(self) -> None:
        """Nothing more is kept of it, unless it is traced."""
        self.results.trace_used[self.w] = -1 if self.kept is None else 0

    @property
    def lane(self) -> int:
        """The lane's number."""
        return int(self.work.columns.lane[self.w])

    @property
    def segment(self) -> int:
        """Which segment of its program the lane is in."""
        return int(self.work.columns.segment[self.w])

    @property
    def steps(self) -> int:
        """How many steps it has taken."""
        return int(self.results.work[self.lane, 0])

    @property
    def now(self) -> float:
        """Where it stands, in s from the start of its sequence."""
        return float(self.work.columns.clock[BASE, self.w] + self.work.columns.clock[NOW, self.w])

    @property
    def lost(self) -> bool:
        """Whether it could not be solved while it was held."""
        return bool(self.work.columns.clock[HELD, self.w] == LOST)

    @property
    def stopped(self) -> bool:
        """Whether the row was seen that ends a lane."""
        row = self.rows.stop_row[0]
        return bool(row >= 0 and self.results.status[self.lane, row] == SEEN)


@dataclass(frozen=True)
class Snapshot:
    """All that a paused lane goes on from, and what it has noted; not how much work it has done."""

    state: tuple[Floats, ...]
    own: tuple[NDArray[np.generic], ...]
    noted: tuple[NDArray[np.generic], ...]


def _arrays(work: Work, names: dict[str, tuple[str, ...]]) -> list[NDArray[Any]]:
    return [getattr(getattr(work, group), name) for group, each in names.items() for name in each]


def taken(column: Column) -> Snapshot:
    """A paused lane as it is."""
    work, results, w = column.work, column.results, column.w
    return Snapshot(
        tuple(array[:, w].copy() for array in _arrays(work, STATE)),
        tuple(np.copy(array[w]) for array in _arrays(work, OWN)),
        tuple(np.copy(getattr(results, name)[column.lane]) for name in NOTED),
    )


def put_back(column: Column, kept: Snapshot) -> None:
    """Put a lane back into its column: it goes on as if nothing had been since."""
    work, results, w = column.work, column.results, column.w
    for array, state in zip(_arrays(work, STATE), kept.state, strict=True):
        array[:, w] = state
    for array, own in zip(_arrays(work, OWN), kept.own, strict=True):
        array[w] = own
    for name, noted in zip(NOTED, kept.noted, strict=True):
        getattr(results, name)[column.lane] = noted
    go_on(column)


def go_on(column: Column, until: float = math.inf, steps: float | None = None) -> None:
    """Let a paused lane go on from where it stands, to be paused again at ``until`` s or beyond so many steps in all,
    where that is given."""
    column.work.columns.phase[column.w] = GOES_ON
    _until(column, until, steps)


def _until(column: Column, until: float, steps: float | None) -> None:
    column.work.columns.clock[PAUSE_AT, column.w] = until
    if steps is not None:
        column.work.columns.clock[PAUSE, column.w] = steps


def leap(column: Column, seconds: float, change: Floats, soon: float, until: float, steps: float) -> None:
    """Move a paused lane ``seconds`` ahead and its free unknowns by ``change``; it sets out anew from there, to be
    paused as by :func:`go_on`.

    What guards have pending by the instant ``soon`` belongs to a period, and comes as much later.
    """
    work, w, free = column.work, column.w, len(change)
    x = work.stepping.x0[:, w].copy()
    x[:free] += change
    known = len(x) - free - work.guarding.told.shape[1]
    if known > 0:
        x[free : free + known] += column.program.source[column.lane, column.segment, :known, 1] * seconds
    work.solving.x[:, w] = x
    work.solving.seen[:, w] = work.stepping.seen0[:, w]
    clock = work.columns.clock
    clock[NOW, w] += seconds
    clock[ROUND, w], clock[MOST, w], clock[AH, w] = 0.0, GLANCES, 0.0
    work.guarding.due[w] += np.where(work.guarding.due[w] <= soon, seconds, 0.0)
    work.columns.phase[w] = GLANCE
    _until(column, until, steps)
