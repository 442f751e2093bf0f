"""Copies of a leaf with other widths, for callers that no longer agree."""

from __future__ import annotations

import re
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

from evenstage.netlist.reading.canonical import canonical
from evenstage.netlist.rewriting.comments import line_end, line_start
from evenstage.netlist.rewriting.edits import Edit, apply_edits
from evenstage.netlist.rewriting.families import calling_words
from evenstage.netlist.rewriting.respelling import Respelling, edits_of
from evenstage.source import SourceText, Span

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Sequence

    from evenstage.netlist.netlist import Netlist, Subcircuit

_COPY_ENDING: Final = re.compile(r"_s\d+$")


@dataclass(frozen=True, slots=True)
class LeafCopy:
    """A copy to be made.

    Parameters
    ----------
    leaf : Subcircuit
        The original.
    name : str
        Of the copy.
    callers : tuple of int
        Numbers of the X cards that will call it.
    changes : tuple of Respelling
        Inside it, with spans on the original.
    inside : str
        The definition in whose copy these cards stand, where that is one.
    """

    leaf: Subcircuit
    name: str
    callers: tuple[int, ...]
    changes: tuple[Respelling, ...]
    inside: str = ""


def insertions(
    netlist: Netlist, copies: Iterable[LeafCopy], elsewhere: Sequence[Respelling]
) -> list[Edit]:
    """Return the edits that add the copies, each after its original.

    Parameters
    ----------
    netlist : Netlist
        The text.
    copies : iterable of LeafCopy
        What to add.
    elsewhere : sequence of Respelling
        All other changes that serve everybody; those inside an original are made in its copies too.
    """
    return [_insertion(netlist, copy, elsewhere) for copy in copies]


def taken_names(netlist: Netlist) -> set[str]:
    """Return the lower-case names that no copy may have."""
    targets = {
        target.decode("utf-8", "surrogateescape")
        for group in netlist.card_groups(range(len(netlist)))
        for target in group.targets
    }
    return targets | set(netlist.subcircuits) | set(netlist.models)


def free_name(leaf: str, taken: set[str]) -> str:
    """Return the first free ``<leaf>_s<n>`` and take it; a copy's copy counts on."""
    base = _COPY_ENDING.sub("", leaf)
    base = base if base.lower() in taken else leaf
    number = 1
    while f"{base}_s{number}".lower() in taken:
        number += 1
    taken.add(f"{base}_s{number}".lower())
    return f"{base}_s{number}"


def retargeting(
    netlist: Netlist, caller: int, name: str, changes: Iterable[Respelling]
) -> Respelling:
    """Return what makes an X card call another definition.

    Parameters
    ----------
    netlist : Netlist
        The text.
    caller : int
        Number of the card.
    name : str
        What it will call.
    changes : iterable of Respelling
        What that changes for it, for the comment.
    """
    card = netlist.card(caller)
    assert card.target_span is not None
    told = [change for change in changes if not change.follows]
    return Respelling(
        span=card.target_span,
        name="",
        old=card.target,
        new=name,
        why="; ".join(dict.fromkeys(change.why for change in told if change.why)),
        detail=f" ({_widths(told)})",
    )


def _widths(changes: list[Respelling]) -> str:
    """Return what changes on the cards of a leaf, equal changes together."""
    cards_of: dict[str, list[str]] = {}
    for change in changes:
        cards_of.setdefault(change.note, []).append(change.card)
    return ", ".join(f"{' '.join(cards)} {note}" for note, cards in cards_of.items())


def content(
    leaf: Subcircuit, changes: Iterable[Respelling], called: Iterable[tuple[Span, bytes]] = ()
) -> bytes:
    """Return what a leaf says after some changes, whatever its name, blanks and comments.

    Parameters
    ----------
    leaf : Subcircuit
        The leaf.
    changes : iterable of Respelling
        Those outside it count for nothing.
    called : iterable of (Span, bytes)
        What stands for the names of the subcircuits it calls.
    """
    text, moved = _cut_out(leaf)
    names = [span for span in (leaf.name_span, leaf.end_name_span) if span is not None]
    edits = [Edit(moved(span), b"?") for span in names]
    edits += [Edit(moved(span), words) for span, words in called]
    edits += [replace(r, span=moved(r.span)).edit for r in _inside(leaf, changes)]
    return b" ".join(canonical(apply_edits(text, edits)).split())


def _cut_out(leaf: Subcircuit) -> tuple[SourceText, Callable[[Span], Span]]:
    """Return a definition as a text of its own, and what moves spans there."""
    body, header = leaf.body, leaf.header
    assert body is not None
    assert header is not None
    source, start = body.source, line_start(body.source.data, header.start)
    text = SourceText(source.path, source.data[start : body.end], source.label)
    return text, lambda span: Span(text, span.start - start, span.end - start)


def _inside(leaf: Subcircuit, changes: Iterable[Respelling]) -> list[Respelling]:
    body, header = leaf.body, leaf.header
    assert body is not None
    assert header is not None
    start = line_start(body.source.data, header.start)
    return [
        r
        for r in changes
        if r.span.source.path == body.source.path
        and start <= r.span.start
        and r.span.end < body.end
    ]


def _insertion(netlist: Netlist, copy: LeafCopy, elsewhere: Sequence[Respelling]) -> Edit:
    """Return the edit that adds one copy after the original's last line."""
    body, header, name = copy.leaf.body, copy.leaf.header, copy.leaf.name_span
    assert body is not None
    assert header is not None
    assert name is not None
    source = body.source
    text, moved = _cut_out(copy.leaf)
    named = Respelling(
        span=name,
        name="",
        old=copy.leaf.name,
        new=copy.name,
        why=calling_words(netlist, copy.callers) + (f" in {copy.inside}" if copy.inside else ""),
    )
    inside = (*_inside(copy.leaf, elsewhere), *copy.changes)
    edits = edits_of(replace(r, span=moved(r.span)) for r in (named, *inside))
    if copy.leaf.end_name_span is not None:
        edits.append(Edit(moved(copy.leaf.end_name_span), named.new.encode()))
    copied = apply_edits(text, edits)
    if not copied.endswith((b"\n", b"\r")):
        copied = line_end(source.data, header.start) + copied
    return Edit(Span(source, body.end, body.end), copied)
