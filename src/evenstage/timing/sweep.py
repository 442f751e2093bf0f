"""Arrivals: one sweep over a timing graph, level by level.

The latest arrival at a node wins, and its transition rides on with it; of equal arrivals the one
along the arc drawn first. An arc's delay is thereby one number for all paths through it, so that
the slowest paths are longest paths.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING

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
        graph = self.graph
        arrival = np.full(len(graph), -np.inf)
        arrival[graph.start] = self.start_arrival
        for some, first, node in _levels(graph):
            candidate = arrival[graph.source[some]] + self.charged[some]
            arrival[node] = np.maximum.reduceat(candidate, first)
        return arrival

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


def sweep(circuit: Circuit, graph: TimingGraph, unit: Yardstick) -> Timing:
    """Add up the delays of a circuit along a graph."""
    arcs, which = circuit.arcs, graph.arc
    load = circuit.net_cap[arcs.output]
    elmore = (arcs.resistance.today * load + arcs.own_today)[which]
    charge = np.where(arcs.rising, unit.charge_rise, unit.charge_fall)[which]
    slope, power = arcs.slope[which], arcs.slope_power[which]
    shape, carry = arcs.shape[which], arcs.shape_carry[which]
    arrival = np.full(len(graph), -np.inf)
    transition = np.zeros(len(graph))
    winner = np.full(len(graph), -1, np.int32)
    delay = np.empty(len(which))
    arrival[graph.start] = start_arrivals(circuit, graph)
    transition[graph.start] = graph.start_transition
    for some, first, node in _levels(graph):
        source = graph.source[some]
        arriving = transition[source]
        delay[some] = arc_delay(elmore[some], arriving, slope[some], power[some])
        candidate = arrival[source] + delay[some]
        latest = np.maximum.reduceat(candidate, first)
        by = _first_equal(candidate, latest, first) + some.start
        arrival[node] = latest
        winner[node] = by
        leaving = arc_transition(elmore[by], transition[graph.source[by]], shape[by], carry[by])
        transition[node] = leaving
    return Timing(
        circuit=circuit,
        graph=graph,
        unit=unit,
        elmore=elmore,
        delay=delay,
        charged=charge * elmore,
        arrival=arrival,
        transition=transition,
        winner=winner,
    )


def _levels(graph: TimingGraph) -> list[tuple[slice, IntArray, IntArray]]:
    """Return per level its arcs, where each target's arcs begin among them, and the targets."""
    bounds = [0, *graph.level_ends.tolist()]
    starts_target = np.flatnonzero(np.diff(graph.target, prepend=-1))
    cuts = np.searchsorted(starts_target, bounds)
    return [
        (
            slice(begin, end),
            (starts_target[lo:hi] - begin).astype(np.int32),
            graph.target[starts_target[lo:hi]],
        )
        for begin, end, lo, hi in zip(bounds, bounds[1:], cuts, cuts[1:], strict=False)
        if end > begin
    ]


def _first_equal(candidate: FloatArray, latest: FloatArray, first: IntArray) -> IntArray:
    """Return the first position in each run of candidates that equals the run's maximum."""
    counts = np.diff(first, append=len(candidate))
    hits = np.flatnonzero(candidate == np.repeat(latest, counts))
    run_of_hit = np.searchsorted(first, hits, side="right") - 1
    _, first_hit = np.unique(run_of_hit, return_index=True)
    result: IntArray = hits[first_hit].astype(np.int32)
    return result
