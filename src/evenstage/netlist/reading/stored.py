"""Cards of one shape in columns of numbers, filled row by row while the text is read."""

from __future__ import annotations

import re
from array import array
from itertools import accumulate, chain
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.netlist.netlist import CardColumns
from evenstage.netlist.reading.tails import EqualTails, PlainTails

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.netlist.devices import IntArray
    from evenstage.netlist.intake import Values, Words
    from evenstage.netlist.reading.shapes import Shape

_ROLES: Final = ("node", "nodes", "target", "argument", "value")
#: Makes every blank of the grammar but the line feed one that ``bytes.split`` knows.
_SPACES: Final = bytes(32 if (b < 33 and b != 10) or b == 44 else b for b in range(256))
#: So many cards are looked at before it is decided how those to come are read.
_MANY: Final = 256
#: Parameters are taken for alike where each occurs at least so often.
_ALIKE: Final = 4
_NUMERIC = re.compile(rb"[+-]?\.?[0-9]|['\"{(]")


class ShapeColumns:
    """All cards of one shape.

    Parameters
    ----------
    number : int
        Of the shape.
    shape : Shape
        How they are read.
    words, values : Words and Values
        Those of the netlist.
    """

    def __init__(self, number: int, shape: Shape, words: Words, values: Values) -> None:
        self.number = number
        #: Matches a card; its groups are to be taken.
        self.match = shape.row.match
        self._rows: list[tuple[bytes, ...]] = []
        self.take = self._rows.append
        self._shape = shape
        self._tails: EqualTails | PlainTails | None = None
        self._is_settled = len(shape.keys) < 2
        self.hashes = array("q")
        self._letter = shape.letter
        self._words = words
        self._values = values
        kept = [role for role in shape.roles if role != "key"]
        places = {role: [i for i, r in enumerate(kept) if r == role] for role in _ROLES}
        self._node_places = places["node"]
        self._target_place = next(iter(places["target"]), None)
        self._run_place = next(iter(places["nodes"]), None)
        self._arguments = places["argument"]
        # Of parameters with one name the last counts.
        self._value_places = dict(zip(shape.keys, places["value"], strict=True))
        self._first_value = min(places["value"], default=0)
        self._nodes = [array("i") for _ in self._node_places]
        self._targets = array("i")
        self._run = array("i")
        self._run_ends = array("i", [0])
        self._columns = {name: array("i") for name in self._value_places}
        if self._arguments:
            self._columns[""] = array("i")

    def waiting(self) -> int:
        """Return how many rows have been taken, but not yet stored."""
        return len(self._rows)

    def store(self) -> None:
        """Turn the rows that wait into numbers."""
        columns = list(zip(*self._rows, strict=True))
        self._rows.clear()
        number = self._words.__getitem__
        self.hashes.extend(map(hash, columns[0]))
        for column, place in zip(self._nodes, self._node_places, strict=True):
            column.extend(map(number, columns[place]))
        if self._target_place is not None:
            self._targets.extend(map(number, columns[self._target_place]))
        if self._run_place is not None:
            self._store_run(columns[self._run_place])
        if self._arguments:
            self._store_values("", main_argument([columns[i] for i in self._arguments]))
        if self._tails is not None:
            self._store_tails(self._tails, columns)
            return
        for name, place in self._value_places.items():
            self._store_values(name, columns[place])
        if not self._is_settled and len(columns[0]) >= _MANY:
            self._settle([columns[place] for place in self._value_places.values()])

    def _settle(self, values: list[tuple[bytes, ...]]) -> None:
        """Decide how the cards to come are read: their parameters all at once, or each apart."""
        self._is_settled = True
        groups = [1 + place - self._first_value for place in self._value_places.values()]
        if _ALIKE * len(set(zip(*values, strict=True))) <= len(values[0]):
            self._tails = EqualTails(self._shape, groups, self._values)
            self.match = self._shape.joint.match
        elif self._shape.plain_joint and self._letter != "x":
            self._tails = PlainTails(self._shape, groups, self._values)
            self.match = self._shape.plain_joint.match

    def _store_tails(
        self, tails: EqualTails | PlainTails, columns: Sequence[Sequence[bytes]]
    ) -> None:
        texts = columns[-1:] if isinstance(tails, EqualTails) else columns[-2:]
        for name, numbers in zip(self._value_places, tails.numbers(*texts), strict=True):
            self._columns[name].frombytes(numbers.tobytes())
        if not tails.is_useful:
            self._tails, self.match = None, self._shape.row.match
            if isinstance(tails, EqualTails):
                self._is_settled = False

    def _store_values(self, name: str, texts: Sequence[bytes]) -> None:
        take = self._values.kept if self._letter == "x" else self._values.numbers_of
        self._columns[name].extend(take(texts))

    def _store_run(self, runs: Sequence[bytes]) -> None:
        words = list(map(bytes.split, b"\n".join(runs).translate(_SPACES).split(b"\n")))
        self._run.extend(map(self._words.__getitem__, chain.from_iterable(words)))
        ends = accumulate(map(len, words), initial=self._run_ends.pop())
        self._run_ends.extend(ends)

    def columns(self, numbers: IntArray, first: int, last: int) -> Iterator[CardColumns]:
        """Give the rows ``[first, last)``, which are the cards of some numbers."""
        values = {name: _view(column)[first:last] for name, column in self._columns.items()}
        targets = _view(self._targets)[first:last]
        if self._run_place is None:
            nodes = np.empty((len(self._nodes), last - first), np.int32)
            for row, column in zip(nodes, self._nodes, strict=True):
                row[:] = _view(column)[first:last]
            yield self._made(numbers, nodes, targets, values)
            return
        ends = _view(self._run_ends)[first : last + 1]
        lengths = np.diff(ends)
        for length in np.unique(lengths).tolist():
            rows = np.flatnonzero(lengths == length)
            nodes = _view(self._run)[ends[rows] + np.arange(length)[:, None]]
            named = targets[rows] if len(targets) else nodes[-1]
            chosen = {name: column[rows] for name, column in values.items()}
            yield self._made(numbers[rows], nodes if len(targets) else nodes[:-1], named, chosen)

    def _made(
        self, numbers: IntArray, nodes: IntArray, targets: IntArray, values: dict[str, IntArray]
    ) -> CardColumns:
        return CardColumns(
            letter=self._letter, numbers=numbers, nodes=nodes, targets=targets, values=values
        )


def _view(column: array[int]) -> IntArray:
    return np.frombuffer(column, np.int32)


def main_argument(arguments: list[tuple[bytes, ...]]) -> Sequence[bytes]:
    """Return the values of R and C cards from their unnamed arguments (value, model)."""
    if len(arguments) == 1:
        return arguments[0]
    return [
        next((text for text in row if _NUMERIC.match(text)), row[0])
        for row in zip(*arguments, strict=True)
    ]
