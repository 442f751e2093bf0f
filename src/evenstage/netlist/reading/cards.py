"""The table of element cards: where each one begins and how it is read, and cards made of that.

Its nets, model and values are numbers in columns; their spelling stays in the text until somebody
asks for it.
"""

from __future__ import annotations

import re
from array import array
from bisect import bisect_left, bisect_right
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from evenstage.netlist.intake import Values, WordList, Words
from evenstage.netlist.netlist import CardColumns, CardGroup, ValuePlaces
from evenstage.netlist.reading.fields import card_of, fields_of_shape, fields_of_statement
from evenstage.netlist.reading.stored import ShapeColumns, main_argument

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Mapping, Sequence

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.netlist import Card
    from evenstage.netlist.reading.blocks import Blocks
    from evenstage.netlist.reading.fields import Field
    from evenstage.netlist.reading.shapes import Shape
    from evenstage.netlist.reading.statement import Statement

#: Cards handed over at once; more only means more objects alive.
_CHUNK = 4096
#: Cards of a shape whose words are turned into numbers together: fewer would not pay.
_LOT = 128
_ODD = -1
#: Spreads small numbers over all bits.
_MIXER = np.int64(0x1E3779B97F4A7C15)
_WORD = re.compile(rb"[^\x00-\x20,]+")
_NAME = re.compile(rb"[^\x00-\x20=,()'\"{}]+")


