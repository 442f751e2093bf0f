"""Cards of one kind of one definition, in columns."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.netlist.elaboration.columns import Column, absent, card_column, joined

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from numpy.typing import NDArray

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.elaboration.mistakes import Mistakes
    from evenstage.netlist.netlist import CardColumns, Netlist


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


class RowsBuilder:
    """Collects cards of one kind."""

    def __init__(
        self, netlist: Netlist, pins: int, names: Sequence[str], mistakes: Mistakes
    ) -> None:
        self._netlist = netlist
        self._mistakes = mistakes
        self._names = names
        self._columns: dict[str, list[tuple[int, Column]]] = {}
        self._count = 0
        self._cards = [np.zeros(0, np.int32)]
        self._nets = [np.zeros((pins, 0), np.int32)]
        self._targets = [np.zeros(0, np.int32)]

    def add(self, cards: CardColumns, nets: IntArray) -> None:
        """Take some cards and their nets, shape ``(pins, n)``."""
        for name in self._names:
            if name in cards.values:
                column = card_column(self._netlist, cards, name, self._count, self._mistakes)
                self._columns.setdefault(name, []).append((self._count, column))
        self._count += len(cards.numbers)
        self._cards.append(cards.numbers)
        self._nets.append(nets)
        self._targets.append(cards.targets)

    def rows(self) -> Rows:
        """Return what was collected, in the order of the cards, without empty columns."""
        cards = np.concatenate(self._cards)
        if len(cards) == 0:
            none = self._targets[0]
            return Rows(card=cards, nets=self._nets[0], target=none, target_names=(), columns={})
        order = _order(cards)
        columns = {}
        for name in [name for name in self._names if name in self._columns]:
            parts = self._columns.pop(name)  # so that nothing stays twice
            if any(part.styles.any() for _, part in parts):
                columns[name] = joined(_without_gaps(parts, self._count)).in_order(order)
        words, targets = distinct(np.concatenate(self._targets))
        return Rows(
            card=cards[order],
            nets=np.concatenate(self._nets, axis=1)[:, order],
            target=targets[order] if len(targets) else targets,
            target_names=tuple(map(folded_name, self._netlist.cards.words.some(words))),
            columns=columns,
        )


def _without_gaps(parts: list[tuple[int, Column]], count: int) -> Iterator[Column]:
    """Yield the parts of a column, each with its first row, and what is absent between them."""
    row = 0
    for first, part in parts:
        if first > row:
            yield absent(first - row)
        yield part
        row = first + len(part.numbers)
    if count > row:
        yield absent(count - row)


def _order(cards: IntArray) -> NDArray[np.intp] | slice:
    """Return what puts cards in the order of the text."""
    if len(cards) == 0 or np.all(cards[1:] > cards[:-1]):
        return slice(None)
    return np.argsort(cards, kind="stable")


def distinct(words: IntArray) -> tuple[IntArray, IntArray]:
    """Return the distinct words in the order in which they come, and the index of each."""
    if len(words) == 1:
        return words, np.zeros(1, np.int32)
    distinct, firsts, inverse = np.unique(words, return_index=True, return_inverse=True)
    order = np.argsort(firsts)
    rank = np.empty(len(order), np.int32)
    rank[order] = np.arange(len(order))
    return distinct[order], rank[inverse]


def folded_name(word: bytes) -> str:
    """Return the name of a definition or model as it is looked up."""
    return word.decode("utf-8", "surrogateescape").lower()
