"""How a file begins: that it is text, and where the first line is a title."""

from __future__ import annotations

import re
from typing import Final, Literal

from evenstage.errors import NetlistError, Notice
from evenstage.netlist.grammar import ENCODING, terminal
from evenstage.netlist.reading.canonical import BOM
from evenstage.netlist.reading.statement import Statement, parse_statement
from evenstage.source import SourceText, Span

FirstLine = Literal["title", "card"]

#: Bytes of the first line that are looked at to tell a title from a card.
_LOOK: Final = 1 << 14
#: A first line that is not blank.
_FIRST_LINE: Final = re.compile(rb"[\x00-\x09\x0b\x0c\x0e-\x20]*+[^\r\n]++")
#: Cards of a kind with a fixed form.
_FIXED: Final = frozenset({"transistor", "call", "passive", "source"})


def check_text(source: SourceText) -> None:
    """Refuse what is no text.

    Raises
    ------
    NetlistError
        If the bytes hold a NUL.
    """
    if source.data.startswith((b"\xff\xfe", b"\xfe\xff")):
        message = f"'{source.label}' is in UTF-16; save it as UTF-8"
        raise NetlistError(message, code="not-text")
    if b"\0" in source.data:
        raise NetlistError(f"'{source.label}' is not a text file", code="not-text")


def after_title(source: SourceText, first_line: FirstLine | None) -> tuple[int, Notice | None]:
    """Return where the first line after the title begins; 0 if there is no title.

    Parameters
    ----------
    source : SourceText
        The main file.
    first_line : {"title", "card"}, optional
        What it begins with; None: a title, unless it is plainly something else.

    Returns
    -------
    start : int
        There.
    notice : Notice, optional
        If the title could be a card.
    """
    line = _FIRST_LINE.match(source.data)
    if first_line is not None:
        return (0 if line is None or first_line == "card" else line.end()), None
    title = re.compile(terminal("TITLE").encode(ENCODING), re.IGNORECASE)
    if line is None or title.match(source.data, 0, min(line.end(), _LOOK)) is None:
        return 0, None
    start = len(BOM) if source.data.startswith(BOM) else 0
    statement = _element_or_none(source, start, line.end())
    if statement is None:
        return line.end(), None
    if statement.rule == "call" and _calls_defined(statement, source):
        return 0, None
    message = (
        "the first line is taken as the title, though it could be a card; "
        'first_line = "card" in the brief overrules this'
    )
    return line.end(), Notice("title", message, Span(source, start, line.end()).place)


def _element_or_none(source: SourceText, start: int, end: int) -> Statement | None:
    """Return a line as an element card of a kind with a fixed form, if it could be one."""
    if end - start > _LOOK:
        return None
    lead = len(source.data[start:end]) - len(source.data[start:end].lstrip())
    try:
        statement = parse_statement(source, start + lead, end)
    except NetlistError:
        return None
    return statement if statement.rule in _FIXED else None


def _calls_defined(statement: Statement, source: SourceText) -> bool:
    """Tell whether the subcircuit a line would call is defined in the same file."""
    words = [mark for mark in statement.marks if mark.terminal == "WORD"]
    name = re.escape(source.data[words[-1].start : words[-1].end])
    return re.search(rb"(?im)^[ \t]*\.subckt[ \t]+" + name + rb"(?![^\s])", source.data) is not None
