"""A definition before its parameters have values: nets, transistors, calls, in columns.

Made once per subcircuit however often it is called.
"""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Literal, NamedTuple, Protocol

import numpy as np

from evenstage.errors import ElaborationError
from evenstage.netlist.elaboration.mistakes import MOST
from evenstage.netlist.elaboration.numbering import NetNumbering
from evenstage.netlist.elaboration.rows import Rows, RowsBuilder, distinct, folded_name
from evenstage.netlist.expression import FormulaError
from evenstage.netlist.values import parse_value

if TYPE_CHECKING:
    from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence

    from numpy.typing import NDArray

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.elaboration.mistakes import Mistakes
    from evenstage.netlist.netlist import Card, CardColumns, Netlist, Subcircuit

#: Drain, gate, source, bulk.
_PINS = 4
_NUMBER = re.compile(rb"[+-]?\.?[0-9]")
#: Letters of the cards whose nets count.
_WIRED = frozenset("mxcrv")


class Call(NamedTuple):
    """An X card that calls a definition: its number, the name called, local nets, parameters.

    Calls that pass the same share the mapping.
    """

    card: int
    target: str
    nets: tuple[int, ...]
    parameters: Mapping[str, str]


class LocalNets(NamedTuple):
    """The nets of a definition: the ports first, in their order, then the others as they are met.

    Parameters
    ----------
    ports : tuple of str
        As written.
    words : IntArray, shape (n,)
        The word of each net.
    firsts : IntArray, shape (2, n - ports)
        Card and position on it at which each net that is no port is met first.
    """

    ports: tuple[str, ...]
    words: IntArray
    firsts: IntArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Outline:
    """One definition.

    Parameters
    ----------
    subcircuit : Subcircuit
        The definition.
    nets : LocalNets
        Its nets.
    transistors, capacitors, resistors : Rows
        The cards of each kind.
    calls : tuple of Call
        The cards that call definitions.
    sources : tuple of (int, int, int)
        V cards and their local nets.
    others : Mapping of str to tuple of int
        Cards that are not understood, by letter.
    names_used : frozenset of str
        All parameters its expressions use.
    repeated : tuple of str
        Lower-case names that several cards have.
    further_pins : IntArray
        Transistor cards with more than four nets.
    """

    subcircuit: Subcircuit
    nets: LocalNets
    transistors: Rows
    capacitors: Rows
    resistors: Rows
    calls: tuple[Call, ...]
    sources: tuple[tuple[int, int, int], ...]
    others: Mapping[str, tuple[int, ...]]
    names_used: frozenset[str]
    repeated: tuple[str, ...]
    further_pins: IntArray

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


class _Passed:
    """What calls pass, one mapping for all that pass the same."""

    def __init__(self, netlist: Netlist) -> None:
        self._text = netlist.cards.values.text
        self._known: dict[tuple[str, ...], dict[tuple[int, ...], Mapping[str, str]]] = {}

    def of(
        self, names: tuple[str, ...], rows: Sequence[tuple[int, ...]]
    ) -> Iterator[Mapping[str, str]]:
        """Give the parameters of some calls from their names and rows of values."""
        known = self._known.setdefault(names, {})
        for row in set(rows) - known.keys():
            known[row] = dict(zip(names, map(self._text, row), strict=True))
        return map(known.__getitem__, rows)


class OutlineBuilder:
    """Makes outlines of definitions.

    Parameters
    ----------
    netlist : Netlist
        Where they stand.
    geometry : sequence of str
        Parameters of transistors that are wanted.
    mistakes : Mistakes
        Takes the values that cannot be read and the transistors that lack a net; an outline goes on
        without them.
    """

    def __init__(self, netlist: Netlist, geometry: Sequence[str], mistakes: Mistakes) -> None:
        self._netlist = netlist
        self._geometry = geometry
        self._mistakes = mistakes
        self._numbering = NetNumbering(len(netlist.cards.words))
        self._passed = _Passed(netlist)

    def outline(self, subcircuit: Subcircuit, classifier: Classifier) -> Outline:
        """Return the outline of a definition; a classifier tells its transistors from its calls."""
        cards = list(self._netlist.cards.columns(subcircuit.cards))
        body = _Body(
            self._netlist, classifier, self._geometry, subcircuit, self._mistakes, self._passed
        )
        ports = map(self._netlist.cards.word_number, subcircuit.ports)
        wired = [one for one in cards if one.letter in _WIRED]
        words, firsts = self._numbering.number(np.array(list(ports), np.int32), wired)
        for one in cards:
            body.add(one, self._numbering.local(one.nodes) if one.letter in _WIRED else one.nodes)
        return body.outline(LocalNets(subcircuit.ports, words, firsts))


