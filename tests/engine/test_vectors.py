"""The kernel's own exponential and logarithm against mpmath with 40 digits; choosing and comparing lane by lane."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from stagebook.engine.kernel import vectors
from stagebook.engine.kernel.compiled import compiled
from stagebook.engine.kernel.layout import Floats, Ints
from stagebook.engine.kernel.vectors import WIDTH, any_of, at, flag, greater, lesser, put, same, where

from . import single_laws


def places_off(found: float, exact: mpmath.mpf) -> float:
    """Distance in units of the last place."""
    return float(abs(mpmath.mpf(found) - exact) / mpmath.mpf(math.ulp(found)))


@given(st.floats(-700.0, 700.0))
@settings(deadline=None)
def test_exp_is_right_to_the_last_places(y: float) -> None:
    with mpmath.workdps(40):
        assert places_off(single_laws.exp(y), mpmath.exp(mpmath.mpf(y))) < 1.5


@given(st.one_of(st.floats(1e-300, 1e300), st.floats(0.9, 1.1)))
@settings(deadline=None)
def test_log_is_right_to_the_last_places(y: float) -> None:
    with mpmath.workdps(40):
        exact = mpmath.log(mpmath.mpf(y))
        assert places_off(single_laws.log(y), exact) < 1.5 or abs(exact) < 1e-300


@compiled
def choose(x: Floats, numbers: Ints, out: Floats, flags: Ints) -> bool:
    v = at(x, 0)
    w = at(x, 1)
    chosen = ((v > w) | (v == 0.0)) & ~same(numbers, 3)
    put(out, 0, where(chosen, -v, 1.0 / w))
    put(out, 1, lesser(v, w))
    put(out, 2, greater(v, 0.5))
    put(out, 3, abs(v) + 2.0 - w)
    put(out, 4, vectors.root(abs(w)))
    flag(chosen, flags)
    return bool(any_of(chosen))


def test_lanes_choose_and_compare_each_for_itself() -> None:
    # NumPy's comparisons and choices are the reference.
    rng = np.random.default_rng(5)
    for _ in range(50):
        x = rng.normal(size=(2, WIDTH))
        x[0, rng.integers(WIDTH)] = 0.0
        numbers = rng.integers(2, 5, WIDTH)
        out, flags = np.zeros((5, WIDTH)), np.zeros(WIDTH, dtype=np.int64)
        said = choose(x, numbers, out, flags)
        v, w = x
        chosen = ((v > w) | (v == 0.0)) & (numbers != 3)
        assert np.array_equal(flags, chosen)
        assert said == np.any(chosen)
        expected = [np.where(chosen, -v, 1.0 / w), np.minimum(v, w), np.maximum(v, 0.5), abs(v) + 2.0 - w]
        assert np.array_equal(out, [*expected, np.sqrt(abs(w))])


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_what_does_not_compare_is_never_chosen(value: float) -> None:
    x = np.full((2, WIDTH), value)
    x[1] = 1.0
    out, flags = np.zeros((5, WIDTH)), np.zeros(WIDTH, dtype=np.int64)
    with np.errstate(all="ignore"):
        choose(x, np.zeros(WIDTH, dtype=np.int64), out, flags)
    assert np.array_equal(flags, np.full(WIDTH, value > 1.0))
    assert np.all(out[1] == (1.0 if math.isnan(value) else min(value, 1.0)))
