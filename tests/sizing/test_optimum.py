"""Which optimiser answers, and what it may begin with."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.testing import assert_allclose, assert_array_equal

from evenstage.sizing import cooling, interior_point
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Cheapest, Fastest
from evenstage.sizing.optimum import solve
from support.problems import random_problem

if TYPE_CHECKING:
    import pytest

SMALL = random_problem(3, 40, depth=6)
LARGE = random_problem(3, 900, depth=20)


def test_small_problems_are_solved_to_the_last_digit() -> None:
    answer = solve(SMALL, Fastest())
    assert_array_equal(answer.sizes, interior_point.solve(SMALL, Fastest()).sizes)
    assert answer.gap < 1e-8


def test_large_problems_are_cooled(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(interior_point, "solve", None)
    answer = solve(LARGE, Fastest(), start=LARGE.lower, tolerance=1e-2)
    assert check(LARGE, Fastest(), answer).gap <= 1e-2


def test_small_and_large_agree(monkeypatch: pytest.MonkeyPatch) -> None:
    exact = solve(SMALL, Fastest())
    monkeypatch.setattr("evenstage.sizing.optimum._SMALL", 0)
    assert_allclose(solve(SMALL, Fastest()).delay, exact.delay, rtol=1.1e-4, atol=0)


def test_an_answer_is_a_start() -> None:
    fastest = solve(LARGE, Fastest(), start=LARGE.lower, tolerance=1e-2)
    goal = Cheapest(1.2 * fastest.delay)
    answer = solve(LARGE, goal, start=fastest, tolerance=1e-2)
    again = cooling.solve(LARGE, goal, start=fastest.sizes, tolerance=1e-2)
    assert_array_equal(answer.sizes, again.sizes)


def test_nothing_to_move_is_proved_too() -> None:
    sizes = np.full(900, 2.0)
    limit = replace(LARGE.limit, coefficient=LARGE.limit.coefficient / 10.0)
    fixed = replace(LARGE, lower=sizes, upper=sizes, limit=limit)
    assert solve(fixed, Fastest()).gap < 1e-8
