"""A group of several nodes divided into what drives and what only passes.

Nodes that carry signals are the *terminals*: those that switches of both polarities meet at, those
seen outside, and the block's inputs. Between terminals and supplies lie pull networks; what joins
two terminals passes a signal. A pull network that two terminals share is itself divided at its
inner nodes.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import networkx as nx

from evenstage.circuit.function import (
    ONE,
    ZERO,
    Expression,
    Literal,
    Not,
    When,
    conduction,
    conjunction,
    disjunction,
)
from evenstage.circuit.gate import (
    INPUTS_MAX,
    ArcForm,
    Pulls,
    Unrecognised,
    all_arcs,
    possible_vectors,
)
from evenstage.circuit.literals import Condition, Cube, Literals, consistent
from evenstage.circuit.network import HIGH, LOW, Network, Switch

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence


@dataclass(frozen=True, slots=True)
class Way:
    """One conducting path from a driver's node to a supply, and when it conducts."""

    path: tuple[int, ...]
    cube: Cube


@dataclass(frozen=True)
class Driver:
    """What pulls one node: a pull network, or the outside (without switches).

    Parameters
    ----------
    node : int
    switches : tuple of int
        Of the whole network.
    up, down : tuple of Way
    arcs : tuple of ArcForm
        With switches of the whole network.
    kind : str
    function : Expression
        Its value, and when it drives.
    always : bool
        Whether it drives under all inputs.
    """

    node: int
    switches: tuple[int, ...]
    up: tuple[Way, ...]
    down: tuple[Way, ...]
    arcs: tuple[ArcForm, ...]
    kind: str
    function: Expression
    always: bool

    @property
    def is_outside(self) -> bool:
        """Whether the signal comes from outside the block."""
        return not self.switches

    def ways(self, supply: int) -> tuple[Way, ...]:
        """Return the paths to one supply."""
        return self.up if supply == HIGH else self.down


@dataclass(frozen=True)
class Pass:
    """Switches in parallel that pass a signal between two terminals.

    Parameters
    ----------
    ends : (int, int)
    n, p : tuple of int
        Switches of either polarity.
    condition : Condition, optional
        When it conducts; None: always.
    """

    ends: tuple[int, int]
    n: tuple[int, ...]
    p: tuple[int, ...]
    condition: Condition | None

    @property
    def switches(self) -> tuple[int, ...]:
        """All its switches."""
        return (*self.n, *self.p)

    @property
    def kind(self) -> str:
        """Transmission gate or pass transistor."""
        return "transmission gate" if self.n and self.p else "pass transistor"

    def other(self, node: int) -> int:
        """Return the end that is not ``node``."""
        return self.ends[1] if node == self.ends[0] else self.ends[0]


@dataclass(frozen=True)
class Link:
    """What may tie two nodes: a pass, or a switch inside the pull network of a driver.

    Parameters
    ----------
    ends : (int, int)
    condition : Condition, optional
        When it does; None: always.
    owner : Pass or Driver
    """

    ends: tuple[int, int]
    condition: Condition | None
    owner: Pass | Driver

    def other(self, node: int) -> int:
        """Return the end that is not ``node``."""
        return self.ends[1] if node == self.ends[0] else self.ends[0]


@dataclass(frozen=True)
class Division:
    """A network divided.

    Parameters
    ----------
    network : Network
    literals : Literals
    drivers : tuple of Driver
    passes : tuple of Pass
    assumed : tuple of (int, int)
        Inputs of switches in parallel taken for complements without proof.
    """

    network: Network
    literals: Literals
    drivers: tuple[Driver, ...]
    passes: tuple[Pass, ...]
    assumed: tuple[tuple[int, int], ...]

    @cached_property
    def drivers_at(self) -> dict[int, list[Driver]]:
        """Drivers by node."""
        found: dict[int, list[Driver]] = {}
        for driver in self.drivers:
            found.setdefault(driver.node, []).append(driver)
        return found

    @cached_property
    def links_at(self) -> dict[int, list[Link]]:
        """Links by node; those to supplies are left out."""
        links = [Link(one.ends, one.condition, one) for one in self.passes]
        for driver in self.drivers:
            for index in driver.switches:
                switch = self.network.switches[index]
                if switch.a >= 0 and switch.b >= 0:
                    condition = closing(switch, self.literals)
                    links.append(Link((switch.a, switch.b), condition, driver))
        found: dict[int, list[Link]] = {}
        for link in links:
            for end in link.ends:
                found.setdefault(end, []).append(link)
        return found

    @cached_property
    def passes_at(self) -> dict[int, list[int]]:
        """Indices of passes by node."""
        found: dict[int, list[int]] = {}
        for index, one in enumerate(self.passes):
            for end in one.ends:
                found.setdefault(end, []).append(index)
        return found


