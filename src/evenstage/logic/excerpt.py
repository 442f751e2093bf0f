"""Some groups of a batch as a small block of their own."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.logic.order import Batch
from evenstage.logic.switches import Switches

if TYPE_CHECKING:
    from evenstage.logic.switches import BoolArray
    from evenstage.netlist.devices import IntArray


@dataclass(frozen=True)
class Excerpt:
    """Groups of a batch.

    Parameters
    ----------
    switches : Switches
    batch : Batch
        With nets of the excerpt.
    nets : IntArray
        The net of the whole block that each net of the excerpt is.
    nodes : BoolArray, shape (free nodes of the whole batch,)
        Which are the free nodes of the excerpt, in the same order.
    """

    switches: Switches
    batch: Batch
    nets: IntArray
    nodes: BoolArray


def excerpt(switches: Switches, batch: Batch, chosen: BoolArray) -> Excerpt:
    """Return the whole groups of some free nodes, ``chosen`` of shape (free,)."""
    wanted = np.zeros(int(batch.group.max()) + 1, bool)
    wanted[batch.group[chosen]] = True
    nodes = wanted[batch.group]
    count = np.diff(batch.head, append=len(batch.start))
    edges = np.flatnonzero(np.repeat(nodes, count))
    is_used = np.zeros(len(batch.device), bool)
    is_used[batch.switch[edges]] = True
    device = batch.device[is_used]
    is_node = np.concatenate([nodes, np.zeros(len(batch.nets) - batch.free, bool)])
    is_node[batch.start[edges]] = True
    members = batch.nets[is_node]
    ends = (switches.drain[device], switches.gate[device], switches.source[device])
    nets = np.unique(np.concatenate([members, *ends]))
    drain, gate, source = (np.searchsorted(nets, end) for end in ends)
    part = Batch(
        nets=np.searchsorted(nets, members),
        free=int(nodes.sum()),
        device=np.arange(len(device)),
        switch=(np.cumsum(is_used) - 1)[batch.switch[edges]],
        start=(np.cumsum(is_node) - 1)[batch.start[edges]],
        head=np.cumsum(count[nodes]) - count[nodes],
        loops=batch.loops,
        groups=int(wanted.sum()),
        group=batch.group[nodes],
    )
    own = Switches(
        drain,
        gate,
        source,
        switches.is_n[device],
        switches.resistance[device],
        switches.cap[nets],
        switches.supply[nets],
        [""] * len(nets),
    )
    return Excerpt(own, part, nets, nodes)
