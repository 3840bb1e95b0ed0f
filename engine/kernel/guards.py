"""Guards: contacts that a signal of the circuit operates, as an armature does, with delays, hysteresis and bounce.

A guard watches the difference of two unknowns. Past its upper level, or below its lower one, it is told to move, and
does so after its delay unless it is called back before. Its state (0 or 1) stands in a row of the unknowns behind the
known nets, so that states that are kept hold it too. The instant of a move is found on the parabola of a step; a step
that went beyond is taken again up to that instant, where the lane jumps.
"""

from __future__ import annotations

import math

from .compiled import leaf
from .layout import (
    CONTACT,
    CT_BOUNCE,
    CT_CLOSED,
    CT_DELAY,
    CT_OPEN,
    CT_TIMES,
    E_A,
    E_B,
    E_C,
    E_EXTRA,
    E_PARAMETER,
    E_SLOT,
    FAMILIES,
    G_OFF,
    G_OFF_DELAY,
    G_ON,
    G_ON_DELAY,
    GUARD,
    Floats,
    Ints,
    Places,
)
from .rows import crossing

SOON = 1e-12  # s, the soonest that a move can follow on what caused it


@leaf
def set_contact(element: Places, k: int, closed: bool, w: int, p: Floats) -> None:
    """Give a contact's conductance its value."""
    own = element[k, E_PARAMETER]
    p[element[k, E_SLOT], w] = p[own + CT_CLOSED, w] if closed else p[own + CT_OPEN, w]


@leaf
def rest_guards(
    element: Places, group: Places, w: int, x: Floats, p: Floats, told: Ints, due: Floats, left: Ints
) -> None:
    """Bring all contacts of a lane to where the states in x say, with nothing about to move."""
    guards = group[GUARD]
    for k in range(guards, group[CONTACT]):
        told[w, k - guards] = 1 if x[element[k, E_C], w] > 0.5 else 0
    for k in range(guards, group[FAMILIES]):
        due[w, k - guards] = math.inf
        left[w, k - guards] = 0
        if k >= group[CONTACT]:
            set_contact(element, k, told[w, element[k, E_A]] == element[k, E_B], w, p)


@leaf
def next_due(due: Floats, w: int) -> float:
    """Return when something moves next, s."""
    soonest = math.inf
    for k in range(due.shape[1]):
        soonest = min(soonest, due[w, k])
    return soonest


@leaf
def watch_guards(
    element: Places,
    group: Places,
    begin: float,
    h: float,
    gamma: float,
    w: int,
    x0: Floats,
    xg: Floats,
    x1: Floats,
    p: Floats,
    told: Ints,
    due: Floats,
) -> bool:
    """Tell the guards what a step says; return whether one moves before its end."""
    within = False
    guards = group[GUARD]
    for k in range(guards, group[CONTACT]):
        g = k - guards
        a = element[k, E_A]
        b = element[k, E_B]
        own = element[k, E_PARAMETER]
        y0 = x0[a, w] - x0[b, w]
        yg = xg[a, w] - xg[b, w]
        y1 = x1[a, w] - x1[b, w]
        if element[k, E_EXTRA] == 1:
            y0 = abs(y0)
            yg = abs(yg)
            y1 = abs(y1)
        on = told[w, g] == 1
        level = p[own + G_OFF, w] if on else p[own + G_ON, w]
        way = -1.0 if on else 1.0
        if max(way * y0, way * yg, way * y1) <= way * level:
            continue
        u = 0.0 if way * y0 > way * level else crossing(y0, yg, y1, level, way, 0.0, gamma)
        if u < 0.0:
            continue
        told[w, g] = 0 if on else 1
        moved = x0[element[k, E_C], w] > 0.5
        if moved == (told[w, g] == 1):
            due[w, g] = math.inf
            continue
        delay = p[own + G_OFF_DELAY, w] if on else p[own + G_ON_DELAY, w]
        due[w, g] = begin + max(u * h + delay, SOON)
        within = within or due[w, g] < begin + h * (1.0 - 1e-9)
    return within


@leaf
def move_guards(
    element: Places,
    group: Places,
    now: float,
    w: int,
    x0: Floats,
    x: Floats,
    p: Floats,
    told: Ints,
    due: Floats,
    left: Ints,
) -> None:
    """Move what is due: armatures first, then the contacts on them, which bounce where they close."""
    guards = group[GUARD]
    first = group[CONTACT]
    for k in range(guards, first):
        g = k - guards
        if due[w, g] > now:
            continue
        due[w, g] = math.inf
        state = 1.0 if told[w, g] == 1 else 0.0
        x0[element[k, E_C], w] = state
        x[element[k, E_C], w] = state
        for n in range(first, group[FAMILIES]):
            if element[n, E_A] == g:
                own = element[n, E_PARAMETER]
                closes = (state > 0.5) == (element[n, E_B] == 1)
                due[w, n - guards] = now + p[own + CT_DELAY, w]
                left[w, n - guards] = 1 + (2 * int(p[own + CT_TIMES, w]) if closes else 0)
    for n in range(first, group[FAMILIES]):
        c = n - guards
        if due[w, c] > now:
            continue
        own = element[n, E_PARAMETER]
        guard = group[GUARD] + element[n, E_A]
        target = (x[element[guard, E_C], w] > 0.5) == (element[n, E_B] == 1)
        left[w, c] -= 1
        set_contact(element, n, target == (left[w, c] % 2 == 0), w, p)
        due[w, c] = math.inf
        if left[w, c] > 0:
            due[w, c] = now + p[own + CT_BOUNCE, w] / (2.0 * p[own + CT_TIMES, w])