def divide(
    network: Network, terminals: Iterable[int], literals: Literals
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
    """
    found = set(network.driven_nodes) | set(terminals)
    while True:
        pulls, passing, more = _assigned(network, found)
        if not more:
            break
        found |= more
    parts = [(n, part) for n in sorted(pulls) for part in _by_inputs(network, pulls[n], literals)]
    drivers = []
    for node, part in parts:
        driver = _driver(network, node, part, literals)
        if isinstance(driver, Unrecognised):
            return driver
        drivers.append(driver)
    for driver in drivers:
        inverted = driver.function
        if isinstance(inverted, Not) and isinstance(inverted.term, Literal):
            literals.tie(driver.node, inverted.term.net, same=False)
    passes, assumed = _passes(network, passing, literals)
    return Division(network, literals, tuple(drivers), passes, assumed)


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
    inside = {n: k for k, part in enumerate(nx.connected_components(graph)) for n in part}
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
            more |= {node for node, k in inside.items() if k == part}
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


def _driver(
    network: Network, node: int, indices: list[int], literals: Literals
) -> Driver | Unrecognised:
    """Return the driver that some switches at a node make, or why they make none."""
    switches = tuple(network.switches[i] for i in indices)
    inputs = tuple(dict.fromkeys(s.gate for s in switches if s.gate >= 0))
    if len(inputs) > INPUTS_MAX:
        return Unrecognised(f"a pull network of it has {len(inputs)} inputs, above {INPUTS_MAX}")
    own = Network(switches, tuple(range(len(switches))), network.node_of_net, inputs)
    up, down = own.conducts(node, HIGH, "p"), own.conducts(node, LOW, "n")
    relations = tuple(
        (a, b)
        for position, a in enumerate(inputs)
        for b in inputs[position + 1 :]
        if literals.condition(a, value=True) == literals.condition(b, value=False)
    )
    possible = possible_vectors(own, relations)
    anyhow = own.conducts(node, HIGH), own.conducts(node, LOW)
    if ((anyhow[0] != up) | (anyhow[1] != down))[possible].any():
        return Unrecognised("an n switch pulls up or a p switch pulls down")
    if (up & down)[possible].any():
        return Unrecognised("pull-up and pull-down conduct together: not complementary")
    if any(s.gate < 0 for s in switches) or not (up | down).any():
        return Unrecognised("a transistor that is always on pulls one of its nodes")
    always = bool((up | down)[possible].all())
    ways = [_ways(own, node, supply, indices, literals) for supply in (HIGH, LOW)]
    if not always and ways[0] and ways[1] and not _enable(*ways):
        return Unrecognised("neither pull conducts for some inputs: it can float")
    arcs = all_arcs(own, node, Pulls(up, down, possible), relations)
    return Driver(
        node=node,
        switches=tuple(indices),
        up=ways[0],
        down=ways[1],
        arcs=tuple(_renumbered(arc, indices) for arc in arcs),
        kind=_kind(up_at_all=bool(up.any()), down_at_all=bool(down.any()), always=always),
        function=_function(own, node, *ways, always=always),
        always=always,
    )


def enabled_function(
    network: Network, output: int, complements: Iterable[tuple[int, int]]
) -> Expression | None:
    """Return what a gate that can float makes of its inputs, and when it drives.

    None where nothing is common to all ways to both supplies.
    """
    literals = Literals((a, b, False) for a, b in complements)
    indices = list(range(len(network.switches)))
    up, down = (_ways(network, output, supply, indices, literals) for supply in (HIGH, LOW))
    if not up or not down or not _enable(up, down):
        return None
    return _function(network, output, up, down, always=False)


def outside(node: int, literals: Literals) -> Driver:
    """Return the driver of a node that the outside drives."""
    high, low = (literals.condition(node, value=value) for value in (True, False))
    ways = [(Way((), frozenset({one})),) for one in (high, low)]
    return Driver(node, (), ways[0], ways[1], (), "input", Literal(node), always=True)


def _kind(*, up_at_all: bool, down_at_all: bool, always: bool) -> str:
    if always:
        return "static gate"
    if up_at_all and down_at_all:
        return "tri-state gate"
    return "pull-up network" if up_at_all else "pull-down network"


def _function(
    own: Network, node: int, up: Sequence[Way], down: Sequence[Way], *, always: bool
) -> Expression:
    """Return what a driver makes of its inputs, and when it drives."""
    if always:
        return Not(conduction(own, node, LOW, "n"))
    ups, downs = [way.cube for way in up], [way.cube for way in down]
    if not downs:
        return When(ONE, sum_of(ups))
    if not ups:
        return When(ZERO, sum_of(downs))
    common = _enable(up, down)
    return When(Not(sum_of([cube - common for cube in downs])), sum_of([common]))


def _enable(up: Sequence[Way], down: Sequence[Way]) -> Cube:
    """Return what all ways to both supplies have in common: when a tri-state gate drives."""
    return frozenset.intersection(*(way.cube for way in (*up, *down)))


def sum_of(cubes: Sequence[Cube]) -> Expression:
    """Return the disjunction of cubes, the shortest first; none of them twice or implied."""
    kept: list[Cube] = []
    for cube in sorted(set(cubes), key=lambda one: (len(one), sorted(one))):
        if not any(other <= cube for other in kept):
            kept.append(cube)
    return disjunction(
        conjunction(Literal(net) if value else Not(Literal(net)) for net, value in sorted(cube))
        for cube in kept
    )


def _ways(
    own: Network, node: int, supply: int, indices: list[int], literals: Literals
) -> tuple[Way, ...]:
    """Return the paths to a supply that can conduct."""
    found = []
    for path in (
        own.paths(node, supply, frozenset(range(len(indices)))) if supply in own.at_node else ()
    ):
        cube = consistent(frozenset(), (closing(own.switches[i], literals) for i in path))
        if cube is not None:
            found.append(Way(tuple(indices[i] for i in path), cube))
    return tuple(found)


def closing(switch: Switch, literals: Literals) -> Condition:
    """Return when a switch conducts."""
    return literals.condition(switch.gate, value=switch.polarity == "n")


def _renumbered(arc: ArcForm, indices: list[int]) -> ArcForm:
    return replace(
        arc,
        path=tuple(indices[i] for i in arc.path),
        behind=tuple((node, indices[i]) for node, i in arc.behind),
    )


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
