"""The process of a netlist that comes without one."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.process.generic import at_length
from evenstage.process.infer import infer_process

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process


def inferred(netlist: Netlist, supply: float | None = None, length: float | None = None) -> Process:
    """Return the process that the model cards of a netlist tell, else the generic one."""
    facts = [(card.name, card.kind, card.values) for card in netlist.models.values()]
    return infer_process(facts, supply, length)


def settled(netlist: Netlist, devices: Devices) -> Process:
    """Return the inferred process, now that supply and channel length are known."""
    volts = [abs(value) for _, _, value in devices.source_nets if value]
    length = float(np.median(devices.length)) if len(devices) else None
    process = inferred(netlist, max(volts, default=None), length)
    return at_length(process, length) if process.origin == "generic" and length else process
