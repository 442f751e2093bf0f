"""What a recognised circuit computes, by its gates' own truth tables."""

from __future__ import annotations

from typing import TYPE_CHECKING

import networkx as nx
import numpy as np

from evenstage.circuit.network import HIGH

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.stage_form import Sink
    from evenstage.netlist.devices import IntArray


def values(circuit: Circuit, inputs: dict[int, NDArray[np.bool_]]) -> dict[int, NDArray[np.bool_]]:
    """Return every net's value for arrays of input values, by net id.

    Nets that depend on something unknown are left out.
    """
    count = len(next(iter(inputs.values())))
    known = dict(inputs)
    for net in np.flatnonzero(circuit.supplies.is_high).tolist():
        known[net] = np.ones(count, bool)
    for net in np.flatnonzero(circuit.supplies.is_low).tolist():
        known[net] = np.zeros(count, bool)
    in_stages = {gate for some in circuit.stages for gate in some.gates.ravel().tolist()}
    order, before = list(nx.topological_sort(circuit.graph())), -1
    while len(known) > before:
        before = len(known)
        for gate in order:
            if gate not in in_stages:
                _add_gate(circuit, gate, known)
        for some in circuit.stages:
            for sink in some.form.sinks:
                for nets in some.nets:
                    _add_sink(sink, nets, known)
    return known


def _add_gate(circuit: Circuit, gate: int, known: dict[int, NDArray[np.bool_]]) -> None:
    """Add the value of a gate's output where its inputs are known."""
    some = circuit.alike[circuit.gate_form[gate]]
    network = some.form.network
    nets = some.nets[circuit.gate_row[gate]]
    wanted = [int(nets[local]) for local in network.inputs]
    if all(net in known for net in wanted):
        column = sum(known[net].astype(int) << row for row, net in enumerate(wanted))
        up = network.conducts(some.form.output, HIGH, "p")
        known[int(circuit.gate_output[gate])] = up[column]


def _add_sink(sink: Sink, nets: IntArray, known: dict[int, NDArray[np.bool_]]) -> None:
    """Add the value of a stage's output where it is known and never floats."""
    wanted = {int(nets[net]) for cube in (*sink.high, *sink.low) for net, _ in cube}
    if not all(net in known for net in wanted):
        return
    high, low = (
        np.any(
            [
                np.all([known[int(nets[net])] == value for net, value in cube], axis=0)
                for cube in cubes
            ],
            axis=0,
        )
        for cubes in (sink.high, sink.low)
    )
    assert not (high & low).any(), "two drivers fight"
    if (high | low).all():
        known[int(nets[sink.node])] = high


def all_vectors(names: list[str]) -> dict[str, NDArray[np.bool_]]:
    """Return every combination of some inputs, by name."""
    codes = np.arange(1 << len(names))
    return {name: (codes >> row & 1).astype(bool) for row, name in enumerate(names)}


def function_values(text: str, known: dict[str, NDArray[np.bool_]]) -> NDArray[np.bool_]:
    """Return the values of a Boolean expression in ``& | ^ !`` and names."""
    result: NDArray[np.bool_] = eval(text.replace("!", "~"), {"__builtins__": {}}, known)
    return result
