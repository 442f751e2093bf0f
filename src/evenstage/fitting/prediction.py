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
from evenstage.fitting.bench import nets_at
from evenstage.timing.graph import TimingGraph, timing_graph
from evenstage.timing.sweep import propagate
from evenstage.timing.yardstick import yardstick

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from numpy.typing import NDArray

    from evenstage.circuit.arcs import Arcs
    from evenstage.circuit.network import BoolArray
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


class ArcGraph(NamedTuple):
    """The timing graph of one measured arc.

    ``net``, ``rising`` and ``level`` (arcs on the longest way there) say what each node is;
    ``source``, ``target`` and ``arc`` (index into ``Circuit.arcs``) what each arc is; then come the
    nodes it starts at and the one it ends at.
    """

    net: IntArray
    rising: BoolArray
    level: IntArray
    source: IntArray
    target: IntArray
    arc: IntArray
    start: IntArray
    end: int


def arc_graphs(bench: Bench, queries: Sequence[Query]) -> tuple[ArcGraph | None, ...]:
    """Return the timing graph of each measured arc; None where no path leads along it.

    All cells measured from one place among their pins to another are looked at together.
    """
    alike: dict[tuple[int, int], list[tuple[int, int]]] = {}
    for index, query in enumerate(queries):
        number = bench.number(query.subcircuit)
        cell = bench.cells[number]
        places = cell.place(query.input), cell.place(query.output)
        alike.setdefault(places, []).append((index, number))
    found: dict[int, ArcGraph | None] = {}
    for (start, end), some in alike.items():
        graph = _between(bench, start, end)
        if graph is not None:
            cell_of_node = _cells(bench, graph, start, {number for _, number in some})
            for index, number in some:
                nodes = np.flatnonzero(cell_of_node == number)
                found[index] = _part(graph, nodes, rising=queries[index].rising)
    return tuple(found.get(index) for index in range(len(queries)))


def _between(bench: Bench, start: int, end: int) -> TimingGraph | None:
    circuit = bench.circuit
    unit = yardstick(circuit.process)
    try:
        return timing_graph(circuit, unit, start=nets_at(start), end=nets_at(end))
    except NoPathError:
        return None


def _cells(bench: Bench, graph: TimingGraph, start: int, numbers: set[int]) -> IntArray:
    """Return the cell each node belongs to, -1 for cells not asked for, shape (nodes,)."""
    of_net = np.full(len(bench.circuit.devices.net_names), -1, np.int32)
    for number in sorted(numbers):
        of_net[bench.net(number, start)] = number
    found = np.full(len(graph), -1, np.int32)
    found[graph.start] = of_net[graph.net[graph.start]]
    for some, first, node in graph.levels:
        found[node] = found[graph.source[some][first]]
    return found


def _part(graph: TimingGraph, nodes: IntArray, *, rising: bool) -> ArcGraph | None:
    """Return what a graph holds of some nodes; None where no end has the wanted edge."""
    number = np.full(len(graph), -1, np.int32)
    number[nodes] = np.arange(len(nodes))
    ends = number[graph.end[graph.rising[graph.end] == rising]]
    ends = ends[ends >= 0]
    if not len(ends):
        return None
    level = np.zeros(len(graph), np.int32)
    level[graph.target] = 1 + np.searchsorted(
        graph.level_ends, np.arange(len(graph.target)), side="right"
    )
    mine = np.flatnonzero(number[graph.target] >= 0)
    starts = number[graph.start]
    return ArcGraph(
        net=graph.net[nodes],
        rising=graph.rising[nodes],
        level=level[nodes],
        source=number[graph.source[mine]],
        target=number[graph.target[mine]],
        arc=graph.arc[mine],
        start=starts[starts >= 0],
        end=int(ends[0]),
    )


def build_predictor(
    bench: Bench, graphs: Sequence[ArcGraph | None], rows: Measurements
) -> Predictor:
    """Prepare the prediction of measurements.

    Parameters
    ----------
    bench : Bench
    graphs : sequence of ArcGraph
        One for each query of the measurements that has rows; see `arc_graphs`.
    rows : Measurements
    """
    parts = [
        _Copies(graph, np.flatnonzero(rows.query == index))
        for index, graph in enumerate(graphs)
        if graph is not None
    ]
    return _joined(bench, [part for part in parts if len(part.row)], rows)


class _Copies(NamedTuple):
    """A graph once per measurement: ``row`` are the measurements, nodes come copy by copy."""

    graph: ArcGraph
    row: IntArray


def _joined(bench: Bench, parts: list[_Copies], rows: Measurements) -> Predictor:
    """Put all copies into one graph, its nodes ordered by level."""
    sizes = [len(part.graph.net) * len(part.row) for part in parts]
    begins = np.cumsum([0, *sizes])[:-1].tolist()

    def nodes(pick: Callable[[ArcGraph], IntArray]) -> IntArray:
        """Return nodes of every copy by their number in the joined graph."""
        return np.concatenate(
            [
                (begin + len(p.graph.net) * np.arange(len(p.row))[:, None] + pick(p.graph)).ravel()
                for begin, p in zip(begins, parts, strict=True)
            ]
        )

    def spread(pick: Callable[[ArcGraph], NDArray[Any]]) -> NDArray[Any]:
        """Return what each copy's graph says of its nodes or arcs."""
        return np.concatenate([np.tile(pick(p.graph), len(p.row)) for p in parts])

    level = np.concatenate([np.tile(p.graph.level, len(p.row)) for p in parts])
    order = np.argsort(level, kind="stable")
    number = np.empty(len(order), np.int32)
    number[order] = np.arange(len(order))
    target = number[nodes(lambda graph: graph.target)]
    by_target = np.argsort(target, kind="stable")
    start_row = np.concatenate([np.repeat(p.row, len(p.graph.start)) for p in parts])
    arc_row = np.concatenate([np.repeat(p.row, len(p.graph.arc)) for p in parts])[by_target]
    end_of_row = np.empty(len(rows), np.int32)
    for begin, p in zip(begins, parts, strict=True):
        end_of_row[p.row] = number[begin + len(p.graph.net) * np.arange(len(p.row)) + p.graph.end]
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
