"""Values of a gate's side inputs under which it passes an edge on, slowest first.

Which are slowest is judged as the estimate does: by the Elmore delay of all nodes that have to move
through the devices that conduct after the edge. Of equally slow ones, the first is that in which
most nodes stand where the output comes from.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import islice
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.simulation.deciding import Search, Wish
from evenstage.simulation.logic import held_at, moving
from evenstage.simulation.ties import ties

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.logic.switches import Values
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.groups import Groups
    from evenstage.simulation.logic import Part

Levels = dict[int, bool]
"""Values by net."""

Edge = tuple[bool, bool]
"""What a net is worth before and after."""

#: Of more free choices only so many are varied, the others low, once a search has found what must
#: be.
_VARIED_MOST: Final = 12

#: So many findings of that search are looked at.
_FOUND_MOST: Final = 8

#: A conductance that keeps nodes without any apart from the others, S.
_LEAK: Final = 1e-12


@dataclass(frozen=True)
class Choice:
    """Side inputs of one gate under which it passes the edge, and how slowly it does, s."""

    levels: Levels
    slowness: float


def choices(
    groups: Groups,
    group: int,
    edges: Mapping[int, Edge],
    held: Mapping[int, bool] | None = None,
    *,
    start: int | None = None,
) -> list[Choice]:
    """Return the values of a group's side inputs under which it passes the edge on, slowest first.

    Parameters
    ----------
    groups : Groups
    group : int
    edges : mapping
        Of nets that switch. Those of the group must do as they say; where it has none, any of its
        nets has to switch.
    held : mapping, optional
        Values of nets that are decided already.
    start : int, optional
        A net that is driven from outside, whatever else drives it.
    """
    part = groups.part(group)
    # What the path drives in the group is no input of it, whatever else it may be.
    driven = {net for net in edges if groups.of_net[net] == group} - {start}
    inputs = [net for net in groups.inputs(group, start) if net not in driven]
    still = [net for net in inputs if net not in edges]
    told = {net: level for net, level in (held or {}).items() if net in still}
    decided = ties(groups, still).spread(told) | told
    rows = {net: part.node(net) for net in edges if net in driven}
    gate = _Gate(
        groups,
        group,
        part,
        edges={net: edges[net] for net in inputs if net in edges},
        decided=decided,
        implied={net: level for net, level in decided.items() if net not in told},
        side=[net for net in still if net not in decided],
        wishes=[Wish(row, *edges[net]) for net, row in rows.items() if row is not None],
    )
    return gate.choices()


@dataclass(frozen=True)
class _Gate:
    """One group under examination: its inputs that switch, that are decided, and that are free.

    What is ``implied`` follows from what was decided elsewhere, and belongs to every choice.
    """

    groups: Groups
    group: int
    part: Part
    edges: dict[int, Edge]
    decided: Levels
    implied: Levels
    side: Sequence[int]
    wishes: Sequence[Wish]

    def choices(self) -> list[Choice]:
        """Return all choices of the free nets, slowest first."""
        tied = ties(self.groups, self.side)
        if len(tied.free) <= _VARIED_MOST or not self.wishes:
            return self._varied({})
        known = {**moving(self.edges), **held_at(self.decided)}
        search = Search(self.part, self.wishes, known, tied)
        found = [
            choice
            for levels in islice(search.settings(), _FOUND_MOST)
            for choice in self._varied(levels)
        ]
        return sorted(found, key=lambda choice: -choice.slowness)

    def _varied(self, levels: Levels) -> list[Choice]:
        """Return the choices that hold some of the nets, the others varied as far as they may."""
        tied = ties(self.groups, [net for net in self.side if net not in levels])
        vectors = _vectors(len(tied.free))
        row = {net: place for place, net in enumerate(tied.free)}
        worth = {net: vectors[row[first]] == tied.same[net] for net, first in tied.first.items()}
        count = vectors.shape[1]
        known = moving(self.edges, count) | held_at(self.decided | levels, count)
        known |= {net: np.stack([level, level]).astype(np.int8) for net, level in worth.items()}
        values, passes = self._passing(known)
        found = np.flatnonzero(passes)
        if not len(found):
            return []
        slowness = self._slowness(values[:, :, found])
        return [
            Choice(
                self.implied
                | levels
                | {net: bool(level[found[i]]) for net, level in sorted(worth.items())},
                float(slowness[i]),
            )
            for i in np.lexsort((found, -self._against(values[:, 0, found]), -slowness)).tolist()
        ]

    def _passing(self, known: Mapping[int, Values]) -> tuple[Values, BoolArray]:
        """Return what all nodes are worth, and under which vectors the edge passes."""
        values = self.part.evaluate(known).values
        if not self.wishes:
            own = self._own
            old, new = values[own, 0], values[own, 1]
            return values, ((old >= 0) & (new >= 0) & (old != new)).any(axis=0)
        passes = np.logical_and.reduce([wish.met(values) for wish in self.wishes])
        if not passes.any():
            found = self.part.evaluate(known, strong=True)
            passes = np.logical_and.reduce([wish.met_by_charge(found) for wish in self.wishes])
        return values, passes

    def _against(self, before: Values) -> IntArray:
        """Return how many nodes stand where the output comes from, shape (vectors,).

        While the controls of passes cross, drivers that agree pull at what they share.
        """
        result: IntArray = (before[self._own] == before[self._output]).sum(axis=0)
        return result

    @property
    def _output(self) -> int:
        return self.wishes[-1].node if self.wishes else int(np.flatnonzero(self._own)[0])

    @property
    def _own(self) -> BoolArray:
        result: BoolArray = self.groups.of_net[self.part.net] == self.group
        return result

    def _slowness(self, values: Values) -> FloatArray:
        circuit, part = self.groups.circuit, self.part
        given = ~self._own | np.isin(part.net, [*self.edges, *self.decided, *self.side])
        return _slowness(
            circuit, self.groups.devices(self.group), part, values, self._output, given
        )


def _vectors(count: int) -> BoolArray:
    """Return vectors of some choices, shape (choices, vectors); rows beyond the limit are low."""
    varied = min(count, _VARIED_MOST)
    table = (np.arange(1 << varied) >> np.arange(varied)[:, None] & 1).astype(bool)
    rest = np.zeros((count - varied, table.shape[1]), bool)
    return np.concatenate([table, rest])


def _slowness(
    circuit: Circuit, devices: IntArray, part: Part, worth: Values, output: int, given: BoolArray
) -> FloatArray:
    """Return the Elmore delay to the output after the edge, s, shape (vectors,)."""
    before, after = worth[:, 0], worth[:, 1]
    nodes, vectors = after.shape
    values, switches = circuit.electrical, part.switches
    closed = after[switches.gate] == switches.is_n[:, None]
    conductance = closed / values.resistance.today[devices][:, None]
    # The part of each device in the matrix, as one long row, so that a product adds them up.
    element = np.zeros((len(devices), nodes, nodes))
    device = np.arange(len(devices))
    for a, b in ((switches.drain, switches.source), (switches.source, switches.drain)):
        element[device, a, a] += 1.0
        element[device, a, b] -= 1.0
    free = np.flatnonzero(~given)
    inner = np.tensordot(conductance.T, element[:, free[:, None], free], axes=1)
    inner[:, np.arange(len(free)), np.arange(len(free))] += _LEAK
    right = np.broadcast_to((free == output).astype(float)[:, None], (vectors, len(free), 1))
    shared = np.linalg.solve(inner, right)[:, :, 0]
    moved = (before != after)[free]
    result: FloatArray = (shared * switches.cap[free] * moved.T).sum(axis=1)
    return result
