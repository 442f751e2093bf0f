"""The distinct rows of a table of small integers."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from evenstage.netlist.devices import IntArray


def distinct_rows(table: NDArray[np.integer] | NDArray[np.bool_]) -> tuple[IntArray, IntArray]:
    """Return the distinct rows of a table in lexicographic order, and which of them each row is.

    The same as `numpy.unique` along the first axis. Rows are sorted by a number mixed from their
    entries instead of as a whole; should two rows have one number, as a whole after all.

    Parameters
    ----------
    table : array, shape (rows, columns)

    Returns
    -------
    kinds : IntArray, shape (kinds, columns)
    inverse : IntArray, shape (rows,)
    """
    mixed = np.zeros(len(table), np.uint64)
    for column in range(table.shape[1]):
        # The 64-bit step of Knuth's multiplicative hashing (TAOCP 3, section 6.4).
        mixed = (mixed + table[:, column].astype(np.int64).view(np.uint64) + np.uint64(1)) * (
            np.uint64(0x9E3779B97F4A7C15)
        )
        mixed ^= mixed >> np.uint64(29)
    order = np.argsort(mixed, kind="stable")
    starts = np.flatnonzero(np.diff(mixed[order], prepend=~mixed[order[:1]]))
    number = np.cumsum(np.bincount(starts, minlength=len(order))) - 1
    inverse = np.empty(len(order), np.int64)
    inverse[order] = number
    kinds = table[order[starts]].astype(np.int64)
    if not (kinds[inverse] == table).all():
        kinds, inverse = np.unique(table.astype(np.int64), axis=0, return_inverse=True)
        return kinds, inverse
    ranked = np.lexsort(kinds.T[::-1]) if table.shape[1] else np.arange(len(kinds))
    rank = np.empty(len(ranked), np.int64)
    rank[ranked] = np.arange(len(ranked))
    return kinds[ranked], rank[inverse]
