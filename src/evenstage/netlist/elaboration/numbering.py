"""Numbers for the nets of one definition, a column at a time."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from numpy.typing import NDArray

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.netlist import CardColumns

#: Cards looked at together.
_CHUNK: Final = 1 << 16
#: No card has so many nets.
_PINS: Final = 1 << 24
_NEVER: Final = np.iinfo(np.int64).max


class NetNumbering:
    """Numbers local nets: the ports first, in their order, then the others as the text has them.

    Parameters
    ----------
    words : int
        How many words the netlist has.
    """

    def __init__(self, words: int) -> None:
        self._first: NDArray[np.int64] = np.full(words, _NEVER)
        self._local = np.zeros(words, np.int32)

    def number(self, ports: IntArray, cards: Sequence[CardColumns]) -> tuple[IntArray, IntArray]:
        """Give the nets of some cards their numbers, which ``local`` then knows.

        Parameters
        ----------
        ports : IntArray
            Words of the ports.
        cards : sequence of CardColumns
            All cards with nets.

        Returns
        -------
        words : IntArray, shape (n,)
            Of each net.
        firsts : IntArray, shape (2, n - ports)
            Card and position on it at which each net that is no port is met first.
        """
        for words, places in _occurrences(cards):
            np.minimum.at(self._first, words, places)
        self._first[ports] = -1
        found = [(np.zeros(0, np.int32), np.zeros(0, np.int64))]
        for words, places in _occurrences(cards):
            new = self._first[words] == places
            found.append((words[new], places[new]))
        words, places = (np.concatenate(column) for column in zip(*found, strict=True))
        order = np.argsort(places)
        numbered = np.concatenate([ports, words[order]])
        self._local[numbered] = np.arange(len(numbered))
        self._first[numbered] = _NEVER
        return numbered, np.stack(np.divmod(places[order], _PINS)).astype(np.int32)

    def local(self, words: IntArray) -> IntArray:
        """Return the numbers of nets, which were numbered last."""
        return self._local[words]


def _occurrences(cards: Sequence[CardColumns]) -> Iterator[tuple[IntArray, NDArray[np.int64]]]:
    """Give words and where they stand, as one number that grows with the text."""
    for one in cards:
        position = np.arange(len(one.nodes))[:, None]
        for start in range(0, len(one.numbers), _CHUNK):
            numbers = one.numbers[start : start + _CHUNK].astype(np.int64)
            words = one.nodes[:, start : start + _CHUNK]
            yield words.ravel(), (numbers * _PINS + position).ravel()
