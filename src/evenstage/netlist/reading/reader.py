"""Walks through the text of a netlist, card by card and file by file."""

from __future__ import annotations

import re
from functools import cache
from typing import TYPE_CHECKING, Final

from evenstage.errors import Notice
from evenstage.netlist.expression import FUNCTIONS
from evenstage.netlist.functions import Function, read_function
from evenstage.netlist.grammar import ENCODING, terminal
from evenstage.netlist.netlist import Netlist
from evenstage.netlist.parameters import Scope
from evenstage.netlist.reading.blocks import Blocks
from evenstage.netlist.reading.brackets import plain_bracket
from evenstage.netlist.reading.branches import Branches
from evenstage.netlist.reading.cards import CardTable
from evenstage.netlist.reading.complaints import foreign_card
from evenstage.netlist.reading.conditions import holds
from evenstage.netlist.reading.fields import parameter, plain_text
from evenstage.netlist.reading.includes import Includes, section_range
from evenstage.netlist.reading.lessons import learn
from evenstage.netlist.reading.models import ModelCards, WrittenModel, numbers_among
from evenstage.netlist.reading.opening import after_title, check_text
from evenstage.netlist.reading.scopes import Scopes
from evenstage.netlist.reading.statement import Statement, parse_statement
from evenstage.netlist.reading.stored import ShapeColumns
from evenstage.progress import tell
from evenstage.source import SourceText, Span

if TYPE_CHECKING:
    from collections.abc import Mapping
    from pathlib import Path

    from evenstage.netlist.netlist import Parameter
    from evenstage.netlist.reading.opening import FirstLine
    from evenstage.netlist.reading.statement import Mark

#: A sequence of terminals is learned when it is met for this time: an expression takes as long to
#: compile as some fifty cards take to parse.
_LEARNED_AT: Final = 3
_BLANKS: Final = bytes(range(33)) + b","
_SKIP = re.compile(rb"[\x00-\x20,]*+")
_ELEMENTS: Final = frozenset({"transistor", "call", "passive", "source", "element"})


class Unit:
    """One file: its bytes, and its canonical text in blocks."""

    def __init__(self, source: SourceText) -> None:
        self.source = source
        self.blocks = Blocks(source)

    @property
    def text(self) -> bytes:
        """The canonical text of the whole file; made for few files."""
        return self.blocks.whole

    def span(self, mark: Mark) -> Span:
        """Return the bytes of a word."""
        return Span(self.source, mark.start, mark.end)


