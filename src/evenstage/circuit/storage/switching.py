"""What closed switches connect a node to, for all values of the signals that close them."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.network import HIGH, LOW

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray, Switch

SIGNALS_MAX = 12
"""All values of so many signals are looked at; a group with more is not looked into."""
SWITCHES_MAX = 200
"""Likewise for transistors."""


@dataclass(frozen=True, slots=True)
class Wiring:
    """A drawn network and the signals that close its switches.

    Parameters
    ----------
    devices : tuple of Switch
    signal : tuple of (int, bool)
        For each local net the number of the signal it carries, and whether inverted; (-1, False)
        for one that closes no switch.
    free : tuple of (int, int)
        Channel ends driven from outside the block: local net and number of its signal.
    """

    devices: tuple[Switch, ...]
    signal: tuple[tuple[int, bool], ...]
    free: tuple[tuple[int, int], ...] = ()

    @property
    def signals(self) -> int:
        """How many signals there are."""
        numbers = [number for number, _ in self.signal] + [number for _, number in self.free]
        return 1 + max(numbers, default=-1)


@dataclass(frozen=True)
class Pulled:
    """Which nodes are joined to a 1 and to a 0 for every value of the signals.

    Parameters
    ----------
    up, down : dict of int to BoolArray, shape (2**signals,)
        By local net.
    """

    up: dict[int, BoolArray]
    down: dict[int, BoolArray]

    def level(self, net: int) -> BoolArray:
        """Return 0 where nothing drives a node, 1 low, 2 high, 3 both, shape (2**signals,)."""
        return self.down[net].astype(np.int8) + 2 * self.up[net]


@lru_cache(maxsize=4096)
def pulled(wiring: Wiring, open_: frozenset[int] = frozenset()) -> Pulled | None:
    """Find what joins the nodes of a network; None where it is too large.

    Parameters
    ----------
    wiring : Wiring
    open_ : frozenset of int
        Signals whose switches never close.
    """
    count = wiring.signals
    if count > SIGNALS_MAX or len(wiring.devices) > SWITCHES_MAX:
        return None
    vectors = (np.arange(1 << count) >> np.arange(count)[:, None] & 1).astype(bool)
    closed = [_closed(wiring, device, vectors, open_) for device in wiring.devices]
    size = vectors.shape[1]
    whole = np.ones(size, bool)
    up, down = {HIGH: whole, LOW: ~whole}, {HIGH: ~whole, LOW: whole}
    for local, number in wiring.free:
        up[local], down[local] = vectors[number], ~vectors[number]
    held = {HIGH, LOW, *(local for local, _ in wiring.free)}
    return Pulled(
        _flood(wiring.devices, closed, up, held), _flood(wiring.devices, closed, down, held)
    )


def _closed(wiring: Wiring, device: Switch, vectors: BoolArray, open_: frozenset[int]) -> BoolArray:
    if device.gate < 0:
        level = np.full(vectors.shape[1], device.gate == HIGH)
    else:
        number, inverted = wiring.signal[device.gate]
        if number in open_:
            return np.zeros(vectors.shape[1], bool)
        level = vectors[number] ^ inverted
    return level if device.polarity == "n" else ~level


def _flood(
    devices: tuple[Switch, ...],
    closed: list[BoolArray],
    start: dict[int, BoolArray],
    held: set[int],
) -> dict[int, BoolArray]:
    """Spread from the held nodes through closed switches; held nodes let nothing through."""
    none = np.zeros_like(closed[0])
    reached = {net: none for device in devices for net in (device.a, device.b)} | start
    growing = True
    while growing:
        growing = False
        for device, is_closed in zip(devices, closed, strict=True):
            for here, there in ((device.a, device.b), (device.b, device.a)):
                if there in held:
                    continue
                wider = reached[there] | (reached[here] & is_closed)
                if (wider != reached[there]).any():
                    reached[there] = wider
                    growing = True
    return reached


@lru_cache(maxsize=4096)
def influence(wiring: Wiring) -> dict[int, tuple[int, ...]]:
    """Return for each node the signals that can change what drives it.

    Of a network too large to be looked at every signal counts for every node.
    """
    nodes = sorted({n for d in wiring.devices for n in (d.a, d.b) if n >= 0})
    found = pulled(wiring)
    if found is None:
        return dict.fromkeys(nodes, tuple(range(wiring.signals)))
    return {node: _changing(found.level(node), wiring.signals) for node in nodes}


def _changing(level: BoolArray, signals: int) -> tuple[int, ...]:
    places = np.arange(len(level))
    return tuple(s for s in range(signals) if (level != level[places ^ (1 << s)]).any())
