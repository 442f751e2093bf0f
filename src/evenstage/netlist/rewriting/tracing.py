"""From a width back to the plain numbers in the text that it is proportional to."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import islice, product
from typing import TYPE_CHECKING, Final

from evenstage.netlist.expression import FormulaError
from evenstage.netlist.rewriting.bindings import Bindings, Place
from evenstage.netlist.rewriting.mentions import names_in
from evenstage.netlist.rewriting.spelling import is_number
from evenstage.netlist.values import parse_value

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Sequence

    from evenstage.netlist.netlist import Card, Parameter

_ALTERNATIVES: Final = 16
_FACTORS: Final = (0.73, 1.37)
_SAME: Final = 1e-9


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
        places = [Place(scope, name, caller) for name in names_in(text)]
        for scaled in self._scaled_together(text, places):
            yield from _unions([list(self._of_name(place, above)) for place in scaled])

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

    def _scaled_together(self, text: str, places: Sequence[Place]) -> Iterator[Sequence[Place]]:
        """Yield the sets of names that an expression is proportional to: all, or single ones.

        Of single names the smaller value comes first: lengths are small, ratios are not.
        """
        values = {place.name: self.value(place) for place in places}
        if not values or any(math.isnan(value) for value in values.values()):
            return
        singles = [[p] for p in sorted(places, key=lambda p: (abs(values[p.name]), p.name))]
        for scaled in [places, *(singles if len(places) > 1 else [])]:
            if _is_proportional(text, values, {place.name for place in scaled}):
                yield scaled

    def value(self, place: Place, above: frozenset[Place] = frozenset()) -> float:
        """Return what a name means, on the first way to it; NaN where that cannot be said."""
        binding = self.bindings.binding(place)
        if binding is None or place in above:
            return math.nan
        further, way = above | {place}, binding.callers[0]
        try:
            return _evaluate(
                binding.parameter.text,
                lambda name: self.value(Place(binding.scope, name, way), further),
            )
        except FormulaError:
            return math.nan

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
        try:
            return _evaluate(
                parameter.text, lambda name: self.value(Place(card.scope, name, caller))
            )
        except FormulaError:
            return math.nan


def _unions(choices: Sequence[Sequence[frozenset[Root]]]) -> Iterator[frozenset[Root]]:
    """Yield the unions of one set of each group."""
    for choice in islice(product(*choices), _ALTERNATIVES):
        yield frozenset[Root]().union(*choice)


def _is_proportional(text: str, values: dict[str, float], scaled: set[str]) -> bool:
    """Tell whether an expression grows by a factor when some of its names do."""
    try:
        now = _evaluate(text, values.__getitem__)
        return now > 0 and all(
            math.isclose(
                _evaluate(
                    text,
                    {n: v * (f if n in scaled else 1.0) for n, v in values.items()}.__getitem__,
                ),
                f * now,
                rel_tol=_SAME,
            )
            for f in _FACTORS
        )
    except FormulaError:
        return False


def _evaluate(text: str, lookup: Callable[[str], float]) -> float:
    """Return what a value means; raises FormulaError where it means nothing."""
    value = parse_value(text)
    return value.number if value.formula is None else value.formula.value(lookup)
