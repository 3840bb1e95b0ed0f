"""Sparse elimination in an order fixed once per topology: minimum degree, then straight index lists.

The order is Markowitz's rule for symmetric patterns (minimum degree: Tinney, Walker, Proc. IEEE 55 (1967) 1801).
"""

from __future__ import annotations

from collections.abc import Iterable

from .compiled import leaf
from .layout import Floats, Places, places
from .vectors import Numbers, at, fused, put, where

LEAST_PIVOT = 1e-15  # S, times a h: next to nothing, but enough to divide by in a net that only a branch holds


class Pattern:
    """Collects the structurally nonzero entries and hands out the slot in which each is stored."""

    def __init__(self, size: int) -> None:
        self.size = size
        self._neighbours: list[set[int]] = [{k} for k in range(size)]

    def couple(self, members: Iterable[int]) -> None:
        """Note that every pair of these unknowns shares an entry; known nets (>= size) are ignored."""
        free = [m for m in members if m < self.size]
        for m in free:
            self._neighbours[m].update(free)

    def plan(self, late: Iterable[tuple[int, tuple[int, ...]]] = ()) -> Plan:
        """Return order and index lists. ``late`` names unknowns without a diagonal of their own and the partners of
        which at least one must go first."""
        waiting = {row: {p for p in partners if p < self.size} for row, partners in late}
        graph = [set(n) for n in self._neighbours]
        left = set(range(self.size))
        order: list[int] = []
        slots: dict[tuple[int, int], int] = {}
        for i, neighbours in enumerate(graph):
            for j in sorted(neighbours):
                slots[i, j] = len(slots)
        while left:
            ready = [k for k in left if not waiting.get(k)]
            k = min(ready, key=lambda node: (len(graph[node]), node))
            rest = graph[k] - {k}
            for i in rest:
                graph[i] |= rest
                graph[i].discard(k)
                for j in rest:
                    slots.setdefault((i, j), len(slots))
            for row in [row for row, partners in waiting.items() if k in partners]:
                del waiting[row]
            left.discard(k)
            order.append(k)
        return Plan(order, slots)


class Plan:
    """The elimination order with the index lists of every multiplication."""

    def __init__(self, order: list[int], slots: dict[tuple[int, int], int]) -> None:
        self.order = order
        self.slots = slots
        self.entries = len(slots)

    def slot(self, row: int, column: int) -> int:
        """Where entry (row, column) is stored; the dump slot when either is a known net."""
        return self.slots.get((row, column), self.entries)

    def lists(self) -> dict[str, Places]:
        """Index lists by the field names of :class:`.layout.Topology`."""
        place = {k: n for n, k in enumerate(self.order)}
        later: dict[int, list[int]] = {k: [] for k in self.order}
        earlier: dict[int, list[int]] = {k: [] for k in self.order}
        for i, j in self.slots:
            if place[j] > place[i]:
                later[i].append(j)
            elif place[j] < place[i]:
                earlier[i].append(j)
        pivots: list[tuple[int, int, int, int]] = []
        entries: list[tuple[int, int, int, int]] = []
        updates: list[tuple[int, int]] = []
        lefts: list[tuple[int, int]] = []
        for k in self.order:
            pivots.append((k, self.slots[k, k], len(entries), len(lefts)))
            lefts += [(j, self.slots[k, j]) for j in sorted(earlier[k], key=place.__getitem__)]
            rest = sorted(later[k], key=place.__getitem__)
            for i in rest:
                entries.append((i, self.slots[i, k], self.slots[k, i], len(updates)))
                updates += [(self.slots[i, j], self.slots[k, j]) for j in rest]
        pivots.append((0, 0, len(entries), len(lefts)))
        entries.append((0, 0, 0, len(updates)))
        return {
            "pivot": places(pivots, len(pivots), 4),
            "entry": places(entries, len(entries), 4),
            "update": places(updates, len(updates), 2),
            "left": places(lefts, len(lefts), 2),
        }


@leaf
def factor(a: Floats, ah: Numbers, pivot: Places, entry: Places, update: Places) -> None:
    """Factor the stored matrix C + a h G of every lane in place; the pivots are stored as their reciprocals."""
    least = LEAST_PIVOT * ah
    for n in range(pivot.shape[0] - 1):
        slot = pivot[n, 1]
        value = at(a, slot)
        value = 1.0 / where(abs(value) < least, least, value)
        put(a, slot, value)
        for r in range(pivot[n, 2], pivot[n + 1, 2]):
            f = at(a, entry[r, 1]) * value
            put(a, entry[r, 1], f)
            for m in range(entry[r, 3], entry[r + 1, 3]):
                put(a, update[m, 0], fused(-f, at(a, update[m, 1]), at(a, update[m, 0])))


@leaf
def substitute(a: Floats, b: Floats, pivot: Places, entry: Places, left: Places) -> None:
    """Solve with the factored matrix; b holds the right-hand side and then the solution."""
    count = pivot.shape[0] - 1
    for n in range(count):
        k = pivot[n, 0]
        v = at(b, k)
        for r in range(pivot[n, 3], pivot[n + 1, 3]):
            v = fused(-at(a, left[r, 1]), at(b, left[r, 0]), v)
        put(b, k, v)
    for back in range(count):
        n = count - 1 - back
        k = pivot[n, 0]
        v = at(b, k)
        for r in range(pivot[n, 2], pivot[n + 1, 2]):
            v = fused(-at(a, entry[r, 2]), at(b, entry[r, 0]), v)
        put(b, k, v * at(a, pivot[n, 1]))


@leaf
def substitute_two(a: Floats, b: Floats, d: Floats, pivot: Places, entry: Places, left: Places) -> None:
    """As :func:`substitute` for two right-hand sides, in little more than the time of one: each waits for itself."""
    count = pivot.shape[0] - 1
    for n in range(count):
        k = pivot[n, 0]
        v = at(b, k)
        u = at(d, k)
        for r in range(pivot[n, 3], pivot[n + 1, 3]):
            f = -at(a, left[r, 1])
            v = fused(f, at(b, left[r, 0]), v)
            u = fused(f, at(d, left[r, 0]), u)
        put(b, k, v)
        put(d, k, u)
    for back in range(count):
        n = count - 1 - back
        k = pivot[n, 0]
        v = at(b, k)
        u = at(d, k)
        for r in range(pivot[n, 2], pivot[n + 1, 2]):
            f = -at(a, entry[r, 2])
            v = fused(f, at(b, entry[r, 0]), v)
            u = fused(f, at(d, entry[r, 0]), u)
        inverse = at(a, pivot[n, 1])
        put(b, k, v * inverse)
        put(d, k, u * inverse)
