"""The exact optimiser: interior point in log sizes, arrivals and worst delay, with proof.

Each point of the central path yields two things: sizes, timed plainly, of which the best that keep
all limits are kept; and multipliers, from which an exact unit flow and its lower bound are built
(:mod:`evenstage.sizing.bound`). The search ends when the two are close enough, whatever the
interior point thinks of itself.

Ties. Sizes on which neither the limiting paths nor limits nor spend depend have no best value. They
are put back towards `start` as far as the objective stays the same.
"""

from __future__ import annotations

from dataclasses import replace
from itertools import islice
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import NotConvergedError
from evenstage.sizing.bound import lower_bound
from evenstage.sizing.central_path import central_path
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.infeasible import (
    BudgetTooSmallError,
    DelayOutOfReachError,
    LimitOutOfReachError,
)
from evenstage.sizing.problem import Problem, arrivals, totals, worst_delay
from evenstage.sizing.solution import Solution, relative_gap
from evenstage.sizing.translation import Translation

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

    from evenstage.sizing.bound import Prices
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray

__all__ = ["Solution", "solve"]

#: A gap that is still an answer when rounding or the iteration limit ends the search.
_ACCEPTED_GAP: Final = 1e-4
#: The central path aims below the tolerance, because the certified gap also counts rounding.
_PATH_PRECISION: Final = 0.01
#: Steps without a gap half as wide after which a search with an acceptable gap ends.
_PATIENCE: Final = 15
#: Parts of the way back to known good sizes that are tried when rounding has broken a limit.
_RETREATS: Final = (1e-12, 1e-10, 1e-8, 1e-6, 1e-4, 1e-2)
#: Relative nearness at which a size is taken to be on its bound.
_ON_BOUND: Final = 1e-6
#: A size matters if its terms in the Lagrangian exceed this part of the longest path.
_MATTERS: Final = 1e-7
#: A delay asked for counts as met with ease if it is missed by this part; then no search for faster
#: sizes is needed before the search for cheaper ones.
_EASE: Final = 1e-3
#: Room above the smallest sizes that the path needs inside a budget, relative.
_ROOM: Final = 1e-8


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
        Relative gap between answer and bound at which to stop.
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
    _refuse_hopeless_limits(problem)
    _refuse_hopeless_budget(problem, goal)
    from_where = begin
    if isinstance(goal, Cheapest) and not _keeps(problem, goal, begin):
        from_where = _fast_enough(problem, goal, begin, tolerance, iterations)
    search = _Search(problem, goal, from_where)
    search.run(tolerance, iterations)
    if search.gap > max(tolerance, _ACCEPTED_GAP):
        _explain(problem, goal)
        raise NotConvergedError(
            f"the sizing came no closer than {search.gap:.1e} to a proven optimum",
            code="not-converged",
        )
    return search.solution(begin, tolerance)


