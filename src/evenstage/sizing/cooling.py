"""The optimiser for blocks of any size: soft-max timing, cooled down, with proof.

Soft-max delay in log sizes, exact Newton steps without a matrix, a temperature that falls, and a
lower bound from the soft flow (:mod:`evenstage.sizing.bound`). Work per gate hardly grows with the
block. The way into the constraints, where `start` is not inside them:

*Limits*: the largest limit sum is minimised like a delay, one path per limit, until it is below 1.

*Budget*: sizes go towards the smallest until the cost is inside.

*Deadline*: ``D_T + epsilon W`` is minimised with T and epsilon falling until D_T is inside. With
price ``1 / epsilon`` of the delay that is already a minimum of the cheapest's function, from which
its walk goes on.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import NotConvergedError
from evenstage.sizing.bound import Prices, lower_bound
from evenstage.sizing.continuation import Best, Walk, balanced
from evenstage.sizing.feasible import limits_as_paths, refuse_hopeless
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.infeasible import (
    BudgetTooSmallError,
    DelayOutOfReachError,
    LimitOutOfReachError,
)
from evenstage.sizing.lagrangian import Point, Weights
from evenstage.sizing.narrowing import lowered
from evenstage.sizing.newton import State
from evenstage.sizing.problem import arrivals, worst_delay
from evenstage.sizing.setup import Question, Setup
from evenstage.sizing.solution import Solution, relative_gap

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem
    from evenstage.sizing.tangent import Bound

#: The temperature begins at this part of the longest path.
_FIRST: Final = 0.01
#: Slack of every limit that a first point should have, and that is enough to stop looking for.
_LITTLE, _PLENTY = 1e-4, 1e-2
#: First price of cost on the way to a deadline: cost counts this part of the delay.
_COST_COUNTS: Final = 0.3
#: How often it may rise, and by what; how often it may fall, and by what, the temperature with it.
_DEARER, _RISES, _PRICES, _COOLER = 4, 3.0, 30, 0.5
#: Newton steps per price.
_STEPS: Final = 40
#: Part of the room between smallest cost and budget that a first point leaves.
_FREE: Final = 0.3
#: A gap that is still an answer when the work is done.
ACCEPTED_GAP: Final = 5e-3
#: Most sweeps of one walk.
_MOST: Final = 20_000
#: Precision at which a wish counts as proved impossible.
_REASON: Final = 1e-4
#: Room for rounding inside constraints, relative.
_ROUNDING: Final = 1e-12


def solve(
    problem: Problem,
    goal: Goal,
    *,
    start: FloatArray,
    tolerance: float = 1e-4,
    most: int = _MOST,
) -> Solution:
    """Return sizes within `tolerance` of the best, and the proof.

    Parameters
    ----------
    problem, goal : Problem and Goal
        What is sized, and to what end; some size can move.
    start : FloatArray, shape (n_sizes,)
        Where to begin, inside the box.
    tolerance : float
        Relative gap between answer and bound at which to stop.
    most : int
        Most sweeps of one walk; a gap up to 5e-3 is accepted then.

    Raises
    ------
    InfeasibleError
        If no sizes meet the limits and the goal.
    NoPathError
        If no path end can be reached.
    NotConvergedError
        If the gap stayed above both `tolerance` and 5e-3.
    """
    worst_delay(problem, start)
    refuse_hopeless(problem, goal)
    job = _Job(problem, goal, inside_limits(problem, start), tolerance, most)
    return job.run()


def inside_limits(problem: Problem, start: FloatArray) -> FloatArray:
    """Return sizes near `start` that leave every limit some slack.

    Raises
    ------
    LimitOutOfReachError
        If there are none.
    """
    if problem.limit_sums(start).max(initial=0.0) <= 1.0 - _LITTLE:
        return start
    limits = limits_as_paths(problem)
    job = _Job(limits, Fastest(), start, _REASON, _MOST)
    walk = Walk(setup=job.base, best=Best(), tolerance=_REASON, most=_MOST)
    unit = job.reduced.time
    fits = (1.0 - _PLENTY) / unit
    walk.run(job.first(walk.setup), lambda _, best: best.objective < fits or best.gap < _REASON)
    assert walk.best.y is not None
    sizes = job.reduced.sizes(walk.best.y)
    worst = float(problem.limit_sums(sizes).max())
    if worst < 1.0 - _ROUNDING:
        return sizes
    if walk.best.bound * unit > 1.0 and walk.best.proof is not None:
        _, _, end = job.reduced.flows(walk.best.proof.flow)
        raise LimitOutOfReachError(int(end.argmax()), worst)
    raise _not_converged(worst - walk.best.bound * unit)


@dataclass
class _Job:
    """One question, from sizes that keep the limits with some slack."""

    problem: Problem
    goal: Goal
    start: FloatArray
    tolerance: float
    most: int

    def __post_init__(self) -> None:
        self.base = Setup.of(self.problem, self.start)
        self.reduced = self.base.reduced
        self.y = self.reduced.log_sizes(self.start)
        self.steps = 0

    def first(self, setup: Setup, cost: float = 0.0) -> Point:
        """Return the first point of a walk that is not about cost."""
        warm = Weights(temperature=_FIRST, goal=_FIRST, limit=_FIRST, cost=cost)
        point = Point(setup, warm, self.y)
        return point.at(self.y, balanced(point, _FIRST, max(point.spread, _FIRST), cost))

    def run(self) -> Solution:
        """Answer the question."""
        match self.goal:
            case Cheapest(delay):
                return self._cheapest(delay)
            case Budget(spend):
                budget = (spend / self.reduced.money) * (1.0 - _ROUNDING)
                self.y = self._inside_budget(budget, spend)
                return self._answer(self.base.asking(Question(budget=budget)))
            case _:
                return self._answer(self.base)

    def _answer(self, setup: Setup) -> Solution:
        """Walk to the end and return what was found."""
        walk = self._walk(setup)
        walk.run(self.first(setup), self._closed)
        return self._proven(walk)

    def _closed(self, _: Point, best: Best) -> bool:
        return best.gap <= self.tolerance

    def _proven(self, walk: Walk) -> Solution:
        """Return what a walk found, if it is good enough."""
        self.steps += walk.steps
        if walk.best.gap > max(self.tolerance, ACCEPTED_GAP):
            raise _not_converged(walk.best.gap)
        return self._solution(walk.best)

    def _walk(self, setup: Setup) -> Walk:
        return Walk(setup=setup, best=Best(), tolerance=self.tolerance, most=self.most)

    def _cheapest(self, delay: float) -> Solution:
        r = self.reduced
        deadline = (delay - r.origin) / r.time
        deadline -= _ROUNDING * abs(deadline)
        walk = self._walk(self.base.asking(Question(deadline=deadline)))
        plain = Point(walk.setup, Weights(temperature=_FIRST, goal=0.0, limit=0.0), self.y)
        walk.best.offer(plain)
        cost = _COST_COUNTS * plain.longest / plain.cost
        point = self.first(self.base, cost)
        while walk.work < self.most and walk.best.gap > self.tolerance:
            inside = self._inside_deadline(point, deadline, delay)
            last = walk.run(_about_cost(inside, walk.setup), self._closed)
            weights = replace(inside.weights, temperature=last.weights.temperature)
            point = Point(point.setup, weights, last.y)
        return self._proven(walk)

    def _inside_deadline(self, point: Point, deadline: float, delay: float) -> Point:
        """Return a minimum for some price of cost that keeps a deadline but for its softness.

        Prices fall until one does; where the first does they rise until one does not.
        """
        best, inside = Best(), None
        for trial in range(_PRICES):
            point = lowered([State(point=point, prices=point.prices, damping=0.1)], _STEPS).point
            best.prove(point, self.tolerance)
            best.offer(point)
            if best.bound > deadline:
                fastest = replace(self, goal=Fastest()).run()
                raise DelayOutOfReachError(delay, fastest.delay)
            keeps = point.longest < deadline
            inside = point if keeps else inside
            if inside is not None and (not keeps or trial >= _DEARER):
                return inside
            weights = point.weights
            if keeps:
                weights = replace(weights, cost=weights.cost * _RISES)
            else:
                weights = weights.times(_COOLER)
            point = point.at(point.y, weights)
        raise _not_converged(best.gap)

    def _inside_budget(self, budget: float, spend: float) -> FloatArray:
        """Return log sizes that keep a budget with some slack."""
        setup = self.base
        none = Weights(temperature=_FIRST, goal=0.0, limit=0.0, cost=0.0)

        def inside(y: FloatArray, least: float) -> bool:
            point = Point(setup, none, y)
            kept = bool((point.limit_slack > 0.0).all())
            return kept and point.cost <= budget - _FREE * max(budget - least, 0.0)

        low = self.reduced.lower
        least = Point(setup, none, low).cost
        if least < budget and inside(low, least):
            for part in (0.0, 0.25, 0.5, 0.75, 0.875, 0.95, 1.0):
                y = self.y + part * (low - self.y)
                if inside(y, least):
                    return y
        return self._cheapest_at_all(budget, spend)

    def _cheapest_at_all(self, budget: float, spend: float) -> FloatArray:
        """Return log sizes inside the limits that cost less than a budget."""
        longest = Point(
            self.base,
            Weights(temperature=_FIRST, goal=0.0, limit=0.0, cost=0.0),
            self.reduced.upper,
        ).longest
        setup = self.base.asking(Question(deadline=100.0 * max(longest, 1.0)))
        walk = self._walk(setup)
        point = Point(
            setup, Weights(temperature=_FIRST, goal=_FIRST, limit=_FIRST, cost=0.0), self.y
        )
        point = point.at(self.y, balanced(point, _FIRST, _FIRST, 0.0))

        def enough(at: Point, best: Best) -> bool:
            return at.cost < budget or best.gap < _REASON

        last = walk.run(point, enough)
        if last.cost < budget:
            return last.y
        if walk.best.bound > budget:
            raise BudgetTooSmallError(spend, walk.best.objective * self.reduced.money)
        raise _not_converged(walk.best.gap)

    def _solution(self, best: Best) -> Solution:
        """Return the best sizes with their proof, in the units of the problem."""
        q, r = self.problem, self.reduced
        assert best.y is not None
        assert best.proof is not None
        sizes, at = r.sizes(best.y), r.sizes(best.proof.y)
        prices = self._prices(best.proof)
        delay, spend = worst_delay(q, sizes), q.cost(sizes)
        cheapest = isinstance(self.goal, Cheapest)
        reached = spend if cheapest else delay
        bound = min(lower_bound(q, self.goal, at, prices), reached)
        length = 0.0 if cheapest else float(prices.flow @ q.arc_delays(sizes))
        return Solution(
            sizes=sizes,
            delay=delay,
            spend=spend,
            bound=bound,
            gap=relative_gap(reached, bound, length),
            flow=prices.flow,
            end_flow=prices.end_flow,
            limit_prices=prices.limit_prices,
            spend_price=prices.spend_price,
            arrivals=arrivals(q, sizes),
            bound_sizes=at,
            iterations=self.steps,
        )

    def _prices(self, proof: Bound) -> Prices:
        """Return a proof's flow and prices in the units of the problem."""
        r, prices = self.reduced, proof.prices
        flow, start_flow, end_flow = r.flows(proof.flow)
        limit = np.zeros(self.problem.limits)
        unit, price = r.time, prices.goal * r.time / r.money
        if isinstance(self.goal, Cheapest):
            unit, price = r.time / prices.goal, r.time / (r.money * prices.goal)
        limit[r.limit] = prices.limit * unit
        return Prices(
            flow=flow,
            start_flow=start_flow,
            end_flow=end_flow,
            limit_prices=limit,
            spend_price=price,
        )


def _about_cost(point: Point, setup: Setup) -> Point:
    """Return a minimum of delay and priced cost as one of cost with a deadline."""
    weights, epsilon = point.weights, point.weights.cost
    assert setup.question.deadline is not None
    grace = point.soft.worst - point.longest
    slack = setup.question.deadline - point.longest
    same = Weights(
        temperature=weights.temperature,
        goal=slack / epsilon,
        limit=weights.limit / epsilon,
        grace=grace,
    )
    return Point(setup, same, point.y)


def _not_converged(gap: float) -> NotConvergedError:
    return NotConvergedError(
        f"the sizing came no closer than {gap:.1e} to a proven optimum", code="not-converged"
    )
