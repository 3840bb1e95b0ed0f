"""Preferred numbers after IEC 60063."""

from __future__ import annotations

import math

import eseries
import pytest
from hypothesis import given
from hypothesis import strategies as st

from stagebook.engine.errors import QuantityError
from stagebook.engine.preferred import (
    SERIES,
    nearest,
    next_down,
    next_up,
    series_for,
    significands,
    values_between,
)

VALUES = st.floats(min_value=1e-12, max_value=1e9)


def test_e24_and_its_coarser_series() -> None:
    """IEC 60063, table of E24; E12, E6 and E3 are every second, fourth and eighth value."""
    e24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
    assert significands("E24") == e24
    assert significands("E12") == (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)
    assert significands("E6") == (10, 15, 22, 33, 47, 68)
    assert significands("E3") == (10, 22, 47)


def test_the_single_exception() -> None:
    """IEC 60063: 920 at k = 185 of E192, where the rule gives 919."""
    assert round(100 * 10 ** (185 / 192)) == 919
    assert significands("E192")[185] == 920
    assert 919 not in significands("E192")


@pytest.mark.parametrize("name", SERIES)
def test_every_series_agrees_with_an_independent_library(name: str) -> None:
    """PyPI eseries, which holds the tables of IEC 60063 written out."""
    assert list(significands(name)) == [round(v) for v in eseries.series(eseries.ESeries[name])]


@given(VALUES, st.sampled_from(SERIES))
def test_stepping_agrees_with_an_independent_library(value: float, name: str) -> None:
    """PyPI eseries: find_greater_than, find_less_than, find_nearest. Values on a preferred number are left to below."""
    key = eseries.ESeries[name]
    if math.isclose(nearest(value, name), value, rel_tol=1e-5):
        return
    assert next_up(value, name) == pytest.approx(eseries.find_greater_than(key, value), rel=1e-9)
    assert next_down(value, name) == pytest.approx(eseries.find_less_than(key, value), rel=1e-9)
    theirs = eseries.find_nearest(key, value)
    assert abs(nearest(value, name) - value) == pytest.approx(abs(theirs - value), rel=1e-6)


@given(VALUES, st.sampled_from(SERIES))
def test_up_and_down_undo_each_other(value: float, name: str) -> None:
    start = nearest(value, name)
    assert next_down(next_up(start, name), name) == start
    assert next_up(next_down(start, name), name) == start


def test_values_come_out_exact() -> None:
    assert next_up(4.7e-9, "E24") == 5.1e-9
    assert next_down(1e6, "E24") == 910e3
    assert next_up(910e3, "E24") == 1e6
    assert next_up(4700 * (1 + 1e-12), "E24") == 5100.0
    assert next_up(4700 * (1 - 1e-12), "E24") == 5100.0


def test_values_between_includes_both_ends() -> None:
    assert values_between(470.0, 1000.0, "E6") == (470.0, 680.0, 1000.0)
    assert values_between(500.0, 600.0, "E6") == ()


@pytest.mark.parametrize(
    ("tolerance", "name"),
    [
        (0.5, "E6"),
        (0.2, "E6"),
        (0.1, "E12"),
        (0.05, "E24"),
        (0.02, "E48"),
        (0.01, "E96"),
        (0.005, "E192"),
        (0.0, "E192"),
    ],
)
def test_series_that_suits_a_tolerance(tolerance: float, name: str) -> None:
    """IEC 60063: E6 20 %, E12 10 %, E24 5 %, E48 2 %, E96 1 %, E192 0.5 % and less."""
    assert series_for(tolerance) == name


@pytest.mark.parametrize("value", [0.0, -4700.0, math.nan, math.inf])
def test_no_preferred_value_without_a_positive_one(value: float) -> None:
    with pytest.raises(QuantityError, match="above zero"):
        nearest(value, "E24")


def test_an_unknown_series_names_the_known_ones() -> None:
    with pytest.raises(QuantityError, match="E3, E6, E12, E24, E48, E96, E192"):
        next_up(1.0, "E25")