class _Search:
    """One walk along the central path and the best of what it met."""

    def __init__(self, problem: Problem, goal: Goal, start: FloatArray) -> None:
        self.problem, self.goal = problem, goal
        self.translation = Translation(problem, _with_room(problem, goal), start)
        self.best: FloatArray | None = None
        self.prices: Prices | None = None
        self.iterations = 0
        for sizes in (start, problem.lower):
            self._try(sizes)

    def run(self, tolerance: float, iterations: int, enough: float = -np.inf) -> None:
        """Walk until the gap is closed, closes no more, or the objective is good `enough`."""
        shape = self.translation
        anchor = np.log(shape.start[shape.free])
        precision = _PATH_PRECISION * tolerance
        path = central_path(shape.programme, shape.first(), anchor, precision)
        lowest, since = np.inf, 0
        for point in islice(path, iterations):
            self.iterations += 1
            self._try(shape.sizes(point.z))
            self._price(shape.prices(point.price), shape.sizes(point.z))
            gap = self.gap
            lowest, since = (gap, 0) if gap < 0.5 * lowest else (lowest, since + 1)
            if gap <= tolerance or self.objective <= enough:
                return
            if since > _PATIENCE and lowest <= _ACCEPTED_GAP:
                return

    def _price(self, prices: Prices, sizes: FloatArray) -> None:
        """Keep prices if they give the better bound; it is measured where the best sizes are."""
        here = sizes if self.best is None else self.best
        old = self.prices
        if old is None or self._bound(here, prices) >= self._bound(here, old):
            self.prices = prices

    def _bound(self, sizes: FloatArray, prices: Prices) -> float:
        return lower_bound(self.problem, self.goal, sizes, prices)

    @property
    def objective(self) -> float:
        """The best objective so far; infinite before any sizes kept all limits."""
        return np.inf if self.best is None else _objective(self.problem, self.goal, self.best)

    @property
    def gap(self) -> float:
        """The relative gap so far."""
        if self.best is None or self.prices is None:
            return np.inf
        bound = self._bound(self.best, self.prices)
        return _gap(self.problem, self.goal, self.best, bound)

    def _try(self, sizes: FloatArray) -> None:
        """Keep sizes if they, or sizes close by, beat the best so far."""
        best = self.objective
        for candidate in self._nearby(sizes):
            if _keeps(self.problem, self.goal, candidate):
                if _objective(self.problem, self.goal, candidate) < best:
                    self.best = candidate
                return

    def _nearby(self, sizes: FloatArray) -> list[FloatArray]:
        """Return sizes, and sizes that keep limits better: constraints are convex in log sizes."""
        if self.best is None:
            return [sizes]
        back = np.log(self.best / sizes)
        return [sizes, *(sizes * np.exp(part * back) for part in _RETREATS)]

    def solution(self, start: FloatArray, tolerance: float) -> Solution:
        """Return the best sizes, tidied, with their proof."""
        q, goal = self.problem, self.goal
        assert self.best is not None
        assert self.prices is not None
        sizes = self._tidied(self.best, self.prices, start, tolerance)
        bound = min(lower_bound(q, goal, sizes, self.prices), _objective(q, goal, sizes))
        return Solution(
            sizes=sizes,
            delay=worst_delay(q, sizes),
            spend=q.cost(sizes),
            bound=bound,
            gap=_gap(q, goal, sizes, bound),
            flow=self.prices.flow,
            end_flow=self.prices.end_flow,
            limit_prices=self.prices.limit_prices,
            spend_price=self.prices.spend_price,
            iterations=self.iterations,
        )

    def _tidied(
        self, sizes: FloatArray, prices: Prices, start: FloatArray, tolerance: float
    ) -> FloatArray:
        """Put sizes on bounds they have all but reached, and those that do not matter back."""
        q, goal = self.problem, self.goal
        allowed = max(tolerance, self.gap)
        idle = ~_matter(q, sizes, prices)
        back = np.where(idle, np.log(start / sizes), 0.0)
        trials = [sizes * np.exp(part * back) for part in (1.0, 0.5, 0.25, 0.125, 0.0)]
        for trial in trials:
            for candidate in (_snapped(q, trial, _ON_BOUND), trial):
                inside = np.clip(candidate, q.lower, q.upper)
                bound = lower_bound(q, goal, inside, prices)
                if _keeps(q, goal, inside) and _gap(q, goal, inside, bound) <= allowed:
                    return inside
        return sizes


def _objective(problem: Problem, goal: Goal, sizes: FloatArray) -> float:
    """Return what the goal wants small."""
    return problem.cost(sizes) if isinstance(goal, Cheapest) else worst_delay(problem, sizes)


def _gap(problem: Problem, goal: Goal, sizes: FloatArray, bound: float) -> float:
    """Return the relative distance of sizes from a bound."""
    if isinstance(goal, Cheapest):
        return relative_gap(problem.cost(sizes), bound, 0.0)
    length = float(arrivals(problem, sizes).max() - problem.start_arrival.min())
    return relative_gap(worst_delay(problem, sizes), bound, length)


def _keeps(problem: Problem, goal: Goal, sizes: FloatArray) -> bool:
    """Tell whether sizes keep all limits, the goal's own included."""
    if problem.limit_sums(sizes).max(initial=0.0) > 1.0:
        return False
    match goal:
        case Cheapest(delay):
            return worst_delay(problem, sizes) <= delay
        case Budget(spend):
            return problem.cost(sizes) <= spend
        case _:
            return True


