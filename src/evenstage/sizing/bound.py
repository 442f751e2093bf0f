"""A lower bound that any flow through the graph gives, however it was found.

=============  =====================================================================
symbol         meaning
=============  =====================================================================
``y``          logarithms of the sizes, in the box ``ylo <= y <= yhi``
``d_a(y)``     delay of arc a, convex in y
``phi_a``      flow on arc a; ``phi_s`` in at start s, ``phi_e`` out at end e, total 1
``kappa_k``    price of limit k, s, >= 0; ``l_k(y) <= 1`` the limit
``nu``         price of spend, s per unit, >= 0; ``W(y)`` the spend
=============  =====================================================================

A unit flow splits into paths with weights that add up to one, so the flow's mean of start arrival
``a``, delays and end offset ``o`` is at most the worst delay:

    D(y)  >=  sum phi_s a_s + sum phi_a d_a(y) + sum phi_e o_e

Hence for sizes that keep the limits, with ``L(y)`` the right side plus
``sum kappa_k (l_k(y) - 1)``,

    D(y) + nu W(y)  >=  L(y) + nu W(y)  =: G(y)

G is a sum of exponentials of linear functions, hence convex: it lies above its tangent at any
``y0``, and a linear function is least at a corner of the box. With ``g`` the gradient of G at y0,

    G(y) >= LB = G(y0) - sum_i max(g_i (y0_i - ylo_i), g_i (y0_i - yhi_i))

so ``D* >= LB`` for the fastest (nu = 0), ``D* >= LB - nu A`` within a budget A, and
``W* >= (LB - T) / nu`` for the cheapest at delay T (Boyd and Vandenberghe, Convex Optimization,
2004, section 5.1: weak duality).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.goals import Budget, Cheapest

if TYPE_CHECKING:
    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem


@dataclass(frozen=True, kw_only=True)
class Prices:
    """A unit flow and what the limits and the spend cost, in seconds.

    Parameters
    ----------
    flow : FloatArray, shape (a,)
        Per arc.
    start_flow : FloatArray, shape (s,)
        Flow that enters at each start.
    end_flow : FloatArray, shape (e,)
        Flow that leaves at each end; adds up to 1.
    limit_prices : FloatArray, shape (limits,)
        s.
    spend_price : float
        s per unit of spend.
    """

    flow: FloatArray
    start_flow: FloatArray
    end_flow: FloatArray
    limit_prices: FloatArray
    spend_price: float


def lower_bound(problem: Problem, goal: Goal, sizes: FloatArray, prices: Prices) -> float:
    """Return a lower bound of the goal's objective: s, or spend for the cheapest.

    Parameters
    ----------
    problem, goal : Problem and Goal
        What is sized, and to what end.
    sizes : FloatArray, shape (n_sizes,)
        The point y0, inside the box.
    prices : Prices
        A unit flow and prices; the nearer to optimal, the better the bound.
    """
    y, lo, hi = np.log(sizes), np.log(problem.lower), np.log(problem.upper)
    flow, kappa, nu = prices.flow, prices.limit_prices, prices.spend_price
    ends = prices.start_flow @ problem.start_arrival + prices.end_flow @ problem.end_offset
    delays = flow @ problem.arc_delays(sizes)
    limits = kappa @ (problem.limit_sums(sizes) - 1.0)
    value = float(ends + delays + limits) + nu * problem.cost(sizes)
    g = problem.delay.gradient(y, flow) + problem.limit.gradient(y, kappa)
    g += nu * problem.spend * sizes
    bound = value - float(np.sum(np.maximum(g * (y - lo), g * (y - hi))))
    match goal:
        case Cheapest(delay):
            return (bound - delay) / nu
        case Budget(spend):
            return bound - nu * spend
        case _:
            return bound
