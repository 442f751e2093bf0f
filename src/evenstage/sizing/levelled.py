"""The sweeps of :mod:`evenstage.sizing.softmax` in numpy.

Soft arrivals go level by level. With shares fixed the other sweeps are triangular linear systems,
which SuperLU solves without fill.
"""

from __future__ import annotations

from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import csc_array
from scipy.sparse.linalg import splu

from evenstage.sizing.problem import totals
from evenstage.sizing.softmax import LEAST_SHARE

if TYPE_CHECKING:
    from numpy.typing import NDArray
    from scipy.sparse.linalg import SuperLU

    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.softmax import Graph


class Levelled:
    """Sweeps in numpy, level by level."""

    def __init__(self, graph: Graph) -> None:
        self.graph = graph
        bounds = graph.level[1:].tolist()
        arcs = graph.first[graph.level[1:]].tolist()
        count = np.diff(graph.first)
        single = np.logical_and.reduceat(count == 1, graph.level[1:-1])
        place = np.arange(graph.nodes) - np.repeat(graph.level[:-1], np.diff(graph.level))
        self._steps = [
            (
                slice(node, stop),
                slice(begin, end),
                graph.source[begin:end],
                None if alone else graph.first[node:stop] - begin,
                None if alone else place[graph.target[begin:end]],
            )
            for node, stop, begin, end, alone in zip(
                bounds[:-1], bounds[1:], arcs[:-1], arcs[1:], single.tolist(), strict=True
            )
        ]

    def longest(self, delay: FloatArray) -> float:
        """Return the length of the longest path."""
        arrival = np.zeros(self.graph.nodes)
        for nodes, arcs, source, first, _ in self._steps:
            late = arrival[source] + delay[arcs]
            arrival[nodes] = late if first is None else np.maximum.reduceat(late, first)
        return float(arrival[-1])

    def soft(self, delay: FloatArray, temperature: float) -> LevelledSoft:
        """Return soft arrivals."""
        arrival, share = np.zeros(self.graph.nodes), np.ones(len(delay))
        scaled = delay / temperature
        for nodes, arcs, source, first, place in self._steps:
            late = arrival[source] + scaled[arcs]
            if first is None:
                arrival[nodes] = late
                continue
            latest = np.maximum.reduceat(late, first)
            part = np.exp(late - latest[place])
            total = np.add.reduceat(part, first)
            arrival[nodes] = latest + np.log(total)
            share[arcs] = part / total[place]
        share[share < LEAST_SHARE] = 0.0
        return LevelledSoft(self.graph, float(arrival[-1]) * temperature, share, temperature)

    def carrying(self, flow: FloatArray, least: float) -> NDArray[np.bool_]:
        """Tell which arcs carry flow, shape (arcs,)."""
        graph = self.graph
        reached, kept = np.zeros(graph.nodes, bool), flow >= least
        kept |= flow == np.maximum.reduceat(flow, graph.first[1:-1])[graph.target - 1]
        reached[-1] = True
        for _, arcs, source, _, _ in reversed(self._steps):
            kept[arcs] &= reached[graph.target[arcs]]
            reached[source[kept[arcs]]] = True
        return kept


class LevelledSoft:
    """Soft arrivals whose derivatives are triangular systems, set up when first asked for."""

    def __init__(self, graph: Graph, worst: float, share: FloatArray, temperature: float) -> None:
        self.graph, self.temperature = graph, temperature
        self.worst, self.share = worst, share

    @cached_property
    def _factors(self) -> SuperLU:
        graph, n, arcs = self.graph, self.graph.nodes, len(self.share)
        # Row v of I - Q holds the arcs into v; read by columns that is its transpose.
        place = np.arange(arcs) + graph.target
        value, index = np.empty(arcs + n), np.empty(arcs + n, np.int32)
        own = graph.first[1:] + np.arange(n)
        value[place], index[place] = -self.share, graph.source
        value[own], index[own] = 1.0, np.arange(n)
        pointer = (graph.first + np.arange(n + 1)).astype(np.int32)
        matrix = csc_array((value, index, pointer), shape=(n, n))
        matrix.sum_duplicates()
        return splu(
            matrix, permc_spec="NATURAL", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
        )

    @cached_property
    def flow(self) -> FloatArray:
        """Flow of each arc, shape (arcs,)."""
        sink = np.zeros(self.graph.nodes)
        sink[-1] = 1.0
        flow: FloatArray = self._factors.solve(sink)[self.graph.target] * self.share
        return flow

    def product(self, moved: FloatArray) -> FloatArray:
        """Return how the flow moves with the delays."""
        graph, n = self.graph, self.graph.nodes
        mean = totals(graph.target, self.share * moved, n)
        later = self._factors.solve(mean, "T")  # type: ignore[call-overload]  # stubs lack it
        bent = self.flow * (later[graph.source] + moved - later[graph.target])
        bent /= self.temperature
        through = self._factors.solve(totals(graph.source, bent, n))
        result: FloatArray = through[graph.target] * self.share + bent
        return result
