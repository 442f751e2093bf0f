"""Factored sums must be the sums, and their derivatives those of finite differences."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.sizing.sums import Curvature, Sums
from support.problems import Term, monomials, random_problem

if TYPE_CHECKING:
    from evenstage.sizing.problem import Monomials

STEP = 1e-6


def anything(seed: int, rows: int = 12, sizes: int = 5) -> Monomials:
    """Return sums of monomials of every shape, some of them multiples of others."""
    rng = np.random.default_rng(seed)

    def term() -> Term:
        plus, minus = (None if k == sizes else int(k) for k in rng.integers(0, sizes + 1, 2))
        return float(rng.uniform(0.1, 3.0)), plus, minus

    drawn = [[term() for _ in range(rng.integers(1, 6))] for _ in range(rows // 2)]
    scaled = [[(2.5 * c, plus, minus) for c, plus, minus in row] for row in drawn]
    return monomials([*drawn, *scaled], sizes)


@given(seed=st.integers(0, 10**6))
def test_values_are_those_of_the_plain_sums(seed: int) -> None:
    terms = anything(seed)
    y = np.random.default_rng(seed).normal(size=5)
    assert_allclose(Sums.of(terms, 12, 5).at(y).values, terms.sums(y, 12), rtol=1e-12, atol=0)


@given(seed=st.integers(0, 10**6))
def test_derivatives_are_those_of_differences(seed: int) -> None:
    rng = np.random.default_rng(seed)
    terms, (y, v) = anything(seed), rng.normal(size=(2, 5))
    sums, weight = Sums.of(terms, 12, 5), rng.uniform(0.0, 1.0, 12)
    at, ahead, behind = (sums.at(y + part * v) for part in (0.0, STEP, -STEP))
    u = at.weights(weight)
    moved = at.moved(v)
    assert_allclose(moved.rows, (ahead.values - behind.values) / (2 * STEP), rtol=1e-6, atol=1e-6)
    assert_allclose(at.gradient(u), terms.gradient(y, weight), rtol=1e-10, atol=1e-10)
    change = (ahead.gradient(u) - behind.gradient(u)) / (2 * STEP)
    curvature = Curvature(at, u)
    assert_allclose(curvature.product(v, moved), change, rtol=1e-5, atol=1e-5)
    both = curvature.product(v, moved, 1.0 + weight)
    more = at.gradient(at.weights(1.0 + weight))
    assert_allclose(both, change + more, rtol=1e-5, atol=1e-5)


def test_diagonal_is_that_of_products() -> None:
    sums = Sums.of(anything(4), 12, 5)
    at = sums.at(np.linspace(-1.0, 1.0, 5))
    curvature = Curvature(at, at.weights(np.arange(12.0)))
    units = [curvature.product(e, at.moved(e))[k] for k, e in enumerate(np.eye(5))]
    assert_allclose(curvature.diagonal, units, rtol=1e-12, atol=0)


def test_squares_are_those_of_gate_delays() -> None:
    question = random_problem(8, 30, depth=5)
    rows, n = len(question.arc_source), len(question.lower)
    at = Sums.of(question.delay, rows, n).at(np.linspace(0.0, 2.0, n))
    weight = np.linspace(0.0, 1.0, rows)
    jacobian = np.stack([at.moved(e).rows for e in np.eye(n)], axis=1)
    assert_allclose(at.squares(weight, at.falling()), weight @ jacobian**2, rtol=1e-12, atol=1e-12)


def test_one_load_is_worked_out_once() -> None:
    load: list[Term] = [(1.0, 1, 0), (2.0, 2, 0), (3.0, None, 0)]
    rows = [[(scale * c, plus, minus) for c, plus, minus in load] for scale in (1.0, 4.0, 0.3)]
    rows[2].append((0.7, None, None))
    sums = Sums.of(monomials(rows, 3), 3, 3)
    assert sums.forms == 1
    assert sums.take.nnz == 3
    assert_allclose(sums.constant, [0.0, 0.0, 0.7], rtol=0, atol=0)


@pytest.mark.parametrize("off", [1.0 + 1e-9, 0.5])
def test_loads_that_differ_stay_apart(off: float) -> None:
    rows: list[list[Term]] = [[(1.0, 1, 0), (2.0, 2, 0)], [(1.0, 1, 0), (2.0 * off, 2, 0)]]
    assert Sums.of(monomials(rows, 3), 2, 3).forms == 2
