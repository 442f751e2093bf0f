"""The words of cards as numbers, stored while the text is read so that no card is read twice.

A net or a model is a number among all words of the netlist, a value a number among all values. One
transistor takes some fifty bytes like this; its own name stays in the text.
"""

from __future__ import annotations

import math
import re
from array import array
from collections import defaultdict
from itertools import count
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.netlist.decimals import PLAIN, decimals
from evenstage.netlist.expression import FormulaError
from evenstage.netlist.values import Style, plain_value

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Iterator, Sequence

    from numpy.typing import NDArray

    from evenstage.netlist.devices import FloatArray, IntArray

    Styles = NDArray[np.int8]

#: Distinct texts remembered; random values would otherwise fill the memory.
_REMEMBERED: Final = 1 << 17
#: Values of which more than half of the first so many are distinct are converted together.
_MANY: Final = 64
_PLAIN = re.compile(rb"(?:" + PLAIN + rb"\n)++")
_BARE = re.compile(rb"(?:[+-]?(?:[0-9]++\.?+[0-9]*+|\.[0-9]++)(?:e[+-]?[0-9]++)?+\n)++")


class Words(defaultdict[bytes, int]):
    """Numbers for words, in the order in which they are first asked for."""

    def __init__(self) -> None:
        super().__init__(count().__next__)


class WordList:
    """The words of a netlist by their numbers, in lower case.

    Parameters
    ----------
    words : iterable of bytes
        In the order of their numbers.
    """

    def __init__(self, words: Iterable[bytes]) -> None:
        kept = list(words)
        self._text = b"".join(kept)
        ends = np.cumsum(np.fromiter(map(len, kept), np.int64, len(kept)))
        self._starts = np.concatenate([[0], ends]).astype(np.int64)

    def __len__(self) -> int:
        return len(self._starts) - 1

    def __getitem__(self, number: int) -> bytes:
        """Return a word."""
        return self._text[self._starts[number] : self._starts[number + 1]]

    def some(self, numbers: IntArray) -> Iterator[bytes]:
        """Give some words."""
        starts, ends = self._starts[numbers].tolist(), self._starts[numbers + 1].tolist()
        return (self._text[start:end] for start, end in zip(starts, ends, strict=True))


class Values:
    """All values of a netlist by their numbers: what each is worth and how it is spelt."""

    def __init__(self) -> None:
        self._numbers = array("d")
        self._styles = array("b")
        self._texts: dict[int, str] = {}
        self._met = _Memo(self.add)
        self._kept = _Memo(self._add_kept)

    def add(self, text: bytes) -> int:
        """Take a value; return its number."""
        number = len(self._numbers)
        written = text.decode("utf-8", "surrogateescape")
        try:
            value = plain_value(written)
        except FormulaError:
            value = None  # it is refused where it is used
        self._numbers.append(math.nan if value is None else value.number)
        self._styles.append(Style.COMPUTED if value is None else value.style)
        if value is None:
            self._texts[number] = written
        return number

    def _add_kept(self, text: bytes) -> int:
        number = self.add(text)
        self._texts.setdefault(number, text.decode("utf-8", "surrogateescape"))
        return number

    def numbers_of(self, texts: Sequence[bytes]) -> Iterable[int]:
        """Return the numbers of some values; the text is kept of expressions alone."""
        if len(texts) >= _MANY and 2 * len(set(texts[:_MANY])) > _MANY:
            numbers = self._add_all(texts)
            if numbers is not None:
                return numbers
        return map(self._met.__getitem__, texts)

    def kept(self, texts: Iterable[bytes]) -> Iterable[int]:
        """Return the numbers of some values whose texts are kept."""
        return map(self._kept.__getitem__, texts)

    def _add_all(self, texts: Sequence[bytes]) -> range | None:
        """Take values that are spelt alike, all at once; None if they are not."""
        lines = b"\n".join(texts) + b"\n"
        if _PLAIN.fullmatch(lines):
            return self.add_decimals(lines)
        if _BARE.fullmatch(lines) is None:
            return None
        numbers = np.array(list(map(float, lines.split())))
        if np.isinf(numbers).any():
            return None
        return self._append(numbers, np.zeros(len(numbers), np.bool_))

    def add_decimals(self, text: bytes) -> range | None:
        """Take the plain decimals of a text; None if there are too long ones among them.

        Parameters
        ----------
        text : bytes
            As ``decimals`` wants it.
        """
        found = decimals(text)
        return None if found is None else self._append(*found)

    def _append(self, numbers: FloatArray, scaled: NDArray[np.bool_]) -> range:
        first = len(self._numbers)
        self._numbers.frombytes(numbers.tobytes())
        styles = np.where(scaled, np.int8(Style.SUFFIXED), np.int8(Style.BARE))
        self._styles.frombytes(styles.tobytes())
        return range(first, len(self._numbers))

    def finish(self) -> None:
        """Forget what only reading needs."""
        self._met.clear()
        self._kept.clear()

    def text(self, number: int) -> str:
        """Return the text of a value, if it was kept."""
        return self._texts[number]

    def worth(self, numbers: IntArray) -> tuple[FloatArray, Styles]:
        """Return what values are worth (NaN for expressions) and how they are spelt."""
        if len(numbers) == 0:
            return np.zeros(0), np.zeros(0, np.int8)
        values = np.frombuffer(self._numbers, np.float64)
        styles = np.frombuffer(self._styles, np.int8)
        return values[numbers], styles[numbers]


class _Memo(dict[bytes, int]):
    """Numbers of the texts met lately."""

    def __init__(self, add: Callable[[bytes], int]) -> None:
        super().__init__()
        self._add = add

    def __missing__(self, text: bytes) -> int:
        if len(self) > _REMEMBERED:
            self.clear()
        number = self[text] = self._add(text)
        return number
