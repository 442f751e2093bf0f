"""One card as the grammar reads it: its rule and its words, each with its place."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

from lark import Token, Tree
from lark.exceptions import UnexpectedInput

from evenstage.netlist.grammar import ENCODING, parser
from evenstage.netlist.reading.complaints import complaint, no_card

if TYPE_CHECKING:
    from evenstage.source import SourceText


_REMARKS: Final = ("$", ";", "//")


class Mark(NamedTuple):
    """One word or sign: the terminal of the grammar and the bytes ``[start, end)``."""

    terminal: str
    start: int
    end: int


class Statement(NamedTuple):
    """One card: the rule of the grammar it follows and its words in their order."""

    rule: str
    marks: tuple[Mark, ...]

    @property
    def pins(self) -> int:
        """How many nets a transistor card gives: its words before the model."""
        words = 0
        for mark in self.marks:
            if mark.terminal == "OFF":
                break
            if mark.terminal == "EQUAL":
                return words - 2  # the last was a parameter's name
            words += mark.terminal == "WORD"
        return words - 1

    def moved(self, by: int) -> Statement:
        """Return the card as if it stood elsewhere."""
        return Statement(self.rule, tuple(Mark(t, a + by, b + by) for t, a, b in self.marks))


def parse_statement(source: SourceText, start: int, end: int) -> Statement:
    """Read one card with its continuation lines.

    Parameters
    ----------
    source : SourceText
        The file.
    start, end : int
        The bytes of the card, from its first to the last before its line end or remark.

    Raises
    ------
    NetlistError
        If the card does not follow the grammar.
    """
    text = source.data[start:end].decode(ENCODING)
    if text.startswith(_REMARKS):
        # Behind a comma it is no remark, though it would be one at the beginning of a text.
        raise no_card(source, start, end)
    try:
        tree = parser("netlist").parse(text, start="statement")
    except UnexpectedInput as error:
        raise complaint(source, start, end, error) from None
    return statement_of(tree, start)


def statement_of(tree: Tree[Token], base: int = 0) -> Statement:
    """Return a tree of the rule ``statement`` as a statement; ``base`` is where its text begins."""
    card = tree.children[0] if tree.data == "statement" else tree
    assert isinstance(card, Tree)
    tokens = card.scan_values(lambda value: isinstance(value, Token))
    return Statement(
        str(card.data),
        tuple(Mark(t.type, base + (t.start_pos or 0), base + (t.end_pos or 0)) for t in tokens),
    )
