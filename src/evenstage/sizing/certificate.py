"""An independent check of what an optimiser claims.

Nothing here is shared with the optimiser but the delay model itself: timing, conservation of the
flow and the lower bound are confirmed plainly, from the sizes, arrivals and multipliers alone.
Arrivals that leave every arc its delay prove the worst delay, however they were found. The bound is
the one derived in :mod:`evenstage.sizing.bound`: for any unit flow and any prices >= 0, the
weighted sum of delays, limits and spend is convex in the log sizes, hence above its tangent at any
sizes of the box, and the tangent is least at a corner of the box.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import NotConvergedError
from evenstage.sizing.goals import Budget, Cheapest

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Monomials, Problem
    from evenstage.sizing.solution import Solution

#: Relative disagreement that rounding may explain.
_ROUNDING: Final = 1e-9
#: The same for one arc of a path of many.
_EXACT: Final = 1e-13


@dataclass(frozen=True, kw_only=True)
class Certificate:
    """What the check found.

    Parameters
    ----------
    delay, spend : float
        Of the sizes, worked out again; s and spend.
    worst_limit : float
        The largest limit sum; at most 1. Zero without limits.
    early : float
        By how much an arrival comes before a start or an arc allows it, at worst, s.
    conservation_error : float
        The largest difference between a node's inflow and outflow.
    bound : float
        Lower bound of the goal's objective.
    gap : float
        Distance of the objective from it, relative to the objective or the limiting paths.
    """

    delay: float
    spend: float
    worst_limit: float
    early: float
    conservation_error: float
    bound: float
    gap: float


def check(problem: Problem, goal: Goal, solution: Solution) -> Certificate:
    """Confirm a solution's claims.

    Parameters
    ----------
    problem, goal, solution : Problem, Goal and Solution
        The question and the answer.

    Raises
    ------
    NotConvergedError
        If a claim is not confirmed; the message says which.
    """
    delays = _sums(problem.delay, solution.sizes, len(problem.arc_source))
    limits = _sums(problem.limit, solution.sizes, problem.limits)
    delay = float((solution.arrivals[problem.end_node] + problem.end_offset).max())
    spend = float(np.dot(problem.spend, solution.sizes)) + problem.spend_fixed
    entering, error = _conservation(problem, solution)
    bound = _bound(problem, goal, solution, entering)
    objective = spend if isinstance(goal, Cheapest) else delay
    length = float(solution.flow @ delays)
    time = max(abs(delay), length)
    unit = abs(objective) if isinstance(goal, Cheapest) else time
    found = Certificate(
        delay=delay,
        spend=spend,
        worst_limit=float(limits.max(initial=0.0)),
        early=_early(problem, solution, delays),
        conservation_error=error,
        bound=bound,
        gap=max(objective - bound, 0.0) / unit if unit else 0.0,
    )
    _confirm(problem, goal, solution, found, unit=unit, time=time)
    return found


def _confirm(
    problem: Problem,
    goal: Goal,
    solution: Solution,
    found: Certificate,
    *,
    unit: float,
    time: float,
) -> None:
    x, slack = solution.sizes, 1.0 + _ROUNDING
    prices = (solution.flow, solution.end_flow, solution.limit_prices, solution.spend_price)
    claims = {
        "sizes are inside their bounds": all(
            bool(np.all(some >= problem.lower / slack) and np.all(some <= problem.upper * slack))
            for some in (x, solution.bound_sizes)
        ),
        "limits are kept": found.worst_limit <= slack,
        "no arrival is too early": found.early <= _EXACT * time,
        "the delay is as stated": abs(found.delay - solution.delay) <= _ROUNDING * abs(found.delay),
        "the spend is as stated": abs(found.spend - solution.spend) <= _ROUNDING * abs(found.spend),
        "the delay is as asked": not isinstance(goal, Cheapest)
        or found.delay <= goal.delay + _ROUNDING * abs(goal.delay),
        "the spend is as asked": not isinstance(goal, Budget) or found.spend <= goal.spend * slack,
        "multipliers are not negative": all(
            bool(np.all(np.asarray(price) >= 0.0)) for price in prices
        ),
        "the flow is conserved": found.conservation_error <= _ROUNDING,
        "the bound holds": solution.bound <= found.bound + _ROUNDING * unit,
        "the gap is as stated": found.gap <= solution.gap + _ROUNDING,
    }
    for claim, confirmed in claims.items():
        if not confirmed:
            raise NotConvergedError(f"not confirmed that {claim}", code="not-confirmed")


def _sums(terms: Monomials, sizes: FloatArray, rows: int) -> FloatArray:
    """Add up each row's monomials."""
    size = np.append(sizes, 1.0)
    total = np.zeros(rows)
    np.add.at(total, terms.row, terms.coefficient * size[terms.plus] / size[terms.minus])
    return total


def _early(problem: Problem, solution: Solution, delays: FloatArray) -> float:
    """Return by how much arrivals come too early, at worst."""
    times = solution.arrivals
    starts = problem.start_arrival - times[problem.start_node]
    reached = times[problem.arc_source] > -np.inf
    source, target = problem.arc_source[reached], problem.arc_target[reached]
    arcs = times[source] + delays[reached] - times[target]
    return max(float(starts.max(initial=0.0)), float(arcs.max(initial=0.0)))


def _conservation(problem: Problem, solution: Solution) -> tuple[float, float]:
    """Return the flow's mean start arrival, s, and the largest error of conservation."""
    into = np.zeros(problem.nodes)
    np.add.at(into, problem.end_node, solution.end_flow)
    np.add.at(into, problem.arc_source, solution.flow)
    np.subtract.at(into, problem.arc_target, solution.flow)
    latest = np.full(problem.nodes, -np.inf)
    np.maximum.at(latest, problem.start_node, problem.start_arrival)
    start = latest > -np.inf
    error = max(
        float(np.abs(into[~start]).max(initial=0.0)),
        float(-into[start].min(initial=0.0)),
        abs(float(solution.end_flow.sum()) - 1.0),
    )
    return float(into[start] @ latest[start]), error


def _bound(problem: Problem, goal: Goal, solution: Solution, entering: float) -> float:
    """Return the least value over the box of the tangent at the sizes given for it."""
    x, kappa, nu = solution.bound_sizes, solution.limit_prices, solution.spend_price
    size, slope = np.append(x, 1.0), np.zeros(len(x) + 1)
    value = entering + float(solution.end_flow @ problem.end_offset) - float(kappa.sum())
    for terms, weight in ((problem.delay, solution.flow), (problem.limit, kappa)):
        part = weight[terms.row] * terms.coefficient * size[terms.plus] / size[terms.minus]
        np.add.at(slope, terms.plus, part)
        np.subtract.at(slope, terms.minus, part)
        value += float(part.sum())
    gradient = slope[:-1] + nu * problem.spend * x
    value += nu * (float(problem.spend @ x) + problem.spend_fixed)
    corner = np.where(gradient > 0.0, problem.lower, problem.upper)
    value += float(gradient @ np.log(corner / x))
    match goal:
        case Cheapest(delay):
            return (value - delay) / nu
        case Budget(spend):
            return value - nu * spend
        case _:
            return value
