"""Few sizes for the copies of a leaf.

A leaf whose widths stand inside it can have only so many sized copies. Where its callers ask for
more sizes than that, sizes near each other in the logarithm become one: Ward's clustering (Journal
of the American Statistical Association 58, 1963), which keeps the spread inside the clusters
smallest.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from scipy.cluster.hierarchy import fcluster, linkage

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.handles import WidthHandles
    from evenstage.sizing.partition import Partition

_EQUAL = 1e-4
"""Sizes closer than this in the logarithm count as one."""


def shared_sizes(
    parts: Partition,
    handles: WidthHandles,
    sizes: FloatArray,
    moving: BoolArray,
    copies: int,
) -> IntArray:
    """Return a label per size; sizes of one label must become one, shape (sizes,).

    Parameters
    ----------
    parts : Partition
    handles : WidthHandles
    sizes : FloatArray, shape (sizes,)
        Relative to today.
    moving : BoolArray, shape (sizes,)
        Which sizes change at all; the others call the leaf as it is.
    copies : int
        How many sized copies of a leaf there may be.
    """
    label = np.arange(len(parts))
    for members in _calls_by_leaf(parts, handles).values():
        changing = np.array([size for size in members if moving[size]], np.int64)
        logs = np.log(sizes[changing])
        if len(changing) <= 1 or len(np.unique(np.rint(logs / _EQUAL))) <= copies:
            continue
        cluster = fcluster(linkage(logs[:, None], "ward"), copies, "maxclust")
        for one in np.unique(cluster):
            label[changing[cluster == one]] = changing[cluster == one].min()
    return label.astype(np.int32)


def _calls_by_leaf(parts: Partition, handles: WidthHandles) -> dict[str, list[int]]:
    """Return the sizes of the calls of each leaf that would have to be copied."""
    found: dict[str, dict[int, None]] = {}
    for slot, size in parts.variable_of.items():
        if slot.caller is None:
            continue
        if any(origin.way in {"leaf", "detached"} for origin in handles[slot].origins):
            scope = handles.block.netlist.card(slot.card).scope
            found.setdefault(scope, {})[size] = None
    return {leaf: sorted(members) for leaf, members in found.items()}
