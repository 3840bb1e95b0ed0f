"""The arrays that one row of lanes is stepped in, and the numbers that every lane has of its own."""

from __future__ import annotations

import math
import threading
from collections.abc import Iterable
from typing import Any, NamedTuple

import numpy as np

from . import machine_code
from .compiled import COMPILED
from .layout import (
    CHANNEL,
    CHANNEL_SLOPES,
    CONTACT,
    FAMILIES,
    GUARD,
    JUNCTION,
    SLOPES,
    TRANSPORT,
    WARM,
    WARM_SLOPES,
    Floats,
    Ints,
    Places,
    Program,
    Rows,
    Topology,
    zeros,
)
from .vectors import WIDTH

# Rows of ``Work.clock``: numbers of each lane.
AH, CARRY, REACH, LENGTH, LAST = 0, 1, 2, 3, 4  # a h; a h or 0 in a jump; gamma h; h; the step before
ROUND, MOST = 5, 6  # iterations of this solve so far, and how many it may take
LIMITED, ERROR, GROWTH = 7, 8, 9
NOW, BASE, ASKED, NEXT, LEFT, LONGEST, SPAN, SURPRISE, STOP = 10, 11, 12, 13, 14, 15, 16, 17, 18
BEGAN, TOOK = 19, 20  # s, of the step or jump just taken
GREW = 21  # growth that the error of the step before allowed
PAUSE, PAUSE_AT = 22, 23  # pauses before a step beyond so many, or this instant in s
HELD = 24  # 1: is paused where it would be stopped or lost, because a caller may take it back; then LOST
MAY = 25  # times the bound of its work that the lane may take
CLOCK = 26
LOST = -1.0


# What a lane is doing: nothing; looking at its start; solving a jump, the stage of a step, its end; waiting between two
# steps, until it is told to go on.
IDLE, GLANCE, LEAP, STAGE, END, PAUSED, GOES_ON = 0, 1, 2, 3, 4, 5, 6
# What came of an iterate.
NOTHING, LOOKED, LEAPT, STAGED, ARRIVED, AGAIN, STARTS, FINISHED = 0, 1, 2, 3, 4, 5, 6, 7


class Columns(NamedTuple):
    """What the lane of each column is at."""

    clock: Floats  # (CLOCK, WIDTH)
    phase: Ints  # (WIDTH,) and so the next
    came: Ints
    failed: Ints
    lane: Ints
    segment: Ints
    moving: Ints
    begun: Ints  # (1,) how many lanes have begun


class Solving(NamedTuple):
    """The iterate and what it takes."""

    x: Floats  # (n_all, WIDTH) voltages, charges, currents
    q: Floats
    i: Floats
    di: Floats  # what Newton's step changes of i and q, the step, and what it leaves over
    dq: Floats
    step: Floats
    bend: Floats
    constant: Floats  # (n_free, WIDTH)
    tolerance: Floats
    error: Floats
    noise: Floats  # what round-off makes of the charges, and what may be left of a residual
    allowed: Floats
    expected: Floats  # where the end of the step was thought to lie
    a: Floats  # (entries + 1, WIDTH) matrix and then its factors, and the linear part of C and of G
    c: Floats
    g: Floats
    seen: Floats  # (devices, WIDTH) junction and channel voltages, then device currents
    flow: Floats
    slope: Floats  # (slopes of devices, WIDTH)
    p: Floats  # (parameters, WIDTH)
    source: Floats  # (sources, WIDTH), and as many of 0
    nothing: Floats
    diagonal: Places  # (n_free,) slot of an unknown's diagonal


class Stepping(NamedTuple):
    """What was found at the start of the step and at its stage, as in :class:`Solving`."""

    x0: Floats
    q0: Floats
    i0: Floats
    seen0: Floats
    flow0: Floats
    xg: Floats
    qg: Floats
    ig: Floats
    flow_g: Floats
    first: Floats  # (n_free, WIDTH) parabola of the step before
    second: Floats


class Watching(NamedTuple):
    """Signals, and rows that are half observed."""

    s0: Floats  # (signals, WIDTH) signals at start, stage and end of the step
    sg: Floats
    s1: Floats
    best: Floats  # (lasting rows, WIDTH) extremes and integrals so far, and when
    best_at: Floats
    window: Floats  # (WIDTH, rows, 2)
    listed: Ints  # (WIDTH, rows + 1) how many rows are open, and which
    listed_until: Floats  # (WIDTH,) s, when to list them anew


class Guarding(NamedTuple):
    """What guards know."""

    told: Ints  # (WIDTH, guards) what each was told last
    due: Floats  # (WIDTH, guards + contacts) when it moves, and how often
    left: Ints


class Work(NamedTuple):
    """Arrays to work in, one column per lane of the row."""

    columns: Columns
    solving: Solving
    stepping: Stepping
    watching: Watching
    guarding: Guarding


