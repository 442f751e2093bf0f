"""Gradient, Hessian and its diagonal against differences, on blocks of real transistors."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.brief import Brief, InputBrief, OutputBrief
from evenstage.pattern import Pattern
from evenstage.sizing.hessian import Hessian
from evenstage.sizing.lagrangian import Point, Weights
from evenstage.sizing.model import Limits
from evenstage.sizing.setup import Question, Setup
from support.blocks import plain_process
from support.models import model_of
from support.problems import random_problem
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.sizing.problem import Problem

PROCESS = plain_process(
    r_fixed=60.0, c_gate_fixed=0.2e-15, c_drain_fixed=0.1e-15, stack=0.7,
    slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2,
)  # fmt: skip
BRIEF = Brief(
    inputs=(InputBrief(nets=(Pattern("i*"),), arrival=2e-11, drive=900.0),),
    outputs=(OutputBrief(nets=(Pattern("n*"),), required=2e-10),),
)
WEIGHTS = Weights(temperature=0.03, goal=0.02, limit=0.004, cost=0.01, grace=0.05)
QUESTIONS = [Question(), Question(deadline=1.4), Question(budget=1.6)]
STEP = 1e-6


def real_problem(block: RandomBlock) -> Problem:
    """Return a block's problem, with a ceiling on its first input and a transition limit."""
    model = model_of(block.text(), PROCESS, BRIEF)
    count, net = len(model.variables), model.graph.net[model.graph.start[:1]]
    ceiling = 5.0 * model.circuit.net_cap[net]
    limits = Limits(ceiling_net=net, ceiling=ceiling, transition=1e-9)
    return model.problem(np.full(count, 0.1), np.full(count, 10.0), np.ones(count), limits)


def point_of(problem: Problem, question: Question) -> Point:
    """Return the point at sizes 1."""
    sizes = np.ones(len(problem.lower))
    setup = Setup.of(problem, sizes).asking(question)
    return Point(setup, WEIGHTS, setup.reduced.log_sizes(sizes))


@pytest.mark.parametrize("question", QUESTIONS, ids=["fastest", "cheapest", "budget"])
class TestOnRealBlocks:
    @given(block=random_blocks(), seed=st.integers(0, 10**6))
    @settings(max_examples=15, deadline=None)
    def test_derivatives(self, question: Question, block: RandomBlock, seed: int) -> None:
        point = point_of(real_problem(block), question)
        assert point.inside
        v = np.random.default_rng(seed).normal(size=len(point.y))
        ahead, behind = (point.at(point.y + part * v) for part in (STEP, -STEP))
        slope = (ahead.value - behind.value) / (2 * STEP)
        assert_allclose(point.gradient @ v, slope, rtol=1e-6, atol=1e-7)
        bend = (ahead.gradient - behind.gradient) / (2 * STEP)
        hessian = Hessian(point, point.prices)
        scale = np.abs(bend).max()
        assert_allclose(hessian.product(v), bend, rtol=1e-5, atol=1e-6 * scale)
        warm, cold = (point.at(point.y, WEIGHTS.times(1 + part)) for part in (STEP, -STEP))
        change = (warm.gradient - cold.gradient) / (2 * STEP)
        scale = np.abs(change).max()
        assert_allclose(hessian.cooling(), change, rtol=1e-5, atol=1e-6 * scale)


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_diagonal_is_exact_without_ties(seed: int) -> None:
    point = point_of(random_problem(seed, 40, depth=6), Question())
    hessian = Hessian(point, point.prices)
    exact = [hessian.product(e)[k] for k, e in enumerate(np.eye(len(point.y)))]
    assert_allclose(hessian.diagonal, exact, rtol=1e-9, atol=1e-12)


def test_products_are_symmetric() -> None:
    point = point_of(random_problem(5, 60, depth=6), Question(deadline=1.2))
    hessian = Hessian(point, point.prices)
    u, v = np.random.default_rng(11).normal(size=(2, len(point.y)))
    assert_allclose(u @ hessian.product(v), v @ hessian.product(u), rtol=1e-10, atol=0)
