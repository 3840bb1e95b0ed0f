"""Vertices: a corner of the conditions with every part at the end of its tolerance that hurts."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..kernel.layout import Floats
from .lanes import Setting

WORST = 2  # of all conditions are tried with part tolerances, whatever their sides
WEAK = 1e-3  # of what all parts change, at most, is changed by those whose ends are left to others

Parts = tuple[tuple[tuple[str, str], int], ...]
"""Keys of part columns with the side at which each is."""
Axes = tuple[tuple[tuple[str, str], int], ...]
"""The same for conditions."""


def sides(slope: Floats, single: Sequence[Setting]) -> Parts:
    """The end of every part that makes ``slope`` smaller: its low and its high end in turn, as in ``single``.

    An end at which the event did not happen (NaN) is the end that hurts.
    """
    low, high = slope[::2], slope[1::2]
    absent = np.isnan(low) | np.isnan(high)
    with np.errstate(invalid="ignore"):
        matters = absent | (np.abs(high - low) > 1e-9 * np.maximum(1.0, np.maximum(np.abs(low), np.abs(high))))
        lower = np.where(absent, np.isnan(low), low < high)
    return tuple((single[2 * int(k)].parts[0][0], -1 if lower[k] else 1) for k in np.flatnonzero(matters))


def weak(slope: Floats, single: Sequence[Setting]) -> frozenset[tuple[str, str]]:
    """The parts that together change ``slope`` by less than a thousandth of what all change it."""
    change = np.abs(slope[1::2] - slope[::2])
    if not np.all(np.isfinite(change)):
        return frozenset()
    order = np.argsort(change, kind="stable")
    few = order[np.cumsum(change[order]) <= WEAK * np.sum(change)]
    return frozenset(single[2 * int(k)].parts[0][0] for k in few)


class Vertices:
    """Settings to try. Under the same conditions one stands for all that differ in weak parts only."""

    def __init__(self, single: Sequence[Setting]) -> None:
        """``single`` are settings of one part each, in the order in which parts are named."""
        self._place = {setting.parts[0][0]: k for k, setting in enumerate(single)}
        self._merged: dict[Axes, list[tuple[dict[tuple[str, str], int], dict[tuple[str, str], int]]]] = {}

    def add(self, axes: Axes, parts: Parts, weak: frozenset[tuple[str, str]]) -> None:
        """Ask for these conditions with parts at these sides, which is indifferent for the ``weak`` ones."""
        strong = {key: side for key, side in parts if key not in weak}
        others = {key: side for key, side in parts if key in weak}
        of_axes = self._merged.setdefault(axes, [])
        for firm, loose in of_axes:
            if all(firm.get(key, side) == side for key, side in strong.items()):
                firm.update(strong)
                loose.update({key: side for key, side in others.items() if key not in loose})
                return
        of_axes.append((strong, others))

    def settings(self) -> list[Setting]:
        """All settings."""
        return [
            Setting(axes, tuple(sorted((loose | firm).items(), key=lambda part: self._place[part[0]])))
            for axes, of_axes in self._merged.items()
            for firm, loose in of_axes
        ]


def lowest(metric: Floats, most: int) -> list[int]:
    """Where the smallest values are, smallest first; what is NaN comes before all."""
    return [int(k) for k in np.argsort(np.nan_to_num(metric, nan=-np.inf), kind="stable")[:most]]


def worst_conditions(metric: Floats, conditions: Sequence[Setting]) -> list[int]:
    """The two worst conditions, and the worst one with each side of every axis: with the tolerances of parts another
    end of the temperature may be worse than the one that is worst without them."""
    order = lowest(metric, len(conditions))
    chosen = dict.fromkeys(order[:WORST])
    for axis in range(len(conditions[0].axes)):
        met: set[int] = set()
        for k in order:
            side = conditions[k].axes[axis][1]
            if side and side not in met:
                met.add(side)
                chosen.setdefault(k)
    return list(chosen)
