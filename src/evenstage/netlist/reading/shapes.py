"""Card shapes learned from the grammar: how a card like one already seen is read at once.

Whether the grammar accepts a card depends only on the sequence of its terminals (it is LALR). So
when Lark has read one card, every card with the same terminals in the same order is a card too, and
one regular expression, put together from the grammar's own terminals in that order, recognises it.
Possessive quantifiers forbid the expression to cut the words in another way. Cards of one shape are
those with equal parameter names; a run of nets of a call counts as one piece, however long.

The expressions read text as ``canonical`` leaves it: lower case, one card per line.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, replace
from functools import cache
from typing import Final, Literal

from evenstage.netlist.decimals import PLAIN
from evenstage.netlist.grammar import ENCODING, terminal
from evenstage.netlist.reading.statement import Mark, Statement

Role = Literal["name", "node", "nodes", "target", "argument", "key", "value"]

_BETWEEN: Final = r"[\x00-\x09\x0b-\x20,]*+"
_BETWEEN_WORDS: Final = r"[\x00-\x09\x0b-\x20,]++"
_END: Final = r"(?:\n[\x00-\x20,]*+|\Z)"
_LEARNABLE: Final = frozenset({"transistor", "call", "passive"})
_SIGNS: Final = frozenset({"EQUAL", "SLASH", "PARAMS", "OPEN", "CLOSE", "OFF"})
#: After these a call's next word is the subcircuit.
_BEFORE_TARGET: Final = frozenset({"/", r"\)"})
_WORD = re.compile(rb"[^\x00-\x20,]++")
_HAS_NUMBER = re.compile(r"[0-9.]")
_QUANTIFIER = re.compile(r"(?<=[\])])(?:[*+]|\?)(?![+?])")


@cache
def _possessive(name: str) -> str:
    """Return a terminal's expression with possessive quantifiers.

    That changes nothing: no terminal of an element card repeats a piece that could also begin what
    comes after it.
    """
    return _QUANTIFIER.sub(lambda match: match[0] + "+", terminal(name))


@dataclass(frozen=True, slots=True)
class Shape:
    """One sequence of terminals of an element card.

    Parameters
    ----------
    letter : str
        First letter of the cards.
    roles : tuple of Role
        What each group of ``groups`` is; ``nodes`` is a run of nets, whose last is the subcircuit
        called unless a ``target`` stands apart.
    keys : tuple of str
        Parameter names in their order, one for each ``value``.
    expression : bytes
        Matches a card from its first byte to the first byte of the next, with a group for each
        role.
    row : re.Pattern
        The same with a group for each role but ``key``, which saves time.
    joint : bytes
        The same with one group for all parameters; empty where there are fewer than two.
    tail : bytes
        Matches what that group holds, with a group for each value.
    plain_tails : bytes
        Matches some of those, each with a line feed, whose values are all plain decimals and their
        only digits; empty where there can be none.
    """

    letter: str
    roles: tuple[Role, ...]
    keys: tuple[str, ...]
    expression: bytes
    row: re.Pattern[bytes]
    joint: bytes = b""
    tail: bytes = b""
    plain_tails: bytes = b""

    @property
    def groups(self) -> re.Pattern[bytes]:
        """The ``expression``, compiled when it is needed for the first time."""
        return _compiled(self.expression)


@cache
def _compiled(expression: bytes) -> re.Pattern[bytes]:
    return re.compile(expression)


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
    word = f"{_BETWEEN_WORDS}{_possessive('WORD')}(?!{_BETWEEN}=)"
    pair = f"{_BETWEEN_WORDS}{_possessive('WORD')}{_BETWEEN}={_BETWEEN}{_possessive('VALUE')}"
    definition = f"(?P<definition>{terminal('SUBCKT')}(?:{word})++)(?P<pairs>(?:{pair})*+)"
    ends = f"(?P<ends>{terminal('ENDS')}(?:{word})?+)"
    return re.compile(f"(?:{definition}|{ends}){_BETWEEN}{_END}".encode(ENCODING))


@cache
def _pair() -> re.Pattern[bytes]:
    word, value = _possessive("WORD"), _possessive("VALUE")
    pair = f"(?P<WORD>{word}){_BETWEEN}(?P<EQUAL>=){_BETWEEN}(?P<VALUE>{value})"
    return re.compile(pair.encode(ENCODING))


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
    pieces = _pieces(statement, text)
    keys = tuple(piece.name for piece in pieces if piece.role == "key")
    shape = Shape(
        chr(text[statement.marks[0].start]),
        tuple(piece.role for piece in pieces if piece.role is not None),
        keys,
        _expression(pieces),
        re.compile(_expression(_without_keys(pieces))),
        *_joint_and_tails(_without_keys(pieces), keys),
    )
    return shape if _agrees(shape, statement, text) else None


@dataclass(frozen=True, slots=True)
class _Piece:
    pattern: str
    role: Role | None
    name: str = ""


def _without_keys(pieces: list[_Piece]) -> list[_Piece]:
    return [replace(piece, role=None) if piece.role == "key" else piece for piece in pieces]


def _joint_and_tails(pieces: list[_Piece], keys: tuple[str, ...]) -> tuple[bytes, bytes, bytes]:
    """Return the expressions of a card with its parameters in one, and of these."""
    if len(keys) < 2:
        return b"", b"", b""
    first = next(i for i, piece in enumerate(pieces) if piece.name)
    plain = [replace(piece, role=None) for piece in pieces[first:]]
    joint = _expression([*pieces[:first], _Piece(_joined(plain), "value")])
    return joint, _joined(pieces[first:]).encode(ENCODING), _plain_tails(pieces[first:])


def _plain_tails(pieces: list[_Piece]) -> bytes:
    plain = [
        replace(p, pattern=_plain_values().get(p.pattern, ""), role=None) if p.role else p
        for p in pieces
    ]
    if not all(p.pattern for p in plain) or any(_HAS_NUMBER.search(p.name) for p in pieces):
        return b""
    return f"(?:{_joined(plain)}\n)++".encode(ENCODING)


@cache
def _plain_values() -> dict[str, str]:
    """Return the expression of a plain decimal for each terminal that may hold one."""
    number = PLAIN.decode(ENCODING)
    written = {
        "VALUE": rf"{number}(?=[\x00-\x20,])",
        "QUOTED": f"'{number}'",
        "STRING": f'"{number}"',
        "BRACED": rf"\{{{number}\}}",
    }
    return {_possessive(name): expression for name, expression in written.items()}


def _joined(pieces: list[_Piece]) -> str:
    return _BETWEEN.join(p.pattern if p.role is None else f"({p.pattern})" for p in pieces)


def _expression(pieces: list[_Piece]) -> bytes:
    return (_joined(pieces) + _BETWEEN + _END).encode(ENCODING)


def _pieces(statement: Statement, text: bytes) -> list[_Piece]:
    """Return the pieces of the expression, one per terminal or run of nets."""
    marks = statement.marks
    # One terminal stands for several kinds of card, a shape for one.
    letter = chr(text[marks[0].start])
    pieces = [_Piece(f"(?={letter}){_possessive(marks[0].terminal)}", "name")]
    position = 1
    while position < len(marks):
        mark = marks[position]
        if _is_key(marks, position):
            name = text[mark.start : mark.end]
            pieces.append(_Piece(re.escape(name.decode(ENCODING)), "key", name.decode(ENCODING)))
        elif _begins_run(statement.rule, mark, pieces[-1]):
            while marks[position + 1 : position + 2] and _continues_run(marks, position + 1):
                position += 1
            word = _possessive("WORD")
            pieces.append(_Piece(f"{word}(?:{_BETWEEN_WORDS}{word})*", "nodes"))
        elif mark.terminal in _SIGNS:
            pieces.append(_Piece(terminal(mark.terminal), None))
        else:
            role = _role(statement, pieces)
            pieces.append(_Piece(_guard(statement, pieces) + _possessive(mark.terminal), role))
        position += 1
    return pieces


def _is_key(marks: tuple[Mark, ...], position: int) -> bool:
    return position + 1 < len(marks) and marks[position + 1].terminal == "EQUAL"


def _continues_run(marks: tuple[Mark, ...], position: int) -> bool:
    return marks[position].terminal == "WORD" and not _is_key(marks, position)


def _begins_run(rule: str, mark: Mark, before: _Piece) -> bool:
    return mark.terminal == "WORD" and rule == "call" and before.pattern not in _BEFORE_TARGET


def _guard(statement: Statement, before: list[_Piece]) -> str:
    """Return what keeps a word from being a sign where the grammar would rather have that.

    From the sixth word of a transistor on, ``off`` may stand in the place of a word.
    """
    words = sum(piece.role == "node" for piece in before)
    bracketed = any(piece.pattern == terminal("OPEN") for piece in before)
    signs = statement.rule == "transistor" and words > 4 and not bracketed
    return f"(?!{terminal('OFF')})" if signs and before[-1].pattern != "=" else ""


def _role(statement: Statement, before: list[_Piece]) -> Role:
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
