"""Values of the side inputs that let exactly one path switch.

A path is sensitised statically if every gate on it, its side inputs held, passes the edge on
(Roth, "Diagnosis of automata failures: a calculus and a method", IBM Journal of Research and
Development 10(4), 1966, for the idea of holding side inputs, from memory). Each gate offers the
values under which it does, slowest first; one net has one value for all gates, found by going back
where two gates disagree. Nets of the path itself have the values of before and after the edge.

Which values are slowest is judged as the estimate does: by the Elmore delay of all nodes that have
to move through the devices that conduct after the edge.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.errors import SimulationError
from evenstage.simulation.logic import switches

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.logic import Switches

Levels = dict[int, bool]
"""Values by net."""

Edge = tuple[bool, bool]
"""What a net is worth before and after."""

#: Gates with more side inputs than this have their first so many varied, the others held low.
_VARIED_MOST: Final = 10

#: A conductance that keeps nodes without any apart from the others, S.
_LEAK: Final = 1e-12


@dataclass(frozen=True)
class Choice:
    """Side inputs of one gate under which it passes the edge, and how slowly it does, s."""

    levels: Levels
    slowness: float


def side_inputs(
    circuit: Circuit, gates: list[int], outputs: list[int], edges: Mapping[int, Edge]
) -> Levels:
    """Return values of the side inputs that let a path switch, by net.

    Parameters
    ----------
    circuit : Circuit
    gates, outputs : list of int
        Gates along the path, and the net each of them drives.
    edges : mapping
        Of the nets on the path, its start included.

    Raises
    ------
    SimulationError
        ``cannot-switch`` where there are none.
    """
    offers = [
        choices(circuit, gate, output, edges) for gate, output in zip(gates, outputs, strict=True)
    ]
    for gate, offered in zip(gates, offers, strict=True):
        if not offered:
            raise _cannot(circuit, gate)
    found = _agreed(offers)
    if found is None:
        raise SimulationError(
            "no values of the side inputs let exactly this path switch: two of its gates need"
            " different ones of the same net; it may be a false path, to be left out with"
            " [[ignore]] in the brief",
            code="cannot-switch",
        )
    return found


def _cannot(circuit: Circuit, gate: int) -> SimulationError:
    return SimulationError(
        f"the path cannot switch at '{circuit.gate_name(gate)}' ({circuit.gate_function(gate)}):"
        " its side inputs on the path itself hold it; it may be a false path, to be left out with"
        " [[ignore]] in the brief",
        code="cannot-switch",
    )


def _agreed(offers: list[list[Choice]]) -> Levels | None:
    """Return one choice of each gate, the first that agree, as values by net."""
    held: list[Levels] = [{}]
    tried = [0]
    while len(held) <= len(offers):
        at = len(held) - 1
        offered, known = offers[at], held[-1]
        fitting = next(
            (i for i in range(tried[-1], len(offered)) if _fits(offered[i].levels, known)), None
        )
        if fitting is None:
            held.pop()
            tried.pop()
            if not held:
                return None
            continue
        tried[-1] = fitting + 1
        held.append(known | offered[fitting].levels)
        tried.append(0)
    return held[-1]


def _fits(levels: Levels, known: Levels) -> bool:
    return all(known.get(net, level) == level for net, level in levels.items())


def choices(
    circuit: Circuit,
    gate: int,
    output: int,
    edges: Mapping[int, Edge],
    held: Mapping[int, bool] | None = None,
) -> list[Choice]:
    """Return the values of a gate's side inputs under which it passes the edge on, slowest first.

    Parameters
    ----------
    circuit : Circuit
    gate, output : int
    edges : mapping
        Of nets that switch; where the output is among them it must do as they say.
    held : mapping, optional
        Values of nets that are decided already.
    """
    part = switches(circuit, circuit.gate_devices(gate))
    inputs = gate_inputs(circuit, gate, part)
    decided = held or {}
    side = [net for net in inputs if net not in edges and net not in decided]
    vectors = _vectors(len(side))
    before, after = (
        _given(
            circuit, part, {net: edge[i] for net, edge in edges.items() if net in inputs}, decided
        )
        for i in (0, 1)
    )
    rows = np.searchsorted(part.net, side)
    worth = [np.repeat(one[:, None], vectors.shape[1], axis=1) for one in (before, after)]
    for one in worth:
        one[rows] = vectors
    settled = [part.settle(one) for one in worth]
    at = int(np.searchsorted(part.net, output))
    was, now = (one[at] for one in settled)
    passes = (
        (was == 1 - now)
        if output not in edges
        else ((was == edges[output][0]) & (now == edges[output][1]))
    )
    found = np.flatnonzero(passes)
    if not len(found):
        return []
    slowness = _slowness(
        circuit, circuit.gate_devices(gate), part, [o[:, found] for o in settled], at
    )
    order = np.lexsort((found, -slowness))
    return [
        Choice(
            {net: bool(vectors[row, found[i]]) for row, net in enumerate(side)},
            float(slowness[i]),
        )
        for i in order.tolist()
    ]


def gate_inputs(circuit: Circuit, gate: int, part: Switches) -> list[int]:
    """Return the nets that decide what a gate does, ascending.

    Those on its transistors' gates, and channel ends that come from elsewhere: from another gate or
    from a port.
    """
    nets, driver = part.net, circuit.driver_of_net[part.net]
    on_gate = np.isin(np.arange(len(nets)), part.gate)
    foreign = (driver >= 0) | np.isin(nets, np.array(circuit.devices.ports, int))
    wanted = (on_gate | foreign) & (driver != gate) & ~circuit.supplies.is_supply[nets]
    return [int(net) for net in nets[wanted]]


def _vectors(count: int) -> BoolArray:
    """Return vectors of some inputs, shape (inputs, vectors); rows beyond the limit are low."""
    varied = min(count, _VARIED_MOST)
    table = (np.arange(1 << varied) >> np.arange(varied)[:, None] & 1).astype(bool)
    rest = np.zeros((count - varied, table.shape[1]), bool)
    return np.concatenate([table, rest])


def _given(
    circuit: Circuit, part: Switches, levels: Mapping[int, bool], held: Mapping[int, bool]
) -> FloatArray:
    """Return what is given of a part's nodes, NaN for what is not, shape (nodes,)."""
    worth = np.full(len(part.net), np.nan)
    worth[circuit.supplies.is_high[part.net]] = 1.0
    worth[circuit.supplies.is_low[part.net]] = 0.0
    for net, level in (*held.items(), *levels.items()):
        row = int(np.searchsorted(part.net, net))
        if row < len(part.net) and part.net[row] == net:
            worth[row] = float(level)
    return worth


