"""A table of measurements in comma-separated text.

The first line names the columns, in any order; lines that begin with ``#`` and empty ones count for
nothing. A field may stand between double quotes; a double quote inside is doubled.
"""

from __future__ import annotations

import difflib
import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import FitError
from evenstage.fitting.measurements import Measurements, Query
from evenstage.source import SourceText, Span
from evenstage.units import parse_quantity

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence
    from pathlib import Path

    from evenstage.netlist.devices import FloatArray

_TEXTS: Final = ("subcircuit", "input", "output", "edge")
#: Columns of numbers with their units.
_NUMBERS: Final = {"transition": "s", "load": "F", "delay": "s"}
#: Columns that may be missing, and whose fields may be empty.
_OPTIONAL: Final = {"output_transition": "s", "input_capacitance": "F"}

#: What a row must have, and all that it may have.
REQUIRED: Final = (*_TEXTS, *_NUMBERS)
COLUMNS: Final = (*REQUIRED, *_OPTIONAL)

_EDGES: Final = {"rise": True, "fall": False}

#: Longer times and larger capacitances were written in the wrong unit.
_MOST: Final = {"s": 1e-3, "F": 1e-6}

_LINE: Final = re.compile(rb"[^\r\n]*")
_NAME: Final = re.compile(r"[A-Za-z_]\w*")
_RESULT: Final = re.compile(
    r"(?<!\S)([A-Za-z_]\w*)\s*=\s*([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?)(?!\S)"
)
_FIELD: Final = re.compile(rb'\s*(?:"(?P<quoted>(?:[^"]|"")*)"|(?P<plain>[^,"]*?))\s*(?=,|$)')


@dataclass(frozen=True, slots=True)
class _Field:
    text: str
    span: Span


def read_results(path: Path) -> dict[str, float]:
    """Read what a simulator printed of its measurements: every ``name = number``.

    Parameters
    ----------
    path : Path
        Any text; names are kept in lower case, of equal ones the last counts.

    Raises
    ------
    FitError
        If the file cannot be read.
    """
    text = _source(path).data.decode("utf-8", "surrogateescape")
    return {name.lower(): float(number) for name, number in _RESULT.findall(text)}


def read_measurements(path: Path, results: Mapping[str, float] | None = None) -> Measurements:
    """Read a table of measurements.

    Parameters
    ----------
    path : Path
        Comma-separated text with the columns of ``COLUMNS``; the last two may be missing.
    results : mapping of str to float, optional
        Numbers that the table holds by name, in lower case; see `read_results`. Rows whose delay is
        a name without a number are left out.

    Raises
    ------
    FitError
        If the file cannot be read or something in it is wrong, with its place.
    """
    source = _source(path)
    rows = _rows(source)
    header = next(rows, None)
    if header is None:
        raise FitError(
            f"'{path}' is empty; its first line must name the columns: {', '.join(REQUIRED)}",
            code="no-measurements",
        )
    columns = _columns(header)
    found = [_fields(columns, row) for row in rows]
    if results is not None:
        found = [filled for row in found if (filled := _filled(row, results)) is not None]
    if not found:
        raise FitError(f"'{path}' holds no measurement below its header", code="no-measurements")
    return _measurements(found)


def _source(path: Path) -> SourceText:
    try:
        data = path.read_bytes()
    except FileNotFoundError:
        raise FitError(f"there is no file '{path}'", code="missing-file") from None
    except (OSError, ValueError) as error:
        reason = (getattr(error, "strerror", None) or str(error)).lower()
        raise FitError(f"cannot read '{path}': {reason}", code="unreadable-file") from None
    return SourceText(path.resolve(), data, str(path))


def _rows(source: SourceText) -> Iterator[list[_Field]]:
    """Yield the fields of every line that says something."""
    data = source.data
    begin = len(b"\xef\xbb\xbf") if data.startswith(b"\xef\xbb\xbf") else 0
    for line in _LINE.finditer(data, begin):
        text = line.group()
        if text.strip() and not text.lstrip().startswith(b"#"):
            yield _split(source, line.start(), line.end())


