"""Channel-connected groups, and which of them are drawn alike.

Transistors whose drains and sources meet, other than in a supply, form a group;
those outside all logic (`evenstage.circuit.apart`) are in none. Written down device
by device with its nets numbered as they appear, a group becomes a row of small integers; equal rows
mean equal networks. All of it is array work: nothing here loops over devices or nets.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from evenstage.circuit.network import HIGH, LOW, Switch
from evenstage.circuit.rows import distinct_rows

if TYPE_CHECKING:
    from evenstage.circuit.apart import Levels
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.supplies import Supplies
    from evenstage.netlist.devices import Devices, IntArray


@dataclass(frozen=True)
class AlikeGroups:
    """All groups with one network.

    Parameters
    ----------
    network : tuple of Switch
        The drawn network all of them have.
    devices : IntArray, shape (groups, devices of a group)
        Device ids, in the order of ``network``.
    nets : IntArray, shape (groups, local nets)
        Net ids, by local net.
    """

    network: tuple[Switch, ...]
    devices: IntArray
    nets: IntArray


def group(
    devices: Devices, supplies: Supplies, logic: BoolArray, levels: Levels
) -> tuple[AlikeGroups, ...]:
    """Group devices of a block by channel connection.

    Parameters
    ----------
    devices : Devices
    supplies : Supplies
        Where channels end.
    logic : BoolArray, shape (devices,)
        Devices to group: at least one channel end of each is no supply.
    levels : Levels
        Nets that never move, as gates see them.

    Returns
    -------
    tuple of AlikeGroups
        In the order of their first device.
    """
    members = np.flatnonzero(logic)
    label = _labels(devices, supplies, logic)
    order = members[np.argsort(label[members], kind="stable")].astype(np.int32)
    starts = np.flatnonzero(np.diff(label[order], prepend=-1))
    sizes = np.diff(starts, append=len(order))
    places = _Places.of(devices, supplies, levels)
    alike: list[AlikeGroups] = []
    for size in np.unique(sizes):
        rows = starts[sizes == size][:, None] + np.arange(size)
        alike.extend(_alike(places, order[rows]))
    alike.sort(key=lambda groups: int(groups.devices[0, 0]))
    return tuple(alike)


@dataclass(frozen=True)
class _Places:
    """What every device hangs on, nets that never move as `HIGH` and `LOW`.

    Parameters
    ----------
    is_p : BoolArray, shape (devices,)
    nets, seen : tuple of IntArray, shape (devices,) each
        Drain, gate and source as net ids, and with what never moves put in.
    """

    is_p: BoolArray
    nets: tuple[IntArray, IntArray, IntArray]
    seen: tuple[IntArray, IntArray, IntArray]

    @classmethod
    def of(cls, devices: Devices, supplies: Supplies, levels: Levels) -> _Places:
        """Return the places of a block's devices."""
        own = np.arange(len(devices.net_names), dtype=np.int32)
        channel = np.where(supplies.is_high, HIGH, np.where(supplies.is_low, LOW, own))
        gate = np.where(levels.high, HIGH, np.where(levels.low, LOW, own))
        is_p = np.array([model.polarity == "p" for model in devices.models], bool)[devices.model]
        nets = (devices.drain, devices.gate, devices.source)
        seen = (channel[devices.drain], gate[devices.gate], channel[devices.source])
        return cls(is_p, nets, seen)


def _labels(devices: Devices, supplies: Supplies, logic: BoolArray) -> IntArray:
    """Return each device's group, numbered by first device."""
    nets = len(devices.net_names)
    inner = logic & ~(supplies.is_supply[devices.drain] | supplies.is_supply[devices.source])
    ends = (devices.drain[inner], devices.source[inner])
    links = coo_array((np.ones(len(ends[0]), np.int8), ends), shape=(nets, nets))
    _, component = connected_components(links, directed=False)
    anchor = np.where(supplies.is_supply[devices.drain], devices.source, devices.drain)
    own = component[anchor]
    first = np.full(int(component.max(initial=-1)) + 1, len(devices), np.int64)
    np.minimum.at(first, own, np.arange(len(devices)))
    result: IntArray = first[own].astype(np.int32)
    return result


def _numbered(nets: IntArray) -> IntArray:
    """Return nets of each row numbered as they first appear; `HIGH` and `LOW` stay as they are."""
    order = np.argsort(nets, axis=1, kind="stable").astype(np.int32)
    ordered = np.take_along_axis(nets, order, axis=1)
    place = np.arange(nets.shape[1], dtype=np.int32)
    # Of equal nets the stable order has the first in front: carry its place to the others.
    begins = np.diff(ordered, axis=1, prepend=LOW - 1) != 0
    front = np.maximum.accumulate(np.where(begins, place, 0), axis=1)
    first = np.empty_like(order)
    np.put_along_axis(first, order, np.take_along_axis(order, front, axis=1), axis=1)
    rank = np.cumsum((first == place) & (nets >= 0), axis=1, dtype=np.int32) - 1
    return np.where(nets >= 0, np.take_along_axis(rank, first, axis=1), nets)


def _alike(places: _Places, members: IntArray) -> list[AlikeGroups]:
    """Split groups of one size, shape (groups, size), into those with equal networks."""
    groups, size = members.shape
    seen, terminals = (
        np.stack([end[members] for end in ends], axis=2).reshape(groups, 3 * size)
        for ends in (places.seen, places.nets)
    )
    numbers = _numbered(seen).reshape(groups, size, 3)
    rows = np.concatenate([places.is_p[members][:, :, None], numbers], axis=2)
    rows = rows.reshape(groups, 4 * size)
    kinds, inverse = distinct_rows(rows)
    order = np.argsort(inverse, kind="stable")
    cuts = np.searchsorted(inverse[order], np.arange(1, len(kinds)))
    result = []
    for kind, rows_of_kind in zip(kinds, np.split(order, cuts), strict=True):
        table = kind.reshape(size, 4)
        network = tuple(Switch("p" if p else "n", d, g, s) for p, d, g, s in table.tolist())
        locals_, first = np.unique(table[:, 1:], return_index=True)
        nets = terminals[rows_of_kind[:, None], first[locals_ >= 0]]
        result.append(AlikeGroups(network, members[rows_of_kind], nets))
    return result
