"""Who calls which definition after a run, and which ones nobody calls any more."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

from evenstage.netlist.rewriting.families import recall

if TYPE_CHECKING:
    from collections.abc import Collection, Iterator, Mapping

    from evenstage.netlist.rewriting.edits import Edit
    from evenstage.netlist.rewriting.families import Family
    from evenstage.netlist.rewriting.sized_block import SizedBlock
    from evenstage.netlist.rewriting.stock import Stock


@dataclass(frozen=True)
class Calls:
    """The calls of all leaves a run has looked at.

    Parameters
    ----------
    stock : Stock
        The definitions, changed and copied.
    placed : Mapping of int to str
        The definition that each call of a leaf will call.
    """

    stock: Stock
    placed: Mapping[int, str]

    @property
    def _block(self) -> SizedBlock:
        return self.stock.block

    @cached_property
    def _targets(self) -> Mapping[int, str]:
        """The definition that each call will call that was looked at."""
        return {**self.placed, **self.stock.moved}

    @cached_property
    def _coming(self) -> Mapping[str, list[int]]:
        coming: dict[str, list[int]] = {}
        for caller, target in self._targets.items():
            coming.setdefault(target, []).append(caller)
        return coming

    @cached_property
    def _families(self) -> dict[Family, None]:
        """The families of all leaves concerned, and of all that these call."""
        leaves = {self._before(caller) for caller in self.placed} | set(self.placed.values())
        known = sorted(leaves & self._block.netlist.subcircuits.keys())
        below = dict.fromkeys(name for leaf in known for name in self._block.below(leaf).order)
        return dict.fromkeys(map(self._block.family, below))

    def _before(self, caller: int) -> str:
        return self._block.netlist.callee(self._block.card(caller))

    def _callers_before(self, name: str) -> list[int]:
        return [c for c in self._block.bindings.callers(name) if c is not None]

    def _callers(self, name: str, gone: Collection[str]) -> list[int]:
        """Return the cards of the text that call a definition in the end."""
        staying = [c for c in self._callers_before(name) if self._targets.get(c, name) == name]
        found = sorted({*staying, *self._coming.get(name, ())})
        return [caller for caller in found if self._block.card(caller).scope not in gone]

    @cached_property
    def _called_by_copies(self) -> frozenset[str]:
        """The definitions that new copies call."""
        found: set[str] = set()
        for copy in self.stock.copies.values():
            for number, callee in self._block.bindings.calls(copy.leaf.name.lower()):
                target = self._block.card(number).target_span
                found.update([c.new.lower() for c in copy.changes if c.span == target] or [callee])
        return frozenset(found)

    def unused(self) -> tuple[str, ...]:
        """Return the copies of earlier runs that nobody calls any more and that may be edited."""
        gone: dict[str, None] = {}
        copies = [copy for family in self._families for copy in family.copies]
        while True:
            more = [
                name
                for name in copies
                if name not in gone and self._may_go(name) and not self._callers(name, gone)
            ]
            if not more:
                return tuple(gone)
            gone.update(dict.fromkeys(more))

    def _may_go(self, name: str) -> bool:
        held = name in self._called_by_copies or name in self.stock.held
        return not held and self._block.is_editable(self._block.body(name))

    def told(self, gone: Collection[str]) -> Iterator[Edit]:
        """Yield what says above copies of earlier runs who calls them now, where others do."""
        for family in self._families:
            for name in family.copies:
                callers = self._callers(name, gone)
                if name not in gone and set(callers) - set(self._callers_before(name)):
                    definition = self.stock.definition(name)
                    yield from recall(self._block.netlist, definition, tuple(callers))
