"""Side inputs of a large group that let an edge through, searched instead of tried one and all.

First the switches between the output and the nearest one that moves are closed; then others that
may still lead to the output are opened, nearest first; where that fails, choices are taken back
(Goel, "An implicit enumeration algorithm to generate tests for combinational logic circuits", IEEE
Transactions on Computers C-30(3), 1981, from memory). What is not known may be anything, so
whatever is found holds for all values of the nets left free.
"""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.logic.settle import KEPT
from evenstage.logic.switches import UNKNOWN
from evenstage.simulation.logic import held_at

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping, Sequence

    from evenstage.circuit.network import BoolArray
    from evenstage.logic.evaluate import Evaluation
    from evenstage.logic.switches import Values
    from evenstage.simulation.logic import Part
    from evenstage.simulation.ties import Ties

#: So many partial settings are looked at for the first that serves, and for others after it.
_LOOKS_MOST: Final = 2000
_LOOKS_MORE: Final = 32

#: Of the ways from the output to something that moves so many are tried to be closed first.
_ROUTES_MOST: Final = 2


@dataclass(frozen=True)
class Wish:
    """What a node has to do, before and after the edge."""

    node: int
    before: bool
    after: bool

    def met(self, values: Values) -> BoolArray:
        """Tell under which vectors it does, shape (vectors,); of values (nodes, 2, vectors)."""
        old, new = values[self.node]
        result: BoolArray = (old == self.before) & (new == self.after)
        return result

    def met_by_charge(self, found: Evaluation) -> BoolArray:
        """Tell under which vectors it does, whatever it is worth before if nothing drives it."""
        old, new = found.values[self.node]
        loose = (old == UNKNOWN) & (found.strength[self.node, 0] == KEPT)
        result: BoolArray = loose & (new == self.after)
        return result | self.met(found.values)

    def lost(self, values: Values) -> bool:
        """Tell whether it does something else under the first vector."""
        old, new = values[self.node, :, 0].tolist()
        return bool(old == (not self.before) or new == (not self.after))


@dataclass(frozen=True)
class Search:
    """A search in one group.

    Parameters
    ----------
    part : Part
    wishes : sequence of Wish
    known : mapping of int to Values
        What is given, by net.
    ties : Ties
        Of the nets that are free.
    """

    part: Part
    wishes: Sequence[Wish]
    known: Mapping[int, Values]
    ties: Ties

    def settings(self) -> Iterator[dict[int, bool]]:
        """Yield values of some of the free nets that let the edge through."""
        wanted, left = self._wanted(), _LOOKS_MOST
        stack: list[dict[int, bool]] = [{}]
        while stack and left:
            left -= 1
            levels = stack.pop()
            found = self.part.evaluate({**self.known, **held_at(levels)}, strong=True)
            values = found.values
            if all(wish.met_by_charge(found)[0] for wish in self.wishes):
                yield levels
                left = min(left, _LOOKS_MORE)
                continue
            if any(wish.lost(values) for wish in self.wishes):
                continue
            ahead = [(net, level) for net, level in wanted.items() if net not in levels]
            choice = ahead[0] if ahead else self._next(values)
            if choice is None:
                continue
            net, level = choice
            stack += [levels | self.ties.spread({net: other}) for other in (not level, level)]

    def _wanted(self) -> dict[int, bool]:
        """Return values that close the switches from the output to one that moves, and beyond."""
        switches = self.part.switches
        values = self.part.evaluate(self.known).values[:, :, 0]
        moves = values[:, 0] != values[:, 1]
        output = self.wishes[-1].node
        way = self._ways(output, values)
        entry = [(len(route), node, route) for node, route in way.items() if moves[node]]
        for device in np.flatnonzero(moves[switches.gate]).tolist():
            ends = int(switches.drain[device]), int(switches.source[device])
            for near, far in (ends, ends[::-1]):
                if near in way and device not in way[near]:
                    rails = [
                        route
                        for node, route in self._ways(far, values, way[near]).items()
                        if switches.supply[node] != UNKNOWN
                    ]
                    beyond = min(rails, key=len, default=())
                    entry.append((len(way[near]), device, (*way[near], *beyond)))
        found: dict[int, bool] = {}
        for _, _, route in sorted(entry)[:_ROUTES_MOST]:
            for device in route:
                net = int(self.part.net[switches.gate[device]])
                if net in self.ties.first and net not in found:
                    found |= self.ties.spread({net: bool(switches.is_n[device])}) | found
        return found

    def _ways(
        self, start: int, values: Values, without: Sequence[int] = ()
    ) -> dict[int, tuple[int, ...]]:
        """Return the devices on a shortest way to each node that may be joined to one."""
        switches = self.part.switches
        shut = (values[switches.gate] == np.where(switches.is_n, 0, 1)[:, None]).all(axis=1)
        shut[list(without)] = True
        found: dict[int, tuple[int, ...]] = {start: ()}
        waiting = deque([start])
        while waiting:
            here = waiting.popleft()
            if switches.supply[here] != UNKNOWN:
                continue
            touching = ((switches.drain == here) | (switches.source == here)) & ~shut
            for device in np.flatnonzero(touching).tolist():
                for end in (int(switches.drain[device]), int(switches.source[device])):
                    if end not in found:
                        found[end] = (*found[here], device)
                        waiting.append(end)
        return found

    def _next(self, values: Values) -> tuple[int, bool] | None:
        """Return the free net nearest to the output that may matter, and what opens its switch."""
        switches, flat = self.part.switches, values[:, :, 0]
        way = self._ways(self.wishes[-1].node, flat)
        for node in way:
            touching = (switches.drain == node) | (switches.source == node)
            for device in np.flatnonzero(touching).tolist():
                net = int(self.part.net[switches.gate[device]])
                if net in self.ties.first and (flat[switches.gate[device]] == UNKNOWN).any():
                    return net, not switches.is_n[device]
        return None
