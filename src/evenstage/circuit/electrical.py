"""Resistance and capacitance of every device: the part that scales and the part that stays.

A quantity ``q`` of a device whose width is multiplied by ``x`` becomes ``scaling * x + fixed``
(capacitance) or ``scaling / x + fixed`` (resistance). Copies in parallel are one device here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.netlist.devices import Devices, FloatArray
    from evenstage.process.process import Process


@dataclass(frozen=True, slots=True)
class Scaled:
    """A quantity per device in two parts, shape ``(n,)`` each."""

    scaling: FloatArray
    fixed: FloatArray

    @property
    def today(self) -> FloatArray:
        """The quantity at today's width."""
        return self.scaling + self.fixed


@dataclass(frozen=True)
class Electrical:
    """What the devices of a block are worth in a process; ohm and F, shape ``(n,)`` each."""

    resistance: Scaled
    gate: Scaled
    drain: Scaled
    source: Scaled
    stack: FloatArray
    slope: FloatArray
    slope_power: FloatArray
    shape: FloatArray
    shape_carry: FloatArray


def electrical(devices: Devices, process: Process) -> Electrical:
    """Return resistance, capacitance and transition constants of every device."""
    kinds = [process.transistors[model.type_index] for model in devices.models]

    def constant(name: str) -> FloatArray:
        table = np.array([getattr(kind, name) for kind in kinds], float)
        return table[devices.model] if len(devices) else np.zeros(0)

    copies = devices.multiplier
    length = devices.length / constant("length")
    width = devices.width
    return Electrical(
        resistance=Scaled(
            constant("r_w") * length / (width * copies), constant("r_fixed") / copies
        ),
        gate=Scaled(
            constant("c_gate") * width * length * copies, constant("c_gate_fixed") * copies
        ),
        drain=_diffusion(devices, process, devices.drain_area, devices.drain_edge),
        source=_diffusion(devices, process, devices.source_area, devices.source_edge),
        stack=constant("stack"),
        slope=constant("slope"),
        slope_power=constant("slope_power"),
        shape=constant("shape"),
        shape_carry=constant("shape_carry"),
    )


def _diffusion(devices: Devices, process: Process, area: FloatArray, edge: FloatArray) -> Scaled:
    """Return drain or source capacitance: of its area and perimeter where both are known.

    With ``E = area / W`` the extent of the diffusion, the perimeter ``2 E + k W`` has a part that
    does not grow with the width.
    """
    kinds = [process.transistors[model.type_index] for model in devices.models]
    per_width = np.array([kind.c_drain for kind in kinds], float)[devices.model]
    fixed = np.array([kind.c_drain_fixed for kind in kinds], float)[devices.model]
    bottom = np.array([k.junction.area if k.junction else np.nan for k in kinds])[devices.model]
    side = np.array([k.junction.edge if k.junction else np.nan for k in kinds])[devices.model]
    extent = area / devices.width
    growing_edge = np.maximum(edge - 2 * extent, 0.0)
    scaling = bottom * area + side * growing_edge
    staying = side * np.minimum(2 * extent, edge)
    known = ~np.isnan(scaling)
    return Scaled(
        np.where(known, scaling, per_width * devices.width) * devices.multiplier,
        np.where(known, staying, fixed) * devices.multiplier,
    )
