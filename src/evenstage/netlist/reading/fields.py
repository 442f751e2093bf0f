"""The pieces of one card with what each of them is, and the card made of them."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

from evenstage.netlist.grammar import terminal
from evenstage.netlist.netlist import Card, Parameter
from evenstage.source import Span

if TYPE_CHECKING:
    from evenstage.netlist.reading.shapes import Role, Shape
    from evenstage.netlist.reading.statement import Statement
    from evenstage.source import SourceText

    #: What a piece of a card is and its bytes.
    Field = tuple[Role, int, int]

_WORD = re.compile(rb"[^\x00-\x20,]+")
_NUMERIC = re.compile(r"[+-]?\.?[0-9]|['\"{(]")

#: Nets of the kinds of element that are kept but not understood.
_NODES: Final = {
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


def fields_of_shape(shape: Shape, text: bytes, start: int) -> list[Field]:
    """Return the pieces of a card of a shape that begins at a place of a canonical text."""
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


def fields_of_statement(statement: Statement, source: SourceText) -> list[Field]:
    """Return the pieces of a card that Lark has read."""
    marks = statement.marks
    letter = chr(source.data[marks[0].start]).lower()
    fields: list[Field] = [("name", marks[0].start, marks[0].end)]
    wanted = _node_count(statement, letter)
    slashed = any(mark.terminal == "SLASH" for mark in marks)
    nodes, position = 0, 1
    while position < len(marks):
        mark = marks[position]
        if marks[position + 1 : position + 2] and marks[position + 1].terminal == "EQUAL":
            fields.append(("key", mark.start, mark.end))
            if position + 2 < len(marks):
                fields.append(("value", *marks[position + 2][1:]))
            position += 3
            continue
        if mark.terminal not in {"SLASH", "PARAMS", "EQUAL", "OPEN", "CLOSE", "ODD", "OFF"}:
            role = _loose_role(letter, nodes, wanted, marks[position - 1].terminal)
            nodes += role == "node"
            fields.append((role, mark.start, mark.end))
        position += 1
    return fields if slashed else _last_node_is_target(letter, fields)


def _node_count(statement: Statement, letter: str) -> int:
    if statement.rule == "call":
        return 1 << 30
    if statement.rule == "transistor":
        return statement.pins
    return {"passive": 2, "source": 2}.get(statement.rule, _NODES.get(letter, 0))


def _loose_role(letter: str, nodes: int, wanted: int, before: str) -> Role:
    if before == "SLASH":
        return "target"
    if nodes < wanted:
        return "node"
    return "target" if letter in "md" else "argument"


def card_of(number: int, fields: list[Field], source: SourceText, scope: str) -> Card:
    """Return the card that some pieces make."""

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


def _value_position(arguments: list[str]) -> int:
    """Return which of the unnamed arguments is the value: the first that looks like one."""
    return next((i for i, text in enumerate(arguments) if _NUMERIC.match(text)), 0)
