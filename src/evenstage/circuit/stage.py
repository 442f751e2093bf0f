"""What a group of several nodes is as a stage: drivers, passes, and arcs through both.

An arc runs from an input of a driving gate, or from a control of a pass, along the route to a node
that is seen outside. It charges every node of the route, and what conducting passes tie to it,
through the part of the route that their charge flows through. When a control closes a pass, the
nodes between it and the driver have settled before.
"""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache
from typing import TYPE_CHECKING

import networkx as nx

from evenstage.circuit.dividing import divide
from evenstage.circuit.division import Division, Driver, Pass, Way
from evenstage.circuit.drivers import outside, sum_of
from evenstage.circuit.function import ONE, ZERO, Each, Expression, Literal, Not, When
from evenstage.circuit.gate import GateForm, Unrecognised, recognise_network
from evenstage.circuit.literals import Cube, Literals, consistent
from evenstage.circuit.network import HIGH, LOW, Network, Switch, merge
from evenstage.circuit.precharge import PRECHARGE
from evenstage.circuit.routes import Route, Router, TooManyRoutesError
from evenstage.circuit.stage_form import Facts, Sink, StageArc, StageForm, Step

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.circuit.division import Charging

FEEDS_BACK = "it feeds back into itself"
SWITCHES_MAX = 4000
"""Larger groups are arrays of cells, not stages."""
_PARALLEL_MAX = 4
"""Transistors at one node that are taken for one pull network."""


@lru_cache(maxsize=4096)
def recognise_stage(devices: tuple[Switch, ...], facts: Facts) -> StageForm | Unrecognised:
    """Recognise one network as a stage, or say why it is none.

    No reason is given for a network that passes nothing on: why it is no gate says more.
    """
    if len(devices) > SWITCHES_MAX:
        return Unrecognised(f"{len(devices)} transistors in one group, above {SWITCHES_MAX}")
    seen = frozenset(facts.seen) | frozenset(facts.inputs) | frozenset(facts.outputs)
    network = merge(devices, seen | frozenset(facts.open))
    terminals = [node for node in network.inner_nodes if node in seen or node in facts.open]
    division = divide(network, terminals, Literals(facts.ties), frozenset(facts.clocks))
    if isinstance(division, Unrecognised):
        return division if len(network.driven_nodes) > 1 else Unrecognised("")
    sources = _sources(division, facts)
    if isinstance(sources, Unrecognised):
        return sources
    drivers = division.drivers + tuple(outside(node, division.literals) for node in sources)
    division = replace(division, drivers=drivers)
    sinks = [node for node in terminals if node in seen and node not in sources]
    if not sinks:
        return Unrecognised("")
    try:
        form = _Builder(division, devices, sinks, sources).form(facts.pairs)
        return form if division.passes or isinstance(form, StageForm) else Unrecognised("")
    except TooManyRoutesError:
        return Unrecognised("its pass transistors offer too many routes")


def _sources(division: Division, facts: Facts) -> tuple[int, ...] | Unrecognised:
    """Return the nodes that the outside drives, or say that this cannot be told.

    An open node without a pull network is driven from outside if the brief says so or if it closes
    switches. Of the others those are inputs that reach a node in the block that waits for a signal;
    those that something drives without such a node in between are outputs.
    """
    driven = division.drivers_at
    candidates = [n for n in facts.open if n in division.passes_at and n not in driven]
    sources = {n for n in candidates if n in facts.inputs or n in facts.gating}
    sources -= set(facts.outputs)
    rest = [n for n in candidates if n not in sources and n not in facts.outputs]
    waiting = set(facts.seen) - sources - set(driven) - set(rest)
    held = sources | {node for node, some in driven.items() if any(d.always for d in some)}
    between: nx.Graph[int] = nx.Graph()
    between.add_nodes_from(node for node in division.passes_at if node not in held)
    between.add_edges_from(one.ends for one in division.passes if not held.intersection(one.ends))
    touched = {end for one in division.passes if held.intersection(one.ends) for end in one.ends}
    for node in rest:
        around = nx.node_connected_component(between, node)
        if around & waiting:
            sources.add(node)
        elif not around & (touched | set(driven)):
            return Unrecognised(
                "nothing tells which of its open ends drive; name the block's inputs in the brief"
            )
    return tuple(sorted(sources))


