"""The part of a block that matters at a point: the paths that carry flow, and sizes that move them.

As the temperature falls the flow leaves all paths but the near-limiting ones, in large blocks a few
hundredths of all arcs. An arc whose share of the flow is too small to be seen changes neither the
soft worst delay nor its derivatives, so Newton's steps can do without it: they are made on the
part, and the whole block is timed only to confirm them. What is left out is confirmed as well: a
minimum counts only if the whole function's gradient says so.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
from scipy.sparse import csr_array

from evenstage.circuit.arcs import ranges
from evenstage.sizing.lagrangian import Point, Prices
from evenstage.sizing.neighbours import Neighbours
from evenstage.sizing.newton import State, is_enough, minimised
from evenstage.sizing.softmax import Graph

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.reduced import Reduced
    from evenstage.sizing.setup import Setup
    from evenstage.sizing.sums import Sums

    Index = NDArray[np.intp]

#: Flow that counts: an arc with less is late by more than 27 temperatures.
_LEAST_FLOW: Final = 1e-20
#: A part is worth its making if it has no more than this share of the arcs.
_WORTH: Final = 0.38
#: Steps on one part before the whole is timed: at first, and at most.
_FIRST, _MOST = 4, 16


@dataclass(frozen=True, kw_only=True)
class Part:
    """Part of a block at a point, as a setup of its own.

    Parameters
    ----------
    whole : Point
        Where it was made.
    setup : Setup
        Of the part; sizes that only far limits share with it are held.
    sizes, limits, rows : array of int
        Which sizes, limits and rows of the sums, arcs first, of the whole it has.
    """

    whole: Point
    setup: Setup
    sizes: Index
    limits: Index
    rows: Index

    def state(self, state: State) -> State:
        """Return a state of the whole on the part."""
        point = Point(self.setup, self.whole.weights, self.whole.y[self.sizes])
        prices = Prices(goal=state.prices.goal, limit=state.prices.limit[self.limits])
        return replace(state, point=point, prices=prices)

    def spread(self, part: FloatArray, elsewhere: FloatArray) -> FloatArray:
        """Return values of the sizes of the whole: those of the part, else those given."""
        every = elsewhere.copy()
        every[self.sizes] = part
        return every

    def joined(self, held: list[State]) -> State:
        """Return a state of the part, taken out of a list, on the whole."""
        state = held.pop()
        y = self.spread(state.point.y, self.whole.y)
        state = replace(state, point=self.whole)  # the part's point is large
        point = self.whole.at(y)
        if not point.inside:
            return replace(state, point=point, prices=self.whole.prices)
        limit = point.prices.limit.copy()
        limit[self.limits] = state.prices.limit
        return replace(state, point=point, prices=Prices(goal=state.prices.goal, limit=limit))


def lowered(held: list[State], most: int) -> State:
    """Return a state whose inexactness costs no more than its softness, worked out on parts.

    Parameters
    ----------
    held : list of State
        One, inside all constraints; it is taken out.
    most : int
        Most Newton steps.
    """
    state = held.pop()
    last, together = state.steps + most, _FIRST
    while state.steps < last and not is_enough(state.point):
        found, worth = _lowered_apart(state, min(together, last - state.steps))
        if found is not None:
            state, together = found, min(2 * together, _MOST)
            del found  # points of large blocks are large
            continue
        if worth and together > 1:
            together = max(together // 4, 1)
            continue
        found = minimised(state, 1)
        if found.point is state.point:
            return found
        state = found
        del found
    return state


def _lowered_apart(state: State, steps: int) -> tuple[State | None, bool]:
    """Return a lower state after some steps on a part, if there is one, and whether a part was."""
    part = part_of(state.point)
    if part is None:
        return None, False
    joined = part.joined([minimised(part.state(state), steps)])
    return (joined if joined.point.value < state.point.value else None), True


def part_of(point: Point) -> Part | None:
    """Return the part of a block that matters at a point; None where that is nearly everything."""
    setup, reduced = point.setup, point.reduced
    arcs = np.flatnonzero(setup.sweeps.carrying(point.soft.flow, _LEAST_FLOW))
    if len(arcs) > _WORTH * reduced.arcs:
        return None
    sums = reduced.sums
    moving = _touched(sums, arcs)
    _, cost = point.factors(point.prices.goal)
    if cost > 0.0:
        moving |= (point.y > reduced.lower) & (reduced.spend > 0.0)
    limits = np.flatnonzero(_touching(sums, moving)[reduced.arcs :])
    rows = np.concatenate([arcs, reduced.arcs + limits])
    there = moving | _touched(sums, rows[len(arcs) :])
    sizes = np.flatnonzero(there)
    y, held = point.y[sizes], ~moving[sizes]
    left = float((point.bill * ~there).sum())
    small = replace(
        reduced,
        free=reduced.free[sizes],
        lower=np.where(held, y, reduced.lower[sizes]),
        upper=np.where(held, y, reduced.upper[sizes]),
        sums=_cut(sums, rows, there),
        graph=_subgraph(reduced.graph, arcs),
        arc=reduced.arc[arcs],
        limit=reduced.limit[limits],
        spend=reduced.spend[sizes],
        spend_held=reduced.spend_held + left,
    )
    return Part(whole=point, setup=_setup(setup, small), sizes=sizes, limits=limits, rows=rows)


def _setup(setup: Setup, reduced: Reduced) -> Setup:
    sweeps = type(setup.sweeps)(reduced.graph)
    return replace(setup, reduced=reduced, sweeps=sweeps, neighbours=Neighbours(reduced))


class _Entries(NamedTuple):
    """What some rows take: how much each, entries of the matrix, their columns."""

    wide: Index
    entry: Index
    column: NDArray[np.int32]


def _entries(sums: Sums, rows: Index) -> _Entries:
    pointer = sums.take.indptr.astype(np.intp)
    wide = np.diff(pointer)[rows]
    entry = ranges(pointer[rows], wide)
    return _Entries(wide, entry, sums.take.indices[entry])


def _forms(sums: Sums, column: NDArray[np.int32]) -> NDArray[np.bool_]:
    """Tell which forms are among some columns, shape (forms,)."""
    used = np.zeros(sums.forms, bool)
    used[column[column < sums.forms]] = True
    return used


def _touched(sums: Sums, rows: Index) -> NDArray[np.bool_]:
    """Tell which sizes some rows depend on, shape (n,)."""
    g, n = sums.forms, sums.sizes
    column = _entries(sums, rows).column
    used = _forms(sums, column)
    found = np.zeros(n, bool)
    found[sums.driver[used]] = True
    found[sums.plus[used[sums.of_part]]] = True
    direct = column[column >= g] - g
    found[np.where(direct < n, direct, direct - n)] = True
    return found


def _touching(sums: Sums, sizes: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Tell which rows depend on some of the sizes, shape (rows,)."""
    form = sizes[sums.driver]
    form[sums.of_part[sizes[sums.plus]]] = True
    column = np.concatenate([form, sizes, sizes])
    found = np.zeros(sums.take.shape[0], bool)
    found[sums.entry_row[column[sums.take.indices]]] = True
    return found


