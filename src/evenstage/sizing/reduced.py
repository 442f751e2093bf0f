"""A sizing problem without what cannot matter, in units near 1, ready for derivatives.

Only sizes that can move, arcs on whole paths and limits that could bind in the box are left. A
source before all starts and a sink behind all ends make start arrivals and end offsets arcs of
constant delay. Time counts from the earliest start in units of the longest path at some sizes.
Limits follow the arcs as further sums.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.sizing.problem import Monomials, Problem, totals
from evenstage.sizing.softmax import Graph
from evenstage.sizing.sums import Sums

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray, IntArray

    Index = NDArray[np.intp]

#: A limit that stays this far below 1 wherever the sizes go is left out.
_NEVER: Final = 1e-9


@dataclass(frozen=True, kw_only=True)
class Reduced:
    """A problem in the form the optimiser works on.

    Parameters
    ----------
    problem : Problem
        What it was made from.
    free : array of int, shape (n,)
        The sizes left.
    held : FloatArray, shape (n_sizes,)
        Where the other sizes are.
    lower, upper : FloatArray, shape (n,)
        Bounds of the log sizes.
    sums : Sums
        Rows: arcs of `graph`, s / `time`, then limits.
    graph : Graph
        With source and sink.
    arc : IntArray, shape (arcs,)
        Which arc of the problem each arc is; then starts and ends count on: -1 - k for start k of
        the problem, ``len(arc_source) + k`` for its end k.
    limit : array of int, shape (m,)
        Which limits of the problem are left.
    spend : FloatArray, shape (n,)
        Cost of each size over `money`.
    spend_held : float
        Cost of all that is held over `money`.
    origin, time, money : float
        Earliest start, s; unit of time, s; unit of spend.
    """

    problem: Problem
    free: Index
    held: FloatArray
    lower: FloatArray
    upper: FloatArray
    sums: Sums
    graph: Graph
    arc: IntArray
    limit: Index
    spend: FloatArray
    spend_held: float
    origin: float
    time: float
    money: float

    @classmethod
    def of(cls, problem: Problem, sizes: FloatArray, *, by_level: bool) -> Reduced:
        """Reduce a problem.

        Parameters
        ----------
        problem : Problem
        sizes : FloatArray, shape (n_sizes,)
            Inside the box; what cannot move is where it is here.
        by_level : bool
            Whether nodes are ordered by level, or stay in the order they have: there neighbours
            usually stand close together, which loops over nodes gain from.
        """
        q = problem
        moving = q.lower < q.upper
        free = np.flatnonzero(moving)
        live = q.levels.reached(q.start_node) & q.levels.reaching(q.end_node)
        starts = np.flatnonzero(live[q.start_node])
        ends = np.flatnonzero(live[q.end_node])
        arcs = np.flatnonzero(live[q.arc_source] & live[q.arc_target])
        arrival = q.levels.arrivals(q.start_time, q.arc_delays(sizes))
        origin = float(q.start_arrival[starts].min())
        time = float((arrival[live]).max()) - origin or 1.0
        money = q.cost(sizes) or 1.0
        graph, order = _graph(q, np.flatnonzero(live), arcs, starts, ends, by_level=by_level)
        code = np.concatenate([arcs, -1 - starts, len(q.arc_source) + ends]).astype(np.int32)
        limit = np.flatnonzero(_most(q) > 1.0 - _NEVER)
        row = np.full(len(q.arc_source), -1, np.int32)
        place = np.empty(len(order), np.int32)
        place[order] = np.arange(len(order))
        row[arcs] = place[: len(arcs)]
        constant = np.zeros(len(order) + len(limit))
        known = place[len(arcs) : len(arcs) + len(starts)]
        constant[known] = (q.start_arrival[starts] - origin) / time
        constant[place[len(arcs) + len(starts) :]] = q.end_offset[ends] / time
        limit_row = np.full(q.limits, -1, np.int32)
        limit_row[limit] = len(order) + np.arange(len(limit))
        held = np.where(moving, 1.0, sizes)
        rows = len(constant)
        sums = Sums.of(_terms(q, free, held, row, limit_row, time), rows, len(free))
        return cls(
            problem=q,
            free=free,
            held=held,
            lower=np.log(q.lower[free]),
            upper=np.log(q.upper[free]),
            sums=replace(sums, constant=sums.constant + constant),
            graph=graph,
            arc=code[order],
            limit=limit,
            spend=q.spend[free] / money,
            spend_held=(float(q.spend[~moving] @ held[~moving]) + q.spend_fixed) / money,
            origin=origin,
            time=time,
            money=money,
        )

    @property
    def arcs(self) -> int:
        """Number of arcs, those of source and sink included."""
        return len(self.arc)

    def sizes(self, y: FloatArray) -> FloatArray:
        """Return all sizes of the problem, inside its box, for log sizes, shape (n,)."""
        sizes = self.held.copy()
        sizes[self.free] = np.exp(y)
        return np.clip(sizes, self.problem.lower, self.problem.upper)

    def log_sizes(self, sizes: FloatArray) -> FloatArray:
        """Return the log sizes of what is free, inside the box, shape (n,)."""
        return np.clip(np.log(sizes[self.free]), self.lower, self.upper)

    def flows(self, flow: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return a flow on arcs, at starts and at ends of the problem."""
        q, code = self.problem, self.arc
        count = len(q.arc_source)
        into, out = code < 0, code >= count
        arc, start, end = np.zeros(count), np.zeros(len(q.start_node)), np.zeros(len(q.end_node))
        inner = ~into & ~out
        arc[code[inner]] = flow[inner]
        start[-1 - code[into]] = flow[into]
        end[code[out] - count] = flow[out]
        return arc, start, end