class Reader:
    """Reads one netlist; ``read_main`` once, then ``finish``."""

    def __init__(self) -> None:
        self._table = CardTable()
        self._scopes = Scopes()
        self._includes = Includes()
        self._learned: list[list[ShapeColumns]] = [[] for _ in range(256)]
        self._met: dict[tuple[str, ...], int] = {}
        self._models = ModelCards()
        self._globals: dict[str, str] = {}
        self._functions: dict[str, Function] = {}
        self._branches = Branches(self._holds)
        self._options: list[Parameter] = []
        self._unknown: dict[str, tuple[int, Span]] = {}
        self._notices: list[Notice] = []

    def read_main(
        self, source: SourceText, name: Path | None = None, first_line: FirstLine | None = None
    ) -> None:
        """Read the main file, whose first line may be a title.

        Parameters
        ----------
        source : SourceText
            The file.
        name : Path, optional
            Where it was asked for, absolute, if that is a link to it.
        first_line : {"title", "card"}, optional
            What it begins with; None: what it looks like.

        Raises
        ------
        NetlistError
            If it, or a file it includes, is no netlist.
        """
        self._includes.add(source, name or source.path)
        check_text(source)
        start, notice = after_title(source, first_line)
        self._notices += [] if notice is None else [notice]
        unit = Unit(source)
        with self._includes.entered(source, None, None):
            self._read_range(unit, start, len(source.data))

    # The loop over the cards of a file.

    def _read_range(self, unit: Unit, position: int, end: int) -> None:
        """Read the cards of part of a file, up to its ``.end``."""
        depth, conditions = self._scopes.depth, self._branches.depth
        self._begin_segment(unit)
        while position < end:
            tell("reading", position / len(unit.source.data))
            position = self._read_block(unit, position, end)
            # The shapes that are met most are tried first.
            for shapes in filter(None, self._learned):
                shapes.sort(key=ShapeColumns.waiting, reverse=True)
            self._table.store()
        self._branches.check_closed(conditions)
        self._scopes.check_closed(depth)
        self._scopes.check_not_below(depth, unit.source)

    def _read_block(self, unit: Unit, position: int, end: int) -> int:
        """Read the cards of a block from a position on; return where the next block begins."""
        base, text, block_end = unit.blocks.at(position)
        position = max(position, base)
        if position >= end:
            return end
        text = text[: end - base]
        skipped = _SKIP.match(text, position - base)
        assert skipped is not None
        place, learned = skipped.end(), self._learned
        size = len(text)
        starts: list[int] = []
        kinds: list[int] = []
        while place < size:
            for shape in learned[text[place]]:
                found = shape.match(text, place)
                if found is not None:
                    starts.append(place)
                    kinds.append(shape.number)
                    shape.take(found.groups())
                    place = found.end()
                    break
            else:
                self._table.extend(base, starts, kinds)
                place = self._read_card(unit, base + place, end) - base
        self._table.extend(base, starts, kinds)
        return max(base + place, min(block_end, end))

    def _begin_segment(self, unit: Unit) -> None:
        self._table.begin_segment(unit.blocks, self._scopes.current)

    def _read_card(self, unit: Unit, position: int, end: int) -> int:
        """Read one card through the grammar; return where the next one begins."""
        base, text, _ = unit.blocks.at(position)
        line_end = text.find(b"\n", position - base)
        if line_end < 0:
            line_end = len(text)
        card_end = position + len(text[position - base : line_end].rstrip(_BLANKS))
        line_end += base
        block = _block_end(unit, position)
        if block is not None:
            self._note_unknown(Span(unit.source, position, _word_end(unit.source.data, position)))
            following = block
        else:
            plain = plain_bracket(text, position - base)
            statement = plain.moved(base) if plain else None
            statement = statement or parse_statement(unit.source, position, card_end)
            following = self._take(unit, statement, line_end, end)
        if following >= base + len(text):
            return following
        skipped = _SKIP.match(text, following - base)
        assert skipped is not None
        return base + skipped.end()

    def _take(self, unit: Unit, statement: Statement, line_end: int, end: int) -> int:
        """Do what a card says; return where reading goes on."""
        if statement.rule in _ELEMENTS:
            self._take_element(unit, statement)
            return line_end
        if statement.rule == "end":
            return end
        if statement.rule == "ends":
            self._take_ends(unit, statement, line_end)
            return line_end
        if statement.rule == "branch":
            return self._take_branch(unit, statement, range(line_end, end))
        if statement.rule == "library" and len(statement.marks) == 2:
            return section_range(unit.source, unit.text, unit.span(statement.marks[1])).stop
        _DOT_CARDS[statement.rule](self, unit, statement)
        return line_end

    def _take_element(self, unit: Unit, statement: Statement) -> None:
        block = unit.blocks.at(statement.marks[0].start)
        letter = chr(block.text[statement.marks[0].start - block.start])
        form = (
            letter,
            *(mark.terminal for mark in statement.marks),
            *(p.name for p in _pairs(unit, statement.marks)),
        )
        self._met[form] = self._met.get(form, 0) + 1
        shape = (
            learn(statement.moved(-block.start), block.text)
            if self._met[form] == _LEARNED_AT
            else None
        )
        if shape is None:
            self._table.append_odd(statement)
            return
        stored = self._table.add_shape(shape)
        found = shape.row.match(block.text, statement.marks[0].start - block.start)
        assert found is not None
        stored.take(found.groups())
        self._learned[ord(shape.letter)].append(stored)
        self._table.extend(statement.marks[0].start, [0], [stored.number])

    # Dot cards.

    def _take_definition(self, unit: Unit, statement: Statement) -> None:
        marks = statement.marks
        words = [
            unit.span(mark)
            for mark, following in zip(marks, (*marks[1:], None), strict=True)
            if mark.terminal == "WORD" and (following is None or following.terminal != "EQUAL")
        ]
        header = Span(unit.source, marks[0].start, marks[-1].end)
        self._scopes.open(header, words[0], tuple(words[1:]), _pairs(unit, marks), len(self._table))
        self._begin_segment(unit)

    def _take_ends(self, unit: Unit, statement: Statement, line_end: int) -> None:
        marks = statement.marks
        card = Span(unit.source, marks[0].start, marks[-1].end)
        name = unit.span(marks[1]) if len(marks) > 1 else None
        after = line_end + (2 if unit.source.data[line_end : line_end + 2] == b"\r\n" else 1)
        self._scopes.close(card, name, min(after, len(unit.source.data)), len(self._table))
        self._begin_segment(unit)

    def _take_assignments(self, unit: Unit, statement: Statement) -> None:
        marks = statement.marks
        self._scopes.assign(_pairs(unit, marks))
        for i, mark in enumerate(marks):
            if mark.terminal == "OPEN":
                close = next(j for j in range(i, len(marks)) if marks[j].terminal == "CLOSE")
                self._define(Span(unit.source, marks[i - 1].start, marks[close + 2].end))

    def _take_function(self, unit: Unit, statement: Statement) -> None:
        marks = statement.marks
        self._define(Span(unit.source, marks[1].start, marks[-1].end))

    def _define(self, words: Span) -> None:
        function = read_function(plain_text(words), words)
        self._functions[function.name] = function
        if function.name in FUNCTIONS:
            message = f"'{function.name}' is a function already, and keeps its meaning"
            self._notices.append(Notice("function-kept", message, words.place, (function.name,)))

    def _take_branch(self, unit: Unit, statement: Statement, after: range) -> int:
        """Read or pass over what a condition holds."""
        word, *rest = statement.marks
        condition = Span(unit.source, rest[0].start, rest[-1].end) if rest else None
        return self._branches.take(unit.span(word), condition, unit.text, after)

    def _holds(self, condition: Span) -> bool:
        return holds(condition, self._scopes.assignments, self._functions)

    def _take_foreign(self, unit: Unit, statement: Statement) -> None:
        raise foreign_card(unit.span(statement.marks[0]))

    def _take_model(self, unit: Unit, statement: Statement) -> None:
        marks = statement.marks
        name, kind = unit.span(marks[1]).text, unit.span(marks[2]).text
        span = Span(unit.source, marks[0].start, marks[-1].end)
        self._models.add(self._scopes.current, WrittenModel(name, kind, _pairs(unit, marks), span))

    def _take_global(self, unit: Unit, statement: Statement) -> None:
        for mark in statement.marks[1:]:
            name = unit.span(mark).text
            self._globals.setdefault(name, name)

    def _take_option(self, unit: Unit, statement: Statement) -> None:
        self._options += _pairs(unit, statement.marks)

    def _take_other(self, unit: Unit, statement: Statement) -> None:
        self._note_unknown(unit.span(statement.marks[0]))

    def _note_unknown(self, word: Span) -> None:
        kind = word.text.lower()
        count, first = self._unknown.get(kind, (0, word))
        self._unknown[kind] = (count + 1, first)

    def _take_include(self, unit: Unit, statement: Statement) -> None:
        self._read_file(unit, unit.span(statement.marks[1]), None)

    def _take_library(self, unit: Unit, statement: Statement) -> None:
        self._read_file(unit, unit.span(statement.marks[1]), unit.span(statement.marks[2]))

    def _read_file(self, unit: Unit, name: Span, section: Span | None) -> None:
        source = self._includes.find(name)
        with self._includes.entered(source, section, name):
            check_text(source)
            included = self._includes.unit(source, Unit)
            places = range(len(source.data))
            if section is not None:
                places = section_range(source, included.text, section, wanted=True)
            self._read_range(included, places.start, places.stop)
        self._begin_segment(unit)

    # The result.

    @property
    def clash(self) -> Span | None:
        """The first port that differs from another of its definition by case alone."""
        return self._scopes.clash

    @property
    def word_numbers(self) -> Mapping[bytes, int]:
        """The numbers of all words on the cards, until ``release``."""
        return self._table.word_numbers

    def release(self) -> None:
        """Forget what the netlist does not need."""
        self._table.release()

    def finish(self) -> Netlist:
        """Return what was read."""
        top = self._scopes.finish(len(self._table))
        callees, renamed = self._scopes.settle()
        self._table.rename_scopes(renamed)
        ports = (port for one in self._scopes.subcircuits.values() for port in one.ports)
        self._table.finish(("0", *self._globals.values(), *ports))
        scope = Scope(assignments=top.assignments, functions=self._functions)
        models, local_models = self._models.settle(self._scopes, renamed, scope)
        return Netlist(
            sources=self._includes.sources,
            names=self._includes.names,
            rooted=frozenset(self._includes.rooted),
            callees=callees,
            subcircuits=self._scopes.subcircuits,
            top=top,
            models=models,
            local_models=local_models,
            global_names=tuple(self._globals.values()),
            functions=self._functions,
            options=numbers_among(self._options, scope),
            notices=(*self._notices, *self._scopes.notices, *self._unknown_notices()),
            _cards=self._table,
        )

    def _unknown_notices(self) -> list[Notice]:
        return [
            Notice("not-understood", _unknown_message(kind, count), first.place, (kind,))
            for kind, (count, first) in self._unknown.items()
        ]


