"""Arrivals: one sweep over a timing graph, level by level.

The latest arrival at a node wins, and its transition rides on with it; of equal arrivals the one
along the arc drawn first. An arc's delay is thereby one number for all paths through it, so that
the slowest paths are longest paths.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from evenstage.timing.knockout import latest
from evenstage.timing.laws import arc_delay, arc_transition
from evenstage.timing.wired import Ride, wire_elmore, wired_graph
from evenstage.timing.yardstick import arc_charges

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.graph import TimingGraph
    from evenstage.timing.results import Yardstick
    from evenstage.timing.wired import WiredGraph


@dataclass(frozen=True, kw_only=True)
class Timing:
    """A circuit's delays along a timing graph.

    Parameters
    ----------
    circuit : Circuit
    graph : TimingGraph
    unit : Yardstick
    elmore, effective, delay, charged : FloatArray, s, shape (arcs,)
        Per graph arc: Elmore delay with the whole and the effective capacitance; 50 % delay with
        today's transitions, and charged delay, both with the wire before the arc.
    arrival, transition : FloatArray, s, shape (nodes,)
        At the driver's end of the net.
    winner : IntArray, shape (nodes,)
        Graph arc the arrival came by; -1 at starts.
    wire, charged_wire : FloatArray, s, shape (arcs,)
        Part of the delays that is the wire before the arc.
    sink_transition : FloatArray, s, shape (arcs,)
        At the arc's input.
    end_wire, end_charged_wire, end_transition : FloatArray, s, shape (ends,)
        Delay of the wire from the driver to where the load of an end hangs, and the transition
        there.
    wired : WiredGraph, optional
        None where no net has resistance.
    """

    circuit: Circuit = field(repr=False)
    graph: TimingGraph = field(repr=False)
    unit: Yardstick
    elmore: FloatArray = field(repr=False)
    effective: FloatArray = field(repr=False)
    delay: FloatArray = field(repr=False)
    charged: FloatArray = field(repr=False)
    arrival: FloatArray = field(repr=False)
    transition: FloatArray = field(repr=False)
    winner: IntArray = field(repr=False)
    wire: FloatArray = field(repr=False)
    charged_wire: FloatArray = field(repr=False)
    sink_transition: FloatArray = field(repr=False)
    end_wire: FloatArray = field(repr=False)
    end_charged_wire: FloatArray = field(repr=False)
    end_transition: FloatArray = field(repr=False)
    wired: WiredGraph | None = field(repr=False)

    @cached_property
    def charge(self) -> FloatArray:
        """Charged over Elmore delay of each graph arc, wires apart, shape (arcs,)."""
        return charges_of(self.circuit, self.graph, self.unit).arc

    @cached_property
    def end_arrival(self) -> FloatArray:
        """Latest arrival at each end, wire and all, s, shape (ends,)."""
        return self.arrival[self.graph.end] + self.end_wire

    @cached_property
    def end_charged_arrival(self) -> FloatArray:
        """Latest arrival at each end in charged delay, wire and all, s, shape (ends,)."""
        return self.charged_arrival[self.graph.end] + self.end_charged_wire

    @cached_property
    def charged_arrival(self) -> FloatArray:
        """Latest arrival at each node in charged delay, s, shape (nodes,)."""
        return latest_arrivals(self.graph, self.charged, self.start_arrival)

    @property
    def start_arrival(self) -> FloatArray:
        """Arrival at each start with the delay of the outside driver, s, shape (starts,)."""
        return start_arrivals(self.circuit, self.graph)

    @property
    def worst(self) -> float:
        """Latest arrival at any path end, s."""
        return float(self.end_arrival.max())

    @property
    def worst_charged(self) -> float:
        """Latest charged arrival at any path end, s."""
        return float(self.end_charged_arrival.max())

    @property
    def worst_transition(self) -> float:
        """Slowest edge any gate makes, s."""
        return float(self.transition[self.graph.target].max())

    @cached_property
    def lateness(self) -> FloatArray:
        """How late each end is, s, shape (ends,): its arrival, and what its required time costs."""
        return self.end_arrival + end_offsets(self.graph)


def end_offsets(graph: TimingGraph) -> FloatArray:
    """Return what makes ends with different required times comparable, s, shape (ends,).

    An end required earlier than the latest required time counts as later by the difference; ends
    without a required time count as they are.
    """
    required = graph.end_required
    known = ~np.isnan(required)
    latest = required[known].max(initial=-np.inf)
    return np.where(known, latest - np.where(known, required, 0.0), 0.0)


def start_arrivals(circuit: Circuit, graph: TimingGraph) -> FloatArray:
    """Return the arrival at each start, the outside driver's delay included, s."""
    load = circuit.net_cap[graph.net[graph.start]]
    return graph.start_arrival + graph.start_drive * load


