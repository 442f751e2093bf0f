"""One channel-connected network of switches: what it conducts, and along which paths.

A network is what is left of a channel-connected group when widths and names are taken away:
switches between local nodes, each closed by one input. Groups with equal networks are recognised
once.

Fingers are merged first. Two inner nodes that see the same switches towards the same neighbours
always carry the same voltage, whatever the inputs, so they are one node drawn several times (folded
stacks); the coarsest such partition is found by refinement, as for bisimilar states (Paige and
Tarjan, SIAM Journal on Computing 16(6), 1987). Switches between the same nodes with the same input
are then one switch. Conduction is unchanged: every closed walk of the merged network lifts to one
of the drawn.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from evenstage.circuit.truth import packed, unpacked

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.netlist.devices import IntArray

BoolArray = NDArray[np.bool_]

HIGH = -1
"""Node of the high supply; as an input it is always 1."""
LOW = -2
"""Node of the low supply; as an input it is always 0."""


@dataclass(frozen=True, slots=True)
class Switch:
    """A transistor without its size: ``n`` closes at input 1, ``p`` at input 0."""

    polarity: str
    a: int
    gate: int
    b: int

    def other(self, node: int) -> int:
        """Return the end that is not ``node``."""
        return self.b if node == self.a else self.a


@dataclass(frozen=True)
class Network:
    """Merged switches between merged nodes.

    Parameters
    ----------
    switches : tuple of Switch
        Switches that can both open and close, or are always closed.
    switch_of_device : tuple of int
        For each drawn device the merged switch it is part of; -1 for one that can never conduct
        (shorted, or held off by a supply) and only adds capacitance.
    node_of_net : tuple of int
        For each local net of the drawing the merged node.
    inputs : tuple of int
        Nets that close and open switches, in order of first appearance.
    """

    switches: tuple[Switch, ...]
    switch_of_device: tuple[int, ...]
    node_of_net: tuple[int, ...]
    inputs: tuple[int, ...]

    @cached_property
    def at_node(self) -> dict[int, tuple[int, ...]]:
        """Switch indices at each node, in drawing order."""
        found: dict[int, list[int]] = {}
        for index, switch in enumerate(self.switches):
            found.setdefault(switch.a, []).append(index)
            found.setdefault(switch.b, []).append(index)
        return {node: tuple(indices) for node, indices in found.items()}

    @cached_property
    def near(self) -> dict[int, tuple[tuple[int, int], ...]]:
        """Switches at each node with the node at their other end, in drawing order."""
        return {
            node: tuple((index, self.switches[index].other(node)) for index in indices)
            for node, indices in self.at_node.items()
        }

    @cached_property
    def inner_nodes(self) -> tuple[int, ...]:
        """Nodes that are not supplies, ascending."""
        return tuple(sorted(node for node in self.at_node if node >= 0))

    @cached_property
    def first_devices(self) -> IntArray:
        """The first drawn device of each switch, shape ``(switches,)``."""
        places = [self.switch_of_device.index(index) for index in range(len(self.switches))]
        return np.array(places, np.int32)

    @cached_property
    def driven_nodes(self) -> tuple[int, ...]:
        """Nodes where a p and an n switch meet: the places that can be pulled both ways."""
        return tuple(
            node
            for node in self.inner_nodes
            if {self.switches[i].polarity for i in self.at_node[node]} == {"n", "p"}
        )

    @cached_property
    def vectors(self) -> BoolArray:
        """All input vectors, shape ``(inputs, 2**inputs)``."""
        count = len(self.inputs)
        return (np.arange(1 << count) >> np.arange(count)[:, None] & 1).astype(bool)

    @cached_property
    def closed(self) -> BoolArray:
        """Which switches are closed under each vector, shape ``(switches, 2**inputs)``."""
        rows = {net: row for row, net in enumerate(self.inputs)}
        table = np.empty((len(self.switches), self.vectors.shape[1]), bool)
        for index, switch in enumerate(self.switches):
            level = self.vectors[rows[switch.gate]] if switch.gate >= 0 else switch.gate == HIGH
            table[index] = level if switch.polarity == "n" else np.logical_not(level)
        return table

    @cached_property
    def closed_bits(self) -> tuple[int, ...]:
        """When each switch is closed, as `evenstage.circuit.truth` writes it."""
        return tuple(packed(row) for row in self.closed)

    def closed_under(self, vector: int) -> frozenset[int]:
        """Return the switches that one input vector closes."""
        known = self._closed_under
        if vector not in known:
            bit = 1 << vector
            known[vector] = frozenset(i for i, bits in enumerate(self.closed_bits) if bits & bit)
        return known[vector]

    @cached_property
    def _closed_under(self) -> dict[int, frozenset[int]]:
        """The switches that vectors close, as far as they were asked for."""
        return {}

    def conducts(self, start: int, end: int, polarities: str = "np") -> BoolArray:
        """Tell for each vector whether closed switches join two nodes, shape ``(2**inputs,)``.

        The way never leads through a supply, and only through switches of the given polarities.
        """
        vectors = 1 << len(self.inputs)
        if start not in self.at_node or end not in self.at_node:
            return np.zeros(vectors, bool)
        reached = {**dict.fromkeys(self.at_node, 0), start: (1 << vectors) - 1}
        usable = [s.polarity in polarities for s in self.switches]
        waiting = [start]
        while waiting:
            here = waiting.pop()
            for index, there in self.near[here] if here >= 0 or here == start else ():
                more = reached[here] & self.closed_bits[index] & ~reached[there]
                if more and usable[index]:
                    reached[there] |= more
                    waiting.append(there)
        return unpacked(reached[end], vectors)

    def paths(self, start: int, end: int, usable: frozenset[int]) -> Iterator[tuple[int, ...]]:
        """Yield the simple paths between two nodes through usable switches, in drawing order."""
        stack: list[tuple[int, tuple[int, ...], tuple[int, ...]]] = [(start, (), (start,))]
        while stack:
            node, path, visited = stack.pop()
            if node == end:
                yield path
                continue
            for index, following in reversed(self.near[node]):
                if index in usable and following not in visited:
                    if following < 0 and following != end:
                        continue
                    stack.append((following, (*path, index), (*visited, following)))

    def condition(self, path: tuple[int, ...]) -> frozenset[tuple[int, str]]:
        """Return what must hold for a path to conduct: gate and polarity of its switches."""
        return frozenset((self.switches[i].gate, self.switches[i].polarity) for i in path)

    def nodes_along(self, path: tuple[int, ...]) -> list[tuple[int, int]]:
        """Return the nodes of a path to a supply, each with the switches left from there."""
        node = self._start(path)
        found = [(node, len(path))]
        for left, index in zip(range(len(path) - 1, 0, -1), path[:-1], strict=True):
            node = self.switches[index].other(node)
            found.append((node, left))
        return found

    def _start(self, path: tuple[int, ...]) -> int:
        """Return the node a path begins at: the end of its first switch that its second lacks."""
        first = self.switches[path[0]]
        if len(path) == 1:
            return first.a if first.a >= 0 else first.b
        second = self.switches[path[1]]
        return first.a if first.b in (second.a, second.b) else first.b

    def apart(self, paths: Sequence[tuple[int, ...]]) -> list[tuple[int, ...]]:
        """Return the first of some paths, and the others as far as they share no node inside."""
        found, met = [], set[int]()
        for path in paths:
            inner = {node for node, _ in self.nodes_along(path)[1:]}
            if not inner & met:
                found.append(path)
                met |= inner
        return found


def merge(devices: Sequence[Switch], apart: frozenset[int] = frozenset()) -> Network:
    """Merge the fingers of a drawn network.

    Parameters
    ----------
    devices : sequence of Switch
        As drawn: local nets count from 0; supplies are HIGH and LOW.
    apart : frozenset of int
        Nets that are signals: never merged with others.
    """
    nets = 1 + max((max(d.a, d.gate, d.b) for d in devices), default=-1)
    active = [d.a != d.b and not _held_off(d) for d in devices]
    node_of_net = _merged_nodes(devices, active, nets, apart)
    switches: dict[tuple[str, int, int, int], int] = {}
    switch_of_device = []
    for device, is_active in zip(devices, active, strict=True):
        ends = sorted(_at(node_of_net, net) for net in (device.a, device.b))
        key = (device.polarity, ends[0], device.gate, ends[1])
        switch_of_device.append(switches.setdefault(key, len(switches)) if is_active else -1)
    inputs = dict.fromkeys(gate for _, _, gate, _ in switches if gate >= 0)
    return Network(
        tuple(Switch(p, a, g, b) for p, a, g, b in switches),
        tuple(switch_of_device),
        node_of_net,
        tuple(inputs),
    )


def _held_off(device: Switch) -> bool:
    """Tell whether a supply on its gate keeps a device open for ever."""
    return device.gate == (LOW if device.polarity == "n" else HIGH)


def _at(node_of_net: Sequence[int], net: int) -> int:
    return node_of_net[net] if net >= 0 else net


def _merged_nodes(
    devices: Sequence[Switch], active: list[bool], nets: int, apart: frozenset[int]
) -> tuple[int, ...]:
    """Return for each net the smallest net of its class under the coarsest stable partition."""
    touching: dict[int, list[tuple[Switch, int]]] = {}
    for device, is_active in zip(devices, active, strict=True):
        if is_active:
            touching.setdefault(device.a, []).append((device, device.b))
            touching.setdefault(device.b, []).append((device, device.a))
    polarity = {net: {d.polarity for d, _ in near} for net, near in touching.items()}
    # Only nodes inside one pull network may merge: anything pulled both ways is an output, and a
    # net that is also an input is seen from outside.
    seen_outside = apart | {device.gate for device in devices}
    inner = [n for n in range(nets) if len(polarity.get(n, ())) == 1 and n not in seen_outside]
    block = {net: net for net in range(nets)} | {HIGH: HIGH, LOW: LOW} | dict.fromkeys(inner, -3)
    while True:
        signature = {
            net: (
                block[net],
                frozenset((d.polarity, d.gate, block[far]) for d, far in touching[net]),
            )
            for net in inner
        }
        first: dict[object, int] = {}
        refined = block | {net: first.setdefault(signature[net], net) for net in inner}
        if refined == block:
            return tuple(block[net] for net in range(nets))
        block = refined
