"""Which nets are the same signal but for inverters."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import IntArray


@dataclass(frozen=True)
class Phases:
    """The net each net follows through inverters, itself where there are none; shape (nets,).

    Parameters
    ----------
    root : IntArray
    inverted : BoolArray
        Whether it is the complement of its root.
    """

    root: IntArray
    inverted: BoolArray


def phases(output: IntArray, source: IntArray, nets: int) -> Phases:
    """Follow inverters back to where a signal comes from.

    Nets on a ring of inverters follow nobody.

    Parameters
    ----------
    output, source : IntArray, shape (inverters,)
        Net ids.
    nets : int
    """
    root = np.arange(nets, dtype=np.int32)
    links = coo_array((np.ones(len(output), np.int8), (output, source)), shape=(nets, nets))
    _, part = connected_components(links, directed=True, connection="strong")
    on_ring = (np.bincount(part, minlength=nets) > 1)[part]
    follows = ~on_ring[output] & (output != source)
    root[output[follows]] = source[follows]
    inverted = root != np.arange(nets)
    while True:
        further = root[root]
        if (further == root).all():
            return Phases(root, inverted)
        inverted = inverted ^ inverted[root]
        root = further