def latest_arrivals(graph: TimingGraph, delay: FloatArray, start_arrival: FloatArray) -> FloatArray:
    """Return the latest arrival at each node under given arc delays, s, shape (nodes, ...).

    Parameters
    ----------
    graph : TimingGraph
    delay : FloatArray, s, shape (arcs, ...)
        Trailing axes are blocks swept side by side.
    start_arrival : FloatArray, s, shape (starts, ...)
    """
    arrival = np.full((len(graph), *delay.shape[1:]), -np.inf)
    arrival[graph.start] = start_arrival
    for (some, _, node), rounds in zip(graph.levels, graph.rounds, strict=True):
        arrival[node], _ = latest(arrival[graph.source[some]] + delay[some], rounds)
    return arrival


def sweep(circuit: Circuit, graph: TimingGraph, unit: Yardstick) -> Timing:
    """Add up the delays of a circuit along a graph."""
    elmore = circuit.arcs.elmore(circuit.net_cap)[graph.arc]
    charges = charges_of(circuit, graph, unit)
    wired = wired_graph(circuit, graph)
    flow = propagate(circuit, graph, elmore, start_arrivals(circuit, graph), wired)
    before, behind = charged_wires(graph, charges, wired)
    return Timing(
        circuit=circuit,
        graph=graph,
        unit=unit,
        elmore=elmore,
        effective=flow.effective,
        delay=flow.delay,
        charged=charges.arc * elmore + before,
        arrival=flow.arrival,
        transition=flow.transition,
        winner=flow.winner,
        wire=flow.wire,
        charged_wire=before,
        sink_transition=flow.sink_transition,
        end_wire=flow.end_wire,
        end_charged_wire=behind,
        end_transition=flow.end_transition,
        wired=wired,
    )


class GraphCharges(NamedTuple):
    """Charged over Elmore delay: of arcs, and of the edges that begin arcs and that end paths."""

    arc: FloatArray
    before: FloatArray
    end: FloatArray


def charges_of(circuit: Circuit, graph: TimingGraph, unit: Yardstick) -> GraphCharges:
    """Return what a slow edge is charged with along a graph; see the yardstick."""
    of_edge = np.array([unit.charge_fall, unit.charge_rise])
    rising = graph.rising.astype(np.intp)
    return GraphCharges(
        arc=arc_charges(circuit.arcs, circuit.process, unit)[graph.arc],
        before=of_edge[rising[graph.source]],
        end=of_edge[rising[graph.end]],
    )


def charged_wires(
    graph: TimingGraph, charges: GraphCharges, wired: WiredGraph | None
) -> tuple[FloatArray, FloatArray]:
    """Return the charged delay of the wire before each arc and each end, s."""
    if wired is None:
        return np.zeros(len(graph.arc)), np.zeros(len(graph.end))
    found = wire_elmore(wired, graph)
    return charges.before * found.arcs, charges.end * found.ends


