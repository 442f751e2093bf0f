"""Parts of a text that count only under a condition: ``.if``, ``.elseif``, ``.else``, ``.endif``.

They are decided once, while the text is read, from the parameters the top level has set before. A
part that does not count is passed over unread.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from evenstage.errors import NetlistError

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.source import Span

_BRANCH: Final = re.compile(
    rb"^[\x00-\x09\x0b-\x20]*(\.(?:if|else?if|else|endif))(?![^\x00-\x20(])", re.MULTILINE
)


@dataclass(slots=True)
class _Open:
    """An ``.if`` whose ``.endif`` has not been met."""

    card: Span
    taken: bool
    is_last: bool = False


class Branches:
    """The conditions that are open while a text is read.

    Parameters
    ----------
    holds : callable
        Tells whether the condition on a card holds.
    """

    def __init__(self, holds: Callable[[Span], bool]) -> None:
        self._holds = holds
        self._open: list[_Open] = []

    @property
    def depth(self) -> int:
        """How many conditions are open."""
        return len(self._open)

    def take(self, card: Span, condition: Span | None, text: bytes, after: range) -> int:
        """Do what a card says.

        Parameters
        ----------
        card : Span
            Its keyword.
        condition : Span, optional
            The words behind it.
        text : bytes
            Canonical text of the file.
        after : range
            From the end of the card to the end of what is read of the file.

        Returns
        -------
        int
            Where reading goes on.

        Raises
        ------
        NetlistError
            If no ``.if`` is open, or none of the cards to come closes it.
        """
        word = card.text.lower()
        if word == ".if":
            assert condition is not None
            self._open.append(_Open(card, self._holds(condition)))
            return after.start if self._open[-1].taken else self._next(text, after)
        if not self._open or (self._open[-1].is_last and word != ".endif"):
            found = "no '.if' is open" if not self._open else "an '.else' came before"
            raise NetlistError(f"{found} for this '{word}'", code="unmatched-if", span=card)
        return self._go_on(word, condition, text, after)

    def _go_on(self, word: str, condition: Span | None, text: bytes, after: range) -> int:
        """Do what a card says that follows an ``.if``."""
        opened = self._open[-1]
        if word == ".endif":
            self._open.pop()
            return after.start
        opened.is_last = word == ".else"
        if opened.taken:
            return self._next(text, after)
        opened.taken = condition is None or opened.is_last or self._holds(condition)
        return after.start if opened.taken else self._next(text, after)

    def _next(self, text: bytes, after: range) -> int:
        """Return where the next card stands that belongs to the innermost condition."""
        depth = 0
        for match in _BRANCH.finditer(text, after.start, after.stop):
            word = match[1]
            if depth == 0 and word != b".if":
                return match.start(1)
            depth += (word == b".if") - (word == b".endif")
        raise self._unclosed()

    def check_closed(self, depth: int) -> None:
        """Refuse conditions still open beyond a depth, at the end of a file.

        Raises
        ------
        NetlistError
            If there is one.
        """
        if self.depth > depth:
            raise self._unclosed()

    def _unclosed(self) -> NetlistError:
        card = self._open[-1].card
        return NetlistError("no '.endif' closes this '.if'", code="unmatched-if", span=card)
