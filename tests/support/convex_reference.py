"""The same sizing problems, written for a general convex solver: a second opinion.

The geometric programme in log space (Boyd, Kim, Vandenberghe and Hassibi, Optimization and
Engineering 8(1), 2007, from memory), vectorised, with exponential cones. Nothing is shared with the
optimiser.
"""

from __future__ import annotations

import contextlib
from dataclasses import replace
from typing import TYPE_CHECKING

import cvxpy as cp
import numpy as np
from cvxpy.atoms.elementwise.exp import exp
from scipy.sparse import csr_array

from evenstage.sizing.goals import Budget, Cheapest
from evenstage.sizing.problem import worst_delay

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import Monomials, Problem


def reference_objective(problem: Problem, goal: Goal) -> float:
    """Return the optimal delay or, for the cheapest, the optimal spend.

    Where the solver gives up, as it does on some larger circuits, other units may help it.

    Raises
    ------
    cvxpy.error.SolverError
        Where it gives up in all units.
    """
    sizes = np.sqrt(problem.lower * problem.upper)
    whole = (abs(worst_delay(problem, sizes)) or 1.0, problem.cost(sizes) or 1.0)
    for time, money in ((1.0, 1.0), whole, (whole[0] / 10.0, whole[1] / 100.0)):
        with contextlib.suppress(cp.error.SolverError):
            optimum = _plain_objective(*_scaled(problem, goal, time, money))
            return optimum * (money if isinstance(goal, Cheapest) else time)
    raise cp.error.SolverError


def _scaled(problem: Problem, goal: Goal, time: float, money: float) -> tuple[Problem, Goal]:
    """Return the same question in other units."""
    match goal:
        case Cheapest(delay):
            goal = Cheapest(delay / time)
        case Budget(spend):
            goal = Budget(spend / money)
    delay_terms = replace(problem.delay, coefficient=problem.delay.coefficient / time)
    changed = replace(
        problem,
        delay=delay_terms,
        start_arrival=problem.start_arrival / time,
        end_offset=problem.end_offset / time,
        spend=problem.spend / money,
        spend_fixed=problem.spend_fixed / money,
    )
    return changed, goal


def _plain_objective(problem: Problem, goal: Goal) -> float:
    """Return the optimum of a question in its own units."""
    y, t, worst = cp.Variable(len(problem.lower)), cp.Variable(problem.nodes), cp.Variable()
    spend = problem.spend @ exp(y) + problem.spend_fixed
    delays = _sums(problem.delay, y, len(problem.arc_source))
    wishes = [
        t[problem.arc_source] + delays <= t[problem.arc_target],
        t[problem.start_node] >= problem.start_arrival,
        t[problem.end_node] + problem.end_offset <= worst,
        y >= np.log(problem.lower),
        y <= np.log(problem.upper),
    ]
    if problem.limits:
        wishes.append(_sums(problem.limit, y, problem.limits) <= 1.0)
    if isinstance(goal, Cheapest):
        wishes.append(worst <= goal.delay)
    if isinstance(goal, Budget):
        wishes.append(spend <= goal.spend)
    wanted = spend if isinstance(goal, Cheapest) else worst
    programme = cp.Problem(cp.Minimize(wanted), wishes)
    programme.solve(solver=cp.CLARABEL)  # type: ignore[no-untyped-call]  # theirs is untyped
    return float(programme.value)


def _sums(terms: Monomials, y: cp.Variable, rows: int) -> cp.Expression:
    """Return each row's sum of monomials as a convex expression; equal ratios are one cone."""
    pairs, ratio = np.unique(np.stack([terms.plus, terms.minus]), axis=1, return_inverse=True)
    entry, sizes = np.arange(pairs.shape[1]), y.size
    up, down = pairs < sizes
    exponent = csr_array(
        (
            np.concatenate([np.ones(up.sum()), -np.ones(down.sum())]),
            (
                np.concatenate([entry[up], entry[down]]),
                np.concatenate([pairs[0, up], pairs[1, down]]),
            ),
        ),
        shape=(len(entry), sizes),
    )
    add = csr_array((terms.coefficient, (terms.row, ratio)), shape=(rows, len(entry)))
    sums: cp.Expression = cp.Constant(add) @ exp(exponent @ y)
    return sums
