"""How strong keepers and loads are against what must overpower them.

A keeper or load that conducts against a pull makes a divider of the two: the output only gets to
``pull / (pull + held)`` of the supply. With a load `LOAD_RATIO` times as resistive as the pull it
stays below a quarter of the supply, as the 4:1 ratio of pseudo-nMOS gates is meant to ensure
(Sutherland, Sproull and Harris, Logical Effort, 1999, section 10.1, from memory); against a keeper,
which gives way once the output has crossed half of the supply, `KEEPER_RATIO` leaves as much again
in hand (common practice, no source).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.gate_arcs import arcs_of
from evenstage.circuit.network import LOW
from evenstage.circuit.stage_tables import stage_arcs
from evenstage.errors import Notice

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.gate import Weak
    from evenstage.circuit.stage_tables import AlikeStages
    from evenstage.circuit.tables import AlikeGates
    from evenstage.netlist.devices import FloatArray, IntArray

LOAD_RATIO = 3.0
"""Least resistance of a load over that of the pull against it."""
KEEPER_RATIO = 2.0
"""Least resistance of a keeper over that of the pull against it."""
_NAMES_MAX = 1000


def ratio_notices(circuit: Circuit) -> list[Notice]:
    """Name the gates whose keeper or load is too strong to be overpowered safely."""
    poor: dict[bool, list[tuple[IntArray, FloatArray]]] = {True: [], False: []}
    for some in circuit.alike:
        for weak in some.form.weak:
            ratio = ratios(circuit, some, weak)
            least = KEEPER_RATIO if weak.is_keeper else LOAD_RATIO
            poor[weak.is_keeper].append((some.gates[ratio < least], ratio[ratio < least]))
    notices = _beside_passes(circuit)
    for is_keeper, parts in poor.items():
        gates = np.concatenate([np.zeros(0, np.int32), *(gates for gates, _ in parts)])
        if not len(gates):
            continue
        ratio = np.concatenate([ratio for _, ratio in parts])
        what, least = ("keeper", KEEPER_RATIO) if is_keeper else ("load", LOAD_RATIO)
        names = tuple(circuit.gate_name(gate) for gate in np.unique(gates)[:_NAMES_MAX].tolist())
        count = len(np.unique(gates))
        verb = "gate has a" if count == 1 else "gates have a"
        notices.append(
            Notice(
                f"strong-{what}",
                f"{count} {verb} {what} too strong for what pulls against it: its resistance "
                f"is {ratio.min():.2g} times that of the pull, at least {least:g} are wanted",
                names=names,
            )
        )
    return notices


def _beside_passes(circuit: Circuit) -> list[Notice]:
    """Return a notice where keepers of nets that passes drive are too strong, naming the nets."""
    nets, ratio = [np.zeros(0, np.int32)], [np.zeros(0)]
    for some in circuit.stages:
        for weak in some.form.weak:
            found = stage_ratios(circuit, some, weak)
            nets.append(some.nets[found < KEEPER_RATIO, weak.node])
            ratio.append(found[found < KEEPER_RATIO])
    every = np.unique(np.concatenate(nets))
    if not len(every):
        return []
    what = "net has a keeper" if len(every) == 1 else "nets have keepers"
    least = np.concatenate(ratio).min()
    return [
        Notice(
            "strong-keeper",
            f"{len(every)} {what} too strong for what drives them through passes: the resistance "
            f"of the keeper is {least:.2g} times that of the route against it, at least "
            f"{KEEPER_RATIO:g} are wanted",
            names=tuple(circuit.devices.net_names[net] for net in every[:_NAMES_MAX].tolist()),
        )
    ]


def stage_ratios(circuit: Circuit, some: AlikeStages, weak: Weak) -> FloatArray:
    """Return the resistance of a keeper over the largest of a route against it, shape (k,).

    Routes count from the node through their passes to the supply, or to the resistance of what
    drives from outside. Infinite where nothing drives against it.
    """
    held, count = _resistance(circuit, some.devices, weak), len(some.form.arcs)
    pull = np.zeros(len(held))
    if count:
        arcs = stage_arcs(some, circuit.electrical, circuit.drive)
        against = np.array(
            [a.output == weak.node and a.rising == (weak.supply == LOW) for a in some.form.arcs]
        )
        whole = np.where(against, arcs.output_resistance.reshape(-1, count), 0.0)
        pull = whole.max(axis=1)
    result: FloatArray = np.divide(held, pull, out=np.full(len(held), np.inf), where=pull > 0)
    return result


def _resistance(circuit: Circuit, devices: IntArray, weak: Weak) -> FloatArray:
    """Return the resistance of a keeper or load in each gate or stage, ohm, shape (k,)."""
    own = circuit.electrical.resistance.today[devices]
    return sum(
        (1 / (1 / own[:, list(parallel)]).sum(axis=1) for parallel in weak.devices),
        np.zeros(len(own)),
    )


def ratios(circuit: Circuit, some: AlikeGates, weak: Weak) -> FloatArray:
    """Return the resistance of a keeper or load over the largest of a pull against it, shape (k,).

    Infinite where nothing pulls against it.
    """
    held = _resistance(circuit, some.devices, weak)
    arcs = arcs_of((some,), circuit.electrical, circuit.wire_cap + circuit.apart_cap)
    pull = np.zeros(len(held))
    against = arcs.rising == (weak.supply == LOW)
    row = np.searchsorted(some.gates, arcs.gate[against])
    np.maximum.at(pull, row, arcs.output_resistance[against])
    mine = pull
    if not weak.is_keeper:
        # Arcs are slowed by their load already: 1 / net = 1 / pull - 1 / load.
        mine = mine * held / (mine + held)
    result: FloatArray = np.divide(held, mine, out=np.full(len(held), np.inf), where=mine > 0)
    return result