def _slowness(
    circuit: Circuit, devices: IntArray, part: Switches, worth: list[FloatArray], output: int
) -> FloatArray:
    """Return the Elmore delay to the output after the edge, s, shape (vectors,)."""
    before, after = worth
    nodes, vectors = after.shape
    values = circuit.electrical
    given = circuit.supplies.is_supply[part.net] | (part.net != part.net[output]) & np.isin(
        np.arange(nodes), part.gate
    )
    conductance = part.closed(after) / values.resistance.today[devices][:, None]
    # The part of each device in the matrix, as one long row, so that a product adds them up.
    element = np.zeros((len(devices), nodes, nodes))
    device = np.arange(len(devices))
    for a, b in ((part.drain, part.source), (part.source, part.drain)):
        element[device, a, a] += 1.0
        element[device, a, b] -= 1.0
    free = np.flatnonzero(~given)
    inner = np.tensordot(conductance.T, element[:, free[:, None], free], axes=1)
    inner[:, np.arange(len(free)), np.arange(len(free))] += _LEAK
    right = np.broadcast_to((free == output).astype(float)[:, None], (vectors, len(free), 1))
    shared = np.linalg.solve(inner, right)[:, :, 0]
    cap = np.zeros(nodes)
    np.add.at(cap, part.drain, values.drain.today[devices])
    np.add.at(cap, part.source, values.source.today[devices])
    cap[output] += circuit.net_cap[part.net[output]]
    moved = (before != after)[free]
    result: FloatArray = (shared * cap[free] * moved.T).sum(axis=1)
    return result
