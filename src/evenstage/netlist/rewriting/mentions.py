"""Which values of the text use which names, and which cards call which definitions."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass
from functools import cached_property, lru_cache
from typing import TYPE_CHECKING, Final, NamedTuple

from evenstage.netlist.expression import FormulaError
from evenstage.netlist.rewriting.inlining import TOP, inlined
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


class Mention(NamedTuple):
    """A value that uses a name: of a card, or (None) of a parameter of a scope."""

    scope: str
    card: int | None
    name: str


@dataclass(frozen=True)
class Mentions:
    """All values of a netlist that use names, looked through once.

    Parameters
    ----------
    netlist : Netlist
        The text.
    """

    netlist: Netlist

    @cached_property
    def card(self) -> Callable[[int], Card]:
        """Gives the card of a number; cards asked for lately are kept."""
        return lru_cache(maxsize=_CARDS_KEPT)(self.netlist.card)

    @cached_property
    def inside(self) -> Mapping[str, Mapping[str, Parameter]]:
        """By scope and name: what ``.param`` cards inside say."""
        scopes = {**self.netlist.subcircuits, "": self.netlist.top}
        return {name: {p.name: p for p in s.assignments} for name, s in scopes.items()}

    @cached_property
    def defaults(self) -> Mapping[str, Mapping[str, Parameter]]:
        """By scope and name: what ``.subckt`` cards say."""
        scopes = {**self.netlist.subcircuits, "": self.netlist.top}
        return {name: {p.name: p for p in s.defaults} for name, s in scopes.items()}

    @cached_property
    def callers(self) -> Mapping[str, tuple[int, ...]]:
        """By scope: the X cards that call it."""
        callers: defaultdict[str, list[int]] = defaultdict(list)
        for _, group in self._groups():
            if group.letter == "x":
                for number, target in zip(group.numbers, self._meant(group), strict=True):
                    callers[target].append(number)
        known = self.netlist.subcircuits.keys() & callers.keys()
        return {name: tuple(sorted(callers[name])) for name in known}

    def calls(self, scope: str) -> Iterator[tuple[int, str]]:
        """Yield the X cards of a scope, each with the definition it calls."""
        subcircuit = self.netlist.subcircuits[scope] if scope else self.netlist.top
        for group in self.netlist.card_groups(subcircuit.cards):
            if group.letter == "x":
                for number, target in zip(group.numbers, self._meant(group), strict=True):
                    if target in self.netlist.subcircuits:
                        yield number, target

    def _meant(self, group: CardGroup) -> Sequence[str]:
        """Return the keys of what some X cards call."""
        callees = self.netlist.callees
        if callees.local or callees.spellings:
            return [self.netlist.callee(self.netlist.card(number)) for number in group.numbers]
        return [_text(target) for target in group.targets]

    @cached_property
    def of_name(self) -> Mapping[tuple[str, str], list[Mention]]:
        """By scope and name: the values that use that name of that scope."""
        mentions: defaultdict[tuple[str, str], list[Mention]] = defaultdict(list)
        for scope, inside in self.inside.items():
            for parameter in (*inside.values(), *self.defaults[scope].values()):
                reflexive = names_in(parameter.text) == (parameter.name,)
                for place in self._names(parameter.text, "" if reflexive else scope):
                    mentions[place].append(Mention(scope, None, parameter.name))
        for scope, group in self._groups():
            for parameter_name, texts in (*group.parameters.items(), ("", group.values)):
                names_of = {text: self._names(_text(text), scope) for text in set(texts)}
                if not any(names_of.values()):
                    continue
                for number, text in zip(group.numbers, texts, strict=True):
                    for place in names_of[text]:
                        mentions[place].append(Mention(scope, number, parameter_name))
        return mentions

    def _names(self, text: str, scope: str) -> tuple[tuple[str, str], ...]:
        """Return the names a value of a scope depends on, each with the scope it is one of."""
        names = names_in(text)
        if not any(name.endswith("()") for name in names):
            return tuple((scope, name) for name in names)
        try:
            formula = inlined(text, self.netlist.functions)
        except FormulaError:
            return tuple((scope, name) for name in names if not name.endswith("()"))
        found = () if formula is None else sorted(formula.names)
        return tuple(
            ("", name.removeprefix(TOP)) if name.startswith(TOP) else (scope, name)
            for name in found
        )

    def _groups(self) -> Iterator[tuple[str, CardGroup]]:
        """Yield all cards that count, in columns, with their scope."""
        for scope, subcircuit in {**self.netlist.subcircuits, "": self.netlist.top}.items():
            for group in self.netlist.card_groups(subcircuit.cards):
                yield scope, group

    @cached_property
    def scopes_naming(self) -> Mapping[str, list[str]]:
        """By name: the subcircuits in which it may stand for the top level's."""
        scopes: defaultdict[str, list[str]] = defaultdict(list)
        for scope, name in self.of_name:
            if scope:
                scopes[name].append(scope)
        return scopes


def _text(word: bytes) -> str:
    return word.decode("utf-8", "surrogateescape")
