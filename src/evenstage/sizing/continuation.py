"""From a warm block to the optimum: the temperature falls, and every stop yields an answer.

At each temperature the smooth function of :mod:`evenstage.sizing.lagrangian` is minimised until its
inexactness costs no more than its softness. Then

1. the flow and prices there give a lower bound of the objective;
2. the tangent of the path of minima, ``dy / dlog T = -H^-1 dg / dlog T``, points to where they go
   as T vanishes. Sizes part of the way along it are timed plainly and kept if they are the best
   that keep every constraint: they are worth a temperature two to four times as low;
3. the temperature and the barriers fall together, less where the last step took long, and the next
   minimisation begins where the tangent says.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.progress import tell_gap
from evenstage.sizing.hessian import Hessian
from evenstage.sizing.lagrangian import Weights
from evenstage.sizing.narrowing import lowered, part_of
from evenstage.sizing.newton import State, direction, is_enough
from evenstage.sizing.tangent import best_bound

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.sizing.lagrangian import Point
    from evenstage.sizing.narrowing import Part
    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.setup import Setup
    from evenstage.sizing.tangent import Bound

#: Part by which it falls at first, and the range this is adapted in.
_FALLS, _FASTEST_FALL, _SLOWEST_FALL = 0.35, 0.2, 0.6
#: Newton steps at one temperature below which it may fall faster, and above which slower.
_FEW, _MANY = 3, 8
#: Newton steps at one temperature at most.
_MOST_STEPS: Final = 40
#: How often this is done at one temperature for a minimum that is hard to reach.
_ROUNDS: Final = 5
#: Parts of the tangent along which sizes are tried.
_TRIED: Final = (0.5, 0.9)
#: A tangent changes no size by more than this in the logarithm.
_LONGEST: Final = 1.5
#: Share of the softness that the barriers of limits and of the goal may cost each.
_BARRIER: Final = 0.5
#: Secant steps along it to a deadline, what part of the last miss they aim inside, and how far.
_SECANTS, _INSIDE, _FARTHEST = 4, 1e-2, 2.0
#: Parts of the way to the fastest sizes tried in turn to get inside a deadline.
_TOWARDS: Final = (0.003, 0.01, 0.03, 0.1, 0.3, 1.0)
#: Factor of the deadline's price within which it counts as settled, so that T may fall.
_SETTLED: Final = 2.0
#: Damping to begin with.
_FIRST_DAMPING: Final = 0.1
#: Rounding ends the path at this temperature.
_LEAST: Final = 1e-10


@dataclass(kw_only=True)
class Best:
    """The best answer and the best bound so far.

    Parameters
    ----------
    y : FloatArray, shape (n,), optional
        Log sizes that keep all constraints.
    objective : float
        Theirs.
    proof : Bound, optional
        The highest lower bound.
    fast : FloatArray, shape (n,), optional
        Log sizes of the least worst delay met, and that delay.
    """

    y: FloatArray | None = None
    objective: float = np.inf
    proof: Bound | None = None
    fast: FloatArray | None = None
    least: float = np.inf

    @property
    def bound(self) -> float:
        """The highest lower bound; minus infinity before there is any."""
        return -np.inf if self.proof is None else self.proof.value

    @property
    def gap(self) -> float:
        """Relative distance of objective and bound."""
        if self.y is None or self.proof is None:
            return np.inf
        return max(self.objective - self.bound, 0.0) / max(abs(self.objective), 1e-12)

    def offer(self, point: Point) -> None:
        """Keep a point if it keeps the constraints and is better, or if it is faster."""
        if point.longest < self.least and (point.limit_slack > 0.0).all():
            self.fast, self.least = point.y, point.longest
        if point.keeps and point.objective < self.objective:
            self.y, self.objective = point.y, point.objective

    def prove(self, point: Point, tolerance: float, part: Part | None = None) -> None:
        """Keep the bound of a point if it is higher.

        Parameters
        ----------
        point : Point
        tolerance : float
            The relative gap wanted.
        part : Part, optional
            Of the point.
        """
        found = best_bound(point, tolerance * abs(point.objective), part)
        if found.value > self.bound:
            self.proof = found


@dataclass(kw_only=True)
class Walk:
    """A walk along the path of minima.

    Parameters
    ----------
    setup : Setup
    best : Best
        What is known already.
    tolerance : float
        Relative gap wanted.
    most : int
        Most sweeps.
    steps, work : int
        Newton steps and sweeps so far.
    """

    setup: Setup
    best: Best
    tolerance: float
    most: int
    steps: int = 0
    work: int = 0

    def run(self, point: Point, enough: Callable[[Point, Best], bool]) -> Point:
        """Walk from a point inside all constraints until the best or a minimum is good enough.

        Parameters
        ----------
        point : Point
            With the weights to begin with.
        enough : callable
            Tells from a minimum and the best whether to end.

        Returns
        -------
        Point
            The last minimum.
        """
        # Points of large blocks are large. They are handed on, lest one that has been left stays.
        held = [State(point=point, prices=point.prices, damping=_FIRST_DAMPING)]
        falls, price, rounds = _FALLS, np.inf, 0
        self.best.offer(point)
        del point
        while True:
            state = lowered(held, _MOST_STEPS)
            point, before = state.point, price
            price = point.prices.goal
            self.best.offer(point)
            part = part_of(point)
            self.best.prove(point, self.tolerance, part)
            tell_gap(self.best.gap)
            tangent, work = _tangent(state, part)
            work += self._try_along(point, tangent)
            steps = state.steps
            self.steps += steps
            self.work += state.work + work
            exhausted = self.work >= self.most or point.weights.temperature < _LEAST
            if enough(point, self.best) or exhausted:
                return point
            state = replace(state, steps=0, work=0)
            rounds = 0 if is_enough(point) else rounds + 1
            if 0 < rounds < _ROUNDS:
                held.append(state)
                del state, point, part, tangent
                continue
            falls = _adapted(falls, steps)
            idle = price * point.spread < self.tolerance * point.objective
            settled = point.question.deadline is None or idle or price > before / _SETTLED
            held.append(self._cooler(state, tangent, falls, settled=settled))
            if not held[0].point.inside:
                return point
            del state, point, part, tangent

    def _try_along(self, point: Point, tangent: FloatArray) -> int:
        """Offer sizes along the tangent, up to where they miss a deadline; return the work."""
        r, deadline = self.setup.reduced, self.setup.question.deadline
        parts, excess = [0.0], [point.longest - (deadline or 0.0)]
        for part in _TRIED:
            there = point.at(np.clip(point.y + part * tangent, r.lower, r.upper))
            self.best.offer(there)
            parts.append(part)
            excess.append(there.longest - (deadline or 0.0))
        if deadline is None:
            return len(_TRIED)
        for trial in range(_SECANTS):
            rise = excess[-1] - excess[-2]
            if rise == 0.0 or parts[-1] == parts[-2]:
                return len(_TRIED) + trial
            # A little inside, so that the last step does not miss by rounding.
            aim = -_INSIDE * abs(excess[-1])
            part = parts[-1] + (aim - excess[-1]) * (parts[-1] - parts[-2]) / rise
            part = min(max(part, 0.0), _FARTHEST)
            there = point.at(np.clip(point.y + part * tangent, r.lower, r.upper))
            self.best.offer(there)
            parts.append(part)
            excess.append(there.longest - deadline)
        return len(_TRIED) + _SECANTS

    def _cooler(self, state: State, tangent: FloatArray, falls: float, *, settled: bool) -> State:
        """Return the first state at the next temperature; outside where there is none inside."""
        point, r = state.point, self.setup.reduced
        weights = _next_weights(point, falls)
        if not settled:
            weights = replace(point.weights, goal=falls * point.weights.goal)
        y = np.clip(point.y + (1.0 - falls) * tangent, r.lower, r.upper)
        stays, ahead = point.at(point.y, weights), point.at(y, weights)
        found = ahead if ahead.value < stays.value else stays
        if not found.inside:
            found = self._brought_inside(found)
        return State(point=found, prices=found.prices, damping=state.damping)

    def _brought_inside(self, point: Point) -> Point:
        """Return a point on the way to the fastest known, inside all constraints if there is one.

        All constraints are convex: if the far end is inside, some way towards it is enough.
        """
        fast = self.best.fast
        if fast is None:
            return point
        for part in _TOWARDS:
            found = point.at((1.0 - part) * point.y + part * fast)
            if found.inside:
                return found
        return found


def _tangent(state: State, part: Part | None) -> tuple[FloatArray, int]:
    """Return how sizes move as the temperature falls, per unit of its logarithm, and the work."""
    if part is not None:
        tangent, work = _tangent(part.state(state), None)
        return part.spread(tangent, np.zeros(len(state.point.y))), work
    hessian = Hessian(state.point, state.prices)
    tangent, work = direction(state, hessian.cooling(), damped=False)
    return np.clip(tangent, -_LONGEST, _LONGEST), work


def _next_weights(point: Point, falls: float) -> Weights:
    """Return lower weights: each barrier costs a fixed share of what the softness will."""
    temperature = falls * point.weights.temperature
    delay, _ = point.factors(point.prices.goal)
    spread = max(falls * point.spread, temperature)
    weights = balanced(point, temperature, delay * spread, falls * point.weights.cost)
    if point.question.deadline is None:
        return weights
    grace = falls * (point.soft.worst - point.longest)
    return replace(weights, grace=grace, goal=max(weights.goal, _FASTEST_FALL * point.weights.goal))


def balanced(point: Point, temperature: float, softness: float, cost: float) -> Weights:
    """Return weights whose barriers cost a fixed share of the softness, in the objective's unit."""
    limits = int(np.count_nonzero(point.near))
    return Weights(
        temperature=temperature,
        goal=_BARRIER * softness,
        limit=_BARRIER * softness / max(limits, 1),
        cost=cost,
    )


def _adapted(falls: float, steps: int) -> float:
    """Return by what part the temperature falls next."""
    if steps <= _FEW:
        return max(falls * 0.8, _FASTEST_FALL)
    if steps > _MANY:
        return min(falls * 1.3, _SLOWEST_FALL)
    return falls
