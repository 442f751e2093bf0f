"""A problem in standard form, and the way back."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from evenstage.sizing.goals import Budget, Cheapest, Fastest, Goal
from evenstage.sizing.translation import Translation
from support.problems import chain_problem, random_problem

GATES = 10


def goals() -> st.SearchStrategy[Goal]:
    return st.sampled_from([Fastest(), Cheapest(300.0), Budget(90.0)])


@given(seed=st.integers(0, 10**6), goal=goals())
def test_constraints_say_what_the_problem_says(seed: int, goal: Goal) -> None:
    question = random_problem(seed, GATES, depth=3)
    rng = np.random.default_rng(seed)
    sizes = np.exp(rng.uniform(0.0, 4.0, GATES))
    shape = Translation(question, goal, sizes)
    t = question.levels.arrivals(question.start_time, question.arc_delays(sizes))
    arrivals = (t[shape.live] - shape.origin) / shape.time
    worst = [] if isinstance(goal, Cheapest) else [arrivals.max()]
    rows = shape.programme.constraints(np.concatenate([np.log(sizes), arrivals, worst]))
    arcs, starts, ends, limits, budget, _ = np.split(rows, shape.block[1:])
    assert_allclose(arcs.max(), 0.0, rtol=0, atol=1e-12)
    assert_allclose(starts, 0.0, rtol=0, atol=1e-12)
    missed = (t.max() - goal.delay) / shape.time if isinstance(goal, Cheapest) else 0.0
    assert_allclose(ends.max(), missed, rtol=0, atol=1e-12)
    assert_allclose(limits, question.limit_sums(sizes)[shape.limits] - 1.0, rtol=1e-12, atol=1e-12)
    if isinstance(goal, Budget):
        overdrawn = question.cost(sizes) - goal.spend
        assert_allclose(budget, overdrawn / (goal.spend - 10.0), rtol=1e-12, atol=1e-12)


@given(seed=st.integers(0, 10**6), goal=goals())
def test_first_point_is_inside(seed: int, goal: Goal) -> None:
    question = random_problem(seed, GATES, depth=3)
    shape = Translation(question, goal, question.lower)
    p, z = shape.programme, shape.first()
    assert np.all(z[:GATES] > p.lower)
    assert np.all(z[:GATES] < p.upper)
    assert np.all(p.constraints(z)[: shape.block[2]] < 0.0)


@given(seed=st.integers(0, 10**6))
def test_any_multipliers_become_an_exact_unit_flow(seed: int) -> None:
    question = random_problem(seed, GATES, depth=3)
    shape = Translation(question, Fastest(), question.lower)
    price = np.random.default_rng(seed).exponential(size=shape.programme.rows + 2 * GATES)
    prices = shape.prices(price)
    net = np.bincount(question.end_node, prices.end_flow, question.nodes)
    net += np.bincount(question.arc_source, prices.flow, question.nodes)
    net -= np.bincount(question.arc_target, prices.flow, question.nodes)
    net -= np.bincount(question.start_node, prices.start_flow, question.nodes)
    assert_allclose(net, 0.0, rtol=0, atol=1e-15)
    assert_allclose(prices.start_flow.sum(), 1.0, rtol=1e-14, atol=0)
    assert_allclose(prices.end_flow.sum(), 1.0, rtol=1e-14, atol=0)


def test_fixed_sizes_leave_the_programme() -> None:
    question = chain_problem([1, 1, 1], [1, 1, 1], [1, 1, 1], 2, 30)
    shape = Translation(question, Fastest(), np.array([2.0, 3.0, 4.0]))
    assert shape.programme.sizes == 2
    sizes = shape.sizes(np.log([5.0, 6.0]))
    assert sizes[0] == 2.0
    assert_allclose(sizes, [2.0, 5.0, 6.0], rtol=1e-15, atol=0)


def test_later_of_two_starts_counts() -> None:
    question = chain_problem([1, 1], [1, 1], [1, 1], 1, 4)
    question = replace(
        question,
        start_node=np.array([0, 0], dtype=np.int32),
        start_arrival=np.array([3.0, 5.0]),
    )
    shape = Translation(question, Fastest(), np.array([1.0, 2.0]))
    prices = shape.prices(np.ones(shape.programme.rows + 2))
    assert_array_equal(prices.start_flow, [0.0, 1.0])
    assert shape.origin == pytest.approx(5.0, rel=1e-15, abs=0)
