"""Sparse elimination against dense linear algebra: numpy.linalg (LAPACK) on the same matrices."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from stagebook.engine.kernel.compiled import compiled
from stagebook.engine.kernel.elimination import Pattern, Plan, factor, substitute, substitute_two
from stagebook.engine.kernel.layout import Floats, Places
from stagebook.engine.kernel.vectors import WIDTH, at


@compiled
def solve(
    stored: Floats,
    solution: Floats,
    other: Floats,
    twin: Floats,
    pivot: Places,
    entry: Places,
    update: Places,
    left: Places,
) -> None:
    factor(stored, at(stored, stored.shape[0] - 1), pivot, entry, update)
    substitute(stored, solution, pivot, entry, left)
    substitute_two(stored, other, twin, pivot, entry, left)


def solved(plan: Plan, matrix: Floats, right: Floats) -> Floats:
    """Solve through the stored entries, as the kernel does."""
    lists = plan.lists()
    stored = np.zeros((plan.entries + 1, WIDTH))
    for (i, j), slot in plan.slots.items():
        stored[slot] = matrix[i, j]
    solution = np.ascontiguousarray(np.repeat(right[:, None], WIDTH, axis=1))
    twin = 2.0 * solution
    other = solution.copy()
    solve(stored, solution, other, twin, lists["pivot"], lists["entry"], lists["update"], lists["left"])
    assert np.array_equal(other, solution)
    assert np.array_equal(twin, 2.0 * solution)
    assert np.all(solution == solution[:, :1])
    return solution[:, 0]


@st.composite
def networks(draw: st.DrawFn) -> tuple[Pattern, Floats, Floats]:
    """A random network of conductances, some controlled from elsewhere: symmetric pattern, unsymmetric values."""
    size = draw(st.integers(1, 14))
    pairs = draw(st.lists(st.tuples(st.integers(0, size), st.integers(0, size)), max_size=40))
    seed = draw(st.integers(0, 2**32 - 1))
    rng = np.random.default_rng(seed)
    pattern = Pattern(size)
    matrix = np.diag(10.0 ** rng.uniform(-9, 0, size))
    for a, b in pairs:
        if a == b:
            continue
        pattern.couple((a, b))
        g = 10.0 ** rng.uniform(-9, 0)
        for row, column, share in ((a, a, 1.0), (b, b, 1.0), (a, b, -rng.uniform(0, 1)), (b, a, -rng.uniform(0, 1))):
            if row < size and column < size:
                matrix[row, column] += share * g
    return pattern, matrix, rng.normal(size=size)


@given(networks())
@settings(max_examples=150, deadline=None)
def test_the_solution_is_that_of_dense_elimination_with_pivoting(network: tuple[Pattern, Floats, Floats]) -> None:
    pattern, matrix, right = network
    exact = np.linalg.solve(matrix, right)
    # Diagonally dominant matrices need no pivoting (Golub, Van Loan, Matrix Computations, section 3.4.10).
    assert solved(pattern.plan(), matrix, right) == pytest.approx(exact, rel=1e-8, abs=1e-12 * np.max(np.abs(exact)))


@given(networks())
@settings(max_examples=100, deadline=None)
def test_every_unknown_is_eliminated_once_and_fill_in_has_slots(network: tuple[Pattern, Floats, Floats]) -> None:
    pattern, matrix, _ = network
    plan = pattern.plan()
    assert sorted(plan.order) == list(range(pattern.size))
    assert sorted(plan.slots.values()) == list(range(plan.entries))
    for i, j in zip(*np.nonzero(matrix), strict=True):
        assert plan.slot(int(i), int(j)) < plan.entries
    # Fill-in by definition: i-j is filled when both are later neighbours of some pivot.
    graph = {k: {j for (i, j) in plan.slots if i == k and (matrix[i, j] != 0 or i == j)} for k in range(pattern.size)}
    for n, k in enumerate(plan.order):
        later = graph[k] & set(plan.order[n + 1 :])
        for i in later:
            graph[i] |= later
            assert all((i, j) in plan.slots for j in later)


def test_known_nets_share_a_slot_that_is_never_read() -> None:
    pattern = Pattern(2)
    pattern.couple((0, 1, 2))
    plan = pattern.plan()
    assert plan.slot(0, 2) == plan.slot(2, 1) == plan.slot(2, 2) == plan.entries == 4


def test_a_chain_fills_nothing_in() -> None:
    # Minimum degree is perfect on trees (Parter, SIAM Review 3 (1961) 119).
    pattern = Pattern(30)
    for k in range(29):
        pattern.couple((k, k + 1))
    assert pattern.plan().entries == 30 + 2 * 29


def test_a_star_is_eliminated_from_its_tips() -> None:
    pattern = Pattern(12)
    for k in range(1, 12):
        pattern.couple((0, k))
    plan = pattern.plan()
    assert plan.entries == 12 + 2 * 11
    assert 0 in plan.order[-2:]  # once one tip is left, hub and tip are alike


def test_a_branch_without_a_diagonal_waits_for_one_of_its_nets() -> None:
    # An ideal source between nets 0 and 1: row 2 reads v0 - v1, its diagonal is 0 before a net is eliminated.
    pattern = Pattern(3)
    pattern.couple((0, 2))
    pattern.couple((1, 2))
    plan = pattern.plan([(2, (0, 1))])
    assert plan.order.index(2) > min(plan.order.index(0), plan.order.index(1))
    matrix = np.array([[1e-3, 0.0, 1.0], [0.0, 2e-3, -1.0], [1.0, -1.0, 0.0]])
    right = np.array([0.0, 0.0, 5.0])
    assert solved(plan, matrix, right) == pytest.approx(np.linalg.solve(matrix, right), rel=1e-12)
