"""A block as switches between nets, and the values nets can have."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import Devices, FloatArray, IntArray

BoolArray = NDArray[np.bool_]
Values = NDArray[np.int8]
"""Values of nets: 0, 1 or `UNKNOWN`."""

UNKNOWN: Final = -1
"""The value that is 0 or 1, nobody knows which, or a level between: X of the literature."""


@dataclass(frozen=True)
class Switches:
    """Devices that conduct as their gates say, between nets.

    Parameters
    ----------
    drain, gate, source : IntArray, shape (devices,)
        Net ids.
    is_n : BoolArray, shape (devices,)
        Closed by 1 (else by 0).
    resistance : FloatArray, ohm, shape (devices,)
        When closed.
    cap : FloatArray, F, shape (nets,)
        All that hangs on each net: what its charge is worth against that of others.
    supply : Values, shape (nets,)
        Value of each supply; `UNKNOWN` for other nets.
    names : sequence of str
        Of the nets.
    """

    drain: IntArray
    gate: IntArray
    source: IntArray
    is_n: BoolArray
    resistance: FloatArray
    cap: FloatArray
    supply: Values
    names: Sequence[str] = field(repr=False)

    def some(self, which: BoolArray) -> Switches:
        """Return only some of the devices, between the same nets."""
        return Switches(
            self.drain[which],
            self.gate[which],
            self.source[which],
            self.is_n[which],
            self.resistance[which],
            self.cap,
            self.supply,
            self.names,
        )


def switches_of(
    devices: Devices,
    high: BoolArray,
    low: BoolArray,
    resistance: FloatArray,
    cap: FloatArray,
) -> Switches:
    """Return the transistors of a block as switches.

    Parameters
    ----------
    devices : Devices
    high, low : BoolArray, shape (nets,)
        Supplies.
    resistance : FloatArray, ohm, shape (devices,)
    cap : FloatArray, F, shape (nets,)
    """
    polarity = np.array([model.polarity == "n" for model in devices.models], bool)
    is_n = polarity[devices.model] if len(devices) else np.zeros(0, bool)
    supply = np.where(high, 1, np.where(low, 0, UNKNOWN)).astype(np.int8)
    return Switches(
        devices.drain,
        devices.gate,
        devices.source,
        is_n,
        resistance,
        cap,
        supply,
        devices.net_names,
    )
