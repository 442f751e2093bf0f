"""What a recognised circuit computes, by its gates' own truth tables."""

from __future__ import annotations

from typing import TYPE_CHECKING

import networkx as nx
import numpy as np

from evenstage.circuit.network import HIGH

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.circuit.circuit import Circuit


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
    for gate in nx.topological_sort(circuit.graph()):
        some = circuit.alike[circuit.gate_form[gate]]
        network = some.form.network
        nets = some.nets[circuit.gate_row[gate]]
        wanted = [int(nets[local]) for local in network.inputs]
        if all(net in known for net in wanted):
            column = sum(known[net].astype(int) << row for row, net in enumerate(wanted))
            up = network.conducts(some.form.output, HIGH, "p")
            known[int(circuit.gate_output[gate])] = up[column]
    return known


def all_vectors(names: list[str]) -> dict[str, NDArray[np.bool_]]:
    """Return every combination of some inputs, by name."""
    codes = np.arange(1 << len(names))
    return {name: (codes >> row & 1).astype(bool) for row, name in enumerate(names)}


def function_values(text: str, known: dict[str, NDArray[np.bool_]]) -> NDArray[np.bool_]:
    """Return the values of a Boolean expression in ``& | ^ !`` and names."""
    result: NDArray[np.bool_] = eval(text.replace("!", "~"), {"__builtins__": {}}, known)
    return result
