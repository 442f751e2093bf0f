"""What a block consists of: its gates by subcircuit and kind, and what was not understood."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.names import device_names
from evenstage.circuit.storage.elements import first_device
from evenstage.circuit.supplied import GateDomains, are_several, gate_domains
from evenstage.tabular import Row, Tabular, row

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.storage.elements import Element
    from evenstage.circuit.supplied import Domain
    from evenstage.circuit.tables import AlikeGates
    from evenstage.errors import Notice
    from evenstage.netlist.devices import Devices, IntArray


@dataclass(frozen=True, slots=True)
class Entry:
    """Gates drawn alike in one subcircuit, on the same supplies.

    Parameters
    ----------
    subcircuit : str
        Innermost definition that holds them; empty for the top level of the text.
    kind : str
    count : int
        How often they occur in the block, all calls together.
    devices : int
        Transistors of each.
    instance : str
        Name of the first.
    output, function : str
        Of the first, in the net names of its subcircuit.
    inputs : tuple of str
        Likewise.
    supplies : Domain
        What they hang on, in the names of the block; rails that are inside instances and that
        nobody declared are gathered by their last name, as ``*.vdd``.
    """

    subcircuit: str
    kind: str
    count: int
    devices: int
    instance: str
    output: str
    function: str
    inputs: tuple[str, ...]
    supplies: Domain


@dataclass(frozen=True, slots=True)
class Unknown:
    """Groups of transistors that were not understood, for one reason.

    Parameters
    ----------
    reason : str
    groups, devices : int
        How many.
    names : tuple of str
        The transistors, at most `evenstage.circuit.names.NAMES_MAX`.
    """

    reason: str
    groups: int
    devices: int
    names: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Stored:
    """Storage elements of one kind in one subcircuit on the same supplies, and loops that are none.

    Parameters
    ----------
    subcircuit, kind : str
    count : int
        How many.
    instance : str
        Path of the instance that holds the first; empty for the block itself.
    nets, data : tuple of str
        Of the first: nets of its loops, and nets that are stored; in the names of its subcircuit.
    clocks, writes : tuple of (str, bool)
        Likewise: its clocks with the level that lets data through (of a flip-flop the level after
        its edge), and what sets or resets it with the level that does.
    supplies : Domain
        What the gates that drive its nets hang on, named as in `Entry`.
    """

    subcircuit: str
    kind: str
    count: int
    instance: str
    nets: tuple[str, ...]
    data: tuple[str, ...]
    clocks: tuple[tuple[str, bool], ...]
    writes: tuple[tuple[str, bool], ...]
    supplies: Domain


@dataclass(frozen=True, slots=True)
class Outside:
    """Transistors outside all logic that play one part in one subcircuit.

    Parameters
    ----------
    subcircuit, role : str
    devices : int
        How many.
    names : tuple of str
        The transistors, at most `evenstage.circuit.names.NAMES_MAX`.
    """

    subcircuit: str
    role: str
    devices: int
    names: tuple[str, ...]


@dataclass(frozen=True, kw_only=True)
class Inventory(Tabular):
    """The contents of a block.

    Parameters
    ----------
    source, top : str
        File and block.
    devices, nets, gates : int
        How many.
    high, low : tuple of str
        Supply nets.
    entries : tuple of Entry
        By subcircuit, callers first, then by supplies where there are several pairs, then by kind
        and first occurrence.
    stored : tuple of Stored
        Likewise.
    outside : tuple of Outside
        By subcircuit, then by role.
    not_understood : tuple of Unknown
    notices : tuple of Notice
    circuit : Circuit
        Where all this was taken from.
    """

    source: str
    top: str
    devices: int
    nets: int
    gates: int
    high: tuple[str, ...]
    low: tuple[str, ...]
    entries: tuple[Entry, ...]
    stored: tuple[Stored, ...]
    outside: tuple[Outside, ...]
    not_understood: tuple[Unknown, ...]
    notices: tuple[Notice, ...]
    circuit: Circuit = field(repr=False, compare=False)

    @property
    def headline(self) -> str:
        """How much was recognised, in one line."""
        left = sum(unknown.devices for unknown in self.not_understood)
        return (
            f"{self.top or self.source}: {self.gates} gates of {self.devices} transistors, "
            f"{left} not understood"
        )

    def tables(self) -> dict[str, list[Row]]:
        """Return the gates by subcircuit and kind, storage, and what was not understood."""
        return {
            "gates": [
                row(entry) | {"inputs": ", ".join(entry.inputs)} | _named(entry.supplies)
                for entry in self.entries
            ],
            "storage": [
                row(some) | {"data": ", ".join(some.data)} | _named(some.supplies)
                for some in self.stored
            ],
            "outside_logic": [row(some) for some in self.outside],
            "not_understood": [row(some) for some in self.not_understood],
        }


def _named(supplies: Domain) -> Row:
    return {"high": ", ".join(supplies.high), "low": ", ".join(supplies.low)}


def take_inventory(circuit: Circuit) -> Inventory:
    """Count what a circuit consists of."""
    supplied = gate_domains(circuit, gathered=True)
    devices, supplies = circuit.devices, circuit.supplies
    names = devices.net_names
    return Inventory(
        source=devices.netlist.sources[0].label,
        top=devices.top,
        devices=len(devices),
        nets=len(names),
        gates=len(circuit),
        high=tuple(names[net] for net in np.flatnonzero(supplies.is_high).tolist()),
        low=tuple(names[net] for net in np.flatnonzero(supplies.is_low).tolist()),
        entries=_entries(circuit, supplied),
        stored=_stored(circuit, supplied),
        outside=_outside(circuit),
        not_understood=_unknown(circuit),
        notices=circuit.notices,
        circuit=circuit,
    )


def _entries(circuit: Circuit, supplied: GateDomains) -> tuple[Entry, ...]:
    by_domain = are_several(supplied.domains)
    found = [
        (subcircuit, domain if by_domain else 0, some.form.kind, first, count)
        for some in circuit.alike
        for subcircuit, domain, first, count in _by_place(circuit, some, supplied)
    ]
    found.sort()
    alike: dict[Entry, int] = {}
    instance: dict[Entry, str] = {}
    for *_, first, count in found:
        entry = _entry(circuit, first, count, supplied.of(first))
        # Parts of stages are drawn in different places of them and yet are alike.
        key = replace(entry, count=0, instance="")
        alike[key] = alike.get(key, 0) + count
        instance.setdefault(key, entry.instance)
    return tuple(replace(key, count=n, instance=instance[key]) for key, n in alike.items())


def _by_place(
    circuit: Circuit, some: AlikeGates, supplied: GateDomains
) -> list[tuple[int, int, int, int]]:
    """Return by subcircuit and domain the first gate of a form, and how many there are."""
    holder = circuit.devices.instance_subcircuit[circuit.gate_instance[some.gates]]
    place = holder.astype(np.int64) * len(supplied.domains) + supplied.index[some.gates]
    places, first, count = np.unique(place, return_index=True, return_counts=True)
    subcircuit, domain = np.divmod(places, len(supplied.domains))
    columns = subcircuit, domain, some.gates[first], count
    return list(zip(*(column.tolist() for column in columns), strict=True))


def _entry(circuit: Circuit, gate: int, count: int, supplies: Domain) -> Entry:
    form = circuit.alike[int(circuit.gate_form[gate])].form
    return Entry(
        subcircuit=circuit.gate_subcircuit(gate),
        kind=form.kind,
        count=count,
        devices=len(form.drawn),
        instance=circuit.gate_name(gate),
        output=circuit.local_name(gate, form.output),
        function=circuit.gate_function(gate),
        inputs=tuple(circuit.local_name(gate, local) for local in form.network.inputs),
        supplies=supplies,
    )


def _stored(circuit: Circuit, supplied: GateDomains) -> tuple[Stored, ...]:
    devices = circuit.devices
    at_net = first_device(devices)
    by_place: dict[tuple[int, Domain, str], list[tuple[int, Element]]] = {}
    for element in circuit.storage.elements:
        nets = [net for loop in element.loops for net in loop.nets]
        instance = _common(devices, devices.instance[at_net[nets]].tolist())
        drivers = circuit.driver_of_net[nets]
        domain = supplied.joined(drivers[drivers >= 0].tolist())
        place = int(devices.instance_subcircuit[instance]), domain, element.kind
        by_place.setdefault(place, []).append((instance, element))
    rank = {domain: i for i, domain in enumerate(dict.fromkeys(place[1] for place in by_place))}
    if not are_several(rank):
        rank = dict.fromkeys(rank, 0)
    order = sorted(by_place, key=lambda place: (place[0], rank[place[1]], place[2]))
    return tuple(_stored_entry(circuit, place, by_place[place]) for place in order)


def _stored_entry(
    circuit: Circuit, place: tuple[int, Domain, str], members: list[tuple[int, Element]]
) -> Stored:
    devices, (instance, first) = circuit.devices, members[0]
    _, supplies, kind = place

    def named(net: int) -> str:
        return circuit.net_name_inside(instance, net)

    return Stored(
        subcircuit=devices.subcircuits[int(devices.instance_subcircuit[instance])],
        kind=kind,
        count=len(members),
        instance=devices.instance_path(instance),
        nets=tuple(named(net) for loop in first.loops for net in loop.nets),
        data=tuple(map(named, first.data)),
        clocks=tuple((named(net), level) for net, level in first.clocks),
        writes=tuple((named(net), level) for net, level in first.writes),
        supplies=supplies,
    )


def _common(devices: Devices, instances: list[int]) -> int:
    """Return the innermost instance that holds all of some."""
    lines: list[list[int]] = []
    for instance in dict.fromkeys(instances):
        line = [instance]
        while line[-1] > 0:
            line.append(int(devices.instance_parent[line[-1]]))
        lines.append(line[::-1])
    shared: list[int] = [level[0] for level in zip(*lines, strict=False) if len(set(level)) == 1]
    return shared[-1]


def _outside(circuit: Circuit) -> tuple[Outside, ...]:
    devices = circuit.devices
    found = []
    for some in circuit.apart:
        holder = devices.instance_subcircuit[devices.instance[some.devices]]
        for subcircuit in np.unique(holder).tolist():
            which = some.devices[holder == subcircuit]
            names = device_names(devices, which)
            name = devices.subcircuits[subcircuit]
            found.append((subcircuit, some.role, Outside(name, some.role, len(which), names)))
    return tuple(outside for _, _, outside in sorted(found, key=lambda one: one[:2]))


def _unknown(circuit: Circuit) -> tuple[Unknown, ...]:
    by_reason: dict[str, list[IntArray]] = {}
    for some in circuit.not_understood:
        by_reason.setdefault(some.reason, []).append(some.devices)
    return tuple(
        Unknown(
            reason=reason,
            groups=sum(len(part) for part in parts),
            devices=sum(part.size for part in parts),
            names=device_names(circuit.devices, np.concatenate([part.ravel() for part in parts])),
        )
        for reason, parts in by_reason.items()
    )
