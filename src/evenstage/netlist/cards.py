"""The table of element cards: where each one begins and how it is read, and cards made of that.

A card costs the table some twelve bytes; its words stay in the text until somebody asks for them.
"""

from __future__ import annotations

import re
from array import array
from bisect import bisect_left, bisect_right
from typing import TYPE_CHECKING

from evenstage.netlist.grammar import terminal
from evenstage.netlist.netlist import Card, CardGroup, Parameter
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.netlist.shapes import Role, Shape
    from evenstage.netlist.statement import Statement
    from evenstage.source import SourceText

    #: What a piece of a card is and its bytes.
    Field = tuple[Role, int, int]

#: Cards handed over at once; more only means more objects alive.
_CHUNK = 4096
_ODD = -1
_WORD = re.compile(rb"[^\x00-\x20,]+")
_NAME = re.compile(rb"[^\x00-\x20=,()'\"{}]+")
_NUMERIC = re.compile(r"[+-]?\.?[0-9]|['\"{(]")

#: Nets of the kinds of element that are kept but not understood.
_NODES = {
    "d": 2,
    "b": 2,
    "f": 2,
    "h": 2,
    "w": 2,
    "q": 3,
    "j": 3,
    "z": 3,
    "e": 4,
    "g": 4,
    "s": 4,
    "t": 4,
}


class CardTable:
    """All element cards of a netlist in reading order; filled by the reader, then left alone."""

    def __init__(self) -> None:
        self._starts = array("q")
        self._shape_of = array("i")
        self._shapes: list[Shape] = []
        self._odd: dict[int, Statement] = {}
        self._segments: list[int] = []
        self._segment_places: list[tuple[SourceText, bytes, str]] = []

    def __len__(self) -> int:
        return len(self._starts)

    def begin_segment(self, source: SourceText, text: bytes, scope: str) -> None:
        """Say where the cards to come stand: file, canonical text, subcircuit."""
        if self._segments and self._segments[-1] == len(self):
            self._segments.pop()
            self._segment_places.pop()
        self._segments.append(len(self))
        self._segment_places.append((source, text, scope))

    def add_shape(self, shape: Shape) -> int:
        """Take note of a shape and return its number."""
        self._shapes.append(shape)
        return len(self._shapes) - 1

    def append(self, start: int, shape: int) -> None:
        """Add a card that has a shape."""
        self._starts.append(start)
        self._shape_of.append(shape)

    def append_odd(self, statement: Statement) -> None:
        """Add a card that has none, as Lark read it."""
        self._odd[len(self)] = statement
        self.append(statement.marks[0].start, _ODD)

    def _place(self, number: int) -> tuple[SourceText, bytes, str]:
        return self._segment_places[bisect_right(self._segments, number) - 1]

    def __getitem__(self, number: int) -> Card:
        """Make the card of a number."""
        if not 0 <= number < len(self):
            raise IndexError(number)
        source, _, scope = self._place(number)
        return _card(number, self._fields(number), source, scope)

    def _fields(self, number: int) -> list[Field]:
        source, text, _ = self._place(number)
        shape = self._shape_of[number]
        if shape == _ODD:
            return _fields_of_statement(self._odd[number], source)
        return _fields_of_shape(self._shapes[shape], text, self._starts[number])

    def name(self, number: int) -> str:
        """Return the name of a card as written, without making the card."""
        source = self._place(number)[0]
        match = _NAME.match(source.data, self._starts[number])
        assert match is not None
        return match[0].decode("utf-8", "surrogateescape")

    def scope(self, number: int) -> str:
        """Return the lower-case name of the subcircuit that holds a card; empty: top level."""
        return self._place(number)[2]

    def node_names(self, numbers: Sequence[int], positions: Sequence[int]) -> list[str]:
        """Return nets as written, each by card number and position on the card."""
        return list(map(self._node, numbers, positions))

    def _node(self, number: int, position: int) -> str:
        source, text, _ = self._place(number)
        kind = self._shape_of[number]
        shape = None if kind == _ODD else self._shapes[kind]
        if shape is None or "nodes" in shape.roles:
            nodes = [field for field in self._fields(number) if field[0] == "node"]
            _, start, end = nodes[position]
        else:
            match = shape.groups.match(text, self._starts[number])
            assert match is not None
            # The nets follow the name, which is the first group.
            start, end = match.span(position + 2)
        return source.data[start:end].decode("utf-8", "surrogateescape")

    def groups(self, numbers: Sequence[int]) -> Iterator[CardGroup]:
        """Give the cards of ascending numbers, grouped by shape; see ``CardStore``."""
        for first in range(0, len(numbers), _CHUNK):
            yield from self._chunk(numbers[first : first + _CHUNK])

    def _chunk(self, numbers: Sequence[int]) -> Iterator[CardGroup]:
        """Give some cards, those of one file at a time."""
        first = 0
        while first < len(numbers):
            segment = bisect_right(self._segments, numbers[first])
            beyond = self._segments[segment] if segment < len(self._segments) else len(self)
            last = bisect_left(numbers, beyond, first)
            text = self._segment_places[segment - 1][1]
            yield from self._segment_groups(numbers[first:last], text)
            first = last

    def _segment_groups(self, numbers: Sequence[int], text: bytes) -> Iterator[CardGroup]:
        by_shape: dict[int, list[int]] = {}
        shape_of = self._shape_of
        for number in numbers:
            by_shape.setdefault(shape_of[number], []).append(number)
        for shape, members in by_shape.items():
            if shape == _ODD:
                yield from (self._odd_group(number) for number in members)
            else:
                yield from self._shaped_groups(self._shapes[shape], members, text)

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

    def _shaped_groups(self, shape: Shape, numbers: list[int], text: bytes) -> Iterator[CardGroup]:
        match = shape.groups.match
        starts = self._starts
        rows = [match(text, starts[number]).groups() for number in numbers]  # type: ignore[union-attr]  # each start was matched by this shape before
        columns = dict(enumerate(zip(*rows, strict=True)))
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
            values=_main_argument(arguments),
            parameters=dict(zip(shape.keys, values, strict=True)),
        )


