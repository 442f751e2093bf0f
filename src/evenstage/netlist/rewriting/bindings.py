"""Where a parameter gets its value and what depends on it, over the whole text.

A name inside a subcircuit means, in this order: what a ``.param`` card inside it says, what the
call passes, the default of the ``.subckt`` card, a ``.param`` card of the top level. The answer may
differ from call to call, so a name is looked at together with the X card that calls its subcircuit.
"""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING, Final, NamedTuple

from evenstage.netlist.expression import FormulaError
from evenstage.netlist.values import parse_value

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Mapping, Sequence

    from evenstage.netlist.netlist import Card, CardGroup, Netlist, Parameter

_CARDS_KEPT: Final = 1 << 16


def names_in(text: str) -> tuple[str, ...]:
    """Return the lower-case parameter names of a value; () where it has none.

    Examples
    --------
    >>> names_in("'int((NF+1)/2)*w/nf*0.29u'"), names_in("0.6u")
    (('nf', 'w'), ())
    """
    try:
        formula = parse_value(text).formula
    except FormulaError:
        return ()
    return () if formula is None else tuple(sorted(formula.names))


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


class _Mention(NamedTuple):
    """A value that uses a name: of a card, or (None) of a parameter of a scope."""

    scope: str
    card: int | None
    name: str


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


@dataclass(frozen=True)
class Bindings:
    """The parameter names of a whole netlist.

    Parameters
    ----------
    netlist : Netlist
        The text.
    transistors : frozenset of int
        Numbers of the cards that are transistors: a call of a wrapped one is not followed.
    """

    netlist: Netlist
    transistors: frozenset[int] = frozenset()

    @cached_property
    def card(self) -> Callable[[int], Card]:
        """Gives the card of a number; cards asked for lately are kept."""
        return lru_cache(maxsize=_CARDS_KEPT)(self.netlist.card)

    def callers(self, scope: str) -> tuple[int | None, ...]:
        """Return the numbers of the X cards that call a scope; ``(None,)`` if there is none."""
        return self._callers.get(scope, (None,))

    def binding(self, place: Place) -> Binding | None:
        """Return what gives a name its value, or None if nothing does."""
        scope, name, caller = place
        inside = self._inside[scope].get(name)
        if inside is not None:
            return self._in_scope(place, inside, "inside")
        if caller is not None:
            card = self.card(caller)
            passed = card.parameter(name)
            if passed is not None:
                return Binding(place, passed, "passed", card.scope, self.callers(card.scope))
        default = self._defaults[scope].get(name)
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

    @cached_property
    def _inside(self) -> Mapping[str, Mapping[str, Parameter]]:
        scopes = {**self.netlist.subcircuits, "": self.netlist.top}
        return {name: {p.name: p for p in s.assignments} for name, s in scopes.items()}

    @cached_property
    def _defaults(self) -> Mapping[str, Mapping[str, Parameter]]:
        scopes = {**self.netlist.subcircuits, "": self.netlist.top}
        return {name: {p.name: p for p in s.defaults} for name, s in scopes.items()}

    @cached_property
    def _callers(self) -> Mapping[str, tuple[int, ...]]:
        callers: defaultdict[str, list[int]] = defaultdict(list)
        for _, group in self._groups():
            if group.letter == "x":
                for number, target in zip(group.numbers, self._meant(group), strict=True):
                    callers[target].append(number)
        known = self.netlist.subcircuits.keys() & callers.keys()
        return {name: tuple(sorted(callers[name])) for name in known}

    def _meant(self, group: CardGroup) -> Sequence[str]:
        """Return the keys of what some X cards call."""
        callees = self.netlist.callees
        if callees.local or callees.spellings:
            return [self.netlist.callee(self.netlist.card(number)) for number in group.numbers]
        return [_text(target) for target in group.targets]

    @cached_property
    def _mentions(self) -> Mapping[tuple[str, str], list[_Mention]]:
        """By scope and name: the values that use that name of that scope."""
        mentions: defaultdict[tuple[str, str], list[_Mention]] = defaultdict(list)
        for scope, inside in self._inside.items():
            for parameter in (*inside.values(), *self._defaults[scope].values()):
                names = names_in(parameter.text)
                where = "" if names == (parameter.name,) else scope
                for name in names:
                    mentions[where, name].append(_Mention(scope, None, parameter.name))
        for scope, group in self._groups():
            for parameter_name, texts in (*group.parameters.items(), ("", group.values)):
                names_of = {text: names_in(_text(text)) for text in set(texts)}
                if not any(names_of.values()):
                    continue
                for number, text in zip(group.numbers, texts, strict=True):
                    for name in names_of[text]:
                        mentions[scope, name].append(_Mention(scope, number, parameter_name))
        return mentions

    def _groups(self) -> Iterator[tuple[str, CardGroup]]:
        """Yield all cards that count, in columns, with their scope."""
        for scope, subcircuit in {**self.netlist.subcircuits, "": self.netlist.top}.items():
            for group in self.netlist.card_groups(subcircuit.cards):
                yield scope, group

    @cached_property
    def _scopes_naming(self) -> Mapping[str, list[str]]:
        """By name: the subcircuits in which it may stand for the top level's."""
        scopes: defaultdict[str, list[str]] = defaultdict(list)
        for scope, name in self._mentions:
            if scope:
                scopes[name].append(scope)
        return scopes

    def _in_scope(self, place: Place, parameter: Parameter, kind: str) -> Binding:
        """Return a binding of the scope itself; ``w=w`` takes the top level's w."""
        if place.scope and names_in(parameter.text) == (place.name,):
            return Binding(place, parameter, kind, "", (None,))
        return Binding(place, parameter, kind, place.scope, (place.caller,))

    def _direct(self, place: Place) -> Iterator[Use | Place]:
        """Yield what uses a name in one step."""
        scope, name, caller = place
        for mention in self._mentions.get((scope, name), ()):
            if mention.card is not None:
                yield self._on_card(mention.card, mention.name, caller)
                continue
            ways = (caller,) if mention.scope == scope else self.callers(mention.scope)
            for way in ways:
                yield from self._unless_passed(Place(mention.scope, mention.name, way))
        if not scope:
            for inner in self._scopes_naming.get(name, ()):
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


def _text(word: bytes) -> str:
    return word.decode("utf-8", "surrogateescape")
