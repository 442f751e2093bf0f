"""Which supply nets gates hang on: their domains."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Iterable

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.supplies import BoolArray
    from evenstage.netlist.devices import IntArray


@dataclass(frozen=True, slots=True)
class Domain:
    """Supply nets that the transistors of a gate hang on.

    Parameters
    ----------
    high, low : tuple of str
        In the order of the block's nets; empty where no transistor has one at its drain or source.
    """

    high: tuple[str, ...]
    low: tuple[str, ...]

    @property
    def nets(self) -> tuple[str, ...]:
        """High ones, then low ones."""
        return self.high + self.low


@dataclass(frozen=True)
class GateDomains:
    """The domains of all gates.

    Parameters
    ----------
    domains : tuple of Domain
        In the order of the block's supply nets; gates on no high one come last.
    index : IntArray, shape (gates,)
        Into ``domains``.
    """

    domains: tuple[Domain, ...]
    index: IntArray

    def of(self, gate: int) -> Domain:
        """Return the domain of a gate."""
        return self.domains[int(self.index[gate])]

    def joined(self, gates: Iterable[int]) -> Domain:
        """Return what several gates hang on together."""
        found = [self.domains[i] for i in sorted({int(self.index[gate]) for gate in gates})]
        return Domain(
            tuple(dict.fromkeys(net for one in found for net in one.high)),
            tuple(dict.fromkeys(net for one in found for net in one.low)),
        )


def are_several(domains: Iterable[Domain]) -> bool:
    """Tell whether there is more than one high or more than one low supply among some."""
    some = tuple(domains)
    high = {net for one in some for net in one.high}
    low = {net for one in some for net in one.low}
    return len(high) > 1 or len(low) > 1


def gate_domains(circuit: Circuit, *, gathered: bool = False) -> GateDomains:
    """Find the supply nets of every gate.

    Parameters
    ----------
    circuit : Circuit
    gathered : bool
        Whether rails inside instances, which nobody declared and which are a net in every call, are
        gathered by the last part of their name, as ``*.vdd``, where there are several.
    """
    is_high = circuit.supplies.is_high
    names = _names(circuit, gathered=gathered)
    gate, net = _touched(circuit)
    index, first = _alike_sets(len(circuit), gate, net, len(is_high))
    begin, end = np.searchsorted(gate, first, "left"), np.searchsorted(gate, first, "right")
    sets = [net[i:j].tolist() for i, j in zip(begin.tolist(), end.tolist(), strict=True)]
    found = [
        Domain(
            tuple(dict.fromkeys(names[n] for n in nets if is_high[n])),
            tuple(dict.fromkeys(names[n] for n in nets if not is_high[n])),
        )
        for nets in sets
    ]
    order = sorted(range(len(sets)), key=lambda i: _high_first(sets[i], is_high))
    place = {domain: i for i, domain in enumerate(dict.fromkeys(found[i] for i in order))}
    merged = np.array([place[domain] for domain in found], np.int32)
    return GateDomains(tuple(place), merged[index])


def _high_first(nets: list[int], is_high: BoolArray) -> tuple[bool, list[int], list[int]]:
    high = [n for n in nets if is_high[n]]
    return not high, high, nets


def _touched(circuit: Circuit) -> tuple[IntArray, IntArray]:
    """Return each gate with each supply net at its drains and sources, by gate, then by net."""
    devices, is_supply = circuit.devices, circuit.supplies.is_supply
    keys = [np.zeros(0, np.int64)]
    for some in circuit.alike:
        for ends in (devices.drain, devices.source):
            nets = ends[some.devices]
            row, column = np.nonzero(is_supply[nets])
            gates = some.gates[row].astype(np.int64)
            keys.append(np.unique(gates * len(is_supply) + nets[row, column]))
    gate, net = np.divmod(np.unique(np.concatenate(keys)), len(is_supply))
    return gate.astype(np.int32), net.astype(np.int32)


def _alike_sets(gates: int, gate: IntArray, net: IntArray, nets: int) -> tuple[IntArray, IntArray]:
    """Return the number of each gate's set of nets, and the first gate of each set, ascending."""
    label = np.zeros(gates, np.int64)
    rank = np.arange(len(gate)) - np.searchsorted(gate, gate, "left")
    order = np.argsort(rank, kind="stable")
    # Round by round one more net tells apart what was alike: as many rounds as nets on one gate.
    ends = np.cumsum(np.bincount(rank))[:-1] if len(rank) else np.zeros(0, np.intp)
    for now in np.split(order, ends):
        _, longer = np.unique(label[gate[now]] * nets + net[now], return_inverse=True)
        label[gate[now]] = label.max(initial=0) + 1 + longer
    _, first, inverse = np.unique(label, return_index=True, return_inverse=True)
    place = np.empty(len(first), np.int32)
    place[np.argsort(first)] = np.arange(len(first))
    return place[inverse], np.sort(first).astype(np.int32)


def _names(circuit: Circuit, *, gathered: bool) -> dict[int, str]:
    """Return what the supply nets are called."""
    every = circuit.devices.net_names
    names = {net: every[net] for net in np.flatnonzero(circuit.supplies.is_supply).tolist()}
    if not gathered:
        return names
    last = {net: name.rpartition(".")[2].lower() for net, name in names.items() if "." in name}
    often = Counter(last.values())
    return names | {net: f"*.{part}" for net, part in last.items() if often[part] > 1}
