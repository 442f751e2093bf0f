"""Nets whose names differ by case alone: one net, or several.

Case makes no difference, unless a definition has two ports that differ by it alone: then it counts
in all names of nets. The brief may say either. Whatever is taken is told where it matters.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from itertools import chain, islice
from typing import TYPE_CHECKING, Final, Literal

import numpy as np

from evenstage.errors import NetlistError, Notice
from evenstage.netlist.intake import WordList

if TYPE_CHECKING:
    from collections.abc import Iterable, Iterator, Mapping, Sequence

    from numpy.typing import NDArray

    from evenstage.netlist.intake import Values
    from evenstage.netlist.netlist import (
        Card,
        CardColumns,
        CardGroup,
        CardStore,
        Netlist,
        Subcircuit,
        ValuePlaces,
    )
    from evenstage.source import Span

Case = Literal["any", "exact"]

#: Bytes looked through for names that differ by case where that only makes a notice, and nets of
#: one definition looked at: more only where that finds too few to show. What is longer a program
#: has written, and that spells a net one way.
_LOOKS: Final = ((1 << 16, 500), (2 << 20, 5000))
_SHOWN: Final = 4
_SIGNS: Final = bytes.maketrans(b",=()'\"{}", b" " * 8)


def settle_case(
    netlist: Netlist, numbers: Mapping[bytes, int], case: Case | None, clash: Span | None
) -> Netlist:
    """Return a netlist in which nets that differ by case alone are one net or several.

    Parameters
    ----------
    netlist : Netlist
        In which they are one.
    numbers : Mapping of bytes to int
        Of its words.
    case : {"any", "exact"}, optional
        Whether case counts; None: as the ports say.
    clash : Span, optional
        The first port that differs from another one of its definition by case alone.

    Raises
    ------
    NetlistError
        If there is such a port and case may not count.
    """
    if clash is not None and case == "any":
        message = f"a port '{clash.text}' stands here twice, for 'case' is \"any\" in the brief"
        raise NetlistError(message, code="duplicate-port", span=clash)
    if case == "exact" or clash is not None:
        cards = ExactCards(netlist.cards, _spelt_otherwise(netlist, numbers), netlist)
        return replace(netlist, _cards=cards, notices=(*netlist.notices, *_counts(case, clash)))
    names = {name.lower(): name for name in reversed(netlist.global_names)}
    return replace(
        netlist,
        global_names=tuple(name for name in netlist.global_names if name in names.values()),
        notices=(*netlist.notices, *_makes_none(netlist, numbers)),
    )


def _counts(case: Case | None, clash: Span | None) -> tuple[Notice, ...]:
    """Return a notice that case counts, where nobody has said so."""
    if case is not None or clash is None:
        return ()
    message = (
        f"the port '{clash.text}' differs from another by case alone, so in names of nets case "
        'counts; case = "any" in the brief overrules this'
    )
    return (Notice("case-of-nets", message, clash.place, (clash.text,)),)


def _makes_none(netlist: Netlist, numbers: Mapping[bytes, int]) -> tuple[Notice, ...]:
    """Return a notice that nets of some definition are one which are spelt in several ways."""
    found: dict[str, str] = {}
    for most, nets in _LOOKS:
        found = _spelt_apart(netlist, _spelt_otherwise(netlist, numbers, most), nets)
        if len(found) > _SHOWN or sum(len(source.data) for source in netlist.sources) <= most:
            break
    if not found:
        return ()
    shown = "; ".join(islice(found, _SHOWN)) + ("; ..." if len(found) > _SHOWN else "")
    message = (
        f"nets whose names differ by case alone are one net: {shown}; "
        'case = "exact" in the brief keeps them apart'
    )
    return (Notice("case-of-nets", message, next(iter(found.values())), tuple(found)),)


def _spelt_apart(netlist: Netlist, words: NDArray[np.int32], nets: int) -> dict[str, str]:
    """Return the spellings of nets that have several in one definition, each with a place.

    Parameters
    ----------
    netlist : Netlist
        In which they are one net.
    words : array of int32
        Those that may be meant.
    nets : int
        How many are looked at in each definition.
    """
    found: dict[str, str] = {}
    for subcircuit in (netlist.top, *netlist.subcircuits.values()) if len(words) else ():
        for spellings, number in _within(netlist, subcircuit, words, nets):
            if len(spellings) > 1:
                text = " and ".join(f"'{name}'" for name in sorted(spellings))
                found.setdefault(text, netlist.card(number).span.place)
    return found


def _within(
    netlist: Netlist, subcircuit: Subcircuit, words: NDArray[np.int32], nets: int
) -> Iterator[tuple[set[str], int]]:
    """Give the spellings of some words among the nets of a definition, and a card with each."""
    spelt: dict[int, set[str]] = {}
    last: dict[int, int] = {}
    ports = {port.lower(): port for port in subcircuit.ports}
    cards = subcircuit.cards[:nets]
    for word, number, position in islice(_occurrences(netlist.cards, cards, words), nets):
        name = netlist.node_name(number, position)
        known = spelt.setdefault(word, {ports.get(name.lower(), name)})
        if name not in known:
            known.add(name)
            last[word] = number
    return ((spelt[word], number) for word, number in last.items())


def _occurrences(
    cards: CardStore, numbers: Sequence[int], words: NDArray[np.int32]
) -> Iterator[tuple[int, int, int]]:
    """Give word, card and position of each net of some cards that is one of some words."""
    for columns in cards.columns(numbers):
        position, row = np.nonzero(np.isin(columns.nodes, words))
        found = columns.nodes[position, row], columns.numbers[row], position
        yield from zip(*(column.tolist() for column in found), strict=True)


def _spelt_otherwise(
    netlist: Netlist, numbers: Mapping[bytes, int], most: int | None = None
) -> NDArray[np.int32]:
    """Return the words of the netlist that the first bytes of its text spell in several ways."""
    spelt: dict[bytes, bytes] = {}
    several: set[bytes] = set()
    for source in netlist.sources:
        data = source.data[:most]
        most = None if most is None else most - len(data)
        if data.islower() or data.isupper():
            continue
        for token in set(data.translate(_SIGNS).split()):
            lower = token.lower()
            if spelt.setdefault(lower, token) != token:
                several.add(lower)
    return np.array(sorted(numbers[word] for word in several if word in numbers), np.int32)


@dataclass(frozen=True)
class ExactCards:
    """The cards of a netlist in which nets that differ by case are several.

    Parameters
    ----------
    cards : CardStore
        In which they are one.
    ambiguous : array of int32
        The words that are spelt in several ways.
    netlist : Netlist
        For the names of ports and global nets.
    """

    cards: CardStore
    ambiguous: NDArray[np.int32]
    netlist: Netlist

    def __len__(self) -> int:
        return len(self.cards)

    def __getitem__(self, number: int) -> Card:
        return self.cards[number]

    @cached_property
    def _numbers(self) -> dict[tuple[int, str], int]:
        """The number of each spelling of each ambiguous word; the first has that of the word."""
        numbers: dict[tuple[int, str], int] = {}
        firsts: set[int] = set()
        more = len(self.cards.words)
        for word, name in self._spelt():
            if (word, name) in numbers:
                continue
            if word in firsts:
                numbers[word, name] = more
                more += 1
            else:
                numbers[word, name] = word
                firsts.add(word)
        return numbers

    def _spelt(self) -> Iterator[tuple[int, str]]:
        """Give every ambiguous word with every spelling it has."""
        subcircuits = self.netlist.subcircuits.values()
        ports = chain.from_iterable(one.ports for one in subcircuits)
        ambiguous = frozenset(self.ambiguous.tolist())
        for name in chain(self.netlist.global_names, ports):
            word = self.cards.word_number(name)
            if word in ambiguous:
                yield word, name
        everywhere = range(len(self.cards))
        for word, number, position in _occurrences(self.cards, everywhere, self.ambiguous):
            yield word, self.cards.node_name(number, position)

    @cached_property
    def words(self) -> WordList:
        """All names of nets, models and subcircuits on the cards, in lower case."""
        words = self.cards.words
        more = sorted((number, word) for (word, _), number in self._numbers.items())
        every = words.some(np.arange(len(words)))
        return WordList(chain(every, (words[word] for number, word in more if number != word)))

    @property
    def values(self) -> Values:
        """All values on the cards."""
        return self.cards.values

    def columns(self, numbers: Sequence[int]) -> Iterator[CardColumns]:
        """Give the cards of ascending numbers as columns of numbers, each form by itself."""
        for columns in self.cards.columns(numbers):
            positions, rows = np.nonzero(np.isin(columns.nodes, self.ambiguous))
            if len(rows) == 0:
                yield columns
                continue
            nodes = columns.nodes.copy()
            for position, row in zip(positions.tolist(), rows.tolist(), strict=True):
                name = self.cards.node_name(int(columns.numbers[row]), position)
                nodes[position, row] = self._numbers[int(nodes[position, row]), name]
            yield replace(columns, nodes=nodes)

    def word_number(self, name: str) -> int:
        """Return the number of the word for a port or a global net."""
        word = self.cards.word_number(name)
        return self._numbers.get((word, name), word)

    def may_repeat(self, scope: str) -> bool:
        """Tell whether several cards of a subcircuit may have one name."""
        return self.cards.may_repeat(scope)

    def groups(self, numbers: Sequence[int]) -> Iterator[CardGroup]:
        """Give the cards of ascending numbers in groups, each of at most a few thousand."""
        return self.cards.groups(numbers)

    def name(self, number: int) -> str:
        """Return the name of a card as written."""
        return self.cards.name(number)

    def value_places(self, numbers: Sequence[int], name: str) -> Iterator[ValuePlaces]:
        """Give the places of one parameter on cards of ascending numbers, where they have it."""
        return self.cards.value_places(numbers, name)

    def full_names(self, numbers: Iterable[int]) -> Iterator[str]:
        """Give the names of some cards as written, behind those of their subcircuits."""
        return self.cards.full_names(numbers)

    def scope(self, number: int) -> str:
        """Return the lower-case name of the subcircuit that holds a card; empty: top level."""
        return self.cards.scope(number)

    def node_name(self, number: int, position: int) -> str:
        """Return a net as written, by card number and position on the card."""
        return self.cards.node_name(number, position)