class Flow(NamedTuple):
    """What one sweep finds; the trailing axes, if any, are blocks swept side by side.

    Parameters
    ----------
    delay, effective : FloatArray, s, shape (arcs, ...)
        The latter the Elmore delay with the capacitance that the driver sees.
    arrival, transition : FloatArray, s, shape (nodes, ...)
    winner : IntArray, shape (nodes, ...)
        Graph arc the arrival came by; -1 at starts.
    wire, sink_transition : FloatArray, s, shape (arcs, ...)
        Delay of the wire before each arc, part of its delay, and the transition behind the wire.
    end_wire, end_transition : FloatArray, s, shape (ends, ...)
        Delay of the wire before each end, no part of the arrival, and the transition behind it.
    """

    delay: FloatArray
    effective: FloatArray
    arrival: FloatArray
    transition: FloatArray
    winner: IntArray
    wire: FloatArray
    sink_transition: FloatArray
    end_wire: FloatArray
    end_transition: FloatArray


def propagate(
    circuit: Circuit,
    graph: TimingGraph,
    elmore: FloatArray,
    start_arrival: FloatArray,
    wired: WiredGraph | None = None,
) -> Flow:
    """Add up given Elmore delays along a graph, with the transitions they make.

    Parameters
    ----------
    circuit : Circuit
        Its transition constants count, not its widths.
    graph : TimingGraph
    elmore : FloatArray, s, shape (arcs, ...)
        Per graph arc; trailing axes are blocks swept side by side.
    start_arrival : FloatArray, s, shape (starts, ...)
    wired : WiredGraph, optional
        Wires along the graph, the same for all blocks.
    """
    arcs, which = circuit.arcs, graph.arc
    beside = elmore.shape[1:]
    column = (-1, *(1 for _ in beside))
    slope, power, shape, carry = (
        constant[which].reshape(column)
        for constant in (arcs.slope, arcs.slope_power, arcs.shape, arcs.shape_carry)
    )
    arrival = np.full((len(graph), *beside), -np.inf)
    transition = np.zeros((len(graph), *beside))
    winner = np.full((len(graph), *beside), -1, np.int32)
    delay, at_input = np.empty_like(elmore), np.empty_like(elmore)
    wire, seen = np.zeros_like(elmore), elmore if wired is None else elmore.copy()
    arrival[graph.start] = start_arrival
    transition[graph.start] = graph.start_transition.reshape(column)
    ride = None
    if wired is not None:
        outside = start_arrival - graph.start_arrival.reshape(column)
        ride = Ride(wired, graph, elmore, shape, outside)
    for (some, _, node), rounds in zip(graph.levels, graph.rounds, strict=True):
        source = graph.source[some]
        arriving = shown = transition[source]
        if ride is not None:
            wire[some], arriving, shown = ride.at_inputs(some, arriving)
            seen[some] = ride.effective(some, arriving)
        late = arc_delay(seen[some], arriving, slope[some], power[some])
        if ride is not None:
            late = late + wire[some]
        arrival[node], by = latest(arrival[source] + late, rounds)
        brought = _chosen(arriving, by)
        made, shaped, carried = (_chosen(column[some], by) for column in (elmore, shape, carry))
        transition[node] = arc_transition(made, brought, shaped, carried)
        delay[some], at_input[some] = late, shown
        winner[node] = by + some.start
        if ride is not None:
            ride.follow(node, winner[node], brought)
    end_wire, end_transition = _at_ends(graph, ride, shape, winner, transition)
    return Flow(delay, seen, arrival, transition, winner, wire, at_input, end_wire, end_transition)


def _at_ends(
    graph: TimingGraph,
    ride: Ride | None,
    shape: FloatArray,
    winner: IntArray,
    transition: FloatArray,
) -> tuple[FloatArray, FloatArray]:
    """Return delay and transition behind the wires to the ends, s, shape (ends, ...)."""
    at_driver = transition[graph.end]
    if ride is None:
        return np.zeros_like(at_driver), at_driver
    by = winner[graph.end]
    made = np.where(by >= 0, shape.reshape(-1)[np.maximum(by, 0)], 0.0)
    late, added = ride.at_ends(made)
    return late, np.sqrt(at_driver**2 + added)


def _chosen(values: FloatArray, by: IntArray) -> FloatArray:
    """Return the values at chosen positions; blocks side by side may share one column."""
    if values.ndim == 1:
        return values[by]
    if values.shape[1] == 1:
        return values[:, 0][by]
    chosen: FloatArray = np.take_along_axis(values, by, axis=0)
    return chosen
