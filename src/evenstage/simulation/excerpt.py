"""The part of a circuit that a path's simulation needs, and what is given at its edges."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.simulation.choices import choices
from evenstage.simulation.following import followers
from evenstage.simulation.layout import LOW, OUTSIDE, lay_out
from evenstage.simulation.logic import moving, part_of
from evenstage.simulation.parameters import known_channels
from evenstage.simulation.ramps import Ramps
from evenstage.simulation.sensitise import side_inputs

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.choices import Edge, Levels
    from evenstage.simulation.groups import Groups
    from evenstage.simulation.layout import Layout
    from evenstage.simulation.parameters import Parameters
    from evenstage.timing.results import Path


#: Side branches of more transistors are taken as capacitances.
_SIDE_MOST: Final = 100


@dataclass(frozen=True, kw_only=True)
class Route:
    """A path in ids: its nets, start included, what they do, and the group that drives each.

    ``groups`` stand beside the nets after the start; see `evenstage.simulation.groups`. ``beside``
    are the groups of nets that move along; ``edges`` tells what these do too.
    """

    nets: tuple[int, ...]
    edges: dict[int, Edge]
    groups: tuple[int, ...]
    beside: tuple[int, ...] = ()


@dataclass(frozen=True, kw_only=True)
class Excerpt:
    """A path with its side branches, ready to be integrated.

    Parameters
    ----------
    route : Route
    layout : Layout
    ramps : Ramps
    initial : FloatArray, V, shape (unknown,)
    watched : tuple of int
        Node at which each net of the route is seen: where the next gate's switching transistors
        hang, and where the last net's name is.
    held : dict of int to bool
        Side inputs and what they are held at.
    side_gates : int
        Gates off the path that are simulated as such.
    """

    route: Route
    layout: Layout
    ramps: Ramps
    initial: FloatArray
    watched: tuple[int, ...]
    held: Levels
    side_gates: int


def route_of(groups: Groups, path: Path) -> Route:
    """Return the ids of a path's nets and groups."""
    circuit = groups.circuit
    names = [path.start, *(stage.output for stage in path.stages)]
    rising = [path.start_edge == "rise", *(stage.edge == "rise" for stage in path.stages)]
    nets = [net for name in names if (net := circuit.net_id(name)) is not None]
    edges = {net: (not rises, rises) for net, rises in zip(nets, rising, strict=True)}
    along = tuple(int(groups.of_net[net]) for net in nets[1:])
    more, beside = followers(groups, along, edges)
    return Route(nets=tuple(nets), edges=edges | more, groups=along, beside=beside)


def excerpt(
    groups: Groups,
    parameters: Parameters,
    route: Route,
    *,
    transition: float,
    drive: float,
    with_gates: bool,
    decided: Levels | None = None,
) -> Excerpt:
    """Cut a path out of a circuit.

    Parameters
    ----------
    groups : Groups
        Of the circuit.
    parameters : Parameters
    route : Route
    transition : float
        s; of the ramp at the start, which begins at time 0.
    drive : float
        ohm; resistance of the outside driver.
    with_gates : bool
        Whether side branches are simulated as gates; else they are capacitances.
    decided : dict of int to bool, optional
        What nets are worth that a vector decides.

    Raises
    ------
    SimulationError
        ``cannot-switch``, see `side_inputs`.
    """
    circuit, along = groups.circuit, tuple(dict.fromkeys((*route.groups, *route.beside)))
    told = decided or {}
    held = side_inputs(groups, along, route.edges, told)
    side: list[int] = []
    if with_gates:
        side, held = _side_groups(groups, route, held, told, loads_start=drive > 0)
    devices = np.concatenate([groups.devices(group) for group in (*along, *side)])
    levels = {net: (level, level) for net, level in held.items()} | _bulks(circuit, devices)
    start = route.nets[0]
    constant = np.array(sorted(levels), np.int64)
    layout = lay_out(circuit, parameters, devices, constant, start, drive=drive)
    levels |= {LOW: (False, False), OUTSIDE: route.edges[start], start: route.edges[start]}
    return Excerpt(
        route=route,
        layout=layout,
        ramps=_ramps(circuit, layout, levels, transition),
        initial=_initial(groups, layout, route, levels),
        watched=_watched(groups, route, layout),
        held=held,
        side_gates=len(side),
    )


