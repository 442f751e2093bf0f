"""Transistors that take no part in any logic: what they are, and what is known because of them.

Dummies beside a row of fingers, transistors held off by their gate, decoupling between the
supplies, gates used as capacitors, and tie cells, whose output never moves. They are set aside
before transistors are grouped, so that a dummy never joins two gates into one, and only load the
nets they touch. A net that a tie cell holds counts as 0 or 1 wherever it closes a switch.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.circuit.network import BoolArray
    from evenstage.circuit.supplies import Supplies
    from evenstage.netlist.devices import Devices, IntArray

_ROUNDS = 8
"""A tie cell is a few transistors deep; what takes more rounds stays a signal."""

DECOUPLING = "decoupling"
DUMMY = "dummy"
OFF = "held off"
SHORTED = "channel shorted"
CAPACITOR = "gate as a capacitor"
TIE = "tie"
ACROSS = "between supplies"


@dataclass(frozen=True, slots=True)
class Apart:
    """Transistors outside all logic that play one part.

    Parameters
    ----------
    role : str
    devices : IntArray
        Device ids, ascending.
    """

    role: str
    devices: IntArray


@dataclass(frozen=True)
class Levels:
    """Nets that never move, as the gates of transistors see them; shape (nets,) each.

    Supplies, and nets that a tie cell holds.
    """

    high: BoolArray
    low: BoolArray


@dataclass(frozen=True)
class _Channels:
    """Polarity and channel ends of every device; shape (devices,)."""

    devices: Devices
    is_p: BoolArray
    shorted: BoolArray

    def always(self, levels: Levels) -> tuple[BoolArray, BoolArray]:
        """Tell which devices always conduct, and which never do."""
        low, high = levels.low[self.devices.gate], levels.high[self.devices.gate]
        return np.where(self.is_p, low, high), np.where(self.is_p, high, low)


def set_apart(devices: Devices, supplies: Supplies) -> tuple[tuple[Apart, ...], Levels]:
    """Find the transistors outside all logic, by role, and the nets that never move.

    Parameters
    ----------
    devices : Devices
    supplies : Supplies
    """
    is_p = np.array([model.polarity == "p" for model in devices.models], bool)[devices.model]
    channels = _Channels(devices, is_p, devices.drain == devices.source)
    biased = _self_biased(channels, supplies)
    levels, tie = _held(channels, supplies, biased)
    role = _roles(channels, supplies, levels, tie, biased)
    names = (DECOUPLING, DUMMY, OFF, SHORTED, CAPACITOR, TIE, ACROSS)
    parts = ((name, np.flatnonzero(role == number + 1)) for number, name in enumerate(names))
    return tuple(Apart(name, which.astype(np.int32)) for name, which in parts if len(which)), levels


def _roles(
    channels: _Channels, supplies: Supplies, levels: Levels, tie: BoolArray, biased: BoolArray
) -> IntArray:
    """Return the number of each device's role, counted from 1; 0 for those in logic."""
    devices, is_supply = channels.devices, supplies.is_supply
    on, off = channels.always(levels)
    ends = is_supply[devices.drain] & is_supply[devices.source]
    same = supplies.is_high[devices.drain] == supplies.is_high[devices.source]
    still = levels.high[devices.gate] | levels.low[devices.gate]
    result: IntArray = np.select(
        [
            biased | (ends & on & same),
            ends & (off | ((devices.gate == devices.drain) & same)),
            ends & same & ~still,
            ends,
            tie,
            off & ~_unused_input(channels, supplies, off | tie),
            channels.shorted,
        ],
        [1, 2, 5, 7, 6, 3, 4],
        0,
    ).astype(np.int8)
    return result


def _unused_input(channels: _Channels, supplies: Supplies, idle: BoolArray) -> BoolArray:
    """Tell which devices lead from a supply to a net that others move.

    Held off, such a device is the unused input of a gate as often as a dummy, and it joins nothing:
    it stays in the gate.
    """
    devices, nets = channels.devices, len(supplies.is_high)
    active = ~idle & ~channels.shorted
    moved = _marked(nets, devices.drain[active]) | _marked(nets, devices.source[active])
    moved &= ~supplies.is_supply
    to_supply = supplies.is_supply[devices.drain] ^ supplies.is_supply[devices.source]
    return to_supply & (moved[devices.drain] | moved[devices.source])


def _held(channels: _Channels, supplies: Supplies, biased: BoolArray) -> tuple[Levels, BoolArray]:
    """Return the nets that never move, and the devices that hold those that are no supplies.

    A net is held where everything on it leads to one supply and something always conducts: a
    transistor whose gate is held, or one whose gate is the net itself (diode-connected). A port
    that closes switches is an input with a pull device, and moves.
    """
    devices, nets = channels.devices, len(supplies.is_high)
    levels = Levels(supplies.is_high, supplies.is_low)
    moves = np.zeros(nets, bool)
    moves[list(devices.ports)] = True
    driven = [net for plus, minus, _ in devices.source_nets for net in (plus, minus)]
    moves &= _marked(nets, devices.gate)
    moves[driven] = True
    moves |= supplies.is_supply
    is_port = np.zeros(nets, bool)
    is_port[list(devices.ports)] = True
    for _ in range(_ROUNDS):
        on, off = channels.always(levels)
        active = ~(off | channels.shorted | biased)
        grown = []
        for own, other in (
            (supplies.is_low, supplies.is_high),
            (supplies.is_high, supplies.is_low),
        ):
            holds, pulls_else = np.zeros(nets, bool), other | moves
            for here, there in ((devices.drain, devices.source), (devices.source, devices.drain)):
                diode = (devices.gate == here) & ~is_port[here]
                holds[here[active & own[there] & (on | diode)]] = True
                pulls_else[here[active & ~own[there]]] = True
            grown.append(holds & ~pulls_else)
        low, high = levels.low | grown[0], levels.high | grown[1]
        if (low == levels.low).all() and (high == levels.high).all():
            break
        levels = Levels(high, low)
    held = (levels.high | levels.low) & ~supplies.is_supply
    tie = held[devices.drain] | held[devices.source]
    return levels, tie


def _self_biased(channels: _Channels, supplies: Supplies) -> BoolArray:
    """Find decoupling pairs: an n and a p transistor, each with its gate on the other's drain."""
    devices = channels.devices
    nets = len(supplies.is_high)
    at_supply = supplies.is_supply[devices.drain] ^ supplies.is_supply[devices.source]
    inner = np.where(supplies.is_supply[devices.drain], devices.source, devices.drain)
    rail = np.where(supplies.is_supply[devices.drain], devices.drain, devices.source)
    lonely = _count(nets, devices.drain, devices.source) + _count(nets, devices.gate) == 2
    lonely[list(devices.ports)] = False
    fits = at_supply & lonely[inner] & lonely[devices.gate]
    n = np.flatnonzero(fits & ~channels.is_p & supplies.is_low[rail])
    p = np.flatnonzero(fits & channels.is_p & supplies.is_high[rail])
    key_n = inner[n].astype(np.int64) * nets + devices.gate[n]
    key_p = devices.gate[p].astype(np.int64) * nets + inner[p]
    found = np.zeros(len(devices), bool)
    found[n[np.isin(key_n, key_p)]] = True
    found[p[np.isin(key_p, key_n)]] = True
    return found


def _count(nets: int, *ends: IntArray) -> IntArray:
    return sum((np.bincount(end, minlength=nets) for end in ends), np.zeros(nets, np.int64))


def _marked(nets: int, which: IntArray) -> BoolArray:
    found = np.zeros(nets, bool)
    found[which] = True
    return found
