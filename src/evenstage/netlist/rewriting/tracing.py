"""From a width back to the plain numbers in the text that it is proportional to."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import islice, product
from typing import TYPE_CHECKING, Final

from evenstage.netlist.expression import FormulaError
from evenstage.netlist.rewriting.bindings import Bindings, Place
from evenstage.netlist.rewriting.inlining import TOP, inlined
from evenstage.netlist.rewriting.proportion import degree
from evenstage.netlist.rewriting.spelling import is_number
from evenstage.netlist.values import parse_value

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from evenstage.netlist.expression import Formula
    from evenstage.netlist.netlist import Card, Parameter

_ALTERNATIVES: Final = 16


@dataclass(frozen=True, slots=True)
class Root:
    """A plain number a width is proportional to.

    Parameters
    ----------
    parameter : Parameter
        The number.
    kind : {"inside", "passed", "default"}
        As in ``Binding``.
    place : Place
        The name it gives a value to.
    """

    parameter: Parameter
    kind: str
    place: Place


@dataclass(frozen=True)
class Tracer:
    """Traces expressions through the parameter scopes of a netlist."""

    bindings: Bindings

    def roots(self, text: str, scope: str, callers: Sequence[int | None]) -> list[frozenset[Root]]:
        """Return the sets of numbers an expression is proportional to, the most natural first.

        Scaling all numbers of one set by a factor scales the expression by that factor, on each
        way of calling its scope. An expression may allow several sets (``wn*ratio``) or none.

        Parameters
        ----------
        text : str
            The expression, perhaps in quotes.
        scope : str
            Where its names are looked up.
        callers : sequence of int or None
            The ways of calling that scope.
        """
        return list(islice(self._of_text(text, scope, callers, frozenset()), _ALTERNATIVES))

    def _of_text(
        self, text: str, scope: str, callers: Sequence[int | None], above: frozenset[Place]
    ) -> Iterator[frozenset[Root]]:
        """Yield the sets that serve on all of some ways."""
        return _unions([list(self._on_one_way(text, scope, way, above)) for way in callers])

    def _on_one_way(
        self, text: str, scope: str, caller: int | None, above: frozenset[Place]
    ) -> Iterator[frozenset[Root]]:
        formula = self._formula(text)
        places = {} if formula is None else _places(formula, scope, caller)
        if formula is None or not places:
            return
        for scaled in self._scaled_together(formula, places):
            yield from _unions([list(self._of_name(place, above)) for place in scaled])

    def _formula(self, text: str) -> Formula | None:
        """Return the expression of a value; None where it is none that can be traced."""
        try:
            return inlined(text, self.bindings.netlist.functions)
        except FormulaError:
            return None

    def _of_name(self, place: Place, above: frozenset[Place]) -> Iterator[frozenset[Root]]:
        """Yield the sets that a name is proportional to; nothing for a circle."""
        binding = self.bindings.binding(place)
        if binding is None or place in above:
            return
        parameter = binding.parameter
        if is_number(parameter.text):
            yield frozenset({Root(parameter, binding.kind, binding.place)})
        else:
            further = above | {place}
            yield from self._of_text(parameter.text, binding.scope, binding.callers, further)

    def _scaled_together(
        self, formula: Formula, places: Mapping[str, Place]
    ) -> Iterator[Sequence[Place]]:
        """Yield the sets of names that an expression is proportional to: all, or single ones.

        Of single names the smaller value comes first: lengths are small, ratios are not.
        """
        values = {name: self.value(place) for name, place in places.items()}
        if any(math.isnan(value) for value in values.values()):
            return
        ordered = sorted(places, key=lambda name: (abs(values[name]), name))
        singles = [[name] for name in ordered] if len(places) > 1 else []
        for names in (sorted(places), *singles):
            if _is_proportional(formula, values, names):
                yield [places[name] for name in names]

    def value(self, place: Place, above: frozenset[Place] = frozenset()) -> float:
        """Return what a name means, on the first way to it; NaN where that cannot be said."""
        binding = self.bindings.binding(place)
        if binding is None or place in above:
            return math.nan
        further, way = above | {place}, binding.callers[0]
        return self._value(binding.parameter.text, binding.scope, way, further)

    def value_on_card(self, card: Card, parameter: Parameter, caller: int | None) -> float:
        """Return what a transistor card's parameter means in its text's own unit; NaN if unknown.

        Parameters
        ----------
        card : Card
            The transistor card.
        parameter : Parameter
            One of the card's.
        caller : int or None
            The way its subcircuit is called.
        """
        return self._value(parameter.text, card.scope, caller, frozenset())

    def _value(self, text: str, scope: str, caller: int | None, above: frozenset[Place]) -> float:
        try:
            formula = inlined(text, self.bindings.netlist.functions)
            if formula is None:
                return parse_value(text).number
            places = _places(formula, scope, caller)
            return formula.value(lambda name: self.value(places[name], above))
        except FormulaError:
            return math.nan


def _places(formula: Formula, scope: str, caller: int | None) -> dict[str, Place]:
    """Return what each name of an expression means on one way of calling its scope."""
    return {
        name: (
            Place("", name.removeprefix(TOP), None)
            if name.startswith(TOP)
            else Place(scope, name, caller)
        )
        for name in sorted(formula.names)
    }


def _unions(choices: Sequence[Sequence[frozenset[Root]]]) -> Iterator[frozenset[Root]]:
    """Yield the unions of one set of each group."""
    for choice in islice(product(*choices), _ALTERNATIVES):
        yield frozenset[Root]().union(*choice)


def _is_proportional(formula: Formula, values: Mapping[str, float], scaled: list[str]) -> bool:
    """Tell whether an expression grows by a factor when some of its names do."""
    try:
        positive = formula.value(values.__getitem__) > 0
        return positive and degree(formula.root, scaled, values.__getitem__) == 1
    except FormulaError:
        return False
