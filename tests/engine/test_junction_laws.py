"""Laws of junctions as mathematics: conductance and capacitance are the slopes of current and charge; limits hold."""

from __future__ import annotations

import math
from typing import Any

import mpmath
import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from stagebook.engine.kernel import laws
from stagebook.engine.kernel.layout import (
    J_BREAKDOWN,
    J_BREAKDOWN_KNEE,
    J_BREAKDOWN_SLOPE,
    J_KNEE,
    J_LEAKAGE,
    J_SLOPE,
    Floats,
)
from stagebook.engine.primitives.builder import constant
from stagebook.engine.primitives.columns import AMBIENT, Column, Lanes
from stagebook.engine.primitives.lane_table import junction_parameters

from . import single_laws

LANES = Lanes.nominal([Column(*AMBIENT, 25.0, 25.0, 25.0)])


def junction(**figures: float) -> Floats:
    """Parameters of one junction as the circuit builder makes them."""
    return junction_parameters({name: constant(value) for name, value in figures.items()}, LANES)[0]


junctions = st.builds(
    junction,
    saturation=st.floats(-16, -5).map(lambda e: 10.0**e),
    slope=st.floats(0.015, 0.08),
    capacitance=st.sampled_from([0.0, 4e-12, 1e-9]),
    potential=st.floats(0.4, 1.0),
    grading=st.sampled_from([0.0, 0.2, 0.33, 0.5, 0.6]),
    breakdown=st.sampled_from([0.0, 5.1, 8.0, 75.0]),
    breakdown_slope=st.floats(0.02, 0.5),
    breakdown_current=st.floats(-6, -2).map(lambda e: 10.0**e),
    leakage=st.sampled_from([0.0, 1e-9, 5e-6]),
)


def slope_of(function: Any, v: float) -> float:
    """Central difference with one extrapolation (Richardson 1911): error of fourth order."""
    h = 1e-4
    wide = (function(v + h) - function(v - h)) / (2 * h)
    narrow = (function(v + h / 2) - function(v - h / 2)) / h
    return float((4 * narrow - wide) / 3)


@given(st.floats(-60.0, 100.0))
@settings(deadline=None)
def test_exponential_and_its_derivative_below_the_bend(y: float) -> None:
    value, slope = single_laws.exponential(y)
    if y <= laws.TOP:
        exact = mpmath.expm1(y)
        # Below the floor the exponential counts as nothing: a part in 1e13 of the saturation current.
        assert value == pytest.approx(float(exact), rel=1e-12, abs=1e-13)
        assert slope == pytest.approx(math.exp(y), rel=1e-12, abs=1e-13)
    else:
        # Beyond the bend a straight line continues value and slope.
        assert value == pytest.approx(math.exp(laws.TOP) * (1 + y - laws.TOP) - 1, rel=1e-12)
        assert slope == pytest.approx(math.exp(laws.TOP), rel=1e-15)


@given(junctions, st.floats(-9.0, 0.9))
@settings(max_examples=300, deadline=None)
def test_conductance_is_the_slope_of_leakage_and_breakdown_current(p: Floats, v: float) -> None:
    law = single_laws.side_currents
    assume(abs(v) > 2e-4)  # leakage bends in a corner at 0 V
    if p[J_BREAKDOWN] > 0.0:
        over = -(v + p[J_BREAKDOWN]) / p[J_BREAKDOWN_SLOPE]
        assume(abs(over - laws.TOP) > 0.02)
        assume(abs(over - laws.FLOOR) > 0.02)
    # The leakage bends within its knee: a difference of finite width is off by the square of width over knee there.
    assume(abs(v) > 3e-4)
    bend = (1e-4 / (laws.LEAKAGE_KNEE + abs(v))) ** 2 if p[J_LEAKAGE] > 0.0 else 0.0
    current, conductance = law(v, p)
    assert conductance >= 0.0
    assert conductance == pytest.approx(
        slope_of(lambda u: law(u, p)[0], v), rel=1e-6 + bend, abs=1e-13 + 1e-9 * abs(current)
    )


