"""The bytes of one input file and places in it.

Position means byte offset everywhere in the program. Line and column, counted in characters, are
worked out only when a message is printed.
"""

from __future__ import annotations

import re
from bisect import bisect_right
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from pathlib import Path

_LINE_END = re.compile(rb"\r\n|\n|\r")


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
    def _line_starts(self) -> list[int]:
        """Offsets at which lines begin; a line ends at LF, CR LF or a lone CR."""
        return [0, *(match.end() for match in _LINE_END.finditer(self.data))]

    def line_number(self, offset: int) -> int:
        """Return the 1-based line that holds a byte offset."""
        return bisect_right(self._line_starts, offset)

    def column(self, offset: int) -> int:
        """Return the 1-based column of a byte offset, in characters."""
        start = self._line_starts[self.line_number(offset) - 1]
        return len(self.data[start:offset].decode("utf-8", "surrogateescape")) + 1

    def line(self, number: int) -> str:
        """Return the text of a 1-based line without its line end."""
        start = self._line_starts[number - 1]
        following = self._line_starts[number : number + 1]
        end = following[0] if following else len(self.data)
        return self.data[start:end].rstrip(b"\r\n").decode("utf-8", "surrogateescape")


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
