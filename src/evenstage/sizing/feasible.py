"""Whether sizes exist that keep the limits at all, before any goal is asked for."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.goals import Budget
from evenstage.sizing.infeasible import BudgetTooSmallError, LimitOutOfReachError
from evenstage.sizing.problem import Monomials, Problem, totals

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal


def refuse_hopeless(problem: Problem, goal: Goal) -> None:
    """Refuse a limit that cannot be kept even alone, and a budget below the smallest sizes.

    Raises
    ------
    LimitOutOfReachError, BudgetTooSmallError
    """
    low, high = np.append(problem.lower, 1.0), np.append(problem.upper, 1.0)
    terms = problem.limit
    ratio = np.where(terms.plus == terms.minus, 1.0, low[terms.plus] / high[terms.minus])
    least = totals(terms.row, terms.coefficient * ratio, problem.limits)
    if least.max(initial=0.0) > 1.0:
        raise LimitOutOfReachError(int(least.argmax()), float(least.max()))
    cost = problem.cost(problem.lower)
    if isinstance(goal, Budget) and goal.spend < cost:
        raise BudgetTooSmallError(goal.spend, cost)


def limits_as_paths(problem: Problem) -> Problem:
    """Return a problem whose worst delay is the largest limit sum: one arc per limit."""
    count, none = problem.limits, np.zeros(0, dtype=np.int32)
    ends = np.arange(1, count + 1, dtype=np.int32)
    return replace(
        problem,
        nodes=count + 1,
        start_node=np.zeros(1, dtype=np.int32),
        start_arrival=np.zeros(1),
        arc_source=np.zeros(count, dtype=np.int32),
        arc_target=ends,
        delay=problem.limit,
        end_node=ends,
        end_offset=np.zeros(count),
        limit=Monomials(row=none, coefficient=np.zeros(0), plus=none, minus=none),
        limits=0,
    )
