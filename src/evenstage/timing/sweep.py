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

from evenstage.timing.laws import arc_delay, arc_transition

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.graph import TimingGraph
    from evenstage.timing.results import Yardstick


@dataclass(frozen=True, kw_only=True)
class Timing:
    """A circuit's delays along a timing graph.

    Parameters
    ----------
    circuit : Circuit
    graph : TimingGraph
    unit : Yardstick
    elmore, delay, charged : FloatArray, s, shape (arcs,)
        Per graph arc: Elmore delay, 50 % delay with today's transitions, charged delay.
    arrival, transition : FloatArray, s, shape (nodes,)
    winner : IntArray, shape (nodes,)
        Graph arc the arrival came by; -1 at starts.
    """

    circuit: Circuit = field(repr=False)
    graph: TimingGraph = field(repr=False)
    unit: Yardstick
    elmore: FloatArray = field(repr=False)
    delay: FloatArray = field(repr=False)
    charged: FloatArray = field(repr=False)
    arrival: FloatArray = field(repr=False)
    transition: FloatArray = field(repr=False)
    winner: IntArray = field(repr=False)

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
        return float(self.arrival[self.graph.end].max())

    @property
    def worst_charged(self) -> float:
        """Latest charged arrival at any path end, s."""
        return float(self.charged_arrival[self.graph.end].max())

    @property
    def worst_transition(self) -> float:
        """Slowest edge any gate makes, s."""
        return float(self.transition[self.graph.target].max())

    @cached_property
    def lateness(self) -> FloatArray:
        """How late each end is, s, shape (ends,): its arrival, and what its required time costs."""
        return self.arrival[self.graph.end] + end_offsets(self.graph)


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
    for some, first, node in graph.levels:
        candidate = arrival[graph.source[some]] + delay[some]
        arrival[node] = np.maximum.reduceat(candidate, first, axis=0)
    return arrival


def sweep(circuit: Circuit, graph: TimingGraph, unit: Yardstick) -> Timing:
    """Add up the delays of a circuit along a graph."""
    arcs, which = circuit.arcs, graph.arc
    elmore = arcs.elmore(circuit.net_cap)[which]
    charge = np.where(arcs.rising, unit.charge_rise, unit.charge_fall)[which]
    flow = propagate(circuit, graph, elmore, start_arrivals(circuit, graph))
    return Timing(
        circuit=circuit,
        graph=graph,
        unit=unit,
        elmore=elmore,
        delay=flow.delay,
        charged=charge * elmore,
        arrival=flow.arrival,
        transition=flow.transition,
        winner=flow.winner,
    )


class Flow(NamedTuple):
    """What one sweep finds; the trailing axes, if any, are blocks swept side by side.

    Parameters
    ----------
    delay : FloatArray, s, shape (arcs, ...)
    arrival, transition : FloatArray, s, shape (nodes, ...)
    winner : IntArray, shape (nodes, ...)
        Graph arc the arrival came by; -1 at starts.
    """

    delay: FloatArray
    arrival: FloatArray
    transition: FloatArray
    winner: IntArray


def propagate(
    circuit: Circuit, graph: TimingGraph, elmore: FloatArray, start_arrival: FloatArray
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
    delay = np.empty_like(elmore)
    arrival[graph.start] = start_arrival
    transition[graph.start] = graph.start_transition.reshape(column)
    for some, first, node in graph.levels:
        source = graph.source[some]
        arriving = transition[source]
        delay[some] = arc_delay(elmore[some], arriving, slope[some], power[some])
        candidate = arrival[source] + delay[some]
        latest = np.maximum.reduceat(candidate, first, axis=0)
        by = _first_equal(candidate, latest, first)
        leaving = arc_transition(elmore[some], arriving, shape[some], carry[some])
        arrival[node] = latest
        winner[node] = by + some.start
        transition[node] = np.take_along_axis(leaving, by, axis=0)
    return Flow(delay, arrival, transition, winner)


def _first_equal(candidate: FloatArray, latest: FloatArray, first: IntArray) -> IntArray:
    """Return the first position in each run of candidates that equals the run's maximum."""
    runs = np.repeat(latest, np.diff(first, append=len(candidate)), axis=0)
    place = np.arange(len(candidate)).reshape(-1, *(1 for _ in candidate.shape[1:]))
    result: IntArray = np.minimum.reduceat(
        np.where(candidate == runs, place, len(candidate)), first, axis=0
    )
    return result
