"""Compiled loops and numpy must give the same answers, and each have its place."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from evenstage.sizing.compiled import Compiled
from evenstage.sizing.cooling import solve
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.hessian import Hessian
from evenstage.sizing.lagrangian import Point, Weights
from evenstage.sizing.levelled import Levelled
from evenstage.sizing.setup import Question, Setup
from support.problems import random_problem

SMALL = random_problem(9, 50, depth=5)
LARGE = random_problem(9, 120, depth=10)
START = LARGE.lower * 1.05


@pytest.fixture(autouse=True)
def _compile_early(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("evenstage.sizing.setup._COMPILED_FROM", 300)


def without_numba(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("evenstage.sizing.setup.find_spec", lambda _: None)


def test_small_problems_do_not_load_numba() -> None:
    assert isinstance(Setup.of(SMALL, SMALL.lower).sweeps, Levelled)
    assert isinstance(Setup.of(LARGE, START).sweeps, Compiled)


@pytest.mark.parametrize("question", [Question(), Question(deadline=1.2), Question(budget=2.0)])
def test_both_ways_work_out_the_same(question: Question, monkeypatch: pytest.MonkeyPatch) -> None:
    weights = Weights(temperature=0.02, goal=0.01, limit=1e-3, grace=0.2)
    points = []
    for _ in range(2):
        setup = Setup.of(LARGE, START).asking(question)
        points.append(Point(setup, weights, setup.reduced.log_sizes(START)))
        without_numba(monkeypatch)
    v = np.random.default_rng(2).normal(size=len(START))
    one, two = (Hessian(point, point.prices) for point in points)
    assert type(one.point.sums) is not type(two.point.sums)
    assert_allclose(points[0].value, points[1].value, rtol=1e-12, atol=0)
    assert_allclose(points[0].gradient, points[1].gradient, rtol=1e-9, atol=1e-12)
    assert_allclose(one.product(v), two.product(v), rtol=1e-8, atol=1e-10)
    assert_allclose(one.diagonal, two.diagonal, rtol=1e-9, atol=1e-12)
    assert_allclose(one.cooling(), two.cooling(), rtol=1e-8, atol=1e-10)


def test_both_ways_give_the_same_answers(monkeypatch: pytest.MonkeyPatch) -> None:
    least = solve(LARGE, Fastest(), start=START, tolerance=1e-3).delay
    goals = (Fastest(), Cheapest(1.1 * least), Budget(2.0 * LARGE.cost(LARGE.lower)))
    some = [solve(LARGE, goal, start=START, tolerance=1e-3) for goal in goals]
    without_numba(monkeypatch)
    others = [solve(LARGE, goal, start=START, tolerance=1e-3) for goal in goals]
    for goal, one, two in zip(goals, some, others, strict=True):
        if isinstance(goal, Cheapest):
            assert_allclose(one.spend, two.spend, rtol=1e-3, atol=0)
        else:
            assert_allclose(one.delay, two.delay, rtol=1e-3, atol=0)
