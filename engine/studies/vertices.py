"""Vertices: a corner of the conditions with every part at the end of its tolerance that hurts."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..kernel.layout import Floats
from .lanes import Setting

WORST = 2  # of all conditions are tried with part tolerances, whatever their sides


def sides(slope: Floats, single: Sequence[Setting]) -> tuple[tuple[tuple[str, str], int], ...]:
    """The end of every part that makes ``slope`` smaller: its low and its high end in turn, as in ``single``.

    An end at which the event did not happen (NaN) is the end that hurts.
    """
    found: list[tuple[tuple[str, str], int]] = []
    for k in range(0, len(single), 2):
        low, high = slope[k], slope[k + 1]
        ((key, _),) = single[k].parts
        if np.isnan(low) or np.isnan(high):
            found.append((key, -1 if np.isnan(low) else 1))
        elif abs(high - low) > 1e-9 * max(1.0, abs(low), abs(high)):
            found.append((key, -1 if low < high else 1))
    return tuple(found)


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
