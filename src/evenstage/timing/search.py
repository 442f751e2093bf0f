"""The slowest paths of a timing graph, best first.

Every arrival is exact for the path that made it, so walking back from the ends with the lateness of
the slowest completion as the key meets complete paths in the order of their delay (an A* search
with a perfect estimate; Hart, Nilsson and Raphael, IEEE TSSC 4(2), 1968). Equal delays are told in
the order of the end's net, then of the arcs as drawn.
"""

from __future__ import annotations

import heapq
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.netlist.devices import IntArray
    from evenstage.timing.sweep import Timing

ArcPath = tuple[int, ...]
"""Graph arcs from a start to an end."""

_Tail = tuple[int, "_Tail"] | None


def winning_path(timing: Timing, node: int) -> ArcPath:
    """Return the graph arcs by which the latest arrival at a node came."""
    path = []
    while (arc := int(timing.winner[node])) >= 0:
        path.append(arc)
        node = int(timing.graph.source[arc])
    return tuple(reversed(path))


def latest_path(timing: Timing) -> ArcPath:
    """Return the path to the latest end (required times counted in); of equal ones the first."""
    return winning_path(timing, int(timing.graph.end[int(timing.lateness.argmax())]))


def slowest_paths(timing: Timing) -> Iterator[ArcPath]:
    """Yield the paths of a block, the latest end (required times counted in) first."""
    graph = timing.graph
    arcs = leading_arcs(timing)
    by_target = graph.target[arcs]
    head = np.searchsorted(by_target, np.arange(len(graph) + 1)).tolist()
    arcs_list = arcs.tolist()
    starts = set(graph.start.tolist())
    late = timing.lateness.tolist()
    heap: list[tuple[float, int, int, _Tail]] = []
    for rank, (end, key) in enumerate(zip(graph.end.tolist(), late, strict=True)):
        heap.append((-key, rank, end, None))
    heapq.heapify(heap)
    ties = 0
    while heap:
        key, _, node, tail = heapq.heappop(heap)
        if node in starts:
            yield _as_tuple(tail)
            continue
        # Of equal keys the newest goes first, so that ties are finished one by one.
        for arc in reversed(arcs_list[head[node] : head[node + 1]]):
            source = int(graph.source[arc])
            # Along the winning arc the key stays as it is, to the last bit: ties remain ties.
            slack = 0.0
            if arc != int(timing.winner[node]):
                here = float(timing.arrival[node])
                slack = max(0.0, here - float(timing.arrival[source]) - float(timing.delay[arc]))
            ties -= 1
            heapq.heappush(heap, (key + slack, ties, source, (arc, tail)))


def leading_arcs(timing: Timing) -> IntArray:
    """Return the slowest of each bundle of parallel arcs, sorted by target."""
    graph = timing.graph
    order = np.lexsort((np.arange(len(graph.arc)), -timing.delay, graph.source, graph.target))
    pair = np.stack([graph.target[order], graph.source[order]])
    first = np.flatnonzero((np.diff(pair, axis=1, prepend=-1) != 0).any(axis=0))
    result: IntArray = order[first].astype(np.int32)
    # Within one target keep the order in which arcs are drawn.
    return result[np.lexsort((result, graph.target[result]))]


def _as_tuple(tail: _Tail) -> ArcPath:
    path = []
    while tail is not None:
        arc, tail = tail
        path.append(arc)
    return tuple(path)
