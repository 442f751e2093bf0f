"""The best lower bound that one flow and its prices give.

At fixed flow and prices the Lagrangian is a sum of exponentials, convex in the log sizes, and its
tangent at *any* sizes of the box gives a bound (:mod:`evenstage.sizing.bound`). The nearer those
are to the Lagrangian's own minimum over the box, the better the bound: a few Newton steps towards
it are cheap, as they need no sweep over the graph.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.conjugate import conjugate_gradients
from evenstage.sizing.sums import Curvature

if TYPE_CHECKING:
    from evenstage.sizing.lagrangian import Point, Prices
    from evenstage.sizing.narrowing import Part
    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.reduced import Reduced

#: Newton steps, conjugate gradient iterations of each, and what they change sizes by at most.
_STEPS, _ITERATIONS, _LONGEST = 3, 15, 1.0
#: Steps are made where softness costs less than so many times what is wanted, and until the
#: tangent costs less than this part of it.
_WORTH, _LITTLE = 20.0, 0.05
#: Relative curvature below which a size counts as flat.
_FLAT = 1e-14


@dataclass(frozen=True, kw_only=True)
class Bound:
    """A lower bound of the objective.

    Parameters
    ----------
    value : float
    flow, prices : FloatArray, shape (arcs,), and Prices
        That give it.
    y : FloatArray, shape (n,)
        Log sizes at which it is measured.
    """

    value: float
    flow: FloatArray
    prices: Prices
    y: FloatArray


def best_bound(point: Point, wanted: float, part: Part | None = None) -> Bound:
    """Return the best bound found from a point's flow and prices.

    Parameters
    ----------
    point : Point
    wanted : float
        Distance of point and bound, in the objective's unit, that would be worth steps for.
    part : Part, optional
        What of the block the flow is on, where that is less than the whole: steps are made there.
    """
    reduced, question, prices = point.reduced, point.question, point.proof_prices
    delay, cost = (prices.goal, 1.0) if question.deadline is not None else (1.0, prices.goal)
    rows = point.rows(delay, prices.limit)
    u, still = point.sums.weights(rows), float(prices.limit.sum())
    still += delay * (question.deadline or 0.0) + cost * (question.budget or 0.0)
    lowering = _Lowering(reduced if part is None else part.setup.reduced, cost)
    y, flow = point.y, point.soft.flow
    best = Bound(value=-np.inf, flow=flow, prices=prices, y=y)
    steps = _STEPS if point.softness < _WORTH * wanted else 0
    for step in range(steps + 1):
        at = reduced.sums.at(y)
        bill = cost * reduced.spend * at.x
        value = float(rows @ at.values) + float(bill.sum()) + cost * reduced.spend_held - still
        gradient = at.gradient(u) + bill
        low, high = gradient * (y - reduced.lower), gradient * (y - reduced.upper)
        lost = float(np.maximum(low, high).sum())
        if value - lost > best.value:
            best = Bound(value=value - lost, flow=flow, prices=prices, y=y)
        if lost < _LITTLE * wanted:
            break
        if step < steps and part is None:
            y = lowering.after(y, rows)
        elif step < steps and part is not None:
            y = part.spread(lowering.after(y[part.sizes], rows[part.rows]), y)
    return best


@dataclass(frozen=True)
class _Lowering:
    """Newton steps towards the minimum of a Lagrangian at fixed flow and prices.

    Parameters
    ----------
    reduced : Reduced
    cost : float
        Weight of the cost.
    """

    reduced: Reduced
    cost: float

    def after(self, y: FloatArray, rows: FloatArray) -> FloatArray:
        """Return log sizes after a step, for given row weights."""
        lower, upper = self.reduced.lower, self.reduced.upper
        at = self.reduced.sums.at(y)
        u, bill = at.weights(rows), self.cost * self.reduced.spend * at.x
        gradient = at.gradient(u) + bill
        held = ((y <= lower) & (gradient > 0.0)) | ((y >= upper) & (gradient < 0.0))
        curvature = Curvature(at, u)
        diagonal = curvature.diagonal + bill
        scale = np.where(held, 0.0, 1.0 / np.maximum(diagonal, _FLAT * diagonal.max(initial=_FLAT)))

        def product(v: FloatArray) -> FloatArray:
            result = curvature.product(v, at.moved(v)) + bill * v
            return np.where(held, 0.0, result)

        step, _ = conjugate_gradients(
            product, lambda r: scale * r, np.where(held, 0.0, -gradient), most=_ITERATIONS
        )
        moved: FloatArray = y + np.clip(step, -_LONGEST, _LONGEST)
        return np.clip(moved, lower, upper)
