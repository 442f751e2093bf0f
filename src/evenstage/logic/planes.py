"""Values of nets as bits: 64 input vectors in one word, ones and zeros apart."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from evenstage.logic.switches import UNKNOWN

if TYPE_CHECKING:
    from evenstage.logic.switches import BoolArray, Values

Words = NDArray[np.uint64]
"""Bits of vectors, 64 in a word; the last axis is that of the words."""

WIDE: Final = 64


def bits(table: BoolArray) -> Words:
    """Return a table, shape (..., vectors), as words, shape (..., words); spare bits are 0."""
    octets = np.packbits(table, axis=-1, bitorder="little")
    spare = -octets.shape[-1] % 8
    widened = np.pad(octets, [(0, 0)] * (table.ndim - 1) + [(0, spare)])
    return widened.view(np.uint64)


def table(words: Words, vectors: int) -> BoolArray:
    """Return words as a table, shape (..., vectors)."""
    octets = np.ascontiguousarray(words).view(np.uint8)
    return np.unpackbits(octets, axis=-1, count=vectors, bitorder="little").view(np.bool_)


class Planes:
    """What every net is worth: where it is 1, and where it is 0; elsewhere it is unknown.

    Parameters
    ----------
    one, zero : Words, shape (nets, words)
    """

    def __init__(self, one: Words, zero: Words) -> None:
        self.one, self.zero = one, zero

    @classmethod
    def of(cls, values: Values) -> Planes:
        """Return values, shape (nets, vectors), as planes."""
        return cls(bits(values == 1), bits(values == 0))

    def put(self, nets: NDArray[np.integer] | int, values: Values) -> None:
        """Give some nets values, shape (..., vectors)."""
        self.one[nets], self.zero[nets] = bits(values == 1), bits(values == 0)

    def values(self, vectors: int, nets: NDArray[np.integer] | slice = slice(None)) -> Values:
        """Return the values of some nets, shape (nets, vectors)."""
        one, zero = (table(plane[nets], vectors).view(np.int8) for plane in (self.one, self.zero))
        # 1, 0 and -1 without a choice for each.
        found: Values = 2 * one + zero + np.int8(UNKNOWN)
        return found
