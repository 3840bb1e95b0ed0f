"""Carries lanes that linger in a steady oscillation forward, each by itself, whatever else is in its row."""

from __future__ import annotations

import numpy as np

from ..kernel import layout
from ..kernel.layout import Control, Program, Results, Rows, Topology, ints
from ..kernel.march import end_lane
from ..kernel.vectors import WIDTH
from ..kernel.work import PAUSE, Work
from .carried import Carried
from .column import Column, go_on
from .follower import Follower
from .kept import Kept

LINGERS = 5000  # steps since an event, after which a lane is looked at
ROOM = 400_000  # numbers that are kept of a lane until it is looked at, within so many points:
LEAST_POINTS, MOST_POINTS = 256, 2048


class Carrier:
    """Lets paused lanes go on: ``go_on`` is what the kernel's ``march`` asks for."""

    def __init__(
        self,
        top: Topology,
        program: Program,
        rows: Rows,
        control: Control,
        carried: Carried,
        kept: Kept | None = None,
    ) -> None:
        """``kept`` is where the steps of a lane alone are kept; it must have been given room (:func:`with_room`)."""
        self.top, self.program, self.rows, self.control, self.carried = top, program, rows, control, carried
        self.kept = kept
        self._followers: dict[int, Follower] = {}

    def go_on(self, work: Work, columns: list[int], results: Results) -> Results:
        """Decide what each paused lane does next."""
        if results.trace_time.shape[1] == 0:
            results = with_room(results, *sizes(work))
        with np.errstate(all="ignore"):  # what is not finite compares as false, and nothing is carried by it
            self._all_go_on(work, columns, results)
        return results

    def _all_go_on(self, work: Work, columns: list[int], results: Results) -> None:
        for w in columns:
            column = Column(work, w, results, self.program, self.rows, self.kept)
            if self._keeps(column):
                self._go_on(column)

    def _keeps(self, column: Column) -> bool:
        """Keep the steps of a traced lane, which ends where there are too many."""
        if self.kept is not None:
            keep(self.kept, column.results, column.w, column.work.solving.x.shape[0])
            if self.kept.count > self.kept.most:
                end_lane(column.work, column.w, column.results, layout.TRACE_FULL)
                return False
        return True

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
        column.unwatched()
        if column.steps < column.work.columns.clock[PAUSE, w]:
            go_on(column)  # an event came while it was followed: it does not linger since
            return
        self._followers[w] = follower = Follower(self.top, self.control, self.carried, column)
        follower.watch(column)


def sizes(work: Work) -> tuple[int, int, int]:
    """How many unknowns, signals and lasting rows a lane has."""
    return work.solving.x.shape[0], work.watching.s0.shape[0], work.watching.best.shape[0]


def with_room(results: Results, unknowns: int, signals: int, lasting: int) -> Results:
    """Room for what is kept of every lane of the row."""
    width = unknowns + signals + 2 * lasting
    points = int(np.clip(ROOM // width, LEAST_POINTS, MOST_POINTS))
    return results._replace(
        trace_time=layout.zeros(WIDTH, points),
        trace_value=layout.zeros(WIDTH, points, width),
        trace_used=ints([-1] * WIDTH),
    )


def keep(kept: Kept, results: Results, w: int, unknowns: int) -> None:
    """Keep what the kernel has traced of the lane in column ``w`` since it was paused last."""
    used = int(results.trace_used[w])
    if used > 0:
        kept.add(results.trace_time[w, :used].copy(), results.trace_value[w, :used, :unknowns].copy())