class _Builder:
    """The stage of one division, put together."""

    def __init__(
        self,
        division: Division,
        devices: tuple[Switch, ...],
        sinks: Sequence[int],
        sources: tuple[int, ...],
    ) -> None:
        self._division, self._devices = division, devices
        self._sinks, self._sources = sinks, sources
        self._router = Router(division)
        self._pulling = [driver for driver in division.drivers if not driver.is_outside]
        self._groups = _joined_drivers(self._pulling)
        drivers = [tuple(i for d in some for i in d.switches) for some in self._groups]
        switches = drivers + [p.switches for p in division.passes]
        switches += [one.switches for one in division.charging]
        self._whole = recognise_network(devices)
        if isinstance(self._whole, GateForm):
            switches = [tuple(range(len(division.network.switches)))]
        self._part_of = {index: part for part, some in enumerate(switches) for index in some}
        self._count = len(switches)
        self._ways_taken: set[tuple[int, int]] = set()

    def form(self, pairs: tuple[tuple[int, int], ...]) -> StageForm | Unrecognised:
        """Return the stage, with what sense amplifiers do to themselves left out."""
        arcs: dict[StageArc, None] = {}
        sinks = []
        for node in self._sinks:
            high = list(self._towards(node, HIGH, arcs))
            low = list(self._towards(node, LOW, arcs))
            high, low = (
                some + [(frozenset({one.condition}), False) for one in self._charging(node, supply)]
                for some, supply in ((high, HIGH), (low, LOW))
            )
            if not (high or low) or not ((high and low) or self._division.charging or pairs):
                return Unrecognised("a node of it that is seen outside is only pulled one way")
            part = next((arc.part for arc in arcs if arc.output == node), 0)
            sinks.append(
                Sink(
                    node=node,
                    part=part,
                    high=tuple(dict.fromkeys(cube for cube, _ in high)),
                    low=tuple(dict.fromkeys(cube for cube, _ in low)),
                    weak_high=any(is_weak for _, is_weak in high),
                    weak_low=any(is_weak for _, is_weak in low),
                )
            )
        own = {net for pair in pairs for net in pair}
        arcs = {arc: None for arc in arcs if arc.input not in own}
        if not arcs:
            return Unrecognised("nothing drives a node of it that is seen outside")
        links = nx.DiGraph((arc.input, arc.output) for arc in arcs)
        if not nx.is_directed_acyclic_graph(links):
            return Unrecognised(FEEDS_BACK)
        columns = self._columns()
        return StageForm(
            drawn=self._devices,
            network=self._division.network,
            columns=columns,
            parts=self._parts(columns),
            arcs=tuple(arcs),
            sinks=tuple(sinks),
            sources=self._sources,
            assumed=self._division.assumed,
            both_ways=self._both_ways(),
            bounded=tuple(sink.node for sink in sinks) if self._router.is_bounded else (),
            lines=tuple(
                (node, self._part_at(node), number)
                for node, number in sorted(self._router.lines.items())
            ),
            precharge=tuple(self._precharge()),
        )

    def _part_at(self, node: int) -> int:
        """Return the first part with a switch on a node."""
        return min(self._part_of[index] for index in self._division.network.at_node[node])

    def _charging(self, node: int, supply: int) -> list[Charging]:
        """Return what precharges a node to a supply."""
        return [c for c in self._division.charging if c.node == node and c.supply == supply]

    def _precharge(self) -> Iterator[StageArc]:
        """Yield the arcs that precharge dynamic nodes.

        With a node move the inner nodes of its pull networks, as far as they may hang on it while
        what precharges it conducts.
        """
        switches = self._division.network.switches
        for one in self._division.charging:
            first = switches[one.switches[0]]
            moved = {one.node: 1} | dict.fromkeys(self._behind(one), 1)
            yield StageArc(
                part=self._part_of[one.switches[0]],
                input=first.gate,
                output=one.node,
                input_rising=first.polarity == "n",
                rising=one.supply == HIGH,
                steps=(Step(self._part_of[one.switches[0]], one.switches),),
                moved=tuple(sorted(moved.items())),
                behind=(),
                switching=one.switches[0],
                source=-1,
            )

    def _behind(self, one: Charging) -> list[int]:
        """Return the inner nodes that pull networks may tie to a node while it precharges."""
        links, known = self._division.links_at, frozenset({one.condition})
        found: list[int] = []
        waiting = [one.node]
        while waiting:
            for link in links.get(waiting.pop(), ()):
                for far in link.ends:
                    is_inner = isinstance(link.owner, Driver) and far not in (*found, one.node)
                    closes = link.condition is None or consistent(known, (link.condition,))
                    if is_inner and closes is not None:
                        found.append(far)
                        waiting.append(far)
        return found

    def _towards(
        self, node: int, supply: int, arcs: dict[StageArc, None]
    ) -> Iterator[tuple[Cube, bool]]:
        """Add the arcs that pull a node to a supply; yield when each route does, and if weakly."""
        for route in self._router.routes(node):
            for way in route.driver.ways(supply):
                cube = consistent(route.cube, way.cube)
                if cube is None:
                    continue
                depth = self._depths(route, len(way.path))
                sets = self._router.beside(depth, route, way, supply)
                if not sets:
                    continue
                self._note_direction(route)
                alone = any(0 not in nodes.values() for nodes in sets)
                yield cube, alone and self._is_weak(route, supply)
                for arc in self._arcs(route, way, supply, sets):
                    arcs.setdefault(arc)

    def _depths(self, route: Route, below: int) -> dict[int, int]:
        """Return how many steps, from the supply, charge each node of a route."""
        last = len(route.nodes) - 1
        return {node: below + last - place for place, node in enumerate(route.nodes)}

    def _arcs(
        self, route: Route, way: Way, supply: int, sets: list[dict[int, int]]
    ) -> Iterator[StageArc]:
        passes = [Step(self._part_of[p.switches[0]], p.switches) for p in self._passes(route)]
        places = zip(way.path, *way.beside, strict=True)
        steps = (*passes, *(Step(self._part_of[some[0]], some) for some in places))
        rising, switches = supply == HIGH, self._division.network.switches
        source = route.driver.node if route.driver.is_outside else -1
        for nodes in sets:
            for switch, moved, behind in self._moves(route, way, nodes, rising=rising):
                by = None if switch < 0 else switches[switch]
                yield StageArc(
                    part=steps[-1].part if by is None else self._part_of[switch],
                    input=source if by is None else by.gate,
                    output=route.nodes[0],
                    input_rising=rising if by is None else by.polarity == "n",
                    rising=rising,
                    steps=steps,
                    moved=tuple(sorted(moved.items())),
                    behind=behind,
                    switching=switch,
                    source=source,
                )

    def _moves(
        self, route: Route, way: Way, nodes: dict[int, int], *, rising: bool
    ) -> Iterator[tuple[int, dict[int, int], tuple[tuple[int, int], ...]]]:
        """Yield the switches that start a move, -1 for the outside, and the nodes that move.

        Those behind a switch of the idle pull are named once more with that switch.
        """
        switches = self._division.network.switches
        moving = {node: depth for node, depth in nodes.items() if depth}
        if route.driver.is_outside:
            yield -1, moving, ()
        for arc in route.driver.arcs:
            if arc.path == way.path and arc.rising == rising:
                moved = (place for one in arc.ways for place in one.moved)
                inner = {node: d for node, d in moved if node != route.driver.node}
                switching = next(i for i in arc.path if switches[i].gate == arc.input)
                yield switching, moving | inner, arc.behind
        depth = self._depths(route, len(way.path))
        for place, one in enumerate(self._passes(route)):
            least = depth[route.nodes[place]]
            for switch in one.switches:
                if switches[switch].gate >= 0:
                    yield switch, {node: d for node, d in moving.items() if d >= least}, ()

    def _passes(self, route: Route) -> list[Pass]:
        return [self._division.passes[index] for index in route.passes]

    def _is_weak(self, route: Route, supply: int) -> bool:
        """Tell whether a pass on a route conducts only through the polarity that passes weakly."""
        return any(not (one.p if supply == HIGH else one.n) for one in self._passes(route))

    def _note_direction(self, route: Route) -> None:
        for place, index in enumerate(route.passes):
            self._ways_taken.add((index, route.nodes[place]))

    def _both_ways(self) -> tuple[int, ...]:
        """Return the parts that pass signals in both directions."""
        return tuple(
            self._part_of[one.switches[0]]
            for index, one in enumerate(self._division.passes)
            if all((index, end) in self._ways_taken for end in one.ends)
        )

    def _columns(self) -> tuple[tuple[int, ...], ...]:
        """Return the devices of each part; those that never conduct go with a neighbour."""
        network = self._division.network
        owner = [self._part_of.get(index, -1) for index in network.switch_of_device]
        at_net: dict[int, int] = {}
        for device, part in zip(self._devices, owner, strict=True):
            for net in (device.a, device.b):
                if net >= 0 and part >= 0:
                    at_net.setdefault(net, part)
        for column, device in enumerate(self._devices):
            if owner[column] < 0:
                near = [at_net[net] for net in (device.a, device.b) if net in at_net]
                owner[column] = near[0] if near else 0
        return tuple(
            tuple(c for c, part in enumerate(owner) if part == wanted)
            for wanted in range(self._count)
        )

    def _parts(self, columns: tuple[tuple[int, ...], ...]) -> tuple[GateForm, ...]:
        """Return the parts as gates of their own: the whole where only an inner node is seen."""
        if isinstance(self._whole, GateForm):
            return (replace(self._whole, arcs=()),)
        told = [
            (some[0].node, _kind(some), _function(some), [i for d in some for i in d.switches])
            for some in self._groups
        ]
        for index, one in enumerate(self._division.passes):
            output = self._far_end(index, one)
            told.append((output, one.kind, self._passing(one, output), list(one.switches)))
        for charging in self._division.charging:
            level = ONE if charging.supply == HIGH else ZERO
            function = When(level, sum_of([frozenset({charging.condition})]))
            told.append((charging.node, PRECHARGE, function, list(charging.switches)))
        return tuple(self._gate(*part, some) for part, some in zip(told, columns, strict=True))

    def _gate(
        self,
        output: int,
        kind: str,
        function: Expression,
        indices: list[int],
        columns: tuple[int, ...],
    ) -> GateForm:
        """Return one part as a gate."""
        whole = self._division.network
        switches = tuple(whole.switches[index] for index in indices)
        inputs = tuple(dict.fromkeys(s.gate for s in switches if s.gate >= 0))
        return GateForm(
            drawn=tuple(self._devices[column] for column in columns),
            network=Network(switches, (), whole.node_of_net, inputs),
            output=output,
            pull_down=function.term if isinstance(function, Not) else ZERO,
            arcs=(),
            kind=kind,
            function=function,
        )

    def _far_end(self, index: int, one: Pass) -> int:
        """Return the end that a signal leaves a pass at: the one nearer to an output."""
        leaves = [end for end in one.ends if (index, end) in self._ways_taken]
        return leaves[0] if leaves else one.ends[1]

    def _passing(self, one: Pass, output: int) -> Expression:
        """Return what a pass does, as text: its other end, and when."""
        control = ONE if one.condition is None else sum_of([frozenset({one.condition})])
        return When(Literal(one.other(output)), control)