class _Body:
    """The cards of one definition while they are taken in."""

    def __init__(
        self,
        netlist: Netlist,
        classifier: Classifier,
        geometry: Sequence[str],
        subcircuit: Subcircuit,
        mistakes: Mistakes,
        passed: _Passed,
    ) -> None:
        self._netlist = netlist
        self._passed = passed
        self._classifier = classifier
        self._subcircuit = subcircuit
        self._mistakes = mistakes
        self._transistors = RowsBuilder(netlist, 4, geometry, mistakes)
        self._capacitors = RowsBuilder(netlist, 2, ("", "c", "m"), mistakes)
        self._resistors = RowsBuilder(netlist, 2, ("", "r", "m"), mistakes)
        self._calls: list[Call] = []
        self._sources: list[tuple[int, int, int]] = []
        self._others: dict[str, list[int]] = {}
        self._further_pins = [np.zeros(0, np.int32)]

    def add(self, cards: CardColumns, nets: IntArray) -> None:
        """Take some cards and their nets."""
        match cards.letter:
            case "m":
                self._take_transistors(cards, nets)
            case "x":
                self._take_calls(cards, nets)
            case "c":
                self._capacitors.add(cards, nets)
            case "r":
                self._resistors.add(cards, nets)
            case "v":
                self._take_sources(cards, nets)
            case _:
                self._others.setdefault(cards.letter, []).extend(cards.numbers.tolist())

    def _take_transistors(self, cards: CardColumns, nets: IntArray) -> None:
        """Take M cards; of more than four nets the first four are drain, gate, source, bulk."""
        if len(nets) > _PINS:
            self._further_pins.append(cards.numbers)
            for word, first in zip(*np.unique(cards.targets, return_index=True), strict=True):
                if _NUMBER.match(self._netlist.cards.words[int(word)]):
                    card = self._netlist.card(int(cards.numbers[first]))
                    self._mistakes.add(_loose_size(card))
        self._transistors.add(cards, nets[:_PINS])

    def _take_sources(self, cards: CardColumns, nets: IntArray) -> None:
        plus, minus = nets.tolist()
        self._sources += zip(cards.numbers.tolist(), plus, minus, strict=True)

    def _take_calls(self, cards: CardColumns, nets: IntArray) -> None:
        words, targets = distinct(cards.targets)
        names = self._meant(self._netlist.cards.words.some(words))
        if any(name in self._netlist.callees.spellings for name in names):
            names, targets = self._by_spelling(cards)
        kinds = [self._classifier.call_kind(name, len(nets), cards.values.keys()) for name in names]
        for kind in dict.fromkeys(kinds):
            rows = np.flatnonzero(np.array([k == kind for k in kinds])[targets])
            some, wires = _selected(cards, rows), nets[:, rows]
            if kind == "transistor":
                self._take_wrapped(some, wires)
            elif kind == "instance":
                self._calls += self._made(some, [names[i] for i in targets[rows].tolist()], wires)
            else:
                self._others.setdefault("x", []).extend(some.numbers.tolist())

    def _meant(self, words: Iterable[bytes]) -> list[str]:
        """Return the keys of what some words mean here."""
        scope, callees = self._subcircuit.name.lower(), self._netlist.callees
        if not callees.local:
            return list(map(folded_name, words))
        return [callees.local.get((scope, folded_name(word)), folded_name(word)) for word in words]

    def _by_spelling(self, cards: CardColumns) -> tuple[list[str], IntArray]:
        """Return the keys of what some cards call, and which each card calls, case and all."""
        keys = [self._netlist.callee(self._netlist.card(n)) for n in cards.numbers.tolist()]
        index = {key: i for i, key in enumerate(dict.fromkeys(keys))}
        return list(index), np.array([index[key] for key in keys], np.int32)

    def _made(self, cards: CardColumns, names: Iterable[str], nets: IntArray) -> Iterator[Call]:
        """Give the calls some cards are."""
        count = len(cards.numbers)
        columns = [numbers.tolist() for numbers in cards.values.values()]
        rows = list(zip(*columns, strict=True)) if columns else [()] * count
        wires = zip(*nets.tolist(), strict=True) if len(nets) else [()] * count
        passed = self._passed.of(tuple(cards.values), rows)
        return map(Call, cards.numbers.tolist(), names, wires, passed)

    def _take_wrapped(self, cards: CardColumns, nets: IntArray) -> None:
        if len(nets) < _PINS:
            for number in cards.numbers[:MOST].tolist():
                self._mistakes.add(_wrong_pins(self._netlist.card(number)))
            return
        self._take_transistors(cards, nets)

    def outline(self, nets: LocalNets) -> Outline:
        """Return the finished outline."""
        rows = (self._transistors.rows(), self._capacitors.rows(), self._resistors.rows())
        calls = tuple(sorted(self._calls, key=lambda call: call.card))
        return Outline(
            subcircuit=self._subcircuit,
            nets=nets,
            transistors=rows[0],
            capacitors=rows[1],
            resistors=rows[2],
            calls=calls,
            sources=tuple(sorted(self._sources)),
            others={letter: tuple(sorted(cards)) for letter, cards in self._others.items()},
            names_used=frozenset(self._names_used(rows, calls)),
            repeated=self._repeated(),
            further_pins=np.sort(np.concatenate(self._further_pins)),
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
        if not self._netlist.cards.may_repeat(self._subcircuit.name.lower()):
            return ()
        counts = Counter(self._netlist.card_name(n).lower() for n in self._subcircuit.cards)
        return tuple(name for name, count in counts.items() if count > 1)


def _wrong_pins(card: Card) -> ElaborationError:
    message = (
        f"'{card.name}' calls the transistor '{card.target}' with {len(card.nodes)} nets, "
        "expected four: drain, gate, source, bulk"
    )
    return ElaborationError(message, code="pin-count", span=card.span)


def _loose_size(card: Card) -> ElaborationError:
    message = (
        f"'{card.name}' would have the model '{card.target}'; sizes need names, as in w=1u l=60n"
    )
    return ElaborationError(message, code="loose-word", span=card.target_span)


def _selected(cards: CardColumns, rows: NDArray[np.intp]) -> CardColumns:
    """Return some of the cards."""
    return replace(
        cards,
        numbers=cards.numbers[rows],
        nodes=cards.nodes[:, rows],
        targets=cards.targets[rows],
        values={name: column[rows] for name, column in cards.values.items()},
    )


def _names_in(text: str) -> frozenset[str]:
    try:
        formula = parse_value(text).formula
    except FormulaError:
        return frozenset()
    return frozenset() if formula is None else formula.names
