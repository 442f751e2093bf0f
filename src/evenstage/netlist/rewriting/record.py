"""The comment at the head of a rewritten netlist that later runs read.

It says what the first run found and which limits it kept, so that a later run keeps the same ones
instead of creeping on from the new widths, and a key that tells whether there is anything to do.
One fact per line, ``* evenstage record: <fact> = <value>``, with units for people; 12 digits.
"""

from __future__ import annotations

import hashlib
import re
from dataclasses import dataclass, field
from textwrap import wrap
from typing import TYPE_CHECKING, Final, Literal
from urllib.parse import quote, unquote

from evenstage.netlist.grammar import ENCODING, terminal
from evenstage.netlist.rewriting.comments import BYTE_ORDER_MARK, MARK, line_end
from evenstage.netlist.rewriting.edits import Edit
from evenstage.source import SourceText, Span
from evenstage.units import engineering, parse_quantity

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping
    from pathlib import Path

    from evenstage.netlist.netlist import Netlist

_PREFIX: Final = b"* evenstage record: "
_LINE: Final = re.compile(re.escape(_PREFIX) + rb"[^\r\n]*(?:\r\n|\n|\r|\Z)")
_BLOCK: Final = re.compile(rb"(?:" + _LINE.pattern + rb")+")
_HEADLINE: Final = "limits and figures of the netlist as first drawn; keep these lines"
_DIGITS: Final = 12
_COLUMNS: Final = 60

#: Single facts: attribute, words, unit.
_FACTS: Final = (
    ("delay_before", "worst delay before", "s"),
    ("delay_after", "worst delay after", "s"),
    ("least_delay", "least charged delay within the limits", "s"),
    ("total_width", "total width before", "m"),
    ("switched_cap", "switched capacitance before", "F"),
    ("transition", "slowest transition", "s"),
    ("gap", "gap to the bound", ""),
    ("rounding_loss", "loss by rounding", ""),
)

Bounded = Literal["delay", "width", "energy"]

_BOUND_UNITS: Final[Mapping[Bounded, str]] = {"delay": "s", "width": "m", "energy": "F"}


#: Signs of a corner's name that stand for themselves.
_PLAIN: Final = "+-(),.@/:"


@dataclass(frozen=True, slots=True, kw_only=True)
class CornerRecord:
    """What must be kept in one of several corners.

    Parameters
    ----------
    transition : float
        Slowest transition allowed, s.
    ceilings : Mapping of str to float
        Capacitance allowed on each input, F, by lower-case name.
    """

    transition: float
    ceilings: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, kw_only=True)
class Record:
    """What a run leaves for later ones.

    Parameters
    ----------
    key : str
        From ``digest``.
    delay_before, delay_after : float
        Worst delay of the netlist as first drawn and as written, s.
    least_delay : float
        Least worst charged delay within the limits, s.
    total_width : float
        Of the netlist as first drawn, m.
    switched_cap : float
        Likewise, F.
    transition : float
        Slowest transition allowed, s.
    bound : float
        No widths within the limits do better, s, m or F.
    bound_on : {"delay", "width", "energy"}
        What the bound is about.
    gap, rounding_loss : float
        Relative distance of the answer to the bound; relative loss by rounding.
    ceilings : Mapping of str to float
        Capacitance allowed on each input, F, by lower-case name.
    smallest : Mapping of str to float
        Smallest width of each model, m, by lower-case name.
    corners : Mapping of str to CornerRecord
        By the name of its process, where the netlist was sized for several; delays are then the
        worst over corners, and all else is that of the first.
    """

    key: str
    delay_before: float
    delay_after: float
    least_delay: float
    total_width: float
    switched_cap: float
    transition: float
    bound: float
    bound_on: Bounded
    gap: float
    rounding_loss: float
    ceilings: Mapping[str, float] = field(default_factory=dict)
    smallest: Mapping[str, float] = field(default_factory=dict)
    corners: Mapping[str, CornerRecord] = field(default_factory=dict)


def record_lines(record: Record, end: bytes = b"\n") -> bytes:
    """Return a record as comment lines, each with a line end."""
    lines = [_HEADLINE, *(f"{fact} = {value}" for fact, value in _facts(record))]
    return b"".join(_PREFIX + line.encode("utf-8", "surrogateescape") + end for line in lines)


def find_record(source: SourceText) -> Record | None:
    """Return the record in a file, or None where there is none that can be read.

    Lines that say nothing known are passed over; a fact that is missing or garbled makes the record
    unreadable.
    """
    block = _BLOCK.search(source.data)
    lines = _LINE.findall(block.group()) if block else []
    facts = dict(filter(None, map(_fact, lines)))
    try:
        return _record(facts)
    except (KeyError, ValueError, StopIteration):
        return None


def without_record(data: bytes) -> bytes:
    """Return a file's bytes without record lines."""
    return _LINE.sub(b"", data)


