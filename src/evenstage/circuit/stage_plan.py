"""How the arcs of a stage are summed up: indices, worked out once, whatever the widths are.

The resistance of a charge is a sum of resistances of steps; an own term is the sum over moving
nodes of a shared resistance times a capacitance. Resistances and capacitances of a stage stand in
one vector each, and the sums are lists of places in them.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import lru_cache
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from evenstage.circuit.arcs import NO_OWNER

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.circuit.stage_form import StageArc, StageForm
    from evenstage.netlist.devices import IntArray


class Resistor(NamedTuple):
    """One entry of the vector of resistances.

    ``switches`` conduct in parallel, one of ``series`` steps, for a rising or falling output; none:
    the outside drives the node ``source``. ``scales`` tells which part of it is meant; ``factor``
    is that of the arc.
    """

    switches: tuple[int, ...]
    series: int
    rising: bool
    scales: bool
    source: int = -1
    factor: float = 1.0


class Capacitor(NamedTuple):
    """One entry of the vector of capacitances: of one part's channels on a node.

    ``behind`` is the switch of the idle pull that ties the node to the output, -1 for none.
    """

    node: int
    part: int
    rising: bool
    scales: bool
    behind: int = -1


class Present(NamedTuple):
    """What there is at all: resistances and capacitances that do not scale, outside drivers."""

    fixed_resistance: bool
    fixed_capacitance: bool
    drive: bool


@dataclass(frozen=True)
class Sums:
    """Sums of products of entries: row, place in each vector; ordered by row.

    ``count`` is the number of rows of each arc; ``owner`` and ``other`` are parts, one per row.
    """

    count: IntArray
    owner: IntArray
    other: IntArray
    row: IntArray
    resistor: IntArray
    capacitor: IntArray


@dataclass(frozen=True)
class Plan:
    """The sums of one form.

    Parameters
    ----------
    resistors : tuple of Resistor
    capacitors : tuple of Capacitor
    charges : Sums
        ``other`` is the local net charged; no capacitors.
    own : Sums
        ``owner`` is that of the resistance, ``other`` that of the capacitance.
    whole : Sums
        For each row of ``own`` the whole resistance of its owner.
    """

    resistors: tuple[Resistor, ...]
    capacitors: tuple[Capacitor, ...]
    charges: Sums
    own: Sums
    whole: Sums


_PARTS_MOST = 64
"""Channels of more parts on one node count as pins on its net: as own terms of every arc that moves
it they would be as many as the square of the parts."""


@lru_cache(maxsize=1024)
def parts_at(form: StageForm) -> dict[int, tuple[int, ...]]:
    """Return for each node of a form the parts that have channels on it."""
    node_of_net = form.network.node_of_net
    found: dict[int, list[int]] = {}
    for part, columns in enumerate(form.columns):
        nets = {net for c in columns for net in (form.drawn[c].a, form.drawn[c].b)}
        for node in sorted({node_of_net[net] for net in nets if net >= 0}):
            found.setdefault(node, []).append(part)
    return {node: tuple(parts) for node, parts in found.items()}


def crowded(form: StageForm) -> tuple[int, ...]:
    """Return the nodes of a form that so many parts share that their channels count as pins."""
    return tuple(node for node, parts in parts_at(form).items() if len(parts) > _PARTS_MOST)


@lru_cache(maxsize=1024)
def plan(form: StageForm, present: Present) -> Plan:
    """Return the sums of a form's arcs."""
    return _Planner(form, present).plan()


@dataclass
class _Rows:
    """Rows and entries as they are found."""

    count: list[int] = field(default_factory=list)
    owner: list[int] = field(default_factory=list)
    other: list[int] = field(default_factory=list)
    row: list[int] = field(default_factory=list)
    resistor: list[int] = field(default_factory=list)
    capacitor: list[int] = field(default_factory=list)

    def add(self, owner: int, other: int, entries: Sequence[tuple[int, int]]) -> None:
        """Add one row."""
        self.row += [len(self.owner)] * len(entries)
        self.owner.append(owner)
        self.other.append(other)
        self.resistor += [resistor for resistor, _ in entries]
        self.capacitor += [capacitor for _, capacitor in entries]

    def sums(self) -> Sums:
        """Return the rows as arrays; ``count`` holds where each arc ends."""
        columns = (self.owner, self.other, self.row, self.resistor, self.capacitor)
        ends = np.array(self.count, np.int32)
        return Sums(
            np.diff(ends, prepend=0).astype(np.int32),
            *(np.array(column, np.int32) for column in columns),
        )


