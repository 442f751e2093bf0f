"""The sizing problem: sums of monomials and plain timing."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.errors import NoPathError
from evenstage.sizing.problem import arrivals, worst_delay
from evenstage.sizing.solution import marginal

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.sizing.problem import FloatArray
from support.problems import Arc, chain_problem, monomials, problem, random_problem


def differences(
    function: Callable[[FloatArray], float], y: FloatArray, step: float = 1e-6
) -> FloatArray:
    """Return the gradient of a function by central differences."""
    return np.array(
        [(function(y + step * e) - function(y - step * e)) / (2 * step) for e in np.eye(len(y))]
    )


class TestMonomials:
    def test_sums_are_those_of_the_formula(self) -> None:
        terms = monomials([[(2.0, 0, 1), (3.0, None, 0)], [], [(5.0, 1, None)]], 2)
        sums = terms.sums(np.log([4.0, 8.0]), 3)
        assert_allclose(sums, [2 * 4 / 8 + 3 / 4, 0.0, 40.0], rtol=1e-14, atol=0)

    @given(seed=st.integers(0, 10**6))
    def test_gradient_is_that_of_differences(self, seed: int) -> None:
        rng = np.random.default_rng(seed)
        question = random_problem(seed, 6, depth=3)
        y, weight = rng.normal(size=6), rng.uniform(size=len(question.arc_source))
        terms = question.delay
        found = terms.gradient(y, weight)
        expected = differences(lambda at: float(weight @ terms.sums(at, len(weight))), y)
        assert_allclose(found, expected, rtol=1e-6, atol=1e-6)


class TestWorstDelay:
    def test_of_a_chain_is_the_sum_of_its_stages(self) -> None:
        question = chain_problem([1, 4 / 3], [1, 2], [1, 1], 1, 12)
        assert_allclose(worst_delay(question, [1.0, 3.0]), 3 + 1 + 16 / 3 + 2, rtol=1e-14, atol=0)

    def test_counts_starts_and_offsets(self) -> None:
        one = [(1.0, None, None)]
        question = problem(
            [Arc(0, 2, one), Arc(1, 2, one)],
            [1],
            [2],
            starts={0: 5.0, 1: 7.0},
            ends={2: -3.0, 0: 1.5},
        )
        assert worst_delay(question, [1.0]) == 6.5
        assert arrivals(question, [1.0]).tolist() == [5.0, 7.0, 8.0]

    def test_ignores_ends_that_no_path_reaches(self) -> None:
        question = problem(
            [Arc(0, 1, [(1.0, None, 0)]), Arc(2, 3, [(9.0, None, None)])],
            [1],
            [2],
            starts={0: 0.0},
            ends={1: 0.0, 3: 0.0},
        )
        assert worst_delay(question, [1.0]) == 1.0

    def test_needs_a_path(self) -> None:
        question = problem([Arc(0, 1, [(1.0, None, 0)])], [1], [2], starts={1: 0.0}, ends={0: 0.0})
        with pytest.raises(NoPathError, match="no path leads"):
            worst_delay(question, [1.0])


def test_marginal_is_the_change_of_the_worst_delay_along_its_path() -> None:
    question = chain_problem([1, 1, 1], [1, 1, 1], [1, 1, 1], 1, 30, side_load=[3, 0, 2])
    sizes = np.array([1.0, 2.0, 5.0])
    found = marginal(question, sizes, np.ones(3))
    expected = differences(lambda y: worst_delay(question, np.exp(y)), np.log(sizes))
    assert_allclose(found, expected, rtol=1e-6, atol=1e-6)