@given(junctions, st.floats(-30.0, 1.5))
@settings(max_examples=300, deadline=None)
def test_capacitance_is_the_slope_of_charge(p: Floats, v: float) -> None:
    law = single_laws.depletion
    charge, capacitance = law(v, p)
    numeric = slope_of(lambda u: law(u, p)[0], v)
    assert capacitance == pytest.approx(numeric, rel=2e-6, abs=1e-9 * abs(charge))


@pytest.mark.parametrize("grading", [0.0, 0.33, 0.5])
@pytest.mark.parametrize("volts", [-20.0, -3.0, 0.2, 0.45, 0.7])
def test_depletion_charge_is_the_integral_of_the_textbook_capacitance(grading: float, volts: float) -> None:
    # C = C0 (1 - v/phi)^-m below phi/2, its tangent above (textbook form), integrated by mpmath.
    c0, potential = 10e-12, 0.75

    def capacitance(v: mpmath.mpf) -> mpmath.mpf:
        half = potential / 2
        if v <= half:
            return c0 * (1 - v / potential) ** (-grading)
        at = c0 * mpmath.mpf("0.5") ** (-grading)
        return at * (1 + grading * (v - half) / half)

    exact = mpmath.quad(capacitance, [0, volts] if volts <= potential / 2 else [0, potential / 2, volts])
    p = junction(saturation=1e-14, slope=0.026, capacitance=c0, potential=potential, grading=grading)
    assert single_laws.depletion(volts, p)[0] == pytest.approx(float(exact), rel=1e-12)


@given(junctions, st.floats(-100.0, 100.0), st.floats(-100.0, 100.0))
@settings(deadline=None)
def test_limiting_keeps_sides_and_never_overshoots(p: Floats, v: float, old: float) -> None:
    u = single_laws.limited(v, old, p)
    knee, slope = p[J_KNEE], p[J_SLOPE]
    if v <= knee and (p[J_BREAKDOWN] == 0.0 or -v - p[J_BREAKDOWN] <= p[J_BREAKDOWN_KNEE]):
        assert u == v  # where little flows, nothing is limited
    elif v > knee:
        assert min(max(old, knee), v) <= u <= v
        # A step into conduction grows with the logarithm of what was asked for.
        assert u <= max(v if v <= max(old, knee) + 2 * slope else 0.0, max(old, knee) + slope * math.log1p(400 / slope))
    else:
        assert v <= u <= max(v, min(old, -p[J_BREAKDOWN] - p[J_BREAKDOWN_KNEE]))


@given(junctions, st.floats(0.0, 100.0))
@settings(deadline=None)
def test_limited_iterates_reach_any_voltage(p: Floats, v: float) -> None:
    # Logarithmic steps do not stop short: repeated towards a fixed voltage they arrive.
    u = 0.0
    for _ in range(20_000):
        before, u = u, single_laws.limited(v, u, p)
        if u == v:
            break
        assert u > before
    assert u == v


def test_currents_stay_finite_however_far_an_iterate_lies() -> None:
    p = junction(saturation=1e-5, slope=0.02, capacitance=1e-9, breakdown=5.1, leakage=1e-9)
    for v in (-1e6, -1e3, 1e3, 1e6):
        for value in (*single_laws.side_currents(v, p), *single_laws.depletion(v, p)):
            assert np.isfinite(value)


def test_the_knee_is_where_the_junction_conducts_seven_tenths_of_a_siemens() -> None:
    # slope / (sqrt(2) I_S) = exp(knee / slope), so that g = I_S exp(knee/slope) / slope = 1 / sqrt(2) S.
    p = junction(saturation=1e-14, slope=0.0257)
    assert 1e-14 * math.exp(p[J_KNEE] / 0.0257) / 0.0257 == pytest.approx(1 / math.sqrt(2), rel=1e-12)
