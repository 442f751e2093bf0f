"""Copies of a leaf with other widths, for callers that no longer agree."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

from evenstage.netlist.comments import line_end, line_start
from evenstage.netlist.edits import Edit, apply_edits
from evenstage.netlist.respelling import Respelling, edits_of
from evenstage.source import SourceText, Span

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.netlist.netlist import Netlist, Subcircuit

#: Respellings inside a leaf, by the number of the X card that wants them.
Wanted = Mapping[int, tuple[Respelling, ...]]

_COPY_ENDING: Final = re.compile(r"_s\d+$")
_NAMED_CALLERS: Final = 3


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
    """

    leaf: Subcircuit
    name: str
    callers: tuple[int, ...]
    changes: tuple[Respelling, ...]


def plan_copies(netlist: Netlist, wanted: Mapping[str, Wanted]) -> list[LeafCopy]:
    """Decide which copies of leaves are made; callers that want the same share one.

    Parameters
    ----------
    netlist : Netlist
        The text.
    wanted : Mapping
        By lower-case name of the leaf.
    """
    taken = _taken_names(netlist) if wanted else set()
    copies = []
    for scope, by_caller in wanted.items():
        leaf = netlist.subcircuits[scope]
        for callers in _sharing(by_caller):
            name = _free_name(leaf.name, taken)
            copies.append(LeafCopy(leaf, name, callers, by_caller[callers[0]]))
    return copies


def retargetings(netlist: Netlist, copies: Iterable[LeafCopy]) -> list[Respelling]:
    """Return what makes the X cards call the copies instead of the original."""
    return [_retargeting(netlist, copy, caller) for copy in copies for caller in copy.callers]


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
        All other changes; those inside an original are made in its copies too.
    """
    return [_insertion(netlist, copy, elsewhere) for copy in copies]


def _sharing(by_caller: Wanted) -> list[tuple[int, ...]]:
    """Return the callers in groups that want the same, in the order of the text."""
    groups: dict[tuple[tuple[int, int, str, str], ...], list[int]] = {}
    for caller in sorted(by_caller):
        groups.setdefault(wishes_key(by_caller[caller]), []).append(caller)
    return [tuple(callers) for callers in groups.values()]


def wishes_key(changes: Iterable[Respelling]) -> tuple[tuple[int, int, str, str], ...]:
    """Return what is equal for changes that write the same text."""
    return tuple(sorted((r.span.start, r.span.end, r.name, r.new) for r in changes))


def _taken_names(netlist: Netlist) -> set[str]:
    targets = {
        target.decode("utf-8", "surrogateescape")
        for group in netlist.card_groups(range(len(netlist)))
        for target in group.targets
    }
    return targets | set(netlist.subcircuits) | set(netlist.models)


def _free_name(leaf: str, taken: set[str]) -> str:
    """Return the first free ``<leaf>_s<n>`` and take it; a copy's copy counts on."""
    base = _COPY_ENDING.sub("", leaf)
    base = base if base.lower() in taken else leaf
    number = 1
    while f"{base}_s{number}".lower() in taken:
        number += 1
    taken.add(f"{base}_s{number}".lower())
    return f"{base}_s{number}"


def _retargeting(netlist: Netlist, copy: LeafCopy, caller: int) -> Respelling:
    card = netlist.card(caller)
    assert card.target_span is not None
    told = [change for change in copy.changes if not change.follows]
    return Respelling(
        span=card.target_span,
        name="",
        old=card.target,
        new=copy.name,
        why="; ".join(dict.fromkeys(change.why for change in told if change.why)),
        detail=f" ({_widths(told)})",
    )


def _widths(changes: list[Respelling]) -> str:
    """Return what changes on the cards of a leaf, equal changes together."""
    cards_of: dict[str, list[str]] = {}
    for change in changes:
        cards_of.setdefault(change.note, []).append(change.card)
    return ", ".join(f"{' '.join(cards)} {note}" for note, cards in cards_of.items())


def _insertion(netlist: Netlist, copy: LeafCopy, elsewhere: Sequence[Respelling]) -> Edit:
    """Return the edit that adds one copy after the original's last line."""
    body, header, name = copy.leaf.body, copy.leaf.header, copy.leaf.name_span
    assert body is not None
    assert header is not None
    assert name is not None
    source, start = body.source, line_start(body.source.data, header.start)
    text = SourceText(source.path, source.data[start : body.end], source.label)

    def moved(span: Span) -> Span:
        return Span(text, span.start - start, span.end - start)

    inside = [
        r
        for r in elsewhere
        if r.span.source.path == source.path and start <= r.span.start and r.span.end < body.end
    ]
    named = Respelling(
        span=name,
        name="",
        old=copy.leaf.name,
        new=copy.name,
        why=f"called by {_called_by(netlist, copy.callers)}",
    )
    edits = edits_of(replace(r, span=moved(r.span)) for r in (named, *inside, *copy.changes))
    if copy.leaf.end_name_span is not None:
        edits.append(Edit(moved(copy.leaf.end_name_span), named.new.encode()))
    copied = apply_edits(text, edits)
    if not copied.endswith((b"\n", b"\r")):
        copied = line_end(source.data, header.start) + copied
    return Edit(Span(source, body.end, body.end), copied)


def _called_by(netlist: Netlist, callers: tuple[int, ...]) -> str:
    names = [netlist.card(caller).name for caller in callers]
    more = len(names) - _NAMED_CALLERS
    return ", ".join(names[:_NAMED_CALLERS]) + (f" and {more} more" if more > 0 else "")
