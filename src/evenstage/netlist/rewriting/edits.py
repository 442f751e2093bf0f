"""Changes to text as data: decided first, spliced in once, so that nothing else can move."""

from __future__ import annotations

from dataclasses import dataclass
from operator import attrgetter
from typing import TYPE_CHECKING

from evenstage.netlist.collection import without_collection
from evenstage.progress import tell

if TYPE_CHECKING:
    from collections.abc import Iterable
    from pathlib import Path

    from evenstage.netlist.netlist import Netlist
    from evenstage.source import SourceText, Span


@dataclass(frozen=True, slots=True)
class Edit:
    """New bytes for a span; an empty span is an insertion before its byte.

    Parameters
    ----------
    span : Span
        What is replaced.
    text : bytes
        What stands there afterwards.
    """

    span: Span
    text: bytes


_ends = attrgetter("span.start", "span.end")


def apply_edits(source: SourceText, edits: Iterable[Edit]) -> bytes:
    """Return a source's bytes with all edits spliced in.

    Parameters
    ----------
    source : SourceText
        The file; each edit must be of it.
    edits : iterable of Edit
        In any order; only insertions at one place keep theirs.

    Returns
    -------
    bytes
        The new contents; every byte outside the spans is the old one.

    Raises
    ------
    ValueError
        If two edits overlap or one is of another file: a fault of ours.

    Examples
    --------
    >>> from pathlib import Path
    >>> from evenstage.source import SourceText, Span
    >>> source = SourceText(Path("inv.sp"), b"w=0.6u l=60n", "inv.sp")
    >>> apply_edits(source, [Edit(Span(source, 2, 6), b"1.25u")])
    b'w=1.25u l=60n'
    """
    pieces: list[bytes] = []
    data, done = source.data, 0
    for edit in sorted(edits, key=_ends):
        start, end = _ends(edit)
        of_another = edit.span.source is not source and edit.span.source.path != source.path
        if of_another or not done <= start <= end:
            raise ValueError(f"edit at {edit.span.place} overlaps another or is of another file")
        pieces += (data[done:start], edit.text)
        done = end
    pieces.append(data[done:])
    return b"".join(pieces)


def rewrite(netlist: Netlist, edits: Iterable[Edit]) -> dict[Path, bytes]:
    """Return the new contents of every file of a netlist that changes.

    Parameters
    ----------
    netlist : Netlist
        The netlist the edits' spans belong to.
    edits : iterable of Edit
        In any order; only insertions at one place keep theirs.

    Returns
    -------
    dict of Path to bytes
        By the path of the source, main file first; files that stay as they are do not occur.

    Raises
    ------
    ValueError
        If two edits overlap: a fault of ours.

    Examples
    --------
    >>> from evenstage import analyse, elaborate, read_process, recognise, resize
    >>> from evenstage.netlist.reading.read import read
    >>> folder = "sample_netlists/pad_predriver"
    >>> netlist, process = read(f"{folder}/netlist.sp"), read_process(f"{folder}/process.toml")
    >>> circuit = recognise(elaborate(netlist, process=process), process)
    >>> for path, text in rewrite(netlist, resize(analyse(circuit)).edits).items():
    ...     print(path.name, len(text) > len(netlist.sources[0].data))
    netlist.sp True
    """
    tell("writing")
    with without_collection():
        of_source: dict[int, list[Edit]] = {}
        for edit in edits:
            of_source.setdefault(id(edit.span.source), []).append(edit)
        of_path: dict[Path, list[Edit]] = {}
        for some in of_source.values():
            of_path.setdefault(some[0].span.source.path, []).extend(some)
        texts = {
            source.path: apply_edits(source, of_path[source.path])
            for source in netlist.sources
            if source.path in of_path
        }
    unchanged = {source.path: source.data for source in netlist.sources}
    return {path: text for path, text in texts.items() if text != unchanged[path]}
