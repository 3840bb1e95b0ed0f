"""What a corner is called: by the conditions and parts that move the margin most, and never by another setting."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import combinations

import numpy as np

from ..kernel.layout import Floats
from .lanes import Setting

Effects = dict[tuple[str, str], float]
SHARE = 0.03  # of the largest effect: what moves the margin by less is not named
LITTLE, NOISE = 1e-3, 1e-5  # D/C below this share of the worst one, and below this at all, counts as no more than that


def named(setting: Setting, effects: Effects) -> str:
    """The corner in words; everything that is not nominal where nothing that matters is."""
    least = SHARE * max(effects.values(), default=0.0)
    words = setting.words([key for key, effect in effects.items() if effect > least])
    return setting.words() if words == "nominal" else words


def used(margin: Floats, worst: float) -> Floats:
    """The logarithm of D/C: what makes it twice as large near nominal does so near the ``worst`` margin as well."""
    return np.log(np.maximum(1.0 - margin, max(LITTLE * (1.0 - worst), NOISE)))


def of_conditions(measure: Floats, conditions: Sequence[Setting]) -> Effects:
    """By how much each axis alone moves the measure, anywhere among all combinations of conditions.

    ``conditions`` are every combination of the sides of their axes, the last axis turning fastest.
    """
    keys = [key for key, _ in conditions[0].axes]
    sides = [len({setting.axes[n][1] for setting in conditions}) for n in range(len(keys))]
    grid = np.asarray(measure[: len(conditions)], dtype=float).reshape(sides)
    happened = np.isfinite(grid)
    known = np.where(happened, grid, 0.0)
    found: Effects = {}
    for n, key in enumerate(keys):
        for one, other in combinations(range(sides[n]), 2):
            both = happened.take(one, n) & happened.take(other, n)
            either = happened.take(one, n) != happened.take(other, n)
            apart = np.where(both, np.abs(known.take(one, n) - known.take(other, n)), np.where(either, 1.0, 0.0))
            found[key] = max(found.get(key, 0.0), float(apart.max()))
    return found


def of_parts(measure: Floats, single: Sequence[Setting], least: float = 0.0) -> Effects:
    """By how much each part moves the measure, its low and its high end in turn; up to ``least`` is nothing."""
    found: Effects = {}
    for k in range(0, len(single), 2):
        ((key, _),) = single[k].parts
        apart = _apart(float(measure[k]), float(measure[k + 1]))
        found[key] = apart if apart > least else 0.0
    return found


def weighed(conditions: Effects, parts: Effects) -> Effects:
    """Both together where they are measured in different units: the largest of each counts the same."""
    largest, scale = max(parts.values(), default=0.0), max(conditions.values(), default=1.0) or 1.0
    return conditions | {key: effect * scale / largest for key, effect in parts.items() if largest > 0.0}


def _apart(one: float, other: float) -> float:
    """The difference; 1 where an event happened on one side only."""
    if np.isfinite(one) and np.isfinite(other):
        return abs(one - other)
    return 0.0 if np.isfinite(one) == np.isfinite(other) else 1.0
