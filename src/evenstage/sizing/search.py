"""One walk along the central path, and the best of what it meets.

Each point yields two things: sizes, timed plainly, of which the best that keep all limits are kept;
and multipliers, from which an exact unit flow and its lower bound are built
(:mod:`evenstage.sizing.bound`). The walk ends when the two are close enough, whatever the interior
point thinks of itself.
"""

from __future__ import annotations

from itertools import islice
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.progress import tell_gap
from evenstage.sizing.bound import lower_bound
from evenstage.sizing.central_path import central_path
from evenstage.sizing.goals import Budget, Cheapest, Fastest
from evenstage.sizing.problem import arrivals, totals, worst_delay
from evenstage.sizing.solution import Solution, relative_gap
from evenstage.sizing.translation import Translation

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.bound import Prices
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem

#: A gap that is still an answer when rounding or the iteration limit ends the search.
ACCEPTED_GAP: Final = 1e-4
#: The path aims below the tolerance, because the certified gap also counts rounding.
_PATH_PRECISION: Final = 0.01
#: Steps without a gap half as wide after which a search with an acceptable gap ends.
_PATIENCE: Final = 10
#: Relative difference of objectives that may be rounding; then later sizes are the better ones.
_SAME: Final = 1e-12
#: Parts of the way back to known good sizes that are tried when rounding has broken a limit.
_RETREATS: Final = (1e-12, 1e-10, 1e-8, 1e-6, 1e-4, 1e-2)
#: Parts of the way from idle sizes back to where they began that are tried.
_RETURNS: Final = (1.0, 0.5, 0.25, 0.125, 0.0)
#: Relative precision that the path is always ready to go to, whatever gap is asked for.
_PATH_GOES_TO: Final = 1e-6
#: Relative nearness at which a size is taken to be on its bound.
_ON_BOUND: Final = 1e-6
#: A size matters if its terms in the Lagrangian exceed this part of the limiting paths.
_MATTERS: Final = 1e-7
#: Room above the smallest sizes that the path needs inside a budget, relative.
_ROOM: Final = 1e-8


