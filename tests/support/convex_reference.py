"""The same sizing problems, written for a general convex solver: a second opinion.

The geometric programme in log space (Boyd, Kim, Vandenberghe and Hassibi, Optimization and
Engineering 8(1), 2007, from memory), vectorised, with exponential cones. Nothing is shared with the
optimiser.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import cvxpy as cp
import numpy as np
from cvxpy.atoms.elementwise.exp import exp
from scipy.sparse import csr_array

from evenstage.sizing.goals import Budget, Cheapest

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import Monomials, Problem


def reference_objective(problem: Problem, goal: Goal) -> float:
    """Return the optimal delay or, for the cheapest, the optimal spend."""
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
