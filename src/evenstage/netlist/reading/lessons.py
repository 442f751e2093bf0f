"""How the shape of a card is learned from the card itself, once Lark has read it."""

from __future__ import annotations

import re
from functools import cache
from typing import TYPE_CHECKING, Final

from evenstage.netlist.grammar import ENCODING, terminal
from evenstage.netlist.reading.shapes import BETWEEN_WORDS, PLAIN_WORDS, Piece, Shape, possessive

if TYPE_CHECKING:
    from evenstage.netlist.reading.shapes import Role
    from evenstage.netlist.reading.statement import Mark, Statement

_LEARNABLE: Final = frozenset({"transistor", "call", "passive"})
_SIGNS: Final = frozenset({"EQUAL", "SLASH", "PARAMS", "OPEN", "CLOSE", "OFF"})


def learn(statement: Statement, text: bytes) -> Shape | None:
    """Return the shape of a card Lark has read, or None for cards that are always left to Lark.

    Parameters
    ----------
    statement : Statement
        The card.
    text : bytes
        Canonical text of its file.
    """
    if statement.rule not in _LEARNABLE:
        return None
    letter = chr(text[statement.marks[0].start])
    shape = Shape(letter, tuple(_pieces(statement, text)))
    return shape if _agrees(shape, statement, text) else None


def _pieces(statement: Statement, text: bytes) -> list[Piece]:
    """Return the pieces of the expression, one per terminal or run of nets."""
    marks = statement.marks
    # One terminal stands for several kinds of card, a shape for one.
    letter = chr(text[marks[0].start])
    pieces = [Piece(f"(?={letter}){possessive(marks[0].terminal)}", "name")]
    position = 1
    while position < len(marks):
        mark = marks[position]
        if _is_key(marks, position):
            written = text[mark.start : mark.end]
            name = written.decode("utf-8", "surrogateescape").lower()
            pieces.append(Piece(re.escape(written.decode(ENCODING)), "key", name))
        elif _begins_run(statement.rule, mark, pieces[-1]):
            while marks[position + 1 : position + 2] and _continues_run(marks, position + 1):
                position += 1
            word = possessive("WORD")
            general = f"{word}(?:{BETWEEN_WORDS}{word})*"
            pieces.append(Piece(f"(?:{PLAIN_WORDS}|{general})", "nodes"))
        elif mark.terminal in _SIGNS:
            pieces.append(Piece(_sign(mark.terminal), None))
        else:
            role = _role(statement, pieces)
            pieces.append(Piece(_guard(statement, pieces) + possessive(mark.terminal), role))
        position += 1
    return pieces


@cache
def _sign(name: str) -> str:
    """Return the expression of a sign; where a word can begin, as with a slash, it is no sign."""
    return f"(?!{possessive('WORD')}){terminal(name)}" if name == "SLASH" else terminal(name)


def _is_key(marks: tuple[Mark, ...], position: int) -> bool:
    return position + 1 < len(marks) and marks[position + 1].terminal == "EQUAL"


def _continues_run(marks: tuple[Mark, ...], position: int) -> bool:
    return marks[position].terminal == "WORD" and not _is_key(marks, position)


def _begins_run(rule: str, mark: Mark, before: Piece) -> bool:
    # After these signs a call's next word is the subcircuit.
    ends = {_sign("SLASH"), _sign("CLOSE")}
    return mark.terminal == "WORD" and rule == "call" and before.pattern not in ends


def _guard(statement: Statement, before: list[Piece]) -> str:
    """Return what keeps a word from being a sign where the grammar would rather have that.

    From the sixth word of a transistor on, ``off`` may stand in the place of a word.
    """
    words = sum(piece.role == "node" for piece in before)
    bracketed = any(piece.pattern == terminal("OPEN") for piece in before)
    signs = statement.rule == "transistor" and words > 4 and not bracketed
    return f"(?!{terminal('OFF')})" if signs and before[-1].pattern != "=" else ""


def _role(statement: Statement, before: list[Piece]) -> Role:
    if before[-1].pattern == "=":
        return "value"
    if statement.rule == "call":
        return "target"
    nodes = sum(piece.role == "node" for piece in before)
    if statement.rule == "transistor":
        return "node" if nodes < statement.pins else "target"
    return "node" if nodes < 2 else "argument"


def _agrees(shape: Shape, statement: Statement, text: bytes) -> bool:
    """Tell whether the expression finds the same words in the card as Lark did."""
    match = shape.row.match(text, statement.marks[0].start)
    if match is None:
        return False
    edges = {edge for mark in statement.marks for edge in (mark.start, mark.end)}
    return all(set(match.span(g)) <= edges for g in range(1, shape.row.groups + 1))
