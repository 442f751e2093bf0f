"""Few sizes for the copies of a leaf.

A leaf whose widths stand inside it can have only so many sized copies. Where its callers ask for
more sizes than that, sizes near each other in the logarithm become one: Ward's clustering (Journal
of the American Statistical Association 58, 1963), which keeps the spread inside the clusters
smallest.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Literal

import numpy as np
from scipy.cluster.hierarchy import fcluster, linkage

from evenstage.netlist.rewriting.handles import copy_texts

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from numpy.typing import NDArray

    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.rewriting.families import Family
    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.netlist.rewriting.sized_block import Slot
    from evenstage.sizing.partition import Partition

Text = Literal["copy", "leaf", "kept"]

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
        How many sized copies of a leaf there may be, those of earlier runs included; for 0 all
        calls have one size already.
    """
    label = np.arange(len(parts), dtype=np.int32)
    if not copies:
        return label
    _, first = np.unique(parts.of_slot, return_index=True)
    log_size = np.log(factor[first])
    moving = np.zeros(len(parts), bool)
    moving[parts.of_slot[np.abs(factor - 1) > _AS_DRAWN]] = True
    for leaves in _calls_by_family(parts, handles).values():
        members = [_Member(calls, moving, log_size, text) for text, calls in leaves]
        for member, sizes in zip(members, _sizes_allowed(members, copies), strict=True):
            if sizes < member.sizes:
                member.tie(label, sizes)
    return label


@dataclass(frozen=True)
class _Member:
    """The calls of a leaf, or of a sized copy that an earlier run made of it.

    Parameters
    ----------
    calls : IntArray, shape (calls, 2)
        The sizes of pull-down and pull-up of each, ascending; where a call has one for both, twice
        that.
    moving : array of bool, shape (sizes,)
        Whether each size changes.
    log_size : FloatArray, shape (sizes,)
        By how much, in the logarithm.
    text : {"copy", "leaf", "kept"}
        A sized copy; the leaf itself; or the leaf itself where it has to stay as drawn.
    """

    calls: IntArray
    moving: NDArray[np.bool_]
    log_size: FloatArray
    text: Text

    @cached_property
    def changing(self) -> IntArray:
        """The calls that change, shape (k, 2)."""
        return self.calls[self.moving[self.calls].any(axis=1)]

    @property
    def some_stay(self) -> bool:
        """Whether some calls keep their size."""
        return len(self.changing) < len(self.calls)

    @cached_property
    def sizes(self) -> int:
        """How many sizes its calls ask for."""
        distinct = np.unique(np.rint(self._logs / _EQUAL), axis=0)
        return max(len(distinct) + self.some_stay, 1)

    @property
    def _logs(self) -> FloatArray:
        """Logarithms of what changes, shape (calls that change, 1 or 2)."""
        logs: FloatArray = self.log_size[self.changing]
        return logs if (self.calls[:, 0] != self.calls[:, 1]).any() else logs[:, :1]

    def copies(self, sizes: int) -> int:
        """Return how many copies so many sizes need; a leaf all calls agree on is no copy."""
        if self.text == "copy" or not len(self.changing):
            return sizes if self.text == "copy" else 0
        if sizes == 1:
            return int(self.text == "kept")
        return sizes - self.some_stay

    def tie(self, label: IntArray, sizes: int) -> None:
        """Give the calls so few sizes; of those that stay all change if there is one for all."""
        if sizes == 1:
            label[self.calls] = self.calls[0]
            return
        cluster = fcluster(linkage(self._logs, "ward"), sizes - self.some_stay, "maxclust")
        _, leader, of_call = np.unique(cluster, return_index=True, return_inverse=True)
        label[self.changing] = self.changing[leader[of_call]]


def _sizes_allowed(members: Sequence[_Member], copies: int) -> list[int]:
    """Return how many sizes each member may have, so that the family keeps to its copies.

    The member with most sizes gives way first. Copies that are there already can all stay.
    """
    sizes = [member.sizes for member in members]
    while sum(m.copies(n) for m, n in zip(members, sizes, strict=True)) > copies and max(sizes) > 1:
        sizes[sizes.index(max(sizes))] -= 1
    return sizes


def _calls_by_family(
    parts: Partition, handles: WidthHandles
) -> dict[Family, list[tuple[Text, IntArray]]]:
    """Return the sizes of the calls of each leaf that would have to be copied, ascending.

    A leaf and its copies stand together, each with what its text may become; so do the calls of
    one that cannot share a copy whatever their sizes.
    """
    block = handles.block
    texts = copy_texts(block, handles.values())
    leaves = Counter(text.leaf for text in texts)
    families: dict[Family, list[tuple[Text, IntArray]]] = {}
    for (leaf, drawn), slots in texts.items():
        family = block.family(leaf)
        stays = drawn or leaves[leaf] > 1 or block.is_called_elsewhere(leaf)
        text: Text = "copy" if leaf != family.root else "kept" if stays else "leaf"
        families.setdefault(family, []).append((text, _pairs(parts, slots)))
    for family in families:
        idle = [c for c in family.copies if not leaves[c] and block.is_called_for_size(c)]
        families[family] += [("copy", np.zeros((0, 2), np.int64))] * len(idle)
    return families


def _pairs(parts: Partition, slots: Iterable[Slot]) -> IntArray:
    """Return the sizes of pull-down and pull-up of the calls that some slots belong to.

    Shape (calls, 2), ascending, each pair once; a side of which no slot is one goes with the other.
    """
    apart = parts.of_gate[:, 0] != parts.of_gate[:, 1]
    has_sides = np.zeros(len(parts), bool)
    has_sides[parts.of_gate[apart]] = True
    found: dict[int | None, list[int]] = {}
    for slot in slots:
        size = parts.variable_of[slot]
        pair = found.setdefault(slot.caller, [size, size])
        if has_sides[size]:
            pair[int(parts.side[size])] = size
    return np.unique(np.array(list(found.values())), axis=0)
