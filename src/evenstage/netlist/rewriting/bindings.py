"""Where a parameter gets its value and what depends on it, over the whole text.

A name inside a subcircuit means, in this order: what a ``.param`` card inside it says, what the
call passes, the default of the ``.subckt`` card, a ``.param`` card of the top level. The answer may
differ from call to call, so a name is looked at together with the X card that calls its subcircuit.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, NamedTuple, Self

from evenstage.netlist.rewriting.mentions import Mentions, names_in

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Mapping

    from evenstage.netlist.netlist import Card, Netlist, Parameter


class Place(NamedTuple):
    """A name in a subcircuit on one way of calling it.

    ``scope`` is the lower-case subcircuit name, empty for the top level; ``caller`` is the number
    of the X card, None for the top level and for a subcircuit nobody calls.
    """

    scope: str
    name: str
    caller: int | None


class Use(NamedTuple):
    """A card parameter that depends on a name, where ``caller`` calls the card's subcircuit."""

    card: int
    name: str
    caller: int | None


@dataclass(frozen=True, slots=True)
class Binding:
    """What gives a name its value.

    Parameters
    ----------
    place : Place
        The name where it is bound: the place asked for, or that of the top level.
    parameter : Parameter
        The text.
    kind : {"inside", "passed", "default"}
        A ``.param`` card of the scope, the calling X card, the ``.subckt`` card.
    scope : str
        Where the text's own names are looked up.
    callers : tuple of int or None
        On which ways of calling that scope.
    """

    place: Place
    parameter: Parameter
    kind: str
    scope: str
    callers: tuple[int | None, ...]


Ways = tuple[int | None, ...]


@dataclass(frozen=True)
class Bindings:
    """The parameter names of a whole netlist.

    Parameters
    ----------
    text : Mentions
        Its values.
    transistors : frozenset of int
        Numbers of the cards that are transistors: a call of a wrapped one is not followed.
    only : Mapping of str to tuple of int
        The calls that count of some scopes, where not all do.
    """

    text: Mentions
    transistors: frozenset[int] = frozenset()
    only: Mapping[str, Ways] = field(default_factory=dict)

    @classmethod
    def of(cls, netlist: Netlist, transistors: frozenset[int] = frozenset()) -> Self:
        """Return those of a netlist."""
        return cls(Mentions(netlist), transistors)

    @property
    def netlist(self) -> Netlist:
        """The text."""
        return self.text.netlist

    @property
    def card(self) -> Callable[[int], Card]:
        """Gives the card of a number."""
        return self.text.card

    def callers(self, scope: str) -> Ways:
        """Return the numbers of the X cards that call a scope; ``(None,)`` if there is none."""
        found = self.only.get(scope)
        return self.text.callers.get(scope, (None,)) if found is None else found

    def calls(self, scope: str) -> tuple[tuple[int, str], ...]:
        """Return the X cards of a scope that call subcircuits, each with what it calls."""
        return tuple(
            (number, callee)
            for number, callee in self.text.calls(scope)
            if number not in self.transistors
        )

    def binding(self, place: Place) -> Binding | None:
        """Return what gives a name its value, or None if nothing does."""
        scope, name, caller = place
        inside = self.text.inside[scope].get(name)
        if inside is not None:
            return self._in_scope(place, inside, "inside")
        if caller is not None:
            card = self.card(caller)
            passed = card.parameter(name)
            if passed is not None:
                return Binding(place, passed, "passed", card.scope, self.callers(card.scope))
        default = self.text.defaults[scope].get(name)
        if default is not None:
            return self._in_scope(place, default, "default")
        return self.binding(Place("", name, None)) if scope else None

    def uses(self, start: Place) -> Iterator[Use]:
        """Yield every card parameter that depends on a name, however indirectly."""
        pending, seen = [start], {start}
        while pending:
            for found in self._direct(pending.pop()):
                if isinstance(found, Use):
                    yield found
                elif found not in seen:
                    seen.add(found)
                    pending.append(found)

    def _in_scope(self, place: Place, parameter: Parameter, kind: str) -> Binding:
        """Return a binding of the scope itself; ``w=w`` takes the top level's w."""
        if place.scope and names_in(parameter.text) == (place.name,):
            return Binding(place, parameter, kind, "", (None,))
        return Binding(place, parameter, kind, place.scope, (place.caller,))

    def _direct(self, place: Place) -> Iterator[Use | Place]:
        """Yield what uses a name in one step."""
        scope, name, caller = place
        for mention in self.text.of_name.get((scope, name), ()):
            ways = (caller,) if mention.scope == scope else self.callers(mention.scope)
            for way in ways:
                if mention.card is not None:
                    yield self._on_card(mention.card, mention.name, way)
                else:
                    yield from self._unless_passed(Place(mention.scope, mention.name, way))
        if not scope:
            for inner in self.text.scopes_naming.get(name, ()):
                for way in self.callers(inner):
                    binding = self.binding(Place(inner, name, way))
                    if binding is not None and not binding.place.scope:
                        yield Place(inner, name, way)

    def _unless_passed(self, place: Place) -> Iterator[Place]:
        """Yield a dependent parameter of the same scope unless the call passes another value."""
        binding = self.binding(place)
        if binding is not None and binding.kind != "passed":
            yield place

    def _on_card(self, number: int, parameter: str, caller: int | None) -> Use | Place:
        """Return where a card hands a parameter on to: into its subcircuit, or no further."""
        card = self.card(number)
        if self._is_call(card):
            inner = Place(self.netlist.callee(card), parameter, number)
            binding = self.binding(inner)
            if binding is not None and binding.kind == "passed" and parameter != "m":
                return inner
        return Use(number, parameter, caller)

    def _is_call(self, card: Card) -> bool:
        """Tell whether a card calls a subcircuit that is more than a wrapped transistor."""
        known = self.netlist.callee(card) in self.netlist.subcircuits
        return card.letter == "x" and known and card.number not in self.transistors
