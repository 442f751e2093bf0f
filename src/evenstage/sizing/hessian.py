"""Newton's matrix of :mod:`evenstage.sizing.lagrangian` by its products and its diagonal.

With prices kappa and slacks s of the constraints c,

    H = w_D Hess D_T + w_W Hess W + sum kappa (Hess c + grad c grad c' / s)

Hess D_T is never formed: its product with v is ``J' dphi`` plus the delays' own curvature at flow
phi, where ``J v`` are the moved delays and dphi is the moved flow. Its diagonal is the variance,
over paths, of each size's derivative of the path's length, over T, plus that curvature.
"""

from __future__ import annotations

from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.sums import Curvature

if TYPE_CHECKING:
    from evenstage.sizing.lagrangian import Point, Prices
    from evenstage.sizing.problem import FloatArray


class Hessian:
    """Newton's matrix at a point.

    Parameters
    ----------
    point : Point
    prices : Prices
        kappa.
    """

    def __init__(self, point: Point, prices: Prices) -> None:
        self.point = point
        self.delay, self.cost = point.factors(prices.goal)
        self.stiff = prices.limit / point.limit_slack
        self.goal_stiff = prices.goal / point.goal_slack
        weights = point.sums.weights(point.rows(self.delay, prices.limit))
        self.curvature = Curvature(point.sums, weights)

    def product(self, v: FloatArray) -> FloatArray:
        """Return the matrix times v, shape (n,)."""
        point, arcs = self.point, self.point.reduced.arcs
        moved = point.sums.moved(v)
        rows = np.empty(len(moved.rows))
        rows[:arcs] = self.delay * point.soft.product(moved.rows[:arcs])
        rows[arcs:] = self.stiff * moved.rows[arcs:]
        result = self.curvature.product(v, moved, rows)
        if self.cost:
            result += self.cost * point.bill * v
        if self.goal_stiff:
            normal = self.normal
            result += (self.goal_stiff * float(normal @ v)) * normal
        return result

    @property
    def normal(self) -> FloatArray:
        """Gradient of the goal's constraint."""
        if self.point.question.deadline is not None:
            return self.point.delay_gradient
        return self.point.bill

    @cached_property
    def diagonal(self) -> FloatArray:
        """The diagonal of the matrix, nearly, the goal's own constraint apart, shape (n,).

        It would be exact but for sizes that a path meets again farther on.
        """
        point, sums = self.point, self.point.sums
        none = np.zeros(len(self.stiff))
        falling = sums.falling()
        variance = sums.squares(point.rows(1.0, none), falling)
        variance += point.setup.neighbours.cross(sums, point.soft, falling)
        variance -= point.delay_gradient**2
        diagonal = self.curvature.diagonal + self.cost * point.bill
        diagonal += self.delay * np.maximum(variance, 0.0) / point.weights.temperature
        if len(self.stiff):
            rows = np.concatenate([np.zeros(point.reduced.arcs), self.stiff])
            diagonal += sums.squares(rows, falling)
        return diagonal

    def cooling(self) -> FloatArray:
        """Return how the gradient changes as log T rises and all barriers with it, shape (n,)."""
        point = self.point
        prices = point.prices
        delay, cost = point.factors(prices.goal)
        rows = np.concatenate([-delay * point.soft.product(point.delay), prices.limit])
        change = point.sums.gradient(point.sums.weights(rows))
        if point.question.deadline is not None:
            gives = (point.spread - point.weights.grace) / point.goal_slack
            change += delay * (1.0 + gives) * point.delay_gradient
        else:
            change += cost * point.bill
        return change
