"""Which cards share one size.

A size belongs to cards, not to devices: to the X card that calls a leaf (a subcircuit that is
exactly one gate, or that the brief names one), else to the transistor cards of a gate, shared by
all callers of the subcircuit they stand in. Cards that any gate shares, or that the brief ties,
have one size.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from evenstage.netlist.rewriting.sized_block import Slot
from evenstage.sizing.named import gates_named, leaves_named

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import IntArray


@dataclass(frozen=True)
class Partition:
    """The sizes of a block and the widths in the text that they scale.

    Parameters
    ----------
    of_gate : IntArray, shape (gates, 2)
        Size of each gate's n transistors, and of its p transistors: one unless they are apart.
    of_device : IntArray, shape (devices,)
        Size of each device; -1 outside recognised gates.
    handle : IntArray, shape (sizes,)
        Number of the card that stands for each size: the smallest of its X or transistor cards.
    slots : tuple of Slot
        Every width in the text that some size scales.
    slot_of_device : IntArray, shape (devices,)
        Index into ``slots``; -1 outside recognised gates.
    """

    of_gate: IntArray
    of_device: IntArray
    handle: IntArray
    slots: tuple[Slot, ...]
    slot_of_device: IntArray

    def __len__(self) -> int:
        return len(self.handle)

    @cached_property
    def side(self) -> IntArray:
        """Which column of ``of_gate`` names each size: 1 where it is of p transistors alone."""
        side = np.ones(len(self), np.int32)
        side[self.of_gate[:, 0]] = 0
        return side

    @property
    def is_apart(self) -> bool:
        """Whether some gate's pull-up has a size of its own."""
        return bool(self.side.any())

    @cached_property
    def first_device(self) -> IntArray:
        """The first device of each slot, shape (slots,)."""
        first = np.full(len(self.slots) + 1, len(self.slot_of_device), np.int64)
        np.minimum.at(first, self.slot_of_device, np.arange(len(self.slot_of_device)))
        return first[:-1].astype(np.int32)

    @cached_property
    def of_slot(self) -> IntArray:
        """Size of each slot, shape (slots,)."""
        return self.of_device[self.first_device]

    @cached_property
    def variable_of(self) -> dict[Slot, int]:
        """Size of each slot, for the rewriting of widths."""
        return dict(zip(self.slots, self.of_slot.tolist(), strict=True))

    def with_sizes(self, of_gate: IntArray, of_device: IntArray, handle: IntArray) -> Partition:
        """Return the partition with other sizes of the same widths."""
        return replace(self, of_gate=of_gate, of_device=of_device, handle=handle)

    def tied(self, label: IntArray) -> Partition:
        """Return the partition with sizes of equal label made one, shape (sizes,)."""
        _, first, new = np.unique(label, return_index=True, return_inverse=True)
        return replace(
            self,
            of_gate=new[self.of_gate].astype(np.int32),
            of_device=np.append(new, -1)[self.of_device].astype(np.int32),
            handle=self.handle[first],
        )


def partition(circuit: Circuit, brief: Brief | None = None) -> Partition:
    """Find the sizes of a circuit.

    Raises
    ------
    SettingsError
        Where a pattern of the brief fits nothing.
    """
    callers = calling_cards(circuit, brief)
    of_gate, handle = _labels(circuit, brief, callers)
    inside = circuit.gate_of_device >= 0
    caller_of_device = np.append(callers, -1)[circuit.gate_of_device]
    pairs, index = np.unique(
        np.stack([circuit.devices.card[inside], caller_of_device[inside]]),
        axis=1,
        return_inverse=True,
    )
    slot_of_device = np.full(len(inside), -1, np.int32)
    slot_of_device[inside] = index
    return Partition(
        of_gate=np.stack([of_gate, of_gate], axis=1),
        of_device=np.append(of_gate, -1)[circuit.gate_of_device].astype(np.int32),
        handle=handle,
        slots=tuple(
            Slot(card, caller if caller >= 0 else None) for card, caller in pairs.T.tolist()
        ),
        slot_of_device=slot_of_device,
    )


def calling_cards(circuit: Circuit, brief: Brief | None = None) -> IntArray:
    """Return for each gate the X card that calls its leaf, -1 where its own cards count."""
    devices = circuit.devices
    caller = np.where(
        circuit.gate_is_leaf, devices.instance_card[circuit.gate_instance], -1
    ).astype(np.int32)
    if brief is None or not brief.leaves:
        return caller
    is_named = np.isin(devices.instance_subcircuit, leaves_named(devices, brief.leaves))
    # Walk outwards: the outermost instance of a named leaf calls it.
    instance = circuit.gate_instance.copy()
    while (instance > 0).any():
        inside = (instance > 0) & is_named[instance]
        caller[inside] = devices.instance_card[instance[inside]]
        instance = np.where(instance > 0, devices.instance_parent[instance], 0)
    return caller


def _labels(circuit: Circuit, brief: Brief | None, callers: IntArray) -> tuple[IntArray, IntArray]:
    """Return the size of each gate, and each size's first card: a card joins all its gates."""
    gate_of_link, card_of_link = _links(circuit, callers)
    gates, cards = len(circuit), len(circuit.devices.netlist)
    first, second = _tied_gates(circuit, brief, callers)
    ends = np.concatenate([gate_of_link, first]), np.concatenate([gates + card_of_link, second])
    links = coo_array((np.ones(len(ends[0]), np.int8), ends), shape=(gates + cards, gates + cards))
    _, component = connected_components(links, directed=False)
    first_card = np.full(int(component.max(initial=0)) + 1, cards, np.int64)
    np.minimum.at(first_card, component[gate_of_link], card_of_link)
    handle, of_gate = np.unique(first_card[component[:gates]], return_inverse=True)
    return of_gate.astype(np.int32), handle.astype(np.int32)


def _links(circuit: Circuit, callers: IntArray) -> tuple[IntArray, IntArray]:
    """Return pairs of a gate and a card that carries its size."""
    by_card = circuit.gate_of_device >= 0
    by_card &= callers[circuit.gate_of_device] < 0
    called = np.flatnonzero(callers >= 0).astype(np.int32)
    return (
        np.concatenate([circuit.gate_of_device[by_card], called]),
        np.concatenate([circuit.devices.card[by_card], callers[called]]),
    )


def _tied_gates(
    circuit: Circuit, brief: Brief | None, callers: IntArray
) -> tuple[IntArray, IntArray]:
    """Return pairs of gates the brief ties: same sizes, and all calls of a leaf without copies."""
    groups = [gates_named(circuit, patterns) for patterns in (brief.same_size if brief else ())]
    if brief is not None and not brief.copies_per_leaf:
        leaf = circuit.devices.instance_subcircuit[circuit.gate_instance]
        called = np.flatnonzero(callers >= 0)
        groups += [called[leaf[called] == one].tolist() for one in np.unique(leaf[called])]
    first = [group[0] for group in groups for _ in group[1:]]
    second = [gate for group in groups for gate in group[1:]]
    return np.array(first, np.int32), np.array(second, np.int32)
