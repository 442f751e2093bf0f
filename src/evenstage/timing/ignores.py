"""Leaving out paths the brief names.

A path is ignored when it starts at a net that fits ``from``, passes one that fits ``through`` and
ends at one that fits ``to``. To leave out exactly these and no other, each node is split by how far
the path so far has come with every such rule; an end that a rule completes is no end.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.pattern import select

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import IntArray
    from evenstage.pattern import Pattern


@dataclass(frozen=True, kw_only=True)
class Expansion:
    """Nodes and arcs before they are put in order; see `evenstage.timing.graph.TimingGraph`."""

    net: IntArray
    rising: BoolArray
    source: IntArray
    target: IntArray
    arc: IntArray
    start: IntArray
    end: IntArray


@dataclass(frozen=True, slots=True)
class _Rule:
    """One ignored kind of path, by net id; an absent set fits every net."""

    start: frozenset[int] | None
    through: frozenset[int] | None
    end: frozenset[int] | None

    def begin(self, net: int) -> bool:
        """Tell whether a path that starts at a net may still be ignored by this rule."""
        return self.start is None or net in self.start

    def passed(self, net: int) -> bool:
        """Tell whether a net is one the rule waits for."""
        return self.through is None or net in self.through

    def completes(self, net: int) -> bool:
        """Tell whether the rule, once passed, forbids to end at a net."""
        return self.end is None or net in self.end


_Progress = tuple[int, ...]  # per rule: 0 does not apply, 1 waits for `through`, 2 has passed it


def expand(
    circuit: Circuit, kept: IntArray, brief: Brief | None, starts: IntArray, ends: IntArray
) -> Expansion:
    """Return the graph's nodes and arcs, split where ignored paths need it.

    Parameters
    ----------
    circuit : Circuit
    kept : IntArray
        Indices of usable circuit arcs.
    brief : Brief, optional
    starts, ends : IntArray
        Net ids.
    """
    arcs = circuit.arcs
    source = 2 * arcs.input[kept] + arcs.input_rising[kept]
    target = 2 * arcs.output[kept] + arcs.rising[kept]
    rules = _rules(circuit, brief)
    if rules:
        return _split(source, target, kept, rules, (starts, ends))
    nodes = np.arange(2 * len(circuit.devices.net_names), dtype=np.int32)
    return Expansion(
        net=nodes // 2,
        rising=nodes % 2 == 1,
        source=source.astype(np.int32),
        target=target.astype(np.int32),
        arc=kept,
        start=_both_edges(starts),
        end=_both_edges(ends),
    )


def _both_edges(nets: IntArray) -> IntArray:
    return (2 * nets[:, None] + np.array([0, 1], np.int32)).ravel().astype(np.int32)


def _rules(circuit: Circuit, brief: Brief | None) -> list[_Rule]:
    every = np.arange(len(circuit.devices.net_names))
    return [
        _Rule(
            _chosen(circuit, ignore.start, every, "net"),
            _chosen(circuit, ignore.through, every, "net"),
            _chosen(circuit, ignore.end, circuit.driven, "driven net"),
        )
        for ignore in (brief.ignores if brief else ())
    ]


def _chosen(
    circuit: Circuit, patterns: Sequence[Pattern], among: IntArray, what: str
) -> frozenset[int] | None:
    """Return the nets that patterns fit; None where there is no pattern."""
    if not patterns:
        return None
    names = circuit.devices.net_names
    fitting = select(patterns, [names[net] for net in among.tolist()], what)
    return frozenset(among[fitting].tolist())


def _split(
    source: IntArray,
    target: IntArray,
    arc: IntArray,
    rules: list[_Rule],
    wish: tuple[IntArray, IntArray],
) -> Expansion:
    """Walk from the starts, making a node for every edge and progress met."""
    followers: dict[int, list[tuple[int, int]]] = {}
    for a, b, index in zip(source.tolist(), target.tolist(), arc.tolist(), strict=True):
        followers.setdefault(a, []).append((b, index))
    numbers: dict[tuple[int, _Progress], int] = {}
    start = [
        numbers.setdefault((edge, _begun(rules, edge // 2)), len(numbers))
        for edge in _both_edges(wish[0]).tolist()
    ]
    waiting = list(numbers)
    links: list[tuple[int, int, int]] = []
    while waiting:
        edge, progress = here = waiting.pop()
        for follower, index in followers.get(edge, ()):
            there = (follower, _advanced(rules, progress, follower // 2))
            if there not in numbers:
                numbers[there] = len(numbers)
                waiting.append(there)
            links.append((numbers[here], numbers[there], index))
    edges = np.array([edge for edge, _ in numbers], np.int32)
    wanted = set(wish[1].tolist())
    end = [
        number
        for (edge, progress), number in numbers.items()
        if edge // 2 in wanted and not _ignored(rules, progress, edge // 2)
    ]
    columns = np.array(links, np.int32).reshape(-1, 3).T
    return Expansion(
        net=edges // 2,
        rising=edges % 2 == 1,
        source=columns[0],
        target=columns[1],
        arc=columns[2],
        start=np.array(start, np.int32),
        end=np.array(sorted(end, key=lambda number: (int(edges[number]), number)), np.int32),
    )


def _begun(rules: list[_Rule], net: int) -> _Progress:
    return _advanced(rules, tuple(int(rule.begin(net)) for rule in rules), net)


def _advanced(rules: list[_Rule], progress: _Progress, net: int) -> _Progress:
    return tuple(
        2 if state == 1 and rule.passed(net) else state
        for rule, state in zip(rules, progress, strict=True)
    )


def _ignored(rules: list[_Rule], progress: _Progress, net: int) -> bool:
    return any(
        state == 2 and rule.completes(net) for rule, state in zip(rules, progress, strict=True)
    )
