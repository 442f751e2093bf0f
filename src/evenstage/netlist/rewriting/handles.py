"""Which widths of a block can be changed, and how far, before anything is optimised."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

from evenstage.errors import Notice
from evenstage.netlist.rewriting.fingers import Drawing, drawable, widest
from evenstage.netlist.rewriting.origins import Origin, find_origins
from evenstage.netlist.rewriting.sized_block import SizedBlock, Slot
from evenstage.netlist.rewriting.spelling import is_number

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator

    from evenstage.netlist.devices import Devices
    from evenstage.netlist.rewriting.families import Family
    from evenstage.process.process import Process, Transistor


@dataclass(frozen=True, slots=True, kw_only=True)
class WidthHandle:
    """How one width can be changed.

    Parameters
    ----------
    slot : Slot
        Whose.
    drawing : Drawing
        As it is.
    transistor : Transistor
        Its type.
    origins : tuple of Origin
        What to change; empty: the width is fixed.
    fingers_may_change : bool
        Whether the card can be given a further number of fingers.
    fin : float, optional
        Width of one fin, m, where the card counts fins.
    reason : str
        Why the width is fixed; empty where it is not.
    """

    slot: Slot
    drawing: Drawing
    transistor: Transistor
    origins: tuple[Origin, ...] = ()
    fingers_may_change: bool = False
    fin: float | None = None
    reason: str = ""

    @property
    def is_detached(self) -> bool:
        """Whether a number takes the place of an expression in a copy of the leaf."""
        return any(origin.way == "detached" for origin in self.origins)

    @property
    def width_max(self) -> float | None:
        """Greatest width that can be written, m, all fingers together; None: no such limit."""
        return None if self.fingers_may_change else widest(self.drawing, self.transistor)

    def smallest_step(self, step: float) -> float:
        """Return by how much the width (m, all fingers together) can change at least.

        Parameters
        ----------
        step : float
            m; taken where the process gives no ``width_step``.
        """
        if self.fin is not None:
            return self.fin
        fingers = self.drawing.fingers if self.transistor.width_is == "finger" else 1.0
        return fingers * (self.transistor.width_step or step)

    def drawable(self, width: float, step: float | None = None) -> float:
        """Return the width (m) nearest to a wished one that the card can say on a grid.

        Parameters
        ----------
        width : float
            m, all fingers together.
        step : float, optional
            Grid of the total width, or of one finger where the card gives the width of a finger,
            m; None: the process's ``width_step``. Fins come whole, whatever the step.
        """
        step = step if step is not None else self.transistor.width_step
        return drawable(width, self.drawing, self.transistor, self.fin or step)


@dataclass(frozen=True)
class WidthHandles(Mapping[Slot, WidthHandle]):
    """The handles of all slots of a block, each found when asked for.

    Parameters
    ----------
    block : SizedBlock
        The block and its sizing variables.
    """

    block: SizedBlock
    _found: dict[Slot, WidthHandle] = field(default_factory=dict, repr=False)

    def __getitem__(self, slot: Slot) -> WidthHandle:
        if slot not in self:
            raise KeyError(slot)
        found = self._alone(slot)
        if found.is_detached and slot in self._beyond_the_copies:
            leaf = self.block.leaf(slot)
            reason = f"its width is a parameter's, and '{leaf}' has all the copies it may have"
            return replace(found, origins=(), reason=reason)
        return found

    def _alone(self, slot: Slot) -> WidthHandle:
        """Return a slot's handle as if no other call needed a copy of its leaf."""
        known = self._found.get(slot)
        if known is None:
            known = self._found[slot] = _find(self.block, slot)
        return known

    @cached_property
    def _beyond_the_copies(self) -> frozenset[Slot]:
        """The slots whose calls would need more copies than there may be, whatever their sizes.

        Where numbers take the place of expressions, calls with other widths drawn never share one.
        """
        texts: dict[Family, dict[CopyText, list[Slot]]] = {}
        for text, slots in copy_texts(self.block, map(self._alone, self)).items():
            texts.setdefault(self.block.family(text.leaf), {})[text] = slots
        beyond: list[Slot] = []
        for family, slots_of in texts.items():
            plain = {text.leaf for text in slots_of if not text.drawn}
            called = {c for c in family.copies if self.block.is_called_for_size(c)}
            left = max(self.block.copies_per_leaf - len(plain | called), 0)
            drawn = [slots for text, slots in slots_of.items() if text.drawn]
            beyond += (slot for slots in drawn[left:] for slot in slots)
        return frozenset(beyond)

    def __contains__(self, slot: object) -> bool:
        return slot in self.block.variable_of

    def __iter__(self) -> Iterator[Slot]:
        return iter(self.block.variable_of)

    def __len__(self) -> int:
        return len(self.block.variable_of)

    def cannot_change(self) -> dict[Slot, str]:
        """Return the slots whose width the text fixes, and why."""
        return {slot: handle.reason for slot, handle in self.items() if handle.reason}

    def notices(self) -> tuple[Notice, ...]:
        """Return one notice for each reason why widths stay as they are."""
        slots_of: dict[str, list[Slot]] = {}
        for slot, reason in self.cannot_change().items():
            slots_of.setdefault(reason, []).append(slot)
        return tuple(self._notice(reason, slots) for reason, slots in slots_of.items())

    def _notice(self, reason: str, slots: list[Slot]) -> Notice:
        cards = [self.block.card(slot.card) for slot in slots]
        names = tuple(dict.fromkeys(card.name for card in cards))
        place = cards[0].span.place
        return Notice("width-fixed", f"{names[0]} keeps its width: {reason}", place, names)