def record_edit(netlist: Netlist, record: Record) -> Edit:
    """Return the edit that puts a record at the head of the main file, in place of an earlier one.

    It stands after the title or a comment in the first line, else before everything. Give it to
    ``rewrite`` before all other edits.
    """
    source = netlist.sources[0]
    block = _BLOCK.search(source.data)
    end = line_end(source.data, 0)
    lines = record_lines(record, end)
    if block is not None:
        return Edit(Span(source, *block.span()), lines)
    place = _place(source.data)
    if (
        place
        and source.data[:place].strip(BYTE_ORDER_MARK)
        and source.data[place - 1] not in b"\r\n"
    ):
        lines = end + lines.removesuffix(end)
    return Edit(Span(source, place, place), lines)


def digest(netlist: Netlist, asked: str, texts: Mapping[Path, bytes] | None = None) -> str:
    """Return a key of a netlist without its record and of what was asked.

    Parameters
    ----------
    netlist : Netlist
        As read.
    asked : str
        All that decides an answer besides the netlist.
    texts : Mapping of Path to bytes, optional
        New contents of sources that change, from ``rewrite``.
    """
    digesting = hashlib.sha256()
    for source in netlist.sources:
        data = without_record((texts or {}).get(source.path, source.data))
        digesting.update(b"%d:" % len(data) + data)
    digesting.update(asked.encode("utf-8", "surrogateescape"))
    return digesting.hexdigest()


def _place(data: bytes) -> int:
    """Return where a new record is put."""
    start = len(BYTE_ORDER_MARK) if data.startswith(BYTE_ORDER_MARK) else 0
    first = re.compile(rb"[^\r\n]*(?:\r\n|\n|\r|\Z)").match(data, start)
    assert first is not None
    line = first.group()
    title = re.compile(terminal("TITLE").encode(ENCODING), re.IGNORECASE).match(line)
    remark = line.startswith(b"*") and not line.startswith((b"*.", MARK))
    return first.end() if title or remark else start


def _facts(record: Record) -> Iterator[tuple[str, str]]:
    """Yield what each line says, and the value as text."""
    for attribute, words, unit in _FACTS:
        yield words, _exact(getattr(record, attribute), unit)
    yield f"bound on {record.bound_on}", _exact(record.bound, _BOUND_UNITS[record.bound_on])
    yield from _by_value("input", record.ceilings, "F")
    yield from _by_value("smallest", record.smallest, "m")
    for number, (name, corner) in enumerate(record.corners.items(), 1):
        yield f"corner {number}", quote(name, _PLAIN)
        yield f"corner {number} slowest transition", _exact(corner.transition, "s")
        yield from _by_value(f"corner {number} input", corner.ceilings, "F")
    yield "key", record.key


def _by_value(kind: str, values: Mapping[str, float], unit: str) -> Iterator[tuple[str, str]]:
    """Yield facts about names, those of one value together as far as a line goes."""
    names_of: dict[str, list[str]] = {}
    for name, value in values.items():
        names_of.setdefault(_exact(value, unit), []).append(name)
    for text, names in names_of.items():
        for line in wrap(" ".join(names), _COLUMNS, break_long_words=False, break_on_hyphens=False):
            yield f"{kind} {line}", text


def _exact(value: float, unit: str) -> str:
    """Return a value with a prefix and 12 digits, without trailing zeros."""
    if not unit:
        return f"{value:.{_DIGITS}g}"
    number, _, prefixed = engineering(value, unit, _DIGITS).partition(" ")
    if "." in number and "e" not in number:
        number = number.rstrip("0").rstrip(".")
    return f"{number} {prefixed}"


def _fact(line: bytes) -> tuple[str, str] | None:
    """Return what a line says and the value as text."""
    text = line.removeprefix(_PREFIX).decode("utf-8", "surrogateescape").strip()
    words, equal, value = text.rpartition(" = ")
    return (words, value) if equal else None


def _record(facts: Mapping[str, str]) -> Record:
    """Return the record some facts make; raises KeyError or ValueError where they make none."""
    single = {
        attribute: float(facts[words]) if not unit else parse_quantity(facts[words], unit)
        for attribute, words, unit in _FACTS
    }
    bound_on: Bounded
    bound_on, unit = next(b for b in _BOUND_UNITS.items() if f"bound on {b[0]}" in facts)
    return Record(
        key=facts["key"],
        bound_on=bound_on,
        bound=parse_quantity(facts[f"bound on {bound_on}"], unit),
        ceilings=_named(facts, "input ", "F"),
        smallest=_named(facts, "smallest ", "m"),
        corners=dict(_corners(facts)),
        **single,
    )


def _corners(facts: Mapping[str, str]) -> Iterator[tuple[str, CornerRecord]]:
    """Yield the corners by name."""
    number = 1
    while (name := facts.get(f"corner {number}")) is not None:
        transition = parse_quantity(facts[f"corner {number} slowest transition"], "s")
        ceilings = _named(facts, f"corner {number} input ", "F")
        yield unquote(name), CornerRecord(transition=transition, ceilings=ceilings)
        number += 1


def _named(facts: Mapping[str, str], kind: str, unit: str) -> dict[str, float]:
    """Return the values of all facts of a kind by the name in them."""
    return {
        name: parse_quantity(value, unit)
        for words, value in facts.items()
        if words.startswith(kind)
        for name in words.removeprefix(kind).split(" ")
    }