def _cut(sums: Sums, rows: Index, sizes: NDArray[np.bool_]) -> Sums:
    """Return some rows over some sizes, among them all that the rows depend on."""
    taken, entry, column = _entries(sums, rows)
    used = _forms(sums, column)
    forms, parts = np.flatnonzero(used), np.flatnonzero(used[sums.of_part])
    g, n = len(forms), int(sizes.sum())
    size = (np.cumsum(sizes) - 1).astype(np.int32)
    number = np.concatenate([np.cumsum(used) - 1, g + size, g + n + size]).astype(np.int32)
    pointer = np.concatenate([[0], np.cumsum(taken)]).astype(np.int32)
    wide = np.diff(sums.first)[forms]
    return replace(
        sums,
        sizes=n,
        first=np.concatenate([[0], np.cumsum(wide)]).astype(np.int32),
        plus=size[sums.plus[parts]],
        coefficient=sums.coefficient[parts],
        driver=size[sums.driver[forms]],
        base=sums.base[forms],
        of_part=np.repeat(np.arange(g, dtype=np.int32), wide),
        take=csr_array(
            (sums.take.data[entry], number[column], pointer), shape=(len(rows), g + 2 * n)
        ),
        constant=sums.constant[rows],
    )


def _subgraph(graph: Graph, arcs: Index) -> Graph:
    """Return the graph of some arcs, which lead from source to sink."""
    source, target = graph.source[arcs], graph.target[arcs]
    there = np.zeros(graph.nodes, bool)
    there[0] = True
    there[target] = True
    before = np.concatenate([[0], np.cumsum(there)]).astype(np.int32)
    target = before[target]
    return Graph(
        first=np.searchsorted(target, np.arange(before[-1] + 1)).astype(np.int32),
        source=before[source],
        target=target,
        level=np.unique(before[graph.level]),
    )