class CardTable:
    """All element cards of a netlist in reading order; filled by the reader, then left alone."""

    def __init__(self) -> None:
        self.values = Values()
        self.words = WordList(())
        self._starts = array("q")
        self._shape_of = array("i")
        self._shapes: list[Shape] = []
        self._stored: list[ShapeColumns] = []
        self._numbers: list[IntArray] = []
        self._odd: dict[int, Statement] = {}
        self._odd_columns: dict[int, CardColumns] = {}
        self._segments: list[int] = []
        self._segment_places: list[tuple[Blocks, str]] = []
        self.word_numbers = Words()
        self._kept: dict[bytes, int] = {}
        self._scopes_with_repeats: frozenset[str] = frozenset()

    def __len__(self) -> int:
        return len(self._starts)

    def begin_segment(self, blocks: Blocks, scope: str) -> None:
        """Say where the cards to come stand: file, subcircuit."""
        if self._segments and self._segments[-1] == len(self):
            self._segments.pop()
            self._segment_places.pop()
        self._segments.append(len(self))
        self._segment_places.append((blocks, scope))

    def rename_scopes(self, renamed: Mapping[str, str]) -> None:
        """Give subcircuits other keys."""
        if renamed:
            self._segment_places = [(b, renamed.get(s, s)) for b, s in self._segment_places]

    def add_shape(self, shape: Shape) -> ShapeColumns:
        """Take note of a shape and return what takes its cards."""
        self._shapes.append(shape)
        self._stored.append(ShapeColumns(len(self._stored), shape, self.word_numbers, self.values))
        return self._stored[-1]

    def extend(self, base: int, starts: list[int], shapes: list[int]) -> None:
        """Add cards that have a shape and empty the lists; their words are in the rows of it.

        Parameters
        ----------
        base : int
            What the starts count from.
        starts, shapes : list of int
            Of each card.
        """
        self._starts.extend(map(base.__add__, starts))
        self._shape_of.extend(shapes)
        starts.clear()
        shapes.clear()

    def store(self, waiting: int | None = None) -> None:
        """Turn the words of cards into numbers, where so many cards of a shape wait."""
        waiting = _LOT if waiting is None else waiting
        for stored in self._stored:
            if stored.waiting() >= waiting:
                stored.store()

    def append_odd(self, statement: Statement) -> None:
        """Add a card that has no shape, as Lark read it."""
        number = len(self)
        self._odd[number] = statement
        self.extend(statement.marks[0].start, [0], [_ODD])
        self._odd_columns[number] = self._numbered(self._odd_group(number))

    def _numbered(self, group: CardGroup) -> CardColumns:
        """Turn the words of a group into numbers."""
        number = self.word_numbers.__getitem__
        take = self.values.kept if group.letter == "x" else self.values.numbers_of
        texts = {**group.parameters, **({"": group.values} if group.values else {})}
        return CardColumns(
            letter=group.letter,
            numbers=np.array(group.numbers, np.int32),
            nodes=np.array([list(map(number, node)) for node in group.nodes], np.int32).reshape(
                len(group.nodes), len(group.numbers)
            ),
            targets=np.array(list(map(number, group.targets)), np.int32),
            values={name: np.array(list(take(t)), np.int32) for name, t in texts.items()},
        )

    def finish(self, names: Iterable[str]) -> None:
        """Make ready to be asked.

        Parameters
        ----------
        names : iterable of str
            Nets that ``word_number`` will be asked for.
        """
        self.store(waiting=1)
        self._scopes_with_repeats = self._find_repeats()
        words = self.word_numbers
        self._kept = {name: words[name] for name in map(_folded, names)}
        self.words = WordList(words)
        self.values.finish()
        shape_of = np.frombuffer(self._shape_of, np.int32) if len(self) else np.zeros(0, np.int32)
        order = np.argsort(shape_of, kind="stable").astype(np.int32)
        ends = np.cumsum(np.bincount(shape_of + 1, minlength=len(self._shapes) + 1))
        self._numbers = [order[a:b] for a, b in pairwise([0, *ends])]

    def release(self) -> None:
        """Forget the numbers of words nobody will ask for: they are large."""
        self.word_numbers.clear()

    def _find_repeats(self) -> frozenset[str]:
        """Return the scopes in which several cards may have one name."""
        shape_of = np.array(self._shape_of, np.int32)
        hashes = np.empty(len(self), np.int64)
        for shape, stored in enumerate(self._stored):
            hashes[shape_of == shape] = np.array(stored.hashes, np.int64)
            del stored.hashes
        for number in self._odd:
            hashes[number] = hash(_folded(self.name(number)))
        scopes = Words()
        of_segment = [scopes[_folded(scope)] for _, scope in self._segment_places]
        scope = np.repeat(of_segment, np.diff([*self._segments, len(self)]))
        mixed = hashes ^ (scope * _MIXER)
        ordered = np.sort(mixed)
        repeated = ordered[1:][ordered[1:] == ordered[:-1]]
        names = list(scopes)
        found = np.unique(scope[np.isin(mixed, repeated)]).tolist()
        return frozenset(names[i].decode("utf-8", "surrogateescape") for i in found)

    def word_number(self, name: str) -> int:
        """Return the number of a word by lower-case name, one of those kept."""
        return self._kept[_folded(name)]

    def may_repeat(self, scope: str) -> bool:
        """Tell whether several cards of a subcircuit may have one name."""
        return scope in self._scopes_with_repeats

    def _place(self, number: int) -> tuple[Blocks, str]:
        return self._segment_places[bisect_right(self._segments, number) - 1]

    def __getitem__(self, number: int) -> Card:
        """Make the card of a number."""
        if not 0 <= number < len(self):
            raise IndexError(number)
        blocks, scope = self._place(number)
        return card_of(number, self._fields(number), blocks.source, scope)

    def _fields(self, number: int) -> list[Field]:
        blocks, _ = self._place(number)
        shape = self._shape_of[number]
        if shape == _ODD:
            return fields_of_statement(self._odd[number], blocks.source)
        block = blocks.at(self._starts[number])
        fields = fields_of_shape(
            self._shapes[shape], block.text, self._starts[number] - block.start
        )
        return [(role, a + block.start, b + block.start) for role, a, b in fields]

    def name(self, number: int) -> str:
        """Return the name of a card as written, without making the card."""
        source = self._place(number)[0].source
        match = _NAME.match(source.data, self._starts[number])
        assert match is not None
        return match[0].decode("utf-8", "surrogateescape")

    def full_names(self, numbers: Iterable[int]) -> Iterator[str]:
        """Give the names of some cards as written, behind those of their subcircuits."""
        first = beyond = 0
        before, data = "", b""
        for number in numbers:
            if not first <= number < beyond:
                first, beyond = self._segment_of(number)
                blocks, scope = self._place(number)
                before, data = f"{scope}." if scope else "", blocks.source.data
            match = _NAME.match(data, self._starts[number])
            assert match is not None
            yield before + match[0].decode("utf-8", "surrogateescape")

    def scope(self, number: int) -> str:
        """Return the lower-case name of the subcircuit that holds a card; empty: top level."""
        return self._place(number)[1]

    def node_name(self, number: int, position: int) -> str:
        """Return a net as written, by card number and position on the card."""
        blocks, _ = self._place(number)
        kind = self._shape_of[number]
        shape = None if kind == _ODD else self._shapes[kind]
        if shape is None or "nodes" in shape.roles:
            nodes = [field for field in self._fields(number) if field[0] == "node"]
            _, start, end = nodes[position]
        else:
            base, text, _ = blocks.at(self._starts[number])
            match = shape.groups.match(text, self._starts[number] - base)
            assert match is not None
            # The nets follow the name, which is the first group.
            start, end = (base + edge for edge in match.span(position + 2))
        return blocks.source.data[start:end].decode("utf-8", "surrogateescape")

    def value_places(self, numbers: Sequence[int], name: str) -> Iterator[ValuePlaces]:
        """Give the places of one parameter on some cards, those that have it; see ``CardStore``."""
        patterns = [shape.until(name) for shape in self._shapes]
        first = 0
        while first < len(numbers):
            last = bisect_left(numbers, self._segment_of(numbers[first])[1], first)
            found = self._values_on(numbers[first:last], name, patterns)
            yield ValuePlaces(self._place(numbers[first])[0].source, *found)
            first = last

    def _values_on(
        self, numbers: Sequence[int], name: str, patterns: Sequence[re.Pattern[bytes] | None]
    ) -> tuple[IntArray, IntArray, IntArray]:
        """Return which cards of a segment have a parameter, where it starts and where it ends."""
        having, starts, ends = array("q"), array("q"), array("q")
        blocks, _ = self._place(numbers[0])
        shape_of, card_starts = self._shape_of, self._starts
        base = beyond = 0
        for number in numbers:
            shape, start = shape_of[number], card_starts[number]
            pattern = None if shape == _ODD else patterns[shape]
            if pattern is not None:
                if not base <= start < beyond:
                    base, text, _ = blocks.at(start)
                    beyond = base + len(text)
                match = pattern.match(text, start - base)
                assert match is not None
                first, last = match.span(1)
                having.append(number)
                starts.append(base + first)
                ends.append(base + last)
            elif shape == _ODD and (parameter := self[number].parameter(name)) is not None:
                having.append(number)
                starts.append(parameter.span.start)
                ends.append(parameter.span.end)
        return _long_view(having), _long_view(starts), _long_view(ends)

    def _segment_of(self, number: int) -> tuple[int, int]:
        """Return the range of the cards around one that stand in the same place."""
        segment = bisect_right(self._segments, number)
        last = segment == len(self._segments)
        return self._segments[segment - 1], len(self) if last else self._segments[segment]

    def columns(self, numbers: Sequence[int]) -> Iterator[CardColumns]:
        """Give the cards of ascending numbers as columns of numbers; see ``CardStore``."""
        if isinstance(numbers, range):
            yield from self._columns_of_range(numbers.start, numbers.stop)
            return
        cuts = np.flatnonzero(np.diff(numbers) != 1) + 1
        for run in np.split(np.array(numbers), cuts):
            yield from self._columns_of_range(int(run[0]), int(run[-1]) + 1)

    def _columns_of_range(self, begin: int, end: int) -> Iterator[CardColumns]:
        odd = self._numbers[0]
        first, last = np.searchsorted(odd, (begin, end)).tolist()
        yield from (self._odd_columns[number] for number in odd[first:last].tolist())
        for stored, members in zip(self._stored, self._numbers[1:], strict=True):
            first, last = np.searchsorted(members, (begin, end)).tolist()
            if last > first:
                yield from stored.columns(members[first:last], first, last)

    def groups(self, numbers: Sequence[int]) -> Iterator[CardGroup]:
        """Give the cards of ascending numbers, grouped by shape; see ``CardStore``."""
        for first in range(0, len(numbers), _CHUNK):
            yield from self._chunk(numbers[first : first + _CHUNK])

    def _chunk(self, numbers: Sequence[int]) -> Iterator[CardGroup]:
        by_shape: dict[int, list[int]] = {}
        shape_of = self._shape_of
        for number in numbers:
            by_shape.setdefault(shape_of[number], []).append(number)
        for shape, members in by_shape.items():
            if shape == _ODD:
                yield from (self._odd_group(number) for number in members)
            else:
                yield from self._shaped_groups(self._shapes[shape], members)

    def _odd_group(self, number: int) -> CardGroup:
        card = self[number]
        return CardGroup(
            letter=card.letter,
            numbers=[number],
            names=[_folded(card.name)],
            nodes=[[_folded(node)] for node in card.nodes],
            targets=[_folded(card.target)] if card.target else [],
            values=[] if card.value is None else [_folded(card.value.text)],
            parameters={p.name: [_folded(p.text)] for p in card.parameters},
        )

    def _rows(self, shape: Shape, numbers: list[int]) -> Iterator[tuple[bytes, ...]]:
        """Give the words of cards of one shape."""
        for number in numbers:
            start = self._starts[number]
            base, text, _ = self._place(number)[0].at(start)
            match = shape.groups.match(text, start - base)
            assert match is not None
            yield match.groups()

    def _shaped_groups(self, shape: Shape, numbers: list[int]) -> Iterator[CardGroup]:
        columns = dict(enumerate(zip(*self._rows(shape, numbers), strict=True)))
        roles = shape.roles
        if "nodes" in roles:
            yield from _run_groups(shape, numbers, columns)
            return
        values = [columns[i] for i, role in enumerate(roles) if role == "value"]
        arguments = [columns[i] for i, role in enumerate(roles) if role == "argument"]
        yield CardGroup(
            letter=shape.letter,
            numbers=numbers,
            names=columns[0],
            nodes=[columns[i] for i, role in enumerate(roles) if role == "node"],
            targets=next((columns[i] for i, role in enumerate(roles) if role == "target"), ()),
            values=main_argument(arguments),
            parameters=dict(zip(shape.keys, values, strict=True)),
        )


