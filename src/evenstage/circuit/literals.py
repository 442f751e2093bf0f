"""Inputs that are equal or complements of each other, and products of their literals."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterable

Condition = tuple[int, bool]
"""Representative of an input and the value it has."""
Cube = frozenset[Condition]
"""Conditions that hold together."""


class Literals:
    """Classes of inputs with one representative each; grows by `tie`.

    Parameters
    ----------
    ties : iterable of (int, int, bool)
        Two inputs, and whether they are equal rather than complements.
    """

    def __init__(self, ties: Iterable[tuple[int, int, bool]] = ()) -> None:
        self._parent: dict[int, Condition] = {}
        for a, b, same in ties:
            self.tie(a, b, same=same)

    def condition(self, net: int, *, value: bool) -> Condition:
        """Return a condition in terms of the representative."""
        while net in self._parent:
            net, same = self._parent[net]
            value = value == same
        return net, value

    def tie(self, a: int, b: int, *, same: bool) -> None:
        """Make two inputs equal or complements; what contradicts earlier ties changes nothing."""
        root_a, straight_a = self.condition(a, value=True)
        root_b, straight_b = self.condition(b, value=True)
        if root_a != root_b:
            high, low = max(root_a, root_b), min(root_a, root_b)
            self._parent[high] = (low, (straight_a == straight_b) == same)

    def are_tied(self, a: int, b: int) -> bool:
        """Tell whether two inputs are equal or complements."""
        return self.condition(a, value=True)[0] == self.condition(b, value=True)[0]


def consistent(cube: Cube, other: Iterable[Condition]) -> Cube | None:
    """Return the product of two cubes, or None where it is empty."""
    found = dict(cube)
    for net, value in other:
        if found.setdefault(net, value) != value:
            return None
    return frozenset(found.items())
