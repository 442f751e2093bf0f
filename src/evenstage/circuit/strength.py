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
from evenstage.errors import Notice

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.gate import Weak
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
    notices = []
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


def ratios(circuit: Circuit, some: AlikeGates, weak: Weak) -> FloatArray:
    """Return the resistance of a keeper or load over the largest of a pull against it, shape (k,).

    Infinite where nothing pulls against it.
    """
    own = circuit.electrical.resistance.today[some.devices]
    held = sum(
        (1 / (1 / own[:, list(parallel)]).sum(axis=1) for parallel in weak.devices),
        np.zeros(len(own)),
    )
    arcs = arcs_of((some,), circuit.electrical, circuit.wire_cap + circuit.apart_cap)
    pull = np.zeros(len(own))
    against = arcs.rising == (weak.supply == LOW)
    row = np.searchsorted(some.gates, arcs.gate[against])
    np.maximum.at(pull, row, arcs.output_resistance[against])
    mine = pull
    if not weak.is_keeper:
        # Arcs are slowed by their load already: 1 / net = 1 / pull - 1 / load.
        mine = mine * held / (mine + held)
    result: FloatArray = np.divide(held, mine, out=np.full(len(held), np.inf), where=mine > 0)
    return result
