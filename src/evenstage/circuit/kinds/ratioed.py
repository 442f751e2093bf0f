"""Ratioed gates: a network that pulls one way against a load that always conducts.

Pseudo-nMOS gates have a pMOS load whose gate is tied low; the mirror image and loads of nMOS exist
too. Where the network conducts, both do, and the output goes where the stronger pulls: the
difference of the conductances is what moves it (Sutherland, Sproull and Harris, Logical Effort,
1999, section 10.1, from memory).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.function import conduction, dual
from evenstage.circuit.gate import (
    GateForm,
    Pulls,
    Unrecognised,
    Weak,
    all_arcs,
    possible_vectors,
)
from evenstage.circuit.kinds.paths import drawn_path, other_supply, shortest, single_output
from evenstage.circuit.network import HIGH, LOW, merge

if TYPE_CHECKING:
    from evenstage.circuit.context import Context
    from evenstage.circuit.network import Network, Switch

KIND = "ratioed gate"


def ratioed(devices: tuple[Switch, ...], context: Context) -> GateForm | Unrecognised:
    """Recognise a gate with an always-on load."""
    network = merge(devices)
    output = single_output(network, context)
    if output is None:
        return Unrecognised("not one output alone")
    load = _load(network, output)
    if load is None:
        return Unrecognised("not one supply alone that a load leads to")
    supply, weak = load
    against = other_supply(supply)
    pull = network.conducts(output, against, "n" if supply == HIGH else "p")
    possible = possible_vectors(network, context.complements)
    if (pull != network.conducts(output, against))[possible].any():
        return Unrecognised("an n switch pulls up or a p switch pulls down")
    up, down = (~pull, pull) if supply == HIGH else (pull, ~pull)
    pulls = Pulls(up, down, possible)
    arcs = all_arcs(network, output, pulls, context.complements, frozenset(weak))
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
        kind=KIND,
        weak=(Weak(supply, drawn_path(network, weak), is_keeper=False, node=output),),
    )


def _load(network: Network, output: int) -> tuple[int, tuple[int, ...]] | None:
    """Return the supply that a load alone leads to, and the load; None where there is none."""
    always = frozenset(i for i, s in enumerate(network.switches) if s.gate < 0)
    for supply in (HIGH, LOW):
        path = shortest(network, output, supply, always)
        ends = {i for i, s in enumerate(network.switches) if supply in (s.a, s.b)}
        if path is not None and ends <= set(path):
            return supply, path
    return None
