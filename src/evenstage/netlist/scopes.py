"""The subcircuits of a netlist while it is read: which one is open, what it holds."""

from __future__ import annotations

from dataclasses import dataclass, field
from itertools import chain, pairwise
from typing import TYPE_CHECKING

from evenstage.errors import NetlistError, Notice
from evenstage.netlist.canonical import canonical
from evenstage.netlist.netlist import Subcircuit
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.netlist import Parameter
    from evenstage.source import SourceText


@dataclass(slots=True)
class _Open:
    """A definition whose ``.ends`` has not been met, or the top level."""

    name: Span | None
    ports: tuple[str, ...] = ()
    defaults: tuple[Parameter, ...] = ()
    header: Span | None = None
    body_start: int = 0
    assignments: list[Parameter] = field(default_factory=list)
    ranges: list[range] = field(default_factory=list)

    @property
    def key(self) -> str:
        return "" if self.name is None else self.name.text.lower()

    def closed(self, body: Span | None, end_name: Span | None) -> Subcircuit:
        """Return the finished definition."""
        return Subcircuit(
            name="" if self.name is None else self.name.text,
            ports=self.ports,
            defaults=self.defaults,
            assignments=tuple(self.assignments),
            cards=_joined(self.ranges),
            header=self.header,
            name_span=self.name,
            body=body,
            end_name_span=end_name,
        )


def _joined(ranges: list[range]) -> Sequence[int]:
    if not ranges:
        return range(0)
    contiguous = all(a.stop == b.start for a, b in pairwise(ranges))
    if contiguous:
        return range(ranges[0].start, ranges[-1].stop)
    return tuple(chain.from_iterable(ranges))


class Scopes:
    """The stack of open definitions and the finished ones."""

    def __init__(self) -> None:
        self._stack = [_Open(None)]
        self._first = 0
        self._bodies: dict[str, tuple[SourceText, int, int]] = {}
        self.subcircuits: dict[str, Subcircuit] = {}
        self.notices: list[Notice] = []

    @property
    def current(self) -> str:
        """Lower-case name of the innermost open definition; empty: top level."""
        return self._stack[-1].key

    @property
    def depth(self) -> int:
        """How many definitions are open."""
        return len(self._stack) - 1

    @property
    def assignments(self) -> tuple[Sequence[Parameter], frozenset[str]]:
        """The parameters of the top level so far, and the names that open definitions mask."""
        inner = [p for one in self._stack[1:] for p in (*one.defaults, *one.assignments)]
        return self._stack[0].assignments, frozenset(p.name for p in inner)

    def assign(self, parameters: tuple[Parameter, ...]) -> None:
        """Take the parameters of a ``.param`` card."""
        self._stack[-1].assignments.extend(parameters)

    def _cut(self, cards: int) -> None:
        """Give the cards read since the last change to the definition that holds them."""
        if cards > self._first:
            self._stack[-1].ranges.append(range(self._first, cards))
        self._first = cards

    def open(
        self,
        header: Span,
        name: Span,
        ports: tuple[Span, ...],
        defaults: tuple[Parameter, ...],
        cards: int,
    ) -> None:
        """Begin a definition; ``cards`` is how many element cards came before it.

        Raises
        ------
        NetlistError
            If two ports have one name.
        """
        seen: set[str] = set()
        for port in ports:
            if port.text.lower() in seen:
                message = f"'{name.text}' has two ports named '{port.text}'"
                raise NetlistError(message, code="duplicate-port", span=port)
            seen.add(port.text.lower())
        self._cut(cards)
        names = tuple(port.text for port in ports)
        start = line_start(header.source, header.start)
        self._stack.append(_Open(name, names, defaults, header, start))

    def close(self, card: Span, end_name: Span | None, line_end: int, cards: int) -> None:
        """End the innermost definition.

        Parameters
        ----------
        card : Span
            The ``.ends`` card.
        end_name : Span, optional
            The name on it.
        line_end : int
            Where the line after it begins.
        cards : int
            How many element cards have been read.

        Raises
        ------
        NetlistError
            If none is open, or one of another name.
        """
        opened = self._stack[-1]
        if opened.name is None:
            raise NetlistError(
                "no '.subckt' is open for this '.ends'", code="unmatched-ends", span=card
            )
        if end_name is not None and end_name.text.lower() != opened.key:
            message = f"this '.ends' names '{end_name.text}', but '{opened.name.text}' is open"
            raise NetlistError(
                message, code="unmatched-ends", span=end_name, notes=(_begins(opened),)
            )
        self._cut(cards)
        self._stack.pop()
        body = Span(card.source, opened.body_start, line_end)
        place = (card.source, opened.body_start, card.start)
        self._define(opened.closed(body, end_name), place)

    def _define(self, subcircuit: Subcircuit, place: tuple[SourceText, int, int]) -> None:
        """Add a definition; a later one of the same name replaces an earlier one."""
        key = subcircuit.name.lower()
        earlier = self.subcircuits.get(key)
        if earlier is not None:
            if _words(*self._bodies[key]) == _words(*place):
                return
            assert earlier.name_span is not None
            assert subcircuit.name_span is not None
            where = subcircuit.name_span.place
            message = (
                f"'{subcircuit.name}' was defined otherwise at {earlier.name_span.place}; "
                "the later definition counts"
            )
            self.notices.append(Notice("duplicate-subcircuit", message, where, (subcircuit.name,)))
        self.subcircuits[key] = subcircuit
        self._bodies[key] = place

    def check_closed(self, depth: int) -> None:
        """Refuse definitions still open beyond a depth, at the end of a file.

        Raises
        ------
        NetlistError
            If there is one.
        """
        if self.depth > depth:
            opened = self._stack[-1]
            assert opened.name is not None
            message = f"no '.ends' closes '{opened.name.text}'"
            raise NetlistError(message, code="unmatched-subckt", span=opened.header)

    def check_not_below(self, depth: int, source: SourceText) -> None:
        """Refuse a file that closes a definition another file has opened."""
        if self.depth < depth:
            end = Span(source, len(source.data), len(source.data))
            message = "this file closes a '.subckt' that the file including it has opened"
            raise NetlistError(message, code="unmatched-ends", span=end)

    def finish(self, cards: int) -> Subcircuit:
        """Return the top level."""
        self._cut(cards)
        return self._stack[0].closed(None, None)


def _words(source: SourceText, start: int, end: int) -> list[bytes]:
    """Return the words of some cards."""
    return canonical(source.data[start:end]).split()


def _begins(opened: _Open) -> str:
    assert opened.name is not None
    assert opened.header is not None
    return f"inside subcircuit '{opened.name.text}', which begins at {opened.header.place}"


def line_start(source: SourceText, offset: int) -> int:
    """Return where the line of an offset begins."""
    return max(source.data.rfind(b"\n", 0, offset), source.data.rfind(b"\r", 0, offset)) + 1
