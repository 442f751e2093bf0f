"""Which definition each caller of a leaf will call: the leaf, a copy there is, or a new one.

Callers that want the same text share a definition. A text that a member of the family has already
is taken from there. A definition that nobody wants as it is any more is changed where it stands,
the first leaf only if all its callers agree. All else becomes a new copy, and copies that are left
without callers go.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING

from evenstage.netlist.rewriting.copies import (
    LeafCopy,
    content,
    free_name,
    insertions,
    retargeting,
    wishes_key,
)
from evenstage.netlist.rewriting.families import recall, removal

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from evenstage.netlist.rewriting.edits import Edit
    from evenstage.netlist.rewriting.families import Family
    from evenstage.netlist.rewriting.ledger import Entry
    from evenstage.netlist.rewriting.respelling import Respelling
    from evenstage.netlist.rewriting.sized_block import SizedBlock


@dataclass(frozen=True, slots=True)
class _Group:
    """Callers that want one text."""

    text: bytes
    callers: tuple[int, ...]


@dataclass
class Placing:
    """The callers of one family.

    Parameters
    ----------
    block : SizedBlock
        The block.
    family : Family
        The leaf and its copies.
    wished : Mapping of int to sequence of Entry
        What each caller wants changed in the definition it calls.
    shared : sequence of Respelling
        What changes for everybody.
    """

    block: SizedBlock
    family: Family
    wished: Mapping[int, Sequence[Entry]]
    shared: Sequence[Respelling]
    _texts: dict[object, bytes] = field(default_factory=dict, repr=False)
    _place: dict[int, str] = field(default_factory=dict, repr=False)
    _changed_members: set[str] = field(default_factory=set, repr=False)
    in_place: list[Respelling] = field(default_factory=list)
    new: list[LeafCopy] = field(default_factory=list)

    def place(self, taken: set[str]) -> None:
        """Decide for every caller; ``taken`` are names no new copy may have.

        Raises
        ------
        ValueError
            If the family would have more copies than allowed: a fault of ours.
        """
        for member in self.family.members:
            self._place.update(dict.fromkeys(self._staying(member), member))
        for group in self._groups:
            member = self._with_text(group) or self._changed(group) or self._copied(group, taken)
            self._place.update(dict.fromkeys(group.callers, member))
        self._check()

    @cached_property
    def _groups(self) -> list[_Group]:
        """The callers that want something, most callers first, else in the order of the text."""
        callers_of: dict[bytes, list[int]] = {}
        for caller in sorted(self.wished):
            callers_of.setdefault(self._wanted(caller), []).append(caller)
        groups = [_Group(text, tuple(callers)) for text, callers in callers_of.items()]
        return sorted(groups, key=lambda group: -len(group.callers))

    def _wanted(self, caller: int) -> bytes:
        """Return the text a caller wants."""
        member, changes = self._member(caller), self._changes(caller)
        key = (member, wishes_key(changes))
        if key not in self._texts:
            leaf = self.block.netlist.subcircuits[member]
            self._texts[key] = content(leaf, (*self.shared, *changes))
        return self._texts[key]

    def _text(self, member: str) -> bytes:
        """Return the text a member has for all who want nothing."""
        if member not in self._texts:
            self._texts[member] = content(self.block.netlist.subcircuits[member], self.shared)
        return self._texts[member]

    def _member(self, caller: int) -> str:
        return self.block.netlist.callee(self.block.card(caller))

    def _changes(self, caller: int) -> tuple[Respelling, ...]:
        return tuple(entry.value.respelling for entry in self.wished[caller])

    def _callers(self, member: str) -> list[int]:
        return [c for c in self.block.bindings.callers(member) if c is not None]

    def _staying(self, member: str) -> list[int]:
        """Return the callers of a member that want nothing."""
        return [caller for caller in self._callers(member) if caller not in self.wished]

    def _with_text(self, group: _Group) -> str | None:
        """Return a member that has a group's text already; one that keeps callers first."""
        fitting = [
            member
            for member in self.family.members
            if member not in self._changed_members and self._text(member) == group.text
        ]
        return min(fitting, key=lambda member: not self._staying(member), default=None)

    def _changed(self, group: _Group) -> str | None:
        """Return a member that a group's text can be written into, and write it there."""
        calling: dict[str, list[int]] = {}
        for caller in group.callers:
            calling.setdefault(self._member(caller), []).append(caller)
        for member in sorted(calling, key=lambda m: (-len(calling[m]), calling[m])):
            if self._may_change(member, calling[member]):
                self._changed_members.add(member)
                self.in_place += self._changes(calling[member][0])
                return member
        return None

    def _may_change(self, member: str, callers: Sequence[int]) -> bool:
        wanted = {group.text for group in self._groups}
        if member in self._changed_members or self._staying(member) or self._text(member) in wanted:
            return False
        if member != self.family.root:
            return True
        detached = any(e.value.way == "detached" for c in callers for e in self.wished[c])
        return not detached and set(callers) == set(self._callers(member))

    def _copied(self, group: _Group, taken: set[str]) -> str:
        """Add a copy with a group's text and return its name."""
        first = group.callers[0]
        leaf = self.block.netlist.subcircuits[self._member(first)]
        name = free_name(leaf.name_span.text if leaf.name_span else leaf.name, taken)
        self.new.append(LeafCopy(leaf, name, group.callers, self._changes(first)))
        return name

    def _check(self) -> None:
        kept = {member for member in self._place.values() if member in self.family.copies}
        count = len(kept) + len(self.new)
        if self.new and count > self.block.copies_per_leaf:
            allowed = self.block.copies_per_leaf
            raise ValueError(f"{count} copies of {self.family.root}, {allowed} allowed")

    # What follows.

    def moves(self) -> list[Respelling]:
        """Return what makes the X cards call other definitions than so far."""
        return [
            retargeting(self.block.netlist, caller, self._name(target), self._changes(caller))
            for caller, target in sorted(self._place.items())
            if target != self._member(caller)
        ]

    def _name(self, member: str) -> str:
        known = self.block.netlist.subcircuits.get(member)
        return member if known is None or known.name_span is None else known.name_span.text

    @cached_property
    def unused(self) -> tuple[str, ...]:
        """The copies that nobody calls any more and that may be edited."""
        used = set(self._place.values())
        return tuple(
            member for member in self.family.copies if member not in used and self._may_go(member)
        )

    def _may_go(self, member: str) -> bool:
        body = self.block.netlist.subcircuits[member].body
        return body is not None and self.block.is_editable(body)

    @property
    def left(self) -> tuple[str, ...]:
        """The name of the leaf as first drawn if it had callers and they all go to copies."""
        root = self.family.root
        calling = [caller for caller, _ in self._place.items() if self._member(caller) == root]
        return (self._name(root),) if calling and root not in self._place.values() else ()

    def edits(self, elsewhere: Iterable[Respelling]) -> list[Edit]:
        """Return what is added and taken out, and who is said to call what."""
        netlist = self.block.netlist
        callers_of: dict[str, list[int]] = {}
        for caller, member in sorted(self._place.items()):
            callers_of.setdefault(member, []).append(caller)
        told = [
            edit
            for member in self.family.copies
            if set(callers := callers_of.get(member, [])) - set(self._callers(member))
            for edit in recall(netlist, netlist.subcircuits[member], tuple(callers))
        ]
        gone = [removal(netlist.subcircuits[member]) for member in self.unused]
        return [*gone, *insertions(netlist, self.new, tuple(elsewhere)), *told]