class Search:
    """A walk for one goal from one start.

    Parameters
    ----------
    problem, goal : Problem and Goal
        What is sized, and to what end.
    start : FloatArray, shape (n_sizes,)
        Sizes inside the box.
    """

    def __init__(self, problem: Problem, goal: Goal, start: FloatArray) -> None:
        self.problem, self.goal = problem, goal
        self.translation = Translation(problem, _with_room(problem, goal), start)
        self.best: FloatArray | None = None
        self.objective = np.inf
        self.gap = np.inf
        self.proven: tuple[FloatArray, Prices] | None = None
        self.iterations = 0
        for sizes in (start, problem.lower):
            self._try(sizes)

    def run(self, tolerance: float, iterations: int, enough: float = -np.inf) -> None:
        """Walk until the gap is closed, closes no more, or the objective is good `enough`."""
        shape = self.translation
        anchor = np.log(shape.start[shape.free])
        # The path itself must not end before there are sizes that keep every limit.
        precision = _PATH_PRECISION * min(tolerance, _PATH_GOES_TO)
        path = central_path(shape.programme, shape.first(), anchor, precision)
        narrow, since = np.inf, 0
        for point in islice(path, iterations):
            self.iterations += 1
            self._try(shape.sizes(point.z))
            self._prove(shape.prices(point.price))
            tell_gap(self.gap)
            narrow, since = (self.gap, 0) if self.gap < 0.5 * narrow else (narrow, since + 1)
            # Half the tolerance: the other half is for tidying up.
            if self.gap <= 0.5 * tolerance or self.objective <= enough:
                return
            if since > _PATIENCE and self.gap <= ACCEPTED_GAP:
                return

    def _prove(self, prices: Prices) -> None:
        """Keep the best sizes together with prices if no pair before had a narrower gap.

        The gap is that of the bound measured at the sizes themselves, where the checker measures
        it: later sizes and earlier prices need not go together.
        """
        if self.best is None:
            return
        gap = self._gap(self.best, prices)
        if gap < self.gap:
            self.gap, self.proven = gap, (self.best, prices)

    def _gap(self, sizes: FloatArray, prices: Prices) -> float:
        """Return the gap of sizes, with the bound measured at those sizes."""
        bound = lower_bound(self.problem, self.goal, sizes, prices)
        unit = self._length(sizes, prices)
        return relative_gap(objective(self.problem, self.goal, sizes), bound, unit)

    def _length(self, sizes: FloatArray, prices: Prices) -> float:
        """Return the length of the limiting paths where that is what is minimised, else 0."""
        if isinstance(self.goal, Cheapest):
            return 0.0
        return float(prices.flow @ self.problem.arc_delays(sizes))

    def _try(self, sizes: FloatArray) -> None:
        """Keep sizes, or sizes close by, if they are as good as the best so far."""
        for candidate in self._nearby(sizes):
            if keeps(self.problem, self.goal, candidate):
                value = objective(self.problem, self.goal, candidate)
                if value <= self.objective + self._rounding():
                    self.best, self.objective = candidate, value
                return

    def _rounding(self) -> float:
        """Return a difference of objectives that means nothing."""
        if self.proven is None:
            return 0.0
        return _SAME * max(abs(self.objective), self._length(*self.proven))

    def _nearby(self, sizes: FloatArray) -> list[FloatArray]:
        """Return sizes, and sizes that keep limits better: constraints are convex in log sizes."""
        if self.best is None:
            return [sizes]
        back = np.log(self.best / sizes)
        return [sizes, *(sizes * np.exp(part * back) for part in _RETREATS)]

    def solution(self, start: FloatArray, tolerance: float) -> Solution:
        """Return the best sizes, tidied, with their proof.

        Parameters
        ----------
        start : FloatArray, shape (n_sizes,)
            Where sizes that do not matter go back to.
        tolerance : float
            Gap that tidying may bring about.
        """
        assert self.proven is not None
        q, goal, prices = self.problem, self.goal, self.proven[1]
        sizes = self._tidied(*self.proven, start, tolerance)
        bound = min(lower_bound(q, goal, sizes, prices), objective(q, goal, sizes))
        return Solution(
            sizes=sizes,
            delay=worst_delay(q, sizes),
            spend=q.cost(sizes),
            bound=bound,
            gap=self._gap(sizes, prices),
            flow=prices.flow,
            end_flow=prices.end_flow,
            limit_prices=prices.limit_prices,
            spend_price=prices.spend_price,
            arrivals=arrivals(q, sizes),
            bound_sizes=sizes,
            iterations=self.iterations,
        )

    def _tidied(
        self, sizes: FloatArray, prices: Prices, start: FloatArray, tolerance: float
    ) -> FloatArray:
        """Put sizes on bounds they have all but reached, and those that do not matter back."""
        q = self.problem
        allowed = max(tolerance, self.gap)
        idle = ~_matter(q, sizes, prices)
        back = np.where(idle, np.log(start / sizes), 0.0)
        for part in _RETURNS:
            trial = np.clip(sizes * np.exp(part * back), q.lower, q.upper)
            for candidate in (_snapped(q, trial), trial):
                good = keeps(q, self.goal, candidate)
                if good and self._gap(candidate, prices) <= allowed:
                    return candidate
        return sizes


def objective(problem: Problem, goal: Goal, sizes: FloatArray) -> float:
    """Return what the goal wants small: s, or spend for the cheapest."""
    return problem.cost(sizes) if isinstance(goal, Cheapest) else worst_delay(problem, sizes)


def keeps(problem: Problem, goal: Goal, sizes: FloatArray) -> bool:
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


def _with_room(problem: Problem, goal: Goal) -> Goal:
    """Return the goal the path follows: a budget without any room needs a little."""
    if not isinstance(goal, Budget):
        return goal
    moving = problem.lower < problem.upper
    least = float(problem.spend[moving] @ problem.lower[moving])
    if least == 0.0:
        return Fastest()
    return Budget(max(goal.spend, problem.cost(problem.lower) + _ROOM * least))


def _snapped(problem: Problem, sizes: FloatArray) -> FloatArray:
    """Return sizes with those that are all but on a bound put on it."""
    low = np.where(sizes <= problem.lower * (1.0 + _ON_BOUND), problem.lower, sizes)
    return np.where(low >= problem.upper * (1.0 - _ON_BOUND), problem.upper, low)


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
