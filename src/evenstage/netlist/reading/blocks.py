"""The canonical text of a file, some thousand cards at a time.

No file is held twice: a block is made when it is read, and again when somebody asks for one of its
cards. Blocks begin where cards begin, so that none of them needs another to be understood.
"""

from __future__ import annotations

import re
from bisect import bisect_right
from collections import OrderedDict
from functools import cached_property
from typing import TYPE_CHECKING, Final, NamedTuple

from evenstage.netlist.reading.canonical import canonical

if TYPE_CHECKING:
    from evenstage.source import SourceText

#: Bytes of a block: large enough for array work to pay, small enough for the processor's cache.
_SIZE: Final = 1 << 16
_KEPT: Final = 16
#: Before a line that is neither comment nor continuation.
_CUT = re.compile(rb"[\r\n][\x00-\x09\x0b\x0c\x0e-\x20]*+(?=[A-Za-z.])")


class Block(NamedTuple):
    """Canonical text of the bytes from ``start`` on."""

    start: int
    text: bytes


class Blocks:
    """The canonical text of one file.

    Parameters
    ----------
    source : SourceText
        The file.
    """

    def __init__(self, source: SourceText) -> None:
        self.source = source
        self._starts: list[int] = []
        self._ends: list[int] = []
        self._recent: OrderedDict[int, Block] = OrderedDict()

    def at(self, position: int) -> Block:
        """Return the block that holds a position.

        Where none does yet, one is cut that begins with the position's line.
        """
        index = bisect_right(self._starts, position) - 1
        if index < 0 or position >= self._ends[index]:
            index = self._cut(position)
        start, end = self._starts[index], self._ends[index]
        block = self._recent.get(start)
        if block is None:
            block = self._recent[start] = Block(start, canonical(self.source.data[start:end]))
            if len(self._recent) > _KEPT:
                self._recent.popitem(last=False)
        return block

    def _cut(self, position: int) -> int:
        """Add a block; return its index."""
        data = self.source.data
        index = bisect_right(self._starts, position)
        floor = self._ends[index - 1] if index else 0
        line = max(data.rfind(b"\n", floor, position), data.rfind(b"\r", floor, position)) + 1
        start = position if line == 0 else line
        cut = _CUT.search(data, position + _SIZE)
        end = len(data) if cut is None else cut.end()
        if index < len(self._starts):
            end = min(end, self._starts[index])
        self._starts.insert(index, start)
        self._ends.insert(index, end)
        return index

    @cached_property
    def whole(self) -> bytes:
        """The canonical text of all of it, for files whose sections must be found first."""
        return canonical(self.source.data)
