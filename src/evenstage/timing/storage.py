"""Where storage elements end and start paths.

A path ends where data enter a loop that a clock closes, and one begins with the clock and leaves
through the loop: arcs of data lead to an end of their own, beside the node that goes on. What the
loop feeds back to the net where it is entered is no arc of its own: with the clock it only holds.
In a loop without a clock one net moves the other, once: arcs inside it lead to copies of its nets,
from where only nets outside are reached.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.storage.elements import Loop
    from evenstage.netlist.devices import IntArray
    from evenstage.timing.ignores import Expansion


@dataclass(frozen=True)
class Boundaries:
    """What storage elements make of the arcs of a circuit.

    Parameters
    ----------
    captured : BoolArray, shape (arcs,)
        Data into a clocked loop: a path ends there.
    held : BoolArray, shape (arcs,)
        Back into a clocked loop, or from a clock that closes it: no path.
    around : BoolArray, shape (arcs,)
        From one net of a loop without a clock to another.
    part : IntArray, shape (nets,)
        Nets that reach each other have the same number; all have one where nothing stores.
    """

    captured: BoolArray
    held: BoolArray
    around: BoolArray
    part: IntArray


def boundaries(circuit: Circuit) -> Boundaries:
    """Find the arcs that enter and close the storage loops of a circuit."""
    arcs, storage = circuit.arcs, circuit.storage
    loops, loop = storage.loops(), storage.loop_of_net()
    if not loops:
        none = np.zeros(len(arcs), bool)
        return Boundaries(none, none, none, np.zeros(len(loop), np.int32))
    clocked = np.array([one.captures for one in loops], bool)
    into, source = loop[arcs.output], storage.phases.root[arcs.input]
    inside = into >= 0
    own = inside & ((loop[arcs.input] == into) | (loop[source] == into))
    is_clocked = np.zeros(len(arcs), bool)
    is_clocked[inside] = clocked[into[inside]]
    level = _clock_levels(
        loops, into, source, arcs.input_rising ^ storage.phases.inverted[arcs.input]
    )
    written = _writes(loops, into, source)
    captured = is_clocked & ~own & (level == 0) & ~written
    part = _parts(circuit, ~captured)
    inner = own & (part[arcs.input] == part[arcs.output])
    entered = _entries(circuit, loops, np.where(is_clocked & ~own, into, -1))
    held = is_clocked & ((inner & entered[arcs.output]) | (level < 0))
    return Boundaries(captured, held, inner & ~is_clocked, part)


def _clock_levels(
    loops: Sequence[Loop], into: IntArray, source: IntArray, rising: BoolArray
) -> IntArray:
    """Return 1 for arcs from a clock that opens its loop, -1 where it closes, 0 for others."""
    nets = int(source.max(initial=0)) + 1
    found = np.zeros(len(into), np.int8)
    for level in (False, True):
        keys = [
            number * nets + net
            for number, one in enumerate(loops)
            for net, opens in one.clocks
            if opens == level
        ]
        mine = _is_pair(into, source, nets, keys)
        found[mine] = np.where(rising[mine] == level, 1, -1)
    return found


def _writes(loops: Sequence[Loop], into: IntArray, source: IntArray) -> BoolArray:
    """Tell which arcs begin at a net that sets or resets their loop."""
    nets = int(source.max(initial=0)) + 1
    keys = [number * nets + net for number, one in enumerate(loops) for net, _ in one.writes]
    return _is_pair(into, source, nets, keys)


def _is_pair(into: IntArray, source: IntArray, nets: int, keys: Sequence[int]) -> BoolArray:
    """Tell which arcs lead into a loop (-1: none) from a net that some keys name with it."""
    found = np.zeros(len(into), bool)
    inside = np.flatnonzero(into >= 0)
    pair = into[inside].astype(np.int64) * nets + source[inside]
    found[inside] = np.isin(pair, np.array(keys, np.int64))
    return found


def _entries(circuit: Circuit, loops: Sequence[Loop], into: IntArray) -> BoolArray:
    """Tell of each net whether it is the one where its loop is entered.

    The first of several, and the first of its nets where no arc enters a loop.
    """
    found = np.zeros(len(circuit.devices.net_names), bool)
    closed = np.ones(len(loops), bool)
    closed[into[into >= 0]] = False
    found[[loops[number].nets[0] for number in np.flatnonzero(closed).tolist()]] = True
    arcs = np.flatnonzero(into >= 0)
    outputs = circuit.arcs.output[arcs]
    order = np.lexsort((outputs, into[arcs]))
    _, first = np.unique(into[arcs][order], return_index=True)
    found[outputs[order][first]] = True
    return found


def _parts(circuit: Circuit, kept: BoolArray) -> IntArray:
    nets, arcs = len(circuit.devices.net_names), circuit.arcs
    ends = (arcs.input[kept], arcs.output[kept])
    links = coo_array((np.ones(len(ends[0]), np.int8), ends), shape=(nets, nets))
    part: IntArray = connected_components(links, directed=True, connection="strong")[1]
    return part


def bounded(expansion: Expansion, found: Boundaries, ends: IntArray, stored: IntArray) -> Expansion:
    """Lead captured arcs to ends of their own, and arcs inside other loops to copies of nets.

    Parameters
    ----------
    expansion : Expansion
        Without the arcs that only hold.
    found : Boundaries
    ends : IntArray
        Nets where paths may end.
    stored : IntArray
        Those of them that only captured paths end at.
    """
    captured, around = found.captured[expansion.arc], found.around[expansion.arc]
    if not (captured.any() or around.any()):
        return expansion
    count = len(expansion.net)
    target = expansion.target.copy()
    moved = captured | around
    copied, place = np.unique(2 * target[moved] + around[moved], return_inverse=True)
    original = copied // 2
    target[moved] = count + place
    copies = count + np.arange(len(original), dtype=np.int32)
    may_end = np.isin(expansion.net[original], ends)
    goes_on = ~np.isin(expansion.net[expansion.end], stored)
    # What leaves the copies of loops without a clock.
    copy_of = np.full(count, -1, np.int32)
    copy_of[original[copied % 2 == 1]] = copies[copied % 2 == 1]
    net, source = expansion.net, expansion.source
    leaving = np.flatnonzero(
        (copy_of[source] >= 0) & (found.part[net[source]] != found.part[net[expansion.target]])
    )
    return replace(
        expansion,
        net=np.concatenate([net, net[original]]),
        rising=np.concatenate([expansion.rising, expansion.rising[original]]),
        source=np.concatenate([source, copy_of[source[leaving]]]),
        target=np.concatenate([target, target[leaving]]).astype(np.int32),
        arc=np.concatenate([expansion.arc, expansion.arc[leaving]]),
        end=np.concatenate([expansion.end[goes_on], copies[may_end]]),
    )
