"""Dynamic gates: a clock precharges the output, then a network of one polarity may discharge it.

With a foot, a transistor of the clock in the network, precharge and network never fight; without
one the inputs must be low while the gate precharges, as those of domino logic are (Krambeck, Lee
and Law, IEEE Journal of Solid-State Circuits 17(3), 1982). Only evaluation is an arc: during
precharge nobody waits for the output.
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
    if not footed and set(context.ports) & {
        n for n, o in enumerate(network.node_of_net) if o == output
    }:
        return Unrecognised("a driver of a port, with each of its transistors driven apart")
    never = np.zeros_like(pull)
    pulls = Pulls(never, pull, possible) if supply == HIGH else Pulls(pull, never, possible)
    arcs = all_arcs(network, output, pulls, context.complements)
    if not arcs:
        return Unrecognised("no input moves its output")
    return GateForm(
        drawn=devices,
        network=network,
        output=output,
        pull_down=conduction(network, output, LOW, "n")
        if supply == HIGH
        else dual(conduction(network, output, HIGH, "p")),
        arcs=arcs,
        kind=FOOTED if footed else UNFOOTED,
    )
