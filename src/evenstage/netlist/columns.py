"""Parameter values of many cards as columns: numbers, how they are spelt, and the expressions."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import MistakesError
from evenstage.netlist.expression import FormulaError
from evenstage.netlist.mistakes import MOST, Mistakes
from evenstage.netlist.parameters import bad_value
from evenstage.netlist.values import Style, parse_value

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable, Sequence

    from numpy.typing import NDArray

    from evenstage.errors import ElaborationError
    from evenstage.netlist.devices import FloatArray
    from evenstage.netlist.netlist import CardGroup, Netlist, Parameter
    from evenstage.netlist.parameters import Scope
    from evenstage.source import Span

    Styles = NDArray[np.int8]

#: Distinct texts remembered; random values would otherwise fill the memory.
_REMEMBERED = 1 << 17


class _Numbers(dict[bytes, complex]):
    """The number of each value text, with its style as the imaginary part (one lookup for both)."""

    def __missing__(self, text: bytes) -> complex:
        value = parse_value(text.decode("utf-8", "surrogateescape"))
        if len(self) > _REMEMBERED:
            self.clear()
        number = self[text] = complex(value.number, value.style)
        return number


_NUMBERS = _Numbers()


@dataclass(frozen=True, slots=True)
class Column:
    """One parameter of many cards, shape ``(n,)`` each.

    Parameters
    ----------
    numbers : FloatArray
        NaN where the card says nothing or has an expression.
    styles : array of int8
        A ``Style`` each.
    formulas : tuple of (int, str)
        Row and text of each expression.
    """

    numbers: FloatArray
    styles: Styles
    formulas: tuple[tuple[int, str], ...] = ()

    def bound(self, scope: Scope, where: Callable[[int], Span]) -> Column:
        """Return the column with its expressions evaluated; ``where`` gives a row's bytes."""
        if not self.formulas:
            return self
        numbers = self.numbers.copy()
        mistakes = Mistakes()
        for row, text in self.formulas:
            with mistakes.collecting():
                numbers[row] = scope.evaluate(text, partial(where, row))
            if len(mistakes) >= MOST:
                break
        mistakes.check()
        return Column(numbers, self.styles)

    def in_order(self, order: NDArray[np.intp]) -> Column:
        """Return the column with its rows in another order."""
        if np.all(np.diff(order) == 1):
            return self
        place = np.empty(len(order), np.intp)
        place[order] = np.arange(len(order))
        formulas = tuple(sorted((int(place[row]), text) for row, text in self.formulas))
        return Column(self.numbers[order], self.styles[order], formulas)


def absent(rows: int) -> Column:
    """Return the column of a parameter no card has."""
    return Column(np.full(rows, np.nan), np.zeros(rows, np.int8))


def parsed(texts: Sequence[bytes], where: Callable[[int], Span], first_row: int = 0) -> Column:
    """Return a column from value texts.

    Raises
    ------
    ElaborationError
        If a text is neither a number nor an expression.
    """
    try:
        pairs = np.array(list(map(_NUMBERS.__getitem__, texts)), np.complex128)
    except FormulaError:
        raise _error(texts, where) from None
    styles = pairs.imag.astype(np.int8)
    computed = np.flatnonzero(styles == Style.COMPUTED).tolist()
    formulas = ((first_row + i, texts[i].decode("utf-8", "surrogateescape")) for i in computed)
    return Column(pairs.real.copy(), styles, tuple(formulas))


def _error(texts: Sequence[bytes], where: Callable[[int], Span]) -> ElaborationError:
    """Return what is wrong with some texts, one of which at least is no value."""
    found = [error for row, text in enumerate(texts) if (error := _bad(text, partial(where, row)))]
    return found[0] if len(found) == 1 else MistakesError(tuple(found[:MOST]))


def _bad(text: bytes, where: Callable[[], Span]) -> ElaborationError | None:
    written = text.decode("utf-8", "surrogateescape")
    try:
        parse_value(written)
    except FormulaError as error:
        return bad_value(written, error, where())
    return None


def joined(columns: Iterable[Column]) -> Column:
    """Return columns one after the other; their formulas count rows through already."""
    parts = list(columns)
    return Column(
        np.concatenate([part.numbers for part in parts]),
        np.concatenate([part.styles for part in parts]),
        tuple(formula for part in parts for formula in part.formulas),
    )


def value_span(netlist: Netlist, number: int, name: str) -> Span:
    """Return the bytes of a card's parameter, or of its unnamed value for an empty name."""
    card = netlist.card(number)
    parameter: Parameter | None = card.parameter(name) if name else card.value
    return card.span if parameter is None else parameter.span


def group_column(netlist: Netlist, group: CardGroup, name: str, first_row: int) -> Column:
    """Return one parameter of a group of cards; an empty name stands for the unnamed value."""
    texts = group.parameters.get(name) if name else group.values
    if not texts:
        return absent(len(group.numbers))
    return parsed(texts, lambda row: value_span(netlist, group.numbers[row], name), first_row)
