"""A circuit at given states, outside of any run: currents, charges, and dense matrices of their derivatives."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial

import numpy as np

from . import machine_code
from .assemble import evaluate, linear_matrices
from .compiled import COMPILED, leaf
from .layout import (
    BRANCH,
    CHANNEL,
    CHANNEL_SLOPES,
    E_A,
    E_SLOT,
    JUNCTION,
    SLOPES,
    TRANSPORT,
    WARM,
    WARM_SLOPES,
    Floats,
    Places,
    Topology,
    zeros,
)
from .vectors import WIDTH, at, put, where

LOOKS = 100  # until junctions, limited in each look, are taken at the voltages asked for


@dataclass(frozen=True)
class Linearised:
    """Currents (A) out of and charges (C) on all nets, (states, n_all); G and C of the free unknowns, (states, n_free,
    n_free), in siemens and farad, rows of branches in volts."""

    current: Floats
    charge: Floats
    conductance: Floats
    capacitance: Floats


def linearised(top: Topology, parameters: Floats, sources: int, states: Floats) -> Linearised:
    """Linearise at states (states, n_all), each with a row of the lane table; ``sources`` is their number, all at 0."""
    count, n_all = states.shape
    free, entries = int(top.size[1]), int(top.size[3])
    transports = int(top.group[TRANSPORT + 1]) - int(top.group[TRANSPORT])
    junctions = int(top.group[TRANSPORT]) - int(top.group[JUNCTION])
    made = Linearised(*(zeros(count, n_all) for _ in range(2)), *(zeros(count, free, free) for _ in range(2)))
    rows, columns, slots = np.array(_places(top), dtype=np.int64).reshape(-1, 3).T
    i, q = zeros(n_all, WIDTH), zeros(n_all, WIDTH)
    channels = int(top.group[CHANNEL + 1]) - int(top.group[CHANNEL])
    warm = int(top.group[WARM + 1]) - int(top.group[WARM])
    flow = zeros(junctions + 2 * (transports + channels + warm), WIDTH)
    slopes = 2 * junctions + int(SLOPES) * transports + int(CHANNEL_SLOPES) * channels + int(WARM_SLOPES) * warm
    slope = zeros(slopes, WIDTH)
    c, g, a = (zeros(entries + 1, WIDTH) for _ in range(3))
    steps = np.repeat([[0.0], [1.0]], WIDTH, axis=1)
    limited = zeros(1, WIDTH)
    for low in range(0, count, WIDTH):
        lanes = np.minimum(np.arange(low, low + WIDTH), count - 1)
        few = min(WIDTH, count - low)
        p, x = np.ascontiguousarray(parameters[lanes].T), np.ascontiguousarray(states[lanes].T)
        seen = np.zeros_like(flow)
        stored = []
        for which in range(2):
            arguments = (
                top.element, top.group, p, zeros(sources, WIDTH), c, g, steps, which, x, i, q, a, seen, flow, slope,
                limited,
            )  # fmt: skip
            again = machine_code.bound("look", arguments) if COMPILED else partial(look, *arguments)
            for _ in range(LOOKS):
                with np.errstate(all="ignore"):
                    again()
                if not np.any(limited):
                    break
            stored.append(a[slots, :few].T.copy())
        here = slice(low, low + few)
        made.current[here], made.charge[here] = i[:, :few].T, q[:, :few].T
        made.capacitance[here, rows, columns] = stored[0]
        made.conductance[here, rows, columns] = stored[1] - stored[0]
    return made


@leaf
def look(
    element: Places,
    group: Places,
    p: Floats,
    source: Floats,
    c: Floats,
    g: Floats,
    steps: Floats,
    which: int,
    x: Floats,
    i: Floats,
    q: Floats,
    a: Floats,
    seen: Floats,
    flow: Floats,
    slope: Floats,
    limited: Floats,
) -> None:
    """Evaluate WIDTH states with step ``which``; ``limited`` tells where a junction is not yet where it was asked."""
    linear_matrices(element, group, p, c, g)
    away = evaluate(element, group, p, source, c, g, at(steps, which), x, i, q, a, seen, flow, slope)
    put(limited, 0, where(away, 1.0, 0.0))


def _places(top: Topology) -> list[tuple[int, int, int]]:
    """Row, column and slot of every entry between free unknowns that some element has."""
    found = {}
    for family in range(WARM + 1):
        for element in top.element[top.group[family] : top.group[family + 1]].astype(int):
            if family == BRANCH:
                a, b, own = element[E_A : E_A + 3]
                pairs = [(own, a), (own, b), (own, own), (a, own), (b, own)]
            else:
                nets = element[E_A : E_A + (3 if family in (TRANSPORT, CHANNEL, WARM) else 2)]
                pairs = [(r, k) for r in nets for k in nets]
            for n, pair in enumerate(pairs):
                if max(pair) < top.size[1]:
                    found[pair] = int(element[E_SLOT + n])
    return [(*pair, slot) for pair, slot in found.items()]
