"""Sizing against a general convex solver: cvxpy in log space, with Clarabel."""

from __future__ import annotations

import pytest
from numpy.testing import assert_allclose

from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.interior_point import solve
from support.convex_reference import reference_objective
from support.problems import chain_problem, random_problem

#: Invented blocks: seed, gates, layers.
_BLOCKS = [(11, 8, 3), (23, 20, 5), (37, 40, 6), (41, 60, 12)]


def test_reference_on_a_path_worked_by_hand() -> None:
    question = chain_problem([1, 1], [0, 0], [1, 1], 1, 100, side_load=[10, 0])
    assert_allclose(reference_objective(question, Fastest()), 30.0, rtol=1e-6, atol=0)


@pytest.mark.parametrize(("seed", "gates", "depth"), _BLOCKS)
def test_all_three_goals_agree(seed: int, gates: int, depth: int) -> None:
    question = random_problem(seed, gates, depth=depth)
    fastest = solve(question, Fastest())
    assert_allclose(fastest.delay, reference_objective(question, Fastest()), rtol=1e-5, atol=0)
    relaxed = Cheapest(1.05 * fastest.delay)
    cheapest = solve(question, relaxed)
    assert_allclose(cheapest.spend, reference_objective(question, relaxed), rtol=1e-5, atol=0)
    budget = Budget(0.5 * (cheapest.spend + question.cost(question.lower)))
    within = solve(question, budget)
    assert_allclose(within.delay, reference_objective(question, budget), rtol=1e-5, atol=0)
