"""In which order channel-connected groups are settled.

A group waits for the groups whose nets close and open its switches. Groups that wait for each other
(storage, level restorers, keepers) form a loop and are settled together; of loops and single groups
all whose inputs are known are settled at once, as one batch, whatever their structure.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

if TYPE_CHECKING:
    from evenstage.logic.switches import BoolArray, Switches
    from evenstage.netlist.devices import IntArray


@dataclass(frozen=True)
class Batch:
    """Groups that are settled at once.

    Edges are switches seen from one end, by the free node they lead to; each free node has some.

    Parameters
    ----------
    nets : IntArray, shape (nodes,)
        Net ids, the free nodes first.
    free : int
        How many nodes are free; the others are given.
    device : IntArray, shape (switches,)
        Device ids.
    switch, start : IntArray, shape (edges,)
        Index into ``device``, and the node each edge comes from.
    head : IntArray, shape (free,)
        First edge to each free node.
    loops : bool
        Whether its groups wait for themselves or each other.
    groups : int
        How many there are.
    group : IntArray, shape (free,)
        Number of the group of each free node.
    """

    nets: IntArray
    free: int
    device: IntArray
    switch: IntArray
    start: IntArray
    head: IntArray
    loops: bool
    groups: int
    group: IntArray


@dataclass(frozen=True)
class Groups:
    """Channel-connected groups of a block, given nets as barriers.

    Parameters
    ----------
    of_net : IntArray, shape (nets,)
        Group of each net, -1 for given nets and for those no channel ends at.
    of_device : IntArray, shape (devices,)
        Group of each device, -1 for those between given nets or with both ends on one.
    waits, awaited : IntArray, shape (pairs,)
        Which group waits for which; a group may wait for itself.
    count : int
    """

    of_net: IntArray
    of_device: IntArray
    waits: IntArray
    awaited: IntArray
    count: int


def find_groups(switches: Switches, given: BoolArray) -> Groups:
    """Return the channel-connected groups; ``given``, shape (nets,): nets decided from outside."""
    drain, source = switches.drain, switches.source
    nets = len(given)
    inner = ~(given[drain] | given[source]) & (drain != source)
    links = coo_array(
        (np.ones(int(inner.sum()), np.int8), (drain[inner], source[inner])), (nets,) * 2
    )
    _, label = connected_components(links, directed=False)
    used = ~(given[drain] & given[source]) & (drain != source)
    anchor = np.where(given[drain], source, drain)
    found, of_used = np.unique(label[anchor[used]], return_inverse=True)
    of_device = np.full(len(drain), -1, np.int64)
    of_device[used] = of_used
    of_net = np.full(nets, -1, np.int64)
    for ends in (drain[used], source[used]):
        free = ~given[ends]
        of_net[ends[free]] = of_used[free]
    awaited = of_net[switches.gate[used]]
    # One number for each pair sorts faster than pairs do.
    pair = np.unique((of_used * len(found) + awaited)[awaited >= 0])
    waits, awaited = np.divmod(pair, max(1, len(found)))
    return Groups(of_net, of_device, waits, awaited, len(found))


def fan_in(groups: Groups, seeds: IntArray) -> BoolArray:
    """Tell which groups some groups wait for, themselves included, shape (groups,)."""
    return _closure(groups.count, groups.awaited, groups.waits, seeds)


def fan_out(groups: Groups, seeds: IntArray) -> BoolArray:
    """Tell which groups wait for some groups, themselves included, shape (groups,)."""
    return _closure(groups.count, groups.waits, groups.awaited, seeds)


def _closure(count: int, target: IntArray, source: IntArray, seeds: IntArray) -> BoolArray:
    reached = np.zeros(count, bool)
    reached[seeds] = True
    while True:
        further = target[reached[source]]
        if reached[further].all():
            return reached
        reached[further] = True


def batches(switches: Switches, given: BoolArray) -> tuple[Batch, ...]:
    """Return the groups in an order in which each finds all it waits for settled."""
    groups = find_groups(switches, given)
    if not groups.count:
        return ()
    shape = (groups.count, groups.count)
    ones = np.ones(len(groups.waits), np.int8)
    graph = coo_array((ones, (groups.waits, groups.awaited)), shape)
    loops, loop = connected_components(graph, directed=True, connection="strong")
    level = _levels(loop[groups.waits], loop[groups.awaited], loops)[loop]
    inside = loop[groups.waits] == loop[groups.awaited]
    looped = np.zeros(loops, bool)
    looped[loop[groups.waits[inside]]] = True
    stage = 2 * level + looped[loop]
    used = np.flatnonzero(groups.of_device >= 0)
    when = stage[groups.of_device[used]]
    order = used[np.argsort(when, kind="stable")]
    cuts = np.flatnonzero(np.diff(np.sort(when), prepend=-1))
    times, count = np.unique(stage, return_counts=True)
    return tuple(
        _batch(switches, groups.of_net, some, loops=bool(time & 1), groups=int(number))
        for some, time, number in zip(
            np.split(order, cuts[1:]), times.tolist(), count.tolist(), strict=True
        )
    )


def _levels(waits: IntArray, awaited: IntArray, count: int) -> IntArray:
    """Return the length of the longest chain of waiting before each loop, shape (loops,)."""
    between = waits != awaited
    waits, awaited = waits[between], awaited[between]
    by_awaited = np.argsort(awaited, kind="stable")
    follower = waits[by_awaited]
    head = np.searchsorted(awaited[by_awaited], np.arange(count + 1))
    open_ends = np.bincount(waits, minlength=count)
    level, met = np.zeros((2, count), np.int64)
    ready = np.flatnonzero(open_ends == 0)
    depth = 0
    while len(ready):
        level[ready] = depth
        depth += 1
        lengths = head[ready + 1] - head[ready]
        place = np.arange(lengths.sum()) + np.repeat(
            head[ready] - np.cumsum(lengths) + lengths, lengths
        )
        open_ends -= np.bincount(follower[place], minlength=count)
        ready = follower[place]
        ready = ready[open_ends[ready] == 0]
        # Each once: the place it is met at last.
        met[ready] = np.arange(len(ready))
        ready = ready[met[ready] == np.arange(len(ready))]
    return level


def _batch(
    switches: Switches, group: IntArray, device: IntArray, *, loops: bool, groups: int
) -> Batch:
    ends = np.stack([switches.drain[device], switches.source[device]])
    nets = np.unique(ends)
    is_given = group[nets] < 0
    nets = np.concatenate([nets[~is_given], nets[is_given]])
    free = int((~is_given).sum())
    place = np.empty(len(group), np.int64)
    place[nets] = np.arange(len(nets))
    start = place[ends].ravel()
    end = place[ends[::-1]].ravel()
    switch = np.tile(np.arange(len(device)), 2)
    order = np.argsort(end, kind="stable")
    order = order[end[order] < free]
    head = np.searchsorted(end[order], np.arange(free))
    own = group[nets[:free]]
    return Batch(nets, free, device, switch[order], start[order], head, loops, groups, own)
