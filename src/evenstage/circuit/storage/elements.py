"""The storage elements of a block: loops that hold, latches joined to flip-flops."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.storage.loops import DrawnLoops, Feedback
from evenstage.circuit.storage.reading import (
    C_ELEMENT,
    CELL,
    LATCH,
    SENSE_AMPLIFIER,
    SET_RESET,
    read_loop,
)

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.circuit.gate import GateForm
    from evenstage.circuit.groups import AlikeGroups
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.storage.phases import Phases
    from evenstage.netlist.devices import Devices, IntArray

DYNAMIC = "dynamic latch"
FLIP_FLOP = "flip-flop"
CLOCK_GATE = "clock gate"
TOO_LARGE = "loop too large to be read"

STORING = frozenset(
    {FLIP_FLOP, CLOCK_GATE, LATCH, DYNAMIC, SET_RESET, C_ELEMENT, CELL, SENSE_AMPLIFIER}
)
"""Kinds that end and start paths."""


@dataclass(frozen=True, slots=True)
class Loop:
    """One loop of nets.

    Parameters
    ----------
    nets : tuple of int
    clocks : tuple of (int, bool)
        Net, and the level that lets data in.
    data : tuple of int
        Nets that are stored.
    writes : tuple of (int, bool)
        Nets that set or reset, with the level that does.
    """

    nets: tuple[int, ...]
    clocks: tuple[tuple[int, bool], ...] = ()
    data: tuple[int, ...] = ()
    writes: tuple[tuple[int, bool], ...] = ()

    @property
    def captures(self) -> bool:
        """Whether data end here until a clock lets them out."""
        return bool(self.clocks and self.data)


@dataclass(frozen=True, slots=True)
class Element:
    """A storage element, or a loop that is none.

    Parameters
    ----------
    kind : str
    loops : tuple of Loop
        Of a flip-flop two, first that which its data enter.
    """

    kind: str
    loops: tuple[Loop, ...]

    @property
    def stores(self) -> bool:
        """Whether it holds a value."""
        return self.kind in STORING

    @property
    def clocks(self) -> tuple[tuple[int, bool], ...]:
        """Net, and the level that shows the data; of a flip-flop the level after its edge."""
        return self.loops[-1].clocks

    @property
    def data(self) -> tuple[int, ...]:
        """Nets that are stored."""
        return self.loops[0].data

    @property
    def writes(self) -> tuple[tuple[int, bool], ...]:
        """Nets that set or reset, with the level that does."""
        if len(self.loops) == 1:
            return self.loops[0].writes
        first, second = self.loops
        clock = second.clocks[0][0]
        others = tuple(one for one in first.clocks if one[0] != clock)
        return tuple(dict.fromkeys((*first.writes, *others, *second.writes)))


@dataclass(frozen=True)
class Storage:
    """The loops of a block.

    Parameters
    ----------
    elements : tuple of Element
        By their first nets.
    phases : Phases
        Which nets follow which through inverters.
    """

    elements: tuple[Element, ...]
    phases: Phases

    def loops(self) -> list[Loop]:
        """Return the loops that store."""
        return [loop for one in self.elements if one.stores for loop in one.loops]

    def loop_of_net(self) -> IntArray:
        """Return the number of the loop that each net is in, -1 for none, shape (nets,)."""
        found = np.full(len(self.phases.root), -1, np.int32)
        for number, loop in enumerate(self.loops()):
            found[list(loop.nets)] = number
        return found


def find_storage(
    devices: Devices,
    gates: Sequence[tuple[GateForm, AlikeGroups]],
    strange: Sequence[AlikeGroups],
) -> Storage:
    """Find the loops of a block and read them."""
    feedback = Feedback(devices, gates, strange)
    held = _held_by_keepers(gates, len(devices.net_names))
    found = [
        element
        for some in feedback.drawn(feedback.near_loops())
        for element in _elements(some)
        if not (len(element.loops[0].nets) == 1 and held[element.loops[0].nets[0]])
    ]
    ends = held.copy()
    for element in found:
        ends[list(element.loops[0].nets)] = True
    far = feedback.drawn(feedback.far_loops(ends))
    found += [element for some in far for element in _elements(some)]
    found.sort(key=lambda one: one.loops[0].nets[0])
    joined = _flip_flops(found, _second_of(found, feedback, _instances(devices, found)))
    elements = _clock_gates(joined, gates, feedback.phases.root)
    return Storage(elements, feedback.phases)


def _held_by_keepers(gates: Sequence[tuple[GateForm, AlikeGroups]], nets: int) -> BoolArray:
    """Tell which nets are outputs whose value a keeper holds, and which store nothing by it."""
    held = np.zeros(nets, bool)
    for form, some in gates:
        if form.weak and not form.floats:
            held[some.nets[:, form.output]] = True
    return held


def _elements(some: DrawnLoops) -> list[Element]:
    """Return the elements of loops drawn alike: they are read once."""
    reading = read_loop(some.members) if some.members is not None else None
    if reading is None:
        return [Element(TOO_LARGE, (Loop(tuple(nets)),)) for nets in some.nets.tolist()]
    return [
        Element(
            reading.kind,
            (
                Loop(
                    tuple(nets),
                    clocks=tuple((signals[number], level) for number, level in reading.clocks),
                    data=tuple(signals[number] for number in reading.data),
                    writes=tuple((signals[number], level) for number, level in reading.writes),
                ),
            ),
        )
        for nets, signals in zip(some.nets.tolist(), some.signals.tolist(), strict=True)
    ]


def _instances(devices: Devices, found: Sequence[Element]) -> list[int]:
    """Return the instance of the first transistor on the first net of each element."""
    at_net = first_device(devices)
    first = [one.loops[0].nets[0] for one in found]
    instances: list[int] = devices.instance[at_net[first]].tolist()
    return instances


def first_device(devices: Devices) -> IntArray:
    """Return the first transistor with a channel end on each net; 0 for none, shape (nets,)."""
    found = np.full(len(devices.net_names), len(devices), np.int64)
    every = np.arange(len(devices))
    for ends in (devices.drain, devices.source):
        np.minimum.at(found, ends, every)
    result: IntArray = np.where(found < len(devices), found, 0).astype(np.int32)
    return result


def _flip_flops(found: Sequence[Element], second_of: Mapping[int, int]) -> tuple[Element, ...]:
    """Join two latches to a flip-flop where one stores the other while its clock holds that."""
    firsts = set(second_of.values())
    result = [
        replace(one, kind=FLIP_FLOP, loops=(*found[second_of[index]].loops, *one.loops))
        if index in second_of
        else one
        for index, one in enumerate(found)
        if index not in firsts
    ]
    return tuple(sorted(result, key=lambda one: min(min(loop.nets) for loop in one.loops)))


def _second_of(
    found: Sequence[Element], feedback: Feedback, places: Sequence[int]
) -> dict[int, int]:
    """Return for each latch that shows what another stored that other one.

    In a chain of latches of both phases every second one does. Those that a transmission gate
    joins belong together, then those of one instance; else a chain is paired from its beginning.
    """
    first_of = {
        net: at for at, one in enumerate(found) if one.kind == LATCH for net in one.loops[0].nets
    }
    feeding: dict[int, list[int]] = {}
    for index, one in enumerate(found):
        if one.kind == LATCH and len(one.clocks) == 1:
            clock, level = one.clocks[0]
            others = {first_of[net] for net in one.data if net in first_of} - {index}
            fits = [other for other in sorted(others) if (clock, not level) in found[other].clocks]
            if fits:
                feeding[index] = fits
    depth = _depths(feeding)
    pairs = [(index, other) for index, others in feeding.items() for other in others]
    groups = {
        index: {feedback.group_of(net) for net in found[index].loops[0].nets}
        for index in {index for pair in pairs for index in pair}
    }
    pairs.sort(
        key=lambda pair: (
            groups[pair[0]].isdisjoint(groups[pair[1]]),
            places[pair[0]] != places[pair[1]],
            depth[pair[0]],
            pair,
        )
    )
    joined: dict[int, int] = {}
    firsts: set[int] = set()
    for index, other in pairs:
        if joined.keys().isdisjoint((index, other)) and firsts.isdisjoint((index, other)):
            joined[index] = other
            firsts.add(other)
    return joined


def _depths(feeding: Mapping[int, Sequence[int]]) -> dict[int, int]:
    """Return how far down its chain each latch stands; on a ring of latches 0."""
    followers: dict[int, list[int]] = {}
    for index, others in feeding.items():
        for other in others:
            followers.setdefault(other, []).append(index)
    depth = dict.fromkeys(feeding, 0)
    waiting = [(one, 0) for one in followers if one not in feeding]
    while waiting:
        one, at = waiting.pop()
        for follower in followers.get(one, ()):
            if depth[follower] == 0:
                depth[follower] = at + 1
                waiting.append((follower, at + 1))
    return depth


def _clock_gates(
    found: Sequence[Element], gates: Sequence[tuple[GateForm, AlikeGroups]], root: IntArray
) -> tuple[Element, ...]:
    """Name the latches whose value and clock meet in one gate."""
    latches = {
        one.loops[0].nets[0]: one.clocks[0][0] for one in found if one.kind == LATCH and one.clocks
    }
    wanted = np.array(sorted(latches.items()), np.int64).reshape(-1, 2)
    looped = np.zeros(len(root), bool)
    looped[[net for one in found for loop in one.loops for net in loop.nets]] = True
    met = set()
    for form, some in gates:
        if len(form.network.inputs) < 2 or not len(wanted):
            continue
        roots = root[some.nets[:, list(form.network.inputs)]]
        for column in range(roots.shape[1]):
            place = np.searchsorted(wanted[:, 0], roots[:, column]).clip(max=len(wanted) - 1)
            is_latch = wanted[place, 0] == roots[:, column]
            with_clock = (roots == wanted[place, 1][:, None]).any(axis=1)
            outside = ~looped[some.nets[:, form.output]]
            met.update(roots[is_latch & with_clock & outside, column].tolist())
    return tuple(
        replace(one, kind=CLOCK_GATE) if one.kind == LATCH and one.loops[0].nets[0] in met else one
        for one in found
    )
