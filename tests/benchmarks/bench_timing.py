"""How fast a large block is analysed, and how fast wires are.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_timing.py``, or ``pytest -m benchmark`` on
this file, which holds the table against its limits. The block is invented: 285,000 stages, a
million transistors, 60 layers. Times are CPU seconds, best of three.
"""

from __future__ import annotations

import sys
import time
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
import pytest

from evenstage.circuit.rc_network import RCNetwork
from evenstage.circuit.recognise import recognise
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.process.generic import generic
from evenstage.timing.analyse import analyse, report
from evenstage.timing.graph import timing_graph
from evenstage.timing.sweep import propagate, start_arrivals, sweep
from evenstage.timing.yardstick import yardstick
from support.large_netlists import layered

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator

    from evenstage.circuit.circuit import Circuit

_ROUNDS = 3
_STAGES, _DEPTH = 285_000, 60


class Row(NamedTuple):
    """What was measured, CPU seconds, and what they must not exceed (infinity: only told)."""

    what: str
    seconds: float
    limit: float = float("inf")

    def __str__(self) -> str:
        limit = "" if self.limit == float("inf") else f"  <= {self.limit:g}"
        missed = "  missed" if self.seconds > self.limit else ""
        return f"{self.what:<56}{self.seconds:8.3f} s{limit}{missed}"


def seconds(action: Callable[[], object], rounds: int = _ROUNDS) -> float:
    """Return the CPU seconds of an action, best of some rounds."""
    found = []
    for _ in range(rounds):
        begin = time.process_time()
        action()
        found.append(time.process_time() - begin)
    return min(found)


def block() -> Circuit:
    """Return the large block, recognised, nothing worked out yet."""
    process = generic(1.0)
    # Powers of transitions cost most: they are on.
    curved = tuple(replace(t, slope_power=0.7, shape_carry=0.2) for t in process.transistors)
    process = replace(process, transistors=curved)
    netlist = read_bytes(layered(_STAGES, _DEPTH), "layers.sp", Path())
    return recognise(elaborate(netlist, process=process), process)


def large() -> Iterator[Row]:
    """Yield the rows of the large block."""
    circuit = block()
    yield Row(
        f"{len(circuit.devices):,} transistors, complete analysis",
        seconds(lambda: analyse(replace(circuit)), 2),
        2.0,
    )
    unit = yardstick(circuit.process)
    yield Row("  of that: tables of arcs and pins", seconds(lambda: replace(circuit).arcs))
    graph = timing_graph(circuit, unit)
    yield Row("  timing graph", seconds(lambda: timing_graph(circuit, unit)))
    elmore = circuit.arcs.elmore(circuit.net_cap)[graph.arc]
    start = start_arrivals(circuit, graph)
    yield Row(
        f"  arrivals of {len(circuit):,} stages, {len(graph.arc):,} arcs",
        seconds(lambda: propagate(circuit, graph, elmore, start), 7),
        0.05,
    )
    timing = sweep(circuit, graph, unit)
    yield Row("  results", seconds(lambda: report(timing)))


def wires() -> Iterator[Row]:
    """Yield the rows of RC networks."""
    rng = np.random.default_rng(3)
    for nodes, limit in ((10_000, 0.1), (1_000_000, float("inf"))):
        tree = (rng.random(nodes - 1) * np.arange(1, nodes)).astype(np.int32)
        ends = np.stack([tree, np.arange(1, nodes, dtype=np.int32)])
        yield Row(f"a tree of {nodes:,} nodes", _network(ends, nodes), limit)
    grid = np.arange(10_000, dtype=np.int32).reshape(100, 100)
    across = np.stack([grid[:, :-1].ravel(), grid[:, 1:].ravel()])
    down = np.stack([grid[:-1].ravel(), grid[1:].ravel()])
    yield Row("a mesh of 10,000 nodes", _network(np.concatenate([across, down], 1), 10_000), 0.1)


def _network(ends: np.ndarray, nodes: int) -> float:
    driven = np.arange(nodes) == 0
    resistance, capacitance = np.ones(ends.shape[1]), np.full(nodes, 1e-15)
    return seconds(lambda: RCNetwork(ends, resistance, driven).moments(capacitance))


@pytest.mark.benchmark
def test_all_is_within_its_limits() -> None:
    """The table, row by row."""
    missed = [str(row) for row in (*wires(), *large()) if row.seconds > row.limit]
    assert not missed


def main() -> None:
    """Print the table."""
    for row in (*wires(), *large()):
        sys.stdout.write(f"{row}\n")
        sys.stdout.flush()


if __name__ == "__main__":
    main()
