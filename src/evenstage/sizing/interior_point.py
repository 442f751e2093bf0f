"""The exact optimiser: interior point in log sizes, arrivals and worst delay, with proof.

Ties. Sizes on which neither the limiting paths nor limits nor spend depend have no best value. They
are put back towards `start` as far as the proof allows.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import NotConvergedError
from evenstage.sizing.feasible import limits_as_paths, refuse_hopeless
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.infeasible import (
    BudgetTooSmallError,
    DelayOutOfReachError,
    LimitOutOfReachError,
)
from evenstage.sizing.problem import worst_delay
from evenstage.sizing.search import ACCEPTED_GAP, Search, keeps
from evenstage.sizing.solution import Solution

if TYPE_CHECKING:
    from numpy.typing import ArrayLike

    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem

__all__ = ["Solution", "solve"]

#: Sizes faster than asked by this part are fast enough to begin the search for cheaper ones with.
_EASE: Final = 1e-3
#: Tolerance and iterations of searches for the reason of a failure.
_REASON: Final = (1e-6, 200)


def solve(
    problem: Problem,
    goal: Goal,
    *,
    start: ArrayLike | None = None,
    tolerance: float = 1e-9,
    iterations: int = 200,
) -> Solution:
    """Return the best sizes and the proof that they are.

    Parameters
    ----------
    problem : Problem
        What is sized.
    goal : Goal
        To what end.
    start : array_like, shape (n_sizes,), optional
        Where to begin, clipped to the box; also where sizes that do not matter stay. Without it the
        middle of the box.
    tolerance : float
        Relative gap between answer and bound at which to stop. A gap up to 1e-4 is still accepted
        when rounding or `iterations` leave no smaller one.
    iterations : int
        Most matrix factorisations per search.

    Raises
    ------
    InfeasibleError
        If no sizes meet the limits and the goal: :class:`DelayOutOfReachError` with the least
        possible delay, :class:`BudgetTooSmallError`, :class:`LimitOutOfReachError` with the limit.
    NoPathError
        If no path end can be reached.
    NotConvergedError
        If the gap stayed above both `tolerance` and 1e-4.
    """
    middle = np.sqrt(problem.lower * problem.upper)
    begin = np.asarray(middle if start is None else start, dtype=np.float64)
    begin = np.clip(begin, problem.lower, problem.upper)
    worst_delay(problem, begin)
    refuse_hopeless(problem, goal)
    from_where = begin
    if isinstance(goal, Cheapest) and not keeps(problem, goal, begin):
        from_where = _fast_enough(problem, goal, begin, tolerance, iterations)
    search = Search(problem, goal, from_where)
    search.run(tolerance, iterations)
    if search.gap > max(tolerance, ACCEPTED_GAP):
        raise _not_converged(problem, goal, search)
    return search.solution(begin, tolerance)


def _fast_enough(
    problem: Problem, goal: Cheapest, start: FloatArray, tolerance: float, iterations: int
) -> FloatArray:
    """Return sizes that meet the delay, or say how far out of reach it is."""
    search = Search(problem, Fastest(), start)
    search.run(tolerance, iterations, enough=goal.delay - _EASE * abs(goal.delay))
    if search.best is not None and search.objective <= goal.delay:
        return search.best
    if search.gap <= max(tolerance, ACCEPTED_GAP):
        raise DelayOutOfReachError(goal.delay, search.objective)
    raise _not_converged(problem, Fastest(), search)


def _not_converged(problem: Problem, goal: Goal, search: Search) -> Exception:
    """Return why a search came to no end: limits, budget, or the gap it came to."""
    if problem.limits:
        limits = limits_as_paths(problem)
        middle = np.sqrt(limits.lower * limits.upper)
        closest = Search(limits, Fastest(), middle)
        closest.run(*_REASON, enough=1.0 - _EASE)
        if closest.objective > 1.0 and closest.proven is not None:
            blamed = int(closest.proven[1].end_flow.argmax())
            return LimitOutOfReachError(blamed, closest.objective)
        if isinstance(goal, Budget):
            cheapest = solve(limits, Cheapest(1.0), tolerance=_REASON[0])
            if cheapest.bound > goal.spend:
                return BudgetTooSmallError(goal.spend, cheapest.spend)
    return NotConvergedError(
        f"the sizing came no closer than {search.gap:.1e} to a proven optimum",
        code="not-converged",
    )
