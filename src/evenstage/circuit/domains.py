"""Which supply each gate stands on, and where one supply's signals enter another's gates.

A gate whose input only swings to a lower supply than its own never turns its pMOS off; one whose
input swings higher may break. Either way a level shifter is wanted in between (common practice, no
source).
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.circuit.kinds.cross_coupled import KINDS
from evenstage.circuit.names import NAMES_MAX
from evenstage.errors import Notice
from evenstage.netlist.wording import counted

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import IntArray

MIXED = -2
"""Domain of a gate whose transistors hang on several high supplies."""


def domains(circuit: Circuit) -> IntArray:
    """Return the high supply net of each gate; -1 where it has none, `MIXED` for several."""
    devices, is_high = circuit.devices, circuit.supplies.is_high
    lowest = np.full(len(circuit), len(is_high), np.int32)
    highest = np.full(len(circuit), -1, np.int32)
    for ends in (devices.drain, devices.source):
        on = np.flatnonzero(is_high[ends] & (circuit.gate_of_device >= 0))
        np.minimum.at(lowest, circuit.gate_of_device[on], ends[on])
        np.maximum.at(highest, circuit.gate_of_device[on], ends[on])
    result: IntArray = np.where((highest >= 0) & (lowest != highest), MIXED, highest)
    return result


def domain_notices(circuit: Circuit) -> list[Notice]:
    """Name the nets that gates of one high supply drive and plain gates of another read."""
    if not len(circuit) or circuit.supplies.is_high.sum() < 2:
        return []
    domain = domains(circuit)
    if len(np.unique(domain[domain >= 0])) < 2:
        return []
    driver = circuit.driver_of_net[circuit.pins.net]
    shifts = np.array([some.form.kind in KINDS.values() for some in circuit.alike], bool)
    reader = domain[circuit.pins.gate]
    source = np.where(driver >= 0, domain[driver], -1)
    crosses = (source >= 0) & (reader >= 0) & (source != reader)
    crosses &= ~shifts[circuit.gate_form[circuit.pins.gate]]
    if not crosses.any():
        return []
    names = circuit.devices.net_names
    nets = np.unique(circuit.pins.net[crosses])
    first = int(np.flatnonzero(crosses & (circuit.pins.net == nets[0]))[0])
    return [
        Notice(
            "supply-crossed",
            f"{counted(len(nets), 'net')} driven from one supply and read by gates of another "
            f"without a level shifter: '{names[int(nets[0])]}' leads from '{names[source[first]]}' "
            f"to '{names[reader[first]]}'",
            names=tuple(names[net] for net in nets[:NAMES_MAX].tolist()),
        )
    ]
