"""What the arc model says of measured arcs: the program's own sweep, one start per measurement.

For every measured arc the timing graph from its input to its output is taken, as an analysis would
take it; each measurement is one copy of it with its own transition and load. All copies are swept
at once.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from evenstage.circuit.arcs import ranges
from evenstage.errors import NoPathError
from evenstage.timing.graph import TimingGraph, timing_graph
from evenstage.timing.sweep import propagate
from evenstage.timing.yardstick import yardstick

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from numpy.typing import NDArray

    from evenstage.circuit.arcs import Arcs
    from evenstage.fitting.bench import Bench
    from evenstage.fitting.measurements import Measurements, Query
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.process.process import Process


class Predicted(NamedTuple):
    """Predictions, shape ``(n,)`` each: delay (s), output transition (s), input capacitance (F)."""

    delay: FloatArray
    output_transition: FloatArray
    input_cap: FloatArray


@dataclass(frozen=True, kw_only=True)
class Predictor:
    """Measurements as one timing graph.

    Parameters
    ----------
    bench : Bench
    graph : TimingGraph
        One copy of an arc's own graph per measurement.
    output, load : IntArray and FloatArray, F, shape (graph arcs,)
        The measured net of the copy that an arc belongs to, and what hangs on it.
    end : IntArray, shape (n,)
        Node of each measurement's output edge.
    input_net : IntArray, shape (n,)
    stages : IntArray, shape (n,)
        Most stages between input and output.
    """

    bench: Bench
    graph: TimingGraph
    output: IntArray
    load: FloatArray
    end: IntArray
    input_net: IntArray
    stages: IntArray

    def __call__(self, process: Process) -> Predicted:
        """Predict every measurement from the constants of a process."""
        circuit = replace(self.bench.circuit, process=process)
        arcs, which = circuit.arcs, self.graph.arc
        elmore = arcs.elmore(circuit.net_cap)[which]
        loaded, charge = _loaded(arcs, which, self.output)
        np.add.at(elmore, loaded, arcs.charges.resistance[charge] * self.load[loaded])
        flow = propagate(circuit, self.graph, elmore, self.graph.start_arrival)
        return Predicted(
            flow.arrival[self.end], flow.transition[self.end], circuit.net_cap[self.input_net]
        )


def graph_of(bench: Bench, query: Query) -> TimingGraph | None:
    """Return the timing graph of one measured arc; None where no path leads along it."""
    cell, circuit = bench.number(query.subcircuit), bench.circuit
    names = circuit.devices.net_names
    start, end = (names[bench.net(cell, port)] for port in (query.input, query.output))
    try:
        graph = timing_graph(circuit, yardstick(circuit.process), start=start, end=end)
    except NoPathError:
        return None
    return graph if (graph.rising[graph.end] == query.rising).any() else None


def build_predictor(
    bench: Bench, graphs: Sequence[TimingGraph | None], rows: Measurements
) -> Predictor:
    """Prepare the prediction of measurements.

    Parameters
    ----------
    bench : Bench
    graphs : sequence of TimingGraph
        One for each query of the measurements that has rows; see `graph_of`.
    rows : Measurements
    """
    parts = [
        _copies(graph, rows.queries[index], np.flatnonzero(rows.query == index))
        for index, graph in enumerate(graphs)
        if graph is not None
    ]
    return _joined(bench, [part for part in parts if len(part.row)], rows)


class _Copies(NamedTuple):
    """A graph once per measurement: ``row`` are the measurements, nodes come copy by copy."""

    graph: TimingGraph
    row: IntArray
    level: IntArray
    end: int


def _copies(graph: TimingGraph, query: Query, row: IntArray) -> _Copies:
    level = np.zeros(len(graph), np.int32)
    level[graph.target] = 1 + np.searchsorted(
        graph.level_ends, np.arange(len(graph.target)), side="right"
    )
    end = int(graph.end[graph.rising[graph.end] == query.rising][0])
    return _Copies(graph, row, level, end)


def _joined(bench: Bench, parts: list[_Copies], rows: Measurements) -> Predictor:
    """Put all copies into one graph, its nodes ordered by level."""
    sizes = [len(part.graph) * len(part.row) for part in parts]
    begins = np.cumsum([0, *sizes])[:-1].tolist()

    def nodes(pick: Callable[[TimingGraph], IntArray]) -> IntArray:
        """Return nodes of every copy by their number in the joined graph."""
        return np.concatenate(
            [
                (begin + len(p.graph) * np.arange(len(p.row))[:, None] + pick(p.graph)).ravel()
                for begin, p in zip(begins, parts, strict=True)
            ]
        )

    def spread(pick: Callable[[TimingGraph], NDArray[Any]]) -> NDArray[Any]:
        """Return what each copy's graph says of its nodes or arcs."""
        return np.concatenate([np.tile(pick(p.graph), len(p.row)) for p in parts])

    level = np.concatenate([np.tile(p.level, len(p.row)) for p in parts])
    order = np.argsort(level, kind="stable")
    number = np.empty(len(order), np.int32)
    number[order] = np.arange(len(order))
    target = number[nodes(lambda graph: graph.target)]
    by_target = np.argsort(target, kind="stable")
    start_row = np.concatenate([np.repeat(p.row, len(p.graph.start)) for p in parts])
    arc_row = np.concatenate([np.repeat(p.row, len(p.graph.arc)) for p in parts])[by_target]
    end_of_row = np.empty(len(rows), np.int32)
    for begin, p in zip(begins, parts, strict=True):
        end_of_row[p.row] = number[begin + len(p.graph) * np.arange(len(p.row)) + p.end]
    arc = spread(lambda graph: graph.arc)[by_target]
    net = spread(lambda graph: graph.net)[order]
    arc_level = level[order][target[by_target]]
    starts = number[nodes(lambda graph: graph.start)]
    graph = TimingGraph(
        net=net,
        rising=spread(lambda graph: graph.rising)[order],
        source=number[nodes(lambda graph: graph.source)][by_target],
        target=target[by_target],
        arc=arc,
        level_ends=np.searchsorted(
            arc_level, np.arange(1, int(level.max(initial=0)) + 1), side="right"
        ).astype(np.int32),
        start=starts,
        start_arrival=np.zeros(len(starts)),
        start_transition=rows.transition[start_row],
        start_drive=np.zeros(len(starts)),
        end=end_of_row,
        end_required=np.full(len(rows), np.nan),
        whole=False,
    )
    input_of_row = np.empty(len(rows), np.int32)
    input_of_row[start_row] = net[starts]
    return Predictor(
        bench=bench,
        graph=graph,
        output=net[end_of_row][arc_row],
        load=rows.load[arc_row],
        end=end_of_row,
        input_net=input_of_row,
        stages=level[order][end_of_row],
    )


def _loaded(arcs: Arcs, arc: IntArray, net: IntArray) -> tuple[IntArray, IntArray]:
    """Return which of some arcs charge a net of their own, and by which charges."""
    head = arcs.charges.head
    count = np.diff(head)[arc]
    row = np.repeat(np.arange(len(arc), dtype=np.int32), count)
    charge = ranges(head[arc], count)
    here = arcs.charges.net[charge] == net[row]
    return row[here], charge[here]
