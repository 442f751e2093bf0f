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
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.handles import WidthHandles
    from evenstage.sizing.partition import Partition

_EQUAL = 1e-4
"""Sizes closer than this in the logarithm count as one."""
_AS_DRAWN = 1e-9
"""Relative change of a width below which it does not change."""


def shared_sizes(
    parts: Partition, handles: WidthHandles, factor: FloatArray, copies: int
) -> IntArray:
    """Return a label per size; sizes of one label must become one, shape (sizes,).

    Parameters
    ----------
    parts : Partition
    handles : WidthHandles
    factor : FloatArray, shape (slots,)
        Widths relative to today; what does not change calls the leaf as it is.
    copies : int
        How many sized copies of a leaf there may be; for 0 all calls have one size already.
    """
    label = np.arange(len(parts), dtype=np.int32)
    if not copies:
        return label
    _, first = np.unique(parts.of_slot, return_index=True)
    log_size = np.log(factor[first])
    moving = np.zeros(len(parts), bool)
    moving[parts.of_slot[np.abs(factor - 1) > _AS_DRAWN]] = True
    for members in _calls_by_leaf(parts, handles).values():
        changing = members[moving[members]]
        logs = log_size[changing]
        if len(np.unique(np.rint(logs / _EQUAL))) <= copies:
            continue
        cluster = fcluster(linkage(logs[:, None], "ward"), copies, "maxclust")
        _, leader, of_call = np.unique(cluster, return_index=True, return_inverse=True)
        label[changing] = changing[leader[of_call]]
    return label


def _calls_by_leaf(parts: Partition, handles: WidthHandles) -> dict[str, IntArray]:
    """Return the sizes of the calls of each leaf that would have to be copied, ascending."""
    found: dict[str, set[int]] = {}
    for slot, size in parts.variable_of.items():
        if slot.caller is None:
            continue
        if any(origin.way in {"leaf", "detached"} for origin in handles[slot].origins):
            scope = handles.block.netlist.card(slot.card).scope
            found.setdefault(scope, set()).add(size)
    return {leaf: np.array(sorted(members)) for leaf, members in found.items()}
