"""Newton's iteration of every lane in a row: what an iterate leaves over, and what counts as solved."""

from __future__ import annotations

import math

from .compiled import leaf
from .elimination import factor, substitute
from .laws import TOP
from .layout import Floats, Places
from .vectors import Flags, Numbers, at, exp, greater, lesser, put, where

REMAINDER = 0.3  # accepted Kirchhoff residual in parts of the tolerance
ROUND_OFF = 2.2e-16  # of the charges that cancel in a residual
BRANCH_VOLTS = 1e-4  # V, accepted residual of a branch's own equation


@leaf
def residual(
    nets: int,
    ah: Numbers,
    i: Floats,
    q: Floats,
    a: Floats,
    diagonal: Places,
    constant: Floats,
    tolerance: Floats,
    rhs: Floats,
) -> tuple[Flags, Flags]:
    """Set rhs to -(q + ah i + constant); return where all of it is finite and where it is well inside the tolerance,
    judged in volts through the diagonal."""
    wrong = ah != ah
    over = wrong
    for k in range(rhs.shape[0]):
        r = at(q, k) + ah * at(i, k) + at(constant, k)
        allowed = abs(at(a, diagonal[k])) * at(tolerance, k)
        if k >= nets:
            allowed = allowed + ah * BRANCH_VOLTS
        put(rhs, k, -r)
        over = over | (abs(r) > REMAINDER * allowed)
        wrong = wrong | ~(abs(r) < math.inf)
    return ~wrong, ~over


@leaf
def worst_unknown(
    nets: int,
    ah: float,
    a: Floats,
    diagonal: Places,
    tolerance: Floats,
    rhs: Floats,
    w: int,
) -> int:
    """Return the unknown of the lane in column w that is furthest from solved."""
    worst = 0
    largest = 0.0
    for k in range(rhs.shape[0]):
        if not math.isfinite(rhs[k, w]):
            return k
        allowed = abs(a[diagonal[k], w]) * tolerance[k, w] + (ah * BRANCH_VOLTS if k >= nets else 0.0)
        if abs(rhs[k, w]) > largest * allowed:
            largest = abs(rhs[k, w]) / (allowed + 1e-300)
            worst = k
    return worst


@leaf
def asked_step(q: Floats, a: Floats, diagonal: Places, x: Floats, constant: Floats, rhs: Floats, trial: Floats) -> None:
    """Set trial to what the residual asks to be moved, before substitution. Round-off asks for nothing."""
    for k in range(rhs.shape[0]):
        r = at(rhs, k)
        noise = ROUND_OFF * (abs(at(q, k)) + abs(at(constant, k)) + abs(at(a, diagonal[k]) * at(x, k)))
        put(trial, k, where(abs(r) <= noise, 0.0, r))


@leaf
def settled(tolerance: Floats, trial: Floats, moved: Numbers) -> Flags:
    """Return where the step that a small residual asks for is well inside the tolerance too.

    Where a large capacitance joins two nets that hang on little else, a residual that is small beside it may still
    stand for volts. What counts is the step it asks for; the factors at hand tell that, up to the growth or fall of the
    junctions' conductances since.
    """
    step = abs(at(trial, 0)) / at(tolerance, 0)
    for k in range(1, trial.shape[0]):
        step = greater(abs(at(trial, k)) / at(tolerance, k), step)
    accepted: Flags = step * exp(lesser(moved, TOP)) <= REMAINDER
    return accepted


@leaf
def improve(
    pivot: Places,
    entry: Places,
    update: Places,
    left: Places,
    going: Flags,
    a: Floats,
    rhs: Floats,
    factors: Floats,
    x: Floats,
) -> None:
    """Factor the matrix and take Newton's step in the lanes that go on; only they get new factors."""
    factor(a, pivot, entry, update)
    substitute(a, rhs, pivot, entry, left)
    for k in range(a.shape[0]):
        put(factors, k, where(going, at(a, k), at(factors, k)))
    for k in range(rhs.shape[0]):
        x_old = at(x, k)
        put(x, k, where(going, x_old + at(rhs, k), x_old))
