"""The subcircuits of a netlist while it is read: which one is open, what it holds."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field, replace
from itertools import chain, pairwise
from typing import TYPE_CHECKING, Final

from evenstage.errors import NetlistError, Notice
from evenstage.netlist.callees import Callees, local_names
from evenstage.netlist.netlist import Subcircuit
from evenstage.netlist.reading.canonical import canonical
from evenstage.source import Span

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.netlist import Parameter
    from evenstage.source import SourceText


#: Definitions inside each other; more are a forgotten ``.ends`` each time.
_DEPTH: Final = 100


@dataclass(slots=True)
class _Open:
    """A definition whose ``.ends`` has not been met, or the top level."""

    name: Span | None
    label: str = ""
    ports: tuple[str, ...] = ()
    defaults: tuple[Parameter, ...] = ()
    header: Span | None = None
    body_start: int = 0
    assignments: list[Parameter] = field(default_factory=list)
    ranges: list[range] = field(default_factory=list)

    @property
    def key(self) -> str:
        return self.label.lower()

    def closed(self, body: Span | None, end_name: Span | None) -> Subcircuit:
        """Return the finished definition."""
        return Subcircuit(
            name=self.label,
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
        self._parents: dict[str, str] = {}
        self._plain: dict[str, str] = {}
        self._same: dict[str, str] = {}
        self._spellings: dict[str, dict[str, str]] = {}
        self.subcircuits: dict[str, Subcircuit] = {}
        #: By the key of each definition that of the one around it, once they are settled.
        self.parents: dict[str, str] = {}
        self.notices: list[Notice] = []
        #: The first port that differs from another of its definition by case alone.
        self.clash: Span | None = None

    @property
    def current(self) -> str:
        """Key of the innermost open definition, as ``finish`` takes it; empty: top level."""
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
            If two ports have one name, or too many definitions are open.
        """
        seen: dict[str, set[str]] = {}
        for port in ports:
            spellings = seen.setdefault(port.text.lower(), set())
            if port.text in spellings:
                message = f"'{name.text}' has two ports named '{port.text}'"
                raise NetlistError(message, code="duplicate-port", span=port)
            if spellings and self.clash is None:
                self.clash = port
            spellings.add(port.text)
        if self.depth >= _DEPTH:
            message = f"subcircuits are defined inside each other more than {_DEPTH} deep"
            raise NetlistError(message, code="unmatched-subckt", span=header)
        self._cut(cards)
        names = tuple(port.text for port in ports)
        start = line_start(header.source, header.start)
        label = self._label(name.text)
        self._parents[label.lower()] = self.current
        self._plain[label.lower()] = name.text.lower() if self.depth else label.lower()
        self._stack.append(_Open(name, label, names, defaults, header, start))

    def _label(self, name: str) -> str:
        """Return what a new definition is called, so that no other one is in its place.

        One inside another has the other's name before it. One whose name differs from an earlier
        one's by case alone has a quotation mark behind it, which no name in the text has.
        """
        if self._stack[-1].name is not None:
            return f"{self._stack[-1].label}.{name}"
        spelt = self._spellings.setdefault(name.lower(), {})
        key = spelt.setdefault(name, name.lower() + "'" * len(spelt))
        return name + "'" * (len(key) - len(name))

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
        if end_name is not None and end_name.text.lower() != opened.name.text.lower():
            message = f"this '.ends' names '{end_name.text}', but '{opened.name.text}' is open"
            raise NetlistError(
                message, code="unmatched-ends", span=end_name, notes=(_begins(opened),)
            )
        if end_name is None and self.depth > 1:
            self._note_bare(card, opened)
        self._cut(cards)
        self._stack.pop()
        body = Span(card.source, opened.body_start, line_end)
        place = (card.source, opened.body_start, card.start)
        self._define(opened.closed(body, end_name), place)

    def _define(self, subcircuit: Subcircuit, place: tuple[SourceText, int, int]) -> None:
        """Add a definition; a later one of the same name replaces an earlier one."""
        key = subcircuit.name.lower()
        if self._is_like_another(subcircuit, place):
            return
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

    def _is_like_another(self, subcircuit: Subcircuit, place: tuple[SourceText, int, int]) -> bool:
        """Tell whether a definition only repeats one that is spelt in other case."""
        key = subcircuit.name.lower()
        plain = key.rstrip("'")
        if key == plain:
            return False
        if _words(*self._bodies[plain]) == _words(*place):
            self._same[key] = plain
            return True
        if key not in self.subcircuits:
            name, other = subcircuit.name.rstrip("'"), self.subcircuits[plain].name
            message = (
                f"'{name}' and '{other}' are different subcircuits, so in their names case counts; "
                f"'{name}' is called {subcircuit.name} in reports"
            )
            assert subcircuit.name_span is not None
            place_of = subcircuit.name_span.place
            self.notices.append(Notice("case-counts", message, place_of, (name, other)))
        return False

    def _note_bare(self, card: Span, opened: _Open) -> None:
        assert opened.name is not None
        if any(notice.code == "bare-ends" for notice in self.notices):
            return
        outer = self._stack[-2].label
        message = (
            f"an '.ends' without a name ends the innermost subcircuit, here '{opened.name.text}' "
            f"inside '{outer}'; a name behind it can say otherwise"
        )
        self.notices.append(Notice("bare-ends", message, card.place, (opened.name.text,)))

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
        """Return the top level; after that, ``subcircuits`` are all there are."""
        self._cut(cards)
        return self._stack[0].closed(None, None)

    def settle(self) -> tuple[Callees, dict[str, str]]:
        """Give definitions inside others their plain names where nothing else has them.

        Returns
        -------
        callees : Callees
            What names mean that several definitions have.
        renamed : dict of str to str
            The keys of definitions by those ``current`` gave before, where they differ.
        """
        plain = self._plain
        counts = Counter(plain[key] for key in self.subcircuits)
        moved = {key: plain[key] for key in self.subcircuits if counts[plain[key]] == 1}
        renamed = {old: new for old, new in {**self._same, **moved}.items() if old != new}
        self.subcircuits = {
            moved.get(key, key): replace(one, name=_written(one)) if key in renamed else one
            for key, one in self.subcircuits.items()
        }
        parents = self.parents = {
            moved.get(key, key): moved.get(outer, outer) for key, outer in self._parents.items()
        }
        names = {key: plain[key] for key in self.subcircuits if key in plain and plain[key] != key}
        spellings = {
            name: spelt
            for name, some in self._spellings.items()
            if len(spelt := {s: self._same.get(k, k) for s, k in some.items()}) > 1
            and len(set(spelt.values())) > 1
        }
        return Callees(local_names(parents, names) if names else {}, spellings), renamed


def _words(source: SourceText, start: int, end: int) -> list[bytes]:
    """Return the words of some cards."""
    return canonical(source.data[start:end]).split()


def _written(subcircuit: Subcircuit) -> str:
    assert subcircuit.name_span is not None
    return subcircuit.name_span.text


def _begins(opened: _Open) -> str:
    assert opened.name is not None
    assert opened.header is not None
    return f"inside subcircuit '{opened.name.text}', which begins at {opened.header.place}"


def line_start(source: SourceText, offset: int) -> int:
    """Return where the line of an offset begins."""
    feed = source.data.rfind(b"\n", 0, offset)
    return max(feed, source.data.rfind(b"\r", feed + 1, offset)) + 1
