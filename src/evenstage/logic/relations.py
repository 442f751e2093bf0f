"""What a channel-connected group makes of its inputs, as truth tables: groups drawn alike once."""

from __future__ import annotations

from dataclasses import dataclass, field
from functools import lru_cache
from typing import TYPE_CHECKING, Final

import numpy as np

from evenstage.logic.evaluate import evaluate, input_table
from evenstage.logic.settle import WEAK
from evenstage.logic.switches import UNKNOWN, Switches
from evenstage.logic.ways import Channel, WideRelation

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.logic.order import Groups
    from evenstage.logic.switches import BoolArray, Values
    from evenstage.netlist.devices import IntArray

INPUTS_MOST: Final = 12
"""Groups with more inputs have no table, but ways."""
_MATTER_MOST: Final = 7
"""Of tables with more inputs, any input is taken to matter anywhere."""


@dataclass(frozen=True)
class Relation:
    """A net as its group makes it.

    Parameters
    ----------
    inputs : tuple of int
        Net ids.
    table : Values, shape (2**inputs,)
        Bit ``k`` of a place is the value of input ``k`` there; `UNKNOWN` where it is not driven.
    """

    inputs: tuple[int, ...]
    table: Values

    def matters(self, position: int) -> BoolArray:
        """Tell where an input is among some that decide together and not without it.

        That is where its literal stands in a prime implicant that holds there. Shape as the table.
        """
        count = len(self.inputs)
        if count > _MATTER_MOST or (self.table == UNKNOWN).any():
            return np.ones(len(self.table), bool)
        found: BoolArray = _matters(self.table.tobytes(), count)[position]
        return found


@lru_cache(maxsize=4096)
def _matters(table: bytes, count: int) -> BoolArray:
    """Return for each input where it matters, shape (inputs, 2**inputs)."""
    decided = _decided(np.frombuffer(table, np.int8))
    weight = 3 ** np.arange(count)
    bits = np.arange(1 << count)[:, None] >> np.arange(count) & 1
    # For each vector and each set of inputs that are known: the place of their cube.
    cube = np.where(bits[None, :, :] == 1, bits[:, None, :], 2) @ weight
    known = decided[cube] != UNKNOWN
    sets = np.arange(1 << count)
    found: BoolArray = np.stack(
        [(known[:, sets | 1 << k] & ~known[:, sets & ~(1 << k)]).any(axis=1) for k in range(count)]
    )
    return found


def _decided(table: Values) -> Values:
    """Return what each cube decides, shape (3**inputs,); digit 2 of a place: that input is free."""
    if len(table) == 1:
        return table
    low, high = (_decided(half) for half in np.split(table, 2))
    return np.concatenate([low, high, np.where(low == high, low, UNKNOWN).astype(np.int8)])


@dataclass
class Relations:
    """The relations of a block's groups, made when asked for.

    Parameters
    ----------
    switches : Switches
    given : BoolArray, shape (nets,)
        Nets decided from outside, supplies among them.
    groups : Groups
    """

    switches: Switches
    given: BoolArray
    groups: Groups
    _known: dict[bytes, Values] = field(default_factory=dict, repr=False)

    def __post_init__(self) -> None:
        self._order = np.argsort(self.groups.of_device, kind="stable")
        ordered = self.groups.of_device[self._order]
        self._head = np.searchsorted(ordered, np.arange(self.groups.count + 1))

    def of_group(self, group: int) -> Mapping[int, Relation | WideRelation]:
        """Return the relation of each of a group's own nets."""
        which = self._order[self._head[group] : self._head[group + 1]]
        every = self.switches
        ends = np.concatenate([every.drain[which], every.source[which]])
        gates = every.gate[which]
        nets = np.unique(np.concatenate([ends, gates]))
        supply = every.supply[nets]
        own = (self.groups.of_net[nets] == group) & np.isin(nets, ends)
        inputs = nets[(supply == UNKNOWN) & (np.isin(nets, gates) | ~own)]
        wanted = tuple(inputs.tolist())
        if len(inputs) > INPUTS_MOST:
            return self._wide(which, nets, wanted, own)
        table = self._table(which, nets, inputs, own)
        return {
            int(net): Relation(wanted, row)
            for net, row in zip(nets[own].tolist(), table, strict=True)
        }

    def _wide(
        self, which: IntArray, nets: IntArray, inputs: tuple[int, ...], own: BoolArray
    ) -> dict[int, WideRelation]:
        every = self.switches
        columns = (every.drain, every.gate, every.source, every.is_n)
        channels = [
            Channel(*row) for row in zip(*(c[which].tolist() for c in columns), strict=True)
        ]
        level = dict(zip(nets.tolist(), every.supply[nets].tolist(), strict=True))
        ends = {net: level[net] for net in nets[~own].tolist()}
        supplies = {net: value for net, value in level.items() if value != UNKNOWN}
        return {
            net: WideRelation(net, inputs, channels, ends, supplies) for net in nets[own].tolist()
        }

    def _table(self, which: IntArray, nets: IntArray, inputs: IntArray, own: BoolArray) -> Values:
        """Return the values of own nets for all inputs, shape (own nets, 2**inputs).

        A net of the group's own that closes its switches is two: what is asked and what comes out.
        """
        every = self.switches
        place = np.searchsorted(nets, inputs)
        seen = np.arange(len(nets))
        seen[place] = np.where(own[place], len(nets) + np.arange(len(inputs)), place)
        drain, source = (np.searchsorted(nets, some[which]) for some in (every.drain, every.source))
        gate = seen[np.searchsorted(nets, every.gate[which])]
        supply = np.concatenate([every.supply[nets], np.full(len(inputs), UNKNOWN)])
        ohm = every.resistance[which]
        columns = (drain, gate, source, every.is_n[which], supply, seen[place], own)
        drawn = b"|".join(np.ascontiguousarray(one).tobytes() for one in columns)
        sized = drawn + ohm.tobytes()
        for key in (drawn, sized):
            if key in self._known:
                return self._known[key]
        part = Switches(
            drain,
            gate,
            source,
            every.is_n[which],
            ohm,
            np.ones(len(supply)),
            supply.astype(np.int8),
            [""] * len(supply),
        )
        vectors = dict(zip(seen[place].tolist(), input_table(len(inputs)), strict=True))
        found = evaluate(part, vectors)
        table: Values = found.values[: len(nets), 0][own]
        # Where nothing is driven against anything, sizes do not matter.
        fights = bool((found.strength[: len(nets)][own] == WEAK).any())
        self._known[sized if fights else drawn] = table
        return table
