"""The parameters of many cards of one shape, read from their texts all at once.

The *tail* of a card is what stands there from its first parameter to its last value.
"""

from __future__ import annotations

from array import array
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.intake import Values
    from evenstage.netlist.reading.shapes import Shape

_MOST: Final = 1 << 14
#: So many lots may hold something unusual, more than those that do not.
_PATIENCE: Final = 4


class EqualTails(dict[bytes, int]):
    """Tails many of which are alike: each text is taken apart once.

    Most cards of a netlist are drawn like many others.

    Parameters
    ----------
    shape : Shape
        Of the cards.
    groups : Sequence of int
        The group of each column's parameter in the tail.
    values : Values
        Those of the netlist.
    """

    def __init__(self, shape: Shape, groups: Sequence[int], values: Values) -> None:
        super().__init__()
        self._columns = [array("i") for _ in groups]
        self._groups = groups
        self._match = shape.tail.fullmatch
        self._take = values.kept if shape.letter == "x" else values.numbers_of

    def __missing__(self, text: bytes) -> int:
        match = self._match(text)
        assert match is not None
        numbers = self._take([match[group] for group in self._groups])
        for column, number in zip(self._columns, numbers, strict=True):
            column.append(number)
        self[text] = len(self)
        return len(self) - 1

    @property
    def is_useful(self) -> bool:
        """Whether there are few enough of them."""
        return len(self) <= _MOST

    def numbers(self, texts: Sequence[bytes]) -> list[IntArray]:
        """Return the numbers of the values of some cards, in columns."""
        ids = np.fromiter(map(self.__getitem__, texts), np.intp, len(texts))
        return [np.frombuffer(column, np.int32)[ids] for column in self._columns]


class PlainTails:
    """Tails whose values are plain decimals, converted some hundred cards at once.

    There are two columns of them, as ``Shape.plain_joint`` gives them: the plain and the others.

    Parameters
    ----------
    shape : Shape
        Of the cards.
    groups : Sequence of int
        The group of each column's parameter in the tail.
    values : Values
        Those of the netlist.
    """

    def __init__(self, shape: Shape, groups: Sequence[int], values: Values) -> None:
        self._groups = groups
        self._match = shape.tail.fullmatch
        self._values = values
        self._count = len(shape.keys)
        self._misses = 0

    @property
    def is_useful(self) -> bool:
        """Whether few lots hold something unusual."""
        return self._misses < _PATIENCE

    def numbers(self, plain: Sequence[bytes], others: Sequence[bytes]) -> list[IntArray]:
        """Return the numbers of the values of some cards, in columns.

        Parameters
        ----------
        plain, others : Sequence of bytes
            Of each card one is None.
        """
        found = None if any(others) else self._values.add_decimals(b"\n".join(plain) + b"\n")
        if found is None:
            self._misses += 1
            return self._apart([a or b for a, b in zip(plain, others, strict=True)])
        self._misses = max(self._misses - 1, 0)
        rows = np.arange(found.start, found.stop, dtype=np.int32).reshape(-1, self._count)
        return [rows[:, group - 1] for group in self._groups]

    def _apart(self, texts: Sequence[bytes]) -> list[IntArray]:
        matches = [match for match in map(self._match, texts) if match is not None]
        columns = ([match[group] for match in matches] for group in self._groups)
        return [np.array(list(self._values.numbers_of(c)), np.int32) for c in columns]
