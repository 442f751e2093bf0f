"""Devices and nets to equations: which nets are nodes, what is given, and what loads them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.simulation.equations import Equations
from evenstage.simulation.parameters import ROUNDING_SHARE

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import Devices, FloatArray, IntArray
    from evenstage.simulation.parameters import Parameters

LOW: Final = -1
"""Net of the node that stands for the low supply wherever no other does."""
OUTSIDE: Final = -2
"""Net of the node behind the resistance of an outside driver."""

#: Every node has at least this share of the smallest gate's capacitance, so that none has none.
_LEAST_SHARE: Final = 1e-3


@dataclass(frozen=True)
class Layout:
    """Part of a circuit as equations.

    Parameters
    ----------
    equations : Equations
    net : IntArray, shape (nodes,)
        Net of each node, the unknown ones first; LOW for the low supply, OUTSIDE for what is behind
        an outside driver. The nodes of a net with resistance share it.
    place : IntArray, shape (nodes,)
        Which of its net's nodes each is, as `Places` numbers them.
    places : Places
    devices : IntArray, shape (devices,)
        Device ids, in the order of the equations.
    """

    equations: Equations
    net: IntArray
    place: IntArray
    places: Places
    devices: IntArray

    def node(self, place: int) -> int:
        """Return the node at a place."""
        return int(np.flatnonzero(self.place == place)[0])


@dataclass(frozen=True)
class Places:
    """Where things hang: on a net, or on one of the nodes that resistance parts a net into.

    Nets come first, by id, then the nodes of nets with resistance.

    Parameters
    ----------
    net : IntArray, shape (places,)
    named : IntArray, shape (nets,)
        The place that carries each net's name.
    drain, gate, source : IntArray, shape (n,)
        Of each transistor.
    capacitor : IntArray, shape (2, k)
        Of each capacitor card.
    resistor : IntArray, shape (2, r)
    resistance : FloatArray, ohm, shape (r,)
    """

    net: IntArray
    named: IntArray
    drain: IntArray
    gate: IntArray
    source: IntArray
    capacitor: IntArray
    resistor: IntArray
    resistance: FloatArray


def places_of(devices: Devices, held: BoolArray) -> Places:
    """Return the places of a block; nets that are held have only one, whatever their resistance.

    Parameters
    ----------
    devices : Devices
    held : BoolArray, shape (nets,)
    """
    nets, wires = np.arange(len(devices.net_names)), devices.wires
    if wires is None:
        return Places(
            net=nets,
            named=nets,
            drain=devices.drain,
            gate=devices.gate,
            source=devices.source,
            capacitor=devices.capacitor_nets,
            resistor=np.zeros((2, 0), np.int64),
            resistance=np.zeros(0),
        )

    def at(net: IntArray, node: IntArray) -> IntArray:
        return np.where((node >= 0) & ~held[net], len(nets) + node, net)

    free = ~held[wires.net[wires.ends[0]]]
    return Places(
        net=np.concatenate([nets, wires.net]),
        named=at(nets, wires.head),
        drain=at(devices.drain, wires.drain),
        gate=at(devices.gate, wires.gate),
        source=at(devices.source, wires.source),
        capacitor=at(devices.capacitor_nets, wires.capacitor),
        resistor=len(nets) + wires.ends[:, free],
        resistance=wires.resistance[free],
    )


def lay_out(
    circuit: Circuit,
    parameters: Parameters,
    devices: IntArray,
    held: IntArray,
    source: int,
    *,
    drive: float = 0.0,
) -> Layout:
    """Lay some devices of a circuit out for simulation.

    Pins of gates that are left out load their nets as capacitances.

    Parameters
    ----------
    circuit : Circuit
    parameters : Parameters
        Of all devices.
    devices : IntArray
        The devices to simulate.
    held : IntArray
        Nets whose voltage is constant, the supplies aside.
    source : int
        A net that is driven from outside, at the place that carries its name.
    drive : float
        ohm; through this resistance.
    """
    block = circuit.devices
    constant = circuit.supplies.is_supply.copy()
    constant[held] = True
    spots = places_of(block, constant)
    ends = (spots.drain[devices], spots.gate[devices], spots.source[devices], block.bulk[devices])
    met = np.zeros(len(spots.net), bool)
    met[np.concatenate([*ends, spots.named[[source]]])] = True
    # All nodes of a net with resistance, those aside where nothing hangs that counts.
    nets = np.zeros(len(block.net_names), bool)
    nets[spots.net[met]] = True
    met[spots.resistor[:, nets[spots.net[spots.resistor[0]]]]] = True
    given = constant[spots.net]
    given[spots.named[source]] = drive == 0
    unknown, known = np.flatnonzero(met & ~given), np.flatnonzero(met & given)
    count, ground = len(unknown), len(unknown) + len(known)
    outside = [OUTSIDE] if drive > 0 else []
    place = np.concatenate([unknown, known, [LOW], outside]).astype(np.int64)
    node = np.full(len(spots.net), ground, np.int64)
    node[place[:ground]] = np.arange(ground)
    joined = (node[spots.resistor] < ground).all(axis=0)
    resistors, resistance = node[spots.resistor[:, joined]], spots.resistance[joined]
    if drive > 0:
        way = np.array([[node[spots.named[source]]], [ground + 1]])
        resistors, resistance = np.hstack([resistors, way]), np.append(resistance, drive)
    capacitors, capacitance = _capacitors(circuit, parameters, devices, spots, node, count)
    return Layout(
        equations=Equations(
            unknown=count,
            given=len(place) - count,
            channels=parameters.channels.take(devices),
            drain=node[ends[0]],
            gate=node[ends[1]],
            source=node[ends[2]],
            bulk=node[ends[3]],
            capacitor_ends=capacitors,
            capacitance=capacitance,
            resistor_ends=resistors,
            resistance=resistance,
            rounding=ROUNDING_SHARE * circuit.process.supply,
        ),
        net=np.where(place >= 0, spots.net[np.maximum(place, 0)], place),
        place=place,
        places=spots,
        devices=devices,
    )


def _capacitors(
    circuit: Circuit,
    parameters: Parameters,
    devices: IntArray,
    spots: Places,
    node: IntArray,
    unknown: int,
) -> tuple[IntArray, FloatArray]:
    """Return ends and values of all capacitors that touch unknown nodes, cards and devices."""
    block = circuit.devices
    ground = node.max()
    load = np.zeros(unknown + len(node))
    np.add.at(load, node, _loads(circuit, devices, spots))
    gates = (parameters.gate_bulk + parameters.gate_source + parameters.gate_drain)[devices]
    load = np.maximum(load[:unknown], _LEAST_SHARE * gates.min())
    d, g, s, b = (node[end[devices]] for end in (spots.drain, spots.gate, spots.source, block.bulk))
    cards = node[spots.capacitor]
    touching = np.flatnonzero((cards < unknown).any(axis=0))
    pairs = [
        (g, b, parameters.gate_bulk[devices]),
        (g, s, parameters.gate_source[devices]),
        (g, d, parameters.gate_drain[devices]),
        (d, b, parameters.drain_bulk[devices]),
        (s, b, parameters.source_bulk[devices]),
        (*cards[:, touching], block.capacitance[touching]),
        (np.arange(unknown), np.full(unknown, ground), load),
    ]
    ends = np.stack([np.concatenate([pair[i] for pair in pairs]) for i in (0, 1)])
    return ends, np.concatenate([pair[2] for pair in pairs])


def _loads(circuit: Circuit, devices: IntArray, spots: Places) -> FloatArray:
    """Return what loads each place besides the chosen devices and capacitor cards, F."""
    values = circuit.electrical
    left = np.ones(len(circuit.devices))
    left[devices] = 0.0
    load: FloatArray = np.zeros(len(spots.net))
    np.add.at(load, spots.named, circuit.outside_cap)
    for end, cap in (
        (spots.gate, values.gate.today),
        (spots.drain, values.drain.today),
        (spots.source, values.source.today),
    ):
        np.add.at(load, end, cap * left)
    return load
