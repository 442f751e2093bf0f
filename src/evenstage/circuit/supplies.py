"""Which nets are supplies, and which way they pull."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from evenstage.errors import CircuitError
from evenstage.netlist.elaboration.nets import endings
from evenstage.pattern import Pattern, select

if TYPE_CHECKING:
    from collections.abc import Iterable

    from evenstage.brief import Brief
    from evenstage.netlist.devices import Devices

BoolArray = NDArray[np.bool_]

# Names met in 5,767 openly published netlist files; common practice, no source.
_HIGH_NAME = re.compile(r"(a|d|io)?v(dd|cc|pwr)\w*[!]?|dd[!]?|sup|power|pwr|vnw|vpb", re.IGNORECASE)
_LOW_NAME = re.compile(
    r"0|(a|d|p)?(gnd|gnda|gndd)\w*[!]?|v(ss|gnd|ee)\w*[!]?|ss|ground|vpw|vnb", re.IGNORECASE
)


@dataclass(frozen=True)
class Supplies:
    """The supply nets of a block.

    Parameters
    ----------
    is_high, is_low : BoolArray, shape (nets,)
    """

    is_high: BoolArray
    is_low: BoolArray

    @property
    def is_supply(self) -> BoolArray:
        """High or low."""
        return self.is_high | self.is_low


def find_supplies(devices: Devices, brief: Brief | None = None) -> Supplies:
    """Find the supplies: from the brief, sources, names, and the bulks of the transistors.

    The brief decides alone where it speaks. Otherwise a net is high that a source holds above
    another or whose name says so, and low likewise; a net that only drives gates is a signal,
    whatever its name. Where a kind is still missing, the net that most bulks of its transistors are
    tied to and that is one of their channel ends is taken.

    Parameters
    ----------
    devices : Devices
    brief : Brief, optional
        Its supplies.

    Raises
    ------
    CircuitError
        ``no-supply`` where a kind cannot be found.
    SettingsError
        Where a pattern of the brief fits no net.
    """
    high = _named(devices, brief.supplies_high if brief else (), "supply")
    low = _named(devices, brief.supplies_low if brief else (), "supply")
    if not low.any():
        low = _by_name(devices, _LOW_NAME) | _by_source(devices, low=True)
        low &= ~high
    if not high.any():
        high = (_by_name(devices, _HIGH_NAME) | _by_source(devices, low=False)) & ~low
    if not (high & _channel(devices)).any():
        high |= _by_bulk(devices, "p", ~low)
    if not (low & _channel(devices)).any():
        low |= _by_bulk(devices, "n", ~high)
    for found, kind, key in ((high, "high", "p"), (low, "low", "n")):
        if not (found & _channel(devices)).any():
            raise CircuitError(
                f"no {kind} supply found in '{devices.top or 'the top level'}': no net that "
                f"{key}-transistors hang on is named like one, held by a source or tied to their "
                f"bulks; name it with supplies.{kind} in the brief",
                code="no-supply",
            )
    return Supplies(high, low)


def _channel(devices: Devices) -> BoolArray:
    found = np.zeros(len(devices.net_names), bool)
    found[devices.drain] = found[devices.source] = True
    return found


def _named(devices: Devices, patterns: Iterable[Pattern], what: str) -> BoolArray:
    found = np.zeros(len(devices.net_names), bool)
    if chosen := tuple(patterns):
        found[select(chosen, devices.net_names, what)] = True
    return found


def _by_name(devices: Devices, name: re.Pattern[str]) -> BoolArray:
    """Match the last component of each name: an undeclared rail deep in a block is still a rail."""
    found = _channel(devices)
    found[devices.bulk] = True
    texts, place = endings(devices.net_names)
    fits = np.array([name.fullmatch(text) is not None for text in texts], bool)
    found &= fits[place]
    return found


def _by_source(devices: Devices, *, low: bool) -> BoolArray:
    found = np.zeros(len(devices.net_names), bool)
    for plus, minus, volts in devices.source_nets:
        if low:
            found[minus if volts > 0 else plus] |= volts != 0
        elif volts != 0:
            found[plus if volts > 0 else minus] = True
    # A source that drives a gate is a stimulus, not a supply.
    drives_gate = np.zeros(len(devices.net_names), bool)
    drives_gate[devices.gate] = True
    return found & ~(drives_gate & ~_channel(devices))


def _by_bulk(devices: Devices, polarity: str, allowed: BoolArray) -> BoolArray:
    """Return the most frequent bulk net of a polarity that is also one of its channel ends."""
    of_kind = np.array([model.polarity == polarity for model in devices.models], bool)
    chosen = of_kind[devices.model] if len(devices) else np.zeros(0, bool)
    ends = np.zeros(len(devices.net_names), bool)
    ends[devices.drain[chosen]] = ends[devices.source[chosen]] = True
    votes = np.bincount(devices.bulk[chosen], minlength=len(devices.net_names))
    votes = np.where(ends & allowed, votes, 0)
    found = np.zeros(len(devices.net_names), bool)
    if votes.any():
        found[int(votes.argmax())] = True
    return found
