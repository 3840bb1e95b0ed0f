"""Periods and drifts found in made-up steps, for which both are known."""

from __future__ import annotations

import math

import numpy as np
import pytest

from stagebook.engine.carry.measure import drift, mean_rate
from stagebook.engine.carry.periods import candidates, rises


def steps(ends: float, seed: int = 1) -> np.ndarray:
    """Instants of unequal steps up to ``ends``, about 200 a second."""
    return np.concatenate([[0.0], np.cumsum(np.random.default_rng(seed).uniform(0.2, 1.8, int(200 * ends)) / 200.0)])


def test_rises_of_a_sine_are_a_period_apart() -> None:
    time = np.linspace(0.0, 10.0, 4001)
    found = rises(time, 3.0 + np.sin(2.0 * math.pi * time))
    assert np.diff(found) == pytest.approx(1.0, abs=1e-4)
    assert found % 1.0 == pytest.approx(np.zeros(10), abs=1e-4) or found[0] == pytest.approx(1.0, abs=1e-4)


def test_what_does_not_swing_has_no_periods() -> None:
    time = np.linspace(0.0, 10.0, 4001)
    assert rises(time, 0.01 * np.sin(time)).size == 0
    assert candidates(time, np.stack([time, 0.01 * np.sin(20.0 * time)], axis=1), 8) == []


def test_heights_that_take_turns_make_one_period_of_both() -> None:
    """Two rises a period, at unequal distances: they are counted together."""
    time = np.linspace(0.0003, 20.0, 20_001)
    shape = np.where(
        np.mod(time, 1.0) < 0.3,
        np.sin(2.0 * math.pi * (time % 1.0) / 0.3),
        np.sin(2.0 * math.pi * (time % 1.0 - 0.3) / 0.7),
    )
    found = candidates(time, shape[:, None], 8)
    assert [period.together for period in found] == [2]
    assert found[0].length == pytest.approx(1.0, rel=1e-3)


def test_the_drift_of_what_charges_beneath_a_ripple() -> None:
    """v = 5 (1 - exp(-t / 50)) and a ripple: its rate at the middle is known."""
    time = steps(30.0)
    ripple = np.sin(2.0 * math.pi * time)
    slow = 5.0 * (1.0 - np.exp(-time / 50.0))
    values = np.stack([ripple, slow + 0.01 * ripple, np.full_like(time, 2.0)], axis=1)
    (period,) = candidates(time, values[:, :1], 8)
    found = drift(time, values, period, np.full(3, 1e-4))
    assert found.steady
    assert found.length == pytest.approx(1.0, rel=1e-3)
    assert found.rate[1] == pytest.approx(0.1 * math.exp(-found.middle / 50.0), rel=2e-3)
    assert found.drifts.tolist() == [False, True, False]
    assert found.mean[2] == pytest.approx(2.0)
    assert found.high[0] == pytest.approx(1.0, abs=0.01)


def test_a_growing_oscillation_is_not_steady() -> None:
    time = np.linspace(0.0, 12.0, 6001)
    values = (np.exp(0.3 * time) * np.sin(2.0 * math.pi * time))[:, None]
    assert not any(drift(time, values, period, np.full(1, 1e-4)).steady for period in candidates(time, values, 8))


def test_the_mean_of_a_rate_that_falls_as_an_exponential() -> None:
    """From 0 to 1 of exp(-t): 1 - 1/e, from its values at two instants. Of opposite signs: the straight line."""
    rates = np.array([math.exp(-0.2), 1.0]), np.array([math.exp(-0.7), -1.0])
    found = mean_rate(rates, (0.2, 0.7), 0.0, 1.0)
    assert found[0] == pytest.approx(1.0 - math.exp(-1.0), rel=1e-12)
    assert found[1] == pytest.approx(1.0 - 2.0 * (0.5 - 0.2) / 0.5, rel=1e-12)
