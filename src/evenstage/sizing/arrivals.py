"""Hard timing and flows on an acyclic graph, level by level.

A level holds the nodes whose longest chain of arcs from anywhere has the same number of arcs, so
all arcs into one level can be worked on at once. Two sweeps are all that sizing needs:

=========  =========================================================  ==================
symbol     meaning                                                    shape
=========  =========================================================  ==================
``t``      arrival: ``t_v = max(start_v, max over arcs (t_u + d_a))``  ``(nodes,)``, s
``phi``    flow through a node, from the ends back to the starts      ``(nodes,)``
``q_a``    share of its node's flow that enters through arc ``a``     ``(arcs,)``
=========  =========================================================  ==================
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.arcs import ranges

if TYPE_CHECKING:
    from collections.abc import Iterator

    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray, IntArray

    Index = NDArray[np.intp]


@dataclass(frozen=True, kw_only=True)
class Levels:
    """The arcs of an acyclic graph in the order in which a sweep meets them.

    Parameters
    ----------
    nodes : int
        Number of nodes.
    source, target : IntArray, shape (a,)
        The graph; every arc has source < target.
    order : IntArray, shape (a,)
        Arcs by level of their target, then by target.
    first : array of int, shape (levels + 1,)
        Where each level begins in `order`.
    depth : IntArray, shape (nodes,)
        Level of each node; 0 for those no arc leads to.
    """

    nodes: int
    source: IntArray
    target: IntArray
    order: IntArray
    first: Index
    depth: IntArray

    @classmethod
    def of(cls, nodes: int, source: IntArray, target: IntArray) -> Levels:
        """Cut a graph into levels.

        Raises
        ------
        ValueError
            If an arc does not lead from a smaller to a larger node id.
        """
        if np.any(source >= target) or np.any(source < 0) or np.any(target >= nodes):
            raise ValueError("node ids must be a topological order of the graph")
        depth = _depths(nodes, source, target)
        level = depth[target]
        order = np.lexsort((target, level)).astype(np.int32)
        count = int(level.max(initial=0))
        first = np.searchsorted(level[order], np.arange(1, count + 2))
        return cls(nodes=nodes, source=source, target=target, order=order, first=first, depth=depth)

    def _slices(self) -> Iterator[IntArray]:
        for begin, end in zip(self.first[:-1], self.first[1:], strict=True):
            yield self.order[begin:end]

    def arrivals(self, start: FloatArray, delay: FloatArray) -> FloatArray:
        """Return the latest arrival at each node, s, shape (nodes,).

        Parameters
        ----------
        start : FloatArray, shape (nodes,)
            Arrival from outside, s; minus infinity where no path begins.
        delay : FloatArray, shape (a,)
            s.
        """
        t = start.copy()
        for arcs in self._slices():
            np.maximum.at(t, self.target[arcs], t[self.source[arcs]] + delay[arcs])
        return t

    def flows(self, end: FloatArray, share: FloatArray) -> FloatArray:
        """Return the flow on each arc, shape (a,).

        Parameters
        ----------
        end : FloatArray, shape (nodes,)
            Flow that leaves the graph at each node.
        share : FloatArray, shape (a,)
            Part of its target's flow that comes through each arc; what the shares of a node leave
            over enters there from outside.
        """
        through = end.copy()
        flow = np.zeros(len(share))
        for begin, stop in zip(self.first[-2::-1], self.first[:0:-1], strict=True):
            arcs = self.order[begin:stop]
            flow[arcs] = through[self.target[arcs]] * share[arcs]
            np.add.at(through, self.source[arcs], flow[arcs])
        return flow

    def reached(self, seeds: IntArray) -> NDArray[np.bool_]:
        """Tell which nodes some path from `seeds` reaches, shape (nodes,)."""
        seen = np.zeros(self.nodes, dtype=bool)
        seen[seeds] = True
        for arcs in self._slices():
            seen[self.target[arcs[seen[self.source[arcs]]]]] = True
        return seen

    def reaching(self, goals: IntArray) -> NDArray[np.bool_]:
        """Tell from which nodes some path leads to `goals`, shape (nodes,)."""
        seen = np.zeros(self.nodes, dtype=bool)
        seen[goals] = True
        for begin, stop in zip(self.first[-2::-1], self.first[:0:-1], strict=True):
            arcs = self.order[begin:stop]
            seen[self.source[arcs[seen[self.target[arcs]]]]] = True
        return seen


def _depths(nodes: int, source: IntArray, target: IntArray) -> IntArray:
    """Return the level of each node: all arcs into a level are met before it is left."""
    by_source = np.argsort(source, kind="stable").astype(np.int32)
    out = np.bincount(source, minlength=nodes)
    begin = np.cumsum(out) - out
    missing = np.bincount(target, minlength=nodes)
    depth = np.zeros(nodes, np.int32)
    front, level = np.flatnonzero(missing == 0), 0
    while len(front):
        met = target[by_source[ranges(begin[front], out[front])]]
        np.subtract.at(missing, met, 1)
        front, level = np.unique(met[missing[met] == 0]), level + 1
        depth[front] = level
    return depth
