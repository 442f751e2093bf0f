"""Which sizes lie on the paths that limit a block, as drawn and as sized."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.timing.sweep import end_offsets

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.sizing.joint import Joint
    from evenstage.sizing.model import Limits, Model
    from evenstage.sizing.solution import Solution
    from evenstage.sizing.timed import Timed
    from evenstage.timing.sweep import Timing

#: Share of the unit flow above which a size counts as on a limiting path.
ON_LIMITING_PATH: Final = 1e-3
#: Relative distance at which a delay counts as met.
AGREES: Final = 1e-5


def worst_charged(timing: Timing) -> float:
    """Return the worst charged arrival at any path end, required times counted in, s."""
    offset = timing.lateness - timing.end_arrival
    return float((timing.end_charged_arrival + offset).max())


def limiting(joint: Joint, solution: Solution, share: float = ON_LIMITING_PATH) -> BoolArray:
    """Tell which sizes carry flow: those of gates on limiting paths, in any corner."""
    found = np.zeros(len(joint.variables), bool)
    for model, flow in zip(joint.models, joint.flows(solution), strict=True):
        found |= _sizes_along(model, model.graph.arc[flow > share])
    return found


def on_slowest_path(joint: Joint, block: Timed) -> BoolArray:
    """Tell which sizes lie on the slowest paths over all corners, by arrival and by charged delay.

    Parameters
    ----------
    joint : Joint
    block : Timed
        As drawn.
    """
    found = np.zeros(len(joint.variables), bool)
    late, charged = block.lateness, block.charged
    for model, timing in zip(joint.models, block.corners, strict=True):
        if timing.lateness.max() >= late:
            found |= _sizes_on_path(model, timing.arrival, timing.delay)
        if worst_charged(timing) >= charged:
            found |= _sizes_on_path(model, timing.charged_arrival, timing.charged)
    return found


def slower_than(joint: Joint, block: Timed, delay: float) -> BoolArray:
    """Tell which sizes lie, in any corner, on paths whose charged delay exceeds one (s)."""
    found = np.zeros(len(joint.variables), bool)
    for model, timing in zip(joint.models, block.corners, strict=True):
        found |= _slower_than(model, timing, delay)
    return found


def _slower_than(model: Model, timing: Timing, delay: float) -> BoolArray:
    graph = model.graph
    rest = np.full(len(graph), -np.inf)
    rest[graph.end] = end_offsets(graph) + timing.end_charged_wire
    for some, _, _ in reversed(graph.levels):
        later = rest[graph.target[some]] + timing.charged[some]
        np.maximum.at(rest, graph.source[some], later)
    through = timing.charged_arrival[graph.source] + timing.charged + rest[graph.target]
    return _sizes_along(model, graph.arc[through > delay * (1 + AGREES)])


def beyond_limits(joint: Joint, limits: Sequence[Limits], block: Timed) -> BoolArray:
    """Tell which sizes load an input over its ceiling, or make too slow an edge, in any corner."""
    found = np.zeros(len(joint.variables), bool)
    for model, some, timing in zip(joint.models, limits, block.corners, strict=True):
        found |= _beyond_limits(model, some, timing)
    return found


def _beyond_limits(model: Model, limits: Limits, timing: Timing) -> BoolArray:
    circuit, parts = model.circuit, model.variables.partition
    over = limits.ceiling_net[circuit.net_cap[limits.ceiling_net] > limits.ceiling * (1 + 1e-9)]
    gates = circuit.pins.gate[np.isin(circuit.pins.net, over)]
    if limits.strict:
        slow = timing.transition[model.graph.target] > limits.transition
        gates = np.concatenate([gates, circuit.arcs.gates_along(model.graph.arc[slow])])
    found = np.zeros(len(parts), bool)
    found[parts.of_gate[gates]] = True
    return found


def _sizes_along(model: Model, arcs: IntArray) -> BoolArray:
    """Tell which sizes some arcs of a circuit run through."""
    found = np.zeros(len(model.variables), bool)
    found[model.variables.partition.of_gate[model.circuit.arcs.gates_along(arcs)]] = True
    return found


def _sizes_on_path(model: Model, arrival: FloatArray, delay: FloatArray) -> BoolArray:
    """Return the sizes along the path that makes the latest arrival under some arc delays."""
    graph = model.graph
    node = int(graph.end[int(arrival[graph.end].argmax())])
    heads = np.searchsorted(graph.target, np.arange(len(graph) + 1))
    found: list[int] = []
    while heads[node] < heads[node + 1]:
        some = np.arange(heads[node], heads[node + 1])
        arc = int(some[int((arrival[graph.source[some]] + delay[some]).argmax())])
        found.append(arc)
        node = int(graph.source[arc])
    return _sizes_along(model, graph.arc[found])
