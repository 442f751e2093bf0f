"""The definitions of a text and what one run makes of them: changed, called anew, copied.

A leaf may call other subcircuits. Then its text is its own together with theirs, and a copy of it
calls copies of those that change; the others it calls as they are.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

from evenstage.netlist.rewriting.copies import (
    LeafCopy,
    content,
    free_name,
    retargeting,
    taken_names,
)

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from evenstage.netlist.netlist import Subcircuit
    from evenstage.netlist.rewriting.below import Below
    from evenstage.netlist.rewriting.families import Family
    from evenstage.netlist.rewriting.respelling import Respelling
    from evenstage.netlist.rewriting.sized_block import SizedBlock
    from evenstage.source import Span

_Wishes = tuple[tuple[object, ...], ...]


@dataclass
class Stock:
    """All definitions.

    Parameters
    ----------
    block : SizedBlock
        The block.
    shared : sequence of Respelling
        What changes for everybody.
    changed : set of str
        Definitions that change where they stand.
    held : set of str
        Definitions that calls are sent to.
    in_place : list of Respelling
        What changes in them.
    copies : dict of str to LeafCopy
        New ones, by lower-case name.
    moved : dict of int to str
        Calls that stay where they are and call another definition than so far.
    """

    block: SizedBlock
    shared: Sequence[Respelling]
    changed: set[str] = field(default_factory=set)
    held: set[str] = field(default_factory=set)
    in_place: list[Respelling] = field(default_factory=list)
    copies: dict[str, LeafCopy] = field(default_factory=dict)
    moved: dict[int, str] = field(default_factory=dict)
    _taken: set[str] = field(default_factory=set, repr=False)
    _copied: dict[tuple[str, bytes], str] = field(default_factory=dict, repr=False)
    _texts: dict[tuple[str, _Wishes], Mapping[str, bytes]] = field(default_factory=dict, repr=False)

    def text(self, name: str, changes: Sequence[Respelling] = ()) -> bytes:
        """Return what a definition says after some changes, with all that it calls."""
        return self._all_texts(name, changes)[name]

    def _all_texts(self, name: str, changes: Sequence[Respelling]) -> Mapping[str, bytes]:
        key = name, tuple(sorted((r.span.start, r.span.end, r.name, r.new) for r in changes))
        if key not in self._texts:
            below = self.block.below(name)
            texts: dict[str, bytes] = {}
            for one in below.order:
                called = [
                    (span, hashlib.sha256(texts[callee]).hexdigest().encode())
                    for number, callee in below.calls[one]
                    if (span := self.block.card(number).target_span) is not None
                ]
                texts[one] = content(self.definition(one), (*self.shared, *changes), called)
            self._texts[key] = texts
        return self._texts[key]

    def definition(self, name: str) -> Subcircuit:
        """Return a definition by its lower-case name."""
        return self.block.netlist.subcircuits[name]

    def shown(self, name: str) -> str:
        """Return the name of a definition as written."""
        if name in self.copies:
            return self.copies[name].name
        definition = self.definition(name)
        return definition.name if definition.name_span is None else definition.name_span.text

    # What is done.

    def change(self, name: str, changes: Sequence[Respelling], *, detached: bool) -> None:
        """Write changes where they stand; what others call too is copied for this definition.

        Parameters
        ----------
        name : str
            The definition.
        changes : sequence of Respelling
            In it and in what it calls.
        detached : bool
            Whether a number takes the place of an expression, which only a copy should lose.
        """
        below = self.block.below(name)
        owned = below.owned(self.block.bindings)
        own, renamed = self._own(below, changes), dict[str, str]()
        for one in below.order:
            made = (*own[one], *self._moves(below, one, renamed, changes))
            if not made:
                continue
            if one == name or (one in owned and self._may_change(one, detached=detached)):
                self.in_place += made
                text = self._all_texts(name, changes)[one]
                self._copied.setdefault((self.block.family(one).root, text), one)
                self.moved.update(_targets(below, one, renamed))
            else:
                callers = below.callers[one]
                copy = LeafCopy(self.definition(one), "", callers, made, self.shown(name))
                renamed[one] = self._copy(copy, self._all_texts(name, changes)[one])
        texts = self._all_texts(name, changes)
        self.changed.update(
            one for one in below.order if one not in renamed and texts[one] != self.text(one)
        )

    def copy(self, name: str, changes: Sequence[Respelling], callers: tuple[int, ...]) -> str:
        """Return the name of a copy of a definition, with copies of what changes below it.

        Parameters
        ----------
        name : str
            The definition.
        changes : sequence of Respelling
            In it and in what it calls.
        callers : tuple of int
            The cards that will call the copy.
        """
        below, texts = self.block.below(name), self._all_texts(name, changes)
        copy = LeafCopy(self.definition(name), "", callers, ())
        known = self._known(name, texts[name])
        if known:
            return self._copy(copy, texts[name])
        free = self._free_name(name)
        own, renamed = self._own(below, changes), dict[str, str]()
        for one in below.order:
            made = (*own[one], *self._moves(below, one, renamed, changes))
            if one == name:
                copy = replace(copy, name=free, changes=made)
                renamed[one] = self._copy(copy, texts[one])
            elif made:
                inner = LeafCopy(self.definition(one), "", below.callers[one], made, free)
                renamed[one] = self._copy(inner, texts[one])
        return renamed[name]

    def _may_change(self, name: str, *, detached: bool) -> bool:
        """Tell whether a definition that a leaf calls may change where it stands."""
        is_first = self.block.family(name).root == name
        return name not in self.changed | self.held and not (is_first and detached)

    def _moves(
        self, below: Below, name: str, renamed: Mapping[str, str], changes: Sequence[Respelling]
    ) -> list[Respelling]:
        """Return what makes the calls in a definition call copies."""
        return [
            retargeting(self.block.netlist, number, self.shown(target), changes)
            for number, target in _targets(below, name, renamed).items()
        ]

    def having(self, family: Family, text: bytes) -> list[str]:
        """Return the members of a family that have a text, and keep it."""
        sizing = self.block.sizing_scopes
        return [
            member
            for member in family.members
            if member not in self.changed
            and self.text(member) == text
            and sizing.isdisjoint(self.block.below(member).order)
        ]

    def _known(self, name: str, text: bytes) -> str:
        """Return a definition of a family that has a text, or a new copy with it; empty if none."""
        family = self.block.family(name)
        return next(iter(self.having(family, text)), "") or self._copied.get(
            (family.root, text), ""
        )

    def _copy(self, copy: LeafCopy, text: bytes) -> str:
        """Return the lower-case name of a definition with a text: one there is, or this new one."""
        assert copy.leaf.name_span is not None
        original = copy.leaf.name.lower()
        known = self._known(original, text)
        if known in self.copies:
            there = self.copies[known]
            callers = tuple(dict.fromkeys((*there.callers, *copy.callers)))
            self.copies[known] = replace(there, callers=callers)
        elif not known:
            copy = replace(copy, name=copy.name or self._free_name(original))
            known = copy.name.lower()
            self.copies[known] = copy
            self._copied[self.block.family(original).root, text] = known
        self.hold(known)
        return known

    def hold(self, name: str) -> None:
        """Keep a definition, with all that it calls, as it is now."""
        self.held.add(name)
        if name not in self.copies:
            self.held.update(self.block.below(name).order)

    def _free_name(self, name: str) -> str:
        if not self._taken:
            self._taken = taken_names(self.block.netlist)
        return free_name(self.shown(name), self._taken)

    def _own(self, below: Below, changes: Iterable[Respelling]) -> dict[str, list[Respelling]]:
        """Return the changes that stand in each definition itself, not in one inside it."""
        bodies = {name: self.block.body(name) for name in below.order}
        own: dict[str, list[Respelling]] = {name: [] for name in below.order}
        for change in changes:
            around = [name for name, body in bodies.items() if _is_within(change.span, body)]
            own[min(around, key=lambda name: bodies[name].end - bodies[name].start)].append(change)
        return own


def _is_within(inner: Span, outer: Span) -> bool:
    same = inner.source.path == outer.source.path
    return same and outer.start <= inner.start and inner.end <= outer.end


def _targets(below: Below, name: str, renamed: Mapping[str, str]) -> dict[int, str]:
    """Return the calls in a definition that get another target, with it."""
    calls = below.calls[name]
    return {number: renamed[callee] for number, callee in calls if callee in renamed}
