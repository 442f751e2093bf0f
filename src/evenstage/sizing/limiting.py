"""Which sizes lie on the paths that limit a block, as drawn and as sized."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.timing.sweep import end_offsets

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.model import Limits, Model
    from evenstage.sizing.solution import Solution
    from evenstage.timing.sweep import Timing

#: Share of the unit flow above which a size counts as on a limiting path.
ON_LIMITING_PATH: Final = 1e-3
#: Relative distance at which a delay counts as met.
AGREES: Final = 1e-5


def worst_charged(timing: Timing) -> float:
    """Return the worst charged arrival at any path end, required times counted in, s."""
    offset = timing.lateness - timing.end_arrival
    return float((timing.end_charged_arrival + offset).max())


def limiting(model: Model, solution: Solution, share: float = ON_LIMITING_PATH) -> BoolArray:
    """Tell which sizes carry flow: those of gates on limiting paths."""
    graph = model.graph
    flow = solution.flow[len(solution.flow) - len(graph.arc) :]
    gates = model.circuit.arcs.gates_along(graph.arc[flow > share])
    found = np.zeros(len(model.variables), bool)
    found[model.variables.partition.of_gate[gates]] = True
    return found


def on_slowest_path(model: Model, timing: Timing) -> BoolArray:
    """Tell which sizes lie on today's slowest paths, by arrival and by charged delay."""
    found = np.zeros(len(model.variables), bool)
    for arrival, delay in (
        (timing.arrival, timing.delay),
        (timing.charged_arrival, timing.charged),
    ):
        found[_sizes_on_path(model, arrival, delay)] = True
    return found


def slower_than(model: Model, timing: Timing, delay: float) -> BoolArray:
    """Tell which sizes lie today on paths whose charged delay exceeds one (s)."""
    graph = model.graph
    rest = np.full(len(graph), -np.inf)
    rest[graph.end] = end_offsets(graph) + timing.end_charged_wire
    for some, _, _ in reversed(graph.levels):
        later = rest[graph.target[some]] + timing.charged[some]
        np.maximum.at(rest, graph.source[some], later)
    through = timing.charged_arrival[graph.source] + timing.charged + rest[graph.target]
    gates = model.circuit.arcs.gates_along(graph.arc[through > delay * (1 + AGREES)])
    found = np.zeros(len(model.variables), bool)
    found[model.variables.partition.of_gate[gates]] = True
    return found


def beyond_limits(model: Model, limits: Limits, timing: Timing) -> BoolArray:
    """Tell which sizes load an input over its ceiling, or make too slow an edge, today."""
    circuit, parts = model.circuit, model.variables.partition
    over = limits.ceiling_net[circuit.net_cap[limits.ceiling_net] > limits.ceiling * (1 + 1e-9)]
    gates = circuit.pins.gate[np.isin(circuit.pins.net, over)]
    if limits.strict:
        slow = timing.transition[model.graph.target] > limits.transition
        gates = np.concatenate([gates, circuit.arcs.gates_along(model.graph.arc[slow])])
    found = np.zeros(len(parts), bool)
    found[parts.of_gate[gates]] = True
    return found


def _sizes_on_path(model: Model, arrival: FloatArray, delay: FloatArray) -> list[int]:
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
    gates = model.circuit.arcs.gates_along(graph.arc[found])
    sizes: list[int] = model.variables.partition.of_gate[gates].tolist()
    return sizes
