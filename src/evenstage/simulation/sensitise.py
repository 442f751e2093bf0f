"""Values of the side inputs that let exactly one path switch.

A path is sensitised statically if every gate on it, its side inputs held, passes the edge on
(Roth, "Diagnosis of automata failures: a calculus and a method", IBM Journal of Research and
Development 10(4), 1966, for the idea of holding side inputs, from memory). Each gate offers the
values under which it does, slowest first; one net has one value for all gates, found by going back
where two gates disagree. Nets of the path itself have the values of before and after the edge.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.errors import SimulationError
from evenstage.simulation.choices import choices
from evenstage.simulation.ties import ties

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.simulation.choices import Choice, Edge, Levels
    from evenstage.simulation.groups import Groups
    from evenstage.simulation.ties import Ties


def side_inputs(
    groups: Groups,
    along: Sequence[int],
    edges: Mapping[int, Edge],
    decided: Mapping[int, bool] | None = None,
) -> Levels:
    """Return values of the side inputs that let a path switch, by net.

    Parameters
    ----------
    groups : Groups
    along : sequence of int
        The groups along the path, each once.
    edges : mapping
        Of the nets on the path, its start first.
    decided : mapping, optional
        What nets are worth that a vector decides.

    Raises
    ------
    SimulationError
        ``cannot-switch`` where there are none.
    """
    start = next(iter(edges))
    fixed = decided or {}
    offers = [choices(groups, group, edges, fixed, start=start) for group in along]
    for group, offered in zip(along, offers, strict=True):
        if not offered:
            raise _cannot(groups, group, edges)
    beside = {net for offered in offers for choice in offered[:1] for net in choice.levels}
    found = _agreed(offers, ties(groups, sorted(beside)))
    if found is None:
        raise SimulationError(
            "no values of the side inputs let exactly this path switch: two of its gates need"
            " different ones of the same net; it may be a false path, to be left out with"
            " [[ignore]] in the brief",
            code="cannot-switch",
        )
    heard = {net: fixed[net] for group in along for net in groups.inputs(group) if net in fixed}
    return {net: level for net, level in heard.items() if net not in edges} | found


def _cannot(groups: Groups, group: int, edges: Mapping[int, Edge]) -> SimulationError:
    circuit = groups.circuit
    gates = set(circuit.gate_of_device[groups.devices(group)].tolist())
    gate = max(gates)
    place = f"'{circuit.gate_name(gate)}' ({circuit.gate_function(gate)})"
    if len(gates) > 1:
        driven = [net for net in edges if groups.of_net[net] == group]
        place = f"what drives net '{circuit.devices.net_names[driven[-1]]}'"
    return SimulationError(
        f"the path cannot switch at {place}:"
        " its side inputs on the path itself hold it; it may be a false path, to be left out with"
        " [[ignore]] in the brief",
        code="cannot-switch",
    )


def _agreed(offers: list[list[Choice]], tied: Ties) -> Levels | None:
    """Return one choice of each gate, the first that agree, as values by net.

    Nets that are tied to each other agree as one net does.
    """
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
        levels = known | offered[fitting].levels
        held.append(tied.spread(levels) | levels)
        tried.append(0)
    return held[-1]


def _fits(levels: Levels, known: Levels) -> bool:
    return all(known.get(net, level) == level for net, level in levels.items())
