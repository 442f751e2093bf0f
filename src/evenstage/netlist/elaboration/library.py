"""Everything the elaboration of one block looks up: outlines, templates, models, parameters."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.errors import ElaborationError, Notice
from evenstage.netlist.elaboration.mistakes import MOST, Mistakes
from evenstage.netlist.elaboration.outline import Outline, OutlineBuilder
from evenstage.netlist.elaboration.polarity import Models
from evenstage.netlist.elaboration.template import Binder, CallForm, Key, Template
from evenstage.netlist.parameters import Scope
from evenstage.netlist.wording import nearest

if TYPE_CHECKING:
    from collections.abc import Collection

    from evenstage.netlist.elaboration.outline import CallKind
    from evenstage.netlist.netlist import Card, Netlist
    from evenstage.process.process import Process

_GEOMETRY = ("w", "l", "m", "mult", "nf", "ng", "ad", "as", "pd", "ps")
#: What an X card must say at least once to count as a transistor nobody defines.
_SIZES = frozenset({"w", "l", "nf", "nfin"})


class Library:
    """Outlines and templates of a netlist, made when they are first needed.

    Parameters
    ----------
    netlist : Netlist
        The cards.
    process : Process
        The transistor types.
    """

    def __init__(self, netlist: Netlist, process: Process) -> None:
        self.netlist = netlist
        self.process = process
        self.models = Models(netlist, process)
        self.globals = Scope(assignments=netlist.top.assignments, functions=netlist.functions)
        self.width_parameters = frozenset(t.width_parameter.lower() for t in process.transistors)
        own = sorted(self.width_parameters)
        own += [t.fingers_parameter.lower() for t in process.transistors if t.fingers_parameter]
        names = tuple(dict.fromkeys((*_GEOMETRY, *own)))
        self._sizes = _SIZES | set(own)
        self._outlines: dict[str, Outline] = {}
        self.mistakes = Mistakes(netlist.sources)
        self._builder = OutlineBuilder(netlist, names, self.mistakes)
        self._templates: dict[Key, Template] = {}
        #: Templates of calls that pass numbers only, and the multipliers of these calls.
        self.alike: dict[CallForm, tuple[Key, float]] = {}
        self._covered: dict[str, bool] = {}
        self._missing: set[str] = set()
        self._circular = False

    def outline(self, name: str) -> Outline:
        """Return the outline of a definition by lower-case name; empty: the top level."""
        known = self._outlines.get(name)
        if known is None:
            subcircuit = self.netlist.subcircuits[name] if name else self.netlist.top
            known = self._outlines[name] = self._builder.outline(subcircuit, self)
        return known

    def template(self, key: Key) -> Template:
        """Return a definition with bound parameters."""
        known = self._templates.get(key)
        if known is None:
            known = self._templates[key] = Binder(self).bind(key)
        return known

    def scope(self, key: Key) -> Scope:
        """Return the parameters a definition sees with the values its caller gives it."""
        name, passed = key
        if not name:
            return self.globals
        subcircuit = self.netlist.subcircuits[name]
        return Scope(subcircuit.defaults, subcircuit.assignments, dict(passed), self.globals)

    def is_wrapper(self, outline: Outline) -> bool:
        """Tell whether a definition holds one transistor, or one call, and nothing else."""
        return (
            len(outline.transistors) + len(outline.calls) == 1
            and len(outline.capacitors) == len(outline.resistors) == 0
            and not outline.sources
            and not outline.others
        )

    def call_kind(self, target: str, nets: int, parameters: Collection[str]) -> CallKind:
        """Return what cards are that call a name with so many nets and such parameters."""
        defined = target in self.netlist.subcircuits
        possible = self._covered.get(target)
        if possible is None:
            covered = self.process.type_of(target) is not None
            possible = covered and (not defined or self._is_opaque(target))
            self._covered[target] = possible
        sized = not self._sizes.isdisjoint(parameters)
        if possible and sized:
            return "transistor"
        # Diodes and resistors drawn as calls have sizes and fewer nets than a transistor.
        return "unknown" if sized and not defined and nets < 4 else "instance"

    def _is_opaque(self, target: str) -> bool:
        """Tell whether a definition has no transistor we could see, or calls only itself."""
        cards = self.netlist.subcircuits[target].cards
        if len(cards) > 20:
            return False
        found = [self.netlist.card(number) for number in cards]
        return not any(
            card.letter == "m" or (card.letter == "x" and self.netlist.callee(card) != target)
            for card in found
        )

    def reachable(self, top: str, *, going_on: bool = False) -> list[str]:
        """Return a definition and all it calls, callers before callees.

        Parameters
        ----------
        top : str
            Lower-case name of the definition; empty: the top level.
        going_on : bool
            Whether mistakes wait to be told together with those of later steps, if these can be
            taken: calls of what is missing are left out then, but no definition may call itself.

        Raises
        ------
        ElaborationError
            If a definition is missing or calls itself, or a value on a card cannot be read.
        """
        order: list[str] = []
        done: set[str] = set()
        path: dict[str, None] = {}
        stack: list[tuple[str, bool]] = [(top, False)]
        while stack:
            name, finished = stack.pop()
            if finished:
                path.popitem()
                done.add(name)
                order.append(name)
            elif name not in done:
                path[name] = None
                stack.append((name, True))
                stack += [(callee, False) for callee in self._callees(name, path)]
        if self._circular or not going_on:
            self.mistakes.check()
        return order[::-1]

    def _callees(self, name: str, path: Collection[str]) -> list[str]:
        callees: dict[str, None] = {}
        for call in self.outline(name).calls:
            if call.target in callees or call.target in self._missing:
                continue
            if call.target not in self.netlist.subcircuits:
                self._missing.add(call.target)
                if len(self._missing) < MOST:
                    self.mistakes.add(self._unknown(call.card))
            elif call.target in path:
                loop = list(path)
                self._circular = True
                self.mistakes.add(self._recursive(call.card, loop[loop.index(call.target) :]))
            else:
                callees[call.target] = None
        return list(callees)

    def _unknown(self, number: int) -> ElaborationError:
        card = self.netlist.card(number)
        names = [subcircuit.name for subcircuit in self.netlist.subcircuits.values()]
        hint = nearest(card.target, names)
        if not hint and self.process.type_of(card.target) is not None:
            hint = "; a transistor needs w or l on its card"
        elif not hint and len(card.nodes) == 4 and self._sized(card):
            hint = "; if it is a transistor, add its name to the process file"
        message = f"there is no subcircuit '{card.target}'{hint}"
        return ElaborationError(message, code="unknown-subcircuit", span=card.target_span)

    def _recursive(self, number: int, loop: list[str]) -> ElaborationError:
        card = self.netlist.card(number)
        names = [self.netlist.subcircuits[name].name for name in loop]
        chain = " -> ".join([*names, names[0]])
        message = f"'{names[0]}' calls itself: {chain}"
        return ElaborationError(message, code="recursive-subcircuit", span=card.target_span)

    def _sized(self, card: Card) -> bool:
        return any(parameter.name in self._sizes for parameter in card.parameters)

    def notices(self, names: list[str]) -> list[Notice]:
        """Return what was assumed about some definitions."""
        repeated = [
            f"{name}.{card}" if name else card
            for name in names
            for card in self.outline(name).repeated
        ]
        notices = self.models.notices()
        if repeated:
            message = f"several cards of one subcircuit share a name: {', '.join(repeated[:8])}"
            notices.append(Notice("duplicate-name", message, names=tuple(repeated)))
        return notices
