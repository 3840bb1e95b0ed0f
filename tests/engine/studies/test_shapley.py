"""Shares of a change, on games that are solved by hand (Shapley, Contributions to the Theory of Games 2 (1953) 307)."""

from __future__ import annotations

from collections.abc import Callable
from math import fsum

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from stagebook.engine.kernel.layout import Floats
from stagebook.engine.studies.shapley import EXACT_UP_TO, Chosen, exact, sampled, shares

Game = Callable[[Chosen], Floats]


def game(value: Callable[[Chosen], float]) -> Game:
    return lambda chosen: np.array([value(chosen)])


def of(found: Floats) -> list[float]:
    return [float(v) for v in found[:, 0]]


def test_a_player_that_does_nothing_gets_nothing() -> None:
    found = exact(3, game(lambda chosen: 2.0 * (0 in chosen) - 0.5 * (2 in chosen)))
    assert of(found.values) == pytest.approx([2.0, 0.0, -0.5], abs=1e-15)
    assert found.values[1, 0] == 0.0
    assert np.array_equal(found.error, np.zeros((3, 1)))


def test_two_that_only_work_together_share_equally() -> None:
    found = exact(2, game(lambda chosen: 1.0 if chosen == {0, 1} else 0.0))
    assert of(found.values) == [0.5, 0.5]


def test_the_glove_game() -> None:
    # One left glove and two right ones, a pair is worth 1: 2/3, 1/6, 1/6 (textbook example).
    found = exact(3, game(lambda chosen: 1.0 if 0 in chosen and chosen & {1, 2} else 0.0))
    assert of(found.values) == pytest.approx([2.0 / 3.0, 1.0 / 6.0, 1.0 / 6.0])


def test_the_airport_game() -> None:
    # Costs 1, 2, 4 of a runway that the largest decides: 1/3, 1/3 + 1/2, 1/3 + 1/2 + 2 (Littlechild, Owen 1973).
    costs = (1.0, 2.0, 4.0)
    found = exact(3, game(lambda chosen: max((costs[p] for p in chosen), default=0.0)))
    assert of(found.values) == pytest.approx([1.0 / 3.0, 5.0 / 6.0, 17.0 / 6.0])


def random_game(players: int, seed: int) -> Game:
    table = np.random.default_rng(seed).normal(size=2**players)
    return game(lambda chosen: float(table[sum(1 << p for p in chosen)]))


@settings(max_examples=30, deadline=None)
@given(st.integers(1, 6), st.integers(0, 10**6))
def test_shares_sum_to_the_change(players: int, seed: int) -> None:
    value = random_game(players, seed)
    change = float((value(frozenset(range(players))) - value(frozenset()))[0])
    assert fsum(of(exact(players, value).values)) == pytest.approx(change, abs=1e-12)


@settings(max_examples=20, deadline=None)
@given(st.integers(2, 5), st.integers(0, 10**6))
def test_players_that_are_alike_get_the_same(players: int, seed: int) -> None:
    table = np.random.default_rng(seed).normal(size=players + 1)
    found = exact(players, game(lambda chosen: float(table[len(chosen)])))
    assert of(found.values) == pytest.approx([of(found.values)[0]] * players, abs=1e-12)


@pytest.mark.parametrize("players", [7, 9])
def test_more_than_six_are_sampled_and_still_sum_to_the_change(players: int) -> None:
    value = random_game(players, 11)
    found = shares(players, value, seed=3)
    change = float((value(frozenset(range(players))) - value(frozenset()))[0])
    assert fsum(of(found.values)) == pytest.approx(change, abs=1e-12)
    assert np.all(found.error > 0.0)


def test_sampled_shares_are_within_their_error_of_the_exact_ones() -> None:
    value = random_game(6, 5)
    true = exact(6, value).values
    found = sampled(6, value, seed=1)
    # 6 shares, 24 draws each: |t| with 23 degrees of freedom stays below 4 but once in two thousand.
    assert np.all(np.abs(found.values - true) < 4.0 * found.error)


def test_a_sampled_game_without_interaction_is_exact() -> None:
    worth = np.arange(1.0, 9.0)
    found = sampled(8, game(lambda chosen: float(sum(worth[p] for p in chosen))), seed=1)
    assert of(found.values) == pytest.approx(worth, abs=1e-12)
    assert found.error == pytest.approx(np.zeros((8, 1)), abs=1e-12)


def test_the_same_seed_draws_the_same_orders() -> None:
    value = random_game(7, 2)
    first, second, other = (sampled(7, value, seed) for seed in (1, 1, 2))
    assert np.array_equal(first.values, second.values)
    assert not np.array_equal(first.values, other.values)


def test_up_to_six_all_combinations_are_valued_once() -> None:
    asked: list[Chosen] = []
    table = np.random.default_rng(1).normal(size=64)

    def value(chosen: Chosen) -> Floats:
        asked.append(chosen)
        return np.array([table[sum(1 << p for p in chosen)]])

    assert np.array_equal(shares(EXACT_UP_TO, value).error, np.zeros((6, 1)))
    assert set(asked) == {frozenset(p for p in range(6) if bits >> p & 1) for bits in range(64)}


def test_no_players_no_shares() -> None:
    found = shares(0, lambda chosen: np.array([1.0, 2.0]))
    assert found.values.shape == found.error.shape == (0, 2)
