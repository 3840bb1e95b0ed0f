"""Shares of a change: Shapley, A value for n-person games, Contributions to the Theory of Games 2 (1953) 307.

A share is the mean, over all orders in which the changes can be made, of what a change adds when it is made. Shares sum
to the whole change exactly, whatever the interactions.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import factorial

import numpy as np

from ..kernel.layout import Floats

Chosen = frozenset[int]
EXACT_UP_TO = 6
ORDERS = 24  # orders drawn, each with its reverse, where there are too many to try all


@dataclass(frozen=True)
class Shares:
    """Shares (players, checks) with the standard error of sampled ones, (players, checks), zero where exact."""

    values: Floats
    error: Floats


def exact(players: int, value: Callable[[Chosen], Floats]) -> Shares:
    """Shares from all 2^n combinations."""
    everyone = range(players)
    shares = []
    for player in everyone:
        total = np.zeros_like(value(frozenset()))
        others = [p for p in everyone if p != player]
        for bits in range(2 ** len(others)):
            chosen = frozenset(p for k, p in enumerate(others) if bits >> k & 1)
            weight = factorial(len(chosen)) * factorial(players - len(chosen) - 1) / factorial(players)
            total = total + weight * (value(chosen | {player}) - value(chosen))
        shares.append(total)
    values = np.array(shares) if players else np.zeros((0, value(frozenset()).size))
    return Shares(values, np.zeros_like(values))


def sampled(players: int, value: Callable[[Chosen], Floats], seed: int) -> Shares:
    """Shares from random orders and their reverses: each order telescopes, so the sum stays exact."""
    generator = np.random.Generator(np.random.Philox(key=seed))
    orders: list[Sequence[int]] = []
    for _ in range(ORDERS):
        drawn_order = [int(p) for p in generator.permutation(players)]
        orders += [drawn_order, drawn_order[::-1]]
    drawn = []
    for order in orders:
        added = np.zeros((players, value(frozenset()).size))
        chosen: Chosen = frozenset()
        for player in order:
            after = chosen | {player}
            added[player] = value(after) - value(chosen)
            chosen = after
        drawn.append(added)
    # An order and its reverse are no independent draws; their means are.
    pairs = np.array(drawn).reshape(ORDERS, 2, players, -1).mean(axis=1)
    return Shares(pairs.mean(axis=0), pairs.std(axis=0, ddof=1) / np.sqrt(ORDERS))


def combinations(players: int) -> int:
    """How many combinations of changes are evaluated for shares, at most."""
    return int(2**players if players <= EXACT_UP_TO else 2 * ORDERS * players)


def shares(players: int, value: Callable[[Chosen], Floats], seed: int = 1) -> Shares:
    """Exact shares up to six changes, sampled ones above."""
    return exact(players, value) if players <= EXACT_UP_TO else sampled(players, value, seed)
