"""What a leaf calls, and what that calls: the definitions a sized copy of it needs for itself."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.netlist.rewriting.bindings import Bindings


@dataclass(frozen=True)
class Below:
    """A definition and all those it reaches.

    Parameters
    ----------
    root : str
        Lower-case name of the definition.
    order : tuple of str
        Those of all of them, callees before their callers; the root is the last.
    calls : Mapping of str to tuple of (int, str)
        By definition: its X cards that call definitions, each with what it calls.
    """

    root: str
    order: tuple[str, ...]
    calls: Mapping[str, tuple[tuple[int, str], ...]]

    @property
    def is_flat(self) -> bool:
        """Whether the definition calls no other."""
        return len(self.order) == 1

    @cached_property
    def callers(self) -> Mapping[str, tuple[int, ...]]:
        """By definition below the root: the calls of it that stand in these definitions."""
        found: dict[str, list[int]] = {}
        for calls in self.calls.values():
            for number, callee in calls:
                found.setdefault(callee, []).append(number)
        return {name: tuple(sorted(numbers)) for name, numbers in found.items()}

    def towards(self, scope: str) -> tuple[str, ...]:
        """Return the definitions through which the root reaches one of them, with both ends."""
        reaching = {scope}
        for name in self.order:
            if any(callee in reaching for _, callee in self.calls[name]):
                reaching.add(name)
        return tuple(name for name in self.order if name in reaching)

    def owned(self, bindings: Bindings) -> frozenset[str]:
        """Return the definitions that nothing outside these calls, the root among them."""
        owned = {self.root}
        for name in reversed(self.order[:-1]):
            callers = bindings.callers(name)
            if all(c is not None and bindings.card(c).scope in owned for c in callers):
                owned.add(name)
        return frozenset(owned)


def find_below(bindings: Bindings, root: str) -> Below:
    """Return what a definition reaches.

    Parameters
    ----------
    bindings : Bindings
        Of the whole text.
    root : str
        Lower-case name of the definition; none of those it reaches calls itself.
    """
    calls: dict[str, tuple[tuple[int, str], ...]] = {}
    order: dict[str, None] = {}
    stack = [root]
    while stack:
        name = stack[-1]
        if name not in calls:
            calls[name] = bindings.calls(name)
            stack += [callee for _, callee in calls[name] if callee not in calls]
        else:
            stack.pop()
            order[name] = None
    return Below(root, tuple(order), calls)
