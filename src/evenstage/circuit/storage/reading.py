"""What a loop of nets does: whether it holds a value, and which signals write it.

Every value of the loop's nets and of the signals from outside is looked at. A value of the loop is
stable where each of its nets is driven to the level it has, or is not driven. Where two values are
stable the loop holds; where one is, it is written; where none is, it oscillates. Of the signals,

- one that writes a constant at one of its levels, whatever the others do, sets or resets,
- one that decides between writing and holding is a clock,
- the others that a written value depends on are data.

Where a signal from outside and the loop itself pull a net both ways, the outside wins: it has to,
or the loop could not be written.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.storage.switching import Wiring, pulled

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import IntArray

BITS_MAX = 14
"""Nets of a loop and signals from outside together; wider loops are not read."""

LATCH = "latch"
SET_RESET = "set-reset pair"
C_ELEMENT = "C-element"
BUS_KEEPER = "bus keeper"
CELL = "storage cell"
SENSE_AMPLIFIER = "sense amplifier"
NO_STORAGE = "loop that never holds"
OSCILLATES = "loop that oscillates"


@dataclass(frozen=True, slots=True)
class Member:
    """One net of a loop: the network that drives it, and which of its nodes it is.

    Signals are numbered through for the whole loop: first its own nets, then those from outside.
    """

    wiring: Wiring
    node: int


@dataclass(frozen=True, slots=True)
class Reading:
    """What a loop is.

    Parameters
    ----------
    kind : str
    clocks : tuple of (int, bool)
        Signals that decide between writing and holding, with the level that writes.
    data : tuple of int
        Signals that are written.
    writes : tuple of (int, bool)
        Signals that set or reset, with the level that does.
    """

    kind: str
    clocks: tuple[tuple[int, bool], ...] = ()
    data: tuple[int, ...] = ()
    writes: tuple[tuple[int, bool], ...] = ()


@dataclass(frozen=True)
class _Table:
    """For every value of the outer signals, shape (2**outer,).

    ``value`` says what the first net is written to, ``values`` what each net, shape (nets,
    2**outer).
    """

    hold: BoolArray
    written: BoolArray
    values: BoolArray

    @property
    def value(self) -> BoolArray:
        """What the first net is written to."""
        first: BoolArray = self.values[0]
        return first


@lru_cache(maxsize=4096)
def read_loop(members: tuple[Member, ...]) -> Reading | None:
    """Read one loop; None where it is too large to be looked at."""
    nets = len(members)
    signals = max(nets, *(member.wiring.signals for member in members))
    if signals > BITS_MAX:
        return None
    table = _table(members, nets, signals)
    if table is None:
        return None
    outer = signals - nets
    if not table.hold.any():
        every = bool(table.written.all())
        return Reading(NO_STORAGE if every else OSCILLATES)
    if not outer:
        return Reading(BUS_KEEPER)
    return _classified(table, nets, outer)


def _table(members: tuple[Member, ...], nets: int, signals: int) -> _Table | None:
    bits = np.arange(1 << signals) >> np.arange(signals)[:, None] & 1
    stable = np.ones(1 << signals, bool)
    loop = frozenset(range(nets))
    for place, member in enumerate(members):
        levels = _levels(member, loop, bits)
        if levels is None:
            return None
        own = np.where(bits[place] == 1, 2, 1)
        stable &= (levels == own) | (levels == 0)
    shape = (1 << (signals - nets), 1 << nets)
    stable = stable.reshape(shape)
    count = stable.sum(axis=1)
    chosen = stable.argmax(axis=1)
    values = (chosen >> np.arange(nets)[:, None] & 1).astype(bool)
    return _Table(count > 1, count == 1, values)


def _levels(member: Member, loop: frozenset[int], bits: IntArray) -> IntArray | None:
    """Return what drives a net, shape (2**signals,): 0 nothing, 1 low, 2 high, 3 undecided."""
    wiring = member.wiring
    found = pulled(wiring)
    if found is None:
        return None
    here = (bits[: wiring.signals] << np.arange(wiring.signals)[:, None]).sum(axis=0)
    levels: IntArray = found.level(member.node)[here]
    if (levels == 3).any():
        outside = pulled(wiring, loop)
        if outside is not None:
            winning = outside.level(member.node)[here]
            levels = np.where((levels == 3) & (winning != 0), winning, levels)
    return levels


def _classified(table: _Table, nets: int, outer: int) -> Reading:
    places = np.arange(1 << outer)
    level = (places >> np.arange(outer)[:, None] & 1).astype(bool)
    left = np.ones(1 << outer, bool)
    rest = list(range(outer))
    writes: list[tuple[int, bool]] = []
    precharged = False
    while (found := _constant_write(table, left, level, rest)) is not None:
        signal, at = found
        values = table.values[:, left & (level[signal] == at)]
        precharged |= nets > 1 and bool((values == values[0, 0]).all())
        writes.append((nets + signal, at))
        left &= level[signal] != at
        rest.remove(signal)
    clocks = [s for s in rest if _matters(table.hold, left, s)]
    data = [s for s in rest if s not in clocks and _matters(table.value & table.written, left, s)]
    return Reading(
        kind=_kind(table, left, (clocks, data, writes), precharged=precharged),
        clocks=tuple((nets + s, _writing_level(table, left, level[s])) for s in clocks),
        data=tuple(nets + s for s in data),
        writes=tuple(writes),
    )


def _constant_write(
    table: _Table, left: BoolArray, level: BoolArray, rest: list[int]
) -> tuple[int, bool] | None:
    """Return a signal that at some level forces one of the nets, whatever the others do."""
    for signal in rest if table.hold[left].any() else ():
        for at in (False, True):
            some = left & (level[signal] == at)
            values = table.values[:, some]
            if table.written[some].all() and (values == values[:, :1]).all(axis=1).any():
                return signal, at
    return None


def _matters(table: BoolArray, left: BoolArray, signal: int) -> bool:
    """Tell whether a signal changes a table while the others keep to the values left."""
    places = np.flatnonzero(left)
    other = places ^ (1 << signal)
    both = left[other]
    return bool((table[places[both]] != table[other[both]]).any())


def _writing_level(table: _Table, left: BoolArray, level: BoolArray) -> bool:
    high, low = table.written[left & level], table.written[left & ~level]
    return bool(high.sum() >= low.sum())


def _kind(
    table: _Table,
    left: BoolArray,
    signals: tuple[list[int], list[int], list[tuple[int, bool]]],
    *,
    precharged: bool,
) -> str:
    clocks, data, writes = signals
    if precharged:
        return SENSE_AMPLIFIER
    if not clocks:
        return SET_RESET if writes else CELL
    if data:
        return LATCH
    written = np.flatnonzero(left & table.written)
    mask = sum(1 << s for s in clocks)
    if len(clocks) > 1 and len(written) == 2 and (written[0] ^ written[1]) & mask == mask:
        return C_ELEMENT
    return CELL
