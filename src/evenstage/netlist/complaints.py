"""What to tell the user about a card the grammar refuses."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, NamedTuple

from lark import Token

from evenstage.errors import NetlistError
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Callable

    from lark.exceptions import UnexpectedInput

    from evenstage.source import SourceText

_WORD = re.compile(rb"[^\x00-\x20=,()'\"{}]+")
_JOINT = re.compile(rb"(?:[\r\n][^\S\r\n]*(?:[*$;][^\r\n]*)?)*[\r\n][^\S\r\n]*\+")
_CLOSING = {"'": "'", '"': '"', "{": "}"}
_NODES = {"m": 4, "r": 2, "c": 2, "l": 2, "v": 2, "i": 2}
_USAGE = {
    "m": "four nets (drain, gate, source, bulk) and a model",
    "r": "two nets and a value",
    "c": "two nets and a value",
    "l": "two nets and a value",
    "v": "two nets and a value",
    "i": "two nets and a value",
}
_DOT_USAGE = {
    ".subckt": ("missing-name", "'.subckt' needs a name"),
    ".include": ("missing-file", "'.include' needs the name of a file"),
    ".inc": ("missing-file", "'.inc' needs the name of a file"),
    ".lib": ("missing-file", "'.lib' needs a file and a section, or the name of a section"),
    ".model": ("missing-name", "'.model' needs a name and a type"),
}

# What only the other languages found behind the same file endings have.
_FOREIGN = re.compile(
    rb"^[^\S\r\n]*(?:simulator[^\S\r\n]+lang|(?:inline[^\S\r\n]+)?subckt[^\S\r\n]|ends\b|//|/\*"
    rb"|module[^\S\r\n]|endmodule|library[^\S\r\n]*\(|\([a-z]|<\?|#include|#!|import\s|def\s)",
    re.MULTILINE | re.IGNORECASE,
)


class _Refusal(NamedTuple):
    """A card the grammar refused: where it stands and where reading stopped."""

    source: SourceText
    start: int
    end: int
    place: int
    terminal: str

    @property
    def words(self) -> list[tuple[int, int]]:
        """The places of the words before the first ``=``."""
        text = self.source.data[self.start : self.end]
        text = _JOINT.sub(lambda joint: b" " * len(joint[0]), text)
        head = text.split(b"=", 1)[0]
        found = [(self.start + m.start(), self.start + m.end()) for m in _WORD.finditer(head)]
        return found[:-1] if b"=" in text and len(found) > 1 else found

    def error(self, code: str, message: str, start: int, end: int) -> NetlistError:
        """Return the error for some bytes of the card."""
        return NetlistError(message, code=code, span=Span(self.source, start, max(end, start + 1)))

    def text(self, start: int, end: int) -> str:
        """Return some bytes of the card as text."""
        return Span(self.source, start, end).text


def complaint(source: SourceText, start: int, end: int, error: UnexpectedInput) -> NetlistError:
    """Return the error that says what is wrong with a card.

    Parameters
    ----------
    source : SourceText
        The file.
    start, end : int
        The bytes of the card.
    error : UnexpectedInput
        Where and why the parser stopped.
    """
    token = getattr(error, "token", None)
    at_end = isinstance(token, Token) and token.type == "$END"
    place = end if at_end else start + _offset(error)
    kind = token.type if isinstance(token, Token) else ""
    refusal = _Refusal(source, start, end, place, kind)
    foreign = _FOREIGN.search(source.data)
    if foreign is not None:
        return refusal.error(
            "other-language",
            "this does not look like a SPICE netlist",
            *_content(foreign),
        )
    return next(filter(None, (check(refusal) for check in _CHECKS)))


def _offset(error: UnexpectedInput) -> int:
    offset: int | None = error.pos_in_stream
    return 0 if offset is None else offset


def _content(match: re.Match[bytes]) -> tuple[int, int]:
    lead = len(match[0]) - len(match[0].lstrip())
    return match.start() + lead, match.start() + len(match[0].rstrip())


def _bad_beginning(refusal: _Refusal) -> NetlistError | None:
    first = refusal.text(refusal.start, refusal.start + 1)
    if first == "+":
        message = "this line continues a card, but no card stands before it"
        return refusal.error("stray-continuation", message, refusal.start, refusal.start + 1)
    if first.isalpha() or first == ".":
        return None
    message = f"a card begins with a letter or a dot, a comment with '*', got '{first}'"
    return refusal.error("bad-card", message, refusal.start, refusal.start + 1)


def _bad_dot_card(refusal: _Refusal) -> NetlistError | None:
    word = refusal.text(refusal.start, refusal.end).split(maxsplit=1)[0].lower()
    if refusal.terminal == "$END" and word in _DOT_USAGE:
        code, message = _DOT_USAGE[word]
        return refusal.error(code, message, refusal.start, refusal.start + len(word))
    return None


def _unclosed_quote(refusal: _Refusal) -> NetlistError | None:
    sign = refusal.text(refusal.place, refusal.place + 1)
    closing = _CLOSING.get(sign)
    if closing is None or closing in refusal.text(refusal.place + 1, refusal.end):
        return None
    message = f"{sign} opens an expression that no {closing} closes"
    return refusal.error("unclosed-quote", message, refusal.place, refusal.end)


def _missing_node(refusal: _Refusal) -> NetlistError | None:
    letter = refusal.text(refusal.start, refusal.start + 1).lower()
    words = refusal.words
    needed = _NODES.get(letter, 0) + (letter == "m")
    if refusal.terminal not in {"$END", "EQUAL"} or len(words) > needed or letter not in _NODES:
        return None
    name = refusal.text(*words[0])
    message = f"'{name}' needs {_USAGE[letter]}, got {_count(len(words) - 1, 'word')}"
    return refusal.error("missing-node", message, words[0][0], words[-1][1])


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"


def _missing_subcircuit(refusal: _Refusal) -> NetlistError | None:
    words = refusal.words
    if refusal.text(refusal.start, refusal.start + 1).lower() != "x" or len(words) > 1:
        return None
    name = refusal.text(*words[0])
    message = f"'{name}' needs its nets and the subcircuit it calls"
    return refusal.error("missing-node", message, *words[0])


def _missing_value(refusal: _Refusal) -> NetlistError | None:
    before = refusal.source.data[refusal.start : refusal.place].rstrip()
    if not before.endswith(b"="):
        return None
    end = refusal.start + len(before)
    name = _WORD.findall(before)[-1]
    start = refusal.start + before.rindex(name)
    message = f"a value is missing after '{name.decode('utf-8', 'surrogateescape')}='"
    return refusal.error("missing-value", message, start, end)


def _missing_name(refusal: _Refusal) -> NetlistError | None:
    if refusal.terminal != "EQUAL":
        return None
    message = "a name is missing before '='"
    return refusal.error("missing-name", message, refusal.place, refusal.place + 1)


def _loose_word(refusal: _Refusal) -> NetlistError | None:
    before = refusal.source.data[refusal.start : refusal.place]
    words = list(_WORD.finditer(before))
    if not words or refusal.terminal not in {"WORD", "$END", "SLASH"}:
        return None
    start, end = (refusal.start + edge for edge in words[-1].span())
    message = f"expected name=value, got '{refusal.text(start, end)}'"
    return refusal.error("loose-word", message, start, end)


def _unexpected(refusal: _Refusal) -> NetlistError | None:
    if refusal.place >= refusal.end:
        return refusal.error("bad-card", "this card ends too early", refusal.start, refusal.end)
    match = _WORD.match(refusal.source.data, refusal.place, refusal.end)
    end = match.end() if match else refusal.place + 1
    message = f"'{refusal.text(refusal.place, end)}' does not belong here"
    return refusal.error("bad-card", message, refusal.place, end)


#: Tried in this order; the last always has an answer.
_CHECKS: tuple[Callable[[_Refusal], NetlistError | None], ...] = (
    _bad_beginning,
    _bad_dot_card,
    _unclosed_quote,
    _missing_node,
    _missing_subcircuit,
    _missing_value,
    _missing_name,
    _loose_word,
    _unexpected,
)
