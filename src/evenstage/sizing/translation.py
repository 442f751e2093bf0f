"""A sizing problem and a goal as a convex programme, and its multipliers as a flow and prices.

Variables are the log sizes that can move, the arrivals at nodes that lie on some whole path and,
unless the delay is given, the worst delay. Rows are, in this order: arcs, starts, ends, limits,
budget. Times count from the earliest start in units of today's longest path, spend in units of
today's; both keep the programme's numbers near 1.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.sizing.bound import Prices
from evenstage.sizing.goals import Budget, Cheapest
from evenstage.sizing.problem import Monomials, totals
from evenstage.sizing.programme import Entries, Programme

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.goals import Goal
    from evenstage.sizing.problem import FloatArray, Problem

    Index = NDArray[np.intp]

#: The first point keeps this part of a size's logarithmic range away from its bounds.
_INSIDE: Final = 0.05
#: First arrivals assume arcs slower by this part, so that every arc has slack.
_SLOWER: Final = 0.1
#: Slack of starts and ends at first, in units of the longest path.
_AIR: Final = 0.02


class Translation:
    """A problem and a goal, reduced, scaled and in standard form.

    Parameters
    ----------
    problem, goal : Problem and Goal
        What is sized, and to what end.
    start : FloatArray, shape (n_sizes,)
        Sizes inside the box: where to begin.
    """

    def __init__(self, problem: Problem, goal: Goal, start: FloatArray) -> None:
        self.problem, self.goal, self.start = problem, goal, start
        self._select()
        t = problem.levels.arrivals(problem.start_time, problem.arc_delays(start))
        self.origin = float(problem.start_arrival[self.starts].min())
        self.time = float(t[self.live].max()) - self.origin or 1.0
        self.money = problem.cost(start) or 1.0
        budget = isinstance(goal, Budget)
        self.to_spend = goal.spend - self._held() if isinstance(goal, Budget) else 0.0
        counts = [len(self.arcs), len(self.starts), len(self.ends), len(self.limits), int(budget)]
        self.block = np.cumsum([0, *counts]).tolist()
        self.programme = self._programme()

    def _select(self) -> None:
        """Find what can move and what lies on a whole path."""
        q = self.problem
        moving = np.append(q.lower < q.upper, [False])
        self.free = np.flatnonzero(moving)
        live = q.levels.reached(q.start_node) & q.levels.reaching(q.end_node)
        self.live = np.flatnonzero(live)
        self.arcs = np.flatnonzero(live[q.arc_source] & live[q.arc_target])
        latest = q.start_arrival == q.start_time[q.start_node]
        self.starts = np.flatnonzero(live[q.start_node] & latest)
        self.ends = np.flatnonzero(live[q.end_node])
        self.limits = np.unique(q.limit.row[moving[q.limit.plus] | moving[q.limit.minus]])

    def _held(self) -> float:
        """Return the cost of what cannot change."""
        fixed = self.problem.spend * self.start
        fixed[self.free] = 0.0
        return float(fixed.sum()) + self.problem.spend_fixed

    def _programme(self) -> Programme:
        q, n = self.problem, len(self.free)
        given = isinstance(self.goal, Cheapest)
        variables = n + len(self.live) + (not given)
        constant = np.zeros(self.block[-1])
        _, starts, ends, limits, _, _ = self.block
        constant[starts:ends] = (q.start_arrival[self.starts] - self.origin) / self.time
        constant[ends:limits] = q.end_offset[self.ends] / self.time
        constant[limits:] = -1.0
        cost, weight = np.zeros(variables), np.zeros(n)
        match self.goal:
            case Cheapest(delay):
                constant[ends:limits] -= (delay - self.origin) / self.time
                weight = q.spend[self.free] / self.money
            case _:
                cost[-1] = 1.0
        terms, still = self._terms()
        return Programme(
            cost=cost,
            weight=weight,
            lower=np.log(q.lower[self.free]),
            upper=np.log(q.upper[self.free]),
            linear=self._linear(given=given),
            constant=constant + still,
            terms=terms,
        )

    def _linear(self, *, given: bool) -> Entries:
        """Return the arrivals' and the worst delay's part of the rows."""
        q = self.problem
        variable = np.zeros(q.nodes, dtype=np.intp)
        variable[self.live] = len(self.free) + np.arange(len(self.live))
        arc, start, end = (
            np.arange(*pair) for pair in zip(self.block, self.block[1:4], strict=False)
        )
        parts = [
            (arc, variable[q.arc_source[self.arcs]], 1.0),
            (arc, variable[q.arc_target[self.arcs]], -1.0),
            (start, variable[q.start_node[self.starts]], -1.0),
            (end, variable[q.end_node[self.ends]], 1.0),
        ]
        if not given:
            worst = len(self.free) + len(self.live)
            parts.append((end, np.full(len(end), worst), -1.0))
        return Entries(
            row=np.concatenate([row for row, _, _ in parts]),
            column=np.concatenate([column for _, column, _ in parts]),
            value=np.concatenate([np.full(len(row), value) for row, _, value in parts]),
        )

    def _parts(self) -> list[tuple[Monomials, Index, float]]:
        """Return what is posynomial: monomials, the programme's row of each, and its unit."""
        q = self.problem
        arcs = _rows(len(q.arc_source), self.arcs, 0)
        limits = _rows(q.limits, self.limits, self.block[3])
        parts = [(q.delay, arcs[q.delay.row], self.time), (q.limit, limits[q.limit.row], 1.0)]
        if isinstance(self.goal, Budget):
            paid = self.free[q.spend[self.free] > 0.0].astype(np.int32)
            none = np.full(len(paid), len(q.lower), dtype=np.int32)
            bill = Monomials(row=none, coefficient=q.spend[paid], plus=paid, minus=none)
            parts.append((bill, np.full(len(paid), self.block[4]), self.to_spend))
        return parts

    def _terms(self) -> tuple[Monomials, FloatArray]:
        """Return the monomials that can move, and per row the sum of those that cannot."""
        parts, n = self._parts(), len(self.free)
        row = np.concatenate([rows for _, rows, _ in parts])
        plus = np.concatenate([part.plus for part, _, _ in parts])
        minus = np.concatenate([part.minus for part, _, _ in parts])
        coefficient = np.concatenate([part.coefficient / unit for part, _, unit in parts])
        frozen = np.append(np.log(self.start), 0.0)
        frozen[self.free] = 0.0
        coefficient *= np.exp(frozen[plus] - frozen[minus])
        index = np.full(len(frozen), n, dtype=np.int32)
        index[self.free] = np.arange(n)
        moves = index[plus] != index[minus]
        kept, still = (row >= 0) & moves, (row >= 0) & ~moves
        terms = Monomials(
            row=row[kept].astype(np.int32),
            coefficient=coefficient[kept],
            plus=index[plus[kept]],
            minus=index[minus[kept]],
        )
        return terms, totals(row[still], coefficient[still], self.block[-1])

    def first(self) -> FloatArray:
        """Return a first point of the programme: inside the bounds, with slack in every arc."""
        q, p = self.problem, self.programme
        margin = _INSIDE * (p.upper - p.lower)
        y = np.clip(np.log(self.start[self.free]), p.lower + margin, p.upper - margin)
        slower = (1.0 + _SLOWER) * q.arc_delays(self.sizes(y))
        t = q.levels.arrivals(q.start_time, slower)
        reached = (t[self.live] - self.origin) / self.time + _AIR
        if isinstance(self.goal, Cheapest):
            return np.concatenate([y, reached])
        at_end = t[q.end_node[self.ends]] - self.origin + q.end_offset[self.ends]
        worst = float(at_end.max()) / self.time + 2.0 * _AIR
        return np.concatenate([y, reached, [worst]])

    def sizes(self, z: FloatArray) -> FloatArray:
        """Return all sizes, inside the box, of a point of the programme."""
        sizes = self.start.copy()
        sizes[self.free] = np.exp(z[: len(self.free)])
        return np.clip(sizes, self.problem.lower, self.problem.upper)

    def prices(self, price: FloatArray) -> Prices:
        """Return an exact unit flow and prices in seconds near the programme's multipliers.

        The multipliers of the arcs into a node only say in which proportion its flow enters: the
        flow itself is built from the ends backward, so that it is conserved to rounding.
        """
        q = self.problem
        _, starts, ends, limits, budget, _ = self.block
        arc, enter = np.zeros(len(q.arc_source)), np.zeros(len(q.start_node))
        arc[self.arcs], enter[self.starts] = price[:starts], price[starts:ends]
        total = totals(q.arc_target, arc, q.nodes) + totals(q.start_node, enter, q.nodes)
        total[total == 0.0] = 1.0
        leave, end_flow = float(price[ends:limits].sum()), np.zeros(len(q.end_node))
        end_flow[self.ends] = price[ends:limits] / leave
        out = totals(q.end_node, end_flow, q.nodes)
        flow = q.levels.flows(out, arc / total[q.arc_target])
        through = out + totals(q.arc_source, flow, q.nodes)
        kappa = np.zeros(q.limits)
        kappa[self.limits] = price[limits:budget] * self.time / leave
        match self.goal:
            case Cheapest():
                nu = self.time / (self.money * leave)
            case Budget():
                nu = float(price[budget]) * self.time / (self.to_spend * leave)
            case _:
                nu = 0.0
        return Prices(
            flow=flow,
            start_flow=through[q.start_node] * enter / total[q.start_node],
            end_flow=end_flow,
            limit_prices=kappa,
            spend_price=nu,
        )


def _rows(count: int, chosen: Index, first: int) -> Index:
    """Return the row of each of `count` things: chosen ones from `first` on, others -1."""
    rows = np.full(count, -1, dtype=np.intp)
    rows[chosen] = first + np.arange(len(chosen))
    return rows
