"""Switches opened and closed one vector at a time: what conducts is asked of networkx."""

from __future__ import annotations

from typing import TYPE_CHECKING

import networkx as nx

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.circuit.circuit import Circuit


def settled(circuit: Circuit, inputs: Mapping[int, bool]) -> dict[int, bool | str]:
    """Return the value of every net that is known for some input values, by net id.

    A net that nothing drives is ``"floats"``, one that is driven both ways ``"fights"``.
    """
    devices = circuit.devices
    high, low = circuit.supplies.is_high, circuit.supplies.is_low
    known: dict[int, bool | str] = dict(inputs)
    known |= {net: bool(high[net]) for net in range(len(high)) if high[net] or low[net]}
    sources = dict(known)
    is_n = [devices.models[m].polarity == "n" for m in devices.model.tolist()]
    while True:
        graph: nx.Graph[int] = nx.Graph()
        unsure: set[int] = set()
        columns = (devices.drain.tolist(), devices.gate.tolist(), devices.source.tolist())
        for drain, gate, source, n in zip(*columns, is_n, strict=True):
            if isinstance(known.get(gate), bool):
                if known[gate] == n:
                    graph.add_edge(drain, source)
            else:
                unsure |= {drain, source}
        fresh = dict(known)
        graph.add_nodes_from(set(columns[0]) | set(columns[2]))
        # A wire ends at every source: signals do not pass through supplies or block inputs.
        inner = graph.subgraph(node for node in graph if node not in sources)
        for part in nx.connected_components(inner):
            around = {near for node in part for near in graph[node]} & sources.keys()
            levels = {sources[near] for near in around}
            if part & unsure and len(levels) != 1:
                continue
            value = levels.pop() if len(levels) == 1 else ("fights" if levels else "floats")
            fresh |= dict.fromkeys(part, value)
        if fresh == known:
            return known
        known = fresh