class _Planner:
    def __init__(self, form: StageForm, present: Present) -> None:
        self._form, self._present = form, present
        self._resistors: dict[Resistor, int] = {}
        self._capacitors: dict[Capacitor, int] = {}
        node_of_net = form.network.node_of_net
        self._nets_of_node: dict[int, list[int]] = {}
        for net, node in enumerate(node_of_net):
            self._nets_of_node.setdefault(node, []).append(net)
        shared = set(crowded(form))
        self._parts_at = {node: p for node, p in parts_at(form).items() if node not in shared}

    def plan(self) -> Plan:
        """Go through all arcs."""
        charges, own, whole = _Rows(), _Rows(), _Rows()
        for arc in self._form.arcs:
            for owner, places in self._owners(arc):
                self._charge(arc, owner, places, charges)
                self._own(arc, owner, places, (own, whole))
            charges.count.append(len(charges.owner))
            own.count.append(len(own.owner))
        return Plan(
            tuple(self._resistors),
            tuple(self._capacitors),
            charges.sums(),
            own.sums(),
            whole.sums(),
        )

    def _owners(self, arc: StageArc) -> list[tuple[int, list[tuple[int, int]]]]:
        """Return for each owner its resistors, each with its place from the supply."""
        found: dict[int, list[tuple[int, int]]] = {}
        for place, step in enumerate(reversed(arc.steps)):
            one = Resistor(
                step.switches, len(arc.steps), arc.rising, scales=True, factor=arc.factor
            )
            found.setdefault(step.part, []).append((self._resistor(one), place))
            if self._present.fixed_resistance:
                fixed = self._resistor(one._replace(scales=False))
                found.setdefault(NO_OWNER, []).append((fixed, place))
        if arc.source >= 0 and self._present.drive:
            outside = Resistor((), 1, rising=False, scales=False, source=arc.source)
            found.setdefault(NO_OWNER, []).append((self._resistor(outside), -1))
        return list(found.items())

    def _resistor(self, one: Resistor) -> int:
        return self._resistors.setdefault(one, len(self._resistors))

    def _charge(
        self, arc: StageArc, owner: int, places: list[tuple[int, int]], rows: _Rows
    ) -> None:
        for node, depth in arc.moved:
            shared = [(resistor, 0) for resistor, place in places if place < depth]
            if shared:
                for net in self._nets_of_node[node]:
                    rows.add(owner, net, shared)

    def _own(
        self,
        arc: StageArc,
        owner: int,
        places: list[tuple[int, int]],
        rows: tuple[_Rows, _Rows],
    ) -> None:
        found: dict[int, list[tuple[int, int]]] = {}
        behind = dict(arc.behind)
        for node, depth in arc.moved:
            shared = [resistor for resistor, place in places if place < depth]
            if shared:
                here = self._capacitors_at(node, behind.get(node, -1), rising=arc.rising)
                for other, capacitor in here:
                    found.setdefault(other, []).extend((one, capacitor) for one in shared)
        for other, entries in found.items():
            rows[0].add(owner, other, entries)
            rows[1].add(owner, other, [(resistor, 0) for resistor, _ in places])

    def _capacitors_at(self, node: int, behind: int, *, rising: bool) -> Iterator[tuple[int, int]]:
        """Yield owner and place of the capacitances on a node."""
        for part in self._parts_at.get(node, ()):
            one = Capacitor(node, part, rising, scales=True, behind=behind)
            yield part, self._capacitors.setdefault(one, len(self._capacitors))
            if self._present.fixed_capacitance:
                fixed = one._replace(scales=False)
                yield NO_OWNER, self._capacitors.setdefault(fixed, len(self._capacitors))
