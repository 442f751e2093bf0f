"""A block together with its sizing variables, as the rewriting of widths sees it."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from evenstage.netlist.rewriting.bindings import Bindings
from evenstage.netlist.rewriting.families import Family, find_families
from evenstage.netlist.rewriting.fingers import Drawing
from evenstage.netlist.rewriting.tracing import Tracer

if TYPE_CHECKING:
    from collections.abc import Callable, Mapping
    from pathlib import Path

    from evenstage.netlist.devices import Devices, IntArray
    from evenstage.netlist.netlist import Card, Netlist, Parameter
    from evenstage.process.process import Process, Transistor
    from evenstage.source import Span


class Slot(NamedTuple):
    """One width of one sizing variable.

    ``card`` is the number of the transistor card, or of the X card that calls a wrapped transistor.
    ``caller`` is the number of the X card that calls the leaf holding it, where that call is the
    sizing variable; None: the card has one width for all callers of its subcircuit.
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

        On a call that reaches the card only through further calls it is the card's first device.

        Raises
        ------
        KeyError
            If the block has none: a fault of ours.
        """
        on_call = None
        if slot.caller is not None:
            on_call = self._device_of_call.get((slot.card, slot.caller))
        return self._device_of_card[slot.card] if on_call is None else on_call

    def drawing(self, slot: Slot) -> Drawing:
        """Return how a slot is drawn."""
        device = self.device(slot)
        return Drawing(float(self.devices.width[device]), float(self.devices.fingers[device]))

    def has_one_width(self, slot: Slot) -> bool:
        """Tell whether all devices of a slot are equally wide."""
        mine = self.devices.card == slot.card
        if slot.caller is not None:
            mine &= self._callers == slot.caller
        widths = self.devices.width[mine]
        return bool(np.ptp(widths) <= 1e-9 * widths.max())

    def own_width(self, card: Card) -> Parameter | None:
        """Return the width as a transistor card gives it, or None if it does not."""
        return card.parameter(self.width_name(card))

    def width_name(self, card: Card) -> str:
        """Return the lower-case name of the parameter that holds a transistor card's width."""
        return self.transistor(card.number).width_parameter.lower()

    def is_one_for_all(self, card: Card) -> bool:
        """Tell whether all callers of a card's leaf belong to one variable."""
        everybody = len(self.bindings.callers(card.scope))
        return self._slots_of_card[card.number] == everybody and card.number in self._one_variable

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
        return Bindings(self.netlist, frozenset(self._device_of_card))

    @cached_property
    def tracer(self) -> Tracer:
        """Finds the numbers that widths come from."""
        return Tracer(self.bindings)

    @cached_property
    def _callers(self) -> IntArray:
        """Number of the X card that calls each transistor's subcircuit, -1 for the block's own."""
        return self.devices.instance_card[self.devices.instance]

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
    def _slots_of_card(self) -> Counter[int]:
        return Counter(slot.card for slot in self.variable_of)

    @cached_property
    def _one_variable(self) -> frozenset[int]:
        """The cards whose slots all belong to one variable."""
        pairs = {(slot.card, variable) for slot, variable in self.variable_of.items()}
        counts = Counter(card for card, _ in pairs)
        return frozenset(card for card, count in counts.items() if count == 1)

    @cached_property
    def _device_of_card(self) -> dict[int, int]:
        cards, firsts = np.unique(self.devices.card, return_index=True)
        return dict(zip(cards.tolist(), firsts.tolist(), strict=True))

    @cached_property
    def _device_of_call(self) -> dict[tuple[int, int], int]:
        pairs = np.stack([self.devices.card, self._callers])
        pairs, firsts = np.unique(pairs, axis=1, return_index=True)
        return dict(zip(zip(*pairs.tolist(), strict=True), firsts.tolist(), strict=True))


def _is_inside(inner: Span, outer: Span) -> bool:
    """Tell whether one definition stands inside another."""
    same_file = inner.source.path == outer.source.path
    return same_file and outer.start < inner.start and inner.end <= outer.end
