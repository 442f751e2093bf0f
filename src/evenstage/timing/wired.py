"""Wires along a timing graph: which arcs drive them, and which come behind them.

An arrival at a node is that at the driver's end of its net. What the wire adds to it differs from
sink to sink, so each arc begins with the wire that leads to its input, and paths end with the wire
to where the load hangs.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from evenstage.timing.wire_laws import (
    RAMP,
    TRANSITION,
    added_square,
    added_variance,
    crossing,
    effective,
    wire_delay,
)

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.wiring import WireLoads
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.graph import TimingGraph


@dataclass(frozen=True)
class WiredGraph:
    """Where wires lie along a graph.

    Parameters
    ----------
    loads : WireLoads
    drive : IntArray, shape (arcs,)
        Drive of the wire behind each arc; -1 for none.
    sink : IntArray, shape (arcs,)
        Place of each arc's input among the sinks of its net; -1 for none.
    start_drive : IntArray, shape (starts,)
        Drive of the wire at each start; -1 for none.
    resistance : FloatArray, ohm, shape (arcs,)
        Of each arc at its output.
    start_resistance : FloatArray, ohm, shape (starts,)
    node_drive : IntArray, shape (nodes,)
        Drive of the first arc into each node, or of its start; -1 for none.
    """

    loads: WireLoads
    drive: IntArray
    sink: IntArray
    start_drive: IntArray
    resistance: FloatArray
    start_resistance: FloatArray
    node_drive: IntArray

    def copies(self, drive: IntArray, sink: IntArray) -> IntArray:
        """Return the copies of nodes at which sinks hang under drives."""
        wiring = self.loads.wiring
        result: IntArray = wiring.sink[wiring.sink_head[drive] + sink]
        return result

    def far(self, drive: IntArray, resistance: FloatArray, elmore: FloatArray) -> Far:
        """Return what drivers see of their wires.

        Parameters
        ----------
        drive : IntArray, shape (k,)
            -1 for none.
        resistance : FloatArray, ohm, shape (k,)
        elmore : FloatArray, s, shape (k, ...)
        """
        column = (-1, *(1 for _ in elmore.shape[1:]))
        a, b = (
            np.append(weighted, 0.0)[drive].reshape(column)
            for weighted in (self.loads.weighted_first, self.loads.weighted_second)
        )
        resistance = resistance.reshape(column)
        known = (b > 0) & (elmore > 0)
        hidden = np.divide(a**2, b, out=np.zeros_like(a), where=b > 0) * resistance
        near = np.clip(1 - hidden / np.where(known, elmore, 1.0), 0.0, 1.0)
        lag = np.divide(b, a, out=np.zeros_like(a), where=a > 0) + np.zeros_like(elmore)
        shield = np.ones_like(elmore)
        some = elmore[known]
        at_driver = crossing(some, lag[known], near[known], np.zeros_like(some))
        shield[known] = np.minimum(at_driver / some, 1.0)
        return Far(resistance * a + np.zeros_like(elmore), lag, near, shield)


class Far(NamedTuple):
    """What drivers see of their wires; shape as the Elmore delays of the drivers.

    Parameters
    ----------
    spread : FloatArray, s^2
        ``R A`` of `evenstage.timing.wire_laws`.
    lag : FloatArray, s
    near : FloatArray
    shield : FloatArray
        Effective over whole capacitance, for a step.
    """

    spread: FloatArray
    lag: FloatArray
    near: FloatArray
    shield: FloatArray


def wired_graph(circuit: Circuit, graph: TimingGraph) -> WiredGraph | None:
    """Find the wires along a graph; None where no net has resistance."""
    loads = circuit.wire_loads
    if loads is None:
        return None
    arcs, which, wiring = circuit.arcs, graph.arc, loads.wiring
    gate, output = arcs.gate[which], arcs.output[which]
    drive = wiring.drives(gate, output, arcs.rising[which])
    start_drive = wiring.any_drive(graph.net[graph.start])
    node_drive = np.full(len(graph), -1, np.int32)
    node_drive[graph.target[::-1]] = drive[::-1]
    node_drive[graph.start] = start_drive
    return WiredGraph(
        loads=loads,
        drive=drive,
        sink=wiring.sinks(gate, arcs.input[which], arcs.input_rising[which]),
        start_drive=start_drive,
        resistance=arcs.output_resistance[which],
        start_resistance=graph.start_drive,
        node_drive=node_drive,
    )


class Ride:
    """What rides along with arrivals at the driver's end of wires, while a graph is swept.

    Parameters
    ----------
    wired : WiredGraph
    graph : TimingGraph
    elmore : FloatArray, s, shape (arcs, ...)
        Trailing axes are blocks swept side by side; their wires are those of the first.
    shape : FloatArray, shape (arcs, ...)
        Transition over Elmore delay.
    start_elmore : FloatArray, s, shape (starts, ...)
        Of the outside drivers.
    """

    def __init__(
        self,
        wired: WiredGraph,
        graph: TimingGraph,
        elmore: FloatArray,
        shape: FloatArray,
        start_elmore: FloatArray,
    ) -> None:
        self._wired = wired
        self._graph = graph
        self._elmore = elmore
        self._shape = shape
        self._behind = np.flatnonzero(wired.sink >= 0)
        self._driving = np.flatnonzero(wired.drive >= 0)
        self._far = wired.far(wired.drive, wired.resistance, elmore)
        nodes = (len(graph), *elmore.shape[1:])
        self._drive = np.full(nodes, -1, np.int32)
        self._node_elmore, self._node_input = np.zeros(nodes), np.zeros(nodes)
        self._node_far = Far(np.zeros(nodes), np.zeros(nodes), np.ones(nodes), np.ones(nodes))
        start, column = graph.start, (-1, *(1 for _ in nodes[1:]))
        self._drive[start] = wired.start_drive.reshape(column)
        self._node_elmore[start] = start_elmore
        outside = wired.far(wired.start_drive, wired.start_resistance, self._node_elmore[start])
        for kept, of_start in zip(self._node_far, outside, strict=True):
            kept[start] = of_start
        self._node_input[start] = graph.start_transition.reshape(column)

    def at_inputs(
        self, some: slice, transition: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return delay of the wire before each arc, and ramp and transition behind it, s.

        Parameters
        ----------
        some : slice
            Of the graph's arcs.
        transition : FloatArray, s, shape (k, ...)
            At the driver's end.
        """
        late, ramp, whole = np.zeros_like(transition), transition, transition
        begin, end = np.searchsorted(self._behind, [some.start, some.stop])
        which = self._behind[begin:end]
        if len(which):
            here, ramp, whole = which - some.start, transition.copy(), transition.copy()
            late[here], steep, slow = self._wire(
                self._graph.source[which], self._wired.sink[which], self._shape[which]
            )
            ramp[here] = np.sqrt(transition[here] ** 2 + steep)
            whole[here] = np.sqrt(transition[here] ** 2 + slow)
        return late, ramp, whole

    def at_ends(self, shape: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the delay to each end's load, s, and the added square of the transition, s^2.

        Parameters
        ----------
        shape : FloatArray, shape (ends, ...)
            Transition over Elmore delay.
        """
        late, _, added = self._wire(self._graph.end, None, shape)
        return late, added

    def _wire(
        self, node: IntArray, sink: IntArray | None, shape: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Return delay and added squares of ramp and transition from nodes to sinks or ends."""
        drive, loads = self._drive[node], self._wired.loads
        known = drive >= 0
        if sink is None:
            copy = loads.wiring.named[np.where(known, drive, 0)]
        else:
            place = np.where(known, sink.reshape(-1, *(1 for _ in drive.shape[1:])), 0)
            copy = self._wired.copies(np.where(known, drive, 0), place)
        first = np.where(known, loads.first[copy], 0.0)
        second = np.where(known, loads.second[copy], 0.0)
        elmore, far = self._node_elmore[node], Far(*(kept[node] for kept in self._node_far))
        added = np.where(known, added_variance(far.spread, first, second), 0.0)
        behind = first > 0
        step = np.zeros_like(first)
        step[behind] = crossing(elmore[behind], far.lag[behind], far.near[behind], first[behind])
        late = wire_delay(
            elmore, far.shield, step, self._node_input[node], first, elmore**2 + added
        )
        ramp, whole = (
            np.where(known, added_square(shape, far.spread, first, second, resistive=factor), 0.0)
            for factor in (RAMP, TRANSITION)
        )
        return late, ramp, whole

    def effective(self, some: slice, transition: FloatArray) -> FloatArray:
        """Return the Elmore delay of arcs with effective capacitances, s."""
        elmore = self._elmore[some]
        begin, end = np.searchsorted(self._driving, [some.start, some.stop])
        which = self._driving[begin:end]
        if not len(which):
            return elmore
        here, result = which - some.start, elmore.copy()
        result[here] = effective(elmore[here], self._far.shield[which], transition[here])
        return result

    def follow(self, node: IntArray, winner: IntArray, transition: FloatArray) -> None:
        """Take over what the winning arcs bring to nodes.

        Parameters
        ----------
        node : IntArray, shape (k,)
        winner : IntArray, shape (k, ...)
            Arcs of the graph.
        transition : FloatArray, s, shape (k, ...)
            At the winners' inputs.
        """
        self._drive[node] = self._wired.drive[winner]
        self._node_input[node] = transition
        for kept, of_arc in (
            (self._node_elmore, self._elmore),
            *zip(self._node_far, self._far, strict=True),
        ):
            kept[node] = np.take_along_axis(of_arc, winner, axis=0)


@dataclass(frozen=True)
class WireElmore:
    """Elmore delay of wires, s: before arcs, shape ``(arcs,)``, and ends, shape ``(ends,)``."""

    arcs: FloatArray
    ends: FloatArray


def wire_elmore(wired: WiredGraph, graph: TimingGraph) -> WireElmore:
    """Return the Elmore delay of the wire before each arc and each end, s."""
    loads, wiring = wired.loads, wired.loads.wiring
    before, end = wired.node_drive[graph.source], wired.node_drive[graph.end]
    arcs, ends = np.zeros(len(graph.arc)), np.zeros(len(graph.end))
    known: BoolArray = (before >= 0) & (wired.sink >= 0)
    arcs[known] = loads.first[wired.copies(before[known], wired.sink[known])]
    ends[end >= 0] = loads.first[wiring.named[end[end >= 0]]]
    return WireElmore(arcs, ends)
