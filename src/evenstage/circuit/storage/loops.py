"""Loops of nets in a block: which nets feed back on themselves through any group of transistors."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array, csr_array
from scipy.sparse.csgraph import connected_components

from evenstage.circuit.function import Literal
from evenstage.circuit.rows import distinct_rows
from evenstage.circuit.storage.phases import Phases, phases
from evenstage.circuit.storage.reading import BITS_MAX, Member
from evenstage.circuit.storage.switching import Wiring, influence

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.circuit.gate import GateForm
    from evenstage.circuit.groups import AlikeGroups
    from evenstage.circuit.network import BoolArray, Switch
    from evenstage.netlist.devices import Devices, IntArray

_NETS_MAX = 64
"""A group with more nets is a bit line or an array, and is not looked into."""


@dataclass(frozen=True)
class _Drawing:
    """Groups drawn alike, and how their nets are used in all of them."""

    network: tuple[Switch, ...]
    nets: IntArray
    gates: tuple[int, ...]
    ends: tuple[int, ...]


@dataclass(frozen=True)
class DrawnLoops:
    """Loops drawn alike, with the same signals tied together.

    Parameters
    ----------
    members : tuple of Member, optional
        The loop as it is read; None for one that is too large.
    nets : IntArray, shape (loops, nets of a loop)
    signals : IntArray, shape (loops, signals)
        Net of each signal.
    """

    members: tuple[Member, ...] | None
    nets: IntArray
    signals: IntArray


class Feedback:
    """The groups of a block as signals see them.

    Parameters
    ----------
    devices : Devices
    gates : sequence of (GateForm, AlikeGroups)
        Recognised groups.
    strange : sequence of AlikeGroups
        The others.
    """

    def __init__(
        self,
        devices: Devices,
        gates: Sequence[tuple[GateForm, AlikeGroups]],
        strange: Sequence[AlikeGroups],
    ) -> None:
        nets = len(devices.net_names)
        self._devices = devices
        self.phases = _phases(gates, nets)
        self._drawings = [
            _drawing(some)
            for some in (*(some for _, some in gates), *strange)
            if some.nets.shape[1] <= _NETS_MAX
        ]
        self._drawing_of = np.full(nets, -1, np.int32)
        self._row_of = np.zeros(nets, np.int32)
        self._local_of = np.zeros(nets, np.int32)
        for number, some in enumerate(self._drawings):
            for local in some.ends:
                own = some.nets[:, local]
                self._drawing_of[own] = number
                self._row_of[own] = np.arange(len(own))
                self._local_of[own] = local
        self._free = self._free_ends(nets)
        self._plain = {
            id(some.nets): form.output for form, some in gates if form.kind == "static gate"
        }

    def group_of(self, net: int) -> tuple[int, int]:
        """Return what is equal for channel ends of one group of transistors."""
        return int(self._drawing_of[net]), int(self._row_of[net])

    def _free_ends(self, nets: int) -> BoolArray:
        """Tell which channel ends the outside drives.

        They are ports that close no switch and that no supply reaches but through nets that do.
        """
        devices = self._devices
        is_port, closes = np.zeros(nets, bool), np.zeros(nets, bool)
        is_port[list(devices.ports)] = True
        closes[devices.gate] = True
        pulled = np.zeros(nets, bool)
        seen = closes | is_port
        for some in self._drawings:
            stops = {end for end in some.ends if seen[some.nets[:, end]].any()}
            for end in _reached(some.network, stops):
                pulled[some.nets[:, end]] = True
        return is_port & ~pulled & ~closes

    @cached_property
    def _influences(self) -> tuple[IntArray, IntArray]:
        """Nets that signals come from and the nets they move, each pair once."""
        nets = len(self._devices.net_names)
        none = np.zeros(0, np.int32)
        pairs = [pair for some in self._drawings for pair in self._edges(some)]
        source = np.concatenate([none, *(pair[0] for pair in pairs)])
        target = np.concatenate([none, *(pair[1] for pair in pairs)])
        links = coo_array(
            (np.ones(len(source), np.int8), (source, target)), shape=(nets, nets)
        ).tocsr()
        links.sum_duplicates()
        rows = np.repeat(np.arange(nets, dtype=np.int32), np.diff(links.indptr))
        return rows, links.indices.astype(np.int32)

    def near_loops(self) -> list[IntArray]:
        """Return the loops of nets that move themselves, and of nets that move each other.

        A latch is one of them, whatever logic leads from its output back to its data.
        """
        nets = len(self._devices.net_names)
        source, target = self._influences
        alone = np.zeros(nets, bool)
        alone[source[source == target]] = True
        both = ~alone[source] & ~alone[target]
        links = csr_array((both[both].view(np.int8), (source[both], target[both])), (nets, nets))
        source, target = links.multiply(links.T).nonzero()
        pairs = _parts(source, target, nets)
        return [*(np.array([net], np.int32) for net in np.flatnonzero(alone)), *pairs]

    def far_loops(self, without: BoolArray) -> list[IntArray]:
        """Return the loops that lead through none of some nets, shape (nets,)."""
        source, target = self._influences
        kept = ~without[source] & ~without[target] & (source != target)
        return _parts(source[kept], target[kept], len(without))

    def _edges(self, some: _Drawing) -> Iterator[tuple[IntArray, IntArray]]:
        """Yield the nets that signals come from and the channel ends they move."""
        output = self._plain.get(id(some.nets))
        if output is not None:
            for gate in some.gates:
                yield self.phases.root[some.nets[:, gate]], some.nets[:, output]
            return
        for rows, wiring, signals in self._wirings(some):
            outside = {end for end, _ in wiring.free}
            for end, numbers in influence(wiring).items():
                for number in numbers if end not in outside else ():
                    yield signals[:, number], some.nets[rows, end]

    def _wirings(self, some: _Drawing) -> Iterator[tuple[IntArray, Wiring, IntArray]]:
        """Yield rows of a drawing whose signals are tied alike; the net of each signal."""
        if not some.gates:
            return
        roots = self.phases.root[some.nets[:, some.gates]]
        inverted = self.phases.inverted[some.nets[:, some.gates]]
        free = self._free[some.nets[:, some.ends]]
        # The number of each input's signal: the first input with the same root.
        first = (roots[:, :, None] == roots[:, None, :]).argmax(axis=2)
        table = np.concatenate([first, inverted, free], axis=1)
        kinds, inverse = distinct_rows(table)
        inputs = len(some.gates)
        for index, kind in enumerate(kinds.tolist()):
            rows = np.flatnonzero(inverse == index)
            ranks = {place: rank for rank, place in enumerate(sorted(set(kind[:inputs])))}
            signal = [(-1, False)] * some.nets.shape[1]
            for gate, place, phase in zip(some.gates, kind, kind[inputs:], strict=False):
                signal[gate] = (ranks[place], bool(phase))
            ends = [
                end for end, is_free in zip(some.ends, kind[2 * inputs :], strict=True) if is_free
            ]
            wiring = Wiring(
                some.network,
                tuple(signal),
                tuple((end, len(ranks) + rank) for rank, end in enumerate(ends)),
            )
            nets = [roots[rows][:, sorted(set(kind[:inputs]))], some.nets[rows][:, ends]]
            yield rows, wiring, np.concatenate(nets, axis=1)

    def drawn(self, found: Sequence[IntArray]) -> Iterator[DrawnLoops]:
        """Yield loops of a block, those drawn alike together."""
        by_size: dict[int, list[IntArray]] = {}
        for loop in found:
            by_size.setdefault(len(loop), []).append(loop)
        for loops in by_size.values():
            nets = np.stack(loops)
            if nets.shape[1] > BITS_MAX:
                yield from (DrawnLoops(None, loop[None, :], loop[None, :]) for loop in nets)
                continue
            place = np.concatenate([self._drawing_of[nets], self._local_of[nets]], axis=1)
            kinds, inverse = distinct_rows(place)
            for index, kind in enumerate(kinds.tolist()):
                yield from self._alike(nets[inverse == index], kind[: nets.shape[1]])

    def _alike(self, loops: IntArray, drawings: list[int]) -> Iterator[DrawnLoops]:
        """Yield loops through the same drawings, those with signals tied alike together."""
        columns, inverted, free, count = [loops], [], [], loops.shape[1]
        parts = [self._drawings[number] for number in drawings]
        for member, some in enumerate(parts):
            here = some.nets[self._row_of[loops[:, member]]]
            columns += [self.phases.root[here[:, some.gates]], here[:, some.ends]]
            inverted.append(self.phases.inverted[here[:, some.gates]])
            free.append(self._free[here[:, some.ends]])
        table = np.concatenate(columns, axis=1)
        # The first column with the same net, for every column.
        first = np.stack(
            [(table == table[:, [c]]).argmax(axis=1) for c in range(table.shape[1])], axis=1
        )
        facts = np.concatenate([first, *inverted, *free], axis=1)
        kinds, inverse = distinct_rows(facts)
        for index, kind in enumerate(kinds.tolist()):
            rows = np.flatnonzero(inverse == index)
            members, used = _members(kind, parts, table.shape[1], count)
            yield DrawnLoops(
                tuple(
                    Member(wiring, int(self._local_of[net]))
                    for wiring, net in zip(members, loops[rows[0]].tolist(), strict=True)
                ),
                loops[rows],
                table[rows][:, used],
            )


def _parts(source: IntArray, target: IntArray, nets: int) -> list[IntArray]:
    """Return the nets that reach each other, ascending, where they are several."""
    links = coo_array((np.ones(len(source), np.int8), (source, target)), shape=(nets, nets))
    _, part = connected_components(links, directed=True, connection="strong")
    members = np.flatnonzero((np.bincount(part, minlength=nets) > 1)[part])
    order = members[np.argsort(part[members], kind="stable")].astype(np.int32)
    cuts = np.flatnonzero(np.diff(part[order])) + 1
    return np.split(order, cuts) if len(order) else []


def _members(
    kind: list[int], parts: list[_Drawing], width: int, count: int
) -> tuple[list[Wiring], list[int]]:
    """Return the wiring of each net of a loop, and the table columns that hold its signals."""
    first, rest = kind[:width], iter(kind[width:])
    inverted = [[bool(next(rest)) for _ in some.gates] for some in parts]
    free = [[bool(next(rest)) for _ in some.ends] for some in parts]
    number = {column: column for column in range(count)}
    wirings, at = [], count
    for some, phases_, is_free in zip(parts, inverted, free, strict=True):
        nets = 1 + max((*some.gates, *some.ends))
        signal = [(-1, False)] * nets
        for gate, phase in zip(some.gates, phases_, strict=True):
            signal[gate] = (number.setdefault(first[at], len(number)), phase)
            at += 1
        ends = []
        for end, outside in zip(some.ends, is_free, strict=True):
            if outside:
                ends.append((end, number.setdefault(first[at], len(number))))
            at += 1
        wirings.append(Wiring(some.network, tuple(signal), tuple(ends)))
    return wirings, list(number)


def _phases(gates: Sequence[tuple[GateForm, AlikeGroups]], nets: int) -> Phases:
    pairs = [
        (some.nets[:, form.output], some.nets[:, form.pull_down.net])
        for form, some in gates
        if isinstance(form.pull_down, Literal) and form.kind == "static gate"
    ]
    none = np.zeros(0, np.int32)
    return phases(
        np.concatenate([none, *(output for output, _ in pairs)]),
        np.concatenate([none, *(source for _, source in pairs)]),
        nets,
    )


def _reached(network: tuple[Switch, ...], stops: set[int]) -> set[int]:
    """Return the nets that supplies reach without passing through some of them."""
    reached: set[int] = set()
    growing = True
    while growing:
        growing = False
        for switch in network:
            for here, there in ((switch.a, switch.b), (switch.b, switch.a)):
                opens = here < 0 or (here in reached and here not in stops)
                if opens and there >= 0 and there not in reached:
                    reached.add(there)
                    growing = True
    return reached


def _drawing(some: AlikeGroups) -> _Drawing:
    gates = dict.fromkeys(s.gate for s in some.network if s.gate >= 0)
    ends = dict.fromkeys(net for s in some.network for net in (s.a, s.b) if net >= 0)
    return _Drawing(some.network, some.nets, tuple(gates), tuple(ends))
