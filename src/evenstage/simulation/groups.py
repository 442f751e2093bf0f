"""Transistors that channels join, apart from the supplies: what switches as one.

A gate is such a group, and so are the drivers, transmission gates and pass transistors between them
that lead to one output.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from evenstage.circuit.evaluation import switches
from evenstage.simulation.logic import part_of

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.logic.switches import Switches
    from evenstage.netlist.devices import IntArray
    from evenstage.simulation.logic import Part


@dataclass(frozen=True)
class Groups:
    """The channel-connected groups of a circuit."""

    circuit: Circuit

    @cached_property
    def of_net(self) -> IntArray:
        """Group of each net; -1 for supplies, shape (nets,)."""
        block, is_supply = self.circuit.devices, self.circuit.supplies.is_supply
        inner = ~is_supply[block.drain] & ~is_supply[block.source]
        ends = block.drain[inner], block.source[inner]
        size = (len(is_supply), len(is_supply))
        links = coo_array((np.ones(len(ends[0]), np.int8), ends), shape=size)
        _, label = connected_components(links, directed=False)
        return np.where(is_supply, -1, label)

    @cached_property
    def of_device(self) -> IntArray:
        """Group of each device; -1 between supplies, shape (n,)."""
        block = self.circuit.devices
        return np.maximum(self.of_net[block.drain], self.of_net[block.source])

    @cached_property
    def complements(self) -> tuple[tuple[int, int], ...]:
        """Pairs of nets that the two polarities of transmission gates take for complements."""
        pairs = {
            (int(nets[a]), int(nets[b]))
            for some in self.circuit.stages
            for a, b in some.form.assumed
            for nets in some.nets
        }
        return tuple(sorted(pairs))

    @cached_property
    def every(self) -> Switches:
        """All devices as switches between nets."""
        return switches(self.circuit)

    def part(self, group: int) -> Part:
        """Return the devices of a group as switches."""
        return part_of(self.every, self.devices(group))

    @cached_property
    def _in_order(self) -> IntArray:
        return np.argsort(self.of_device, kind="stable")

    def devices(self, group: int) -> IntArray:
        """Return the device ids of a group, ascending."""
        order = self._in_order
        begin, end = np.searchsorted(self.of_device[order], [group, group + 1])
        return order[int(begin) : int(end)]

    def inputs(self, group: int, start: int | None = None) -> list[int]:
        """Return the nets that decide what a group does, ascending.

        Those on its transistors' gates, and those of its own nets that come from outside the block.

        Parameters
        ----------
        group : int
        start : int, optional
            A net that counts as coming from outside.
        """
        block, devices = self.circuit.devices, self.devices(group)
        own = np.unique(np.concatenate([block.drain[devices], block.source[devices]]))
        ports = np.isin(own, np.array(block.ports, int)) & (self.circuit.driver_of_net[own] < 0)
        gates = np.unique(block.gate[devices])
        outside = gates[self.of_net[gates] != group]
        nets = np.union1d(outside, own[ports | (own == (-1 if start is None else start))])
        return [int(net) for net in nets[~self.circuit.supplies.is_supply[nets]]]
