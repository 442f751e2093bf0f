"""Which transistors the patterns of a brief name."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.netlist.rewriting.families import find_families
from evenstage.pattern import Pattern, select

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.circuit.network import BoolArray
    from evenstage.netlist.devices import Devices


def gates_named(circuit: Circuit, patterns: Sequence[Pattern]) -> list[int]:
    """Return the gates of the transistors that patterns name, see `devices_named`.

    Raises
    ------
    SettingsError
        Where a pattern fits no card.
    """
    gates = np.unique(circuit.gate_of_device[devices_named(circuit.devices, patterns)])
    return [int(gate) for gate in gates if gate >= 0]


def leaves_named(devices: Devices, patterns: Sequence[Pattern]) -> list[int]:
    """Return the subcircuits (indices) that patterns name, by their own name or their leaf's.

    A copy that an earlier run made of a leaf goes by the leaf's name too.

    Raises
    ------
    SettingsError
        Where a pattern fits no subcircuit.
    """
    if not patterns:
        return []
    families = find_families(devices.netlist)
    roots = [
        families[name.lower()].root if name.lower() in families else name
        for name in devices.subcircuits
    ]
    found = select(patterns, [*devices.subcircuits, *roots], "subcircuit")
    return sorted({index % len(roots) for index in found})


def refuse_unknown_names(circuit: Circuit, brief: Brief) -> None:
    """Refuse a brief that names cards or subcircuits the block has not got.

    Raises
    ------
    SettingsError
        Where a pattern fits nothing.
    """
    for patterns in (brief.fixed, *brief.same_size, *(limit.cards for limit in brief.limits)):
        devices_named(circuit.devices, patterns)
    leaves_named(circuit.devices, brief.leaves)


def devices_named(devices: Devices, patterns: Sequence[Pattern]) -> BoolArray:
    """Tell which transistors patterns name, shape (devices,).

    A pattern names a transistor by its card with the path of the instance that holds it, or by an
    instance around it. Names are compared by instance and by distinct card, never transistor by
    transistor.

    Raises
    ------
    SettingsError
        Where a pattern fits no card.
    """
    found = np.zeros(len(devices), bool)
    if not patterns:
        return found
    paths = _Paths(devices)
    for pattern in patterns:
        named = paths.named(pattern)
        if not named.any():
            # Puts all names together to say which are nearest.
            select([pattern], paths.every_name(), "card")
        found |= named
    return found


class _Paths:
    """The names of a block's instances and cards."""

    def __init__(self, devices: Devices) -> None:
        self._devices = devices
        self._instances = [
            devices.instance_path(instance).lower()
            for instance in range(len(devices.instance_parent))
        ]
        numbers, self._card_of_device = np.unique(devices.card, return_inverse=True)
        self._cards = [devices.netlist.card_name(number).lower() for number in numbers.tolist()]

    def named(self, pattern: Pattern) -> BoolArray:
        """Tell which transistors a pattern names."""
        devices = self._devices
        inside = self._fitting(pattern, self._instances)
        inside[0] = False
        for instance in range(1, len(inside)):  # a parent comes before its children
            inside[instance] |= inside[devices.instance_parent[instance]]
        found: BoolArray = inside[devices.instance]
        at_top = devices.instance == 0
        found |= at_top & self._fitting(pattern, self._cards)[self._card_of_device]
        for path, card in _parts(pattern):
            held = self._fitting(path, self._instances)[devices.instance]
            found |= held & ~at_top & self._fitting(card, self._cards)[self._card_of_device]
        return found

    def every_name(self) -> list[str]:
        """Return the path of every instance and of every card."""
        devices = self._devices
        cards = [
            devices.card_path(card, instance)
            for card, instance in zip(devices.card.tolist(), devices.instance.tolist(), strict=True)
        ]
        return [*(devices.instance_path(i) for i in range(1, len(self._instances))), *cards]

    def _fitting(self, pattern: Pattern, lower_names: list[str]) -> BoolArray:
        fits = np.zeros(len(lower_names), bool)
        fits[pattern.fitting(lower_names)] = True
        return fits


def _parts(pattern: Pattern) -> Iterator[tuple[Pattern, Pattern]]:
    """Yield every way a pattern can fit ``path.card``: what fits the path, and what the card.

    The dot between the two is a dot of the pattern, fits a ``?``, or is among what a ``*`` fits.
    """
    for place, char in enumerate(pattern.text):
        rest = "*" if char == "*" else ""
        if char in ".?*":
            yield (
                Pattern(pattern.text[:place] + rest, pattern.span),
                Pattern(rest + pattern.text[place + 1 :], pattern.span),
            )
