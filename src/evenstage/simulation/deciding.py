"""Side inputs of a large group that let an edge through, searched instead of tried one and all.

A net is given a value only where it may still matter: where its transistor lies between the output
and a transistor that is off (Goel, "An implicit enumeration algorithm to generate tests for
combinational logic circuits", IEEE Transactions on Computers C-30(3), 1981, from memory). What is
not known may be anything, so whatever is found holds for all values of the nets left free.
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

#: So many partial settings are looked at.
_LOOKS_MOST: Final = 4000


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


@dataclass
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
    looks: int = 0

    def settings(self) -> Iterator[dict[int, bool]]:
        """Yield values of some of the free nets that let the edge through."""
        stack: list[dict[int, bool]] = [{}]
        while stack and self.looks < _LOOKS_MOST:
            self.looks += 1
            levels = stack.pop()
            found = self.part.evaluate({**self.known, **held_at(levels)}, strong=True)
            values = found.values
            if all(wish.met_by_charge(found)[0] for wish in self.wishes):
                yield levels
                continue
            if any(wish.lost(values) for wish in self.wishes):
                continue
            choice = self._choice(values)
            if choice is None:
                continue
            net, level = choice
            stack += [levels | self.ties.spread({net: other}) for other in (not level, level)]

    def _choice(self, values: Values) -> tuple[int, bool] | None:
        """Return the free net nearest to what is wished, and the value that closes its switch."""
        switches = self.part.switches
        at_gate = values[switches.gate]
        shut = (at_gate == np.where(switches.is_n, 0, 1)[:, None, None]).all(axis=(1, 2))
        waiting = deque(wish.node for wish in self.wishes)
        seen = set(waiting)
        while waiting:
            here = waiting.popleft()
            touching = (switches.drain == here) | (switches.source == here)
            for device in np.flatnonzero(touching & ~shut).tolist():
                net = int(self.part.net[switches.gate[device]])
                if net in self.ties.first and (at_gate[device, :, 0] == UNKNOWN).any():
                    return net, bool(switches.is_n[device])
                for end in (int(switches.drain[device]), int(switches.source[device])):
                    if end not in seen and switches.supply[end] == UNKNOWN:
                        seen.add(end)
                        waiting.append(end)
        return None
