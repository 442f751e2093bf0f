"""The text of a netlist with one card per line, byte for byte at its old place.

Reading a card is fastest where it is one line in lower case with nothing but blanks between its
words. This module makes such a text without moving anything: letters become lower case, line ends
become line feeds, and comments, remarks and the joints of continuation lines become blanks. What is
a comment, a remark or a continuation is said by section 6 of the grammar; the tests hold the two
against each other on generated texts.
"""

from __future__ import annotations

import re
from functools import cache

import numpy as np
from numpy.typing import NDArray

from evenstage.netlist.grammar import ENCODING, terminal

Bytes = NDArray[np.uint8]
Indices = NDArray[np.intp]
Mask = NDArray[np.bool_]

BOM = b"\xef\xbb\xbf"
_BLANK, _NEWLINE, _PLUS, _STAR, _DOT, _SLASH = (ord(c) for c in " \n+*./")
_BLANKS = np.zeros(256, np.bool_)
_BLANKS[[b for b in range(33) if b not in {10, 13}]] = True
_PADDING = b"\n\n\n"


def _among(characters: str) -> Mask:
    table = np.zeros(256, np.bool_)
    table[[ord(c) for c in characters]] = True
    return table


_REMARKS = _among("$;")
_LETTERS = _among("abcdefghijklmnopqrstuvwxyz")


def canonical(raw: bytes, start: int = 0) -> bytes:
    """Return a text of the same length with one card per line.

    Parameters
    ----------
    raw : bytes
        The file.
    start : int
        Where its first card may begin; what stands before (a title) becomes blank.
    """
    text = bytearray(raw.lower().replace(b"\r", b"\n") + _PADDING)
    if raw.startswith(BOM):
        start = max(start, len(BOM))
    text[:start] = b" " * start
    view = np.frombuffer(text, np.uint8)
    lines = _Lines(view, len(raw))
    lines.blank_comments()
    lines.join_continuations()
    lines.blank_remarks()
    del lines, view
    return bytes(text[: len(raw)])


class _Lines:
    """The lines of a text, which its methods change in place.

    Parameters
    ----------
    view : Bytes
        The text with padding, writable.
    size : int
        Its length without padding.
    """

    def __init__(self, view: Bytes, size: int) -> None:
        self.view = view
        ends = np.flatnonzero(view[:size] == _NEWLINE)
        self.starts: Indices = np.concatenate([np.zeros(1, np.intp), ends + 1])
        self.ends: Indices = np.append(ends, size)
        self.first = self._first_marks()
        mark = view[self.first]
        self.plus: Mask = mark == _PLUS
        directive = (
            (mark == _STAR) & (view[self.first + 1] == _DOT) & _LETTERS[view[self.first + 2]]
        )
        slashes = (mark == _SLASH) & (view[self.first + 1] == _SLASH)
        self.comment: Mask = (mark == _STAR) | _REMARKS[mark] | slashes
        anchor = directive | ~(self.comment | self.plus | (mark == _NEWLINE))
        number = np.arange(len(mark))
        # The card or directive each line belongs to; -1 before the first.
        self.owner: Indices = np.maximum.accumulate(np.where(anchor, number, -1))
        of_directive = self.plus & (self.owner >= 0) & directive[self.owner]
        self.comment |= of_directive
        self.joined: Indices = np.flatnonzero(self.plus & (self.owner >= 0) & ~of_directive)
        # The last line of the card that begins on each line.
        self.last: Indices = number.copy()
        self.last[self.owner[self.joined]] = self.joined

    def _first_marks(self) -> Indices:
        """Return the place of the first byte of each line that is not blank."""
        first = self.starts.copy()
        indented = np.flatnonzero(_BLANKS[self.view[first]])
        while len(indented):
            first[indented] += 1
            indented = indented[_BLANKS[self.view[first[indented]]]]
        return first

    def blank_comments(self) -> None:
        """Blank comment lines, and the lines a directive is continued on."""
        if self.comment.any():
            self._blank(self.first[self.comment], self.ends[self.comment])

    def _blank(self, starts: Indices, ends: Indices) -> None:
        """Blank some ranges."""
        lengths = ends - starts
        before = np.cumsum(lengths) - lengths
        self.view[np.repeat(starts - before, lengths) + np.arange(lengths.sum())] = _BLANK

    def join_continuations(self) -> None:
        """Blank each ``+`` that continues a card and the line ends up to it."""
        if len(self.joined) == 0:
            return
        self.view[self.first[self.joined]] = _BLANK
        inside = np.flatnonzero(
            (self.owner >= 0) & (self.last[self.owner] > np.arange(len(self.last)))
        )
        self.view[self.ends[inside]] = _BLANK

    def blank_remarks(self) -> None:
        """Blank each remark from its sign to the end of its line."""
        places = np.union1d(self._places("$;"), self._double_slashes())
        before = self.view[places - 1]
        places = places[(places == 0) | (before <= _BLANK)]
        if len(places) == 0:
            return
        line = np.searchsorted(self.starts, places, "right") - 1
        owner = np.where(self.owner[line] < 0, line, self.owner[line])
        quoted = self._cards_with_quotes()[owner]
        for card in np.unique(owner[quoted]).tolist():
            self._strip_card(card)
        line, first = np.unique(line[~quoted], return_index=True)
        self._blank(places[~quoted][first], self.ends[line])

    def _places(self, signs: str) -> Indices:
        """Return where some signs stand (comparing is ten times as fast as a table)."""
        found = self.view == ord(signs[0])
        for sign in signs[1:]:
            found |= self.view == ord(sign)
        return np.flatnonzero(found)

    def _double_slashes(self) -> Indices:
        """Return where two slashes stand together."""
        places = self._places("/")
        double: Indices = places[self.view[places + 1] == _SLASH]
        return double

    def _cards_with_quotes(self) -> Mask:
        """Tell for each line whether the card that begins there holds a quote."""
        found = np.zeros(len(self.starts), np.bool_)
        line = np.searchsorted(self.starts, self._places("'\"{"), "right") - 1
        found[np.where(self.owner[line] < 0, line, self.owner[line])] = True
        return found

    def _strip_card(self, card: int) -> None:
        """Blank the remarks of one card that also holds quotes."""
        start, end = int(self.starts[card]), int(self.ends[self.last[card]])
        base = max(start - 1, 0)
        text = self.view[base:end].tobytes()
        at = start - base
        while match := _quoted_or_remark().search(text, at):
            at = match.end()
            if match.lastgroup == "remark":
                place = match.start() + base
                stop = int(self.ends[np.searchsorted(self.starts, place, "right") - 1])
                self.view[place:stop] = _BLANK
                at = stop - base


@cache
def _quoted_or_remark() -> re.Pattern[bytes]:
    quoted = "|".join(terminal(name) for name in ("QUOTED", "STRING", "BRACED"))
    return re.compile(rf"{quoted}|(?P<remark>(?<![^\x00-\x20])(?:[$;]|//))".encode(ENCODING))
