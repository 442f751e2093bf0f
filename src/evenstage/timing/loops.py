"""Cutting loops: which arcs must go so that delays can be added up."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import IntArray


@dataclass(frozen=True, slots=True)
class Cut:
    """Which arcs are cut, shape (arcs,)."""

    cut: BoolArray


def cut_loops(source: IntArray, target: IntArray, starts: IntArray, nets: int) -> Cut:
    """Choose arcs between nodes whose removal leaves no loop.

    Nodes are edges of nets: a loop that rising edges close only through falling ones is none.
    Inside each strongly connected part a depth-first walk runs from the nodes where signals enter
    it, in order of their ids (from the smallest where nothing enters); arcs that close a loop
    of the walk are cut. The order of the cards decides nothing but those ids.

    Parameters
    ----------
    source, target : IntArray, shape (arcs,)
        Node ids.
    starts : IntArray
        Nodes where paths begin.
    nets : int
        Number of nodes.
    """
    links = coo_array((np.ones(len(source), np.int8), (source, target)), shape=(nets, nets))
    _, part = connected_components(links, directed=True, connection="strong")
    size = np.bincount(part, minlength=nets)
    inside = (part[source] == part[target]) & ((size[part[source]] > 1) | (source == target))
    cut = np.zeros(len(source), bool)
    if not inside.any():
        return Cut(cut)
    enters = np.zeros(nets, bool)
    enters[starts] = True
    enters[target[~inside]] = True
    closing = _closing_pairs(source[inside], target[inside], enters)
    cut[inside] = [
        pair in closing
        for pair in zip(source[inside].tolist(), target[inside].tolist(), strict=True)
    ]
    return Cut(cut)


def _closing_pairs(source: IntArray, target: IntArray, enters: BoolArray) -> set[tuple[int, int]]:
    """Return the pairs of nets along which a depth-first walk meets a net it is still inside."""
    followers: dict[int, list[int]] = {}
    pairs = sorted(set(zip(source.tolist(), target.tolist(), strict=True)))
    for a, b in pairs:
        followers.setdefault(a, []).append(b)
    roots = sorted(followers, key=lambda net: (not enters[net], net))
    closing: set[tuple[int, int]] = set()
    done: set[int] = set()
    for root in roots:
        if root in done:
            continue
        inside = {root}
        stack = [(root, iter(followers[root]))]
        while stack:
            net, waiting = stack[-1]
            follower = next(waiting, None)
            if follower is None:
                stack.pop()
                inside.discard(net)
                done.add(net)
            elif follower in inside:
                closing.add((net, follower))
            elif follower not in done:
                inside.add(follower)
                stack.append((follower, iter(followers.get(follower, ()))))
    return closing
