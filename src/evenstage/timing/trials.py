"""Many small changes of one block, each timed on its own, all in one sweep.

A gate's resistance and its capacitances depend on its own widths alone. So one block in which all
changes are made at once holds everything that any of them needs: a trial takes its own gates from
there and all others from the block as it is. Trials are swept side by side. Wires keep the delay
they have in the block as it is: what a changed pin weighs tells in its driver's delay alone.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.timing.sweep import charges_of, end_offsets, latest_arrivals, propagate

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.sweep import Timing

_SIDE_BY_SIDE = 4_000_000
"""Entries of the widest array while trials are swept; bounds the memory, some 200 MB."""


@dataclass(frozen=True, kw_only=True)
class Trials:
    """What each trial leads to; shape ``(trials,)`` but for ``net_cap`` and ``elmore_use``.

    Parameters
    ----------
    worst : FloatArray, s
        Latest arrival at any path end.
    lateness, charged_lateness : FloatArray, s
        The same with required times counted in, in arrivals and in charged delay.
    worst_transition : FloatArray, s
    net_cap : FloatArray, F, shape (nets asked for, trials)
    elmore_use : FloatArray
        Largest ratio of an arc's Elmore delay to its limit.
    """

    worst: FloatArray
    lateness: FloatArray
    charged_lateness: FloatArray
    worst_transition: FloatArray
    net_cap: FloatArray
    elmore_use: FloatArray


def tried(
    timing: Timing,
    changed: Circuit,
    trial: IntArray,
    *,
    nets: IntArray,
    elmore_limit: FloatArray,
) -> Trials:
    """Time every trial.

    Parameters
    ----------
    timing : Timing
        The block as it is.
    changed : Circuit
        The block with all changes made.
    trial : IntArray, shape (gates,)
        The trial in which a gate takes its changed widths; -1: in none.
    nets : IntArray
        Nets whose capacitance is wanted.
    elmore_limit : FloatArray, s, shape (circuit arcs,)
        What ``elmore_use`` measures against; infinity for no limit.
    """
    count = int(trial.max(initial=-1)) + 1
    widest = max(len(timing.circuit.arcs.gate), len(timing.graph), len(timing.circuit.net_cap))
    batch = max(1, _SIDE_BY_SIDE // widest)
    parts = [
        _side_by_side(
            timing,
            changed,
            np.where((trial >= begin) & (trial < begin + batch), trial - begin, -1),
            min(batch, count - begin),
            nets,
            elmore_limit,
        )
        for begin in range(0, max(count, 1), batch)
    ]
    return Trials(
        worst=np.concatenate([part.worst for part in parts]),
        lateness=np.concatenate([part.lateness for part in parts]),
        charged_lateness=np.concatenate([part.charged_lateness for part in parts]),
        worst_transition=np.concatenate([part.worst_transition for part in parts]),
        net_cap=np.concatenate([part.net_cap for part in parts], axis=1),
        elmore_use=np.concatenate([part.elmore_use for part in parts]),
    )


def _side_by_side(
    timing: Timing,
    changed: Circuit,
    trial: IntArray,
    count: int,
    nets: IntArray,
    elmore_limit: FloatArray,
) -> Trials:
    """Time some trials in one sweep."""
    circuit, graph, unit = timing.circuit, timing.graph, timing.unit
    load = _loads(circuit, changed, trial, count)
    elmore = _elmore(circuit, changed, trial, load)
    on_graph = elmore[graph.arc]
    drive = graph.start_drive[:, None] * load[graph.net[graph.start]]
    start = graph.start_arrival[:, None] + drive
    flow = propagate(circuit, graph, on_graph, start, timing.wired)
    charge = charges_of(circuit, graph, unit).arc[:, None]
    before = timing.charged_wire[:, None]
    charged = latest_arrivals(graph, charge * on_graph + before, start)[graph.end]
    arrival = flow.arrival[graph.end] + flow.end_wire
    offset = end_offsets(graph)[:, None]
    return Trials(
        worst=arrival.max(axis=0),
        lateness=(arrival + offset).max(axis=0),
        charged_lateness=(charged + timing.end_charged_wire[:, None] + offset).max(axis=0),
        worst_transition=flow.transition[graph.target].max(axis=0),
        net_cap=load[nets],
        elmore_use=(elmore / elmore_limit[:, None]).max(axis=0),
    )


def _loads(circuit: Circuit, changed: Circuit, trial: IntArray, count: int) -> FloatArray:
    """Return the load on each net in each trial, F, shape (nets, trials)."""
    load = np.repeat(circuit.net_cap[:, None], count, axis=1)
    pins = circuit.pins
    mine = trial[pins.gate]
    tells = np.flatnonzero(mine >= 0)
    grown = changed.pins.cap.today[tells] - pins.cap.today[tells]
    np.add.at(load, (pins.net[tells], mine[tells]), grown)
    return load


def _elmore(circuit: Circuit, changed: Circuit, trial: IntArray, load: FloatArray) -> FloatArray:
    """Return the Elmore delay of each circuit arc in each trial, s, shape (arcs, trials)."""
    elmore = circuit.arcs.elmore(load)
    in_trial = np.append(trial, -1)  # the last entry is that of what has no owner
    old, new = circuit.arcs.charges, changed.arcs.charges
    mine = in_trial[old.owner]
    tells = np.flatnonzero(mine >= 0)
    grown = (new.resistance - old.resistance)[tells] * load[old.net[tells], mine[tells]]
    np.add.at(elmore, (old.arc[tells], mine[tells]), grown)
    for row, which, value in _own_terms(circuit, changed, in_trial):
        np.add.at(elmore, (row, which), value)
    return elmore


def _own_terms(
    circuit: Circuit, changed: Circuit, in_trial: IntArray
) -> Iterator[tuple[IntArray, IntArray, FloatArray]]:
    """Yield the arcs whose own terms change, in which trials, and by how much, s.

    A trial that holds one owner of a term but not the other changes that factor alone.
    """
    old, new = circuit.arcs.own, changed.arcs.own
    resistance, capacitance = in_trial[old.resistance_owner], in_trial[old.capacitance_owner]
    both = resistance == capacitance
    for which, r, c in (
        (np.where(both, resistance, -1), new.resistance, new.capacitance),
        (np.where(both, -1, resistance), new.resistance, old.capacitance),
        (np.where(both, -1, capacitance), old.resistance, new.capacitance),
    ):
        tells = np.flatnonzero(which >= 0)
        yield old.arc[tells], which[tells], (r * c - old.today)[tells]
