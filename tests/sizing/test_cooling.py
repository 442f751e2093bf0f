"""Cooling against the interior point, and what it refuses."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from evenstage.errors import NoPathError, NotConvergedError
from evenstage.sizing import interior_point
from evenstage.sizing.certificate import check
from evenstage.sizing.cooling import solve
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.infeasible import (
    BudgetTooSmallError,
    DelayOutOfReachError,
    LimitOutOfReachError,
)
from support.problems import Arc, Term, chain_problem, problem, random_problem, tied

if TYPE_CHECKING:
    from evenstage.sizing.problem import FloatArray, Problem

GAP = 1e-4


def start_of(question: Problem) -> FloatArray:
    """Return the smallest sizes."""
    return question.lower.copy()


@given(seed=st.integers(0, 10**6), gates=st.integers(5, 40))
@settings(max_examples=6, deadline=None)
def test_agrees_with_the_interior_point(seed: int, gates: int) -> None:
    question = random_problem(seed, gates, depth=5)
    start = start_of(question)
    exact = interior_point.solve(question, Fastest())
    fastest = solve(question, Fastest(), start=start, tolerance=GAP)
    assert check(question, Fastest(), fastest).gap <= GAP * (1 + 1e-6)
    assert exact.bound * (1 - 1e-9) <= fastest.delay <= exact.delay * (1 + 1.01 * GAP)
    goal = Cheapest(1.05 * exact.delay)
    cheapest = solve(question, goal, start=start, tolerance=GAP)
    assert check(question, goal, cheapest).gap <= GAP * (1 + 1e-6)
    least = interior_point.solve(question, goal).spend
    assert_allclose(cheapest.spend, least, rtol=1.01 * GAP, atol=0)
    budget = Budget(0.5 * (least + question.cost(question.lower)))
    within = solve(question, budget, start=start, tolerance=GAP)
    assert check(question, budget, within).gap <= GAP * (1 + 1e-6)
    best = interior_point.solve(question, budget).delay
    assert_allclose(within.delay, best, rtol=1.01 * GAP, atol=0)


@given(seed=st.integers(0, 10**6))
@settings(max_examples=6, deadline=None)
def test_ties_and_fixed_sizes(seed: int) -> None:
    question = tied(random_problem(seed, 30, depth=6), seed)
    answer = solve(question, Fastest(), start=start_of(question), tolerance=GAP)
    still = question.lower == question.upper
    assert_array_equal(answer.sizes[still], question.lower[still])
    assert check(question, Fastest(), answer).gap <= GAP * (1 + 1e-6)
    goal = Cheapest(1.1 * answer.delay)
    cheapest = solve(question, goal, start=answer.sizes, tolerance=GAP)
    assert check(question, goal, cheapest).gap <= GAP * (1 + 1e-6)


@pytest.mark.parametrize("slack", [1e-4, 1e-2, 0.3, 1.0])
def test_cheapest_near_the_least_delay_and_far_from_it(slack: float) -> None:
    question = random_problem(17, 40, depth=8)
    fastest = interior_point.solve(question, Fastest())
    goal = Cheapest((1 + slack) * fastest.delay)
    answer = solve(question, goal, start=fastest.sizes, tolerance=1e-3)
    assert answer.delay <= goal.delay
    assert check(question, goal, answer).gap <= 1e-3


@pytest.mark.parametrize("scale", [1e-15, 1e-9, 1e6])
def test_unit_of_time_does_not_matter(scale: float) -> None:
    question = random_problem(6, 20, depth=5)
    delay = replace(question.delay, coefficient=scale * question.delay.coefficient)
    answer = solve(replace(question, delay=delay), Fastest(), start=start_of(question))
    plain = solve(question, Fastest(), start=start_of(question))
    assert_allclose(answer.delay, scale * plain.delay, rtol=1e-7, atol=0)


def test_start_arrivals_and_required_times() -> None:
    question = random_problem(6, 30, depth=5)
    rng = np.random.default_rng(3)
    question = replace(
        question,
        start_arrival=rng.uniform(-5.0, 5.0, len(question.start_arrival)),
        end_offset=rng.uniform(-5.0, 5.0, len(question.end_offset)),
    )
    exact = interior_point.solve(question, Fastest())
    answer = solve(question, Fastest(), start=start_of(question), tolerance=GAP)
    assert_allclose(answer.delay, exact.delay, rtol=2 * GAP, atol=0)


def test_starts_outside_the_limits() -> None:
    question = random_problem(21, 20, depth=5)
    assert question.limit_sums(question.upper).max() > 1.0
    answer = solve(question, Fastest(), start=question.upper.copy())
    assert question.limit_sums(answer.sizes).max() <= 1.0


class TestRefusals:
    def test_delay_out_of_reach(self) -> None:
        ones = [1.0] * 4
        question = chain_problem(ones, ones, ones, 1, 256.0)
        with pytest.raises(DelayOutOfReachError) as caught:
            solve(question, Cheapest(19.0), start=question.lower)
        assert_allclose(caught.value.least, 20.0, rtol=1e-3, atol=0)

    def test_budget_that_limits_do_not_leave(self) -> None:
        limit: list[list[Term]] = [[(10.0, 0, 1)]]
        arcs = [Arc(0, 1, [(1.0, 1, 0), (9.0, None, 1)])]
        question = problem(arcs, [1, 0.1], [20, 20], starts={0: 0.0}, ends={1: 0.0}, limits=limit)
        assert solve(question, Budget(12.0), start=question.upper).sizes[1] >= 10.0
        with pytest.raises(BudgetTooSmallError) as caught:
            solve(question, Budget(5.0), start=question.upper)
        assert_allclose(caught.value.least, 11.0, rtol=1e-3, atol=0)

    def test_limits_that_contradict_each_other(self) -> None:
        limits: list[list[Term]] = [[(0.1, 0, None)], [(2.0, 1, 0)], [(1.0, 0, 1)]]
        arcs = [Arc(0, 1, [(1.0, 1, 0), (9.0, None, 1)])]
        question = problem(arcs, [1, 1], [20, 20], starts={0: 0.0}, ends={1: 0.0}, limits=limits)
        with pytest.raises(LimitOutOfReachError) as caught:
            solve(question, Fastest(), start=question.lower)
        assert caught.value.limit_row in {1, 2}
        assert_allclose(caught.value.least, np.sqrt(2.0), rtol=1e-3, atol=0)

    def test_no_path(self) -> None:
        question = random_problem(1, 10, depth=3)
        question = replace(question, start_node=question.end_node, end_node=question.start_node)
        question = replace(
            question,
            start_arrival=np.zeros(len(question.start_node)),
            end_offset=np.zeros(len(question.end_node)),
        )
        with pytest.raises(NoPathError):
            solve(question, Fastest(), start=question.lower)

    def test_too_little_work_is_an_error_with_the_gap(self) -> None:
        question = random_problem(30, 30, depth=6)
        with pytest.raises(NotConvergedError, match="came no closer than"):
            solve(question, Fastest(), start=question.lower, most=10)


def test_same_question_same_answer() -> None:
    question = random_problem(31, 60, depth=6)
    first, second = (solve(question, Fastest(), start=question.lower) for _ in range(2))
    assert_array_equal(first.sizes, second.sizes)
    assert_array_equal(first.flow, second.flow)
