"""Limits without room fix their sizes; a guard tightens only what has room."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from evenstage.sizing.goals import Fastest
from evenstage.sizing.interior_point import solve
from evenstage.sizing.presolve import with_guard, without_room
from evenstage.sizing.problem import Monomials, Problem
from support.problems import chain_problem

CHAIN = chain_problem([1.0] * 4, [1.0] * 4, [1.0] * 4, 1.0, 1000.0)
N = len(CHAIN.lower)


def limited(*rows: list[tuple[float, int, int]]) -> Problem:
    """Return a chain of sizes in [1, 50] with limits given as (coefficient, plus, minus)."""
    entries = [(row, *entry) for row, some in enumerate(rows) for entry in some]
    row, coefficient, plus, minus = (np.array(column) for column in zip(*entries, strict=True))
    limit = Monomials(
        row=row.astype(np.int32),
        coefficient=coefficient.astype(float),
        plus=plus.astype(np.int32),
        minus=minus.astype(np.int32),
    )
    return replace(CHAIN, lower=np.ones(N), upper=np.full(N, 50.0), limit=limit, limits=len(rows))


class TestWithoutRoom:
    def test_a_ceiling_at_the_smallest_sizes_fixes_them(self) -> None:
        fixed = without_room(limited([(0.4, 0, N), (0.6, 1, N)]))
        assert fixed.upper[:2].tolist() == [1.0, 1.0]
        assert fixed.upper[2] == 50.0

    def test_one_limit_forces_the_next(self) -> None:
        """Once size 0 is fixed at 1, ``x1 / x0 <= 1`` leaves x1 no room either."""
        fixed = without_room(limited([(1.0, 1, 0)], [(1.0, 0, N)]))
        assert fixed.upper[:2].tolist() == [1.0, 1.0]

    def test_room_is_left_alone(self) -> None:
        problem = limited([(0.1, 0, N)])
        assert without_room(problem).upper.tolist() == problem.upper.tolist()

    def test_the_rounding_of_a_sum_does_not_make_it_infeasible(self) -> None:
        problem = without_room(limited([(0.3, 0, N), (0.7 + 5e-10, 1, N)]))
        assert solve(problem, Fastest()).sizes[:2] == pytest.approx([1.0, 1.0])


class TestWithGuard:
    def test_limits_with_room_get_tighter_and_others_stay(self) -> None:
        problem = limited([(0.1, 0, N)], [(1.0, 1, N)])
        guarded = with_guard(problem, 0.01)
        assert guarded.limit.coefficient == pytest.approx([0.101, 1.0])
