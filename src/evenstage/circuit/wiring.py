"""The wires of a block as its gates drive them.

A net with resistance is driven from the nodes where channels of its driver end, and seen at the
nodes of the gates it enters. Which nodes drive depends on the edge and, where several gates drive
one net, on the gate. So each net is taken once for every set of nodes that drives it; all these
copies are one RC network. What wires look like does not depend on widths: a sizing finds this once.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.circuit.arcs import ranges
from evenstage.circuit.rc_network import RCNetwork

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import Devices, FloatArray, IntArray, Wires

#: Wire resistance counts with the ln 2 of an RC response, as that of transistors does.
_SHARE: Final = math.log(2)

#: Driver of nets that no gate drives.
_OUTSIDE: Final = -1


@dataclass(frozen=True)
class Wiring:
    """Every net with resistance, once for each set of nodes that drives it.

    Parameters
    ----------
    node : IntArray, shape (copies,)
        The node of `evenstage.netlist.devices.Wires` that each copy is of.
    head : IntArray, shape (drives + 1,)
        Copies of drive d are ``head[d]:head[d + 1]``.
    net : IntArray, shape (drives,)
    rank : IntArray, shape (nodes,)
        Place of each node among the copies of a drive of its net.
    network : RCNetwork
        Of the copies.
    named : IntArray, shape (drives,)
        Copy of the node that carries the net's name: where an outside load hangs.
    source_key, source_drive : IntArray, shape (sources,)
        Which drive a gate's edge on a net is; ascending keys, see `drives`.
    sink_key, sink_rank : IntArray, shape (sinks of nets,)
        Which of its net's sinks a gate's pin is; ascending keys, see `sinks`.
    sink_head : IntArray, shape (drives,)
        Where the sinks of each drive begin in ``sink``.
    sink : IntArray, shape (sinks of drives,)
        Copy at which each sink hangs.
    gates : int
        How many gates the block has.
    """

    node: IntArray
    head: IntArray
    net: IntArray
    rank: IntArray
    network: RCNetwork
    named: IntArray
    source_key: NDArray[np.int64]
    source_drive: IntArray
    sink_key: NDArray[np.int64]
    sink_rank: IntArray
    sink_head: IntArray
    sink: IntArray
    gates: int

    @cached_property
    def drive(self) -> IntArray:
        """The drive of each copy."""
        return np.repeat(np.arange(len(self.net), dtype=np.int32), np.diff(self.head))

    def drives(self, gate: IntArray, net: IntArray, rising: BoolArray) -> IntArray:
        """Return the drive of edges that gates make on nets; -1 on nets without resistance.

        Where a gate has no transistors for an edge, those for the other one drive it; for a net
        that is driven from elsewhere, any of its drives.
        """
        found = _looked_up(
            self.source_key, self.source_drive, _keys(net, gate, rising, gates=self.gates)
        )
        other = _looked_up(
            self.source_key, self.source_drive, _keys(net, gate, ~rising, gates=self.gates)
        )
        return np.where(found >= 0, found, np.where(other >= 0, other, self.any_drive(net)))

    def any_drive(self, net: IntArray) -> IntArray:
        """Return the first drive of each net; -1 for nets without resistance."""
        order = np.argsort(self.net, kind="stable").astype(np.int32)
        return _looked_up(self.net[order].astype(np.int64), order, net.astype(np.int64))

    def sinks(self, gate: IntArray, net: IntArray, n_switches: BoolArray) -> IntArray:
        """Return the place of pins among the sinks of their nets; -1 on nets without resistance.

        A pin hangs where the gates of its n, or else its p transistors do: those that switch.
        """
        found, other = (
            _looked_up(self.sink_key, self.sink_rank, _keys(net, gate, kind, gates=self.gates))
            for kind in (n_switches, ~n_switches)
        )
        return np.where(found >= 0, found, other)


def find_wiring(
    devices: Devices, gate_of_device: IntArray, outputs: IntArray, is_supply: BoolArray
) -> Wiring | None:
    """Find the wires of a block; None where no net has resistance.

    Parameters
    ----------
    devices : Devices
    gate_of_device : IntArray, shape (devices,)
        -1 for none.
    outputs : IntArray
        Nets that gates drive. Resistance on other nets inside gates counts for nothing.
    is_supply : BoolArray, shape (nets,)
    """
    wires = devices.wires
    if wires is None:
        return None
    gates = int(gate_of_device.max(initial=-1)) + 1
    key, place = _sources(devices, wires, gate_of_device, outputs, is_supply)
    source_key, drive, net, driven = _merged(key, place, wires)
    if not len(net):
        return None
    order = np.argsort(wires.net, kind="stable").astype(np.int32)
    by_net = np.searchsorted(wires.net[order], np.stack([net, net + 1]))
    count = by_net[1] - by_net[0]
    head = np.concatenate([[0], np.cumsum(count)]).astype(np.int32)
    node = order[ranges(by_net[0], count)]
    rank = np.empty(len(order), np.int32)
    rank[order] = np.arange(len(order)) - np.searchsorted(wires.net[order], wires.net[order])
    held = np.zeros(len(node), bool)
    held[head[driven[0]] + rank[driven[1]]] = True
    network = _network(wires, net, head, rank, held)
    pins = _pins(devices, wires, gate_of_device, is_supply, gates)
    sink_key, sink_rank, sink_head, sink = _sinks(pins, wires, net, head, rank, network)
    return Wiring(
        node=node,
        head=head,
        net=net,
        rank=rank,
        network=network,
        named=head[:-1] + rank[wires.head[net]],
        source_key=source_key,
        source_drive=drive,
        sink_key=sink_key,
        sink_rank=sink_rank,
        sink_head=sink_head,
        sink=sink,
        gates=gates,
    )


def _keys(net: IntArray, gate: IntArray, flag: BoolArray, *, gates: int) -> NDArray[np.int64]:
    """Return a number for each net, gate (-1 for none) and flag, ascending by net."""
    wide = net.astype(np.int64) * (gates + 1) + gate + 1
    return wide * 2 + flag


def _looked_up(keys: NDArray[np.int64], values: IntArray, wanted: NDArray[np.int64]) -> IntArray:
    """Return the values of wanted keys among ascending ones; -1 for those that are missing."""
    if not len(keys):
        return np.full(len(wanted), -1, np.int32)
    place = np.minimum(np.searchsorted(keys, wanted), len(keys) - 1)
    return np.where(keys[place] == wanted, values[place], -1).astype(np.int32)


def _sources(
    devices: Devices,
    wires: Wires,
    gate_of_device: IntArray,
    outputs: IntArray,
    is_supply: BoolArray,
) -> tuple[NDArray[np.int64], IntArray]:
    """Return key and node of everything that drives a net with resistance.

    Gates drive where their channels end, for each edge through the transistors that pull that way;
    a net that no gate drives is driven at the node that carries its name.
    """
    gates = int(gate_of_device.max(initial=-1)) + 1
    rises = np.array([model.polarity == "p" for model in devices.models], bool)[devices.model]
    driven = np.zeros(len(devices.net_names), bool)
    driven[outputs] = True
    node = np.concatenate([wires.drain, wires.source])
    gate, edge = np.tile(gate_of_device, 2), np.tile(rises, 2)
    kept = np.flatnonzero((node >= 0) & (gate >= 0))
    kept = kept[driven[wires.net[node[kept]]] & ~is_supply[wires.net[node[kept]]]]
    nets = np.unique(wires.net)
    nets = nets[~driven[nets] & ~is_supply[nets]]
    outside = np.full(len(nets), _OUTSIDE)
    key = np.concatenate(
        [
            _keys(wires.net[node[kept]], gate[kept], edge[kept], gates=gates),
            _keys(nets, outside, np.zeros(len(nets), bool), gates=gates),
        ]
    )
    place = np.concatenate([node[kept], wires.head[nets]])
    pair = np.unique(key * (len(wires.net) + 1) + place)
    return pair // (len(wires.net) + 1), (pair % (len(wires.net) + 1)).astype(np.int32)


def _merged(
    key: NDArray[np.int64], node: IntArray, wires: Wires
) -> tuple[NDArray[np.int64], IntArray, IntArray, tuple[IntArray, IntArray]]:
    """Return keys with their drives, the drives' nets, and which nodes are driven in which drive.

    Equal sets of nodes are one drive. Sets are told apart by sums of scrambled node numbers, which
    differ but for one chance in 2^64.
    """
    first = np.flatnonzero(np.diff(key, prepend=-1))
    scrambled = np.add.reduceat(_scrambled(node), first) if len(first) else np.zeros(0, np.uint64)
    net = wires.net[node[first]]
    order = np.lexsort((scrambled, net))
    fresh = (np.diff(net[order], prepend=-1) != 0) | (
        np.concatenate([[True], np.diff(scrambled[order]) != 0])[: len(order)]
    )
    drive = np.empty(len(first), np.int32)
    drive[order] = np.cumsum(fresh) - 1
    entry = np.repeat(drive, np.diff(first, append=len(key)))
    net_of_drive = np.zeros(int(drive.max(initial=-1)) + 1, np.int32)
    net_of_drive[drive] = net
    return key[first], drive, net_of_drive, (entry, node)


def _scrambled(number: IntArray) -> NDArray[np.uint64]:
    """Return numbers as by chance (the mixer of Steele, Lea and Flood, OOPSLA 2014)."""
    mixed = (number.astype(np.uint64) + np.uint64(1)) * np.uint64(0x9E3779B97F4A7C15)
    mixed = (mixed ^ (mixed >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    mixed = (mixed ^ (mixed >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    scrambled: NDArray[np.uint64] = mixed ^ (mixed >> np.uint64(31))
    return scrambled


def _network(
    wires: Wires, net: IntArray, head: IntArray, rank: IntArray, driven: BoolArray
) -> RCNetwork:
    """Return the resistors of every copy of every net."""
    of_net = wires.net[wires.ends[0]]
    order = np.argsort(of_net, kind="stable")
    bounds = np.searchsorted(of_net[order], np.stack([net, net + 1]))
    count = bounds[1] - bounds[0]
    which = order[ranges(bounds[0], count)]
    ends = np.repeat(head[:-1], count) + rank[wires.ends[:, which]]
    return RCNetwork(ends, _SHARE * wires.resistance[which], driven)


def _pins(
    devices: Devices,
    wires: Wires,
    gate_of_device: IntArray,
    is_supply: BoolArray,
    gates: int,
) -> tuple[NDArray[np.int64], IntArray]:
    """Return key and node of each transistor of a gate whose own gate hangs on a wire, by key."""
    is_n = np.array([model.polarity == "n" for model in devices.models], bool)[devices.model]
    kept = np.flatnonzero((wires.gate >= 0) & (gate_of_device >= 0) & ~is_supply[devices.gate])
    key = _keys(devices.gate[kept], gate_of_device[kept], is_n[kept], gates=gates)
    order = np.argsort(key, kind="stable")
    return key[order], wires.gate[kept][order]


def _sinks(
    pins: tuple[NDArray[np.int64], IntArray],
    wires: Wires,
    net: IntArray,
    head: IntArray,
    rank: IntArray,
    network: RCNetwork,
) -> tuple[NDArray[np.int64], IntArray, IntArray, IntArray]:
    """Return keys and ranks of the sinks of nets, and for each drive the copies they hang at.

    Of several transistors of one gate the one that hangs farthest from the driver counts: where the
    response would be latest, were the capacitance spread evenly.
    """
    key, node = pins
    first = np.flatnonzero(np.diff(key, prepend=-1))
    net_of_sink = wires.net[node[first]]
    bounds = np.searchsorted(net_of_sink, np.stack([net, net + 1]))
    count = bounds[1] - bounds[0]
    which = ranges(bounds[0], count)
    begin, end = first[which], np.append(first, len(key))[which + 1]
    candidate = ranges(begin, end - begin)
    base = np.repeat(np.repeat(head[:-1], count), end - begin)
    copy = base + rank[node[candidate]]
    far = network.voltages(np.ones(len(network)))[copy]
    owner = np.repeat(np.arange(len(which)), end - begin)
    order = np.lexsort((-np.arange(len(copy)), far, owner))
    last = np.flatnonzero(np.diff(owner[order], append=-1))
    ranks = np.arange(len(first)) - np.searchsorted(net_of_sink, net_of_sink)
    sink_head = (np.cumsum(count) - count).astype(np.int32)
    return key[first], ranks.astype(np.int32), sink_head, copy[order][last].astype(np.int32)


@dataclass(frozen=True)
class WireLoads:
    """What wires amount to at given widths.

    Parameters
    ----------
    wiring : Wiring
    capacitance : FloatArray, F, shape (copies,)
    first, second : FloatArray, s and s^2, shape (copies,)
        Moments of the response at each copy, its driver's nodes stepping.
    """

    wiring: Wiring
    capacitance: FloatArray
    first: FloatArray
    second: FloatArray

    @cached_property
    def weighted_first(self) -> FloatArray:
        """Capacitance times first moment, summed over each drive, F s, shape (drives,)."""
        return self._summed(self.capacitance * self.first)

    @cached_property
    def weighted_second(self) -> FloatArray:
        """Capacitance times second moment, summed over each drive, F s^2, shape (drives,)."""
        return self._summed(self.capacitance * self.second)

    def _summed(self, value: FloatArray) -> FloatArray:
        return np.bincount(self.wiring.drive, value, len(self.wiring.net)).astype(np.float64)


def wire_loads(wiring: Wiring, node_capacitance: FloatArray) -> WireLoads:
    """Return what wires amount to when their nodes hold so much capacitance, F, shape (nodes,)."""
    capacitance = node_capacitance[wiring.node]
    first, second = wiring.network.moments(capacitance)
    return WireLoads(wiring, capacitance, first, second)
