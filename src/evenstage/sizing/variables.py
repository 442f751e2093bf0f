"""How far each size may move, and why some may not; 1 is as drawn."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import InfeasibleError, Notice
from evenstage.sizing.named import devices_named, gates_named
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import FloatArray
    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.sizing.partition import Partition
    from evenstage.sizing.pulls import Skews

GROWTH_MAX = 1000.0
"""How many times a width may grow where nothing else limits it; keeps the programme bounded."""


@dataclass(frozen=True)
class Variables:
    """Sizes of a block with their bounds; shape ``(sizes,)`` each.

    Parameters
    ----------
    partition : Partition
    lower, upper : FloatArray
        Bounds relative to today.
    reason : tuple of str
        Why a size must not move at all; empty where it may.
    notices : tuple of Notice
    skews : Skews, optional
        How far pull-up and pull-down may go apart, where they have sizes of their own.
    """

    partition: Partition
    lower: FloatArray
    upper: FloatArray
    reason: tuple[str, ...]
    notices: tuple[Notice, ...]
    skews: Skews | None = None

    def __len__(self) -> int:
        return len(self.partition)

    @cached_property
    def free(self) -> BoolArray:
        """Which sizes may move."""
        return np.array([not reason for reason in self.reason], bool) & (self.lower < self.upper)

    def factors(self, sizes: FloatArray) -> FloatArray:
        """Return each device's width factor, shape (devices,)."""
        return np.append(sizes, 1.0)[self.partition.of_device]


def variables(
    circuit: Circuit,
    brief: Brief | None,
    parts: Partition,
    handles: WidthHandles,
    smallest: Mapping[str, float] | None = None,
    corners: Sequence[Circuit] = (),
) -> Variables:
    """Find the bounds of all sizes.

    Parameters
    ----------
    circuit : Circuit
    brief : Brief, optional
        Fixed cards and width limits.
    parts : Partition
    handles : WidthHandles
        Which widths the text lets change.
    smallest : Mapping of str to float, optional
        Smallest width per model, m, where an earlier run recorded it.
    corners : sequence of Circuit
        The same block in further processes, whose width limits count too.

    Raises
    ------
    SettingsError
        Where a pattern of the brief fits no card.
    InfeasibleError
        Where limits exclude each other.
    """
    reason = [""] * len(parts)
    for slot, why in handles.cannot_change().items():
        reason[parts.variable_of[slot]] = why
    fixed = parts.of_gate[gates_named(circuit, brief.fixed if brief else ())]
    for size in np.unique(fixed).tolist():
        reason[size] = "fixed by the brief"
    found = [
        _width_limits(one, brief, parts, handles, smallest or {}) for one in (circuit, *corners)
    ]
    low = np.max([least for least, _ in found], axis=0)
    high = np.min([most for _, most in found], axis=0)
    width, of = circuit.devices.width, parts.of_device
    mine = of >= 0
    lower, upper = np.zeros(len(parts)), np.full(len(parts), GROWTH_MAX)
    # A card drawn outside its limits stays where it is.
    np.maximum.at(lower, of[mine], np.minimum(low / width, 1.0)[mine])
    np.minimum.at(upper, of[mine], np.maximum(high / width, 1.0)[mine])
    notices = [
        *_outside(circuit, mine & (width < low * (1 - 1e-9)), "below"),
        *_outside(circuit, mine & (width > high * (1 + 1e-9)), "above"),
    ]
    return Variables(parts, lower, upper, tuple(reason), tuple(notices))


def _outside(circuit: Circuit, which: BoolArray, word: str) -> list[Notice]:
    """Return a notice about cards drawn outside their limits."""
    cards = np.unique(circuit.devices.card[which])
    if not len(cards):
        return []
    names = tuple(circuit.devices.netlist.card(int(card)).name for card in cards)
    return [
        Notice(
            f"width-{word}-limit",
            f"{len(names)} cards are drawn {word} their width limit and are not moved further, "
            f"the first is '{names[0]}'",
            circuit.devices.netlist.card(int(cards[0])).span.place,
            names,
        )
    ]


def _width_limits(
    circuit: Circuit,
    brief: Brief | None,
    parts: Partition,
    handles: WidthHandles,
    smallest: Mapping[str, float],
) -> tuple[FloatArray, FloatArray]:
    """Return the smallest and largest width allowed for each device, m."""
    devices, process = circuit.devices, circuit.process
    low, high = np.empty(len(devices)), np.full(len(devices), np.inf)
    for index, model in enumerate(devices.models):
        of_model = devices.model == index
        kind = process.transistors[model.type_index]
        drawn = smallest.get(model.name.lower(), devices.width[of_model].min(initial=np.inf))
        low[of_model] = kind.width_min if kind.width_min is not None else drawn
        if kind.width_max is not None:
            high[of_model] = kind.width_max
    for slot, device in zip(parts.slots, parts.first_device.tolist(), strict=True):
        if (most := handles[slot].width_max) is not None:
            high[device] = min(high[device], most)
    for limit in brief.limits if brief else ():
        chosen = devices_named(devices, limit.cards)
        if limit.width_min is not None:
            low[chosen] = np.maximum(low[chosen], limit.width_min)
        if limit.width_max is not None:
            high[chosen] = np.minimum(high[chosen], limit.width_max)
        if (low[chosen] > high[chosen]).any():
            raise InfeasibleError(
                "the smallest width allowed exceeds the largest for "
                f"'{limit.cards[0].text}': {engineering(float(low[chosen].max()), 'm')} against "
                f"{engineering(float(high[chosen].min()), 'm')}",
                code="width-limits-cross",
                span=limit.cards[0].span,
            )
    return low, high