def _snapped(problem: Problem, sizes: FloatArray, near: float) -> FloatArray:
    """Return sizes with those that are near a bound put on it."""
    low = np.where(sizes <= problem.lower * (1.0 + near), problem.lower, sizes)
    return np.where(low >= problem.upper * (1.0 - near), problem.upper, low)


def _matter(problem: Problem, sizes: FloatArray, prices: Prices) -> NDArray[np.bool_]:
    """Tell which sizes have terms of any weight in the Lagrangian."""
    y, n = np.log(sizes), len(sizes)
    weight = prices.spend_price * problem.spend * sizes
    for terms, price in ((problem.delay, prices.flow), (problem.limit, prices.limit_prices)):
        part = price[terms.row] * terms.values(y)
        both = totals(terms.plus, part, n + 1) + totals(terms.minus, part, n + 1)
        weight = weight + both[:n]
    length = float(prices.flow @ problem.arc_delays(sizes))
    matter: NDArray[np.bool_] = weight > _MATTERS * length
    return matter


def _with_room(problem: Problem, goal: Goal) -> Goal:
    """Return the goal the path follows: a budget without any room needs a little."""
    if not isinstance(goal, Budget):
        return goal
    if not np.any(problem.spend[problem.lower < problem.upper]):
        return Fastest()
    moving = problem.lower < problem.upper
    least = float(problem.spend[moving] @ problem.lower[moving])
    return Budget(max(goal.spend, problem.cost(problem.lower) + _ROOM * least))


def _fast_enough(
    problem: Problem, goal: Cheapest, start: FloatArray, tolerance: float, iterations: int
) -> FloatArray:
    """Return sizes that meet the delay, or say how far out of reach it is."""
    search = _Search(problem, Fastest(), start)
    search.run(tolerance, iterations, enough=goal.delay - _EASE * abs(goal.delay))
    if search.best is None:
        _explain(problem, Fastest())
        raise NotConvergedError("no sizes were found that keep the limits", code="not-converged")
    if search.objective > goal.delay:
        raise DelayOutOfReachError(goal.delay, search.objective)
    return search.best


def _refuse_hopeless_limits(problem: Problem) -> None:
    """Raise if some limit cannot be kept even alone, each size where it suits it best."""
    low, high = np.append(problem.lower, 1.0), np.append(problem.upper, 1.0)
    terms = problem.limit
    ratio = np.where(terms.plus == terms.minus, 1.0, low[terms.plus] / high[terms.minus])
    least = totals(terms.row, terms.coefficient * ratio, problem.limits)
    if least.max(initial=0.0) > 1.0:
        raise LimitOutOfReachError(int(least.argmax()), float(least.max()))


def _refuse_hopeless_budget(problem: Problem, goal: Goal) -> None:
    """Raise if the smallest sizes already cost too much."""
    least = problem.cost(problem.lower)
    if isinstance(goal, Budget) and goal.spend < least:
        raise BudgetTooSmallError(goal.spend, least)


def _explain(problem: Problem, goal: Goal) -> None:
    """Raise the reason why a search found nothing, if limits or budget are the reason."""
    if not problem.limits:
        return
    limits = _limits_as_paths(problem)
    search = _Search(limits, Fastest(), np.sqrt(limits.lower * limits.upper))
    search.run(1e-6, 200, enough=1.0 - _EASE)
    if search.objective > 1.0 and search.prices is not None:
        blamed = int(search.prices.end_flow.argmax())
        raise LimitOutOfReachError(blamed, search.objective)
    if isinstance(goal, Budget):
        least = solve(limits, Cheapest(1.0), tolerance=1e-6).spend
        if least > goal.spend:
            raise BudgetTooSmallError(goal.spend, least)


def _limits_as_paths(problem: Problem) -> Problem:
    """Return a problem whose worst delay is the largest limit sum: one arc per limit."""
    count = problem.limits
    nothing = np.zeros(0, dtype=np.int32)
    empty = replace(
        problem.limit, row=nothing, coefficient=np.zeros(0), plus=nothing, minus=nothing
    )
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
        limit=empty,
        limits=0,
    )
