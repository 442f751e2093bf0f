"""Consecutive arcs whose delays share a size, for the diagonal of the Hessian.

The diagonal of the soft delay's Hessian holds the variance, over paths, of each size's derivative
of the path's length. A size makes the gate it drives faster and the gate before it slower: near the
optimum the two cancel along each path, so that the variance without their product would be far too
large. The pairs are found once.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.arcs import ranges
from evenstage.sizing.problem import totals

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.sizing.problem import FloatArray, IntArray
    from evenstage.sizing.reduced import Reduced
    from evenstage.sizing.softmax import Soft
    from evenstage.sizing.sums import SumsAt


class Neighbours:
    """Pairs of consecutive arcs whose delays share a size: one drives it, one is driven by it.

    Arcs that leave a node through the same driver share a slot, and so do arcs that enter it with
    the same form; pairs are of slots. What has no pair has the last slot.
    """

    def __init__(self, reduced: Reduced) -> None:
        sums, graph = reduced.sums, reduced.graph
        arcs, n, forms = reduced.arcs, sums.sizes, max(sums.forms, 1)
        driver = sums.row_driver[:arcs]
        outs, self.out_slot = _slots(graph.source, driver, driver >= 0, n)
        entries = int(sums.take.indptr[arcs])
        form = sums.take.indices[:entries]
        target = graph.target[sums.entry_row[:entries]]
        ins, self.in_slot = _slots(target, form, form < sums.forms, forms)
        in_node, in_form = ins // forms, ins % forms
        out_node, out_size = outs // max(n, 1), outs % max(n, 1)
        begin, end = (np.searchsorted(in_node, out_node, side) for side in ("left", "right"))
        out = np.repeat(np.arange(len(outs)), end - begin)
        into = ranges(begin, end - begin)
        part_key = sums.of_part.astype(np.int64) * n + sums.plus
        wanted = in_form[into] * n + out_size[out]
        place = np.minimum(np.searchsorted(part_key, wanted), max(len(part_key) - 1, 0))
        met = part_key[place] == wanted if len(part_key) else np.zeros(len(wanted), bool)
        self.out, self.into, self.part = (some[met].astype(np.int32) for some in (out, into, place))
        self.outs, self.ins = len(outs), len(ins)

    def cross(self, sums: SumsAt, soft: Soft, falling: FloatArray) -> FloatArray:
        """Return twice the mean over paths of products of such pairs' derivatives, shape (n,).

        Parameters
        ----------
        sums, soft : SumsAt and Soft
        falling : FloatArray, shape (rows,)
            See :meth:`evenstage.sizing.sums.SumsAt.falling`.
        """
        held, entries = sums.sums, len(self.in_slot)
        fall = soft.flow * falling[: len(self.out_slot)]
        out = totals(self.out_slot, fall, self.outs + 1)
        rise = soft.share[held.entry_row[:entries]] * held.take.data[:entries]
        into = totals(self.in_slot, rise, self.ins + 1)
        pair = out[self.out] * into[self.into] * sums.part[self.part]
        return -2.0 * totals(held.plus[self.part], pair, held.sizes)


def _slots(
    node: IntArray, second: IntArray, kept: NDArray[np.bool_], base: int
) -> tuple[NDArray[np.int64], IntArray]:
    """Return the distinct keys ``node * base + second``, sorted, and which each kept one has."""
    key = node[kept].astype(np.int64) * base + second[kept]
    order = np.argsort(key, kind="stable").astype(np.int32)
    key = key[order]
    new = np.ones(len(key), bool)
    new[1:] = key[1:] != key[:-1]
    mine = np.empty(len(key), np.int32)
    mine[order] = np.cumsum(new, dtype=np.int32) - 1
    distinct = key[new]
    slot = np.full(len(node), len(distinct), np.int32)
    slot[kept] = mine
    return distinct, slot