class CopyText(NamedTuple):
    """What calls of a leaf have in common whose copies can be one: the leaf, and drawn widths.

    ``drawn`` holds the transistor cards on which numbers take the place of expressions, each with
    its width, m.
    """

    leaf: str
    drawn: tuple[tuple[int, float], ...]


def copy_texts(block: SizedBlock, handles: Iterable[WidthHandle]) -> dict[CopyText, list[Slot]]:
    """Return the slots that change in copies of their leaf, those together whose copies can be one.

    Parameters
    ----------
    block : SizedBlock
        The block.
    handles : iterable of WidthHandle
        Of its slots.
    """
    of_call: dict[int, list[WidthHandle]] = {}
    for handle in handles:
        inside = any(origin.way in {"leaf", "detached"} for origin in handle.origins)
        if handle.slot.caller is not None and inside:
            of_call.setdefault(handle.slot.caller, []).append(handle)
    found: dict[CopyText, list[Slot]] = {}
    for some in of_call.values():
        drawn = [(h.slot.card, h.drawing.width) for h in some if h.is_detached]
        text = CopyText(block.leaf(some[0].slot), tuple(sorted(drawn)))
        found.setdefault(text, []).extend(handle.slot for handle in some)
    return found


def width_handles(
    devices: Devices,
    process: Process,
    variable_of: Mapping[Slot, int],
    copies_per_leaf: int = 4,
) -> WidthHandles:
    """Find out which widths of a block can be changed, and how.

    Parameters
    ----------
    devices : Devices
        The block.
    process : Process
        What a card's width means, and how wide a finger may be.
    variable_of : Mapping of Slot to int
        The sizing variable of each slot; transistors outside all variables do not occur.
    copies_per_leaf : int
        How many sized copies of one leaf may be added.
    """
    return WidthHandles(
        SizedBlock(
            devices=devices,
            process=process,
            variable_of=variable_of,
            copies_per_leaf=copies_per_leaf,
        )
    )


def _find(block: SizedBlock, slot: Slot) -> WidthHandle:
    """Find one handle."""
    transistor, drawing = block.transistor(slot.card), block.drawing(slot)
    found = find_origins(block, slot)
    if isinstance(found, str):
        return WidthHandle(slot=slot, drawing=drawing, transistor=transistor, reason=found)
    return WidthHandle(
        slot=slot,
        drawing=drawing,
        transistor=transistor,
        origins=found,
        fin=_fin(block, slot, drawing.width),
        fingers_may_change=_fingers_may_change(block, slot, found, drawing.fingers),
    )


def _fin(block: SizedBlock, slot: Slot, width: float) -> float | None:
    """Return the width of one fin where the card counts fins."""
    card = block.card(slot.card)
    count = block.own_width(card)
    if count is None or block.transistor(slot.card).width_is != "fins":
        return None
    return width / block.tracer_of(slot).value_on_card(card, count, block.way(slot))


def _fingers_may_change(
    block: SizedBlock, slot: Slot, origins: tuple[Origin, ...], fingers: float
) -> bool:
    """Tell whether width and fingers both stand, or may stand, on the transistor card."""
    card = block.card(slot.card)
    name = block.transistor(slot.card).fingers_parameter
    if name is None or origins[0].parameter not in card.parameters:
        return False
    written = card.parameter(name.lower())
    return fingers == 1 if written is None else is_number(written.text)
