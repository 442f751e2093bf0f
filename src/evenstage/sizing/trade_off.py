"""The least spend for each delay from today's to the least possible: the price of speed.

Each point is a convex programme of its own, certified like every answer, and begins at the sizes of
the point before. In the logarithms of delay and spend the curve is convex (a perturbed minimum of a
convex programme is; Boyd and Vandenberghe, Convex Optimization, 2004, section 5.6), so it has one
knee: the point farthest below the straight line between its ends.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.brief import Brief
from evenstage.sizing.block import Block
from evenstage.sizing.results import TradeOff, TradeOffPoint
from evenstage.sizing.wishes import Original, Wishes

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Sequence

    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.engine import Engine
    from evenstage.sizing.solution import Solution
    from evenstage.timing.corners import Corners
    from evenstage.timing.results import Analysis

#: Points of a curve.
_POINTS: Final = 12
#: How near the curve comes to the least delay, relative: at it spend is infinitely steep.
_NEAREST: Final = 1e-3
#: Relative difference of spend below which two points are one.
_SAME: Final = 1e-6
#: How far it goes at least, where the block is all but as fast as it can be.
_FARTHEST: Final = 0.05


def trade_off(
    analysis: Analysis | Corners,
    brief: Brief | None = None,
    wishes: Wishes | None = None,
    original: Original | Sequence[Original] | None = None,
) -> TradeOff:
    """Find the least spend for a dozen delays from today's to the least possible.

    Parameters
    ----------
    analysis : Analysis or Corners
        From `evenstage.timing.analyse.analyse`; in corners the worst one counts.
    brief : Brief, optional
    wishes : Wishes, optional
        What may move and what is kept small; a delay or a width wished for does not count.
    original : Original or sequence of Original, optional
        Limits an earlier run recorded, for each corner; they count instead of today's.

    Raises
    ------
    InfeasibleError
        Where the limits cannot be met.
    NotConvergedError
        Where the optimum cannot be proved.
    ValueError
        Where the analysis carries no timing.
    """
    wishes = replace(wishes or Wishes(), delay=None, width=None)
    block = Block.of(analysis, brief or Brief(), wishes, original)
    parts, _ = block.partition()
    engine = block.engine(parts, block.handles(parts))
    points = tuple(_different(_points(engine)))
    delay, spend = (
        np.array(values)
        for values in zip(*((point.charged_delay, point.spend) for point in points), strict=True)
    )
    return TradeOff(
        spend=wishes.spend,
        today_charged_delay=engine.today.charged,
        today_spend=engine.cost_drawn,
        points=points,
        knee=knee(delay, spend),
    )


def _points(engine: Engine) -> Iterator[TradeOffPoint]:
    """Give the points, from the slowest to the fastest."""
    fastest, lower, upper = engine.least_delay()
    sizes = np.ones(len(lower))
    for deadline in deadlines(engine.today.charged, fastest.delay).tolist():
        answer = engine.within(deadline, fastest, lower, upper, start=sizes)
        sizes, proof = answer.sizes, answer.solution
        yield TradeOffPoint(
            charged_delay=proof.delay,
            delay=engine.timed(sizes).lateness,
            spend=proof.spend,
            bound=proof.bound,
            gap=proof.gap,
            one_percent_buys=_one_percent_buys(proof),
        )


def _different(points: Iterable[TradeOffPoint]) -> Iterator[TradeOffPoint]:
    """Give the points that differ: beyond the least spend more delay saves nothing."""
    last: TradeOffPoint | None = None
    for point in points:
        if last is None or point.spend > last.spend * (1 + _SAME):
            yield point
            last = point


def _one_percent_buys(proof: Solution) -> float | None:
    """Return how much less delay one percent more spend buys, s; None where the delay is slack."""
    bought = 0.01 * proof.spend * proof.spend_price
    return bought if bought < abs(proof.delay) else None


def deadlines(today: float, least: float) -> FloatArray:
    """Return the delays of a curve, s, the slowest first, closer together where it is steeper."""
    nearest = least + _NEAREST * abs(least)
    slowest = max(today, least + _FARTHEST * abs(least))
    part = np.linspace(1.0, 0.0, _POINTS) ** 2
    return np.asarray(nearest + (slowest - nearest) * part)


def knee(delay: FloatArray, spend: FloatArray) -> int | None:
    """Return the point farthest below the straight line between the ends, in logarithms.

    None where no point is below it, or where delays are not positive.
    """
    if delay.min() <= 0 or spend.min() <= 0:
        return None
    x, y = np.log(delay), np.log(spend)
    if x[0] == x[-1] or y[0] == y[-1]:
        return None
    below = (x - x[-1]) / (x[0] - x[-1]) + (y - y[0]) / (y[-1] - y[0])
    # Both axes from 0 to 1: the line between the ends is where the two shares add up to 1.
    deepest = int(below.argmin())
    return deepest if below[deepest] < 1 - 1e-6 else None