def _run_groups(
    shape: Shape, numbers: list[int], columns: dict[int, tuple[bytes, ...]]
) -> Iterator[CardGroup]:
    """Split calls by their number of nets."""
    roles = shape.roles
    keyed = list(zip(shape.keys, (i for i, r in enumerate(roles) if r == "value"), strict=True))
    run = columns[roles.index("nodes")]
    target = roles.index("target") if "target" in roles else None
    by_length: dict[int, list[tuple[int, list[bytes]]]] = {}
    for row, words in enumerate(run):
        split = _WORD.findall(words)
        by_length.setdefault(len(split), []).append((row, split))
    for members in by_length.values():
        rows = [row for row, _ in members]
        nodes = list(zip(*(words for _, words in members), strict=True))
        targets = nodes.pop() if target is None else [columns[target][row] for row in rows]
        yield CardGroup(
            letter=shape.letter,
            numbers=[numbers[row] for row in rows],
            names=[columns[0][row] for row in rows],
            nodes=nodes,
            targets=targets,
            values=(),
            parameters={key: [columns[i][row] for row in rows] for key, i in keyed},
        )


def _folded(text: str) -> bytes:
    return text.encode("utf-8", "surrogateescape").lower()


def _long_view(column: array[int]) -> IntArray:
    return np.frombuffer(column, np.int64) if column else np.zeros(0, np.int64)
