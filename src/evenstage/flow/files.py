"""Files that a command writes, and where its result comes from."""

from __future__ import annotations

import hashlib
from typing import TYPE_CHECKING

from evenstage.circuit.inventory import Inventory
from evenstage.errors import OutputError
from evenstage.fitting.deck import Deck
from evenstage.netlist.rewriting.output import write_files
from evenstage.report.page import render
from evenstage.report.page.origin import FileDigest, Origin

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence
    from pathlib import Path

    from evenstage.report.results import Result


def write_text(path: Path, content: str, *, force: bool) -> None:
    """Write a report as a file, whole or not at all.

    Raises
    ------
    OutputError
        Where it exists (without ``force``) or cannot be written.
    """
    write_files({path: content.encode("utf-8", "surrogateescape")}, force=force)


def refuse_existing(output: Path | None, *, force: bool) -> None:
    """Refuse at once what could not be written in the end.

    Raises
    ------
    OutputError
        Where the output exists.
    """
    if output is not None and output.exists() and not force:
        raise OutputError(
            f"'{output}' exists; choose another name, or say --force to overwrite it",
            code="output-exists",
        )


def origin(
    version: str, arguments: Sequence[str], files: Iterable[Path], delay: float | None = None
) -> Origin:
    """Return where a result comes from, with the digests of the files that are there.

    Parameters
    ----------
    version : str
    arguments : sequence of str
        Of the command line.
    files : iterable of Path
        Read or written.
    delay : float, optional
        s, asked for.
    """
    named = dict.fromkeys(files)
    digests = tuple(
        FileDigest(str(path), hashlib.sha256(path.read_bytes()).hexdigest())
        for path in named
        if path.is_file()
    )
    return Origin(version, tuple(arguments), digests, delay)


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
