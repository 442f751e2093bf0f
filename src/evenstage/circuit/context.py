"""What a group of transistors is told of the gates around it.

Whether a network is, say, a latch or only a strange pile of switches shows in what drives its
inputs: the complement of another input, or a gate that itself listens to the network. Written as
pairs of local nets, equal surroundings of equal networks are found once.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.function import Literal
from evenstage.circuit.rows import distinct_rows
from evenstage.pattern import select

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.gate import GateForm, Relation
    from evenstage.circuit.groups import AlikeGroups
    from evenstage.circuit.network import BoolArray, Switch
    from evenstage.netlist.devices import Devices, IntArray

NETS_MAX = 256
"""A group with more nets is a bit line or an array; nothing is asked about its surroundings."""

_MUTUAL_MAX = 24
"""Larger groups that nobody has recognised are not sides of a cross-coupled pair."""


@dataclass(frozen=True, slots=True)
class Context:
    """What is known around one network; all nets are local.

    Parameters
    ----------
    complements : tuple of (int, int)
        An input, and the net that it is the complement of (another input, or a channel end).
    feedback : tuple of (int, int)
        An input, and a channel end that the gate driving this input listens to.
    mutual : tuple of (int, int)
        Likewise, where what drives the input is not recognised yet.
    seen : tuple of int
        Channel ends that are ports or close switches of other groups.
    ports : tuple of int
        Channel ends that are ports.
    clocks : tuple of int
        Inputs that are clocks: the brief says so, or a dynamic gate is precharged by them.
    """

    complements: tuple[Relation, ...] = ()
    feedback: tuple[Relation, ...] = ()
    mutual: tuple[Relation, ...] = ()
    seen: tuple[int, ...] = ()
    ports: tuple[int, ...] = ()
    clocks: tuple[int, ...] = ()


class Surroundings:
    """The recognised gates of a block, as its other groups see them.

    Parameters
    ----------
    devices : Devices
    gates : sequence of (GateForm, AlikeGroups)
        Recognised so far.
    others : sequence of AlikeGroups
        Those that will be asked about.
    clocks : IntArray
        Nets that the brief says are clocks.
    """

    def __init__(
        self,
        devices: Devices,
        gates: Sequence[tuple[GateForm, AlikeGroups]],
        others: Sequence[AlikeGroups],
        clocks: IntArray,
    ) -> None:
        nets = len(devices.net_names)
        self._nets = nets
        self._complement = np.full(nets, -1, np.int32)
        asked = np.zeros(nets, bool)
        for some in others:
            for local in {s.gate for s in some.network if s.gate >= 0}:
                asked[some.nets[:, local]] = True
        heard, unsure = [], []
        for form, some in gates:
            driven = some.nets[:, form.output]
            if isinstance(form.pull_down, Literal):
                self._complement[driven] = some.nets[:, form.pull_down.net]
            heard += self._pairs(asked, some, form.network.inputs, form.output)
        for some in others:
            if len(some.network) <= _MUTUAL_MAX:
                inputs, ends = _inputs(some), _ends(some)
                unsure += [p for end in ends for p in self._pairs(asked, some, inputs, end)]
        self._heard, self._unsure = _sorted(heard), _sorted(unsure)
        self._gates_on = np.bincount(devices.gate, minlength=nets)
        self._is_port = np.zeros(nets, bool)
        self._is_port[list(devices.ports)] = True
        self._is_clock = np.zeros(nets, bool)
        self._is_clock[clocks] = True
        for form, some in gates:
            for local in form.precharging_clocks:
                self._is_clock[some.nets[:, local]] = True
        self._infer_clocks(others)

    def _infer_clocks(self, others: Sequence[AlikeGroups]) -> None:
        """Mark the clocks of gates of one p, two n and two inputs (or the mirror image).

        Such a gate is dynamic, with the input of both polarities as its clock, or a single-phase
        stage, with the other one. What no static gate drives is a signal; the clock then is the
        other input, if it turns more transistors.
        """
        driven = np.zeros(self._nets, bool)
        for some in others:
            driven[some.nets[:, _ends(some)]] = True
        for some in others:
            pair = _half_clocked(some.network)
            if pair is not None:
                both, alone = some.nets[:, pair[0]], some.nets[:, pair[1]]
                more = self._gates_on[alone] > self._gates_on[both]
                self._is_clock[alone[driven[both] & ~driven[alone] & more]] = True

    def _pairs(
        self, asked: BoolArray, some: AlikeGroups, inputs: Sequence[int], end: int
    ) -> list[IntArray]:
        """Return an asked-for net and each input of the group that drives it, as one number."""
        driven = some.nets[:, end]
        rows = np.flatnonzero(asked[driven])
        return [driven[rows].astype(np.int64) * self._nets + some.nets[rows, i] for i in inputs]

    def split(self, some: AlikeGroups) -> list[tuple[Context, IntArray]]:
        """Return the contexts that equal groups stand in, each with the rows of its groups."""
        if some.nets.shape[1] > NETS_MAX:
            return [(Context(), np.arange(len(some.devices), dtype=np.int32))]
        inputs, ends = _inputs(some), _ends(some)
        here = some.nets[:, inputs]
        facts = [
            self._complement[here][:, :, None] == some.nets[:, None, :],
            self._listens(self._heard, here, some.nets[:, ends]),
            self._listens(self._unsure, here, some.nets[:, ends]),
            self._seen(some, ends),
            self._is_port[some.nets[:, ends]],
            self._is_clock[here],
        ]
        table = np.concatenate([fact.reshape(len(here), -1) for fact in facts], axis=1)
        kinds, inverse = distinct_rows(table)
        sizes = np.cumsum([fact[0].size for fact in facts])[:-1]
        result = []
        for index, kind in enumerate(kinds):
            complements, feedback, mutual, seen, ports, clocks = np.split(kind.astype(bool), sizes)
            locals_ = range(some.nets.shape[1])
            context = Context(
                _pairs(complements, inputs, locals_),
                _pairs(feedback, inputs, ends),
                _pairs(mutual, inputs, ends),
                tuple(np.array(ends)[seen].tolist()),
                tuple(np.array(ends)[ports].tolist()),
                tuple(np.array(inputs)[clocks].tolist()) if inputs else (),
            )
            result.append((context, np.flatnonzero(inverse == index).astype(np.int32)))
        return result

    def _listens(self, heard: IntArray, inputs: IntArray, ends: IntArray) -> BoolArray:
        """Tell whether what drives an input has a net among its own inputs."""
        pairs = inputs.astype(np.int64)[:, :, None] * self._nets + ends[:, None, :]
        if not len(heard):
            return np.zeros(pairs.shape, bool)
        place = np.searchsorted(heard, pairs.ravel()).clip(max=len(heard) - 1)
        found: BoolArray = (heard[place] == pairs.ravel()).reshape(pairs.shape)
        return found

    def _seen(self, some: AlikeGroups, ends: Sequence[int]) -> BoolArray:
        own = np.zeros(some.nets.shape[1], np.int64)
        np.add.at(own, [s.gate for s in some.network if s.gate >= 0], 1)
        nets = some.nets[:, ends]
        found: BoolArray = self._is_port[nets] | (self._gates_on[nets] > own[ends])
        return found


def named_clocks(devices: Devices, brief: Brief | None) -> IntArray:
    """Return the nets that a brief calls clocks.

    Raises
    ------
    SettingsError
        Where a pattern fits no net.
    """
    patterns = [pattern for one in (brief.clocks if brief else ()) for pattern in one.nets]
    # Names are put together on demand, and that takes its time.
    names = devices.net_names if patterns else ()
    return np.array(select(patterns, names, "net"), np.int32)


def _half_clocked(network: Sequence[Switch]) -> tuple[int, int] | None:
    """Return the input of both polarities of a clocked gate of three transistors, and the other."""
    of = {p: [s.gate for s in network if s.polarity == p] for p in "np"}
    one, two = sorted(of.values(), key=len)
    if len(one) != 1 or len(two) != 2 or min(*one, *two) < 0 or one[0] not in two:
        return None
    alone = [gate for gate in two if gate != one[0]]
    return (one[0], alone[0]) if alone else None


def _inputs(some: AlikeGroups) -> list[int]:
    return list(dict.fromkeys(s.gate for s in some.network if s.gate >= 0))


def _ends(some: AlikeGroups) -> list[int]:
    return list(dict.fromkeys(n for s in some.network for n in (s.a, s.b) if n >= 0))


def _sorted(parts: list[IntArray]) -> IntArray:
    return np.sort(np.concatenate([np.zeros(0, np.int64), *parts]))


def _pairs(
    known: BoolArray, inputs: Sequence[int], others: Sequence[int]
) -> tuple[tuple[int, int], ...]:
    table = np.argwhere(known.reshape(len(inputs), len(others))).tolist()
    return tuple((inputs[a], others[b]) for a, b in table)
