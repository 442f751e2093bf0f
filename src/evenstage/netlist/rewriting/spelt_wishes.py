"""What one wished width means in text: each value that changes, with its new spelling."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from evenstage.netlist.rewriting.diffusion import SIDES, edge_factor
from evenstage.netlist.rewriting.fingers import Drawing, fingers_needed, written_ratio
from evenstage.netlist.rewriting.mentions import names_in
from evenstage.netlist.rewriting.respelling import Respelling
from evenstage.netlist.rewriting.spelling import is_number, respell, respell_count, shortest
from evenstage.netlist.values import parse_value
from evenstage.source import Span
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.netlist.netlist import Card, Parameter
    from evenstage.netlist.rewriting.handles import WidthHandle
    from evenstage.netlist.rewriting.origins import Origin, Way
    from evenstage.netlist.rewriting.sized_block import SizedBlock


@dataclass(frozen=True, slots=True)
class SpeltValue:
    """A value to be written for one width.

    Parameters
    ----------
    way : {"shared", "leaf", "default", "detached"}
        As in ``Origin``.
    respelling : Respelling
        What is written.
    factor : float
        By which it makes the width grow.
    """

    way: Way
    respelling: Respelling
    factor: float


def spell_wish(
    block: SizedBlock, handle: WidthHandle, old: float, new: float, why: str
) -> tuple[SpeltValue, ...] | str:
    """Return the values that give a slot a new width, the width's own first; or why none do.

    Parameters
    ----------
    block : SizedBlock
        The block.
    handle : WidthHandle
        The slot's.
    old, new : float
        m, all fingers together.
    why : str
        For the comments.
    """
    if handle.reason:
        return handle.reason
    limit = handle.width_max
    if limit is not None and new > limit * (1 + 1e-9):
        return (
            f"{engineering(new, 'm')} needs more fingers than the {handle.drawing.fingers:g} that "
            "its card can be given"
        )
    now = Drawing(old, handle.drawing.fingers)
    then = Drawing(new, now.fingers)
    if handle.fingers_may_change:
        then = Drawing(new, fingers_needed(new, now.fingers, handle.transistor))
    wish = _Wish(block, handle, now, then, why)
    numbers = [wish.number(origin) for origin in handle.origins]
    return (*numbers, *wish.fingers(), *wish.diffusion(numbers[0].factor))


@dataclass(frozen=True, slots=True)
class _Wish:
    """One wish and what it concerns."""

    block: SizedBlock
    handle: WidthHandle
    now: Drawing
    then: Drawing
    why: str

    @property
    def card(self) -> Card:
        """The transistor card."""
        return self.block.card(self.handle.slot.card)

    @property
    def local(self) -> Way:
        """How a value on the transistor card itself is changed."""
        ways = {origin.way for origin in self.handle.origins}
        return "detached" if "detached" in ways else "leaf" if "leaf" in ways else "shared"

    def number(self, origin: Origin) -> SpeltValue:
        """Return the new spelling of a number that sets the width."""
        ratio = written_ratio(self.now, self.then, self.handle.transistor)
        value = parse_value(origin.model).number
        before, old = value, origin.parameter.text
        if origin.way == "detached":
            before = self._value(origin.parameter)
            old += f" = {respell(origin.model, value, before)}"
        if self.handle.transistor.width_is == "fins":
            text = respell_count(origin.model, value, max(1, round(before * ratio)))
        else:
            text = respell(origin.model, value, before * ratio)
        factor = parse_value(text).number / before
        if self.handle.transistor.width_is == "finger":
            factor *= self.then.fingers / self.now.fingers
        respelling = replace(self._respelling(origin.parameter, text), old=old)
        return SpeltValue(origin.way, respelling, factor)

    def fingers(self) -> Iterator[SpeltValue]:
        """Yield the new number of fingers where it changes."""
        name = self.handle.transistor.fingers_parameter
        if self.then.fingers == self.now.fingers or name is None:
            return
        written = self.card.parameter(name.lower())
        factor = self.then.width / self.now.width
        if written is not None:
            text = respell_count(written.text, self.now.fingers, self.then.fingers)
            respelling = self._respelling(written, text)
        else:
            own = self.handle.origins[0].parameter.name_span.text
            respelling = Respelling(
                span=self._end,
                name=name.upper() if own.isupper() else name,
                old=f"{self.now.fingers:g}",
                new=f"{self.then.fingers:g}",
                why=self.why,
                card=self.card.name,
            )
        yield SpeltValue(self.local, respelling, factor)

    def diffusion(self, factor: float) -> Iterator[SpeltValue]:
        """Yield areas and perimeters, where the card is changed for everybody or in a copy."""
        if self.handle.slot.caller is not None and self.local == "shared":
            return
        if not self.block.is_editable(self.card.span):
            return
        devices, device = self.block.devices, self.block.device(self.handle.slot)
        columns = (
            (devices.drain_area[device], devices.drain_edge[device]),
            (devices.source_area[device], devices.source_edge[device]),
        )
        old, new = self.now.width, self.now.width * factor
        for names, (area, edge) in zip(SIDES, columns, strict=True):
            factors = (factor, edge_factor(float(area), float(edge), old, new))
            for name, growth in zip(names, factors, strict=True):
                parameter = self.card.parameter(name)
                text = parameter and self._grown(parameter, growth)
                if parameter and text:
                    respelling = self._respelling(parameter, text, follows=True)
                    yield SpeltValue(self.local, respelling, factor)

    def _grown(self, parameter: Parameter, growth: float) -> str | None:
        """Return an area or perimeter grown by a factor; None where it stays or follows itself."""
        if is_number(parameter.text):
            zero = parse_value(parameter.text).number == 0
            return None if zero else respell(parameter.text, 1.0, growth)
        if self.local != "detached" or not names_in(parameter.text):
            return None
        value = self._value(parameter) * growth
        return None if math.isnan(value) else f"{shortest(value)}".lower()

    def _value(self, parameter: Parameter) -> float:
        """Return what a parameter of the card means now, in its text's own unit."""
        slot = self.handle.slot
        return self.block.tracer_of(slot).value_on_card(self.card, parameter, self.block.way(slot))

    @property
    def _end(self) -> Span:
        """Where a parameter is added to the card."""
        span = self.card.span
        return Span(span.source, span.end, span.end)

    def _respelling(self, parameter: Parameter, text: str, *, follows: bool = False) -> Respelling:
        return Respelling(
            span=parameter.span,
            name=parameter.name_span.text,
            old=parameter.text,
            new=text,
            why=self.why,
            card=self.card.name,
            follows=follows,
        )
