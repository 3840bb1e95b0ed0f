"""One iterate of Newton's method for all lanes of a row, each in its own phase; and what they keep on arrival."""

from __future__ import annotations

from .assemble import evaluate
from .compiled import part
from .elimination import factor, substitute, substitute_two
from .lasting import note_lasting
from .layout import Control, Rows, Topology
from .newton import advance, residual, solved_by
from .rows import read_signals
from .steps import begin_end, begin_stage, error_of, growth, keep_parabola, left_over, surprise, take
from .tangents import extrapolate
from .vectors import any_of, at, flag, put, same, where
from .work import (
    AGAIN,
    AH,
    ARRIVED,
    BEGAN,
    CARRY,
    END,
    ERROR,
    GLANCE,
    GROWTH,
    LAST,
    LEAP,
    LEAPT,
    LENGTH,
    LIMITED,
    LOOKED,
    MOST,
    REACH,
    ROUND,
    STAGE,
    STAGED,
    STARTS,
    SURPRISE,
    TOOK,
    Work,
)


@part
def iterate(top: Topology, rows: Rows, control: Control, work: Work) -> None:
    """Take one iterate in every lane; note in ``came`` who is solved by it, and in ``failed`` who has no hope left.

    Lanes at the end of a step get its error, how far it lay from where it was expected, and their signals.
    """
    columns, solving, stepping, watching, _ = work
    element, group = top.element, top.group
    pivot, left = top.pivot, top.left
    x, q, i, p, a = solving.x, solving.q, solving.i, solving.p, solving.a
    constant, tolerance = solving.constant, solving.tolerance
    step, bend, error, noise, allowed = solving.step, solving.bend, solving.error, solving.noise, solving.allowed
    seen, slope, flow, clock, phase = solving.seen, solving.slope, solving.flow, columns.clock, columns.phase
    ah = at(clock, AH)
    h = at(clock, LENGTH)
    limited = evaluate(element, group, p, solving.source, solving.c, solving.g, ah, x, i, q, a, seen, flow, slope)
    residual(top.size[0], ah, x, i, q, a, solving.diagonal, constant, tolerance, noise, allowed, step)
    factor(a, ah, pivot, top.entry, top.update)
    substitute(a, step, pivot, top.entry, left)
    leaps = same(phase, LEAP)
    ends = same(phase, END)
    busy = leaps | same(phase, STAGE) | ends
    advance(busy, step, x)
    far = extrapolate(
        element,
        group,
        p,
        ah,
        solving.nothing,
        step,
        seen,
        slope,
        i,
        q,
        flow,
        solving.di,
        solving.dq,
        bend,
    )
    if any_of(ends):
        left_over(h, stepping.i0, stepping.ig, i, noise, error)
        substitute_two(a, bend, error, pivot, top.entry, left)
    else:
        substitute(a, bend, pivot, top.entry, left)
    solved, astray = solved_by(ah, i, q, constant, allowed, tolerance, bend)
    solved = busy & ~limited & ~far & solved
    rounds = at(clock, ROUND) + 1.0
    most = at(clock, MOST)
    hopeless = astray & ~leaps & (rounds >= 0.5 * most)
    spent = busy & ~solved & (hopeless | (rounds >= most))
    ends = ends & solved
    if any_of(ends):
        put(clock, SURPRISE, surprise(top.size[0], solving.expected, x))
        size = error_of(control.relative, control.absolute, stepping.x0, x, error)
        put(clock, ERROR, size)
        put(clock, GROWTH, growth(size))
        read_signals(rows.term, rows.factor, rows.signal, p, stepping.xg, stepping.flow_g, watching.sg)
    if any_of(ends | (solved & leaps) | same(phase, GLANCE)):
        read_signals(rows.term, rows.factor, rows.signal, p, x, flow, watching.s1)
    put(clock, LIMITED, where(limited, 1.0, 0.0 * h))
    put(clock, ROUND, rounds)
    flag(solved, columns.came)
    flag(spent, columns.failed)


@part
def settle(rows: Rows, work: Work) -> None:
    """Keep what lanes found that came to a stage, arrived or leapt; those that begin again forget what they saw."""
    columns, solving, stepping, watching, _ = work
    x, q, i, flow, seen = solving.x, solving.q, solving.i, solving.flow, solving.seen
    came, clock = columns.came, columns.clock
    staged = same(came, STAGED)
    if any_of(staged):
        take(staged, x, stepping.xg)
        take(staged, q, stepping.qg)
        take(staged, i, stepping.ig)
        take(staged, flow, stepping.flow_g)
    arrived = same(came, ARRIVED)
    leapt = same(came, LEAPT) | same(came, LOOKED)
    settles = arrived | leapt
    if any_of(settles):
        note_lasting(
            rows.row, rows.level, rows.lasting, arrived, same(came, LEAPT), at(clock, BEGAN), at(clock, TOOK),
            watching.s0, watching.sg, watching.s1, watching.best, watching.best_at,
        )  # fmt: skip
        keep_parabola(
            arrived,
            leapt,
            at(clock, LENGTH),
            stepping.x0,
            stepping.xg,
            x,
            stepping.first,
            stepping.second,
        )
        take(settles, x, stepping.x0)
        take(settles, q, stepping.q0)
        take(settles, i, stepping.i0)
        take(settles, flow, stepping.flow0)
        take(settles, seen, stepping.seen0)
        take(settles, watching.s1, watching.s0)
    again = same(came, AGAIN)
    if any_of(again):
        take(again, stepping.seen0, seen)


@part
def set_off(control: Control, work: Work) -> None:
    """Begin the next stage or the next end of a step, or a jump, in the lanes that are to."""
    columns, solving, stepping, _, _ = work
    came, clock = columns.came, columns.clock
    x, constant = solving.x, solving.constant
    x0, q0, i0, first, second = stepping.x0, stepping.q0, stepping.i0, stepping.first, stepping.second
    ahead = at(clock, REACH)
    starting = same(came, STARTS)
    if any_of(starting):
        begin_stage(
            starting, control.relative, control.absolute, ahead, at(clock, CARRY), x0, q0, i0, first, second,
            x, constant, solving.tolerance,
        )  # fmt: skip
    staged = same(came, STAGED)
    if any_of(staged):
        begin_end(
            staged, ahead, at(clock, LENGTH), at(clock, LAST), x0, q0, stepping.xg, stepping.qg, first, second,
            x, constant, solving.expected,
        )  # fmt: skip
