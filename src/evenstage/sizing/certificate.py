"""An independent check of what an optimiser claims.

Nothing here is shared with the optimiser but the delay model itself: timing, conservation of the
flow and the lower bound are worked out again, plainly, from the sizes and multipliers alone. The
bound is the one derived in :mod:`evenstage.sizing.bound`: for any unit flow and any prices >= 0,
the weighted sum of delays, limits and spend is convex in the log sizes, hence above its tangent,
and the tangent is least at a corner of the box.
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


@dataclass(frozen=True, kw_only=True)
class Certificate:
    """What the check found.

    Parameters
    ----------
    delay, spend : float
        Of the sizes, worked out again; s and spend.
    worst_limit : float
        The largest limit sum; at most 1. Zero without limits.
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
    y = np.log(solution.sizes)
    delays = _sums(problem.delay, y, len(problem.arc_source))
    limits = _sums(problem.limit, y, problem.limits)
    times = _timing(problem, delays)
    ends = zip(problem.end_node.tolist(), problem.end_offset.tolist(), strict=True)
    delay = max(times[node] + offset for node, offset in ends)
    spend = float(np.dot(problem.spend, solution.sizes)) + problem.spend_fixed
    entering, error = _conservation(problem, solution)
    bound = _bound(problem, goal, solution, delays, limits, entering)
    objective = spend if isinstance(goal, Cheapest) else delay
    length = 0.0 if isinstance(goal, Cheapest) else float(solution.flow @ delays)
    unit = max(abs(objective), length)
    found = Certificate(
        delay=delay,
        spend=spend,
        worst_limit=float(limits.max(initial=0.0)),
        conservation_error=error,
        bound=bound,
        gap=max(objective - bound, 0.0) / unit if unit else 0.0,
    )
    _confirm(problem, goal, solution, found, unit)
    return found


def _confirm(
    problem: Problem, goal: Goal, solution: Solution, found: Certificate, unit: float
) -> None:
    x, slack = solution.sizes, 1.0 + _ROUNDING
    prices = (solution.flow, solution.end_flow, solution.limit_prices, solution.spend_price)
    claims = {
        "sizes are inside their bounds": bool(
            np.all(x >= problem.lower / slack) and np.all(x <= problem.upper * slack)
        ),
        "limits are kept": found.worst_limit <= slack,
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


def _sums(terms: Monomials, y: FloatArray, rows: int) -> FloatArray:
    """Add up each row's monomials."""
    log_size = np.concatenate([y, [0.0]])
    total = np.zeros(rows)
    ratio = np.exp(log_size[terms.plus] - log_size[terms.minus])
    np.add.at(total, terms.row, terms.coefficient * ratio)
    return total


def _timing(problem: Problem, delays: FloatArray) -> list[float]:
    """Return the latest arrival per node: arcs in the order of their targets."""
    times = [-np.inf] * problem.nodes
    starts = zip(problem.start_node.tolist(), problem.start_arrival.tolist(), strict=True)
    for node, arrival in starts:
        times[node] = max(times[node], arrival)
    source, target, delay = (
        problem.arc_source.tolist(),
        problem.arc_target.tolist(),
        delays.tolist(),
    )
    for arc in sorted(range(len(target)), key=target.__getitem__):
        times[target[arc]] = max(times[target[arc]], times[source[arc]] + delay[arc])
    return times


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


def _bound(
    problem: Problem,
    goal: Goal,
    solution: Solution,
    delays: FloatArray,
    limits: FloatArray,
    entering: float,
) -> float:
    """Return the least value over the box of the tangent at the solution's sizes."""
    x, kappa, nu = solution.sizes, solution.limit_prices, solution.spend_price
    y, n = np.log(x), len(x)
    slope = np.zeros(n + 1)
    for terms, weight in ((problem.delay, solution.flow), (problem.limit, kappa)):
        log_size = np.concatenate([y, [0.0]])
        part = weight[terms.row] * terms.coefficient
        part = part * np.exp(log_size[terms.plus] - log_size[terms.minus])
        np.add.at(slope, terms.plus, part)
        np.subtract.at(slope, terms.minus, part)
    slope = slope[:n] + nu * problem.spend * x
    value = entering + float(solution.end_flow @ problem.end_offset) + float(solution.flow @ delays)
    value += float(kappa @ (limits - 1.0)) + nu * (float(problem.spend @ x) + problem.spend_fixed)
    corner = np.where(slope > 0.0, np.log(problem.lower), np.log(problem.upper))
    value += float(slope @ (corner - y))
    match goal:
        case Cheapest(delay):
            return (value - delay) / nu
        case Budget(spend):
            return value - nu * spend
        case _:
            return value
