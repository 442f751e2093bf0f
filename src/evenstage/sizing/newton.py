"""Truncated Newton steps in a box: conjugate gradients on the free sizes, never a matrix.

A size is free unless it is on a bound and the gradient pushes it out. The step solves
``(H + damping diag H) s = -g`` to a tenth of the gradient, is searched along its projection on the
box
(Bertsekas, SIAM J. Control and Optimization 20(2), 1982), and moves no size by more than a factor
e^1.5. Damping keeps sizes that nothing depends on where they are.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.sizing.hessian import Hessian
from evenstage.sizing.lagrangian import Prices

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.lagrangian import Point
    from evenstage.sizing.problem import FloatArray

#: A step changes no size by more than this in the logarithm.
_LONGEST_STEP: Final = 1.5
#: Residual of a step relative to the gradient, and the most products it may take.
_RESIDUAL: Final = 0.1
_PRODUCTS: Final = 80
#: A step goes at most this part of the way to where the tangent of a constraint ends.
_TO_WALL: Final = 0.99
#: Prices stay within this factor of what their barriers imply.
_NEAR: Final = 30.0
#: Shares of a step tried in turn, and the decrease asked for.
_SHORTER: Final = 0.4
_TRIALS: Final = 12
_DECREASE: Final = 1e-4
#: Part of the gap that softness costs which an inexact minimum may add.
_ENOUGH: Final = 0.5
#: Damping: least, most, and how it moves after full steps and each time one is shortened.
_LEAST_DAMPING: Final = 1e-5
_MOST_DAMPING: Final = 10.0
_CALMER, _STRONGER = 0.3, 4.0
#: A step with this length counts as full.
_FULL: Final = 0.9


@dataclass(frozen=True, kw_only=True)
class State:
    """Where a minimisation is.

    Parameters
    ----------
    point : Point
    prices : Prices
        kappa of Newton's matrix.
    damping : float
    steps : int
        Newton steps so far.
    work : int
        Sweeps so far: of values, gradients and products.
    """

    point: Point
    prices: Prices
    damping: float
    steps: int = 0
    work: int = 0


def minimised(state: State, most: int) -> State:
    """Return a state whose inexactness costs no more than its softness.

    Parameters
    ----------
    state : State
        Inside all constraints.
    most : int
        Most Newton steps.
    """
    for _ in range(most):
        point = state.point
        if is_enough(point):
            break
        moved = _stepped(state)
        if moved.point is point:
            if state.damping >= _MOST_DAMPING:
                break
            moved = replace(moved, damping=_MOST_DAMPING)
        state = moved
    return state


def is_enough(point: Point) -> bool:
    """Tell whether a point is near enough to the minimum for its temperature."""
    return point.reach(point.gradient) <= _ENOUGH * point.softness


def direction(state: State, right: FloatArray, *, damped: bool) -> tuple[FloatArray, int]:
    """Return Newton's matrix's inverse times a right side on the free sizes, and products used."""
    point = state.point
    hessian = Hessian(point, state.prices)
    diagonal = hessian.diagonal
    diagonal = np.maximum(diagonal, 1e-14 * float(diagonal.max(initial=1e-300)))
    damping = (state.damping if damped else _LEAST_DAMPING) * diagonal
    free = free_sizes(point)
    scale = np.where(free, 1.0 / (diagonal + damping), 0.0)
    right = np.where(free, right, 0.0)
    return point.setup.solve(hessian, damping, scale, right, _RESIDUAL, _PRODUCTS)


def free_sizes(point: Point) -> NDArray[np.bool_]:
    """Tell which sizes are not held on a bound by the gradient, shape (n,)."""
    y, g, r = point.y, point.gradient, point.reduced
    held: NDArray[np.bool_] = ((y <= r.lower) & (g > 0.0)) | ((y >= r.upper) & (g < 0.0))
    return ~held


def _stepped(state: State) -> State:
    """Return the state after one Newton step; the same point where no step helps."""
    point = state.point
    step, work = direction(state, -point.gradient, damped=True)
    longest = float(np.abs(step).max(initial=0.0))
    if longest > _LONGEST_STEP:
        step = np.clip(step, -_LONGEST_STEP, _LONGEST_STEP)
    found, length, trials = _searched(point, step)
    work += trials + 2
    if found is None:
        damping = min(state.damping * _STRONGER, _MOST_DAMPING)
        return replace(state, damping=damping, steps=state.steps + 1, work=state.work + work)
    damping = state.damping * (_CALMER if length >= _FULL else _STRONGER ** max(trials - 1, 1))
    return State(
        point=found,
        prices=_moved(state, found),
        damping=min(max(damping, _LEAST_DAMPING), _MOST_DAMPING),
        steps=state.steps + 1,
        work=state.work + work,
    )


def _searched(point: Point, step: FloatArray) -> tuple[Point | None, float, int]:
    """Return a point along a step that is lower enough, the share of the step, and trials."""
    r = point.reduced
    length = _to_wall(point, step)
    for trial in range(_TRIALS):
        y = np.clip(point.y + length * step, r.lower, r.upper)
        there = point.at(y)
        fall = float(point.gradient @ (y - point.y))
        if there.value <= point.value + _DECREASE * min(fall, 0.0):
            return there, length, trial + 1
        del there  # large: it would stay while the next is made
        length *= _SHORTER
    return None, 0.0, _TRIALS


def _to_wall(point: Point, step: FloatArray) -> float:
    """Return how much of a step the tangents of the constraints allow, at most 1."""
    use = 0.0
    if len(point.limit_slack):
        moved = point.sums.moved(step).rows[point.reduced.arcs :]
        use = float((moved / point.limit_slack).max())
    if point.question.deadline is not None:
        use = max(use, float(point.delay_gradient @ step) / point.goal_slack)
    elif point.question.budget is not None:
        use = max(use, float(point.bill @ step) / point.goal_slack)
    return min(1.0, _TO_WALL / use) if use > 0.0 else 1.0


def _moved(state: State, there: Point) -> Prices:
    """Return the prices after a step: complementary in the tangent, near the barriers' own."""
    point, own = state.point, there.prices
    goal, limit = state.prices.goal, state.prices.limit
    weights = point.weights
    if len(limit):
        used = point.limit_slack - there.limit_slack
        limit = (weights.limit + limit * used) / point.limit_slack
        limit = np.clip(limit, own.limit / _NEAR, own.limit * _NEAR)
    if point.question.constrained:
        use = point.goal_slack - there.goal_slack
        goal = (weights.goal + goal * use) / point.goal_slack
        goal = min(max(goal, own.goal / _NEAR), own.goal * _NEAR)
    return Prices(goal=goal, limit=limit)