def _main_argument(arguments: list[tuple[bytes, ...]]) -> Sequence[bytes]:
    """Return the values of R and C cards from their unnamed arguments (value, model)."""
    if len(arguments) < 2:
        return arguments[0] if arguments else ()
    return [
        row[_value_position([w.decode("latin-1") for w in row])]
        for row in zip(*arguments, strict=True)
    ]


def _value_position(arguments: list[str]) -> int:
    """Return which of the unnamed arguments is the value: the first that looks like one."""
    return next((i for i, text in enumerate(arguments) if _NUMERIC.match(text)), 0)


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


def _fields_of_shape(shape: Shape, text: bytes, start: int) -> list[Field]:
    match = shape.groups.match(text, start)
    assert match is not None
    fields: list[Field] = []
    for group, role in enumerate(shape.roles, 1):
        first, last = match.span(group)
        if role == "nodes":
            words = [word.span() for word in _WORD.finditer(text, first, last)]
            fields += [("node", *span) for span in words]
        else:
            fields.append((role, first, last))
    return fields if "target" in shape.roles else _last_node_is_target(shape.letter, fields)


def _last_node_is_target(letter: str, fields: list[Field]) -> list[Field]:
    if letter != "x":
        return fields
    last = max(i for i, field in enumerate(fields) if field[0] == "node")
    fields[last] = ("target", *fields[last][1:])
    return fields


def _fields_of_statement(statement: Statement, source: SourceText) -> list[Field]:
    """Give the words of a card that has no shape their roles."""
    marks = statement.marks
    letter = chr(source.data[marks[0].start]).lower()
    fields: list[Field] = [("name", marks[0].start, marks[0].end)]
    wanted = _node_count(statement.rule, letter)
    slashed = any(mark.terminal == "SLASH" for mark in marks)
    position = 1
    while position < len(marks):
        mark = marks[position]
        if marks[position + 1 : position + 2] and marks[position + 1].terminal == "EQUAL":
            fields.append(("key", mark.start, mark.end))
            if position + 2 < len(marks):
                fields.append(("value", *marks[position + 2][1:]))
            position += 3
            continue
        if mark.terminal not in {"SLASH", "PARAMS", "EQUAL", "OPEN", "CLOSE", "ODD", "OFF"}:
            nodes = sum(role == "node" for role, *_ in fields)
            before = marks[position - 1].terminal
            fields.append((_loose_role(letter, nodes, wanted, before), mark.start, mark.end))
        position += 1
    return fields if slashed else _last_node_is_target(letter, fields)


def _node_count(rule: str, letter: str) -> int:
    if rule == "call":
        return 1 << 30
    return {"transistor": 4, "passive": 2, "source": 2}.get(rule, _NODES.get(letter, 0))


def _loose_role(letter: str, nodes: int, wanted: int, before: str) -> Role:
    if before == "SLASH":
        return "target"
    if nodes < wanted:
        return "node"
    return "target" if letter in "md" else "argument"


def _card(number: int, fields: list[Field], source: SourceText, scope: str) -> Card:
    """Put a card together."""

    def span(field: Field) -> Span:
        return Span(source, field[1], field[2])

    of_role = {role: [f for f in fields if f[0] == role] for role in ("node", "target", "argument")}
    pairs = [(fields[i], fields[i + 1]) for i in range(len(fields) - 1) if fields[i][0] == "key"]
    target = next(iter(of_role["target"]), None)
    name = span(fields[0]).text
    return Card(
        number=number,
        letter=name[0].lower(),
        name=name,
        nodes=tuple(span(field).text for field in of_role["node"]),
        target="" if target is None else span(target).text,
        target_span=None if target is None else span(target),
        value=_value(name[0].lower(), [span(field) for field in of_role["argument"]]),
        parameters=tuple(parameter(span(key), span(value)) for key, value in pairs),
        span=Span(source, fields[0][1], max(field[2] for field in fields)),
        scope=scope,
    )


def parameter(name: Span | None, value: Span) -> Parameter:
    """Return a parameter from the bytes of its name (None: it has none) and of its value."""
    text = plain_text(value)
    if name is None:
        return Parameter("", text, Span(value.source, value.start, value.start), value)
    return Parameter(name.text.lower(), text, name, value)


def plain_text(span: Span) -> str:
    """Return the text of some bytes of a card, the joints of continuation lines taken out."""
    text = span.text
    return _joint().sub(" ", text) if "\n" in text or "\r" in text else text


def _joint() -> re.Pattern[str]:
    return re.compile(terminal("_CONTINUATION"))


def _value(letter: str, arguments: list[Span]) -> Parameter | None:
    """Return the unnamed value of an R, C, V ... card."""
    texts = [plain_text(span) for span in arguments]
    if letter in "vi":
        first = next((i for i, text in enumerate(texts[:-1]) if text.lower() == "dc"), -1)
        plain = len(texts) == 1 or (texts and _NUMERIC.match(texts[0]))
        position = first + 1 if first >= 0 or plain else None
    else:
        position = _value_position(texts) if texts else None
    return None if position is None else parameter(None, arguments[position])
