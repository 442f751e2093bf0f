"""What a resizing has to keep, and what it spends.

So that the rest of the chip notices nothing, no input shows more capacitance than today and no edge
gets slower than the slowest of today, unless the brief says otherwise. An earlier run's record of
the netlist as first drawn counts in place of today's.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import InfeasibleError
from evenstage.pattern import select
from evenstage.sizing.model import Limits
from evenstage.sizing.problem import totals
from evenstage.sizing.wishes import Original
from evenstage.timing.endpoints import block_inputs

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.timed import Timed
    from evenstage.sizing.variables import Variables
    from evenstage.timing.sweep import Timing

_ROOM = 1e-9
"""Relative room for the noise of binary arithmetic."""


def limits_of(timing: Timing, brief: Brief, original: Original, free: Variables) -> Limits:
    """Return the input ceilings and the transition limit.

    Parameters
    ----------
    timing : Timing
        The block as drawn.
    brief : Brief
        Its ceilings and its transition limit, where it gives any.
    original : Original
        Those of the netlist as first drawn.
    free : Variables
        Which sizes may move.

    Raises
    ------
    InfeasibleError
        Where an input is above its ceiling and nothing on it may change.
    SettingsError
        Where a pattern of the brief fits no input.
    """
    circuit = timing.circuit
    nets = block_inputs(circuit)
    names = [circuit.devices.net_names[net] for net in nets.tolist()]
    today = circuit.net_cap[nets]
    recorded = (original.ceilings.get(name.lower()) for name in names)
    ceiling = np.array(
        [cap if known is None else known for known, cap in zip(recorded, today, strict=True)]
    )
    for some in brief.inputs:
        if some.capacitance_max is not None:
            ceiling[select(some.nets, names, "input")] = some.capacitance_max
    movable = np.zeros(len(circuit.devices.net_names), bool)
    either = free.free[free.partition.of_gate[circuit.pins.gate]]
    movable[circuit.pins.net[either.any(axis=1)]] = True
    stuck = np.flatnonzero((today > ceiling * (1 + _ROOM)) & ~movable[nets])
    if len(stuck):
        raise InfeasibleError(
            f"input '{names[stuck[0]]}' shows more capacitance than it may, and every card on it "
            "is fixed",
            code="input-over-ceiling",
        )
    return Limits(
        ceiling_net=nets,
        ceiling=ceiling,
        transition=brief.transition_max or original.transition or timing.worst_transition,
        strict=brief.transition_max is not None,
    )


def broken_today(block: Timed, limits: Sequence[Limits]) -> bool:
    """Tell whether the block as drawn breaks, in any corner, an input ceiling or its transition."""
    return any(_broken(one, some) for one, some in zip(block.corners, limits, strict=True))


def _broken(timing: Timing, limits: Limits) -> bool:
    over = timing.circuit.net_cap[limits.ceiling_net] > limits.ceiling * (1 + _ROOM)
    return bool(over.any()) or (limits.strict and timing.worst_transition > limits.transition)


@dataclass(frozen=True, slots=True)
class Spend:
    """What the sizes of a block cost: m of width, or F of switched capacitance.

    Parameters
    ----------
    per_size : FloatArray, shape (sizes,)
        Cost of each size as drawn; it grows in proportion.
    fixed : float
        Cost of everything that has no size.
    """

    per_size: FloatArray
    fixed: float

    @property
    def today(self) -> float:
        """Cost of the block as drawn."""
        return float(self.per_size.sum()) + self.fixed


def spend_of(circuit: Circuit, free: Variables, kind: str) -> Spend:
    """Return what the sizes of a circuit cost, by ``width`` or by ``energy``."""
    values, block = circuit.electrical, circuit.devices
    if kind == "width":
        per_device, total = block.width * block.multiplier, circuit.total_width
    else:
        per_device = values.gate.scaling + values.drain.scaling + values.source.scaling
        total = circuit.switched_cap
    size = free.partition.of_device
    mine = size >= 0
    per_size = totals(size[mine], per_device[mine], len(free))
    return Spend(per_size, max(total - float(per_size.sum()), 0.0))


def kept_for_later(circuit: Circuit, limits: Limits, original: Original, spend: float) -> Original:
    """Return what later runs must keep: what an earlier run recorded, else what counts today."""
    devices = circuit.devices
    names = [devices.net_names[net].lower() for net in limits.ceiling_net.tolist()]
    drawn = {
        model.name.lower(): float(devices.width[devices.model == index].min())
        for index, model in reversed(list(enumerate(devices.models)))
        if (devices.model == index).any()
    }
    return Original(
        ceilings=dict(zip(names, limits.ceiling.tolist(), strict=True)),
        transition=limits.transition,
        smallest={**drawn, **original.smallest},
        spend=spend,
    )
