"""A block together with its sizing variables, as the rewriting of widths sees it."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from evenstage.netlist.rewriting.below import find_below
from evenstage.netlist.rewriting.bindings import Bindings
from evenstage.netlist.rewriting.families import Family, find_families
from evenstage.netlist.rewriting.fingers import Drawing
from evenstage.netlist.rewriting.tracing import Tracer

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping
    from pathlib import Path

    from evenstage.netlist.devices import Devices, FloatArray, IntArray
    from evenstage.netlist.netlist import Card, Netlist, Parameter
    from evenstage.netlist.rewriting.below import Below
    from evenstage.netlist.rewriting.bindings import Ways
    from evenstage.process.process import Process, Transistor
    from evenstage.source import Span

#: Relative difference below which two sizes are one.
_SAME: Final = 1e-9


class Slot(NamedTuple):
    """One width of one sizing variable.

    ``card`` is the number of the transistor card, or of the X card that calls a wrapped transistor.
    ``caller`` is the number of the X card that calls the leaf holding it, itself or in a subcircuit
    that the leaf calls, where that call is the sizing variable; None: the card has one width for
    all callers of its subcircuit.
    """

    card: int
    caller: int | None = None


@dataclass(frozen=True, kw_only=True)
class SizedBlock:
    """A block, its process and which widths belong to which sizing variable.

    Parameters
    ----------
    devices : Devices
        The block.
    process : Process
        What a card's width means.
    variable_of : Mapping of Slot to int
        The sizing variable of each slot; transistors outside all variables do not occur.
    copies_per_leaf : int
        How many sized copies of one leaf may be added.
    """

    devices: Devices
    process: Process
    variable_of: Mapping[Slot, int]
    copies_per_leaf: int = 4

    @cached_property
    def defined_again(self) -> dict[str, str]:
        """Where the text defines a subcircuit a second time, by its lower-case name.

        Of equal definitions the reader takes the first; changed, it would give way to the second.
        A file that is included twice is one text and no such case.
        """
        counting = np.zeros(len(self.netlist), bool)
        scopes = {**self.netlist.subcircuits, "": self.netlist.top}
        for subcircuit in scopes.values():
            counting[subcircuit.cards] = True
        again: dict[str, str] = {}
        for number in np.flatnonzero(~counting).tolist():
            card = self.card(number)
            body = scopes[card.scope].body
            is_later = number > max(scopes[card.scope].cards, default=number)
            if body is not None and is_later and not _is_inside(card.span, body):
                again.setdefault(card.scope, card.span.place)
        return again

    def is_read_again(self, card: Card) -> bool:
        """Tell whether a card's text makes other cards too, in a file that is included again."""
        body = self.netlist.subcircuits[card.scope].body if card.scope else None
        main = self.netlist.sources[0].path
        at_home = card.span.source.path == main if body is None else _is_inside(card.span, body)
        return not at_home and self._readings[card.span.source.path, card.span.start] > 1

    @property
    def netlist(self) -> Netlist:
        """The text."""
        return self.devices.netlist

    @property
    def card(self) -> Callable[[int], Card]:
        """Gives the card of a number."""
        return self.bindings.card

    def transistor(self, card: int) -> Transistor:
        """Return the type of a transistor card."""
        model = self.devices.models[int(self.devices.model[self._device_of_card[card]])]
        return self.process.transistors[model.type_index]

    def device(self, slot: Slot) -> int:
        """Return the first device of a slot.

        Raises
        ------
        KeyError
            If the block has none: a fault of ours.
        """
        if slot.caller is None:
            return self._device_of_card[slot.card]
        return self._device_of_call[slot.card, slot.caller]

    def drawing(self, slot: Slot) -> Drawing:
        """Return how a slot is drawn."""
        device = self.device(slot)
        return Drawing(float(self.devices.width[device]), float(self.devices.fingers[device]))

    def is_drawn_once(self, slot: Slot) -> bool:
        """Tell whether all devices of a slot have the same width, areas and edges."""
        mine = self.devices.card == slot.card
        if slot.caller is not None:
            mine &= self._callers == slot.caller
        of = self.devices
        columns = (of.width, of.drain_area, of.source_area, of.drain_edge, of.source_edge)
        return all(_is_constant(column[mine]) for column in columns)

    # Leaves and what they call.

    def leaf(self, slot: Slot) -> str:
        """Return the subcircuit whose call is the sizing variable, or else the card's own."""
        caller = self.card(slot.card if slot.caller is None else slot.caller)
        return caller.scope if slot.caller is None else self.netlist.callee(caller)

    def below(self, leaf: str) -> Below:
        """Return what a leaf calls, directly and through others."""
        if leaf not in self._below:
            self._below[leaf] = find_below(self.bindings, leaf)
        return self._below[leaf]

    @cached_property
    def _below(self) -> dict[str, Below]:
        return {}

    def way(self, slot: Slot) -> int | None:
        """Return the X card that calls the subcircuit of a slot's first device."""
        if slot.caller is None:
            return self.bindings.callers(self.card(slot.card).scope)[0]
        return int(self._direct_callers[self.device(slot)])

    def ways(self, slot: Slot) -> Ways:
        """Return the X cards that call the subcircuit of a slot's card, where they count for it."""
        scope = self.card(slot.card).scope
        if slot.caller is not None and self.leaf(slot) == scope:
            return (slot.caller,)
        return self.tracer_of(slot).bindings.callers(scope)

    def tracer_of(self, slot: Slot) -> Tracer:
        """Return what finds the numbers behind a width, by way of its leaf's call alone."""
        leaf = self.leaf(slot)
        if slot.caller is None or leaf == self.card(slot.card).scope:
            return self.tracer
        if slot.caller not in self._tracers:
            only = {**self.below(leaf).callers, leaf: (slot.caller,)}
            self._tracers[slot.caller] = Tracer(replace(self.bindings, only=only))
        return self._tracers[slot.caller]

    @cached_property
    def _tracers(self) -> dict[int, Tracer]:
        return {}

    def leaf_around(self, scope: str) -> str | None:
        """Return a leaf that calls a subcircuit on its way to transistors sized with the leaf."""
        return self._leaf_around.get(scope)

    @cached_property
    def _leaf_around(self) -> Mapping[str, str]:
        direct = set(zip(self.devices.card.tolist(), self._direct_callers.tolist(), strict=True))
        deep = (s for s in self.variable_of if s.caller is not None and tuple(s) not in direct)
        found: dict[str, str] = {}
        for leaf in dict.fromkeys(map(self.leaf, deep)):
            found.update(dict.fromkeys(self.below(leaf).order[:-1], leaf))
        return found

    def own_width(self, card: Card) -> Parameter | None:
        """Return the width as a transistor card gives it, or None if it does not."""
        return card.parameter(self.width_name(card))

    def width_name(self, card: Card) -> str:
        """Return the lower-case name of the parameter that holds a transistor card's width."""
        return self.transistor(card.number).width_parameter.lower()

    def is_one_for_all(self, slot: Slot, scope: str) -> bool:
        """Tell whether all callers of a slot's leaf belong to one variable.

        The definition that holds what changes, ``scope``, must serve nobody else.
        """
        key = slot.card, self.leaf(slot), scope
        if key not in self._one_for_all:
            self._one_for_all[key] = self._agrees(*key)
        return self._one_for_all[key]

    @cached_property
    def _one_for_all(self) -> dict[tuple[int, str, str], bool]:
        return {}

    def _agrees(self, card: int, leaf: str, scope: str) -> bool:
        callers = self.bindings.callers(leaf)
        variables = {self.variable_of.get(Slot(card, caller)) for caller in callers}
        one = len(variables) == 1 and None not in variables
        return one and (scope == leaf or scope in self.below(leaf).owned(self.bindings))

    def copies_called(self, family: Family) -> int:
        """Return how many copies of a leaf some sizing variables call."""
        return sum(map(self.is_called_for_size, family.copies))

    def is_called_for_size(self, leaf: str) -> bool:
        """Tell whether a sizing variable calls a definition."""
        return any(caller in self.sized_callers for caller in self.bindings.callers(leaf))

    def is_called_elsewhere(self, leaf: str) -> bool:
        """Tell whether a leaf is called by cards that are no sizing variables."""
        return any(caller not in self.sized_callers for caller in self.bindings.callers(leaf))

    @cached_property
    def sizing_scopes(self) -> frozenset[str]:
        """The definitions that hold cards with sizes of their own: calls of leaves, transistors."""
        holders = {slot.card if slot.caller is None else slot.caller for slot in self.variable_of}
        return frozenset(map(self.netlist.cards.scope, holders))

    @cached_property
    def sized_callers(self) -> frozenset[int]:
        """The X cards that are sizing variables."""
        return frozenset(slot.caller for slot in self.variable_of if slot.caller is not None)

    def body(self, name: str) -> Span:
        """Return the text of a definition."""
        body = self.netlist.subcircuits[name].body
        assert body is not None
        return body

    def is_editable(self, span: Span) -> bool:
        """Tell whether a span's file lies in the folder of the main file or below it.

        Included by a name from the root it would be read there whatever is written elsewhere.
        """
        return span.source.path in self._editable

    def holds_definitions(self, scope: str) -> bool:
        """Tell whether further subcircuits are defined inside one."""
        outer = self.netlist.subcircuits[scope].body
        bodies = [s.body for s in self.netlist.subcircuits.values()]
        return outer is None or any(_is_inside(body, outer) for body in bodies if body)

    def family(self, scope: str) -> Family:
        """Return a leaf, given by its lower-case name, with its copies or its original."""
        return self._families.get(scope) or Family(scope)

    @cached_property
    def _families(self) -> Mapping[str, Family]:
        return find_families(self.netlist)

    @cached_property
    def bindings(self) -> Bindings:
        """The parameter names of the text."""
        return Bindings.of(self.netlist, frozenset(self._device_of_card))

    @cached_property
    def tracer(self) -> Tracer:
        """Finds the numbers that widths come from."""
        return Tracer(self.bindings)

    @cached_property
    def _direct_callers(self) -> IntArray:
        """Number of the X card that calls each transistor's subcircuit, -1 for the block's own."""
        return self.devices.instance_card[self.devices.instance]

    @cached_property
    def _callers(self) -> IntArray:
        """Number of the X card whose size each transistor has; else that of its subcircuit."""
        parent, card = self.devices.instance_parent, self.devices.instance_card
        caller = np.where(np.isin(card, list(self.sized_callers)), card, -1)
        # Outermost calls count: each round takes over what the level above has found.
        waiting = np.flatnonzero((parent > 0) & (caller[parent] >= 0))
        while waiting.size:
            caller[waiting] = caller[parent[waiting]]
            waiting = np.flatnonzero(np.isin(parent, waiting))
        return np.where(caller < 0, card, caller)[self.devices.instance]

    @cached_property
    def _readings(self) -> Counter[tuple[Path, int]]:
        """How many cards begin at each place."""
        spans = (self.netlist.card(number).span for number in range(len(self.netlist)))
        return Counter((span.source.path, span.start) for span in spans)

    @cached_property
    def _editable(self) -> frozenset[Path]:
        main = self.netlist.sources[0].path
        folders = (main.parent, self.netlist.folder.resolve())
        paths = {source.path for source in self.netlist.sources} - self.netlist.rooted
        return frozenset(p for p in paths if any(map(p.is_relative_to, folders))) | {main}

    @cached_property
    def _device_of_card(self) -> dict[int, int]:
        cards, firsts = np.unique(self.devices.card, return_index=True)
        return dict(zip(cards.tolist(), firsts.tolist(), strict=True))

    @cached_property
    def _device_of_call(self) -> dict[tuple[int, int], int]:
        pairs = np.stack([self.devices.card, self._callers])
        pairs, firsts = np.unique(pairs, axis=1, return_index=True)
        return dict(zip(zip(*pairs.tolist(), strict=True), firsts.tolist(), strict=True))


def _is_constant(values: FloatArray) -> bool:
    """Tell whether values are equal but for noise, or all unknown."""
    known = values[~np.isnan(values)]
    if not len(known):
        return True
    spread = float(np.ptp(known))
    return len(known) == len(values) and spread <= _SAME * float(np.abs(known).max())


def _is_inside(inner: Span, outer: Span) -> bool:
    """Tell whether one definition stands inside another."""
    same_file = inner.source.path == outer.source.path
    return same_file and outer.start < inner.start and inner.end <= outer.end
