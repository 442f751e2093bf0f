"""Outputs of merged networks, and drawn devices along their paths."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.gate import INPUTS_MAX, SWITCHES_MAX
from evenstage.circuit.network import HIGH, LOW

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.context import Context
    from evenstage.circuit.network import Network


def other_supply(supply: int) -> int:
    """Return the supply that is not this one."""
    return LOW if supply == HIGH else HIGH


def single_output(network: Network, context: Context) -> int | None:
    """Return the one node that can be pulled both ways or is seen outside; None if several.

    None too for a network too large to be looked at.
    """
    if len(network.switches) > SWITCHES_MAX or len(network.inputs) > INPUTS_MAX:
        return None
    nodes = {network.node_of_net[net] for net in context.seen} | set(network.driven_nodes)
    nodes &= set(network.inner_nodes)
    return nodes.pop() if len(nodes) == 1 else None


def shortest(
    network: Network, start: int, supply: int, usable: frozenset[int]
) -> tuple[int, ...] | None:
    """Return the shortest path of usable switches from a node to a supply, if there is one."""
    if supply not in network.at_node or start not in network.at_node:
        return None
    return min(network.paths(start, supply, usable), key=len, default=None)


def drawn_path(network: Network, path: Sequence[int]) -> tuple[tuple[int, ...], ...]:
    """Return for each switch of a path the drawn devices that make it."""
    return tuple(
        tuple(d for d, own in enumerate(network.switch_of_device) if own == switch)
        for switch in path
    )
