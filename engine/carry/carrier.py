"""Carries lanes that linger in a steady oscillation forward, each by itself, whatever else is in its row."""

from __future__ import annotations

import numpy as np

from ..kernel import layout
from ..kernel.layout import Control, Program, Results, Rows, Topology, ints
from ..kernel.vectors import WIDTH
from ..kernel.work import PAUSE, Work
from .carried import Carried
from .column import Column, go_on
from .follower import Follower

LINGERS = 5000  # steps since an event, after which a lane is looked at
ROOM = 400_000  # numbers that are kept of a lane until it is looked at, within so many points:
LEAST_POINTS, MOST_POINTS = 256, 2048


class Carrier:
    """Lets paused lanes go on: ``go_on`` is what the kernel's ``march`` asks for."""

    def __init__(self, top: Topology, program: Program, rows: Rows, control: Control, carried: Carried) -> None:
        self.top, self.program, self.rows, self.control, self.carried = top, program, rows, control, carried
        self._followers: dict[int, Follower] = {}

    def go_on(self, work: Work, columns: list[int], results: Results) -> Results:
        """Decide what each paused lane does next."""
        if results.trace_time.shape[1] == 0:
            results = _with_room(work, results)
        with np.errstate(all="ignore"):  # what is not finite compares as false, and nothing is carried by it
            self._all_go_on(work, columns, results)
        return results

    def _all_go_on(self, work: Work, columns: list[int], results: Results) -> None:
        for w in columns:
            self._go_on(Column(work, w, results, self.program, self.rows))

    def _go_on(self, column: Column) -> None:
        w = column.w
        follower = self._followers.get(w)
        if follower is not None and follower.lane == column.lane:
            try:
                if follower.go_on(column):
                    return
            except np.linalg.LinAlgError:
                follower.give_up(column)  # a matrix that has no inverse tells nothing of how far a stride may go
                return
        self._followers.pop(w, None)
        column.results.trace_used[w] = -1
        if column.steps < column.work.columns.clock[PAUSE, w]:
            go_on(column)  # an event came while it was followed: it does not linger since
            return
        self._followers[w] = follower = Follower(self.top, self.control, self.carried, column)
        follower.watch(column)


def _with_room(work: Work, results: Results) -> Results:
    """Room for what is kept of every lane of the row."""
    width = work.solving.x.shape[0] + work.watching.s0.shape[0] + 2 * work.watching.best.shape[0]
    points = int(np.clip(ROOM // width, LEAST_POINTS, MOST_POINTS))
    return results._replace(
        trace_time=layout.zeros(WIDTH, points),
        trace_value=layout.zeros(WIDTH, points, width),
        trace_used=ints([-1] * WIDTH),
    )
