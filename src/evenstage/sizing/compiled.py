"""The sweeps of :mod:`evenstage.sizing.softmax` as compiled loops over nodes.

Needs numba (`pip install evenstage[fast]`). Compiled once per machine and kept on disk beside this
file, or in numba's cache folder where that cannot be written.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numba import njit

from evenstage.sizing.softmax import LEAST_SHARE

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray, IntArray
    from evenstage.sizing.softmax import Graph

#: Flows below this are nothing beside rounding, but products with them underflow slowly.
_LEAST_FLOW = 1e-40


@njit(cache=True, nogil=True)
def _longest(first: IntArray, source: IntArray, delay: FloatArray, arrival: FloatArray) -> float:
    nodes = len(first) - 1
    arrival[0] = 0.0
    for node in range(1, nodes):
        latest = -np.inf
        for arc in range(first[node], first[node + 1]):
            late = arrival[source[arc]] + delay[arc]
            latest = max(latest, late)
        arrival[node] = latest
    return float(arrival[nodes - 1])


@njit(cache=True, nogil=True)
def _soft(
    first: IntArray,
    source: IntArray,
    delay: FloatArray,
    temperature: float,
    arrival: FloatArray,
    share: FloatArray,
) -> float:
    nodes = len(first) - 1
    arrival[0] = 0.0
    for node in range(1, nodes):
        begin, end = first[node], first[node + 1]
        if end == begin + 1:
            arrival[node] = arrival[source[begin]] + delay[begin]
            share[begin] = 1.0
            continue
        latest = -np.inf
        for arc in range(begin, end):
            late = arrival[source[arc]] + delay[arc]
            share[arc] = late
            latest = max(latest, late)
        total = 0.0
        for arc in range(begin, end):
            part = np.exp((share[arc] - latest) / temperature)
            share[arc] = part
            total += part
        for arc in range(begin, end):
            part = share[arc] / total
            share[arc] = part if part >= LEAST_SHARE else 0.0
        arrival[node] = latest + temperature * np.log(total)
    return float(arrival[nodes - 1])


@njit(cache=True, nogil=True)
def _flow(first: IntArray, source: IntArray, share: FloatArray, flow: FloatArray) -> None:
    nodes = len(first) - 1
    through = np.zeros(nodes)
    through[nodes - 1] = 1.0
    for node in range(nodes - 1, 0, -1):
        here = through[node]
        for arc in range(first[node], first[node + 1]):
            part = here * share[arc]
            if part < _LEAST_FLOW:
                part = 0.0
            flow[arc] = part
            through[source[arc]] += part


@njit(cache=True, nogil=True)
def _product(
    first: IntArray,
    source: IntArray,
    share: FloatArray,
    flow: FloatArray,
    cold: float,
    moved: FloatArray,
    result: FloatArray,
) -> None:
    nodes = len(first) - 1
    later = np.zeros(nodes)
    through = np.zeros(nodes)
    for node in range(1, nodes):
        mean = 0.0
        for arc in range(first[node], first[node + 1]):
            mean += share[arc] * (later[source[arc]] + moved[arc])
        later[node] = mean
    for node in range(nodes - 1, 0, -1):
        here = through[node]
        for arc in range(first[node], first[node + 1]):
            bent = flow[arc] * (later[source[arc]] + moved[arc] - later[node]) * cold
            bent += here * share[arc]
            if abs(bent) < _LEAST_FLOW:
                bent = 0.0
            result[arc] = bent
            through[source[arc]] += bent


@njit(cache=True, nogil=True)
def _carrying(
    first: IntArray, source: IntArray, flow: FloatArray, least: float, kept: NDArray[np.bool_]
) -> None:
    nodes = len(first) - 1
    reached = np.zeros(nodes, np.bool_)
    reached[nodes - 1] = True
    for node in range(nodes - 1, 0, -1):
        if not reached[node]:
            continue
        most = 0.0
        for arc in range(first[node], first[node + 1]):
            most = max(most, flow[arc])
        for arc in range(first[node], first[node + 1]):
            if flow[arc] >= least or flow[arc] == most:
                kept[arc] = True
                reached[source[arc]] = True


class Compiled:
    """Sweeps as compiled loops."""

    def __init__(self, graph: Graph) -> None:
        self.graph = graph
        self._arrival = np.empty(graph.nodes)

    def longest(self, delay: FloatArray) -> float:
        """Return the length of the longest path."""
        return float(_longest(self.graph.first, self.graph.source, delay, self._arrival))

    def soft(self, delay: FloatArray, temperature: float) -> CompiledSoft:
        """Return soft arrivals."""
        graph, share = self.graph, np.empty(len(delay))
        worst = _soft(graph.first, graph.source, delay, temperature, self._arrival, share)
        return CompiledSoft(graph, float(worst), share, temperature)

    def carrying(self, flow: FloatArray, least: float) -> NDArray[np.bool_]:
        """Tell which arcs carry flow, shape (arcs,)."""
        kept = np.zeros(len(flow), bool)
        _carrying(self.graph.first, self.graph.source, flow, least, kept)
        return kept


class CompiledSoft:
    """Soft arrivals whose derivatives are compiled loops."""

    def __init__(self, graph: Graph, worst: float, share: FloatArray, temperature: float) -> None:
        self.graph, self.temperature = graph, temperature
        self.worst, self.share = worst, share
        self._flow: FloatArray | None = None

    @property
    def flow(self) -> FloatArray:
        """Flow of each arc, shape (arcs,)."""
        if self._flow is None:
            flow = np.empty(len(self.share))
            _flow(self.graph.first, self.graph.source, self.share, flow)
            self._flow = flow
        return self._flow

    def product(self, moved: FloatArray) -> FloatArray:
        """Return how the flow moves with the delays."""
        graph, result = self.graph, np.empty(len(moved))
        cold = 1.0 / self.temperature
        _product(graph.first, graph.source, self.share, self.flow, cold, moved, result)
        return result
