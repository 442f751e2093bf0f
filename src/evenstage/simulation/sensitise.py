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
    from collections.abc import Mapping, Sequence

    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.simulation.groups import Groups
    from evenstage.simulation.logic import Switches

Levels = dict[int, bool]
"""Values by net."""

Edge = tuple[bool, bool]
"""What a net is worth before and after."""

#: Groups with more side inputs than this have their first so many varied, the others held low.
_VARIED_MOST: Final = 12

#: A conductance that keeps nodes without any apart from the others, S.
_LEAK: Final = 1e-12


@dataclass(frozen=True)
class Choice:
    """Side inputs of one gate under which it passes the edge, and how slowly it does, s."""

    levels: Levels
    slowness: float


def side_inputs(groups: Groups, along: Sequence[int], edges: Mapping[int, Edge]) -> Levels:
    """Return values of the side inputs that let a path switch, by net.

    Parameters
    ----------
    groups : Groups
    along : sequence of int
        The groups along the path, each once.
    edges : mapping
        Of the nets on the path, its start first.

    Raises
    ------
    SimulationError
        ``cannot-switch`` where there are none.
    """
    start = next(iter(edges))
    offers = [choices(groups, group, edges, start=start) for group in along]
    for group, offered in zip(along, offers, strict=True):
        if not offered:
            raise _cannot(groups, group)
    found = _agreed(offers)
    if found is None:
        raise SimulationError(
            "no values of the side inputs let exactly this path switch: two of its gates need"
            " different ones of the same net; it may be a false path, to be left out with"
            " [[ignore]] in the brief",
            code="cannot-switch",
        )
    return found


def _cannot(groups: Groups, group: int) -> SimulationError:
    circuit = groups.circuit
    gate = int(circuit.gate_of_device[groups.devices(group)].max())
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
    groups: Groups,
    group: int,
    edges: Mapping[int, Edge],
    held: Mapping[int, bool] | None = None,
    *,
    start: int | None = None,
) -> list[Choice]:
    """Return the values of a group's side inputs under which it passes the edge on, slowest first.

    Parameters
    ----------
    groups : Groups
    group : int
    edges : mapping
        Of nets that switch. Those of the group must do as they say; where it has none, any of its
        nets has to switch.
    held : mapping, optional
        Values of nets that are decided already.
    start : int, optional
        A net that is driven from outside, whatever else drives it.
    """
    circuit, devices = groups.circuit, groups.devices(group)
    part = switches(circuit, devices)
    decided = held or {}
    # What the path drives in the group is no input of it, whatever else it may be.
    driven = {net for net in edges if groups.of_net[net] == group} - {start}
    inputs = [net for net in groups.inputs(group, start) if net not in driven]
    side = [net for net in inputs if net not in edges and net not in decided]
    vectors = _vectors(len(side))
    rows = np.searchsorted(part.net, side)
    settled = []
    for place in (0, 1):
        known = {net: edges[net][place] for net in inputs if net in edges}
        one = _given(circuit, part, known, decided)
        worth = np.repeat(one[:, None], vectors.shape[1], axis=1)
        worth[rows] = vectors
        settled.append(part.settle(worth))
    own = groups.of_net[part.net] == group
    wanted = [
        (row, edges[net])
        for row, net in enumerate(part.net.tolist())
        if own[row] and net in edges and net != start
    ]
    if wanted:
        passes = np.ones(vectors.shape[1], bool)
        for row, edge in wanted:
            passes &= (settled[0][row] == edge[0]) & (settled[1][row] == edge[1])
        outputs = [row for row, _ in wanted]
    else:
        moves = own[:, None] & (settled[0] == 1 - settled[1])
        passes = moves.any(axis=0)
        outputs = [int(np.flatnonzero(own)[0])]
    found = np.flatnonzero(passes & _together(groups, part, inputs, edges, settled[0]))
    if not len(found):
        return []
    given = ~own | np.isin(part.net, inputs)
    slowness = _slowness(circuit, devices, part, [o[:, found] for o in settled], outputs[-1], given)
    order = np.lexsort((found, -slowness))
    return [
        Choice(
            {net: bool(vectors[row, found[i]]) for row, net in enumerate(side)},
            float(slowness[i]),
        )
        for i in order.tolist()
    ]


def _together(
    groups: Groups,
    part: Switches,
    inputs: Sequence[int],
    edges: Mapping[int, Edge],
    worth: FloatArray,
) -> BoolArray:
    """Tell under which vectors inputs go together, as s and !s.

    Where one gate makes one of the other, or transmission gates take them for complements.
    """
    fitting = np.ones(worth.shape[1], bool)
    still = [net for net in inputs if net not in edges]
    for net in still:
        maker = int(groups.of_net[net])
        causes = groups.inputs(maker) if len(groups.devices(maker)) else []
        if len(causes) != 1 or causes[0] not in still:
            continue
        inner = switches(groups.circuit, groups.devices(maker))
        known = [_given(groups.circuit, inner, {causes[0]: level}, {}) for level in (False, True)]
        answer = inner.settle(np.stack(known, axis=1))[np.searchsorted(inner.net, net)]
        cause, effect = worth[np.searchsorted(part.net, [causes[0], net])]
        fitting &= effect == np.where(cause == 1, answer[1], answer[0])
    for pair in groups.complements:
        if all(net in still for net in pair):
            one, other = worth[np.searchsorted(part.net, pair)]
            fitting &= one != other
    return fitting


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
    circuit: Circuit,
    devices: IntArray,
    part: Switches,
    worth: list[FloatArray],
    output: int,
    given: BoolArray,
) -> FloatArray:
    """Return the Elmore delay to the output after the edge, s, shape (vectors,)."""
    before, after = worth
    nodes, vectors = after.shape
    values = circuit.electrical
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
