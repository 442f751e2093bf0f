"""Keepers: devices that hold a net where it is, through a gate that listens to it.

Half-latches on precharged nodes, level restorers behind pass transistors and the feedback of a
latch that its input overpowers have in common that whatever drives the net wins. They are left out
of the network, which is then tried as any other kind; their gates and drains stay as loads.
"""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from evenstage.circuit.gate import SWITCHES_MAX, GateForm, Unrecognised, Weak
from evenstage.circuit.kinds.paths import drawn_path
from evenstage.circuit.network import HIGH, LOW, Network, Switch, merge

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from evenstage.circuit.context import Context

    Family = Callable[[tuple[Switch, ...], Context], GateForm | Unrecognised]

_PATHS_MAX = 8
"""More ways from one net to a supply through feedback alone are no keeper."""


def kept(families: Sequence[Family]) -> Family:
    """Return the kind of those networks that are of other kinds once their keepers are left out."""

    def family(devices: tuple[Switch, ...], context: Context) -> GateForm | Unrecognised:
        rest, keepers = without_keepers(devices, context)
        if not keepers:
            return Unrecognised("no device of it listens to its own output")
        alone = replace(context, feedback=())
        for other in families:
            form = other(rest, alone)
            if isinstance(form, GateForm):
                return replace(
                    form,
                    drawn=devices,
                    network=with_nets(form.network, devices),
                    kind=f"{form.kind}, kept",
                    weak=(*form.weak, *keepers),
                )
        return Unrecognised("nothing is left of it without its keeper")

    return family


def without_keepers(
    devices: tuple[Switch, ...], context: Context
) -> tuple[tuple[Switch, ...], tuple[Weak, ...]]:
    """Return a drawing with its keepers held off, and the keepers."""
    keepers = _keepers(merge(devices), context)
    holding = {d for keeper in keepers for place in keeper.devices for d in place}
    rest = tuple(
        _held_off(device) if index in holding else device for index, device in enumerate(devices)
    )
    return rest, keepers


def with_nets(network: Network, devices: tuple[Switch, ...]) -> Network:
    """Return a network that knows of the nets that only keepers touch."""
    known = network.node_of_net
    nets = 1 + max(max(d.a, d.gate, d.b) for d in devices)
    return replace(network, node_of_net=(*known, *range(len(known), nets)))


def _held_off(device: Switch) -> Switch:
    return replace(device, gate=LOW if device.polarity == "n" else HIGH)


def _keepers(network: Network, context: Context) -> tuple[Weak, ...]:
    """Return the paths from a net to a supply through devices that listen to that net alone."""
    if len(network.switches) > SWITCHES_MAX:
        return ()
    found = []
    for node in dict.fromkeys(network.node_of_net[end] for _, end in context.feedback):
        listening = {net for net, end in context.feedback if network.node_of_net[end] == node}
        usable = frozenset(
            i for i, s in enumerate(network.switches) if s.gate in listening or s.gate < 0
        )
        for supply in (HIGH, LOW):
            if node not in network.at_node or supply not in network.at_node:
                continue
            paths = list(network.paths(node, supply, usable))
            found += [
                Weak(supply, drawn_path(network, path), is_keeper=True, node=node)
                for path in paths[:_PATHS_MAX]
                if any(network.switches[i].gate in listening for i in path)
            ]
    return tuple(found)
