"""Circuits side by side, as the equations of one."""

from __future__ import annotations

from dataclasses import fields, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.simulation.channel import Channels
from evenstage.simulation.equations import Equations

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import IntArray


def with_load(equations: Equations, node: int, cap: float) -> Equations:
    """Return a circuit with one more capacitor (F) between a node and its last given one."""
    ground = equations.unknown + equations.given - 1
    return replace(
        equations,
        capacitor_ends=np.hstack([equations.capacitor_ends, [[node], [ground]]]),
        capacitance=np.append(equations.capacitance, cap),
    )


def side_by_side(circuits: Sequence[Equations]) -> Equations:
    """Return circuits that do not touch as one; unknown and given nodes follow in their order."""
    unknown = np.cumsum([0, *(one.unknown for one in circuits)])
    given = np.cumsum([0, *(one.given for one in circuits)])

    def moved(place: int, nodes: IntArray) -> IntArray:
        one = circuits[place]
        free = nodes < one.unknown
        inner, outer = nodes + unknown[place], nodes - one.unknown + unknown[-1] + given[place]
        result: IntArray = np.where(free, inner, outer)
        return result

    def nodes(name: str) -> IntArray:
        parts = [moved(place, getattr(one, name)) for place, one in enumerate(circuits)]
        return np.concatenate(parts, axis=-1)

    return Equations(
        unknown=int(unknown[-1]),
        given=int(given[-1]),
        channels=Channels(
            *(
                np.concatenate([getattr(one.channels, column.name) for one in circuits])
                for column in fields(Channels)
            )
        ),
        drain=nodes("drain"),
        gate=nodes("gate"),
        source=nodes("source"),
        bulk=nodes("bulk"),
        capacitor_ends=nodes("capacitor_ends"),
        capacitance=np.concatenate([one.capacitance for one in circuits]),
        resistor_ends=nodes("resistor_ends"),
        resistance=np.concatenate([one.resistance for one in circuits]),
        rounding=circuits[0].rounding,
    )