_DOT_CARDS: Final = {
    "definition": Reader._take_definition,  # noqa: SLF001 - the table belongs to the class
    "assignments": Reader._take_assignments,  # noqa: SLF001
    "model": Reader._take_model,  # noqa: SLF001
    "global": Reader._take_global,  # noqa: SLF001
    "option": Reader._take_option,  # noqa: SLF001
    "include": Reader._take_include,  # noqa: SLF001
    "library": Reader._take_library,  # noqa: SLF001
    "function": Reader._take_function,  # noqa: SLF001
    "foreign": Reader._take_foreign,  # noqa: SLF001
    "endl": Reader._take_other,  # noqa: SLF001
    "other": Reader._take_other,  # noqa: SLF001
}


def _block_end(unit: Unit, position: int) -> int | None:
    """Return where a block in another language ends, if one begins here."""
    if unit.source.data[position] != ord("."):
        return None
    matches = (pattern.match(unit.source.data, position) for pattern in _foreign_blocks())
    return next((match.end() for match in matches if match is not None), None)


@cache
def _foreign_blocks() -> tuple[re.Pattern[bytes], ...]:
    names = ("CONTROL", "DATA", "ALTER")
    return tuple(re.compile(terminal(n).encode(ENCODING), re.IGNORECASE) for n in names)


def _word_end(text: bytes, position: int) -> int:
    match = re.compile(rb"[^\x00-\x20]*").match(text, position)
    assert match is not None
    return match.end()


def _pairs(unit: Unit, marks: tuple[Mark, ...]) -> tuple[Parameter, ...]:
    """Return the parameters among the words of a card."""
    return tuple(
        parameter(unit.span(marks[i - 1]), unit.span(marks[i + 1]))
        for i, mark in enumerate(marks)
        if mark.terminal == "EQUAL" and 0 < i < len(marks) - 1 and marks[i - 1].terminal != "CLOSE"
    )


def _unknown_message(kind: str, count: int) -> str:
    cards = "card" if count == 1 else "cards"
    return f"{count} '{kind}' {cards} kept, but not understood"
