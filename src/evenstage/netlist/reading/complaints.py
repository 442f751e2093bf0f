"""What to tell the user about a card the grammar refuses."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Final

from lark import Token

from evenstage.errors import NetlistError
from evenstage.netlist.wording import counted
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Callable

    from lark.exceptions import UnexpectedInput

    from evenstage.source import SourceText

_WORD: Final = re.compile(rb"[^\x00-\x20=,()'\"{}]+")
_JOINT: Final = re.compile(rb"(?:[\r\n][^\S\r\n]*(?:(?:[*$;]|//)[^\r\n]*)?)*[\r\n][^\S\r\n]*\+")
_CLOSING: Final = {"'": "'", '"': '"', "{": "}"}

_MANY: Final = 1 << 30
_TWO_NETS: Final = (2, _MANY, "two nets and a value")
#: What must stand on a card between its name and its parameters: how many words, and which.
_NEEDED: Final = {
    "m": (5, 8, "four nets (drain, gate, source, bulk) and a model"),
    **dict.fromkeys("rclvi", _TWO_NETS),
    "x": (1, _MANY, "its nets and the subcircuit it calls"),
}
_DOT_CARDS: Final = {
    ".subckt": ("missing-name", "a name"),
    ".inc": ("missing-file", "the name of a file"),
    ".include": ("missing-file", "the name of a file"),
    ".lib": ("missing-file", "a file and a section, or the name of a section"),
    ".model": ("missing-name", "a name and a type"),
    ".if": ("missing-condition", "a condition"),
    ".elseif": ("missing-condition", "a condition"),
    ".func": ("missing-name", "a name, its arguments in brackets and an expression"),
}

#: What only the other languages found behind the same file endings have.
_FOREIGN: Final = re.compile(
    rb"^[^\S\r\n]*(simulator[^\S\r\n]+lang|(?:inline[^\S\r\n]+)?subckt(?=[^\S\r\n])|ends\b"
    rb"|module(?=[^\S\r\n])|endmodule|library(?=[^\S\r\n]*\()|\([a-z]+|<\?|#include|#!)",
    re.MULTILINE | re.IGNORECASE,
)


@dataclass(frozen=True)
class _Refusal:
    """A card the grammar refused: its bytes, and where reading stopped."""

    source: SourceText
    start: int
    end: int
    place: int

    @cached_property
    def joined(self) -> bytes:
        """The card with blanks for the joints of its lines."""
        text = self.source.data[self.start : self.end]
        return _JOINT.sub(lambda joint: b" " * len(joint[0]), text)

    @cached_property
    def words(self) -> list[tuple[int, int]]:
        """The places of the name and the words after it, up to the first ``name=``."""
        head, equals, _ = self.joined.partition(b"=")
        found = [
            (self.start + match.start(), self.start + match.end()) for match in _WORD.finditer(head)
        ]
        return found[:-1] if equals and len(found) > 1 else found

    @cached_property
    def sign(self) -> str:
        """The character at which reading stopped; empty at the end of the card."""
        return self.text(self.place, self.end)[:1]

    @cached_property
    def letter(self) -> str:
        """The first letter of the card."""
        return self.text(self.start, self.end)[:1].lower()

    def text(self, start: int, end: int) -> str:
        """Return some bytes of the card as text."""
        return Span(self.source, start, end).text

    def error(self, code: str, message: str, start: int, end: int) -> NetlistError:
        """Return the error for some bytes of the card."""
        return NetlistError(message, code=code, span=Span(self.source, start, max(end, start + 1)))


def complaint(source: SourceText, start: int, end: int, error: UnexpectedInput) -> NetlistError:
    """Return the error that says what is wrong with a card.

    Parameters
    ----------
    source : SourceText
        The file.
    start, end : int
        The bytes of the card.
    error : UnexpectedInput
        Where the parser stopped.
    """
    token = getattr(error, "token", None)
    at_end = isinstance(token, Token) and token.type == "$END"
    refusal = _Refusal(source, start, end, end if at_end else start + _offset(error))
    return next(filter(None, (check(refusal) for check in _CHECKS)))


def _offset(error: UnexpectedInput) -> int:
    offset: int | None = error.pos_in_stream
    return 0 if offset is None else offset


def _other_language(refusal: _Refusal) -> NetlistError | None:
    foreign = _FOREIGN.search(refusal.source.data)
    if foreign is None:
        return None
    return foreign_card(Span(refusal.source, *foreign.span(1)))


def no_card(source: SourceText, start: int, end: int) -> NetlistError:
    """Return the error for bytes that cannot begin a card."""
    refusal = _Refusal(source, start, end, start)
    return _bad_beginning(refusal) or _unexpected(refusal)


def foreign_card(word: Span) -> NetlistError:
    """Return the error for a card of another language, by its first word."""
    message = "this does not look like a SPICE netlist"
    return NetlistError(message, code="other-language", span=word)


def _bad_beginning(refusal: _Refusal) -> NetlistError | None:
    first = refusal.letter
    if first == "+":
        message = "this line continues a card, but no card stands before it"
        return refusal.error("stray-continuation", message, refusal.start, refusal.start + 1)
    if (first.isascii() and first.isalpha()) or first == ".":
        return None
    message = f"a card begins with a letter or a dot, a comment with '*', got '{first}'"
    end = refusal.start + len(first.encode("utf-8", "surrogateescape"))
    return refusal.error("bad-card", message, refusal.start, end)


def _short_dot_card(refusal: _Refusal) -> NetlistError | None:
    word = refusal.text(refusal.start, refusal.end).split(maxsplit=1)[0]
    if refusal.sign or word.lower() not in _DOT_CARDS:
        return None
    code, needed = _DOT_CARDS[word.lower()]
    message = f"'{word}' needs {needed}"
    return refusal.error(code, message, refusal.start, refusal.start + len(word))


def _unclosed_quote(refusal: _Refusal) -> NetlistError | None:
    closing = _CLOSING.get(refusal.sign)
    if closing is None or closing in refusal.text(refusal.place + 1, refusal.end):
        return None
    message = f"{refusal.sign} opens an expression that no {closing} closes"
    return refusal.error("unclosed-quote", message, refusal.place, refusal.end)


def _wrong_word_count(refusal: _Refusal) -> NetlistError | None:
    """Too few words before the parameters, or too many on an M card."""
    if refusal.letter not in _NEEDED or refusal.sign in {*"('\"{}"} - {""}:
        return None
    needed, most, usage = _NEEDED[refusal.letter]
    (start, end), *words = refusal.words
    if needed <= len(words) <= most:
        return None
    message = f"'{refusal.text(start, end)}' needs {usage}, got {counted(len(words), 'word')}"
    if len(words) < needed:
        return refusal.error("missing-node", message, start, words[-1][1] if words else end)
    first, last = words[most][0], words[-1][1]
    return refusal.error(
        "loose-word", f"{message}; at most three pins more may follow", first, last
    )


def _missing_value(refusal: _Refusal) -> NetlistError | None:
    before = refusal.joined[: refusal.place - refusal.start]
    # Before a second '=' the word between is a name, unless it is a number.
    pattern = (
        rb"([^\s=]+)\s*=\s*\Z" if refusal.sign != "=" else rb"([^\s=]+)\s*=\s*[a-zA-Z_][^\s=]*\s*\Z"
    )
    match = re.search(pattern, before)
    if match is None:
        return None
    start = refusal.start + match.start()
    end = refusal.start + match.end(1)
    message = f"a value is missing after '{refusal.text(start, end)}='"
    return refusal.error("missing-value", message, start, end)


def _missing_name(refusal: _Refusal) -> NetlistError | None:
    if refusal.sign != "=":
        return None
    message = "a name is missing before '='"
    return refusal.error("missing-name", message, refusal.place, refusal.place + 1)


def _loose_word(refusal: _Refusal) -> NetlistError | None:
    if refusal.sign and not _WORD.match(refusal.source.data, refusal.place):
        return None
    before = list(_WORD.finditer(refusal.joined[: refusal.place - refusal.start]))
    if not before:
        return None
    start, end = (refusal.start + edge for edge in before[-1].span())
    message = f"expected name=value, got '{refusal.text(start, end)}'"
    return refusal.error("loose-word", message, start, end)


def _unexpected(refusal: _Refusal) -> NetlistError:
    message = f"'{refusal.sign}' does not belong here"
    end = refusal.place + len(refusal.sign.encode("utf-8", "surrogateescape"))
    return refusal.error("bad-card", message, refusal.place, end)


#: Tried in this order; the last always has an answer.
_CHECKS: Final[tuple[Callable[[_Refusal], NetlistError | None], ...]] = (
    _other_language,
    _bad_beginning,
    _short_dot_card,
    _unclosed_quote,
    _wrong_word_count,
    _missing_value,
    _missing_name,
    _loose_word,
    _unexpected,
)
