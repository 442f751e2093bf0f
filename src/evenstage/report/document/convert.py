"""Results to JSON text and back; keys are added, never renamed."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Any, Final

from evenstage.circuit.inventory import Inventory
from evenstage.errors import DocumentError
from evenstage.fitting.results import Deck, Fit
from evenstage.report.document.circuit import write_inventory
from evenstage.report.document.corners import (
    read_corners,
    read_corners_difference,
    write_corners,
    write_corners_difference,
)
from evenstage.report.document.fitting import FIT, write_deck
from evenstage.report.document.origin import ORIGIN
from evenstage.report.document.shape import an_object, optional
from evenstage.report.document.simulation import SIMULATION
from evenstage.report.document.sizing import SIZING
from evenstage.report.document.timing import ANALYSIS, DIFFERENCE
from evenstage.simulation.results import Simulation
from evenstage.sizing.results import Sizing
from evenstage.source import SourceText, Span
from evenstage.timing.corners import Corners, CornersDifference
from evenstage.timing.results import Analysis, Difference

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping
    from pathlib import Path

    from evenstage.report.document.shape import Document, JsonValue
    from evenstage.report.origin import Origin

FORMAT: Final = 1

Reviewable = Analysis | Corners | Sizing | Difference | CornersDifference | Simulation | Fit
"""What a page can be made of, and what can be read back."""

Result = Reviewable | Inventory | Deck

#: Kind of each result, and what writes it. Each takes the result it stands beside.
_WRITERS: Final[dict[type, tuple[str, Callable[[Any], Document]]]] = {
    Analysis: ("analysis", ANALYSIS.write),
    Corners: ("analysis", write_corners),
    Sizing: ("sizing", SIZING.write),
    Difference: ("difference", DIFFERENCE.write),
    CornersDifference: ("difference", write_corners_difference),
    Inventory: ("circuit", write_inventory),
    Simulation: ("simulation", SIMULATION.write),
    Fit: ("fit", FIT.write),
    Deck: ("deck", write_deck),
}

#: What reads each kind, in one process and in several.
_READERS: Final[dict[tuple[str, bool], Callable[[object], Reviewable]]] = {
    ("analysis", False): ANALYSIS.read,
    ("analysis", True): read_corners,
    ("sizing", False): SIZING.read,
    ("sizing", True): SIZING.read,
    ("difference", False): DIFFERENCE.read,
    ("difference", True): read_corners_difference,
    ("simulation", False): SIMULATION.read,
    ("fit", False): FIT.read,
}


def document(result: Result, origin: Origin | None = None) -> Document:
    """Return a result as the document scripts read.

    Parameters
    ----------
    result : Result
    origin : Origin, optional
        Where it comes from.

    Returns
    -------
    dict
        Plain values only; ``kind`` says which result it is. Of keys that differ in their unit only,
        all but one are null.
    """
    kind, write = _WRITERS[type(result)]
    head: Document = {"program": "evenstage", "format": FORMAT, "kind": kind}
    return head | {"origin": optional(ORIGIN.kind).write(origin)} | write(result)


def to_json(document: Mapping[str, JsonValue]) -> str:
    """Return a document as JSON text in pure ASCII, with a final newline.

    Bytes of a name that are not UTF-8 stand as escaped lone surrogates, which Python reads back as
    they were.

    Parameters
    ----------
    document : mapping

    Returns
    -------
    str
        The same text for the same document on any machine.

    Raises
    ------
    ValueError
        If a number is not finite; no result may hold such a number.
    """
    return json.dumps(document, indent=2, allow_nan=False) + "\n"


def read_document(path: Path) -> tuple[Reviewable, Origin | None]:
    """Read a result that was written as JSON, and where it comes from.

    What only the netlist knows is not there: `Analysis.timing` is None.

    Parameters
    ----------
    path : Path

    Raises
    ------
    DocumentError
        Where the file cannot be read, is no JSON, or is no result that can be read back.
    """
    source = _source(path)
    try:
        found = json.loads(source.data, parse_constant=_refuse)
    except json.JSONDecodeError as error:
        at = len(error.doc[: error.pos].encode("utf-8", "surrogatepass"))
        span = Span(source, at, at + 1)
        message = f"not JSON: {error.msg.lower()}; name a file that --json wrote"
        raise DocumentError(message, code="not-json", span=span) from None
    except (UnicodeDecodeError, ValueError, RecursionError) as error:
        message = f"'{path}' is not JSON: {error}; name a file that --json wrote"
        raise DocumentError(message, code="not-json") from None
    try:
        return _read(found)
    except DocumentError as error:
        raise DocumentError(f"'{path}': {error.message}", code=error.code) from None


def _read(found: object) -> tuple[Reviewable, Origin | None]:
    keys = an_object(found, "")
    if keys.get("program") != "evenstage" or keys.get("format") != FORMAT:
        message = f"it is no result of evenstage in format {FORMAT}; name a file that --json wrote"
        raise DocumentError(message, code="not-a-document")
    kind = keys.get("kind")
    read = _READERS.get((str(kind), "corners" in keys))
    if read is None:
        known = ", ".join(sorted({name for name, _ in _READERS}))
        message = f"there is no report of kind '{kind}'; there are reports of kind {known}"
        raise DocumentError(message, code="no-such-report")
    return read(found), optional(ORIGIN.kind).read(keys.get("origin"), "origin")


def _refuse(word: str) -> object:
    message = f"it holds {word}"
    raise ValueError(message)


def _source(path: Path) -> SourceText:
    try:
        return SourceText(path.resolve(), path.read_bytes(), str(path))
    except OSError as error:
        reason = (error.strerror or str(error)).lower()
        message = f"cannot read '{path}': {reason}"
        raise DocumentError(message, code="cannot-read") from None
