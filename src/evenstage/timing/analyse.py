"""A circuit to its analysis: the slowest paths, all path ends, and what the block amounts to."""

from __future__ import annotations

from itertools import islice
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import CircuitError, Notice
from evenstage.progress import tell
from evenstage.timing.graph import timing_graph
from evenstage.timing.precharge import late_precharges, precharges
from evenstage.timing.results import Analysis, Counts, PathEnd
from evenstage.timing.search import latest_path, slowest_paths
from evenstage.timing.stages import describe, edge_name
from evenstage.timing.sweep import Timing, sweep
from evenstage.timing.yardstick import yardstick

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import IntArray


def time(
    circuit: Circuit,
    brief: Brief | None = None,
    *,
    start: str | None = None,
    end: str | None = None,
) -> Timing:
    """Time a circuit: arrivals along the paths that count; see `timing_graph` for the arguments.

    Raises
    ------
    CircuitError
        ``no-gate`` where no gate was recognised.
    NoPathError
        Where no path is left.
    SettingsError
        Where a pattern of the brief fits nothing.
    """
    if not len(circuit):
        reasons = dict.fromkeys(some.reason for some in circuit.not_understood)
        raise CircuitError("; ".join(["no gate found", *reasons]), code="no-gate")
    tell("timing")
    unit = yardstick(circuit.process)
    return sweep(circuit, timing_graph(circuit, unit, brief, start=start, end=end), unit)


def analyse(
    circuit: Circuit,
    brief: Brief | None = None,
    *,
    start: str | None = None,
    end: str | None = None,
    count: int = 1,
) -> Analysis:
    """Find the slowest paths of a circuit; ``count`` of them, see `time` for the other arguments.

    Raises
    ------
    NoPathError
        Where no path is left.
    SettingsError
        Where a pattern of the brief fits nothing.

    Examples
    --------
    >>> from evenstage import elaborate, read, read_brief, read_process, recognise
    >>> folder = "sample_netlists/pad_predriver"
    >>> process = read_process(f"{folder}/process.toml")
    >>> brief = read_brief(f"{folder}/brief.toml")
    >>> devices = elaborate(read(f"{folder}/netlist.sp"), None, process, brief)
    >>> analysis = analyse(recognise(devices, process, brief), brief)
    >>> analysis.headline
    'predrv: d to pg takes 907 ps through 7 stages'
    >>> slowest = max(analysis.paths[0].stages, key=lambda stage: stage.delay)
    >>> slowest.instance, f"{slowest.stage_effort:.1f}"
    ('xp6', '11.2')
    """
    return report(time(circuit, brief, start=start, end=end), count, brief)


def report(timing: Timing, count: int = 1, brief: Brief | None = None) -> Analysis:
    """Put the results of a timing together; ``count`` slowest paths.

    Precharge is told where the whole block is meant, and not only paths between some nets.
    """
    circuit, graph = timing.circuit, timing.graph
    devices = circuit.devices
    # The slowest path alone is the one the latest arrival came by: no need to search.
    slowest = [latest_path(timing)] if count == 1 else islice(slowest_paths(timing), count)
    paths = tuple(describe(timing, arcs) for arcs in slowest)
    start_nets = dict.fromkeys(graph.net[graph.start].tolist())
    reached = np.flatnonzero(_on_paths(circuit, graph.arc))
    charging = precharges(circuit, brief) if graph.whole else ()
    notices = [*circuit.notices, *graph.notices, *late_precharges(charging)]
    if graph.whole and len(reached) < len(circuit):
        notices.append(_unreached(circuit, reached))
    return Analysis(
        source=devices.netlist.sources[0].label,
        top=devices.top,
        yardstick=timing.unit,
        counts=Counts(
            devices=len(devices),
            nets=len(devices.net_names),
            gates=len(circuit),
            stages=len(reached),
        ),
        paths=paths,
        ends=_ends(timing),
        worst_transition=timing.worst_transition,
        total_width=circuit.total_width,
        switched_cap=circuit.switched_cap,
        input_caps=tuple(
            (devices.net_names[net], float(circuit.net_cap[net])) for net in start_nets
        ),
        notices=tuple(notices),
        timing=timing,
        precharges=charging,
    )


def _ends(timing: Timing) -> tuple[PathEnd, ...]:
    """Return every end with its later edge, the latest first; of equal ones the first net."""
    graph, circuit = timing.graph, timing.circuit
    charged = np.full(len(circuit.devices.net_names), -np.inf)
    np.maximum.at(charged, graph.net[graph.end], timing.end_charged_arrival)
    latest: dict[int, int] = {}
    for index, net in enumerate(graph.net[graph.end].tolist()):
        if net not in latest or timing.lateness[index] > timing.lateness[latest[net]]:
            latest[net] = index
    lateness = timing.lateness.tolist()
    order = sorted(latest.values(), key=lambda index: (-lateness[index], index))
    # Names are found fastest in the order of the text.
    names = {net: circuit.devices.net_names[net] for net in sorted(latest)}
    return tuple(
        PathEnd(
            net=names[int(graph.net[graph.end[index]])],
            edge=edge_name(rising=bool(graph.rising[graph.end[index]])),
            delay=float(timing.end_arrival[index]),
            charged_delay=float(charged[graph.net[graph.end[index]]]),
            required=None
            if np.isnan(graph.end_required[index])
            else float(graph.end_required[index]),
            why=circuit.ends.get(int(graph.net[graph.end[index]]), "asked for"),
        )
        for index in order
    )


def _on_paths(circuit: Circuit, which: IntArray) -> BoolArray:
    """Tell which gates some arcs run through, shape (gates,)."""
    arcs = circuit.arcs
    counts, found = np.zeros(len(arcs), bool), np.zeros(len(circuit), bool)
    counts[which] = True
    found[arcs.gate[which]] = True
    found[arcs.gates_along(np.flatnonzero(counts))] = True
    return found


def _unreached(circuit: Circuit, reached: IntArray) -> Notice:
    missing = np.setdiff1d(np.arange(len(circuit)), reached)
    names = tuple(circuit.gate_name(int(gate)) for gate in missing)
    return Notice(
        "not-on-a-path",
        f"{'one gate lies' if len(names) == 1 else f'{len(names)} gates lie'} on no path that "
        f"counts (no input reaches it, or it reaches no path end): '{names[0]}'"
        + (" and others" if len(names) > 1 else ""),
        names=names,
    )
