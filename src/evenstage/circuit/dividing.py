"""A group of several nodes divided into what drives and what only passes.

Nodes that carry signals are the *terminals*: those that switches of both polarities meet at, those
seen outside, and the block's inputs. Between terminals and supplies lie pull networks; what joins
two terminals passes a signal. A pull network that two terminals share is itself divided at its
inner nodes.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import networkx as nx

from evenstage.circuit.charging import Chargers
from evenstage.circuit.division import Division, Pass, closing
from evenstage.circuit.drivers import driver_of
from evenstage.circuit.function import Literal, Not
from evenstage.circuit.gate import Unrecognised
from evenstage.circuit.network import HIGH, LOW, Network

if TYPE_CHECKING:
    from collections.abc import Iterable

    from evenstage.circuit.division import Charging
    from evenstage.circuit.literals import Condition, Literals


def divide(
    network: Network,
    terminals: Iterable[int],
    literals: Literals,
    clocks: frozenset[int] = frozenset(),
) -> Division | Unrecognised:
    """Divide a network.

    Parameters
    ----------
    network : Network
        Merged, with the terminals kept apart.
    terminals : iterable of int
        Nodes seen outside.
    literals : Literals
        What is known of the inputs; inverters inside add to it.
    clocks : frozenset of int
        Inputs known to be clocks.
    """
    found = set(network.driven_nodes) | set(terminals)
    while True:
        pulls, passing, more = _assigned(network, found)
        if not more:
            break
        found |= more
    charging = _charging(pulls, Chargers(network, passing, literals, clocks))
    parts = [(n, part) for n in sorted(pulls) for part in _by_inputs(network, pulls[n], literals)]
    drivers = []
    for node, part in parts:
        driver = driver_of(network, node, part, literals)
        if isinstance(driver, Unrecognised):
            return driver
        drivers.append(driver)
    for driver in drivers:
        inverted = driver.function
        if isinstance(inverted, Not) and isinstance(inverted.term, Literal):
            literals.tie(driver.node, inverted.term.net, same=False)
    passes, assumed = _passes(network, passing, literals)
    return Division(network, literals, tuple(drivers), passes, assumed, charging)


def _charging(pulls: dict[int, list[list[int]]], chargers: Chargers) -> tuple[Charging, ...]:
    """Take what precharges a node out of its pull networks, and return that."""
    found = []
    for node in sorted(pulls):
        one = chargers.at(node, pulls[node])
        if one is not None:
            found.append(one)
            pulls[node] = [part for part in pulls[node] if part[0] not in one.switches]
    return tuple(found)


def _assigned(
    network: Network, terminals: set[int]
) -> tuple[dict[int, list[list[int]]], list[int], set[int]]:
    """Return pull networks by terminal, passing switches, and nodes that must be terminals too."""
    graph: nx.Graph[int] = nx.Graph()
    graph.add_nodes_from(node for node in network.inner_nodes if node not in terminals)
    for switch in network.switches:
        if switch.a in graph and switch.b in graph:
            graph.add_edge(switch.a, switch.b)
    pulls: dict[int, list[list[int]]] = {}
    passing: list[int] = []
    more: set[int] = set()
    components = list(nx.connected_components(graph))
    inside = {n: k for k, part in enumerate(components) for n in part}
    by_part: dict[int, list[int]] = {}
    for index, switch in enumerate(network.switches):
        inner = [node for node in (switch.a, switch.b) if node in inside]
        if inner:
            by_part.setdefault(inside[inner[0]], []).append(index)
        elif switch.a in terminals and switch.b in terminals:
            passing.append(index)
        else:
            pulls.setdefault(max(switch.a, switch.b), []).append([index])
    for part, indices in by_part.items():
        ends = {e for i in indices for e in (network.switches[i].a, network.switches[i].b)}
        owners = ends & terminals
        if len(owners) == 1 and ends & {HIGH, LOW}:
            pulls.setdefault(owners.pop(), []).append(indices)
        else:
            more |= components[part]
    return pulls, passing, more


def _by_inputs(network: Network, parts: list[list[int]], literals: Literals) -> list[list[int]]:
    """Join the parts of pull networks at one node that listen to a common input."""
    graph: nx.Graph[tuple[str, int]] = nx.Graph()
    for number, part in enumerate(parts):
        graph.add_node(("part", number))
        for index in part:
            gate = network.switches[index].gate
            if gate >= 0:
                root = literals.condition(gate, value=True)[0]
                graph.add_edge(("part", number), ("input", root))
    joined = []
    for component in nx.connected_components(graph):
        numbers = sorted(number for kind, number in component if kind == "part")
        joined.append(sorted(index for number in numbers for index in parts[number]))
    return sorted(joined)


def _passes(
    network: Network, passing: list[int], literals: Literals
) -> tuple[tuple[Pass, ...], tuple[tuple[int, int], ...]]:
    """Put passing switches between the same two nodes together that one condition closes.

    One n and one p switch that are left over between two nodes are taken for a pair too, and their
    inputs for complements.
    """
    between: dict[tuple[int, int], list[int]] = {}
    for index in passing:
        switch = network.switches[index]
        between.setdefault((min(switch.a, switch.b), max(switch.a, switch.b)), []).append(index)
    assumed = []
    for some in between.values():
        gates = {
            p: [network.switches[i].gate for i in some if network.switches[i].polarity == p]
            for p in "np"
        }
        if len(gates["n"]) == len(gates["p"]) == 1:
            n, p = gates["n"][0], gates["p"][0]
            if n >= 0 and p >= 0 and not literals.are_tied(n, p):
                literals.tie(n, p, same=False)
                assumed.append((n, p))
    passes = []
    for ends, some in between.items():
        by_condition: dict[Condition | None, list[int]] = {}
        for index in some:
            switch = network.switches[index]
            condition = closing(switch, literals) if switch.gate >= 0 else None
            by_condition.setdefault(condition, []).append(index)
        for condition, members in by_condition.items():
            both = [
                tuple(i for i in members if network.switches[i].polarity == polarity)
                for polarity in "np"
            ]
            passes.append(Pass(ends, both[0], both[1], condition))
    return tuple(passes), tuple(assumed)
