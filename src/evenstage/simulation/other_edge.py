"""A path with all its edges turned round, as the estimate sees it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.timing.search import leading_arcs
from evenstage.timing.stages import describe

if TYPE_CHECKING:
    from evenstage.simulation.excerpt import Route
    from evenstage.timing.results import Path
    from evenstage.timing.sweep import Timing


def turned_round(timing: Timing, route: Route) -> Path | None:
    """Return the path along the same nets with the other edges; None: there is none."""
    graph = timing.graph
    arcs = leading_arcs(timing)
    # Nodes reached so far, each with the arcs that lead there.
    fronts: dict[int, tuple[int, ...]] = {}
    for place, net in enumerate(route.nets):
        rising = not route.edges[net][1]
        here = np.flatnonzero((graph.net == net) & (graph.rising == rising))
        if place == 0:
            fronts = dict.fromkeys(np.intersect1d(here, graph.start).tolist(), ())
            continue
        joining = arcs[np.isin(graph.target[arcs], here)]
        fronts = {
            int(graph.target[arc]): (*fronts[int(graph.source[arc])], arc)
            for arc in joining.tolist()
            if int(graph.source[arc]) in fronts
        }
    ends = [node for node in fronts if node in set(graph.end.tolist())]
    return describe(timing, fronts[ends[0]]) if ends else None
