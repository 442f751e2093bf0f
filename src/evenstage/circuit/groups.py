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
    ordered_label = label[order]
    starts = np.flatnonzero(np.diff(ordered_label, prepend=-1))
    sizes = np.diff(starts, append=len(order))
    numbers = _local_nets(devices, (supplies, levels), order, ordered_label)
    alike: list[AlikeGroups] = []
    for size in np.unique(sizes):
        rows = starts[sizes == size][:, None] + np.arange(size)
        alike.extend(_alike(devices, order[rows], numbers[rows]))
    alike.sort(key=lambda groups: int(groups.devices[0, 0]))
    return tuple(alike)


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


def _local_nets(
    devices: Devices, still: tuple[Supplies, Levels], order: IntArray, label: IntArray
) -> IntArray:
    """Return drain, gate and source of each ordered device as local nets, shape (devices, 3)."""
    supplies, levels = still
    nets = np.stack([devices.drain[order], devices.gate[order], devices.source[order]], axis=1)
    flat = nets.ravel().astype(np.int64)
    pair = np.repeat(label.astype(np.int64), 3) * len(devices.net_names) + flat
    is_gate = np.tile([False, True, False], len(order))
    high = np.where(is_gate, levels.high[flat], supplies.is_high[flat])
    low = np.where(is_gate, levels.low[flat], supplies.is_low[flat])
    signal = ~(high | low)
    local = np.where(high, HIGH, LOW).astype(np.int32)
    unique, first, inverse = np.unique(pair[signal], return_index=True, return_inverse=True)
    # Number the nets of each group by first appearance: sort (group, first place), count from the
    # group's first.
    by_place = np.lexsort((first, unique // len(devices.net_names)))
    owner = (unique // len(devices.net_names))[by_place]
    begins = np.flatnonzero(np.diff(owner, prepend=-1))
    rank = np.empty(len(unique), np.int32)
    counts = np.diff(begins, append=len(owner))
    rank[by_place] = np.arange(len(owner)) - np.repeat(begins, counts)
    local[signal] = rank[inverse]
    return local.reshape(-1, 3)


def _alike(devices: Devices, members: IntArray, numbers: IntArray) -> list[AlikeGroups]:
    """Split groups of one size, shape (groups, size), into those with equal networks."""
    groups, size = members.shape
    is_p = np.array([model.polarity == "p" for model in devices.models])
    polarity = is_p[devices.model[members]].astype(np.int32)
    rows = np.concatenate([polarity[:, :, None], numbers], axis=2).reshape(groups, 4 * size)
    kinds, inverse = distinct_rows(rows)
    order = np.argsort(inverse, kind="stable")
    cuts = np.searchsorted(inverse[order], np.arange(1, len(kinds)))
    result = []
    for kind, which in zip(kinds, np.split(members[order], cuts), strict=True):
        table = kind.reshape(size, 4)
        network = tuple(Switch("p" if p else "n", d, g, s) for p, d, g, s in table.tolist())
        result.append(AlikeGroups(network, which, _net_ids(devices, which, table)))
    return result


def _net_ids(devices: Devices, members: IntArray, table: IntArray) -> IntArray:
    """Return the net ids of local nets, shape (groups, local nets)."""
    columns = np.stack([devices.drain, devices.gate, devices.source])
    places = table[:, 1:]
    nets = np.empty((len(members), int(places.max(initial=-1)) + 1), np.int32)
    for local in range(nets.shape[1]):
        device, terminal = np.argwhere(places == local)[0]
        nets[:, local] = columns[terminal][members[:, device]]
    return nets
