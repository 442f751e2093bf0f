"""The driver that switches at a node make: its pull networks, its arcs, and what it computes."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

from evenstage.circuit.division import Driver, Way, closing
from evenstage.circuit.function import (
    ONE,
    ZERO,
    Each,
    Expression,
    Literal,
    Not,
    When,
    conduction,
    conjunction,
    disjunction,
)
from evenstage.circuit.gate import (
    INPUTS_MAX,
    ArcForm,
    Beside,
    Pulls,
    Unrecognised,
    all_arcs,
    possible_vectors,
)
from evenstage.circuit.literals import Cube, Literals, consistent
from evenstage.circuit.network import HIGH, LOW, Network

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence


def driver_of(
    network: Network, node: int, indices: list[int], literals: Literals
) -> Driver | Unrecognised:
    """Return the driver that some switches at a node make, or why they make none."""
    switches = tuple(network.switches[i] for i in indices)
    inputs = tuple(dict.fromkeys(s.gate for s in switches if s.gate >= 0))
    if len(inputs) > INPUTS_MAX:
        return Unrecognised(f"a pull network of it has {len(inputs)} inputs, above {INPUTS_MAX}")
    own = Network(switches, tuple(range(len(switches))), network.node_of_net, inputs)
    up, down = own.conducts(node, HIGH, "p"), own.conducts(node, LOW, "n")
    relations = tuple(
        (a, b)
        for position, a in enumerate(inputs)
        for b in inputs[position + 1 :]
        if literals.condition(a, value=True) == literals.condition(b, value=False)
    )
    possible = possible_vectors(own, relations)
    anyhow = own.conducts(node, HIGH), own.conducts(node, LOW)
    if ((anyhow[0] != up) | (anyhow[1] != down))[possible].any():
        return Unrecognised("an n switch pulls up or a p switch pulls down")
    if (up & down)[possible].any():
        return Unrecognised("pull-up and pull-down conduct together: not complementary")
    if any(s.gate < 0 for s in switches) or not (up | down).any():
        return Unrecognised("a transistor that is always on pulls one of its nodes")
    always = bool((up | down)[possible].all())
    ways = [_ways(own, node, supply, indices, literals) for supply in (HIGH, LOW)]
    if not always and ways[0] and ways[1] and not enable_of(*ways):
        return Unrecognised("neither pull conducts for some inputs: it can float")
    arcs = all_arcs(own, node, Pulls(up, down, possible), relations)
    return Driver(
        node=node,
        switches=tuple(indices),
        up=ways[0],
        down=ways[1],
        arcs=tuple(_renumbered(arc, indices) for arc in arcs),
        kind=_kind(up_at_all=bool(up.any()), down_at_all=bool(down.any()), always=always),
        function=_function(own, node, *ways, always=always),
        always=always,
    )


def enabled_function(
    network: Network, output: int, complements: Iterable[tuple[int, int]]
) -> Expression | None:
    """Return what a gate that can float makes of its inputs, and when it drives.

    Where nothing is common to all ways to both supplies each level has a condition of its own, and
    the output keeps its level while neither holds. None where there are no such ways.
    """
    literals = Literals((a, b, False) for a, b in complements)
    indices = list(range(len(network.switches)))
    up, down = (_ways(network, output, supply, indices, literals) for supply in (HIGH, LOW))
    if not up or not down:
        return None
    if not enable_of(up, down):
        levels = ((ZERO, down), (ONE, up))
        return Each(
            tuple(When(to, sum_of([w.cube for w in ways])) for to, ways in levels), kept=True
        )
    return _function(network, output, up, down, always=False)


def outside(node: int, literals: Literals) -> Driver:
    """Return the driver of a node that the outside drives."""
    high, low = (literals.condition(node, value=value) for value in (True, False))
    ways = [(Way((), frozenset({one})),) for one in (high, low)]
    return Driver(node, (), ways[0], ways[1], (), "input", Literal(node), always=True)


def _kind(*, up_at_all: bool, down_at_all: bool, always: bool) -> str:
    if always:
        return "static gate"
    if up_at_all and down_at_all:
        return "tri-state gate"
    return "pull-up network" if up_at_all else "pull-down network"


def _function(
    own: Network, node: int, up: Sequence[Way], down: Sequence[Way], *, always: bool
) -> Expression:
    """Return what a driver makes of its inputs, and when it drives."""
    if always:
        return Not(conduction(own, node, LOW, "n"))
    ups, downs = [way.cube for way in up], [way.cube for way in down]
    if not downs:
        return When(ONE, sum_of(ups))
    if not ups:
        return When(ZERO, sum_of(downs))
    common = enable_of(up, down)
    return When(Not(sum_of([cube - common for cube in downs])), sum_of([common]))


def enable_of(up: Sequence[Way], down: Sequence[Way]) -> Cube:
    """Return what all ways to both supplies have in common: when a tri-state gate drives."""
    return frozenset.intersection(*(way.cube for way in (*up, *down)))


def sum_of(cubes: Sequence[Cube]) -> Expression:
    """Return the disjunction of cubes, the shortest first; none of them twice or implied."""
    kept: list[Cube] = []
    for cube in sorted(set(cubes), key=lambda one: (len(one), sorted(one))):
        if not any(other <= cube for other in kept):
            kept.append(cube)
    return disjunction(
        conjunction(Literal(net) if value else Not(Literal(net)) for net, value in sorted(cube))
        for cube in kept
    )


def _ways(
    own: Network, node: int, supply: int, indices: list[int], literals: Literals
) -> tuple[Way, ...]:
    """Return the paths to a supply that can conduct, those that always do together as one way."""
    if supply not in own.at_node:
        return ()
    alike: dict[object, list[tuple[int, ...]]] = {}
    for path in own.paths(node, supply, frozenset(range(len(indices)))):
        alike.setdefault((own.condition(path), len(path)), []).append(path)
    found = []
    for paths in alike.values():
        first, *beside = own.apart(paths)
        cube = consistent(frozenset(), (closing(own.switches[i], literals) for i in first))
        if cube is not None:
            path, *further = (tuple(indices[i] for i in one) for one in (first, *beside))
            found.append(Way(path, cube, tuple(further)))
    return tuple(found)


def _renumbered(arc: ArcForm, indices: list[int]) -> ArcForm:
    return replace(
        arc,
        path=tuple(indices[i] for i in arc.path),
        behind=tuple((node, indices[i]) for node, i in arc.behind),
        beside=tuple(Beside(tuple(indices[i] for i in one.path), one.moved) for one in arc.beside),
    )
