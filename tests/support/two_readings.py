"""The two ways to read cards held against each other: the program's, and that of the grammar alone.

A *case* is the text of some cards, or of what was one before it was edited. It is read behind a
dot card that means nothing, so that it cannot change what stands before it. Cases that the grammar
accepts are put in one file, as many as there are, and that is read by the program; the cards of
both must agree in kind, words and places, to the byte. Cases that the grammar refuses are read one
by one.
"""

from __future__ import annotations

from bisect import bisect_right
from itertools import accumulate
from pathlib import Path
from typing import TYPE_CHECKING, NamedTuple

from lark import Token, Tree
from lark.exceptions import UnexpectedInput

from evenstage.errors import NetlistError
from evenstage.netlist.collection import without_collection
from evenstage.netlist.grammar import ENCODING, parser
from evenstage.netlist.reading.blocks import Blocks
from evenstage.netlist.reading.brackets import plain_bracket
from evenstage.netlist.reading.canonical import canonical
from evenstage.netlist.reading.cards import CardTable
from evenstage.netlist.reading.reader import Reader, Unit
from evenstage.netlist.reading.statement import statement_of
from evenstage.source import SourceText
from support.columns_said import both_said
from support.random_cards import LESSON

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.netlist.netlist import Card, Parameter

ELEMENTS = {"transistor", "call", "passive", "source", "element"}
#: A card that says nothing, before each case.
_FENCE = b".fence\n"
#: What a card says, with places that count from the beginning of its case.
Said = tuple[object, ...]


class Tally(NamedTuple):
    """What became of some cases."""

    accepted: int
    refused: int
    differences: tuple[bytes, ...]


def compare(cases: Sequence[str]) -> Tally:
    """Read some cases in both ways."""
    texts = [_FENCE + case.encode(ENCODING) + b"\n" for case in cases]
    with without_collection():
        said = [by_grammar(text) for text in texts]
        right = [
            (text, cards) for text, cards in zip(texts, said, strict=True) if cards is not None
        ]
        wrong = [text for text, cards in zip(texts, said, strict=True) if cards is None]
        different = (*_different(right), *_accepted(wrong))
    return Tally(len(right), len(wrong), different)


def compare_brackets(cases: Iterable[str]) -> Tally:
    """Hold the quick way for ``.subckt`` and ``.ends`` cards against the grammar.

    Accepted are those that it reads; the others it leaves to the grammar.
    """
    quick, others, different = 0, 0, []
    for case in cases:
        text = case.encode(ENCODING)
        plain = canonical(text)
        statement = plain_bracket(plain, 0)
        quick, others = quick + (statement is not None), others + (statement is None)
        if statement is not None:
            tree = _tree(text[: (plain + b"\n").find(b"\n")])
            first = next((c for c in tree.children if isinstance(c, Tree)), None) if tree else None
            if first is None or statement_of(first) != statement:
                different.append(text)
    return Tally(quick, others, tuple(different))


def by_grammar(text: bytes) -> list[Said] | None:
    """Read a case with Lark alone; None if it is refused."""
    tree = _tree(text)
    if tree is None:
        return None
    table = CardTable()
    table.begin_segment(Blocks(SourceText(Path("fuzz.sp"), text, "fuzz.sp")), "")
    for child in tree.children:
        if isinstance(child, Tree) and child.data == "foreign":
            return None
        if isinstance(child, Tree) and child.data in ELEMENTS:
            table.append_odd(statement_of(child))
    return [_said(table[number], 0) for number in range(len(table))]


def by_program(texts: Sequence[bytes]) -> list[list[Said]] | None:
    """Read some cases in one file as the program does; None if it is refused."""
    reader = Reader()
    data = LESSON + b"".join(texts)
    try:
        reader.read_main(SourceText(Path("fuzz.sp"), data, "fuzz.sp"))
    except NetlistError:
        return None
    netlist = reader.finish()
    starts = list(accumulate(map(len, texts), initial=len(LESSON)))
    said: list[list[Said]] = [[] for _ in texts]
    by_columns, by_cards = both_said(netlist)
    for number in range(LESSON.count(b"\n") - 1, len(netlist)):
        card = netlist.card(number)
        case = bisect_right(starts, card.span.start) - 1
        # What differs between its columns and itself makes a card unlike any other.
        apart = () if by_columns[number] == by_cards[number] else (by_columns[number],)
        said[case].append((*_said(card, starts[case]), *apart))
    return said


def _tree(text: bytes) -> Tree[Token] | None:
    try:
        return parser("netlist").parse(text.decode(ENCODING), start="netlist")
    except UnexpectedInput:
        return None


def _said(card: Card, base: int) -> Said:
    def places(one: Parameter) -> Said:
        spans = (one.name_span, one.span)
        return (one.name, one.text, *((s.start - base, s.end - base) for s in spans))

    called = card.target_span
    return (
        *(card.letter, card.name, card.nodes, card.target),
        None if called is None else (called.start - base, called.end - base),
        None if card.value is None else places(card.value),
        *map(places, card.parameters),
        (card.span.start - base, card.span.end - base),
    )


def _different(right: Sequence[tuple[bytes, list[Said]]]) -> tuple[bytes, ...]:
    """Return the cases of a file that the program reads otherwise."""
    read = by_program([text for text, _ in right])
    if read is not None:
        return tuple(t for (t, by_lark), said in zip(right, read, strict=True) if by_lark != said)
    if len(right) == 1:
        return (right[0][0],)
    middle = len(right) // 2
    return (*_different(right[:middle]), *_different(right[middle:]))


def _accepted(wrong: Sequence[bytes]) -> tuple[bytes, ...]:
    """Return the cases that the program accepts."""
    reader = Reader()
    reader.read_main(SourceText(Path("fuzz.sp"), LESSON, "fuzz.sp"))
    return tuple(text for text in wrong if not _is_refused(reader, text))


def _is_refused(reader: Reader, text: bytes) -> bool:
    source = SourceText(Path("fuzz.sp"), text, "fuzz.sp")
    try:
        # A new reader would have to learn anew.
        reader._read_range(Unit(source), 0, len(text))
    except NetlistError:
        return True
    return False
