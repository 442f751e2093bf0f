"""Resistance and capacitance of every device: the part that scales and the part that stays.

A quantity ``q`` of a device whose width is multiplied by ``x`` becomes ``scaling * x + fixed``
(capacitance) or ``scaling / x + fixed`` (resistance). Copies in parallel are one device here.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Literal

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import Devices, FloatArray
    from evenstage.process.process import Junction, Process, Transistor


@dataclass(frozen=True)
class Scaled:
    """A quantity per device in two parts, shape ``(n,)`` each."""

    scaling: FloatArray
    fixed: FloatArray

    @cached_property
    def today(self) -> FloatArray:
        """The quantity at today's width."""
        return self.scaling + self.fixed


@dataclass(frozen=True)
class Diffusion:
    """Capacitance of both channel ends of every device, F, shape ``(n,)`` each."""

    drain: Scaled
    source: Scaled


@dataclass(frozen=True)
class Electrical:
    """What the devices of a block are worth in a process; ohm and F, shape ``(n,)`` each.

    Diffusion counts as far as the 50 % delay of each edge sees it: ``rise`` and ``fall`` of the
    output it hangs on.
    """

    resistance: Scaled
    gate: Scaled
    rise: Diffusion
    fall: Diffusion
    stack: FloatArray
    slope: FloatArray
    slope_power: FloatArray
    shape: FloatArray
    shape_carry: FloatArray
    slope_stack: FloatArray
    shape_stack: FloatArray
    weak_swing: FloatArray

    @cached_property
    def drain(self) -> Scaled:
        """Drain capacitance over the whole swing."""
        return _mean(self.rise.drain, self.fall.drain)

    @cached_property
    def source(self) -> Scaled:
        """Source capacitance over the whole swing."""
        return _mean(self.rise.source, self.fall.source)


def electrical(devices: Devices, process: Process) -> Electrical:
    """Return resistance, capacitance and transition constants of every device."""
    kinds = [process.transistors[model.type_index] for model in devices.models]

    def constant(name: str) -> FloatArray:
        table = np.array([getattr(kind, name) for kind in kinds], float)
        return table[devices.model] if len(devices) else np.zeros(0)

    rise = _diffusion(devices, kinds, "rise")
    alike = all(k.junctions is None or k.junctions.rise == k.junctions.fall for k in kinds)
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
        rise=rise,
        fall=rise if alike else _diffusion(devices, kinds, "fall"),
        stack=constant("stack"),
        slope=constant("slope"),
        slope_power=constant("slope_power"),
        shape=constant("shape"),
        shape_carry=constant("shape_carry"),
        slope_stack=constant("slope_stack"),
        shape_stack=constant("shape_stack"),
        weak_swing=constant("weak_swing"),
    )


def _mean(one: Scaled, other: Scaled) -> Scaled:
    if one is other:
        return one
    return Scaled((one.scaling + other.scaling) / 2, (one.fixed + other.fixed) / 2)


def _diffusion(
    devices: Devices, kinds: Sequence[Transistor], edge: Literal["rise", "fall"]
) -> Diffusion:
    given = [None if kind.junctions is None else getattr(kind.junctions, edge) for kind in kinds]
    drains = (devices.drain_area, devices.drain_edge, "drain_fixed")
    sources = (devices.source_area, devices.source_edge, "source_fixed")
    return Diffusion(_end(devices, kinds, given, *drains), _end(devices, kinds, given, *sources))


def _end(
    devices: Devices,
    kinds: Sequence[Transistor],
    junctions: Sequence[Junction | None],
    area: FloatArray,
    edge: FloatArray,
    fixed: str,
) -> Scaled:
    """Return drain or source capacitance: of its area and perimeter where both are known.

    With ``E = area / W`` the extent of the diffusion, the perimeter ``2 E + k W`` has a part that
    does not grow with the width.
    """

    def constant(name: str) -> FloatArray:
        table = [np.nan if one is None else getattr(one, name) for one in junctions]
        return np.array(table, float)[devices.model]

    per_width = np.array([kind.c_drain for kind in kinds], float)[devices.model]
    by_width = np.array([kind.c_drain_fixed for kind in kinds], float)[devices.model]
    side = constant("edge")
    extent = area / devices.width
    growing_edge = np.maximum(edge - 2 * extent, 0.0)
    scaling = constant("area") * area + side * growing_edge + constant("overlap") * devices.width
    staying = side * np.minimum(2 * extent, edge) + constant(fixed)
    known = ~np.isnan(scaling)
    return Scaled(
        np.where(known, scaling, per_width * devices.width) * devices.multiplier,
        np.where(known, staying, by_width) * devices.multiplier,
    )
