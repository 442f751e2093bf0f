"""Which instance holds a gate, and whether it holds nothing else."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.tables import AlikeGates
    from evenstage.netlist.devices import Devices, IntArray


def owners(devices: Devices, alike: tuple[AlikeGates, ...]) -> IntArray:
    """Return the innermost instance that holds all transistors of each gate, shape (gates,)."""
    depth = _depths(devices)
    owner = np.empty(sum(len(some.gates) for some in alike), np.int32)
    for some in alike:
        instance = devices.instance[some.devices]
        # Lift the deeper ones, step by step, until all transistors of each gate agree.
        while (apart := np.flatnonzero((instance != instance[:, :1]).any(axis=1))).size:
            rows = instance[apart]
            level = depth[rows]
            deepest = level == level.max(axis=1, keepdims=True)
            instance[apart] = np.where(deepest, devices.instance_parent[rows], rows)
        owner[some.gates] = instance[:, 0]
    return owner


def leaves(devices: Devices, alike: tuple[AlikeGates, ...], owner: IntArray) -> BoolArray:
    """Tell for each gate whether its instance holds exactly its transistors, shape (gates,)."""
    held = np.bincount(devices.instance, minlength=len(devices.instance_parent))
    depth = _depths(devices)
    for level in range(int(depth.max()), 0, -1):
        here = np.flatnonzero(depth == level)
        np.add.at(held, devices.instance_parent[here], held[here])
    size = np.empty(len(owner), np.int64)
    for some in alike:
        size[some.gates] = some.devices.shape[1]
    result: BoolArray = (held[owner] == size) & (owner > 0)
    return result


def _depths(devices: Devices) -> IntArray:
    """Return how deep each instance lies; the block itself at 0."""
    parent = devices.instance_parent
    depth = np.zeros(len(parent), np.int32)
    waiting = parent == 0
    level = 1
    while waiting.any():
        depth[waiting] = level
        # The block has no parent: its -1 must not stand for the last instance.
        waiting = waiting[parent] & (parent >= 0)
        level += 1
    return depth
