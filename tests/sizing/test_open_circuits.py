"""A part of the robustness matrix: open circuits in unlike surroundings, every question certified.

The whole is ``tests/benchmarks/bench_sizing.py matrix``.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest

from evenstage.sizing.certificate import check
from evenstage.sizing.cooling import solve
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from support.open_circuits import Setting, circuit_problem, netlist_path, two_edges

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem
    from evenstage.sizing.solution import Solution

GAP = 1e-3
SETTINGS = (
    Setting(), Setting(upper=16), Setting(upper=1000), Setting(lower=0.3), Setting(wire=0),
    Setting(wire=5), Setting(outside=4), Setting(outside=400), Setting(driver=1),
    Setting(driver=100),
)  # fmt: skip

pytestmark = pytest.mark.skipif(netlist_path("c17") is None, reason="needs circuitgraph")


def certified(question: Problem, goal: Goal, start: FloatArray) -> Solution:
    answer = solve(question, goal, start=start, tolerance=GAP)
    assert check(question, goal, answer).gap <= GAP * (1 + 1e-6)
    return answer


def answered(question: Problem, start: FloatArray) -> None:
    least = certified(question, Fastest(), start)
    for factor in (1.02, 1.1, 1.4):
        cheap = certified(question, Cheapest(factor * least.delay), least.sizes)
        assert cheap.delay <= factor * least.delay * (1 + 1e-9)
    smallest = question.cost(question.lower)
    for factor in (1.1, 1.5, 3.0):
        within = certified(question, Budget(factor * smallest), start)
        assert least.bound * (1 - 1e-9) <= within.delay


@pytest.mark.parametrize("setting", SETTINGS, ids=str)
def test_every_question_in_every_setting(setting: Setting) -> None:
    question = circuit_problem("c17", setting)
    answered(question, np.full(len(question.lower), 4.0))


@pytest.mark.parametrize("name", ["c432", "c880"])
def test_larger_circuits(name: str) -> None:
    question = circuit_problem(name)
    answered(question, np.full(len(question.lower), 4.0))


def test_edges_ties_and_ceilings() -> None:
    question = two_edges(circuit_problem("c880"))
    assert question.limits
    answered(question, 1.05 * question.lower)
