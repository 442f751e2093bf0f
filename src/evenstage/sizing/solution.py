"""The answer of an optimiser, with the proof of how good it is."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.sizing.problem import FloatArray, Problem


@dataclass(frozen=True, kw_only=True)
class Solution:
    """Sizes and the multipliers that prove how near to the best they are.

    Parameters
    ----------
    sizes : FloatArray, shape (n_sizes,)
        The answer; inside the box and within all limits.
    delay : float
        Its worst delay, s, by plain timing.
    spend : float
        Its cost, fixed part included.
    bound : float
        No sizes can do better than this: s, or spend if the goal was the cheapest.
    gap : float
        Distance of the answer from `bound`, relative; see :func:`relative_gap`.
    flow : FloatArray, shape (a,)
        Multiplier of each arc, a unit flow from starts to ends: how much the worst delay grows per
        second that this arc becomes slower.
    end_flow : FloatArray, shape (e,)
        The flow that leaves at each path end; adds up to 1.
    limit_prices : FloatArray, shape (limits,)
        Seconds that the worst delay falls per unit by which a limit is raised.
    spend_price : float
        Seconds that the worst delay falls per unit of spend; 0 if spend was free.
    arrivals : FloatArray, shape (nodes,)
        Latest arrival at each node, s; minus infinity where no path leads.
    bound_sizes : FloatArray, shape (n_sizes,)
        Sizes in the box at which the bound is measured.
    iterations : int
        Newton steps it took.
    """

    sizes: FloatArray
    delay: float
    spend: float
    bound: float
    gap: float
    flow: FloatArray
    end_flow: FloatArray
    limit_prices: FloatArray
    spend_price: float
    arrivals: FloatArray
    bound_sizes: FloatArray
    iterations: int


def relative_gap(objective: float, bound: float, unit: float) -> float:
    """Return how far an objective is above its lower bound, relative to the larger of two scales.

    Parameters
    ----------
    objective, bound : float
        Both s, or both spend.
    unit : float
        The limiting paths' own length, s; it matters where offsets bring the objective near 0.
        For spend: 0.
    """
    return max(objective - bound, 0.0) / max(abs(objective), unit, np.finfo(float).tiny)


def marginal(problem: Problem, sizes: FloatArray, flow: FloatArray) -> FloatArray:
    """Return how the flow's mean path delay changes with each size's logarithm, s.

    At an optimum this is the gradient of the worst delay, multiplier by multiplier: negative where
    a larger size would speed the limiting paths up.

    Parameters
    ----------
    problem : Problem
        What is sized.
    sizes : FloatArray, shape (n_sizes,)
        Where.
    flow : FloatArray, shape (a,)
        A unit flow, as in :class:`Solution`.
    """
    return problem.delay.gradient(np.log(sizes), flow)
