"""A recognised block as the document scripts read."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.supplied import gate_domains
from evenstage.report.document.timing import NOTICES

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.inventory import Entry, Inventory
    from evenstage.circuit.supplied import Domain
    from evenstage.report.document.shape import Document


def write_inventory(inventory: Inventory) -> Document:
    """Return what is in a block as plain values, every gate by name."""
    return {
        "source": inventory.source,
        "top": inventory.top,
        "counts": {
            "devices": inventory.devices,
            "nets": inventory.nets,
            "gates": inventory.gates,
        },
        "supplies": {"high": list(inventory.high), "low": list(inventory.low)},
        "subcircuits": _subcircuits(inventory.entries),
        "gates": _gates(inventory.circuit),
        "storage": [
            {
                "subcircuit": some.subcircuit,
                "kind": some.kind,
                "count": some.count,
                "instance": some.instance,
                "nets": list(some.nets),
                "data": list(some.data),
                "clocks": [{"net": net, "level": int(high)} for net, high in some.clocks],
                "set_reset": [{"net": net, "level": int(high)} for net, high in some.writes],
                "supplies": _supplies(some.supplies),
            }
            for some in inventory.stored
        ],
        "outside_logic": [
            {
                "subcircuit": some.subcircuit,
                "role": some.role,
                "devices": some.devices,
                "names": list(some.names),
            }
            for some in inventory.outside
        ],
        "not_understood": [
            {
                "reason": some.reason,
                "groups": some.groups,
                "devices": some.devices,
                "names": list(some.names),
            }
            for some in inventory.not_understood
        ],
        "notices": NOTICES.write(inventory.notices),
    }


def _supplies(domain: Domain) -> Document:
    return {"high": list(domain.high), "low": list(domain.low)}


def _subcircuits(entries: tuple[Entry, ...]) -> list[Document]:
    """Return the entries by subcircuit, in their order."""
    by_name: dict[str, list[Document]] = {}
    for entry in entries:
        by_name.setdefault(entry.subcircuit, []).append(
            {
                "kind": entry.kind,
                "count": entry.count,
                "devices": entry.devices,
                "instance": entry.instance,
                "output": entry.output,
                "inputs": list(entry.inputs),
                "function": entry.function,
                "supplies": _supplies(entry.supplies),
            }
        )
    return [{"name": name, "kinds": kinds} for name, kinds in by_name.items()]


def _gates(circuit: Circuit) -> list[Document]:
    """Return every gate: nets by their full names, the function in the names of its subcircuit."""
    names, supplied = circuit.devices.net_names, gate_domains(circuit)
    found: list[Document] = []
    for gate in range(len(circuit)):
        some = circuit.alike[int(circuit.gate_form[gate])]
        nets = some.nets[int(circuit.gate_row[gate])]
        found.append(
            {
                "instance": circuit.gate_name(gate),
                "subcircuit": circuit.gate_subcircuit(gate),
                "kind": some.form.kind,
                "output": names[int(circuit.gate_output[gate])],
                "inputs": [names[int(nets[local])] for local in some.form.network.inputs],
                "function": circuit.gate_function(gate),
                "supplies": _supplies(supplied.of(gate)),
            }
        )
    return found
