"""Cards that open and close definitions, read without Lark where they are simple."""

from __future__ import annotations

import re
from functools import cache
from typing import Final

from evenstage.netlist.grammar import ENCODING, terminal
from evenstage.netlist.reading.shapes import BETWEEN, BETWEEN_WORDS, END, possessive
from evenstage.netlist.reading.statement import Mark, Statement

_WORD: Final = re.compile(rb"[^\x00-\x20,]++")


def plain_bracket(text: bytes, position: int) -> Statement | None:
    """Return a ``.subckt`` or ``.ends`` card of words and plain parameters, or None for others.

    A large hierarchy has thousands of them, and Lark takes as long for each as for fifty cards of a
    known shape.

    Parameters
    ----------
    text : bytes
        Canonical text.
    position : int
        Where the card begins.
    """
    match = _brackets().match(text, position)
    if match is None:
        return None
    kind = "ends" if match["definition"] is None else "definition"
    words = [word.span() for word in _WORD.finditer(text, *match.span(kind))]
    terminals = ["SUBCKT" if kind == "definition" else "ENDS", *["WORD"] * (len(words) - 1)]
    marks = [Mark(t, *span) for t, span in zip(terminals, words, strict=True)]
    for pair in _pair().finditer(text, *match.span("pairs")):
        marks += (Mark(t, *pair.span(t)) for t in ("WORD", "EQUAL", "VALUE"))
    return Statement(kind, tuple(marks))


@cache
def _brackets() -> re.Pattern[bytes]:
    word = f"{BETWEEN_WORDS}{possessive('WORD')}(?!{BETWEEN}=)"
    pair = f"{BETWEEN_WORDS}{possessive('WORD')}{BETWEEN}={BETWEEN}{possessive('VALUE')}"
    definition = f"(?P<definition>{terminal('SUBCKT')}(?:{word})++)(?P<pairs>(?:{pair})*+)"
    ends = f"(?P<ends>{terminal('ENDS')}(?:{word})?+)"
    return re.compile(f"(?:{definition}|{ends}){END}".encode(ENCODING))


@cache
def _pair() -> re.Pattern[bytes]:
    word, value = possessive("WORD"), possessive("VALUE")
    pair = f"(?P<WORD>{word}){BETWEEN}(?P<EQUAL>=){BETWEEN}(?P<VALUE>{value})"
    return re.compile(pair.encode(ENCODING))
