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

from evenstage.errors import NoPathError, Notice
from evenstage.pattern import Pattern, select
from evenstage.timing.ignores import Expansion, expand
from evenstage.timing.loops import cut_loops

if TYPE_CHECKING:
    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
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


@dataclass(frozen=True)
class _Wish:
    """What was asked for: which nets start paths and which end them.

    The inputs are all nets where paths begin unless asked otherwise.
    """

    inputs: IntArray
    starts: IntArray
    ends: IntArray
    whole: bool


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
    wish = _wish(circuit, start, end)
    kept, notices = _usable_arcs(circuit, wish)
    expansion = expand(circuit, kept, brief, wish.starts, wish.ends)
    expansion = _on_paths(expansion)
    if not len(expansion.start) or not len(expansion.end):
        raise _no_path(circuit, wish, notices, start, end)
    levels = _levels(len(expansion.net), expansion.source, expansion.target)
    order = np.lexsort((np.arange(len(levels)), levels))
    number = np.empty(len(order), np.int32)
    number[order] = np.arange(len(order))
    by_target = np.lexsort((expansion.arc, number[expansion.target]))
    target = number[expansion.target][by_target]
    level_of_arc = levels[expansion.target][by_target]
    arrival, transition, drive = _input_briefs(circuit, unit, brief, expansion, wish)
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
        end_required=_required(circuit, brief, expansion.net[expansion.end]),
        whole=wish.whole,
        notices=tuple(notices),
    )


def _wish(circuit: Circuit, start: str | None, end: str | None) -> _Wish:
    """Find the nets that start and end paths."""
    nets = len(circuit.devices.net_names)
    has_pin = np.zeros(nets, bool)
    has_pin[circuit.pins.net] = True
    inputs = block_inputs(circuit)
    starts, ends = inputs, np.array(list(circuit.ends), np.int32)
    if start is not None:
        starts = _asked(circuit, start, np.flatnonzero(has_pin), "an input of any gate")
    if end is not None:
        ends = _asked(circuit, end, np.unique(circuit.gate_output), "driven by any gate")
    return _Wish(inputs, starts, ends, start is None and end is None)


def block_inputs(circuit: Circuit) -> IntArray:
    """Return the nets that load gates, that no gate drives and that are no supplies; by id."""
    has_pin = np.zeros(len(circuit.devices.net_names), bool)
    has_pin[circuit.pins.net] = True
    undriven = circuit.driver_of_net < 0
    return np.flatnonzero(has_pin & undriven & ~circuit.supplies.is_supply).astype(np.int32)


def _asked(circuit: Circuit, wanted: str, among: IntArray, what: str) -> IntArray:
    names = circuit.devices.net_names
    pattern = Pattern(wanted)
    chosen = [net for net in among.tolist() if pattern.fits(names[net])]
    if not chosen:
        known = circuit.net_id(wanted)
        problem = f"net '{wanted}' is not {what}" if known is not None else f"no net '{wanted}'"
        raise NoPathError(
            f"{problem} in '{circuit.devices.top or 'the top level'}'", code="no-path"
        )
    return np.array(chosen, np.int32)


def _usable_arcs(circuit: Circuit, wish: _Wish) -> tuple[IntArray, list[Notice]]:
    """Return the circuit arcs left after cutting loops and whatever drives a start."""
    arcs = circuit.arcs
    is_start = np.zeros(len(circuit.devices.net_names), bool)
    is_start[wish.starts] = True
    kept = np.flatnonzero(~is_start[arcs.output] & (circuit.driver_of_net[arcs.output] >= 0))
    cut = cut_loops(arcs.input[kept], arcs.output[kept], wish.starts, len(is_start))
    notices = []
    if cut.cut.any():
        names = circuit.devices.net_names
        pairs = np.unique(np.stack([arcs.input[kept], arcs.output[kept]])[:, cut.cut], axis=1)
        told = tuple(f"{names[a]} -> {names[b]}" for a, b in pairs.T.tolist())
        notices.append(
            Notice(
                "loop-cut",
                f"loops were cut at {len(told)} arcs from an input of a gate to its output, "
                f"the first at {told[0]}",
                names=told,
            )
        )
    return kept[~cut.cut].astype(np.int32), notices


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
    order = np.argsort(source, kind="stable")
    head = np.searchsorted(source[order], np.arange(count + 1))
    followers = target[order].tolist()
    heads = head.tolist()
    reached = [False] * count
    waiting = roots.tolist()
    for root in waiting:
        reached[root] = True
    while waiting:
        node = waiting.pop()
        for follower in followers[heads[node] : heads[node + 1]]:
            if not reached[follower]:
                reached[follower] = True
                waiting.append(follower)
    return np.array(reached, bool)


def _levels(count: int, source: IntArray, target: IntArray) -> IntArray:
    """Return the number of arcs on the longest way to each node, shape (nodes,)."""
    order = np.argsort(source, kind="stable")
    heads = np.searchsorted(source[order], np.arange(count + 1)).tolist()
    followers = target[order].tolist()
    waiting_for = np.bincount(target, minlength=count).tolist()
    level = [0] * count
    ready = [node for node in range(count) if not waiting_for[node]]
    while ready:
        node = ready.pop()
        for follower in followers[heads[node] : heads[node + 1]]:
            level[follower] = max(level[follower], level[node] + 1)
            waiting_for[follower] -= 1
            if not waiting_for[follower]:
                ready.append(follower)
    return np.array(level, np.int32)


def _input_briefs(
    circuit: Circuit, unit: Yardstick, brief: Brief | None, all_: Expansion, wish: _Wish
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return arrival, transition and drive of each start node."""
    nets, rising = all_.net[all_.start], all_.rising[all_.start]
    arrival, drive = np.zeros(len(nets)), np.zeros(len(nets))
    transition = np.where(rising, unit.transition_rise, unit.transition_fall)
    given = brief.inputs if brief else ()
    known = np.union1d(wish.inputs, wish.starts)
    names = [circuit.devices.net_names[net] for net in known.tolist()] if given else []
    for some in given:
        chosen = np.isin(nets, known[select(some.nets, names, "input")])
        arrival[chosen] = some.arrival
        drive[chosen] = some.drive
        if some.transition is not None:
            transition[chosen] = some.transition
    return arrival, transition, drive


def _required(circuit: Circuit, brief: Brief | None, nets: IntArray) -> FloatArray:
    """Return the required time of each end, s; NaN where the brief does not say."""
    required = np.full(len(nets), np.nan)
    given = brief.outputs if brief else ()
    names = [circuit.devices.net_names[net] for net in circuit.gate_output] if given else []
    for some in given:
        if some.required is not None:
            chosen = circuit.gate_output[select(some.nets, names, "driven net")]
            required[np.isin(nets, chosen)] = some.required
    return required


def _no_path(
    circuit: Circuit, wish: _Wish, notices: list[Notice], start: str | None, end: str | None
) -> NoPathError:
    """Say why no path is left."""
    where = f"in '{circuit.devices.top or 'the top level'}'"
    if not len(wish.starts):
        loop = "; its gates form loops without a way in" if notices or len(circuit) else ""
        return NoPathError(
            f"no input {where}: every gate input is driven by a gate or tied to a supply{loop}",
            code="loop-without-entry" if loop else "no-path",
        )
    asked = " ".join(f"{word} '{net}'" for word, net in (("from", start), ("to", end)) if net)
    return NoPathError(
        f"no path {asked + ' ' if asked else ''}{where}: no input reaches such an end along "
        "recognised gates, loops cut and ignored paths left out",
        code="no-path",
    )