def _watched(groups: Groups, route: Route, layout: Layout) -> tuple[int, ...]:
    """Return the node at which each net of a route is seen; the start where it is driven."""
    block, places = groups.circuit.devices, layout.places
    is_n = np.array([model.polarity == "n" for model in block.models], bool)[block.model]
    found = [int(places.named[route.nets[0]])]
    for net, group in zip(route.nets[1:], (*route.groups[1:], None), strict=True):
        place = int(places.named[net])
        if group is not None:
            own = groups.devices(group)
            own = own[block.gate[own] == net]
            switching = own[is_n[own] == route.edges[net][1]]
            among = switching if len(switching) else own
            place = int(places.gate[among[0]]) if len(among) else place
        found.append(place)
    return tuple(layout.node(place) for place in found)


def _side_groups(
    groups: Groups, route: Route, held: Levels, told: Levels, *, loads_start: bool
) -> tuple[list[int], Levels]:
    """Return the groups that hang on the path, and all values held, theirs included.

    One that drives a net which is held, or an input of which another of them drives, or that is
    very large, is left to be a capacitance.
    """
    block, on_path = groups.circuit.devices, route.nets if loads_start else route.nets[1:]
    found: list[int] = []
    for group in np.unique(groups.of_device[np.isin(block.gate, on_path)]).tolist():
        if group < 0 or group in route.groups or group in route.beside:
            continue
        inputs = groups.inputs(group)
        heard = {net: told[net] for net in inputs if net in told and net not in route.edges}
        driven = {int(groups.of_net[net]) for net in inputs if net not in route.edges}
        holds = any(int(groups.of_net[net]) == group for net in held)
        if holds or driven & set(found) or len(groups.devices(group)) > _SIDE_MOST:
            continue
        held = heard | held
        offered = choices(groups, group, route.edges, held)
        rest = dict.fromkeys((n for n in inputs if n not in held and n not in route.edges), False)
        held = held | (offered[0].levels if offered else rest)
        found.append(group)
    return found, held


def _bulks(circuit: Circuit, devices: IntArray) -> dict[int, Edge]:
    """Return the bulks that are no supplies: n at the low, p at the high supply."""
    block = circuit.devices
    is_p = np.array([model.polarity == "p" for model in block.models], bool)[block.model[devices]]
    own = ~circuit.supplies.is_supply[block.bulk[devices]]
    ends = np.concatenate([block.drain[devices], block.source[devices]])
    own &= ~np.isin(block.bulk[devices], ends)
    nets, levels = block.bulk[devices][own].tolist(), is_p[own].tolist()
    return {net: (level, level) for net, level in zip(nets, levels, strict=True)}


def _ramps(circuit: Circuit, layout: Layout, levels: dict[int, Edge], transition: float) -> Ramps:
    nets = layout.net[layout.equations.unknown :].tolist()
    high = circuit.supplies.is_high
    edges = [levels.get(net, (bool(high[net]), bool(high[net]))) for net in nets]
    before, after = np.array(edges, float).T * circuit.process.supply
    shape = np.ones(len(nets))
    return Ramps(before, after, 0.0 * shape, transition * shape)


def _initial(groups: Groups, layout: Layout, route: Route, levels: dict[int, Edge]) -> FloatArray:
    """Return where the unknown nodes stand before the edge.

    A node that nothing joins to a supply keeps a charge nobody knows; it gets the one that has to
    be moved by the edge.
    """
    circuit, part = groups.circuit, part_of(groups.every, layout.devices)
    # Stored values decide what others are worth, so the path's own nets are told, too.
    told = moving({**levels, **route.edges})
    before, after = np.moveaxis(part.evaluate(told).values[:, :, 0], 1, 0)
    before = np.where(before >= 0, before, np.where(after >= 0, 1 - after, 0))
    given = (part.switches.supply >= 0) | np.isin(part.net, [*levels])
    supply, known = circuit.process.supply, known_channels(circuit.process)
    bounds = {
        kind.polarity: one.threshold or 0.0
        for kind, one in zip(circuit.process.transistors, known, strict=True)
    }
    voltage = part.voltages(before, given, supply, (bounds["n"], bounds["p"]))
    initial = np.zeros(layout.equations.unknown)
    unknown = layout.net[: layout.equations.unknown]
    row = np.minimum(np.searchsorted(part.net, unknown), len(part.net) - 1)
    met = part.net[row] == unknown
    initial[met] = voltage[row[met]]
    return initial
