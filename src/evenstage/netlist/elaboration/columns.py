"""Parameter values of many cards as columns: numbers, how they are spelt, and the expressions."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial
from typing import TYPE_CHECKING

import numpy as np

from evenstage.netlist.elaboration.mistakes import MOST, Mistakes
from evenstage.netlist.expression import FormulaError
from evenstage.netlist.parameters import bad_value
from evenstage.netlist.values import Style, parse_value

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable

    from numpy.typing import NDArray

    from evenstage.netlist.devices import FloatArray
    from evenstage.netlist.netlist import CardColumns, Netlist, Parameter
    from evenstage.netlist.parameters import Scope
    from evenstage.source import Span

    Styles = NDArray[np.int8]


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

    def in_order(self, order: NDArray[np.intp] | slice) -> Column:
        """Return the column with its rows in another order; a slice leaves them as they are."""
        if isinstance(order, slice):
            return self
        place = np.empty(len(order), np.intp)
        place[order] = np.arange(len(order))
        formulas = tuple(sorted((int(place[row]), text) for row, text in self.formulas))
        return Column(self.numbers[order], self.styles[order], formulas)


def absent(rows: int) -> Column:
    """Return the column of a parameter no card has."""
    return Column(np.full(rows, np.nan), np.zeros(rows, np.int8))


def joined(columns: Iterable[Column]) -> Column:
    """Return columns one after the other; their formulas count rows through already."""
    parts = list(columns)
    if len(parts) == 1:
        return parts[0]
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


def card_column(
    netlist: Netlist, cards: CardColumns, name: str, first_row: int, mistakes: Mistakes
) -> Column:
    """Return one parameter of some cards; an empty name stands for the unnamed value.

    Parameters
    ----------
    netlist : Netlist
        Where they stand.
    cards : CardColumns
        The cards.
    name : str
        The parameter.
    first_row : int
        What the first of them counts as in the formulas.
    mistakes : Mistakes
        Takes the texts that are neither a number nor an expression; their values are NaN.
    """
    ids = cards.values.get(name)
    if ids is None:
        return absent(len(cards.numbers))
    numbers, styles = netlist.cards.values.worth(ids)
    formulas = []
    wrong = 0
    for row in np.flatnonzero(styles == Style.COMPUTED).tolist():
        text = netlist.cards.values.text(int(ids[row]))
        try:
            parse_value(text)
        except FormulaError as error:
            wrong += 1
            if wrong <= MOST:
                span = value_span(netlist, int(cards.numbers[row]), name)
                mistakes.add(bad_value(text, error, span))
        else:
            formulas.append((first_row + row, text))
    return Column(numbers, styles, tuple(formulas))
