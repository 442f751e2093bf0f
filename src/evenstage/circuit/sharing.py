"""Which drains and sources share their diffusion with a neighbour.

A netlist without areas says nothing of the layout, but layouts are alike: transistors of one type
on one net of one subcircuit stand side by side, two by two around one strip of diffusion, so that
each carries half of it. Where nothing but two such ends meet, between devices in series, the strip
needs no contact and is narrower still: shared diffusion counts about as much as gate capacitance
when contacted, half as much when not, an end on its own up to twice (see reference U6 in
`tests/reference`). Of an odd number of ends one stands alone, and they bear that together.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, NamedTuple

import numpy as np

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import Devices, FloatArray


class SharedEnds(NamedTuple):
    """How one end of every device shares its diffusion; shape ``(n,)`` each.

    Parameters
    ----------
    part : FloatArray
        Share of the device's fingers whose end has a neighbour.
    is_inner : BoolArray
        Whether nothing but two devices in series meet there.
    """

    part: FloatArray
    is_inner: BoolArray

    def factor(self, shared: FloatArray, inner: FloatArray) -> FloatArray:
        """Return what an end counts relative to one that stands alone.

        Parameters
        ----------
        shared, inner : FloatArray, shape (n,)
            What an end with a neighbour counts, in general and where two devices in series meet.
        """
        counted: FloatArray = 1 - (1 - np.where(self.is_inner, inner, shared)) * self.part
        return counted


def shared_ends(devices: Devices) -> tuple[SharedEnds, SharedEnds]:
    """Find how the drains and the sources of a block share their diffusion."""
    nets, count = len(devices.net_names), len(devices)
    kind = np.array([model.type_index for model in devices.models], np.int64)[devices.model]
    net = np.concatenate([devices.drain, devices.source]).astype(np.int64)
    fingers = np.tile(devices.fingers * devices.multiplier, 2)
    place = devices.instance.astype(np.int64) * (kind.max(initial=0) + 1) + kind
    key = net * (place.max(initial=0) + 1) + np.tile(place, 2)
    _, group = np.unique(key, return_inverse=True)
    ends = np.bincount(group, fingers)[group]
    part = 2 * np.floor(ends / 2) / ends
    joins = np.bincount(devices.gate, minlength=nets)
    joins[list(devices.ports)] += 1
    is_inner = (np.bincount(group)[group] == 2) & (np.bincount(net)[net] == 2) & (joins[net] == 0)
    drains, sources = slice(count), slice(count, None)
    return (
        SharedEnds(part[drains], is_inner[drains]),
        SharedEnds(part[sources], is_inner[sources]),
    )
