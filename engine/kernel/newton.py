"""Newton's iteration of every lane in a row: what an iterate leaves over, the step it asks for, what is solved."""

from __future__ import annotations

import math

from .compiled import leaf
from .elimination import LEAST_PIVOT
from .layout import Floats, Places
from .vectors import Flags, Numbers, at, greater, put, where

REMAINDER = 0.3  # accepted Kirchhoff residual in parts of the tolerance
ROUND_OFF = 2.2e-16  # of the charges that cancel in a residual
BRANCH_VOLTS = 1e-4  # V, accepted residual of a branch's own equation
ASTRAY = 20.0  # times the tolerance: what still leaves over so much half way through its iterates does not converge


@leaf
def residual(
    nets: int,
    ah: Numbers,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    diagonal: Places,
    constant: Floats,
    tolerance: Floats,
    noise: Floats,
    allowed: Floats,
    step: Floats,
) -> None:
    """Set the first rows of step to -(q + ah i + constant), 0 where that is round-off, which is noted in noise; and
    allowed to what may be left of it, judged in volts through the diagonal."""
    for k in range(constant.shape[0]):
        r = at(q, k) + ah * at(i, k) + at(constant, k)
        own = greater(abs(at(a, diagonal[k])), LEAST_PIVOT * ah)
        level = ROUND_OFF * (abs(at(q, k)) + abs(at(constant, k)) + own * abs(at(x, k)))
        left = own * at(tolerance, k)
        if k >= nets:
            left = left + ah * BRANCH_VOLTS
        put(allowed, k, REMAINDER * left + 8.0 * level)
        put(noise, k, level)
        put(step, k, where(abs(r) <= level, 0.0, -r))


@leaf
def solved_by(
    ah: Numbers,
    i: Floats,
    q: Floats,
    constant: Floats,
    allowed: Floats,
    tolerance: Floats,
    bend: Floats,
) -> tuple[Flags, Flags]:
    """Return where a step solved the stage: what it leaves over, as a step of its own in bend, is well inside the
    tolerance, and so is the residual by the tangents, which round-off in the elimination may have spoilt; and where
    it is so far from that, or not even finite, that it went astray."""
    well = ah == ah
    near = ah == ah
    for k in range(tolerance.shape[0]):
        over = abs(at(bend, k))
        near = near & (over <= ASTRAY * at(tolerance, k))
        well = well & (over <= REMAINDER * at(tolerance, k))
        well = well & (abs(at(q, k) + ah * at(i, k) + at(constant, k)) <= at(allowed, k))
    return well, ~near


@leaf
def worst_unknown(tolerance: Floats, bend: Floats, step: Floats, w: int) -> int:
    """Return the unknown of the lane in column w that is furthest from solved."""
    worst = 0
    largest = 0.0
    for k in range(tolerance.shape[0]):
        if not math.isfinite(step[k, w]) or not math.isfinite(bend[k, w]):
            return k
        size = abs(bend[k, w]) / tolerance[k, w]
        if size > largest:
            largest = size
            worst = k
    return worst


@leaf
def advance(busy: Flags, step: Floats, x: Floats) -> None:
    """Take Newton's step in the busy lanes; the others have none."""
    for k in range(x.shape[0]):
        taken = where(busy, at(step, k), 0.0)
        put(step, k, taken)
        put(x, k, at(x, k) + taken)
