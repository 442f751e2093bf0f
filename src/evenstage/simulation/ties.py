"""Nets beside a path that go together, as s and !s: each class of them is one free choice.

Where one gate with one input makes one of the other, or transmission gates take them for
complements.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from evenstage.simulation.logic import held_at

if TYPE_CHECKING:
    from collections.abc import Iterable, Mapping, Sequence

    from evenstage.simulation.groups import Groups


@dataclass(frozen=True)
class Ties:
    """Classes of nets that decide each other.

    Parameters
    ----------
    first : dict of int to int
        The net that each net follows, itself where it follows none.
    same : dict of int to bool
        Whether it is worth the same as that one.
    """

    first: dict[int, int]
    same: dict[int, bool]

    @property
    def free(self) -> list[int]:
        """The first net of each class, ascending."""
        return sorted(set(self.first.values()))

    def spread(self, levels: Mapping[int, bool]) -> dict[int, bool]:
        """Return what all nets of the classes are worth that some nets are of."""
        known = {
            self.first[net]: level == self.same[net]
            for net, level in levels.items()
            if net in self.first
        }
        return {
            net: known[first] == self.same[net]
            for net, first in self.first.items()
            if first in known
        }


def ties(groups: Groups, nets: Sequence[int]) -> Ties:
    """Return how some nets go together."""
    first, same = {net: net for net in nets}, dict.fromkeys(nets, True)
    for one, other, alike in _pairs(groups, nets):
        kept, moved = sorted((first[one], first[other]))
        if kept == moved:
            continue
        turned = (same[one] == same[other]) == alike
        for net in [net for net, head in first.items() if head == moved]:
            first[net], same[net] = kept, same[net] == turned
    return Ties(first, same)


def _pairs(groups: Groups, nets: Sequence[int]) -> Iterable[tuple[int, int, bool]]:
    """Yield two of the nets and whether they are worth the same."""
    among = set(nets)
    for net in nets:
        maker = int(groups.of_net[net])
        causes = groups.inputs(maker) if maker >= 0 and len(groups.devices(maker)) else []
        if len(causes) != 1 or causes[0] not in among or causes[0] == net:
            continue
        part = groups.part(maker)
        node = part.node(net)
        answers = [
            int(part.evaluate(held_at({causes[0]: level})).values[node, 0, 0])
            for level in (False, True)
        ]
        if sorted(answers) == [0, 1]:
            yield causes[0], net, answers == [0, 1]
    for one, other in groups.complements:
        if one in among and other in among:
            yield one, other, False
