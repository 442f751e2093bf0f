"""Leaves and the sized copies that earlier runs made of them.

A copy is known by its name, ``<leaf>_s<number>``, and by the comment above its ``.subckt`` card,
which names the definition it was copied from. A leaf and its copies are one family.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from evenstage.netlist.rewriting.comments import MARK, line_end, line_start
from evenstage.netlist.rewriting.edits import Edit
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.netlist.netlist import Netlist, Subcircuit

_COPY_NAME: Final = re.compile(r"(.+)_s\d+", re.DOTALL)
_NAMED_CALLERS: Final = 3


@dataclass(frozen=True, slots=True)
class Family:
    """A leaf and its copies.

    Parameters
    ----------
    root : str
        Lower-case name of the leaf as first drawn.
    copies : tuple of str
        Those of its copies, in the order of the text.
    """

    root: str
    copies: tuple[str, ...] = ()

    @property
    def members(self) -> tuple[str, ...]:
        """All of them, the leaf first."""
        return (self.root, *self.copies)


def find_families(netlist: Netlist) -> Mapping[str, Family]:
    """Return the families with copies, by the lower-case name of each member."""
    copied_from = {
        name: origin
        for name, subcircuit in netlist.subcircuits.items()
        if (origin := _known_origin(netlist, name, _origin(subcircuit))) and origin != name
    }
    copies: dict[str, list[str]] = {}
    for name in copied_from:
        root = _root(name, copied_from)
        if root is not None:
            copies.setdefault(root, []).append(name)
    families = (Family(root, tuple(names)) for root, names in copies.items())
    return {member: family for family in families for member in family.members}


def _known_origin(netlist: Netlist, name: str, origin: str) -> str:
    """Return the definition another was copied from; that one's own origin where it is gone."""
    match = _COPY_NAME.fullmatch(origin)
    for known in (origin, match[1] if match else ""):
        key = netlist.callees.key(name, known)
        if key in netlist.subcircuits:
            return key
    return ""


def _root(name: str, copied_from: Mapping[str, str]) -> str | None:
    """Return what a copy was made of in the first place; None if it comes from itself."""
    seen = set()
    while name in copied_from and name not in seen:
        seen.add(name)
        name = copied_from[name]
    return None if name in seen else name


def _origin(subcircuit: Subcircuit) -> str:
    """Return the lower-case name a definition was copied from; empty if it is no copy."""
    line = calling_line(subcircuit)
    if line is None or not _COPY_NAME.fullmatch(subcircuit.name):
        return ""
    return line.text.removeprefix(MARK.decode()).partition(" -> ")[0].lower()


def calling_line(subcircuit: Subcircuit) -> Span | None:
    """Return the line above a copy that says what it was copied from and who calls it."""
    header = subcircuit.header
    if header is None:
        return None
    data = header.source.data
    end, first = line_start(data, header.start), line_start(data, 0)
    name = re.escape(subcircuit.name.encode("utf-8", "surrogateescape"))
    wanted = re.compile(rb"[^\r\n]+ -> " + name + rb"[:,][^\r\n]*\bcalled by ")
    while end > first and data.startswith(MARK, start := line_start(data, end - 1)):
        if wanted.match(data, start, end):
            return Span(header.source, start, end)
        end = start
    return None


def calling_words(netlist: Netlist, callers: tuple[int, ...]) -> str:
    """Return who calls a copy, in words."""
    names = [netlist.card(caller).name for caller in callers]
    more = len(names) - _NAMED_CALLERS
    return (
        "called by " + ", ".join(names[:_NAMED_CALLERS]) + (f" and {more} more" if more > 0 else "")
    )


def recall(netlist: Netlist, copy: Subcircuit, callers: tuple[int, ...]) -> list[Edit]:
    """Return the edit that says above a copy who calls it now; none if that is said already."""
    line = calling_line(copy)
    if line is None:
        return []
    data = line.source.data
    head, _, _ = data[line.start : line.end].partition(b"called by ")
    words = calling_words(netlist, callers).encode("utf-8", "surrogateescape")
    text = head + words + line_end(data, line.start)
    return [] if text == data[line.start : line.end] else [Edit(line, text)]


def removal(copy: Subcircuit) -> Edit:
    """Return the edit that takes a copy out, with our comments above it."""
    assert copy.body is not None
    assert copy.header is not None
    data = copy.header.source.data
    start, first = line_start(data, copy.header.start), line_start(data, 0)
    while start > first and data.startswith(MARK, above := line_start(data, start - 1)):
        start = above
    return Edit(Span(copy.header.source, start, copy.body.end), b"")