def _joined_drivers(drivers: Sequence[Driver]) -> list[list[Driver]]:
    """Group drivers into parts: transistors at one node that each pull one way are one part.

    Where they are many they are the rows of an array, and each is a part.
    """
    single: dict[int, list[Driver]] = {}
    for driver in drivers:
        if len(driver.switches) == 1 and not driver.always:
            single.setdefault(driver.node, []).append(driver)
    joined: list[list[Driver]] = []
    for driver in drivers:
        some = single.get(driver.node, [])
        if len(some) > _PARALLEL_MAX or driver not in some:
            joined.append([driver])
        elif driver is some[0]:
            joined.append(some)
    return joined


def _kind(drivers: Sequence[Driver]) -> str:
    """Return what one or several drivers of a node are called together."""
    kinds = {driver.kind for driver in drivers}
    return kinds.pop() if len(kinds) == 1 else "tri-state gate"


def _function(drivers: Sequence[Driver]) -> Expression:
    """Return what one or several drivers make of their inputs, and when they drive."""
    if len(drivers) == 1:
        return drivers[0].function
    up, down = ([w.cube for d in drivers for w in d.ways(s)] for s in (HIGH, LOW))
    if not down:
        return When(ONE, sum_of(up))
    if not up:
        return When(ZERO, sum_of(down))
    return Each((When(ZERO, sum_of(down)), When(ONE, sum_of(up))))
