"""Devices and nets to equations: which nets are nodes, what is given, and what loads them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.simulation.equations import Equations
from evenstage.simulation.parameters import ROUNDING_SHARE

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.parameters import Parameters

#: Every node has at least this share of the mean gate's capacitance, so that none is without any.
_LEAST_SHARE: Final = 1e-3


@dataclass(frozen=True)
class Layout:
    """Part of a circuit as equations.

    Parameters
    ----------
    equations : Equations
    net : IntArray, shape (nodes,)
        Net of each node, the unknown ones first; -1 for the low supply, -2 for outside drivers.
    devices : IntArray, shape (devices,)
        Device ids, in the order of the equations.
    """

    equations: Equations
    net: IntArray
    devices: IntArray

    def node(self, net: int) -> int:
        """Return the node of a net."""
        return int(np.flatnonzero(self.net == net)[0])


def lay_out(
    circuit: Circuit,
    parameters: Parameters,
    devices: IntArray,
    given: IntArray,
    *,
    drive: tuple[int, float] | None = None,
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
    given : IntArray
        Nets whose voltage is given, the supplies aside; ascending.
    drive : (int, float), optional
        A net that a resistance (ohm) joins to a given node of its own, the last.
    """
    block = circuit.devices
    ends = (block.drain, block.gate, block.source, block.bulk)
    every = np.unique(np.concatenate([end[devices] for end in ends]))
    is_given = circuit.supplies.is_supply.copy()
    is_given[given] = True
    unknown = every[~is_given[every]]
    known = np.union1d(every[is_given[every]], given)
    count = len(unknown)
    outside = [] if drive is None else [-2]
    net = np.concatenate([unknown, known, [-1], outside]).astype(np.int64)
    node = np.full(len(block.net_names), count + len(known), np.int64)
    node[unknown] = np.arange(count)
    node[known] = count + np.arange(len(known))
    ground = count + len(known)
    load = _loads(circuit, devices)[unknown]
    gates = (parameters.gate_bulk + parameters.gate_source + parameters.gate_drain)[devices]
    load = np.maximum(load, _LEAST_SHARE * gates.mean())
    d, g, s, b = (node[end[devices]] for end in ends)
    touches = np.flatnonzero((node[block.capacitor_nets] < count).any(axis=0))
    pairs = [
        (g, b, parameters.gate_bulk[devices]),
        (g, s, parameters.gate_source[devices]),
        (g, d, parameters.gate_drain[devices]),
        (d, b, parameters.drain_bulk[devices]),
        (s, b, parameters.source_bulk[devices]),
        (*node[block.capacitor_nets[:, touches]], block.capacitance[touches]),
        (np.arange(count), np.full(count, ground), load),
    ]
    return Layout(
        equations=Equations(
            unknown=count,
            given=len(net) - count,
            channels=parameters.channels.take(devices),
            drain=d,
            gate=g,
            source=s,
            bulk=b,
            capacitor_ends=np.stack([np.concatenate([pair[i] for pair in pairs]) for i in (0, 1)]),
            capacitance=np.concatenate([pair[2] for pair in pairs]),
            resistor_ends=np.array([[node[drive[0]]], [ground + 1]])
            if drive
            else np.zeros((2, 0), int),
            resistance=np.array([drive[1]] if drive else [], float),
            rounding=ROUNDING_SHARE * circuit.process.supply,
        ),
        net=net,
        devices=devices,
    )


def _loads(circuit: Circuit, devices: IntArray) -> FloatArray:
    """Return what loads each net besides the chosen devices and capacitor cards, F."""
    block, values = circuit.devices, circuit.electrical
    left = np.ones(len(block))
    left[devices] = 0.0
    load = circuit.outside_cap.copy()
    for end, cap in (
        (block.gate, values.gate.today),
        (block.drain, values.drain.today),
        (block.source, values.source.today),
    ):
        load += np.bincount(end, cap * left, len(load))
    return load
