"""Capacitance that hangs on nets, and on the nodes that resistance parts nets into."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.circuit.electrical import Electrical
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import Devices, FloatArray, IntArray, Wires


def capacitor_values(devices: Devices, is_supply: BoolArray, coupling: float) -> FloatArray:
    """Return what each capacitor card counts for on the nets at its ends, F, shape (capacitors,).

    Parameters
    ----------
    devices : Devices
    is_supply : BoolArray, shape (nets,)
    coupling : float
        What a capacitor between two signals counts on each: 0 where the other moves along, 1 where
        it stands still, 2 where it moves against.
    """
    a, b = devices.capacitor_nets
    between = ~is_supply[a] & ~is_supply[b]
    factor = np.where(a == b, 0.0, np.where(between, coupling, 1.0))
    result: FloatArray = devices.capacitance * factor
    return result


def on_nets(devices: Devices, value: FloatArray) -> FloatArray:
    """Return the sum of capacitor cards at each net, F, shape (nets,)."""
    a, b = devices.capacitor_nets
    nets = len(devices.net_names)
    return at_nets(a, value, nets) + at_nets(b, value, nets)


def on_nodes(
    wires: Wires, values: Electrical, capacitor: FloatArray, outside: FloatArray
) -> FloatArray:
    """Return all capacitance on each node of the nets with resistance, F, shape (nodes,).

    Parameters
    ----------
    wires : Wires
    values : Electrical
    capacitor : FloatArray, F, shape (capacitors,)
        What each capacitor card counts for.
    outside : FloatArray, F, shape (nets,)
        Hangs on the nodes that carry the nets' names.
    """
    parts = [
        (wires.gate, values.gate.today),
        (wires.drain, values.drain.today),
        (wires.source, values.source.today),
        (wires.capacitor[0], capacitor),
        (wires.capacitor[1], capacitor),
        (wires.head, outside),
    ]
    total = np.zeros(len(wires.net))
    for node, value in parts:
        total += at_nets(node[node >= 0], value[node >= 0], len(total))
    return total


def at_nets(net: IntArray, value: FloatArray, nets: int) -> FloatArray:
    """Add values up on the nets they belong to, shape (nets,)."""
    return np.bincount(net, value, nets).astype(np.float64, copy=False)