def _split(source: SourceText, start: int, end: int) -> list[_Field]:
    fields, at = [], start
    while True:
        match = _FIELD.match(source.data, at, end)
        if match is None:
            raise FitError(
                "this field has no end: a double quote is missing",
                code="bad-table",
                span=Span(source, at, end),
            )
        which = "quoted" if match["quoted"] is not None else "plain"
        text = match[which].replace(b'""', b'"').decode("utf-8", "surrogateescape")
        fields.append(_Field(text.strip(), Span(source, *match.span(which))))
        if match.end() == end:
            return fields
        at = match.end() + 1


def _columns(header: Sequence[_Field]) -> dict[str, int]:
    """Return the place of each column."""
    found: dict[str, int] = {}
    for place, field in enumerate(header):
        name = re.sub(r"[\s_]+", "_", field.text.lower())
        if name not in COLUMNS:
            nearest = difflib.get_close_matches(name, COLUMNS, n=1, cutoff=0.0)[0]
            raise FitError(
                f"unknown column '{field.text}'; the nearest known one is {nearest}",
                code="unknown-column",
                span=field.span,
                notes=(f"known here: {', '.join(COLUMNS)}",),
            )
        if name in found:
            raise FitError(f"column {name} stands twice", code="column-twice", span=field.span)
        found[name] = place
    missing = [name for name in REQUIRED if name not in found]
    if missing:
        raise FitError(
            f"column {missing[0]} is missing; needed are {', '.join(REQUIRED)}",
            code="missing-column",
            span=header[0].span,
        )
    return found


def _fields(columns: dict[str, int], row: Sequence[_Field]) -> dict[str, _Field]:
    if len(row) != len(columns):
        raise FitError(
            f"{len(row)} fields, but the header names {len(columns)} columns",
            code="bad-table",
            span=Span(row[0].span.source, row[0].span.start, row[-1].span.end),
        )
    return {name: row[place] for name, place in columns.items()}


def _filled(row: dict[str, _Field], results: Mapping[str, float]) -> dict[str, _Field] | None:
    """Put results in the place of their names; None where the delay was not measured."""
    filled = dict(row)
    for name in ("delay", "output_transition", "input_capacitance"):
        if name in row and _NAME.fullmatch(row[name].text):
            number = results.get(row[name].text.lower())
            filled[name] = _Field("" if number is None else repr(number), row[name].span)
    return filled if filled["delay"].text else None


def _measurements(rows: Sequence[dict[str, _Field]]) -> Measurements:
    queries: dict[Query, int] = {}
    query = [queries.setdefault(_query(row), len(queries)) for row in rows]

    def column(name: str, unit: str) -> FloatArray:
        return np.array([_number(row.get(name), name, unit) for row in rows], float)

    return Measurements(
        queries=tuple(queries),
        query=np.array(query, np.int32),
        transition=column("transition", "s"),
        load=column("load", "F"),
        delay=column("delay", "s"),
        output_transition=column("output_transition", "s"),
        input_cap=column("input_capacitance", "F"),
        places=tuple(row["subcircuit"].span for row in rows),
    )


def _query(row: dict[str, _Field]) -> Query:
    edge = row["edge"]
    if edge.text.lower() not in _EDGES:
        raise FitError(
            f"edge must be rise or fall (of the output), got '{edge.text}'",
            code="bad-edge",
            span=edge.span,
        )
    for name in _TEXTS:
        if not row[name].text:
            raise FitError(f"{name} is empty", code="empty-field", span=row[name].span)
    subcircuit, start, end = (row[name].text for name in ("subcircuit", "input", "output"))
    return Query(subcircuit, start, end, _EDGES[edge.text.lower()])


def _number(field: _Field | None, name: str, unit: str) -> float:
    """Return a number; NaN where an optional one is not given."""
    if field is None or (name in _OPTIONAL and not field.text):
        return float("nan")
    try:
        value = parse_quantity(field.text, unit)
    except ValueError as error:
        raise FitError(f"{name}: {error}", code="bad-number", span=field.span) from None
    # A delay may be negative: a slow input and a light load make it so.
    least = -_MOST[unit] if name == "delay" else 0.0
    too_small = value < least or (value == 0 and name not in {"delay", "load"})
    if too_small or value > _MOST[unit]:
        raise FitError(
            f"{name} must be {'above' if name != 'load' else 'at least'} 0 and at most "
            f"{_MOST[unit]:g} {unit}, got '{field.text}'; numbers are in {unit}, or carry a suffix",
            code="bad-number",
            span=field.span,
        )
    return value
