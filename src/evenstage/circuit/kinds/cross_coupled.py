"""One side of a cross-coupled pair of loads: level shifters and differential cascode gates.

Each output is pulled one way by a network of inputs, and the other way by a load that the opposite
output turns on (Heller, Griffin, Davis and Thoma, Cascode voltage switch logic, ISSCC 1984, from
memory). Until the opposite output has moved the load fights the network, as in a ratioed gate.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.function import conduction, dual
from evenstage.circuit.gate import GateForm, Pulls, Unrecognised, Weak, all_arcs, possible_vectors
from evenstage.circuit.kinds.paths import drawn_path, other_supply, shortest, single_output
from evenstage.circuit.network import HIGH, LOW, merge

if TYPE_CHECKING:
    from evenstage.circuit.context import Context
    from evenstage.circuit.network import Network, Switch

KINDS = {HIGH: "cross-coupled pull-up", LOW: "cross-coupled pull-down"}
"""By the supply that the load leads to."""


def cross_coupled(devices: tuple[Switch, ...], context: Context) -> GateForm | Unrecognised:
    """Recognise one side of a pair of cross-coupled loads."""
    network = merge(devices)
    output = single_output(network, context)
    if output is None:
        return Unrecognised("not one output alone")
    opposite = {a for a, b in context.mutual if network.node_of_net[b] == output}
    weak = frozenset(i for i, s in enumerate(network.switches) if s.gate in opposite)
    for supply, polarity in ((HIGH, "p"), (LOW, "n")):
        if all(network.switches[i].polarity == polarity for i in weak):
            path = shortest(network, output, supply, weak)
            if path is not None and _leads_alone(network, supply, path):
                return _form(devices, network, output, (supply, path), context)
    return Unrecognised("no load that the opposite output turns on")


def _leads_alone(network: Network, supply: int, path: tuple[int, ...]) -> bool:
    """Tell whether nothing but a path leads to a supply."""
    ends = {i for i, s in enumerate(network.switches) if supply in (s.a, s.b)}
    return ends <= set(path)


def _form(
    devices: tuple[Switch, ...],
    network: Network,
    output: int,
    load: tuple[int, tuple[int, ...]],
    context: Context,
) -> GateForm | Unrecognised:
    supply, path = load
    against, polarity = other_supply(supply), "n" if supply == HIGH else "p"
    pull = network.conducts(output, against, polarity)
    possible = possible_vectors(network, context.complements)
    if (pull != network.conducts(output, against))[possible].any() or not pull.any():
        return Unrecognised("nothing of one polarity pulls against its load")
    held = network.conducts(output, supply) & ~pull
    up, down = (held, pull) if supply == HIGH else (pull, held)
    arcs = all_arcs(
        network, output, Pulls(up, down, possible), context.complements, frozenset(path)
    )
    return GateForm(
        drawn=devices,
        network=network,
        output=output,
        pull_down=conduction(network, output, LOW, "n")
        if supply == HIGH
        else dual(conduction(network, output, HIGH, "p")),
        arcs=arcs,
        kind=KINDS[supply],
        weak=(Weak(supply, drawn_path(network, path), is_keeper=False, node=output),),
        floats=True,
    )
