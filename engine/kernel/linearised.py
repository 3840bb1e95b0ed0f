"""A circuit at one operating point, outside of any run: currents, charges, and dense matrices of their derivatives."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from .assemble import evaluate, linear_matrices
from .compiled import compiled
from .layout import BRANCH, E_A, E_SLOT, JUNCTION, TRANSPORT, Floats, Places, Topology, zeros
from .vectors import WIDTH, at, put, where

LOOKS = 200  # until junctions, limited in each look, are taken at the voltages asked for


@dataclass(frozen=True)
class Linearised:
    """Currents (A) out of and charges (C) on all nets, (n_all,); G and C over the free unknowns, (n_free, n_free)."""

    current: Floats
    charge: Floats
    conductance: Floats
    capacitance: Floats

    def matrix(self, ah: float) -> Floats:
        """C + a h G."""
        return self.capacitance + ah * self.conductance


@compiled
def _look(
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
    moved: Floats,
) -> None:
    linear_matrices(element, group, p, c, g)
    limited = evaluate(element, group, p, source, c, g, at(steps, which), x, i, q, a, seen, flow, slope)
    put(moved, 0, where(limited, 1.0, 0.0))


def _places(top: Topology) -> dict[tuple[int, int], int]:
    """Slot of every entry between free unknowns that some element has."""
    found = {}
    for family in range(TRANSPORT + 1):
        for element in top.element[top.group[family] : top.group[family + 1]].astype(int):
            if family == BRANCH:
                a, b, own = element[E_A : E_A + 3]
                pairs = [(own, a), (own, b), (own, own), (a, own), (b, own)]
            else:
                nets = element[E_A : E_A + (3 if family == TRANSPORT else 2)]
                pairs = [(r, k) for r in nets for k in nets]
            for n, pair in enumerate(pairs):
                if max(pair) < top.size[1]:
                    found[pair] = int(element[E_SLOT + n])
    return found


def linearised(top: Topology, parameters: Floats, source: Floats, x: Floats) -> Linearised:
    """Linearise at x (n_all,) with the parameters of one lane, (parameters,), and its sources, (sources,)."""
    free, n_all, entries = int(top.size[1]), int(top.size[2]), int(top.size[3])
    transports = int(top.group[TRANSPORT + 1]) - int(top.group[TRANSPORT])
    devices = int(top.group[TRANSPORT]) - int(top.group[JUNCTION]) + 2 * transports

    def row(values: Floats) -> Floats:
        return np.ascontiguousarray(np.repeat(values[:, None], WIDTH, axis=1))

    p, drive, v = row(parameters), row(source), row(x)
    i, q, seen, flow = zeros(n_all, WIDTH), zeros(n_all, WIDTH), zeros(devices, WIDTH), zeros(devices, WIDTH)
    c, g, a = zeros(entries + 1, WIDTH), zeros(entries + 1, WIDTH), zeros(entries + 1, WIDTH)
    slope = zeros(6 * devices, WIDTH)
    steps = np.ascontiguousarray(np.array([[0.0] * WIDTH, [1.0] * WIDTH]))
    moved = zeros(1, WIDTH)
    stored = []
    with np.errstate(all="ignore"):
        for which in range(2):
            for _ in range(LOOKS):
                _look(top.element, top.group, p, drive, c, g, steps, which, v, i, q, a, seen, flow, slope, moved)
                if moved[0, 0] == 0.0:
                    break
            stored.append(a[:, 0].copy())
    found = []
    for values in (stored[0], stored[1] - stored[0]):
        dense = zeros(free, free)
        for (r, k), slot in _places(top).items():
            dense[r, k] = values[slot]
        found.append(dense)
    return Linearised(i[:, 0].copy(), q[:, 0].copy(), found[1], found[0])
