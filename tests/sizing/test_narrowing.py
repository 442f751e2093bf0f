"""A part of a block must stand for the whole where it was made, and never lead it astray."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from evenstage.sizing.certificate import check
from evenstage.sizing.compiled import Compiled
from evenstage.sizing.cooling import solve
from evenstage.sizing.goals import Cheapest, Fastest
from evenstage.sizing.hessian import Hessian
from evenstage.sizing.lagrangian import Point, Weights
from evenstage.sizing.levelled import Levelled
from evenstage.sizing.narrowing import lowered, part_of
from evenstage.sizing.newton import State, is_enough
from evenstage.sizing.setup import Question, Setup
from support.problems import random_problem

BLOCK = random_problem(9, 400, depth=10, near=3)
START = BLOCK.lower * 1.05
COLD = Weights(temperature=2e-3, goal=0.01, limit=1e-4, grace=0.2)
QUESTIONS = pytest.mark.parametrize(
    "question", [Question(), Question(deadline=1.2), Question(budget=2.0)]
)
WAYS = pytest.mark.parametrize("compiled_from", [300, 10**9])


def cold_point(question: Question) -> Point:
    setup = Setup.of(BLOCK, START).asking(question)
    return Point(setup, COLD, setup.reduced.log_sizes(START))


@QUESTIONS
@WAYS
def test_is_the_whole_to_those_it_has(
    question: Question, compiled_from: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("evenstage.sizing.setup._COMPILED_FROM", compiled_from)
    whole = cold_point(question)
    part = part_of(whole)
    assert part is not None
    state = part.state(State(point=whole, prices=whole.prices, damping=0.1))
    mine, n = state.point, len(whole.y)
    assert len(mine.delay) < 0.5 * len(whole.delay)
    assert_allclose(mine.longest, whole.longest, rtol=1e-12, atol=0)
    assert_allclose(mine.cost, whole.cost, rtol=1e-12, atol=0)
    free = mine.reduced.lower < mine.reduced.upper
    gradient = part.spread(np.where(free, mine.gradient, 0.0), np.zeros(n))
    expected = part.spread(np.where(free, whole.gradient[part.sizes], 0.0), np.zeros(n))
    assert_allclose(gradient, expected, rtol=1e-9, atol=1e-12)
    v = part.spread(np.where(free, 1.0, 0.0), np.zeros(n))
    v *= np.random.default_rng(3).normal(size=n)
    one = Hessian(mine, state.prices).product(v[part.sizes])
    two = Hessian(whole, whole.prices).product(v)[part.sizes]
    assert_allclose(one[free], two[free], rtol=1e-8, atol=1e-10)


@QUESTIONS
def test_brings_the_whole_down(question: Question) -> None:
    point = cold_point(question)
    point = point.at(point.y, replace(COLD, temperature=2e-2, limit=1e-3))
    state = lowered([State(point=point, prices=point.prices, damping=0.1)], 100)
    assert is_enough(state.point)
    assert state.point.value < point.value
    assert len(state.prices.limit) == len(point.prices.limit)


def test_arcs_that_carry_flow_are_whole_paths(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("evenstage.sizing.setup._COMPILED_FROM", 10**9)
    whole = cold_point(Question())
    graph, flow = whole.reduced.graph, whole.soft.flow
    kept = Levelled(graph).carrying(flow, 1e-6)
    assert_array_equal(kept, Compiled(graph).carrying(flow, 1e-6))
    assert kept[flow >= 1e-6].all()
    into = set(graph.target[kept].tolist()) | {0}
    out = set(graph.source[kept].tolist()) | {graph.nodes - 1}
    assert into == out


@WAYS
def test_sizes_off_the_limiting_paths_count_too(
    compiled_from: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Sizes whose paths become limiting only as others are made small."""
    monkeypatch.setattr("evenstage.sizing.setup._COMPILED_FROM", compiled_from)
    question = replace(BLOCK, lower=BLOCK.lower / 4)
    fastest = solve(question, Fastest(), start=question.upper / 8, tolerance=1e-4)
    assert check(question, Fastest(), fastest).gap <= 1e-4 * (1 + 1e-6)
    goal = Cheapest(1.2 * fastest.delay)
    answer = solve(question, goal, start=question.upper / 8, tolerance=1e-3)
    assert check(question, goal, answer).gap <= 1e-3 * (1 + 1e-6)


@QUESTIONS
def test_directions_are_the_same_both_ways(
    question: Question, monkeypatch: pytest.MonkeyPatch
) -> None:
    found = []
    for start in (300, 10**9):
        monkeypatch.setattr("evenstage.sizing.setup._COMPILED_FROM", start)
        point = cold_point(question)
        hessian = Hessian(point, point.prices)
        diagonal = np.abs(hessian.diagonal) + 1e-9
        diagonal[::7] = np.inf
        right = np.where(diagonal < np.inf, -point.gradient, 0.0)
        scale = 1.0 / (1.1 * diagonal)
        damping = np.where(diagonal < np.inf, 0.1 * diagonal, 0.0)
        found.append(point.setup.solve(hessian, damping, scale, right, 1e-9, 8))
    (one, few), (two, many) = found
    assert few == many == 8
    assert_allclose(one, two, rtol=1e-7, atol=1e-9 * float(np.abs(two).max()))
