"""Shapes of cards: how a card like one already read is recognised at once.

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
from functools import cache, cached_property, lru_cache
from typing import TYPE_CHECKING, Final, Literal

from evenstage.netlist.decimals import PLAIN
from evenstage.netlist.grammar import ENCODING, terminal

if TYPE_CHECKING:
    from collections.abc import Iterable

Role = Literal["name", "node", "nodes", "target", "argument", "key", "value"]

BETWEEN: Final = r"[\x00-\x09\x0b-\x20,]*+"
BETWEEN_WORDS: Final = r"[\x00-\x09\x0b-\x20,]++"
#: Words without the signs that only some places of a WORD may hold, in one go: calls of many nets
#: are matched in half the time.
_PLAIN_WORD: Final = r"[^\x00-\x20=,()'\"{}:/$;]"
PLAIN_WORDS: Final = (
    rf"{_PLAIN_WORD}(?:[^\x00-\x08\x0a-\x1f=,()'\"{{}}:/$;]*{_PLAIN_WORD})?(?=[\x00-\x20,]|\Z)"
)
#: Ends a card.
END: Final = BETWEEN + r"(?:\n[\x00-\x20,]*+|\Z)"
_NO_JOINT: Final = rf"(?!,[^\x00-\x20=,()'\"{{}}]*+{BETWEEN_WORDS}=)"
#: What lets a FORMULA hold blanks.
_SPACED: Final = "|[\x00-\x09\x0b\x0c\x0e-\x20]" + r"(?![$;]|\/\/)"
_HAS_NUMBER = re.compile(r"[0-9.]")
_QUANTIFIER = re.compile(r"(?<=[\])])(?:[*+]|\?)(?![+?])")


@cache
def possessive(name: str) -> str:
    """Return a terminal's expression with possessive quantifiers.

    That changes nothing: no terminal of an element card repeats a piece that could also begin what
    comes after it. The grammar decides where the joint of a continuation line may have stood in a
    place it would not allow: between a name behind a comma and its sign (``a=1,b =2``), and inside
    the parentheses of an expression.
    """
    expression = _QUANTIFIER.sub(lambda match: match[0] + "+", terminal(name))
    if name == "FORMULA":
        assert _SPACED in expression
        return expression.replace(_SPACED, "")
    return expression + _NO_JOINT if name == "VALUE" else expression


@dataclass(frozen=True, slots=True)
class Piece:
    """One terminal of a card, or a run of nets.

    Parameters
    ----------
    pattern : str
        Its expression.
    role : Role, optional
        What it is; None for signs, whose place nobody asks for.
    name : str
        Of a key: the parameter's name.
    """

    pattern: str
    role: Role | None
    name: str = ""


@dataclass(frozen=True)
class Shape:
    """One sequence of terminals of an element card.

    Parameters
    ----------
    letter : str
        First letter of the cards.
    pieces : tuple of Piece
        The name first.
    """

    letter: str
    pieces: tuple[Piece, ...]

    @cached_property
    def roles(self) -> tuple[Role, ...]:
        """What each group of ``groups`` is.

        ``nodes`` is a run of nets, whose last is the subcircuit called unless a ``target`` stands
        apart.
        """
        return tuple(piece.role for piece in self.pieces if piece.role is not None)

    @cached_property
    def keys(self) -> tuple[str, ...]:
        """Parameter names in their order, one for each ``value``."""
        return tuple(piece.name for piece in self.pieces if piece.role == "key")

    @cached_property
    def groups(self) -> re.Pattern[bytes]:
        """Matches a card up to the first byte of the next, with a group for each role."""
        return _card(self.pieces)

    @cached_property
    def row(self) -> re.Pattern[bytes]:
        """The same with a group for each role but ``key``, which saves time."""
        return _card(tuple(_without(self.pieces, "key")))

    @cached_property
    def joint(self) -> re.Pattern[bytes]:
        """The same with one group for all parameters."""
        whole = Piece(_joined(_without(self._tail, "key", "value")), "value")
        return _card((*self.pieces[: -len(self._tail)], whole))

    @cached_property
    def plain_joint(self) -> re.Pattern[bytes] | None:
        """The same with two groups, the first for parameters that are plain decimals alone.

        None where there can be none, or where a parameter's name holds a digit.
        """
        plain = [_plain(piece) if piece.role == "value" else piece for piece in self._tail]
        if not all(piece.pattern for piece in plain) or _HAS_NUMBER.search("".join(self.keys)):
            return None
        tails = (_joined(_without(tail, "key", "value")) for tail in (plain, self._tail))
        either = "|".join(f"({tail}){END}" for tail in tails)
        head = _joined(self.pieces[: -len(self._tail)])
        return _compiled(f"{head}{BETWEEN}(?:{either})")

    @cached_property
    def tail(self) -> re.Pattern[bytes]:
        """Matches what that group holds, with a group for each value."""
        return re.compile(_joined(_without(self._tail, "key")).encode(ENCODING))

    @property
    def _tail(self) -> tuple[Piece, ...]:
        """The pieces from the first parameter on."""
        first = next(i for i, piece in enumerate(self.pieces) if piece.role == "key")
        return self.pieces[first:]

    def until(self, name: str) -> re.Pattern[bytes] | None:
        """Return what matches a card up to the value of a parameter, which is the only group.

        None where the cards do not have the parameter; of a repeated one the last counts.
        """
        if name not in self.keys:
            return None
        last = max(i for i, piece in enumerate(self.pieces) if piece.name == name)
        value = next(i for i in range(last, len(self.pieces)) if self.pieces[i].role == "value")
        before = [replace(piece, role=None) for piece in self.pieces[:value]]
        return re.compile(_joined([*before, self.pieces[value]]).encode(ENCODING))


def _without(pieces: Iterable[Piece], *roles: Role) -> list[Piece]:
    """Return pieces of which those of some roles have none."""
    return [replace(piece, role=None) if piece.role in roles else piece for piece in pieces]


def _joined(pieces: Iterable[Piece]) -> str:
    return BETWEEN.join(p.pattern if p.role is None else f"({p.pattern})" for p in pieces)


def _card(pieces: tuple[Piece, ...]) -> re.Pattern[bytes]:
    """Return the expression of a card."""
    return _compiled(_joined(pieces) + END)


@lru_cache(maxsize=1 << 12)
def _compiled(expression: str) -> re.Pattern[bytes]:
    """Compile an expression; that takes as long as reading some fifty cards."""
    return re.compile(expression.encode(ENCODING))


def _plain(piece: Piece) -> Piece:
    return replace(piece, pattern=_plain_values().get(piece.pattern, ""))


@cache
def _plain_values() -> dict[str, str]:
    """Return the expression of a plain decimal for each terminal that may hold one."""
    number = PLAIN.decode(ENCODING)
    written = {
        "VALUE": rf"{number}(?=[\x00-\x20]|\Z)",
        "QUOTED": f"'{number}'",
        "STRING": f'"{number}"',
        "BRACED": rf"\{{{number}\}}",
    }
    return {possessive(name): expression for name, expression in written.items()}
