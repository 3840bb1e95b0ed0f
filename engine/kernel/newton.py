"""Newton's iteration for one stage of a step, with limited junctions, and what counts as solved."""

from __future__ import annotations

import math

from .assemble import evaluate
from .compiled import leaf
from .elimination import copy, factor, substitute
from .laws import TOP
from .layout import Floats, Places

REMAINDER = 0.3  # accepted Kirchhoff residual in parts of the tolerance
ROUND_OFF = 2.2e-16  # of the charges that cancel in a residual
SETTLED = 0.3  # slopes that a junction may move in an iteration that is followed by one without a matrix
BRANCH_VOLTS = 1e-4  # V, accepted residual of a branch's own equation


@leaf
def solve(
    element: Places,
    group: Places,
    pivot: Places,
    entry: Places,
    update: Places,
    nets: int,
    p: Floats,
    source: Floats,
    linear: Floats,
    constant: Floats,
    tolerance: Floats,
    diagonal: Places,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    factors: Floats,
    rhs: Floats,
    seen: Floats,
    flow: Floats,
    ah: float,
    most: int,
) -> tuple[int, int]:
    """Newton for q(x) + ah i(x) + constant = 0 from x; return iterations (-1 = failed) and the worst unknown.

    Accepted once the Kirchhoff residual, judged in volts through the diagonal, is well inside the tolerance.
    """
    worst = 0
    moved = math.inf
    for iteration in range(most + 1):
        # Where the junctions hardly moved, this iterate is mostly the last: its matrix would not be used.
        build = moved > SETTLED
        moved = evaluate(element, group, p, source, linear, ah, x, i, q, a, seen, flow, build)
        largest = 0.0
        finite = True
        for k in range(rhs.size):
            r = q[k] + ah * i[k] + constant[k]
            allowed = abs(a[diagonal[k]]) * tolerance[k]
            if k >= nets:
                allowed += ah * BRANCH_VOLTS
            rhs[k] = -r
            if not math.isfinite(r):
                finite = False
                worst = k
            elif abs(r) > largest * allowed:
                largest = abs(r) / (allowed + 1e-300)
                worst = k
        if not finite or iteration == most:
            return -1, worst
        if iteration > 0 and moved < math.inf and largest <= REMAINDER:
            # Where a large capacitance joins two nets that hang on little else, a residual that is small beside it
            # may still stand for volts. What counts is the step it asks for; the factors at hand tell that, up to the
            # growth or fall of the junctions' conductances since. Round-off asks for nothing.
            for k in range(rhs.size):
                if abs(rhs[k]) <= ROUND_OFF * (abs(q[k]) + abs(constant[k]) + abs(a[diagonal[k]] * x[k])):
                    rhs[k] = 0.0
            substitute(factors, rhs, pivot, entry)
            step = 0.0
            for k in range(rhs.size):
                step = max(step, abs(rhs[k]) / tolerance[k])
            if step * math.exp(min(moved, TOP)) <= REMAINDER:
                return iteration, worst
            for k in range(rhs.size):
                rhs[k] = -(q[k] + ah * i[k] + constant[k])
        if not build:
            moved = evaluate(element, group, p, source, linear, ah, x, i, q, a, seen, flow, True)
        copy(a, factors)
        factor(factors, pivot, entry, update)
        substitute(factors, rhs, pivot, entry)
        for k in range(rhs.size):
            x[k] += rhs[k]
    return -1, worst