def _most(q: Problem) -> FloatArray:
    """Return what each limit's sum stays below wherever the sizes go, shape (limits,)."""
    low, high = np.append(q.lower, 1.0), np.append(q.upper, 1.0)
    terms = q.limit
    value = terms.coefficient * high[terms.plus] / low[terms.minus]
    return totals(terms.row, value, q.limits)


def _graph(
    q: Problem, live: Index, arcs: Index, starts: Index, ends: Index, *, by_level: bool
) -> tuple[Graph, IntArray]:
    """Return the graph between source and sink and the order of its arcs."""
    depth = q.levels.depth[live] if by_level else np.zeros(len(live), np.intp)
    by_depth = np.argsort(depth, kind="stable")
    number = np.zeros(q.nodes, np.int32)
    number[live[by_depth]] = 1 + np.arange(len(live))
    sink = np.int32(len(live) + 1)
    source = np.concatenate(
        [number[q.arc_source[arcs]], np.zeros(len(starts), np.int32), number[q.end_node[ends]]]
    )
    target = np.concatenate(
        [number[q.arc_target[arcs]], number[q.start_node[starts]], np.full(len(ends), sink)]
    )
    order = np.argsort(target, kind="stable").astype(np.int32)
    source, target = source[order], target[order]
    cuts = 1 + np.flatnonzero(np.diff(depth[by_depth]))
    return (
        Graph(
            first=np.searchsorted(target, np.arange(sink + 2)).astype(np.int32),
            source=source,
            target=target,
            level=np.concatenate([[0, 1], 1 + cuts, [sink, sink + 1]]).astype(np.int32),
        ),
        order,
    )


def _terms(
    q: Problem, free: Index, held: FloatArray, row: IntArray, limit_row: IntArray, time: float
) -> Monomials:
    """Return the monomials of arcs and limits that are left, with held sizes folded in."""
    n = len(free)
    number = np.full(len(q.lower) + 1, n, np.int32)
    number[free] = np.arange(n, dtype=np.int32)
    fixed = np.append(held, 1.0)
    found = []
    for terms, rows, unit in ((q.delay, row, time), (q.limit, limit_row, 1.0)):
        if len(terms.row):
            found.append(_left(terms, rows, number, fixed, unit))
    if len(found) == 1:
        return found[0]
    row_of, coefficient, plus, minus = (
        np.concatenate([getattr(part, name) for part in found] or [np.zeros(0)])
        for name in ("row", "coefficient", "plus", "minus")
    )
    return Monomials(
        row=row_of.astype(np.int32),
        coefficient=coefficient,
        plus=plus.astype(np.int32),
        minus=minus.astype(np.int32),
    )


def _left(
    terms: Monomials, rows: IntArray, number: IntArray, fixed: FloatArray, unit: float
) -> Monomials:
    """Return the monomials of the rows that are left, in the numbers of what is left."""
    row = rows[terms.row]
    if (row < 0).any():
        kept = np.flatnonzero(row >= 0)
        row = row[kept]
        terms = Monomials(
            row=row,
            coefficient=terms.coefficient[kept],
            plus=terms.plus[kept],
            minus=terms.minus[kept],
        )
    coefficient = terms.coefficient / unit
    if (fixed != 1.0).any():
        coefficient *= fixed[terms.plus]
        coefficient /= fixed[terms.minus]
    return Monomials(
        row=row, coefficient=coefficient, plus=number[terms.plus], minus=number[terms.minus]
    )
