"""What the optimiser minimises at one temperature.

With the soft worst delay ``D_T`` of :mod:`evenstage.sizing.softmax`, the cost W and limits
``l_k <= 1``, all convex in the log sizes y, each question becomes the smooth convex function

    fastest    D_T(y) + epsilon W                            - sum theta_k log(1 - l_k)
    budget A   D_T(y) + epsilon W - theta log(A - W)         - sum theta_k log(1 - l_k)
    cheapest   W(y) - theta log(delay + grace - D_T(y))      - sum theta_k log(1 - l_k)

The price epsilon, the grace and all barrier weights theta fall with T, so that the minimum over the
box tends to the optimum. Of sizes that matter to no delay the small ones win. The grace makes up
for softness: D_T is above the worst delay by about as much, and without it sizes would have to be
much faster than asked while T is high.

Where the gradient vanishes, ``theta / s`` is the price of a constraint with slack s, and the soft
flow times the price of delay is the multiplier of each arc.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.setup import Setup
    from evenstage.sizing.softmax import Soft
    from evenstage.sizing.sums import SumsAt


#: Slack below which a limit counts as near.
_NEAR: Final = 0.5


@dataclass(frozen=True, kw_only=True)
class Weights:
    """Temperature and barriers.

    Parameters
    ----------
    temperature : float
    goal, limit : float
        theta of the goal's constraint and of each limit.
    cost : float
        epsilon; nothing to the cheapest.
    grace : float
        By how much the soft worst delay may exceed a deadline.
    """

    temperature: float
    goal: float
    limit: float
    cost: float = 0.0
    grace: float = 0.0

    def times(self, factor: float) -> Weights:
        """Return all of them, multiplied."""
        return Weights(
            temperature=self.temperature * factor,
            goal=self.goal * factor,
            limit=self.limit * factor,
            cost=self.cost * factor,
            grace=self.grace * factor,
        )


class Point:
    """Everything at some log sizes.

    Parameters
    ----------
    setup : Setup
    weights : Weights
    y : FloatArray, shape (n,)
    sums : SumsAt, optional
        The sums there, where they are known.
    """

    def __init__(
        self, setup: Setup, weights: Weights, y: FloatArray, sums: SumsAt | None = None
    ) -> None:
        self.setup, self.weights, self.y = setup, weights, y
        self.reduced, self.question = setup.reduced, setup.question
        reduced = self.reduced
        self.sums = reduced.sums.at(y) if sums is None else sums
        self.delay = self.sums.values[: reduced.arcs]
        self.limit_slack: FloatArray = 1.0 - self.sums.values[reduced.arcs :]
        self.bill: FloatArray = reduced.spend * self.sums.x
        self.cost = float(self.bill.sum()) + reduced.spend_held

    @cached_property
    def soft(self) -> Soft:
        """Soft arrivals."""
        return self.setup.sweeps.soft(self.delay, self.weights.temperature)

    @cached_property
    def longest(self) -> float:
        """The worst delay."""
        return self.setup.sweeps.longest(self.delay)

    @cached_property
    def goal_slack(self) -> float:
        """Slack of the goal's constraint; 1 without one."""
        if self.question.deadline is not None:
            return self.question.deadline + self.weights.grace - self.soft.worst
        if self.question.budget is not None:
            return self.question.budget - self.cost
        return 1.0

    @cached_property
    def inside(self) -> bool:
        """Whether every constraint has slack."""
        return bool((self.limit_slack > 0.0).all()) and self.goal_slack > 0.0

    @cached_property
    def value(self) -> float:
        """The function minimised; infinite outside the constraints."""
        if not self.inside:
            return np.inf
        value = self.cost
        if self.question.deadline is None:
            value = self.soft.worst + self.weights.cost * self.cost
        if self.question.constrained:
            value -= self.weights.goal * float(np.log(self.goal_slack))
        return value - self.weights.limit * float(np.log(self.limit_slack).sum())

    @property
    def objective(self) -> float:
        """What the goal wants small, by plain timing."""
        return self.cost if self.question.deadline is not None else self.longest

    @property
    def keeps(self) -> bool:
        """Whether all constraints are kept by plain timing."""
        if not (self.limit_slack >= 0.0).all():
            return False
        if self.question.deadline is not None:
            return self.longest <= self.question.deadline
        return self.question.budget is None or self.cost <= self.question.budget

    @cached_property
    def prices(self) -> Prices:
        """Prices that the barriers imply."""
        goal = self.weights.goal / self.goal_slack if self.question.constrained else 0.0
        return Prices(goal=goal, limit=self.weights.limit / self.limit_slack)

    def factors(self, goal: float) -> tuple[float, float]:
        """Return the weights of delay and cost in the Lagrangian for a price of the goal."""
        if self.question.deadline is not None:
            return goal, 1.0
        return 1.0, goal + self.weights.cost

    def rows(self, delay: float, limit: FloatArray) -> FloatArray:
        """Return row weights: the flow times `delay`, then those of limits."""
        return np.concatenate([delay * self.soft.flow, limit])

    @cached_property
    def delay_gradient(self) -> FloatArray:
        """Gradient of the soft worst delay, shape (n,)."""
        none = np.zeros(len(self.limit_slack))
        return self.sums.gradient(self.sums.weights(self.rows(1.0, none)))

    @cached_property
    def gradient(self) -> FloatArray:
        """Gradient of the function minimised, shape (n,)."""
        delay, cost = self.factors(self.prices.goal)
        gradient = delay * self.delay_gradient + cost * self.bill
        if len(self.prices.limit):
            rows = np.concatenate([np.zeros(self.reduced.arcs), self.prices.limit])
            gradient = gradient + self.sums.gradient(self.sums.weights(rows))
        return gradient

    @cached_property
    def spread(self) -> float:
        """How far the soft worst delay is above the flow's mean: T times the entropy."""
        return max(self.soft.worst - float(self.soft.flow @ self.delay), 0.0)

    @cached_property
    def near(self) -> NDArray[np.bool_]:
        """Tell which limits are near enough to count, shape (m,)."""
        near: NDArray[np.bool_] = self.limit_slack < _NEAR
        return near

    @property
    def proof_prices(self) -> Prices:
        """Prices for a bound: limits far from binding have none."""
        return Prices(goal=self.prices.goal, limit=np.where(self.near, self.prices.limit, 0.0))

    @property
    def softness(self) -> float:
        """What softness and barriers cost in the gap, in the objective's unit."""
        delay, _ = self.factors(self.prices.goal)
        barriers = self.weights.limit * np.count_nonzero(self.near)
        if self.question.constrained:
            barriers += self.weights.goal
        return delay * self.spread + barriers

    def reach(self, gradient: FloatArray) -> float:
        """Return how much lower the tangent gets anywhere in the box."""
        r = self.reduced
        return float(np.maximum(gradient * (self.y - r.lower), gradient * (self.y - r.upper)).sum())

    def at(self, y: FloatArray, weights: Weights | None = None) -> Point:
        """Return the point at other log sizes."""
        sums = self.sums if y is self.y else None
        return Point(self.setup, weights or self.weights, y, sums)


@dataclass(frozen=True, kw_only=True)
class Prices:
    """Multipliers in the units of a reduced problem: of the goal's constraint and of limits."""

    goal: float
    limit: FloatArray
