"""Preferred numbers for resistors and capacitors after IEC 60063: the series E3 to E192 and stepping within them."""

from __future__ import annotations

import math
from bisect import bisect_left, bisect_right
from decimal import Decimal
from functools import cache

from .errors import QuantityError

_E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
SERIES = ("E3", "E6", "E12", "E24", "E48", "E96", "E192")
_EQUAL = 1e-6
"""Relative distance under which a value counts as the preferred one, so that arithmetic upstream cannot add a step."""


@cache
def significands(series: str) -> tuple[int, ...]:
    """The values of one decade, from 10 (E3 to E24) or from 100 (E48 to E192).

    IEC 60063: E3, E6 and E12 are every eighth, fourth and second value of E24; the finer series are
    round(100 * 10**(k/N)) with one exception, 920 instead of 919 in E192. Raises QuantityError for another name.
    """
    if series not in SERIES:
        raise QuantityError(f"there is no series {series!r}; write one of {', '.join(SERIES)}")
    count = int(series[1:])
    if count <= len(_E24):
        return _E24[:: len(_E24) // count]
    exact = (round(100 * 10 ** (k / count)) for k in range(count))
    return tuple(920 if value == 919 else value for value in exact)


def series_for(tolerance: float) -> str:
    """The series whose steps suit a symmetrical tolerance (a fraction): neighbours about touch at their limits.

    IEC 60063 pairs E6 with 20 %, E12 with 10 %, E24 with 5 %, E48 with 2 %, E96 with 1 % and E192 with less.
    """
    for name, least in (("E6", 0.2), ("E12", 0.1), ("E24", 0.05), ("E48", 0.02), ("E96", 0.01)):
        if tolerance >= least * (1 - _EQUAL):
            return name
    return "E192"


def next_up(value: float, series: str) -> float:
    """The smallest preferred value above ``value``."""
    around = _around(value, series)
    return around[bisect_right(around, value * (1 + _EQUAL))]


def next_down(value: float, series: str) -> float:
    """The largest preferred value below ``value``."""
    around = _around(value, series)
    return around[bisect_left(around, value * (1 - _EQUAL)) - 1]


def nearest(value: float, series: str) -> float:
    """The preferred value with the least relative error; the lower one where two are equally far."""
    return min(_around(value, series), key=lambda preferred: (abs(preferred - value), preferred))


def values_between(low: float, high: float, series: str) -> tuple[float, ...]:
    """Every preferred value from ``low`` to ``high``, both included, rising."""
    found, value = [], next_down(low, series)
    while (value := next_up(value, series)) <= high * (1 + _EQUAL):
        found.append(value)
    return tuple(found)


def _around(value: float, series: str) -> tuple[float, ...]:
    """Three decades of preferred values with ``value`` in the middle one."""
    if not (math.isfinite(value) and value > 0):
        raise QuantityError(f"{value} has no preferred values around it; write a value above zero")
    return _decades(math.floor(math.log10(value)), series)


@cache
def _decades(middle: int, series: str) -> tuple[float, ...]:
    values = significands(series)
    digits = len(str(values[0])) - 1
    return tuple(
        float(Decimal(value).scaleb(decade - digits)) for decade in range(middle - 1, middle + 2) for value in values
    )
