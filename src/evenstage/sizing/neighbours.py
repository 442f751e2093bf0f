"""Consecutive arcs whose delays share a size, for the diagonal of the Hessian.

The diagonal of the soft delay's Hessian holds the variance, over paths, of each size's derivative
of the path's length. A size makes the gate it drives faster and the gate before it slower: near the
optimum the two cancel along each path, so that the variance without their product would be far too
large. The pairs are found once.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.problem import totals

if TYPE_CHECKING:
    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.reduced import Reduced
    from evenstage.sizing.softmax import Soft
    from evenstage.sizing.sums import SumsAt


class Neighbours:
    """Pairs of consecutive arcs whose delays share a size: one drives it, one is driven by it."""

    def __init__(self, reduced: Reduced) -> None:
        sums, graph = reduced.sums, reduced.graph
        arcs, n = reduced.arcs, sums.sizes
        driver = sums.row_driver[:arcs].astype(np.int64)
        self.leaving = np.flatnonzero(driver >= 0)
        key = graph.source[self.leaving].astype(np.int64) * n + driver[self.leaving]
        outs, self.out_slot = np.unique(key, return_inverse=True)
        take = sums.take[:arcs]
        row = np.repeat(np.arange(arcs), np.diff(take.indptr))
        form = take.indices < sums.forms
        self.entering, self.multiple = row[form], take.data[form]
        key = graph.target[self.entering].astype(np.int64) * max(sums.forms, 1)
        ins, self.in_slot = np.unique(key + take.indices[form], return_inverse=True)
        in_node, in_form = ins // max(sums.forms, 1), ins % max(sums.forms, 1)
        out_node, out_size = outs // max(n, 1), outs % max(n, 1)
        begin, end = (np.searchsorted(in_node, out_node, side) for side in ("left", "right"))
        count = end - begin
        out = np.repeat(np.arange(len(outs)), count)
        into = np.arange(len(out)) - np.repeat(np.cumsum(count) - count, count)
        into += np.repeat(begin, count)
        part_key = sums.of_part.astype(np.int64) * n + sums.plus
        wanted = in_form[into] * n + out_size[out]
        place = np.minimum(np.searchsorted(part_key, wanted), max(len(part_key) - 1, 0))
        met = part_key[place] == wanted if len(part_key) else np.zeros(len(wanted), bool)
        self.out, self.into, self.part = out[met], into[met], place[met]
        self.size = out_size[self.out]
        self.outs, self.ins, self.sizes = len(outs), len(ins), n

    def cross(self, sums: SumsAt, soft: Soft) -> FloatArray:
        """Return twice the mean over paths of products of such pairs' derivatives, shape (n,)."""
        fall = soft.flow[self.leaving] * sums.falling[self.leaving]
        out = totals(self.out_slot, fall, self.outs)
        rise = totals(self.in_slot, soft.share[self.entering] * self.multiple, self.ins)
        pair = out[self.out] * rise[self.into] * sums.part[self.part]
        return -2.0 * totals(self.size, pair, self.sizes)
