"""What nets are called where a gate is drawn."""

from __future__ import annotations

from functools import cached_property
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices, IntArray

NAMES_MAX = 1000
"""Of very many devices that share one reason, only so many are named."""


def device_names(devices: Devices, which: IntArray) -> tuple[str, ...]:
    """Return the names of transistors with their instance paths, at most `NAMES_MAX`."""
    some = which[:NAMES_MAX]
    places = zip(devices.card[some].tolist(), devices.instance[some].tolist(), strict=True)
    return tuple(devices.card_path(card, instance) for card, instance in places)


class Names:
    """Names of a block's nets, from outside and from inside its instances.

    Parameters
    ----------
    devices : Devices
        The block.
    """

    def __init__(self, devices: Devices) -> None:
        self._devices = devices
        self._ports: dict[int, dict[int, str]] = {}

    def net_id(self, name: str) -> int | None:
        """Return the id of a net by its full name or that of a part of it, in any case."""
        return self._ids.get(name.lower())

    def local(self, instance: int, net: int) -> str:
        """Return the name of a net inside an instance: that of a port, else without the path."""
        port = self._ports_of(instance).get(net)
        if port is not None:
            return port
        name, path = self._devices.net_names[net], self._devices.instance_path(instance)
        return name.removeprefix(f"{path}.") if path else name

    @cached_property
    def _ids(self) -> dict[str, int]:
        devices = self._devices
        parts = zip(devices.joined_names, devices.joined_net.tolist(), strict=True)
        joined = {name.lower(): net for name, net in parts}
        return joined | {name.lower(): net for net, name in enumerate(devices.net_names)}

    def _ports_of(self, instance: int) -> dict[int, str]:
        """Return the ports of an instance by the net they are tied to, the first of several."""
        if instance == 0:
            return {}
        if instance not in self._ports:
            devices = self._devices
            name = devices.subcircuits[int(devices.instance_subcircuit[instance])]
            definition = devices.netlist.subcircuits.get(name.lower())
            card = devices.netlist.card(int(devices.instance_card[instance]))
            outer = int(devices.instance_parent[instance])
            tied = list(zip(card.nodes, definition.ports if definition else (), strict=False))
            self._ports[instance] = {
                self._net_in(outer, node): port for node, port in reversed(tied)
            }
        return self._ports[instance]

    def _net_in(self, instance: int, name: str) -> int:
        """Return the net id of a name used in an instance's subcircuit; -1: it has none."""
        for net, port in self._ports_of(instance).items():
            if port.lower() == name.lower():
                return net
        path = self._devices.instance_path(instance)
        inside = self.net_id(f"{path}.{name}") if path else None
        found = self.net_id(name) if inside is None else inside
        return -1 if found is None else found
