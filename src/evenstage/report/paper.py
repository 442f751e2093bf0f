"""What a text report is printed on: its width, its characters, and names made fit for both."""

from __future__ import annotations

import re
import unicodedata
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from evenstage.timing.results import Edge

#: Reports are laid out for these widths, in character cells; other wishes are moved to the nearest.
NARROWEST: Final = 80
WIDEST: Final = 160

#: A number and its unit stay on one line; all other blanks may break.
_BREAK: Final = re.compile(r"(?<!\d) |(?<=\d) (?!(?:[afpnumkMG]?[sFm]|%)(?!\w))")

_EDGES: Final[dict[Edge, tuple[str, str]]] = {"rise": ("/", "↑"), "fall": ("\\", "↓")}


@dataclass(frozen=True, slots=True)
class Paper:
    """Width and character set of a text report, and whether notices stand on it.

    Parameters
    ----------
    width : int
        Character cells per line, 80 to 160.
    unicode : bool
        Whether the output can show more than ASCII.
    notices : bool
        Whether the notices are printed too.
    """

    width: int = 100
    unicode: bool = False
    notices: bool = True

    def __post_init__(self) -> None:
        object.__setattr__(self, "width", min(max(self.width, NARROWEST), WIDEST))

    @property
    def gap_mark(self) -> str:
        """What stands for the left-out middle of a long name."""
        return "…" if self.unicode else ".."

    @property
    def times(self) -> str:
        """Multiplied by, or so many of."""
        return "×" if self.unicode else "x"

    def edge(self, edge: Edge) -> str:
        """Return a sign for a rising or a falling edge."""
        return _EDGES[edge][self.unicode]

    def shown(self, text: str) -> str:
        """Return text with everything that cannot be printed replaced, one sign for each.

        Line ends, control characters, bytes that are no UTF-8 and, on ASCII paper, all other
        letters count as unprintable.
        """
        if text.isascii() and text.isprintable():
            return text
        substitute = "\N{REPLACEMENT CHARACTER}" if self.unicode else "?"
        return "".join(sign if self._can_show(sign) else substitute for sign in text)

    def _can_show(self, sign: str) -> bool:
        return sign.isprintable() and (self.unicode or sign.isascii())

    def shorten(self, text: str, room: int) -> str:
        """Return printable text in at most ``room`` cells, its middle left out if need be."""
        text = self.shown(text)
        if cells(text) <= room:
            return text
        left_over = max(room - cells(self.gap_mark), 0)
        tail = _last(text, left_over // 2)
        return _first(text, left_over - cells(tail)) + self.gap_mark[:room] + tail

    def paragraph(self, text: str, *, indent: int = 0, hanging: int | None = None) -> list[str]:
        """Return printable text filled into lines; ``hanging`` indents the lines after the first.

        A word longer than a line is a name: its middle is left out. Runs of blanks count as one.
        """
        hanging = indent if hanging is None else hanging
        room = self.width - max(indent, hanging)
        words = [self.shorten(word, room) for word in _BREAK.split(text) if word.strip()]
        lines = [(" " * indent + "".join(words[:1])).rstrip(" ")]
        for word in words[1:]:
            if cells(lines[-1]) + 1 + cells(word) > self.width:
                lines.append(" " * hanging + word)
            else:
                lines[-1] += f" {word}"
        return lines


#: Where nothing else is asked for.
PLAIN: Final = Paper()


def cells(text: str) -> int:
    """Return how many character cells of a terminal printable text takes.

    Wide East Asian letters take two, combining marks none.
    """
    if text.isascii():
        return len(text)
    return sum(_cells_of(sign) for sign in text)


def _cells_of(sign: str) -> int:
    if unicodedata.category(sign) in {"Mn", "Me"}:
        return 0
    return 2 if unicodedata.east_asian_width(sign) in {"W", "F"} else 1


def _first(text: str, room: int) -> str:
    """Return as many of the first signs as fit."""
    end = len(text)
    while cells(text[:end]) > room:
        end -= 1
    return text[:end]


def _last(text: str, room: int) -> str:
    """Return as many of the last signs as fit."""
    start = 0
    while cells(text[start:]) > room:
        start += 1
    return text[start:]
