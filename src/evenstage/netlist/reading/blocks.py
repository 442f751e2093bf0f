"""The canonical text of a file, some thousand cards at a time.

No file is held twice: a block is made when it is read, and again when somebody asks for one of its
cards. Blocks begin where cards begin, so that none of them needs another to be understood. They end
where cards do, or where nothing but blank lines and comments follows for very long; these then
belong to no block.
"""

from __future__ import annotations

import re
from bisect import bisect_right
from collections import OrderedDict
from functools import cached_property
from typing import Final, NamedTuple

from evenstage.errors import NetlistError
from evenstage.netlist.reading.canonical import canonical
from evenstage.source import SourceText, Span

#: Bytes of a block: large enough for array work to pay, small enough for the processor's cache.
_SIZE: Final = 1 << 17
_KEPT: Final = 8
#: Bytes of a card; a longer one is no card of a design, and reading it would fill the memory.
_LONGEST: Final = 1 << 20
_B: Final = rb"[\x00-\x09\x0b\x0c\x0e-\x20]*+"
_COMMENT: Final = rb"(?:\*(?!\.[a-zA-Z])|[$;]|//)"
#: Before a line that is neither comment nor continuation.
_CUT = re.compile(rb"[\r\n]" + _B + rb"(?=[A-Za-z.])")
#: The last line end that has a blank line or a comment behind it.
_LAST_PAUSE = re.compile(rb"[\x00-\xff]*[\r\n](?=" + _B + rb"(?:[\r\n]|\Z|" + _COMMENT + rb"))")
#: The last line of a card.
_LAST_CARD = re.compile(rb"(?:[\x00-\xff]*[\r\n])?" + _B + rb"(?=[A-Za-z.])")
_REMARK: Final = _B + _COMMENT + rb"[^\r\n]*+"
#: Blank lines and comments.
_IDLE = re.compile(rb"(?:(?:" + _REMARK + rb"|" + _B + rb")[\r\n])*+(?:" + _REMARK + rb"\Z)?+")
_LINE_END = re.compile(rb"[\r\n]")
_BLANKS: Final = bytes(range(33)) + b","


class Block(NamedTuple):
    """Canonical text of the bytes from ``start`` on; up to ``end`` only blanks would follow."""

    start: int
    text: bytes
    end: int


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
        """Return the block that holds a position, or the next one where none does.

        Where there is none yet, one is cut that begins with the position's line, or behind the
        blank lines and comments there.

        Raises
        ------
        NetlistError
            If a card in it is too long.
        """
        index = bisect_right(self._starts, position) - 1
        if index < 0 or position >= self._ends[index]:
            index = self._cut(position)
        start, end = self._starts[index], self._ends[index]
        block = self._recent.get(start)
        if block is None:
            most = min(end, start + _SIZE + _LONGEST)
            block = Block(start, canonical(self.source.data[start:most]), end)
            self._check_lengths(block)
            self._recent[start] = block
            if len(self._recent) > _KEPT:
                self._recent.popitem(last=False)
        return block

    def _cut(self, position: int) -> int:
        """Add a block; return its index."""
        data = self.source.data
        index = bisect_right(self._starts, position)
        floor = self._ends[index - 1] if index else 0
        feed = data.rfind(b"\n", floor, position)
        line = max(feed, data.rfind(b"\r", max(feed, floor), position)) + 1
        start = self._behind_idle_lines(position if line == 0 else line)
        if index < len(self._starts) and start >= self._starts[index]:
            return index
        end = self._end(start)
        if index < len(self._starts):
            end = min(end, self._starts[index])
        self._starts.insert(index, start)
        self._ends.insert(index, end)
        return index

    def _behind_idle_lines(self, start: int) -> int:
        idle = _IDLE.match(self.source.data, start)
        assert idle is not None
        return idle.end()

    def _end(self, start: int) -> int:
        """Return where a block ends that begins at some place."""
        data = self.source.data
        least = start + _SIZE
        most = least + _LONGEST
        cut = _CUT.search(data, least, most)
        if cut is not None:
            return cut.end()
        if most >= len(data):
            return len(data)
        pause = _LAST_PAUSE.match(data, least, most)
        end = self._behind_remark(start, most) if pause is None else pause.end()
        following = 0 if end is None else self._behind_idle_lines(end)
        if end is None or data[following : following + 1] == b"+":
            card = _LAST_CARD.match(data, start, least)
            raise self._too_long(start if card is None else card.end())
        return end

    def _behind_remark(self, start: int, most: int) -> int | None:
        """Return where the line of a place ends, if nothing but a remark goes on there."""
        tail = canonical(self.source.data[start:most])[_SIZE:]
        line_end = _LINE_END.search(self.source.data, most)
        if tail.strip(_BLANKS):
            return None
        return len(self.source.data) if line_end is None else line_end.end()

    def _check_lengths(self, block: Block) -> None:
        if len(block.text) <= _LONGEST:
            return
        start = block.start
        for line in block.text.split(b"\n"):
            if len(line.strip(_BLANKS)) > _LONGEST:
                raise self._too_long(start + len(line) - len(line.lstrip(_BLANKS)))
            start += len(line) + 1

    def _too_long(self, start: int) -> NetlistError:
        message = f"this card is longer than {_LONGEST} bytes"
        span = Span(self.source, start, start + 1)
        return NetlistError(message, code="too-large", span=span)

    @cached_property
    def whole(self) -> bytes:
        """The canonical text of all of it, for files whose sections must be found first."""
        pieces: list[bytes] = []
        done = 0
        while done < len(self.source.data):
            start, text, end = self.at(done)
            pieces += (b" " * (start - done), text, b" " * (end - start - len(text)))
            done = end
        return b"".join(pieces)
