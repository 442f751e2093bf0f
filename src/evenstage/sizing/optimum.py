"""The best sizes for a question: one door to two optimisers.

Small problems go to the interior point, which is exact to 1e-9 and as quick; large ones to soft-max
cooling, whose work per gate hardly grows. Both give the same kind of answer, with a flow and prices
that prove a bound.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.sizing import cooling, interior_point
from evenstage.sizing.goals import Cheapest
from evenstage.sizing.solution import Solution

if TYPE_CHECKING:
    from numpy.typing import ArrayLike

    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import Problem

#: Monomials up to which the interior point is used: beyond, its factors may fill.
_SMALL: Final = 10_000
#: The smallest gaps that cooling is asked for: of delay, and of spend, which is the steeper one.
_FINEST_DELAY, _FINEST_SPEND = 1e-4, 1e-3


def solve(
    problem: Problem,
    goal: Goal,
    *,
    start: ArrayLike | Solution | None = None,
    tolerance: float = 1e-9,
) -> Solution:
    """Return the best sizes, and the flow and prices that prove how good they are.

    Parameters
    ----------
    problem, goal : Problem and Goal
        What is sized, and to what end.
    start : array_like, shape (n_sizes,), or Solution, optional
        Where to begin, clipped to the box: sizes near the answer save time, and sizes that do not
        matter stay near them. Default: the middle of the box.
    tolerance : float
        Relative gap between answer and bound to stop at. Large problems stop at 1e-4 of a delay
        or 1e-3 of a spend.

    Raises
    ------
    InfeasibleError
        If no sizes meet the limits and the goal: `DelayOutOfReachError` with the least possible
        delay, `BudgetTooSmallError`, `LimitOutOfReachError` with the limit.
    NoPathError
        If no path end can be reached.
    NotConvergedError
        If the proof fails.
    """
    begin = start.sizes if isinstance(start, Solution) else start
    if begin is None:
        begin = np.sqrt(problem.lower * problem.upper)
    sizes = np.clip(np.asarray(begin, dtype=np.float64), problem.lower, problem.upper)
    if is_small(problem):
        return interior_point.solve(problem, goal, start=sizes, tolerance=tolerance)
    finest = _FINEST_SPEND if isinstance(goal, Cheapest) else _FINEST_DELAY
    return cooling.solve(problem, goal, start=sizes, tolerance=max(tolerance, finest))


def is_small(problem: Problem) -> bool:
    """Tell whether the interior point is the quicker way."""
    moving = problem.lower < problem.upper
    return len(problem.delay.row) + len(problem.limit.row) <= _SMALL or not moving.any()
