"""Dynamic gates: a clock precharges the output, then a network of one polarity may discharge it.

With a foot, a transistor of the clock in the network, precharge and network never fight; without
one the inputs must be low while the gate precharges, as those of domino logic are (Krambeck, Lee
and Law, IEEE Journal of Solid-State Circuits 17(3), 1982). Only evaluation is an arc of the gate:
during precharge nobody waits for the output, as long as it is done before its clock turns. What
leads to precharge, its clock and where there is no foot the inputs that let go, is kept apart.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.function import conduction, dual
from evenstage.circuit.gate import (
    GateForm,
    Pulls,
    Unrecognised,
    all_arcs,
    possible_vectors,
)
from evenstage.circuit.kinds.paths import other_supply, single_output
from evenstage.circuit.network import HIGH, LOW, merge

if TYPE_CHECKING:
    from evenstage.circuit.context import Context
    from evenstage.circuit.network import Network, Switch

FOOTED = "dynamic gate, footed"
UNFOOTED = "dynamic gate, unfooted"


def dynamic(devices: tuple[Switch, ...], context: Context) -> GateForm | Unrecognised:
    """Recognise a precharged gate."""
    network = merge(devices)
    output = single_output(network, context)
    if output is None:
        return Unrecognised("not one output alone")
    for supply, polarity in ((HIGH, "p"), (LOW, "n")):
        clock = _clock(network, output, supply, polarity)
        if clock is not None:
            return _evaluated(devices, network, output, (supply, clock), context)
    return Unrecognised("no clock alone precharges its output")


def _is_port(network: Network, output: int, context: Context) -> bool:
    return any(network.node_of_net[net] == output for net in context.ports)


def _clock(network: Network, output: int, supply: int, polarity: str) -> int | None:
    """Return the input that alone pulls the output to a supply, if one does."""
    ends = [s for s in network.switches if supply in (s.a, s.b)]
    if not ends or any(s.polarity != polarity or output not in (s.a, s.b) for s in ends):
        return None
    gates = {s.gate for s in ends}
    return gates.pop() if len(gates) == 1 and min(gates) >= 0 else None


def _evaluated(
    devices: tuple[Switch, ...],
    network: Network,
    output: int,
    precharge: tuple[int, int],
    context: Context,
) -> GateForm | Unrecognised:
    supply, clock = precharge
    against = other_supply(supply)
    polarity = "n" if supply == HIGH else "p"
    pull = network.conducts(output, against, polarity)
    possible = possible_vectors(network, context.complements)
    if (pull != network.conducts(output, against))[possible].any():
        return Unrecognised("an n switch pulls up or a p switch pulls down")
    level = network.vectors[network.inputs.index(clock)]
    if not any(pull[level == value].any() and not pull[level == value].all() for value in (0, 1)):
        return Unrecognised("only its clock moves its output")
    charging = ~level if supply == HIGH else level
    footed = not (pull & charging)[possible].any()
    others = {s.gate for s in network.switches if supply not in (s.a, s.b) and s.gate != clock}
    if clock not in context.clocks:
        if others and others <= set(context.clocks):
            return Unrecognised("what would precharge it is no clock, and its other input is one")
        if not footed and len(others) == 1 and _is_port(network, output, context):
            return Unrecognised("a driver of a port, with each of its transistors driven apart")
    never = np.zeros_like(pull)
    pulls = Pulls(never, pull, possible) if supply == HIGH else Pulls(pull, never, possible)
    arcs = all_arcs(network, output, pulls, context.complements)
    if not arcs:
        return Unrecognised("no input moves its output")
    charged = charging & ~pull
    back = Pulls(charged, pull, possible) if supply == HIGH else Pulls(pull, charged, possible)
    return GateForm(
        drawn=devices,
        network=network,
        output=output,
        pull_down=conduction(network, output, LOW, "n")
        if supply == HIGH
        else dual(conduction(network, output, HIGH, "p")),
        arcs=arcs,
        kind=FOOTED if footed else UNFOOTED,
        precharge=tuple(
            arc
            for arc in all_arcs(network, output, back, context.complements)
            if arc.rising == (supply == HIGH)
        ),
    )
