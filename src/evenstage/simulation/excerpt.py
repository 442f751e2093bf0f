"""The part of a circuit that a path's simulation needs, and what is given at its edges."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import SimulationError
from evenstage.simulation.layout import LOW, OUTSIDE, lay_out
from evenstage.simulation.logic import switches
from evenstage.simulation.parameters import known_channels
from evenstage.simulation.ramps import Ramps
from evenstage.simulation.sensitise import choices, gate_inputs, side_inputs

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.layout import Layout
    from evenstage.simulation.parameters import Parameters
    from evenstage.simulation.sensitise import Edge, Levels
    from evenstage.timing.results import Path


@dataclass(frozen=True, kw_only=True)
class Route:
    """A path in ids: its nets, start included, what they do, and the gates between them."""

    nets: tuple[int, ...]
    edges: dict[int, Edge]
    gates: tuple[int, ...]


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


def route_of(circuit: Circuit, path: Path) -> Route:
    """Return the ids of a path's nets and gates."""
    names = [path.start, *(stage.output for stage in path.stages)]
    rising = [path.start_edge == "rise", *(stage.edge == "rise" for stage in path.stages)]
    nets = [net for name in names if (net := circuit.net_id(name)) is not None]
    return Route(
        nets=tuple(nets),
        edges={net: (not rises, rises) for net, rises in zip(nets, rising, strict=True)},
        gates=tuple(int(circuit.driver_of_net[net]) for net in nets[1:]),
    )


def excerpt(
    circuit: Circuit,
    parameters: Parameters,
    route: Route,
    *,
    transition: float,
    drive: float,
    with_gates: bool,
) -> Excerpt:
    """Cut a path out of a circuit.

    Parameters
    ----------
    circuit : Circuit
    parameters : Parameters
    route : Route
    transition : float
        s; of the ramp at the start, which begins at time 0.
    drive : float
        ohm; resistance of the outside driver.
    with_gates : bool
        Whether side branches are simulated as gates; else they are capacitances.

    Raises
    ------
    SimulationError
        ``cannot-switch``, see `side_inputs`, or where pass transistors are on the path.
    """
    _refuse_stages(circuit, route)
    held = side_inputs(circuit, list(route.gates), list(route.nets[1:]), route.edges)
    side: list[int] = []
    if with_gates:
        side, held = _side_gates(circuit, route, held, loads_start=drive > 0)
    devices = np.concatenate([circuit.gate_devices(gate) for gate in (*route.gates, *side)])
    levels = {net: (level, level) for net, level in held.items()} | _bulks(circuit, devices)
    start = route.nets[0]
    constant = np.array(sorted(levels), np.int64)
    layout = lay_out(circuit, parameters, devices, constant, start, drive=drive)
    levels |= {LOW: (False, False), OUTSIDE: route.edges[start], start: route.edges[start]}
    return Excerpt(
        route=route,
        layout=layout,
        ramps=_ramps(circuit, layout, levels, transition),
        initial=_initial(circuit, layout, levels),
        watched=_watched(circuit, route, layout),
        held=held,
        side_gates=len(side),
    )


def _refuse_stages(circuit: Circuit, route: Route) -> None:
    """Refuse paths through stages of several gates: what they are tied to is not cut out."""
    for gate in route.gates:
        if circuit.is_part[gate]:
            raise SimulationError(
                f"'{circuit.gate_name(gate)}' ({circuit.gate_function(gate)}) is part of a stage of"
                " several gates, as around pass transistors; such paths are not simulated: simulate"
                " the written netlist with the foundry's models",
                code="cannot-switch",
            )


def _watched(circuit: Circuit, route: Route, layout: Layout) -> tuple[int, ...]:
    """Return the node at which each net of a route is seen; the start where it is driven."""
    block, places = circuit.devices, layout.places
    is_n = np.array([model.polarity == "n" for model in block.models], bool)[block.model]
    found = [int(places.named[route.nets[0]])]
    for net, gate in zip(route.nets[1:], (*route.gates[1:], None), strict=True):
        place = int(places.named[net])
        if gate is not None:
            own = circuit.gate_devices(gate)
            own = own[block.gate[own] == net]
            switching = own[is_n[own] == route.edges[net][1]]
            among = switching if len(switching) else own
            place = int(places.gate[among[0]]) if len(among) else place
        found.append(place)
    return tuple(layout.node(place) for place in found)


def _side_gates(
    circuit: Circuit, route: Route, held: Levels, *, loads_start: bool
) -> tuple[list[int], Levels]:
    """Return the gates that hang on the path, and all values held, theirs included.

    A gate whose output is held, whose other inputs another such gate drives, or that is part of a
    stage of several, is left to be a capacitance.
    """
    on_path = route.nets if loads_start else route.nets[1:]
    loading = circuit.gate_of_device[np.isin(circuit.devices.gate, on_path)]
    found: list[int] = []
    driven: set[int] = set()
    for gate in np.unique(loading[loading >= 0]).tolist():
        if gate in route.gates or circuit.is_part[gate]:
            continue
        output = int(circuit.gate_output[gate])
        inputs = gate_inputs(circuit, gate, switches(circuit, circuit.gate_devices(gate)))
        if output in held or output in route.edges or driven & set(inputs):
            continue
        offered = choices(circuit, gate, output, route.edges, held)
        rest = dict.fromkeys((n for n in inputs if n not in held and n not in route.edges), False)
        if output in rest:
            continue
        held = held | (offered[0].levels if offered else rest)
        found.append(gate)
        driven.add(output)
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


def _initial(circuit: Circuit, layout: Layout, levels: dict[int, Edge]) -> FloatArray:
    """Return where the unknown nodes stand before the edge.

    A node that nothing joins to a supply keeps a charge nobody knows; it gets the one that has to
    be moved by the edge.
    """
    part = switches(circuit, layout.devices)
    worth = np.full((2, len(part.net)), np.nan)
    worth[:, circuit.supplies.is_high[part.net]] = 1.0
    worth[:, circuit.supplies.is_low[part.net]] = 0.0
    for place, net in enumerate(part.net.tolist()):
        if net in levels:
            worth[:, place] = levels[net]
    given = ~np.isnan(worth[0])
    before, after = (part.settle(one[:, None])[:, 0] for one in worth)
    before = np.where(np.isnan(before), np.where(np.isnan(after), 0.0, 1.0 - after), before)
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
