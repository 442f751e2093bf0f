"""Which definition each caller of a leaf will call: the leaf, a copy there is, or a new one.

Callers that want the same text share a definition. A text that a member of the family has already
is taken from there. A definition that nobody wants as it is any more is changed where it stands,
the first leaf only if all its callers agree. All else becomes a new copy, and copies that are left
without callers go.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Literal, NamedTuple

from evenstage.netlist.rewriting.copies import retargeting

if TYPE_CHECKING:
    from collections.abc import Collection, Mapping, Sequence

    from evenstage.netlist.rewriting.families import Family
    from evenstage.netlist.rewriting.ledger import Entry
    from evenstage.netlist.rewriting.respelling import Respelling
    from evenstage.netlist.rewriting.sized_block import SizedBlock
    from evenstage.netlist.rewriting.stock import Stock


@dataclass(frozen=True, slots=True)
class _Group:
    """Callers that want one text."""

    text: bytes
    callers: tuple[int, ...]


class _Decision(NamedTuple):
    """What is done for a group: a member has its text, is changed, or is copied."""

    way: Literal["there", "change", "copy"]
    member: str


@dataclass
class Placing:
    """The callers of one family.

    Parameters
    ----------
    stock : Stock
        The definitions.
    family : Family
        The leaf and its copies.
    wished : Mapping of int to sequence of Entry
        What each caller wants changed in the definition it calls.
    calls : dict of int to str
        The definition that each caller will call, once ``place`` has decided.
    """

    stock: Stock
    family: Family
    wished: Mapping[int, Sequence[Entry]]
    calls: dict[int, str] = field(default_factory=dict)

    @property
    def block(self) -> SizedBlock:
        """The block."""
        return self.stock.block

    def place(self) -> None:
        """Decide for every caller.

        Raises
        ------
        ValueError
            If the family would have more copies than allowed: a fault of ours.
        """
        plan = self._decided(in_place_first=False)
        if self._copies_in(plan) > self.block.copies_per_leaf:
            plan = self._decided(in_place_first=True)
        for member in self.family.members:
            self.calls.update(dict.fromkeys(self._staying(member), member))
        for group, decision in zip(self._groups, plan, strict=True):
            self.calls.update(dict.fromkeys(group.callers, self._done(group, decision)))
        count, allowed = len(self._called() - {self.family.root}), self.block.copies_per_leaf
        if count > allowed and self._called() & self.stock.copies.keys():
            raise ValueError(f"{count} copies of {self.family.root}, {allowed} allowed")

    def _called(self) -> set[str]:
        """Return the definitions that sizing variables call."""
        sized = self.block.sized_callers
        return {member for caller, member in self.calls.items() if caller in sized}

    def _decided(self, *, in_place_first: bool) -> list[_Decision]:
        """Return what is done for each group.

        Parameters
        ----------
        in_place_first : bool
            Whether a member is changed for a group even if another one has its text already, or it
            has a text itself that others want. That takes fewer copies where they are scarce.
        """
        changed, held = set(self.stock.changed), set(self.stock.held)
        wanted = set() if in_place_first else {group.text for group in self._groups}
        plan: list[_Decision] = []
        for group in self._groups:
            there = self._with_text(group, changed)
            member = self._to_change(group, changed | held, wanted)
            if there is not None and not (in_place_first and member):
                held.add(there)
                plan.append(_Decision("there", there))
            elif member is not None:
                changed.add(member)
                plan.append(_Decision("change", member))
            else:
                plan.append(_Decision("copy", self._member(group.callers[0])))
        return plan

    def _copies_in(self, plan: Sequence[_Decision]) -> int:
        """Return how many copies sizing variables would call."""
        sized, root = self.block.sized_callers, self.family.root
        staying = {
            member for member in self.family.copies if sized.intersection(self._staying(member))
        }
        there = {one.member for one in plan if one.way != "copy" and one.member != root}
        return len(staying | there) + sum(one.way == "copy" for one in plan)

    def _done(self, group: _Group, decision: _Decision) -> str:
        """Do what was decided for a group; return what it will call."""
        if decision.way == "there":
            self.stock.hold(decision.member)
            return decision.member
        if decision.way == "copy":
            changes = self._changes(group.callers[0])
            return self.stock.copy(decision.member, changes, group.callers)
        first = next(c for c in group.callers if self._member(c) == decision.member)
        changes, detached = self._changes(first), self._detaches([first])
        self.stock.change(decision.member, changes, detached=detached)
        return decision.member

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
        return self.stock.text(self._member(caller), self._changes(caller))

    def _member(self, caller: int) -> str:
        return self.block.netlist.callee(self.block.card(caller))

    def _changes(self, caller: int) -> tuple[Respelling, ...]:
        return tuple(entry.value.respelling for entry in self.wished[caller])

    def _callers(self, member: str) -> list[int]:
        return [c for c in self.block.bindings.callers(member) if c is not None]

    def _staying(self, member: str) -> list[int]:
        """Return the callers of a member that want nothing."""
        return [caller for caller in self._callers(member) if caller not in self.wished]

    def _with_text(self, group: _Group, changed: Collection[str]) -> str | None:
        """Return a member that has a group's text already; one that keeps callers first."""
        fitting = [m for m in self.stock.having(self.family, group.text) if m not in changed]
        return min(fitting, key=lambda member: not self._staying(member), default=None)

    def _to_change(
        self, group: _Group, touched: Collection[str], wanted: Collection[bytes]
    ) -> str | None:
        """Return a member that a group's text can be written into."""
        calling: dict[str, list[int]] = {}
        for caller in group.callers:
            calling.setdefault(self._member(caller), []).append(caller)
        for member in sorted(calling, key=lambda m: (-len(calling[m]), calling[m])):
            free = member not in touched and self.stock.text(member) not in wanted
            if free and self._may_change(member, calling[member]):
                return member
        return None

    def _may_change(self, member: str, callers: Sequence[int]) -> bool:
        if self._staying(member):
            return False
        if member != self.family.root:
            return True
        return not self._detaches(callers) and set(callers) == set(self._callers(member))

    def _detaches(self, callers: Sequence[int]) -> bool:
        """Tell whether some callers want a number in the place of an expression."""
        return any(e.value.way == "detached" for c in callers for e in self.wished[c])

    # What follows.

    def moves(self) -> list[Respelling]:
        """Return what makes the X cards call other definitions than so far."""
        return [
            retargeting(self.block.netlist, caller, self.stock.shown(target), self._changes(caller))
            for caller, target in sorted(self.calls.items())
            if target != self._member(caller)
        ]

    @property
    def left(self) -> tuple[str, ...]:
        """The name of the leaf as first drawn if it had callers and they all go to copies."""
        root = self.family.root
        calling = [caller for caller in self.calls if self._member(caller) == root]
        gone = bool(calling) and root not in self.calls.values()
        return (self.stock.shown(root),) if gone else ()
