"""Changes to text as data: decided first, spliced in once, so that nothing else can move."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import chain
from typing import TYPE_CHECKING

import numpy as np

from evenstage.netlist.collection import without_collection
from evenstage.progress import tell
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence
    from pathlib import Path

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.netlist import Netlist
    from evenstage.source import SourceText


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


@dataclass(frozen=True, slots=True)
class EditColumns:
    """New bytes for many spans of one file.

    Parameters
    ----------
    source : SourceText
        The file.
    starts, ends : IntArray, shape (n,)
        The spans ``[start, end)``.
    texts : sequence of bytes, n of them
        What stands there afterwards.
    """

    source: SourceText
    starts: IntArray
    ends: IntArray
    texts: Sequence[bytes]


def apply_edits(source: SourceText, edits: Iterable[Edit | EditColumns]) -> bytes:
    """Return a source's bytes with all edits spliced in.

    Parameters
    ----------
    source : SourceText
        The file; each edit must be of it.
    edits : iterable of Edit or EditColumns
        In any order; only insertions at one place keep theirs, single ones first.

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
    columns = _together(source, edits)
    if not len(columns.texts):
        return source.data
    order = np.lexsort((columns.ends, columns.starts))
    starts, ends = columns.starts[order], columns.ends[order]
    done = np.append(0, ends[:-1])
    wrong = np.flatnonzero((done > starts) | (starts > ends))
    if len(wrong):
        place = Span(source, int(starts[wrong[0]]), int(ends[wrong[0]])).place
        raise ValueError(f"edit at {place} overlaps another")
    data, texts = source.data, columns.texts
    kept = zip(done.tolist(), starts.tolist(), strict=True)
    pieces = [data[ends[-1] :]] * (2 * len(order) + 1)
    pieces[:-1:2] = [data[begin:end] for begin, end in kept]
    pieces[1::2] = [texts[number] for number in order.tolist()]
    return b"".join(pieces)


def _together(source: SourceText, edits: Iterable[Edit | EditColumns]) -> EditColumns:
    """Return the edits of a file in one, the single ones first."""
    bulk: list[EditColumns] = []
    single: list[Edit] = []
    for edit in edits:
        of = _source(edit)
        if of is not source and of.path != source.path:
            raise ValueError(f"an edit of {of.label}, another file than {source.label}")
        if isinstance(edit, Edit):
            single.append(edit)
        else:
            bulk.append(edit)
    starts = np.array([edit.span.start for edit in single], np.int64)
    ends = np.array([edit.span.end for edit in single], np.int64)
    return EditColumns(
        source,
        np.concatenate([starts, *(edits.starts for edits in bulk)]),
        np.concatenate([ends, *(edits.ends for edits in bulk)]),
        [*(edit.text for edit in single), *chain.from_iterable(edits.texts for edits in bulk)],
    )


def _source(edit: Edit | EditColumns) -> SourceText:
    """Return the file an edit is of."""
    return edit.span.source if isinstance(edit, Edit) else edit.source


def rewrite(netlist: Netlist, edits: Iterable[Edit | EditColumns]) -> dict[Path, bytes]:
    """Return the new contents of every file of a netlist that changes.

    Parameters
    ----------
    netlist : Netlist
        The netlist the edits' spans belong to.
    edits : iterable of Edit or EditColumns
        In any order; only insertions at one place keep theirs, single ones first.

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
        of_path: dict[Path, list[Edit | EditColumns]] = {}
        for edit in edits:
            of_path.setdefault(_source(edit).path, []).append(edit)
        texts = {
            source.path: apply_edits(source, of_path[source.path])
            for source in netlist.sources
            if source.path in of_path
        }
    unchanged = {source.path: source.data for source in netlist.sources}
    return {path: text for path, text in texts.items() if text != unchanged[path]}
