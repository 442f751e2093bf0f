"""When dynamic nodes are charged again: apart from all paths, counted from their clock."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.names import device_names
from evenstage.circuit.precharge import precharge_devices, precharging
from evenstage.errors import NoPathError, Notice
from evenstage.pattern import select
from evenstage.timing.graph import timing_graph
from evenstage.timing.results import Precharge
from evenstage.timing.stages import edge_name
from evenstage.timing.sweep import sweep
from evenstage.timing.yardstick import yardstick

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.graph import TimingGraph
    from evenstage.timing.sweep import Timing


def precharges(circuit: Circuit, brief: Brief | None = None) -> tuple[Precharge, ...]:
    """Time the precharge of every dynamic node, the latest first.

    Parameters
    ----------
    circuit : Circuit
    brief : Brief, optional
        Its inputs and clocks are used here.

    Raises
    ------
    SettingsError
        Where a pattern of the brief fits nothing.
    """
    back = precharging(circuit)
    if back is None:
        return ()
    unit = yardstick(back.process)
    try:
        timing = sweep(back, timing_graph(back, unit, brief), unit)
    except NoPathError:
        return ()
    return _entries(timing, brief)


def late_precharges(found: Sequence[Precharge]) -> tuple[Notice, ...]:
    """Return a notice where a clock's phase is too short for what it precharges."""
    late = [one for one in found if one.phase is not None and one.complete > one.phase]
    if not late:
        return ()
    what = "one net is" if len(late) == 1 else f"{len(late)} nets are"
    return (
        Notice(
            "precharge-late",
            f"{what} still precharging when the phase of its clock that the brief gives is over: "
            f"'{late[0].net}'",
            names=tuple(one.net for one in late),
        ),
    )


def _entries(timing: Timing, brief: Brief | None) -> tuple[Precharge, ...]:
    graph, circuit = timing.graph, timing.circuit
    names, begin = circuit.devices.net_names, _origins(timing, graph)
    # Of a node both of whose edges count as ends only that by precharge has an arc.
    reached = np.flatnonzero(timing.winner[graph.end] >= 0)
    node = graph.end[reached]
    start = begin[node]
    arrival = np.zeros(len(graph))
    arrival[graph.start] = timing.start_arrival
    delay = timing.end_arrival[reached] - arrival[start]
    gate = circuit.arcs.gate[graph.arc[timing.winner[node]]]
    phase = _phases(circuit, brief, graph.net[start], graph.rising[start])
    order = np.lexsort((node, -delay))
    return tuple(
        Precharge(
            net=names[int(graph.net[node[at]])],
            edge=edge_name(rising=bool(graph.rising[node[at]])),
            instance=circuit.gate_name(int(gate[at])),
            devices=device_names(circuit.devices, precharge_devices(circuit, int(gate[at]))),
            clock=names[int(graph.net[start[at]])],
            clock_edge=edge_name(rising=bool(graph.rising[start[at]])),
            delay=float(delay[at]),
            transition=float(timing.end_transition[reached[at]]),
            phase=None if np.isnan(phase[at]) else float(phase[at]),
        )
        for at in order.tolist()
    )


def _origins(timing: Timing, graph: TimingGraph) -> IntArray:
    """Return the start that the latest arrival at each node came from, shape (nodes,)."""
    origin = np.arange(len(graph))
    came = timing.winner >= 0
    origin[came] = graph.source[timing.winner[came]]
    while (origin[origin] != origin).any():
        origin = origin[origin]
    return origin


def _phases(circuit: Circuit, brief: Brief | None, nets: IntArray, rising: BoolArray) -> FloatArray:
    """Return how long the level lasts that each edge of a net begins, s; NaN where unsaid."""
    found = np.full(len(nets), np.nan)
    given = brief.clocks if brief else ()
    names = circuit.devices.net_names if given else ()
    for clock in given:
        chosen = np.isin(nets, select(clock.nets, names, "net"))
        for level, lasts in ((True, clock.high), (False, clock.low)):
            if lasts is not None:
                found[chosen & (rising == level)] = lasts
    return found