class _Room:
    """One stretch of zeros, of which arrays are cut off: as quick to make, and to clear, as a single array."""

    def __init__(self, shapes: Iterable[tuple[int, ...]]) -> None:
        self.numbers = zeros(sum(map(self._lines, shapes)) + self.LINE)
        self.next = (-self.numbers.__array_interface__["data"][0] // 8) % self.LINE

    # Numbers that a processor fetches at a time. Every row lies within one such line: a row across two takes twice as
    # long.
    LINE = 8

    def _lines(self, shape: tuple[int, ...]) -> int:
        return self.LINE * -(-math.prod(shape) // self.LINE)

    def cut(self, shape: tuple[int, ...]) -> Floats:
        """Zeros of this shape."""
        begin = self.next
        self.next = begin + self._lines(shape)
        return self.numbers[begin : begin + math.prod(shape)].reshape(shape)


def work_for(top: Topology, parameters: int, sources: int, rows: Rows) -> tuple[Work, Floats]:
    """Arrays for the lanes of one row, and the stretch of numbers that they are cut off: 0 there clears them all."""
    free, n_all, entries = int(top.size[1]), int(top.size[2]), int(top.size[3])
    transports = int(top.group[TRANSPORT + 1]) - int(top.group[TRANSPORT])
    junctions = int(top.group[TRANSPORT]) - int(top.group[JUNCTION])
    channels = int(top.group[CHANNEL + 1]) - int(top.group[CHANNEL])
    warm = int(top.group[WARM + 1]) - int(top.group[WARM])
    devices = junctions + 2 * (transports + channels + warm)
    slopes = 2 * junctions + int(SLOPES) * transports + int(CHANNEL_SLOPES) * channels + int(WARM_SLOPES) * warm
    signals, lasting, count = rows.signal.size - 1, rows.lasting.size, rows.row.shape[0]
    guards = int(top.group[CONTACT]) - int(top.group[GUARD])
    contacts = int(top.group[FAMILIES]) - int(top.group[CONTACT])
    unknown, unknown_free, matrix, device, signal, row = (
        (size, WIDTH) for size in (n_all, free, entries + 1, devices, signals, lasting)
    )
    solving = [
        *[unknown] * 7, *[unknown_free] * 6, *[matrix] * 3, device, device,
        (slopes, WIDTH), (parameters, WIDTH), (sources, WIDTH), (sources, WIDTH),
    ]  # fmt: skip
    stepping = [*[unknown] * 3, device, device, *[unknown] * 3, device, unknown_free, unknown_free]
    watching = [signal, signal, signal, row, row, (WIDTH, count, 2), (WIDTH, count + 1), (WIDTH,)]
    columns = [(CLOCK, WIDTH), *[(WIDTH,)] * 6, (1,)]
    guarding = [(WIDTH, guards), (WIDTH, guards + contacts), (WIDTH, guards + contacts)]
    room = _Room([*columns, *solving, *stepping, *watching, *guarding])
    clock, *told_of = map(room.cut, columns)
    diagonal = np.zeros(free, dtype=np.uint32)
    diagonal[top.pivot[:-1, 0]] = top.pivot[:-1, 1]
    made: list[Any] = [*map(room.cut, solving), diagonal]
    steps = Stepping(*map(room.cut, stepping))
    rows_of: list[Any] = list(map(room.cut, watching))
    rows_of[-2] = rows_of[-2].view(np.int64)
    told, due, left = map(room.cut, guarding)
    work = Work(
        Columns(clock, *(each.view(np.int64) for each in told_of)),
        Solving(*made),
        steps,
        Watching(*rows_of),
        Guarding(told.view(np.int64), due, left.view(np.int64)),
    )
    return work, room.numbers


class Held(NamedTuple):
    """Arrays to work in: what for, the arrays, the same as the kernel takes them, and all of their numbers."""

    of: tuple[Topology, tuple[int, ...]]
    work: Work
    taken: Any
    numbers: Floats


class _LastWork(threading.local):
    """The arrays that the last run of a thread was worked in: the next of the same sizes clears and takes them."""

    held: Held | None = None

    def take(self, top: Topology, table: Floats, program: Program, rows: Rows) -> Held:
        """Arrays to work in, which nobody else gets until they are handed back."""
        sizes = table.shape[1], program.source.shape[2], rows.row.shape[0], rows.signal.size, rows.lasting.size
        held, self.held = self.held, None
        if held is not None and held.of[0] is top and held.of[1] == sizes:
            held.numbers[:] = 0.0
            return held
        work, numbers = work_for(top, table.shape[1], program.source.shape[2], rows)
        return Held((top, sizes), work, machine_code.Flat(work) if COMPILED else work, numbers)


LAST_WORK = _LastWork()
