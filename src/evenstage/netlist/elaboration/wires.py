"""Nets that resistors run along: the nodes they fall into, and what hangs on each."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.elaboration.flatten import Indices


#: Ohm; more is as good as open, and its squares would leave the range of floats.
_MOST: Final = 1e15


@dataclass(frozen=True)
class Nodes:
    """Nodes of the nets that have resistance.

    Parameters
    ----------
    of_layout : IntArray, shape (layout nets,)
        Node of each net of the layout; -1 for nets without resistance.
    ends : IntArray, shape (2, resistors)
        The nodes each resistor joins; those that join a node to itself are left out.
    resistance : FloatArray, ohm, shape (resistors,)
    net : IntArray, shape (nodes,)
        The final net of each node.
    """

    of_layout: IntArray
    ends: IntArray
    resistance: FloatArray
    net: IntArray


def find_nodes(pairs: Indices, resistance: FloatArray, net: Indices) -> Nodes:
    """Give the nodes of nets that resistors run along their numbers.

    Resistors without a positive value join their ends to one node.

    Parameters
    ----------
    pairs : Indices, shape (2, resistors)
        Nets of the layout at the ends of each.
    resistance : FloatArray, ohm, shape (resistors,)
    net : Indices, shape (layout nets,)
        Final net of each net of the layout.
    """
    members, places = np.unique(pairs, return_inverse=True)
    places = places.reshape(pairs.shape)
    positive = resistance > 0
    size = (len(members),) * 2
    short = places[:, ~positive]
    links = coo_array((np.ones(short.shape[1], np.int8), tuple(short)), shape=size)
    _, group = connected_components(links, directed=False)
    ends = group[places]
    kept = positive & (ends[0] != ends[1])
    used, numbered = np.unique(ends[:, kept], return_inverse=True)
    number = np.full(int(group.max(initial=-1)) + 1, -1, np.int32)
    number[used] = np.arange(len(used))
    of_layout = np.full(len(net), -1, np.int32)
    of_layout[members] = number[group]
    node = of_layout[members]
    net_of_node = np.zeros(len(used), np.int32)
    net_of_node[node[node >= 0]] = net[members[node >= 0]]
    return Nodes(
        of_layout=of_layout,
        ends=numbered.reshape(2, -1).astype(np.int32),
        resistance=np.minimum(resistance[kept], _MOST),
        net=net_of_node,
    )
