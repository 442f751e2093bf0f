"""A primal-dual interior point for convex programmes with exponentials.

For the programme of :mod:`evenstage.sizing.programme`, with slacks ``s`` of its rows and the
distances ``y - lower`` and ``upper - y`` of its bounds put in one array ``room`` and their
multipliers in one array ``price``, a point is optimal if

    cost + weight exp(y) + J' price - price_low + price_high = 0      dual
    f(z) + s = 0                                                      primal
    room * price = 0,  room > 0,  price > 0                           complementary

The path to it sets the last product to ``mu`` and lets mu fall: a predictor with mu 0 tells how far
mu may fall and how the path bends (Mehrotra, SIAM J. Optimization 2(4), 1992), then products far
from mu are drawn nearer as long as that makes the step longer (Gondzio, Computational Optimization
and Applications 6, 1996; both from memory). A correction costs one solution with factors that are
there already; up to three save a quarter of the factorisations.

Ties. A size on which nothing depends would drift to the middle of what it may do. A term
``mu/2 |y - anchor|^2`` beside the barrier keeps such sizes near where they were and the matrix
definite; it vanishes with mu, so that it cannot spoil the answer.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.sizing.kkt import NewtonSystem, SingularError

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from evenstage.sizing.kkt import Linearisation
    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.programme import Programme

#: A step changes no size by more than a factor e^2: farther away the tangent means nothing.
_LONGEST_STEP: Final = 2.0
#: A step goes at most this part of the way to the nearest wall.
_TO_WALL: Final = 0.995
#: mu does not fall below this part of the remaining residual per constraint, lest the point
#: comes near the walls before it comes near the path.
_MU_PER_RESIDUAL: Final = 0.01
#: Most corrections for longer steps.
_CORRECTIONS: Final = 3
#: Products may differ from mu by this factor without being corrected.
_NEAR_MU: Final = 10.0
#: Slacks of rows, whose terms are near 1, have no digits below this: mu does not ask for less.
_LEAST_ROOM: Final = 1e-17
#: mu falls at most by this factor per step.
_LEAST_SIGMA: Final = 1e-6
#: Slack of the constraints that the first point does not keep.
_FIRST_SLACK: Final = 1e-2


@dataclass(frozen=True, kw_only=True)
class Point:
    """A primal and dual point, or a step between two.

    Parameters
    ----------
    z : FloatArray, shape (variables,)
        The programme's variables.
    room : FloatArray, shape (rows + 2 n,)
        Slacks of the rows, then distances to the lower and the upper bounds. They are stepped on
        their own: beside a bound, the difference of two log sizes would have no digits left.
    price : FloatArray, shape (rows + 2 n,)
        Multipliers of the same.
    """

    z: FloatArray
    room: FloatArray
    price: FloatArray

    @property
    def mu(self) -> float:
        """The mean product of room and price."""
        return float((self.room * self.price).mean())

    def moved(self, step: Point, length: float) -> Point:
        """Return the point a part of a step away."""
        return Point(
            z=self.z + length * step.z,
            room=self.room + length * step.room,
            price=self.price + length * step.price,
        )


def central_path(
    programme: Programme, z: FloatArray, anchor: FloatArray, precision: float
) -> Iterator[Point]:
    """Yield points ever nearer to an optimal one.

    Ends by itself when rounding or `precision` leaves nothing to gain.

    Parameters
    ----------
    programme : Programme
        What is minimised.
    z : FloatArray, shape (variables,)
        First point, strictly inside the bounds; it need not keep the constraints.
    anchor : FloatArray, shape (n,)
        Log sizes to stay near where nothing else decides.
    precision : float
        Gap, relative to the objective, below which mu does not go.
    """
    walk = _Walk(programme, anchor)
    at = walk.first(z)
    while True:
        try:
            with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
                at, finished = walk.step(at, precision)
        except SingularError:
            return
        yield at
        if finished:
            return


class _Walk:
    """Steps along the central path of one programme."""

    def __init__(self, programme: Programme, anchor: FloatArray) -> None:
        self.programme = programme
        self.anchor = anchor
        self.system = NewtonSystem(programme)
        self.count = programme.rows + 2 * programme.sizes

    def first(self, z: FloatArray) -> Point:
        """Return a first point whose products of room and price are all equal."""
        p = self.programme
        slack = np.maximum(-p.constraints(z), _FIRST_SLACK)
        y = z[: p.sizes]
        room = np.concatenate([slack, y - p.lower, p.upper - y])
        return Point(z=z, room=room, price=1.0 / (self.count * room))

    def step(self, at: Point, precision: float) -> tuple[Point, bool]:
        """Return the next point and whether nothing is left to gain."""
        p = self.programme
        products = at.room * at.price
        mu = float(products.mean())
        here = self.system.linearise(at.z, at.room, at.price, mu)
        dual = self.dual_residual(at, here, mu)
        primal = p.constraints(at.z) + at.room[: p.rows]
        residual = float(max(np.abs(dual).max(), np.abs(primal).max()))
        goal = precision * p.scale(at.z)
        least = max(goal / self.count, _LEAST_ROOM * float(at.price[: p.rows].max()))
        newton = partial(self.direction, at, here, dual, primal)
        affine = newton(products)
        reach = self.reach(at, affine, 1.0)
        sigma = max((at.moved(affine, reach).mu / mu) ** 3, _LEAST_SIGMA)
        target = max(sigma * mu, min(mu, _MU_PER_RESIDUAL * residual / self.count), least)
        curved = products - target + reach**2 * affine.room * affine.price
        found = self.tightened(self.corrected(at, newton, curved, target))
        return found, mu <= 1.1 * least and residual <= goal

    def corrected(
        self,
        at: Point,
        newton: Callable[[FloatArray], Point],
        products: FloatArray,
        target: float,
    ) -> Point:
        """Return the point after a step, corrected for as long as that makes it longer."""
        step = newton(products)
        length = self.reach(at, step, _TO_WALL)
        for _ in range(_CORRECTIONS):
            longer = min(1.0, 1.2 * length + 0.1)
            there = at.moved(step, longer)
            product = there.room * there.price
            wish = np.clip(product, target / _NEAR_MU, target * _NEAR_MU) - product
            drawn = products - np.maximum(wish, -target * _NEAR_MU)
            trial = newton(drawn)
            reach = self.reach(at, trial, _TO_WALL)
            if reach < length + 0.1 * (longer - length) + 0.01 * length:
                break
            step, length, products = trial, reach, drawn
        return at.moved(step, length)

    def dual_residual(self, at: Point, here: Linearisation, mu: float) -> FloatArray:
        """Return the gradient of the Lagrangian, tie term included."""
        p = self.programme
        n, y = p.sizes, at.z[: p.sizes]
        rows, low, high = np.split(at.price, [p.rows, p.rows + n])
        dual: FloatArray = p.cost + here.jacobian.T @ rows
        dual[:n] += p.weight * np.exp(y) - low + high + mu * (y - self.anchor)
        return dual

    def direction(
        self,
        at: Point,
        here: Linearisation,
        dual: FloatArray,
        primal: FloatArray,
        products: FloatArray,
    ) -> Point:
        """Return the Newton step that removes the given residuals."""
        p = self.programme
        push = -products / at.room
        push[: p.rows] += here.theta * primal
        rows, low, high = np.split(push, [p.rows, p.rows + p.sizes])
        right = -dual
        right[: p.sizes] += low - high
        z = here.solve(right, rows)
        dy = z[: p.sizes]
        room = np.concatenate([-primal - here.jacobian @ z, dy, -dy])
        return Point(z=z, room=room, price=-(products + at.price * room) / at.room)

    def reach(self, at: Point, step: Point, fraction: float) -> float:
        """Return how far a step may be gone."""
        now = np.concatenate([at.room, at.price])
        move = np.concatenate([step.room, step.price])
        falling = move < 0.0
        wall = float(np.min(-now[falling] / move[falling], initial=np.inf))
        largest = float(np.abs(step.z[: self.programme.sizes]).max(initial=0.0))
        return min(1.0, fraction * wall, _LONGEST_STEP / max(largest, _LONGEST_STEP))

    def tightened(self, at: Point) -> Point:
        """Return the point with the slack it has, where it keeps a constraint well enough."""
        rows = self.programme.rows
        kept, room = -self.programme.constraints(at.z), at.room.copy()
        room[:rows] = np.where(kept > 0.5 * room[:rows], kept, room[:rows])
        return Point(z=at.z, room=room, price=at.price)
