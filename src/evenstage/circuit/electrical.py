"""Resistance and capacitance of every device: the part that scales and the part that stays.

A quantity ``q`` of a device whose width is multiplied by ``x`` becomes ``scaling * x + fixed``
(capacitance) or ``scaling / x + fixed`` (resistance). Copies in parallel are one device here.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Literal

import numpy as np

from evenstage.circuit.sharing import shared_ends

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import Devices, FloatArray, IntArray
    from evenstage.process.process import Junction, Process, Transistor


@dataclass(frozen=True)
class Scaled:
    """A quantity per device in two parts, shape ``(n,)`` each."""

    scaling: FloatArray
    fixed: FloatArray

    @cached_property
    def today(self) -> FloatArray:
        """The quantity at today's width."""
        return self.scaling + self.fixed if self.fixed.any() else self.scaling


@dataclass(frozen=True)
class Constant:
    """A constant of the transistor types, looked up per device.

    Parameters
    ----------
    of_model : FloatArray, shape (models,)
    model : IntArray, shape (n,)
        Of each device.
    """

    of_model: FloatArray
    model: IntArray

    def __getitem__(self, devices: IntArray | int) -> FloatArray:
        """Return the values of some devices, shape as given."""
        found: FloatArray = self.of_model[self.model[devices]]
        return found


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
    stack: Constant
    slope: Constant
    slope_power: Constant
    shape: Constant
    shape_carry: Constant
    slope_stack: Constant
    shape_stack: Constant
    weak_swing: Constant

    def slope_in_stack(self, device: IntArray, more: IntArray) -> FloatArray:
        """Return the slope of devices with so many more in series, relative to one alone."""
        return _in_stack(self.slope_stack[device], self.stack[device], more)

    def shape_in_stack(self, device: IntArray, more: IntArray) -> FloatArray:
        """Return the shape of devices with so many more in series, relative to one alone."""
        return _in_stack(self.shape_stack[device], self.stack[device], more)

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

    def constant(name: str) -> Constant:
        return _constant(devices, [getattr(kind, name) for kind in kinds])

    plain = _by_width(devices, kinds)
    rise = _diffusion(devices, kinds, plain, "rise")
    alike = all(k.junctions is None or k.junctions.rise == k.junctions.fall for k in kinds)
    copies = devices.multiplier
    length = devices.length / _column(constant("length"))
    width = devices.width
    return Electrical(
        resistance=Scaled(
            _column(constant("r_w")) * length / (width * copies),
            _column(constant("r_fixed"), 1 / copies),
        ),
        gate=Scaled(
            _column(constant("c_gate")) * width * length * copies,
            _column(constant("c_gate_fixed"), copies),
        ),
        rise=rise,
        fall=rise if alike else _diffusion(devices, kinds, plain, "fall"),
        stack=constant("stack"),
        slope=constant("slope"),
        slope_power=constant("slope_power"),
        shape=constant("shape"),
        shape_carry=constant("shape_carry"),
        slope_stack=constant("slope_stack"),
        shape_stack=constant("shape_stack"),
        weak_swing=constant("weak_swing"),
    )


def _constant(devices: Devices, values: Sequence[float]) -> Constant:
    return Constant(np.array(values, float), devices.model)


def _column(constant: Constant, factor: FloatArray | float = 1.0) -> FloatArray:
    """Return a constant of every device times a factor; a constant of zero takes no room."""
    if not constant.of_model.any():
        return np.broadcast_to(0.0, len(constant.model))
    return constant.of_model[constant.model] * factor


def _in_stack(part: FloatArray, stack: FloatArray, more: IntArray) -> FloatArray:
    """Return what is left where only a part of the stack factor counts."""
    counted: FloatArray = (1 + part * stack * more) / (1 + stack * more)
    return counted


def _mean(one: Scaled, other: Scaled) -> Scaled:
    if one is other:
        return one
    return Scaled((one.scaling + other.scaling) / 2, (one.fixed + other.fixed) / 2)


def _diffusion(
    devices: Devices,
    kinds: Sequence[Transistor],
    plain: Diffusion,
    edge: Literal["rise", "fall"],
) -> Diffusion:
    given = [None if kind.junctions is None else getattr(kind.junctions, edge) for kind in kinds]
    drain = devices.drain_area, devices.drain_edge, "drain_fixed"
    source = devices.source_area, devices.source_edge, "source_fixed"
    return Diffusion(
        _end(devices, given, drain, plain.drain), _end(devices, given, source, plain.source)
    )


def _by_width(devices: Devices, kinds: Sequence[Transistor]) -> Diffusion:
    """Return the diffusion of devices whose areas nobody knows."""

    def constant(name: str) -> Constant:
        return _constant(devices, [getattr(kind, name) for kind in kinds])

    alone = Scaled(
        _column(constant("c_drain"), devices.width) * devices.multiplier,
        _column(constant("c_drain_fixed"), devices.multiplier),
    )
    if all(kind.drain_shared == kind.drain_inner == 1 for kind in kinds):
        return Diffusion(alone, alone)
    shared, inner = (
        constant(name).of_model[devices.model] for name in ("drain_shared", "drain_inner")
    )
    drain, source = (ends.factor(shared, inner) for ends in shared_ends(devices))
    return Diffusion(
        Scaled(alone.scaling * drain, alone.fixed * drain),
        Scaled(alone.scaling * source, alone.fixed * source),
    )


def _end(
    devices: Devices,
    junctions: Sequence[Junction | None],
    drawn: tuple[FloatArray, FloatArray, str],
    by_width: Scaled,
) -> Scaled:
    """Return drain or source capacitance: of its area and perimeter where both are known.

    With ``E = area / W`` the extent of the diffusion, the perimeter ``2 E + k W`` has a part that
    does not grow with the width.
    """
    area, edge, fixed = drawn
    if all(one is None for one in junctions) or np.isnan(area).all():
        return by_width

    def column(name: str) -> FloatArray:
        table = [np.nan if one is None else getattr(one, name) for one in junctions]
        return _column(_constant(devices, table))

    side, copies = column("edge"), devices.multiplier
    extent = area / devices.width
    growing_edge = np.maximum(edge - 2 * extent, 0.0)
    scaling = column("area") * area + side * growing_edge + column("overlap") * devices.width
    staying = side * np.minimum(2 * extent, edge) + column(fixed)
    known = ~np.isnan(scaling)
    return Scaled(
        np.where(known, scaling * copies, by_width.scaling),
        np.where(known, staying * copies, by_width.fixed),
    )
