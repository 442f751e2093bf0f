"""The delay of wires as monomials in the sizes of the gates that hang on them.

To a sink a wire takes ``sum R_k C_k``, R_k the resistance shared with node k. What gates put on the
nodes grows with their sizes; capacitors and outside loads stay.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from evenstage.circuit.arcs import NO_OWNER, ranges
from evenstage.timing.sweep import charges_of
from evenstage.timing.wired import wired_graph

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.wiring import WireLoads
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.graph import TimingGraph
    from evenstage.timing.results import Yardstick

#: Nets with more sinks than this keep the wire delay of today's sizes: pairs of sinks and nodes
#: grow with their square, and what one gate of so many weighs tells little.
_SINKS_MOST: Final = 256


@dataclass(frozen=True)
class WireTerms:
    """Charged delay of wires, one entry per gate and wire; shape ``(entries,)`` but for ``ends``.

    Parameters
    ----------
    ends : IntArray
        Places, among the graph's ends, of those behind a wire.
    row : IntArray
        Arc of the graph, or place in ``ends``.
    is_end : BoolArray
        Which of the two ``row`` is.
    gate : IntArray
        Gate whose size multiplies the delay; `NO_OWNER` for what stays.
    delay : FloatArray, s
        At today's sizes.
    """

    ends: IntArray
    row: IntArray
    is_end: BoolArray
    gate: IntArray
    delay: FloatArray


class _Hung(NamedTuple):
    """What gates hang on nodes and what of it scales, F; sorted by net."""

    net: IntArray
    node: IntArray
    gate: IntArray
    cap: FloatArray


def wire_terms(circuit: Circuit, graph: TimingGraph, unit: Yardstick) -> WireTerms:
    """Return the charged delay of the wire before each arc and each end of a graph."""
    wired = wired_graph(circuit, graph)
    nothing = np.zeros(0, np.int32)
    if wired is None:
        return WireTerms(nothing, nothing, nothing.astype(bool), nothing, np.zeros(0))
    loads, charges = wired.loads, charges_of(circuit, graph, unit)
    before, behind = wired.node_drive[graph.source], wired.node_drive[graph.end]
    arcs = np.flatnonzero((before >= 0) & (wired.sink >= 0))
    ends = np.flatnonzero(behind >= 0)
    copy = np.concatenate(
        [
            wired.copies(before[arcs], wired.sink[arcs]),
            loads.wiring.named[behind[ends]],
        ]
    )
    charge = np.concatenate([charges.before[arcs], charges.end[ends]])
    kept = np.concatenate([arcs, np.arange(len(ends))]).astype(np.int32)
    is_end = np.arange(len(kept)) >= len(arcs)
    sink, of_sink = np.unique(copy, return_inverse=True)
    place, gate, delay = _scaling(circuit, loads, sink)
    staying = loads.first[sink] - np.bincount(place, delay, len(sink))
    place = np.concatenate([place, np.arange(len(sink))])
    gate = np.concatenate([gate, np.full(len(sink), NO_OWNER)])
    delay = np.concatenate([delay, np.maximum(staying, 0.0)])
    order = np.argsort(place, kind="stable")
    bounds = np.searchsorted(place[order], np.stack([of_sink, of_sink + 1]))
    count = bounds[1] - bounds[0]
    entry = order[ranges(bounds[0], count)]
    return WireTerms(
        ends=ends.astype(np.int32),
        row=np.repeat(kept, count),
        is_end=np.repeat(is_end, count),
        gate=gate[entry].astype(np.int32),
        delay=delay[entry] * np.repeat(charge, count),
    )


def _scaling(
    circuit: Circuit, loads: WireLoads, sink: IntArray
) -> tuple[IntArray, IntArray, FloatArray]:
    """Return place in ``sink``, gate and delay, s, of all that scales on the wires to sinks.

    Parameters
    ----------
    circuit : Circuit
    loads : WireLoads
    sink : IntArray, shape (sinks,)
        Copies of nodes.
    """
    wiring = loads.wiring
    drive = wiring.drive[sink]
    sinks = np.bincount(drive, minlength=len(wiring.net))[drive]
    which = np.flatnonzero(sinks <= _SINKS_MOST)
    drive, hung = drive[which], _hung(circuit)
    bounds = np.searchsorted(hung.net, np.stack([wiring.net[drive], wiring.net[drive] + 1]))
    count = bounds[1] - bounds[0]
    entry = ranges(bounds[0], count)
    place, base = np.repeat(which, count), np.repeat(wiring.head[drive], count)
    other = base + wiring.rank[hung.node[entry]]
    shared = wiring.network.shared_resistance(sink[place], other)
    return place, hung.gate[entry], shared * hung.cap[entry]


def _hung(circuit: Circuit) -> _Hung:
    """Return what each gate hangs on each node: gates, drains and sources of its transistors."""
    wires, values, gate = circuit.devices.wires, circuit.electrical, circuit.gate_of_device
    assert wires is not None
    node = np.concatenate([wires.gate, wires.drain, wires.source])
    cap = np.concatenate([values.gate.scaling, values.drain.scaling, values.source.scaling])
    owner = np.tile(gate, 3)
    kept = (node >= 0) & (owner >= 0)
    pair = node[kept].astype(np.int64) * (len(circuit) + 1) + owner[kept]
    pairs, index = np.unique(pair, return_inverse=True)
    node, owner = pairs // (len(circuit) + 1), pairs % (len(circuit) + 1)
    order = np.argsort(wires.net[node], kind="stable")
    total = np.bincount(index, cap[kept], len(pairs)).astype(np.float64)
    return _Hung(wires.net[node][order], node[order], owner[order], total[order])
