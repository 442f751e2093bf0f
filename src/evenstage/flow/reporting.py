"""A result read back from where it was written, and the page made of it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.inventory import Inventory
from evenstage.fitting.results import Deck
from evenstage.flow.files import origin
from evenstage.report.document.convert import read_document
from evenstage.report.page import render

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from evenstage.report.document.convert import Result, Reviewable
    from evenstage.report.origin import Origin


def report(path: Path, version: str, arguments: Sequence[str]) -> tuple[Reviewable, Origin]:
    """Read a result that another command wrote as JSON, and where it came from.

    Parameters
    ----------
    path : Path
    version, arguments
        Of this run: where the result comes from if it does not say so itself.

    Raises
    ------
    DocumentError
        Where the file is no such result.
    """
    result, known = read_document(path)
    return result, known or origin(version, arguments, [path], result)


def html(result: Result, origin: Origin) -> str:
    """Return a result as one self-contained page.

    Raises
    ------
    TypeError
        Where there is no page of its kind: an inventory, or a deck.
    """
    if isinstance(result, Inventory | Deck):
        message = f"there is no page of {type(result).__name__}"
        raise TypeError(message)
    return render.html(result, origin)
