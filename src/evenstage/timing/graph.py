"""The acyclic graph that delays run along: nodes are edges of nets, arcs are those of the gates.

Which paths count is decided here: where they start and end, what the brief leaves out, and where
loops are cut. Everything after this works on numbered nodes in topological order.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
from scipy.sparse import coo_array
from scipy.sparse.csgraph import breadth_first_order

from evenstage.circuit.arcs import ranges
from evenstage.circuit.circuit import STORED
from evenstage.errors import Notice
from evenstage.timing.endpoints import (
    arrivals_from_outside,
    endpoints,
    no_path,
    required_times,
    undriven,
)
from evenstage.timing.ignores import Expansion, expand
from evenstage.timing.knockout import rounds_of
from evenstage.timing.loops import cut_loops
from evenstage.timing.storage import Boundaries, boundaries, bounded

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.endpoints import Endpoints
    from evenstage.timing.knockout import Rounds
    from evenstage.timing.results import Yardstick


class Level(NamedTuple):
    """Arcs that can be swept together.

    Parameters
    ----------
    arcs : slice
        Of the graph's arcs.
    first : IntArray, shape (k,)
        Where the arcs of each target begin, counted within the slice.
    node : IntArray, shape (k,)
        The targets.
    """

    arcs: slice
    first: IntArray
    node: IntArray


@dataclass(frozen=True, kw_only=True)
class TimingGraph:
    """Nodes and arcs that lie on some path from a start to an end.

    Node numbers are a topological order; arcs are sorted by target, those of one target in the
    order of the circuit's arcs.

    Parameters
    ----------
    net, rising : IntArray and BoolArray, shape (nodes,)
        What a node is.
    source, target : IntArray, shape (arcs,)
    arc : IntArray, shape (arcs,)
        Index into ``Circuit.arcs``.
    level_ends : IntArray, shape (levels,)
        Arcs of level k are ``level_ends[k-1]:level_ends[k]``.
    start : IntArray, shape (starts,)
        Nodes where paths begin.
    start_arrival, start_transition, start_drive : FloatArray, s, s, ohm, shape (starts,)
        As the brief says; the drive adds its own delay.
    end : IntArray, shape (ends,)
        Nodes where paths end, ordered by net.
    end_required : FloatArray, s, shape (ends,)
        NaN where the brief does not say.
    whole : bool
        Whether all inputs and ends count, not only those asked for.
    notices : tuple of Notice
        What was cut or left out.
    """

    net: IntArray
    rising: BoolArray
    source: IntArray
    target: IntArray
    arc: IntArray
    level_ends: IntArray
    start: IntArray
    start_arrival: FloatArray
    start_transition: FloatArray
    start_drive: FloatArray
    end: IntArray
    end_required: FloatArray
    whole: bool
    notices: tuple[Notice, ...] = field(default=())

    def __len__(self) -> int:
        return len(self.net)

    @cached_property
    def levels(self) -> tuple[Level, ...]:
        """The arcs level by level, in the order of a sweep; worked out once."""
        bounds = [0, *self.level_ends.tolist()]
        heads = np.flatnonzero(np.diff(self.target, prepend=-1))
        cuts = np.searchsorted(heads, bounds).tolist()
        return tuple(
            Level(slice(begin, end), heads[low:high] - begin, self.target[heads[low:high]])
            for (begin, end), (low, high) in zip(pairwise(bounds), pairwise(cuts), strict=True)
            if end > begin
        )

    @cached_property
    def rounds(self) -> tuple[Rounds, ...]:
        """For each level how the arrivals at each of its nodes meet."""
        return tuple(
            rounds_of(np.diff(first, append=some.stop - some.start))
            for some, first, _ in self.levels
        )


def timing_graph(
    circuit: Circuit,
    unit: Yardstick,
    brief: Brief | None = None,
    *,
    start: str | None = None,
    end: str | None = None,
) -> TimingGraph:
    """Build the graph of a circuit.

    Parameters
    ----------
    circuit : Circuit
    unit : Yardstick
        Its transitions are the default at inputs.
    brief : Brief, optional
        Arrivals, drives, required times and ignored paths.
    start, end : str, optional
        Net names (wildcards allowed) that paths must start from or end at.

    Raises
    ------
    NoPathError
        Where nothing is left.
    SettingsError
        Where a pattern of the brief fits nothing.
    """
    found = endpoints(circuit, start, end)
    limits = boundaries(circuit)
    kept, notices = _usable_arcs(circuit, found, limits)
    whole = expand(circuit, kept, brief, found.starts, found.ends)
    stored = [net for net, why in circuit.ends.items() if why == STORED] if end is None else []
    expansion = _on_paths(bounded(whole, limits, found.ends, np.array(stored, np.int32)))
    if not len(expansion.start) or not len(expansion.end):
        raise no_path(circuit, found, start=start, end=end)
    levels = _levels(len(expansion.net), expansion.source, expansion.target)
    order = np.lexsort((np.arange(len(levels)), levels))
    number = np.empty(len(order), np.int32)
    number[order] = np.arange(len(order))
    by_target = np.lexsort((expansion.arc, number[expansion.target]))
    target = number[expansion.target][by_target]
    level_of_arc = levels[expansion.target][by_target]
    starting = expansion.net[expansion.start], expansion.rising[expansion.start]
    arrival, transition, drive = arrivals_from_outside(circuit, unit, brief, found, starting)
    return TimingGraph(
        net=expansion.net[order],
        rising=expansion.rising[order],
        source=number[expansion.source][by_target],
        target=target,
        arc=expansion.arc[by_target],
        level_ends=np.searchsorted(
            level_of_arc, np.arange(1, int(levels.max(initial=0)) + 1), side="right"
        ).astype(np.int32),
        start=number[expansion.start],
        start_arrival=arrival,
        start_transition=transition,
        start_drive=drive,
        end=number[expansion.end],
        end_required=required_times(circuit, brief, expansion.net[expansion.end]),
        whole=found.whole,
        notices=(*notices, *undriven(circuit, brief, found)),
    )


def _usable_arcs(
    circuit: Circuit, found: Endpoints, limits: Boundaries
) -> tuple[IntArray, list[Notice]]:
    """Return the circuit arcs left after cutting loops and whatever drives a start."""
    arcs = circuit.arcs
    is_start = np.zeros(len(circuit.devices.net_names), bool)
    is_start[found.starts] = True
    usable = ~is_start[arcs.output] & (circuit.driver_of_net[arcs.output] >= 0) & ~limits.held
    kept = np.flatnonzero(usable)
    # Where storage ends paths no loop is closed.
    running = np.flatnonzero(usable & ~limits.captured & ~limits.around)
    cut = cut_loops(
        2 * arcs.input[running] + arcs.input_rising[running],
        2 * arcs.output[running] + arcs.rising[running],
        (2 * found.starts[:, None] + np.arange(2)).ravel(),
        2 * len(is_start),
    )
    notices = []
    if cut.cut.any():
        names = circuit.devices.net_names
        gone = running[cut.cut]
        pairs = np.unique(np.stack([arcs.input[gone], arcs.output[gone]]), axis=1)
        kept = np.setdiff1d(kept, gone)
        told = tuple(f"{names[a]} -> {names[b]}" for a, b in pairs.T.tolist())
        notices.append(
            Notice(
                "loop-cut",
                f"loops were cut at {len(told)} arcs from an input of a gate to its output, "
                f"the first at {told[0]}",
                names=told,
            )
        )
    return kept.astype(np.int32), notices


def _on_paths(all_: Expansion) -> Expansion:
    """Keep the nodes that a start reaches and that reach an end."""
    count = len(all_.net)
    forward = _reached(count, all_.source, all_.target, all_.start)
    backward = _reached(count, all_.target, all_.source, all_.end)
    keep = forward & backward
    number = np.cumsum(keep, dtype=np.int32) - np.int32(1)
    arcs = keep[all_.source] & keep[all_.target]
    return Expansion(
        net=all_.net[keep],
        rising=all_.rising[keep],
        source=number[all_.source[arcs]],
        target=number[all_.target[arcs]],
        arc=all_.arc[arcs],
        start=number[all_.start[keep[all_.start]]],
        end=number[all_.end[keep[all_.end]]],
    )


def _reached(count: int, source: IntArray, target: IntArray, roots: IntArray) -> BoolArray:
    """Return the nodes that arcs lead to from the roots, the roots included."""
    # One node more, before all roots, makes it a single search.
    begin = np.concatenate([source, np.full(len(roots), count)])
    end = np.concatenate([target, roots])
    arcs = coo_array((np.ones(len(begin), np.int8), (begin, end)), shape=(count + 1, count + 1))
    order = breadth_first_order(arcs.tocsr(), count, return_predecessors=False)
    reached = np.zeros(count + 1, bool)
    reached[order] = True
    return reached[:count]


def _levels(count: int, source: IntArray, target: IntArray) -> IntArray:
    """Return the number of arcs on the longest way to each node, shape (nodes,).

    All nodes of a level are settled at once: those whose last arc comes from the level before.
    """
    order = np.argsort(source, kind="stable")
    followers = target[order]
    heads = np.searchsorted(source[order], np.arange(count + 1)).astype(np.int32)
    width = np.diff(heads)
    waiting_for = np.bincount(target, minlength=count)
    level, place = np.zeros((2, count), np.int32)
    ready, depth = np.flatnonzero(waiting_for == 0), 0
    while len(ready):
        level[ready] = depth
        following = followers[ranges(heads[ready], width[ready])]
        np.subtract.at(waiting_for, following, 1)
        ready = following[waiting_for[following] == 0]
        # Each once: the place it is met at last.
        place[ready] = np.arange(len(ready))
        ready, depth = ready[place[ready] == np.arange(len(ready))], depth + 1
    return level
