"""The arrays that one row of lanes is stepped in, and the numbers that every lane has of its own."""

from __future__ import annotations

import math
import threading
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
CLOCK = 25
LOST = -1.0


class Work(NamedTuple):
    """Arrays to work in, one column per lane of the row."""

    x: Floats  # (n_all, WIDTH) the iterate; then start and stage of the step: voltages, charges, currents
    q: Floats
    i: Floats
    x0: Floats
    q0: Floats
    i0: Floats
    xg: Floats
    qg: Floats
    ig: Floats
    di: Floats  # what Newton's step changes of i and q, the step, and what it leaves over
    dq: Floats
    step: Floats
    bend: Floats
    first: Floats  # (n_free, WIDTH) parabola of the step before
    second: Floats
    constant: Floats
    tolerance: Floats
    error: Floats
    noise: Floats  # what round-off makes of the charges, and what may be left of a residual
    allowed: Floats
    expected: Floats  # where the end of the step was thought to lie
    a: Floats  # (entries + 1, WIDTH) matrix and then its factors, and the linear part of C and of G
    c: Floats
    g: Floats
    seen: Floats  # (devices, WIDTH) junction and channel voltages, then device currents
    seen0: Floats
    flow: Floats
    flow0: Floats
    flow_g: Floats
    slope: Floats  # (slopes of devices, WIDTH)
    p: Floats  # (parameters, WIDTH)
    source: Floats  # (sources, WIDTH), and as many of 0
    nothing: Floats
    clock: Floats  # (CLOCK, WIDTH)
    s0: Floats  # (signals, WIDTH) signals at start, stage and end of the step
    sg: Floats
    s1: Floats
    window: Floats  # (WIDTH, rows, 2)
    listed: Ints  # (WIDTH, rows + 1) how many rows are open, and which
    listed_until: Floats  # (WIDTH,) s, when to list them anew
    best: Floats  # (lasting rows, WIDTH) extremes and integrals so far, and when
    best_at: Floats
    phase: Ints  # (WIDTH,) and so the next
    came: Ints
    failed: Ints
    lane: Ints
    segment: Ints
    moving: Ints
    begun: Ints  # (1,) how many lanes have begun
    told: Ints  # (WIDTH, guards) what each guard was told last; (WIDTH, guards + contacts) when it moves, and how often
    due: Floats
    left: Ints
    diagonal: Places  # (n_free,) slot of an unknown's diagonal


LINE = 64  # bytes that a processor fetches at a time


class _Room:
    """One stretch of zeros, of which arrays are cut off: as quick to make, and to clear, as a single array."""

    def __init__(self, numbers: int) -> None:
        # Every row lies within one line of the cache: a row across two takes twice as long.
        spare = LINE // 8
        self.numbers = zeros(numbers + spare)
        self.next = (-self.numbers.__array_interface__["data"][0] % LINE) // 8

    def cut(self, *shape: int) -> Floats:
        """Zeros of this shape."""
        begin = self.next
        self.next = begin + math.prod(shape)
        return self.numbers[begin : self.next].reshape(shape)


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
    sizes = (
        *[n_all] * 13, *[free] * 8, *[entries + 1] * 3, *[devices] * 5, slopes, parameters, sources, sources, CLOCK,
        *[signals] * 3, lasting, lasting, *[1] * 6,
    )  # fmt: skip
    moves = (WIDTH, guards + contacts)
    shapes = [(WIDTH, count, 2), (WIDTH, count + 1), (WIDTH,), (1,), (WIDTH, guards), moves, moves]
    room = _Room(WIDTH * sum(sizes) + sum(map(math.prod, shapes)))
    cut = [room.cut(size, WIDTH) for size in sizes]
    window, listed, until, begun, told, due, left = (room.cut(*shape) for shape in shapes)
    diagonal = np.zeros(free, dtype=np.uint32)
    diagonal[top.pivot[:-1, 0]] = top.pivot[:-1, 1]
    arrays: list[Any] = [
        *cut[:-8],
        window,
        listed.view(np.int64),
        until,
        *cut[-8:-6],
        *(row[0].view(np.int64) for row in cut[-6:]),
        begun.view(np.int64),
        told.view(np.int64),
        due,
        left.view(np.int64),
        diagonal,
    ]
    return Work(*arrays), room.numbers


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
