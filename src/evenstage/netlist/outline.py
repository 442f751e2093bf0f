"""A definition before its parameters have values: nets, transistors, calls, in columns.

Made once per subcircuit however often it is called.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal, NamedTuple, Protocol

import numpy as np

from evenstage.errors import ElaborationError
from evenstage.netlist.columns import Column, absent, group_column, joined
from evenstage.netlist.expression import FormulaError
from evenstage.netlist.mistakes import MOST
from evenstage.netlist.values import parse_value

if TYPE_CHECKING:
    from collections.abc import Collection, Iterable, Mapping, Sequence

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.mistakes import Mistakes
    from evenstage.netlist.netlist import Card, CardGroup, Netlist, Subcircuit


class Call(NamedTuple):
    """An X card that calls a definition: its number, the name called, local nets, parameters."""

    card: int
    target: str
    nets: tuple[int, ...]
    parameters: Mapping[str, str]


@dataclass(frozen=True, slots=True, kw_only=True)
class Rows:
    """Cards of one kind, shape ``(n,)`` per column.

    Parameters
    ----------
    card : IntArray
        Card numbers.
    nets : IntArray, shape (pins, n)
        Local nets.
    target : IntArray
        Index into ``target_names``; empty for R and C.
    target_names : tuple of str
        Lower-case model names.
    columns : Mapping of str to Column
        Parameters by name; the empty name is the unnamed value.
    """

    card: IntArray
    nets: IntArray
    target: IntArray
    target_names: tuple[str, ...]
    columns: Mapping[str, Column]

    def __len__(self) -> int:
        return len(self.card)


@dataclass(frozen=True, slots=True, kw_only=True)
class Outline:
    """One definition.

    Local nets are numbered: the ports first, in their order, then the others as they are met.

    Parameters
    ----------
    subcircuit : Subcircuit
        The definition.
    net_keys : tuple of bytes
        Lower-case names of the local nets.
    net_firsts : IntArray, shape (2, n)
        Card and position on it at which each net that is no port is met first.
    transistors, capacitors, resistors : Rows
        The cards of each kind.
    calls : tuple of Call
        The cards that call definitions.
    sources : tuple of int
        V cards.
    others : Mapping of str to tuple of int
        Cards that are not understood, by letter.
    names_used : frozenset of str
        All parameters its expressions use.
    repeated : tuple of str
        Lower-case names that several cards have.
    """

    subcircuit: Subcircuit
    net_keys: tuple[bytes, ...]
    net_firsts: IntArray
    transistors: Rows
    capacitors: Rows
    resistors: Rows
    calls: tuple[Call, ...]
    sources: tuple[int, ...]
    others: Mapping[str, tuple[int, ...]]
    names_used: frozenset[str]
    repeated: tuple[str, ...]

    @property
    def ports(self) -> int:
        """How many ports it has."""
        return len(self.subcircuit.ports)


CallKind = Literal["transistor", "instance", "unknown"]


class Classifier(Protocol):
    """Tells what the X cards are: transistors, instances of definitions, or neither."""

    def call_kind(self, target: str, nets: int, parameters: Collection[str]) -> CallKind:
        """Return what cards are that call a name with so many nets and such parameters."""
        ...


class _Numbering(dict[bytes, int]):
    """Numbers for names, in the order in which they are first asked for."""

    def __missing__(self, name: bytes) -> int:
        number = self[name] = len(self)
        return number


class _Nets:
    """Numbers for local nets."""

    def __init__(self, ports: Iterable[str]) -> None:
        self.ids = _Numbering()
        for port in ports:
            self.ids[port.encode("utf-8", "surrogateescape").lower()]  # the look-up numbers it
        self._first_cards: list[IntArray] = []
        self._first_positions: list[int] = []

    def columns(self, group: CardGroup) -> IntArray:
        """Return the nets of some cards; new ones are noted with the card they stand on."""
        numbers = np.array(group.numbers, np.int32)
        nets = np.empty((len(group.nodes), len(numbers)), np.int32)
        for position, names in enumerate(group.nodes):
            known = len(self.ids)
            nets[position] = list(map(self.ids.__getitem__, names))
            if len(self.ids) > known:
                new = np.flatnonzero(nets[position] >= known)
                _, first = np.unique(nets[position, new], return_index=True)
                self._first_cards.append(numbers[new[first]])
                self._first_positions += [position] * len(first)
        return nets

    def firsts(self) -> IntArray:
        """Return card and position at which each net that is no port was met, shape (2, n)."""
        cards = np.concatenate([np.zeros(0, np.int32), *self._first_cards])
        return np.stack([cards, np.array(self._first_positions, np.int32)])


class _RowsBuilder:
    """Collects groups of cards of one kind."""

    def __init__(
        self, netlist: Netlist, pins: int, names: Sequence[str], mistakes: Mistakes
    ) -> None:
        self._netlist = netlist
        self._mistakes = mistakes
        self._columns: dict[str, list[Column]] = {name: [] for name in names}
        self._count = 0
        self._cards = [np.zeros(0, np.int32)]
        self._nets = [np.zeros((pins, 0), np.int32)]
        self._target_ids = _Numbering()
        self._targets = [np.zeros(0, np.int32)]

    def add(self, group: CardGroup, nets: IntArray) -> None:
        """Take a group of cards and their nets, shape ``(pins, n)``."""
        for name, parts in self._columns.items():
            column = absent(len(group.numbers))
            with self._mistakes.collecting():
                column = group_column(self._netlist, group, name, self._count)
            parts.append(column)
        self._count += len(group.numbers)
        self._cards.append(np.array(group.numbers, np.int32))
        self._nets.append(nets)
        targets = list(map(self._target_ids.__getitem__, group.targets))
        self._targets.append(np.array(targets, np.int32))

    def rows(self) -> Rows:
        """Return what was collected, in the order of the cards, without empty columns."""
        cards = np.concatenate(self._cards)
        order = np.argsort(cards, kind="stable")
        columns = {
            name: joined(parts).in_order(order)
            for name, parts in self._columns.items()
            if any(part.styles.any() for part in parts)
        }
        target = np.concatenate(self._targets)
        return Rows(
            card=cards[order],
            nets=np.concatenate(self._nets, axis=1)[:, order],
            target=target[order] if len(target) else target,
            target_names=tuple(map(_name, self._target_ids)),
            columns=columns,
        )


class OutlineBuilder:
    """Makes outlines of definitions.

    Parameters
    ----------
    netlist : Netlist
        Where they stand.
    classifier : Classifier
        Tells transistors among the X cards.
    geometry : sequence of str
        Parameters of transistors that are wanted.
    mistakes : Mistakes
        Takes the values that cannot be read and the transistors that lack a net; an outline goes on
        without them.
    """

    def __init__(
        self,
        netlist: Netlist,
        classifier: Classifier,
        geometry: Sequence[str],
        mistakes: Mistakes,
    ) -> None:
        self._netlist = netlist
        self._classifier = classifier
        self._geometry = geometry
        self._mistakes = mistakes

    def outline(self, subcircuit: Subcircuit) -> Outline:
        """Return the outline of a definition."""
        body = _Body(self._netlist, self._classifier, self._geometry, subcircuit, self._mistakes)
        for group in self._netlist.card_groups(subcircuit.cards):
            body.add(group)
        return body.outline()


class _Body:
    """The cards of one definition while they are taken in."""

    def __init__(
        self,
        netlist: Netlist,
        classifier: Classifier,
        geometry: Sequence[str],
        subcircuit: Subcircuit,
        mistakes: Mistakes,
    ) -> None:
        self._netlist = netlist
        self._classifier = classifier
        self._subcircuit = subcircuit
        self._nets = _Nets(subcircuit.ports)
        self._mistakes = mistakes
        self._transistors = _RowsBuilder(netlist, 4, geometry, mistakes)
        self._capacitors = _RowsBuilder(netlist, 2, ("", "c", "m"), mistakes)
        self._resistors = _RowsBuilder(netlist, 2, (), mistakes)
        self._calls: list[Call] = []
        self._sources: list[int] = []
        self._others: dict[str, list[int]] = {}
        self._hashes = [np.zeros(0, np.int64)]
        self._takers = {
            "m": self._take_transistors,
            "x": self._take_calls,
            "c": lambda group: self._capacitors.add(group, self._nets.columns(group)),
            "r": lambda group: self._resistors.add(group, self._nets.columns(group)),
            "v": self._take_sources,
        }

    def add(self, group: CardGroup) -> None:
        """Take a group of cards."""
        self._hashes.append(np.array(list(map(hash, group.names)), np.int64))
        taker = self._takers.get(group.letter)
        if taker is None:
            self._others.setdefault(group.letter, []).extend(group.numbers)
        else:
            taker(group)

    def _take_transistors(self, group: CardGroup) -> None:
        self._transistors.add(group, self._nets.columns(group))

    def _take_sources(self, group: CardGroup) -> None:
        self._nets.columns(group)
        self._sources += group.numbers

    def _take_calls(self, group: CardGroup) -> None:
        nets = self._nets.columns(group)
        kinds = {
            target: self._classifier.call_kind(_name(target), len(nets), group.parameters.keys())
            for target in dict.fromkeys(group.targets)
        }
        rows = [row for row, target in enumerate(group.targets) if kinds[target] == "transistor"]
        if rows:
            self._take_wrapped(_selected(group, rows), nets[:, rows])
        for row, target in enumerate(group.targets):
            if kinds[target] == "instance":
                self._calls.append(_call(group, row, nets))
            elif kinds[target] == "unknown":
                self._others.setdefault("x", []).append(group.numbers[row])

    def _take_wrapped(self, group: CardGroup, nets: IntArray) -> None:
        if len(nets) != 4:
            for number in group.numbers[:MOST]:
                self._mistakes.add(_wrong_pins(self._netlist.card(number)))
            return
        self._transistors.add(group, nets)

    def outline(self) -> Outline:
        """Return the finished outline."""
        rows = (self._transistors.rows(), self._capacitors.rows(), self._resistors.rows())
        calls = tuple(sorted(self._calls))
        return Outline(
            subcircuit=self._subcircuit,
            net_keys=tuple(self._nets.ids),
            net_firsts=self._nets.firsts(),
            transistors=rows[0],
            capacitors=rows[1],
            resistors=rows[2],
            calls=calls,
            sources=tuple(self._sources),
            others={letter: tuple(cards) for letter, cards in self._others.items()},
            names_used=frozenset(self._names_used(rows, calls)),
            repeated=self._repeated(),
        )

    def _names_used(self, rows: Iterable[Rows], calls: Iterable[Call]) -> set[str]:
        texts = {
            text for kind in rows for column in kind.columns.values() for _, text in column.formulas
        }
        texts.update(text for call in calls for text in call.parameters.values())
        parameters = (*self._subcircuit.defaults, *self._subcircuit.assignments)
        texts.update(parameter.text for parameter in parameters)
        names: set[str] = set()
        for text in texts:
            names |= _names_in(text)
        return names

    def _repeated(self) -> tuple[str, ...]:
        hashes = np.concatenate(self._hashes)
        if len(np.unique(hashes)) == len(hashes):
            return ()
        counts = Counter(self._netlist.card_name(n).lower() for n in self._subcircuit.cards)
        return tuple(name for name, count in counts.items() if count > 1)


def _wrong_pins(card: Card) -> ElaborationError:
    message = (
        f"'{card.name}' calls the transistor '{card.target}' with {len(card.nodes)} nets, "
        "expected four: drain, gate, source, bulk"
    )
    return ElaborationError(message, code="pin-count", span=card.span)


def _call(group: CardGroup, row: int, nets: IntArray) -> Call:
    parameters = {name: _text(column[row]) for name, column in group.parameters.items()}
    local = tuple(nets[:, row].tolist())
    return Call(group.numbers[row], _name(group.targets[row]), local, parameters)


def _selected(group: CardGroup, rows: Sequence[int]) -> CardGroup:
    """Return some rows of a group."""

    def pick(column: Sequence[bytes]) -> list[bytes]:
        return [column[row] for row in rows]

    return type(group)(
        letter=group.letter,
        numbers=[group.numbers[row] for row in rows],
        names=pick(group.names),
        nodes=[pick(column) for column in group.nodes],
        targets=pick(group.targets),
        values=(),
        parameters={name: pick(column) for name, column in group.parameters.items()},
    )


def _text(word: bytes) -> str:
    return word.decode("utf-8", "surrogateescape")


def _name(word: bytes) -> str:
    """Return the name of a definition or model as it is looked up."""
    return _text(word).lower()


def _names_in(text: str) -> frozenset[str]:
    try:
        formula = parse_value(text).formula
    except FormulaError:
        return frozenset()
    return frozenset() if formula is None else formula.names
