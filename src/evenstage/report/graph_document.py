"""The graph of a block's gates as GraphML."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

import networkx as nx

from evenstage.circuit.circuit import NET
from evenstage.circuit.supplied import gate_domains

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit

#: What XML 1.0 cannot hold, not even escaped (section 2.2 of the recommendation).
_NOT_XML = re.compile("[^\t\n\r -\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")


def graph_document(circuit: Circuit) -> str:
    """Return the gates as nodes, and an edge for each net from a gate to an input of another.

    Nodes carry ``instance``, ``subcircuit``, ``kind``, ``function``, ``output`` and, as ``high``
    and ``low``, the supply nets that the gate hangs on, several with commas between; edges ``net``.
    Bytes of names that XML cannot hold are written as escapes.

    Parameters
    ----------
    circuit : Circuit

    Returns
    -------
    str
        GraphML with a final newline; the same text for the same circuit.
    """
    names, supplied = circuit.devices.net_names, gate_domains(circuit)
    told: nx.DiGraph[int] = nx.DiGraph()
    for gate in range(len(circuit)):
        told.add_node(
            gate,
            instance=_shown(circuit.gate_name(gate)),
            subcircuit=_shown(circuit.gate_subcircuit(gate)),
            kind=circuit.gate_kind(gate),
            function=_shown(circuit.gate_function(gate)),
            output=_shown(names[int(circuit.gate_output[gate])]),
            high=_shown(", ".join(supplied.of(gate).high)),
            low=_shown(", ".join(supplied.of(gate).low)),
        )
    for driver, gate, facts in circuit.graph().edges(data=True):
        told.add_edge(driver, gate, net=_shown(names[int(facts[NET])]))
    return "\n".join([*nx.generate_graphml(told), ""])


def _shown(text: str) -> str:
    return _NOT_XML.sub(lambda found: f"\\x{ord(found[0]):02x}", text)
