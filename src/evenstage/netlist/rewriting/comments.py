"""The comment above each edited card that says what changed and why."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

from evenstage.netlist.rewriting.edits import Edit
from evenstage.source import Span

if TYPE_CHECKING:
    from evenstage.source import SourceText

MARK: Final = b"* evenstage: "
BYTE_ORDER_MARK: Final = b"\xef\xbb\xbf"
_LINE_END: Final = re.compile(rb"\r\n|\n|\r")
_CONTINUATION: Final = re.compile(rb"[ \t]*\+")
#: A blank line or a comment line, as may stand between a card and its continuation.
_GAP: Final = re.compile(rb"[ \t]*(?:[*$;]|//|[\r\n]|\Z)")
#: What stays above a copy of a leaf as long as there is the copy.
_CALLED_BY: Final = re.compile(rb"[^\r\n]+ -> [^\r\n]*\bcalled by ")
_CONTROL: Final = re.compile(r"[\x00-\x1f\x7f\x85\u2028\u2029]+")


def line_start(data: bytes, offset: int) -> int:
    """Return where the line of an offset begins, after a byte-order mark."""
    if data[offset - 1 : offset + 1] == b"\r\n" and offset:
        offset -= 1
    feed = data.rfind(b"\n", 0, offset)
    start = max(feed, data.rfind(b"\r", feed + 1, offset)) + 1
    return len(BYTE_ORDER_MARK) if start == 0 and data.startswith(BYTE_ORDER_MARK) else start


def line_end(data: bytes, offset: int) -> bytes:
    """Return the line end in use at an offset: of its line, else of the line before, else LF."""
    here = _LINE_END.search(data, offset)
    if here is not None:
        return here.group()
    start = line_start(data, offset)
    return next((end for end in (b"\r\n", b"\n", b"\r") if data[:start].endswith(end)), b"\n")


def card_line(data: bytes, offset: int) -> int:
    """Return where the first line of the card at an offset begins, above its continuations."""
    first = line_start(data, 0)
    start = line_start(data, offset)
    while start > first and _CONTINUATION.match(data, start):
        start = line_start(data, start - 1)
        while start > first and _GAP.match(data, start):
            start = line_start(data, start - 1)
    return start


def comment_above(source: SourceText, offset: int, text: str) -> Edit:
    """Return the edit that puts a comment above a card, in place of an earlier one of ours.

    Parameters
    ----------
    source : SourceText
        The file.
    offset : int
        Anywhere on the card.
    text : str
        What to say; made one line.
    """
    data = source.data
    end = card_line(data, offset)
    start, first = end, line_start(data, 0)
    while start > first and data.startswith(MARK, above := line_start(data, start - 1)):
        if _CALLED_BY.match(data, above, start):
            break
        start = above
    words = _CONTROL.sub(" ", text).encode("utf-8", "surrogateescape")
    return Edit(Span(source, start, end), MARK + words + line_end(data, offset))
