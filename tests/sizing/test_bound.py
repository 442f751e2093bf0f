"""The lower bound must hold for any unit flow, any prices and any point of the box."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.sizing.bound import lower_bound
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.interior_point import solve
from evenstage.sizing.problem import worst_delay
from evenstage.sizing.translation import Translation
from support.problems import chain_problem, random_problem, tied

GATES = 12


@given(seed=st.integers(0, 10**6), nu=st.floats(1e-3, 1.0))
def test_no_sizes_beat_it_whatever_the_multipliers(seed: int, nu: float) -> None:
    question = random_problem(seed, GATES, depth=3)
    rng = np.random.default_rng(seed)
    sizes, other = np.exp(rng.uniform(0.0, np.log(64.0), (2, GATES)))
    other /= max(1.0, question.limit_sums(other).max(initial=0.0))
    other = np.clip(other, question.lower, question.upper)
    if question.limit_sums(other).max(initial=0.0) > 1.0:
        other = question.lower
    shape = Translation(question, Fastest(), sizes)
    prices = shape.prices(rng.exponential(size=shape.programme.rows + 2 * GATES))
    delay, spend = worst_delay(question, other), question.cost(other)
    assert lower_bound(question, Fastest(), sizes, prices) <= delay * (1 + 1e-12)
    priced = replace(prices, spend_price=nu)
    assert lower_bound(question, Budget(spend), sizes, priced) <= delay * (1 + 1e-12)
    assert lower_bound(question, Cheapest(delay), sizes, priced) <= spend * (1 + 1e-12)


@given(seed=st.integers(0, 10**6), part=st.floats(0.0, 1.0), nu=st.floats(1e-3, 1.0))
def test_holds_with_ties_fixed_sizes_and_tight_limits(seed: int, part: float, nu: float) -> None:
    question = tied(random_problem(seed, GATES, depth=3), seed)
    rng = np.random.default_rng(seed)
    low, high = np.log(question.lower), np.log(question.upper)
    sizes, other = np.exp(low + rng.uniform(0.0, 1.0, (2, GATES)) * (high - low))
    middle = np.sqrt(question.lower * question.upper)
    # Limits are convex in the log sizes, and the middle keeps them with room.
    other = middle * (other / middle) ** part
    if question.limit_sums(other).max(initial=0.0) > 1.0:
        other = middle
    shape = Translation(question, Fastest(), sizes)
    rows = shape.programme.rows + 2 * shape.programme.sizes
    prices = replace(shape.prices(rng.exponential(size=rows)), spend_price=nu)
    delay, spend = worst_delay(question, other), question.cost(other)
    assert lower_bound(question, Budget(spend), sizes, prices) <= delay * (1 + 1e-12)
    assert lower_bound(question, Cheapest(delay), sizes, prices) <= spend * (1 + 1e-12)


def test_is_tight_at_the_optimum_by_hand() -> None:
    question = chain_problem([1, 1], [1, 1], [1, 1], 1, 16)
    answer = solve(question, Fastest())
    assert_allclose(answer.bound, 10.0, rtol=1e-9, atol=0)


@pytest.mark.parametrize("off", [0.99, 1.01])
def test_is_loose_beside_the_optimum(off: float) -> None:
    question = chain_problem([1, 1], [1, 1], [1, 1], 1, 16)
    shape = Translation(question, Fastest(), np.array([1.0, 4.0]))
    prices = shape.prices(np.ones(shape.programme.rows + 2))
    assert_allclose(
        lower_bound(question, Fastest(), np.array([1.0, 4.0]), prices), 10.0, rtol=1e-12, atol=0
    )
    assert lower_bound(question, Fastest(), np.array([1.0, 4.0 * off]), prices) < 10.0 - 0.01
