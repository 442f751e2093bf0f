"""What drawn widths must keep in each corner, and which gates are nearest to breaking it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from evenstage.circuit.arcs import NO_OWNER, ranges

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.sizing.joint import Corner
    from evenstage.timing.sweep import Timing

ROOM: Final = 2e-9
"""Relative room for the noise of binary arithmetic."""


class Kept(NamedTuple):
    """What must be kept in one corner.

    Parameters
    ----------
    corner : Corner
    elmore_limit : FloatArray, s, shape (circuit arcs,)
        Transition limit of each arc in the programme.
    slowest : float
        The slowest edge any gate may make, s.
    """

    corner: Corner
    elmore_limit: FloatArray
    slowest: float

    def over(self, net_cap: FloatArray) -> BoolArray:
        """Tell which inputs exceed their ceilings, shape (inputs, ...)."""
        limits = self.corner.limits
        ceiling = limits.ceiling * (1 + ROOM)
        return net_cap > ceiling.reshape(-1, *(1 for _ in net_cap.shape[1:]))


def slowest_edge(corner: Corner, today: Timing) -> float:
    """Return the slowest edge any gate may make in a corner, s."""
    if corner.limits.strict:
        return corner.limits.transition
    # A process without shapes has no transitions, so none is too slow.
    return max(corner.limits.transition, today.worst_transition) or np.inf


def gates_by_slack(timing: Timing, limit: float) -> tuple[FloatArray, IntArray]:
    """Return the gates along all arcs, each with the slack of its arc, s.

    ``limit`` is how late a path end may be, s.
    """
    graph, charges = timing.graph, timing.circuit.arcs.charges
    head = charges.head
    count = head[graph.arc + 1] - head[graph.arc]
    owner = charges.owner[ranges(head[graph.arc], count)]
    slack = np.repeat(_slack(timing, limit)[graph.target], count)
    return slack[owner != NO_OWNER], owner[owner != NO_OWNER]


def _slack(timing: Timing, limit: float) -> FloatArray:
    """Return how much later each node's arrival could be before a path end is later, s.

    ``limit`` is how late a path end may be, s.
    """
    graph = timing.graph
    latest = np.full(len(graph), np.inf)
    np.minimum.at(latest, graph.end, limit - (timing.lateness - timing.arrival[graph.end]))
    for begin, end in reversed(list(zip([0, *graph.level_ends], graph.level_ends, strict=False))):
        some = slice(int(begin), int(end))
        np.minimum.at(latest, graph.source[some], latest[graph.target[some]] - timing.delay[some])
    result: FloatArray = latest - timing.arrival
    return result
