"""Nets that an edge on a path takes along: those that inverters and buffers make of its nets.

Both controls of a transmission gate move where the path comes by one of them; held where it was,
the other would leave half of the gate as it is.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.simulation.logic import moving

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.simulation.groups import Groups

Edge = tuple[bool, bool]
"""What a net is worth before and after."""


def followers(
    groups: Groups, along: Sequence[int], edges: Mapping[int, Edge]
) -> tuple[dict[int, Edge], tuple[int, ...]]:
    """Return the nets beside a path that move with it and decide what it does, and their groups.

    Parameters
    ----------
    groups : Groups
    along : sequence of int
        The groups along the path.
    edges : mapping
        Of the nets on the path.
    """
    found: dict[int, Edge] = {}
    makers: dict[int, None] = {}
    for group in dict.fromkeys(along):
        known = {net: edge for net, edge in edges.items() if groups.of_net[net] != group}
        for net in groups.inputs(group):
            _follow(groups, net, known, found, makers)
    return found, tuple(makers)


def _follow(
    groups: Groups,
    net: int,
    edges: Mapping[int, Edge],
    found: dict[int, Edge],
    makers: dict[int, None],
) -> None:
    """Add a net that a chain of inverters and buffers makes of one with an edge, chain and all."""
    chain: list[int] = []
    at = net
    while at not in edges and at not in found:
        maker = int(groups.of_net[at])
        causes = groups.inputs(maker) if maker >= 0 and len(groups.devices(maker)) else []
        if len(causes) != 1 or causes[0] in (at, *chain):
            return
        chain.append(at)
        at = causes[0]
    for one in reversed(chain):
        before, after = _made(groups, one, at, edges.get(at) or found[at])
        if before == after:
            return
        found[one] = (before, after)
        makers.setdefault(int(groups.of_net[one]))
        at = one


def _made(groups: Groups, net: int, cause: int, edge: Edge) -> Edge:
    """Return what a group with one input makes of an edge; where it floats, nothing."""
    part = groups.part(int(groups.of_net[net]))
    node = part.node(net)
    before, after = part.evaluate(moving({cause: edge})).values[node, :, 0].tolist()
    return before == 1, after == 1
