"""The bytes of one input file and places in it.

Position means byte offset everywhere in the program. Line and column, counted in characters, are
worked out only when a message is printed.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from pathlib import Path

_LINE_END = re.compile(rb"[\r\n]")
#: Bytes between places where the lines before are known.
_PART: Final = 1 << 16
#: Bytes behind an offset up to which its line is given.
_SHOWN: Final = 1 << 16


@dataclass(frozen=True)
class SourceText:
    """One input file, every byte of it.

    Parameters
    ----------
    path : Path
        Where the file is; resolved, so that one file has one path.
    data : bytes
        Its contents, untouched.
    label : str
        The name shown in messages, as the user wrote it.
    """

    path: Path
    data: bytes = field(repr=False)
    label: str

    @cached_property
    def _counts(self) -> list[int]:
        """How many lines end before each part of the file, as far as anybody has asked.

        A list of all lines would outgrow the file.
        """
        return [0]

    def _ends_before(self, part: int) -> int:
        """Return how many lines end before a part."""
        counts = self._counts
        for known in range(len(counts) - 1, part):
            counts.append(counts[known] + self._ends_between(known * _PART, (known + 1) * _PART))
        return counts[part]

    def _ends_between(self, start: int, stop: int) -> int:
        """Return how many lines end in a range; a line ends at LF, CR LF or a lone CR."""
        count = self.data.count
        stop = min(stop, len(self.data))
        return (
            count(b"\n", start, stop) + count(b"\r", start, stop) - count(b"\r\n", start, stop + 1)
        )

    def line_number(self, offset: int) -> int:
        """Return the 1-based line that holds a byte offset."""
        part = offset // _PART
        return 1 + self._ends_before(part) + self._ends_between(part * _PART, offset)

    def _line_start(self, offset: int) -> int:
        """Return where the line of an offset begins."""
        if self.data[offset - 1 : offset + 1] == b"\r\n" and offset:
            offset -= 1
        feed = self.data.rfind(b"\n", 0, offset)
        return max(feed, self.data.rfind(b"\r", feed + 1, offset)) + 1

    def column(self, offset: int) -> int:
        """Return the 1-based column of a byte offset, in characters."""
        start = self._line_start(offset)
        return len(self.data[start:offset].decode("utf-8", "surrogateescape")) + 1

    def line(self, offset: int) -> str:
        """Return the text of the line of a byte offset, without its line end.

        Far behind the offset it is cut: messages show less, and a line may be the whole file.
        """
        start, most = self._line_start(offset), min(len(self.data), offset + _SHOWN)
        end = _LINE_END.search(self.data, start, most)
        text = self.data[start : most if end is None else end.start()]
        return text.decode("utf-8", "surrogateescape")


@dataclass(frozen=True, slots=True)
class Span:
    """A range of bytes ``[start, end)`` of one source."""

    source: SourceText
    start: int
    end: int

    @property
    def place(self) -> str:
        """The place as ``file:line:column``."""
        line = self.source.line_number(self.start)
        return f"{self.source.label}:{line}:{self.source.column(self.start)}"

    @property
    def text(self) -> str:
        """The bytes as text; bytes that are not UTF-8 survive as surrogates."""
        return self.source.data[self.start : self.end].decode("utf-8", "surrogateescape")
