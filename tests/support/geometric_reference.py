"""Sizing as a user of a general modelling language would write it: a geometric programme in sizes.

One positive variable per size and per arrival, one constraint per arc, as the textbook has it
(Boyd, Kim, Vandenberghe and Hassibi, Optimization and Engineering 8(1), 2007, from memory); the
language finds the convex form by itself.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import cvxpy as cp
import numpy as np

if TYPE_CHECKING:
    from evenstage.sizing.problem import Problem


def least_delay(problem: Problem) -> tuple[float, str]:
    """Return the least worst delay that the solver found, and how it says it ended.

    Parameters
    ----------
    problem : Problem
        Without limits; all starts at 0 and no end offsets.

    Raises
    ------
    cvxpy.error.SolverError
        Where the solver gives up.
    """
    n = len(problem.lower)
    x, t = cp.Variable(n, pos=True), cp.Variable(problem.nodes, pos=True)
    worst = cp.Variable(pos=True)
    delays: list[object] = [0.0] * len(problem.arc_source)
    terms = problem.delay
    columns = (some.tolist() for some in (terms.row, terms.coefficient, terms.plus, terms.minus))
    for row, coefficient, plus, minus in zip(*columns, strict=True):
        ratio = 1.0 if plus == minus else (1.0 if plus == n else x[plus])
        if minus not in {n, plus}:
            ratio /= x[minus]
        delays[row] += coefficient * ratio
    starts = set(problem.start_node.tolist())
    wishes = [x >= problem.lower, x <= problem.upper]
    arcs = zip(problem.arc_source.tolist(), problem.arc_target.tolist(), delays, strict=True)
    for source, target, delay in arcs:
        wishes.append((delay if source in starts else t[source] + delay) <= t[target])
    wishes += [t[node] <= worst for node in np.unique(problem.end_node).tolist()]
    programme = cp.Problem(cp.Minimize(worst), wishes)
    programme.solve(gp=True, solver=cp.CLARABEL)  # type: ignore[no-untyped-call]  # theirs is untyped
    return float(programme.value), str(programme.status)
