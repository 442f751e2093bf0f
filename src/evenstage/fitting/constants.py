"""The constants of a process as the unknowns of a fit.

What must be positive is fitted by its logarithm; what may be zero by its ratio to a scale of its
own, so that a change of 0.1 in any unknown is a tenth of something that matters. Gate capacitance
has one factor for all transistor types: an input pin holds both polarities, nearly always in one
proportion, and nothing measured at pins tells them apart.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.devices import FloatArray
    from evenstage.process.process import Process, Transistor

#: Least and most of what is fitted by its logarithm, relative to where it starts.
_FACTOR: Final = (1e-3, 1e3)

#: Bounds of plain numbers. Below a slope_power of 0.45 the delay hardly depends on the Elmore delay
#: and r_w loses its meaning; a shape_carry of 1 would let transitions grow without end.
_NUMBERS: Final = {
    "stack": (0.05, 2.0),
    "slope": (0.0, 4.0),
    "slope_power": (0.45, 1.0),
    "shape": (0.1, 10.0),
    "shape_carry": (0.0, 0.95),
    "slope_stack": (0.0, 1.5),
    "shape_stack": (0.0, 1.5),
    "weak_swing": (0.0, 1.0),
    "drain_shared": (0.2, 1.0),
    "drain_inner": (0.1, 1.0),
}

#: Where plain numbers start if the process to begin with leaves the plain linear model.
_STARTS: Final = {
    "slope": 0.3,
    "slope_power": 0.7,
    "shape": 2.0,
    "shape_carry": 0.3,
    "slope_stack": 0.6,
    "shape_stack": 0.6,
    "weak_swing": 0.5,
    "drain_shared": 0.8,
    "drain_inner": 0.5,
}

#: Plain numbers that the plain linear model takes as 1; the others it takes as 0.
_ONES: Final = frozenset(
    {"slope_power", "slope_stack", "shape_stack", "weak_swing", "drain_shared", "drain_inner"}
)

#: Constant parts, each with the constant whose value at the scale's width is its scale, and the
#: most it can be of that.
_FIXED: Final = {"r_fixed": "r_w", "c_drain_fixed": "c_drain", "c_gate_fixed": "c_gate"}
_FIXED_MOST: Final = 3.0


@dataclass(frozen=True, slots=True)
class Unknown:
    """One constant to be fitted.

    Parameters
    ----------
    key : str
        As in the process file.
    types : tuple of int
        Transistor types that it belongs to.
    scale : float
        Unit of the unknown; of a logarithm, where the constant starts.
    start, least, most : float
        Of the unknown.
    is_log : bool
        Whether the unknown is the logarithm of the constant over its scale.
    """

    key: str
    types: tuple[int, ...]
    scale: float
    start: float
    least: float
    most: float
    is_log: bool = False

    def value(self, unknown: float) -> float:
        """Return the constant for the first type that an unknown stands for."""
        return self.scale * (math.exp(unknown) if self.is_log else unknown)

    def error(self, unknown: float, error: float) -> float:
        """Return the standard error of the constant from that of the unknown."""
        return abs(self.value(unknown)) * error if self.is_log else self.scale * error


def unknowns_of(process: Process, types: Sequence[int], width: float) -> tuple[Unknown, ...]:
    """Return everything to be fitted.

    Parameters
    ----------
    process : Process
        Where the fit starts.
    types : sequence of int
        The transistor types measured.
    width : float
        m; a usual one, which makes the scales of constant parts.
    """
    found = [
        unknown
        for index in types
        for unknown in (
            _factor(process, "r_w", (index,)),
            _fixed(process, "r_fixed", (index,), 1 / width),
            _factor(process, "c_drain", (index,)),
            _fixed(process, "c_drain_fixed", (index,), width),
            *(_number(process.transistors[index], key, index) for key in _NUMBERS),
        )
    ]
    every = tuple(types)
    gate = (
        _factor(process, "c_gate", every),
        _fixed(process, "c_gate_fixed", every, width),
    )
    return (*found, *gate)


def _factor(process: Process, key: str, types: tuple[int, ...]) -> Unknown:
    least, most = map(math.log, _FACTOR)
    # A drain without capacitance has no logarithm: begin with as much as a gate.
    first = process.transistors[types[0]]
    scale = getattr(first, key) or first.c_gate
    return Unknown(key, types, scale, 0.0, least, most, is_log=True)


def _fixed(process: Process, key: str, types: tuple[int, ...], width: float) -> Unknown:
    first = process.transistors[types[0]]
    scale = (getattr(first, _FIXED[key]) or first.c_gate) * width
    start = min(max(getattr(first, key) / scale, 0.02), _FIXED_MOST / 2)
    return Unknown(key, types, scale, start, 0.0, _FIXED_MOST)


def _number(transistor: Transistor, key: str, index: int) -> Unknown:
    least, most = _NUMBERS[key]
    given = getattr(transistor, key)
    is_plain = given == (1 if key in _ONES else 0)
    start = _STARTS.get(key, 0.1) if is_plain else given
    margin = 1e-3 * (most - least)
    return Unknown(key, (index,), 1.0, min(max(start, least + margin), most - margin), least, most)


def with_constants(process: Process, unknowns: Sequence[Unknown], at: FloatArray) -> Process:
    """Return a process with its constants at given unknowns."""
    changes: list[dict[str, float]] = [{} for _ in process.transistors]
    for unknown, value in zip(unknowns, at.tolist(), strict=True):
        for index in unknown.types:
            constant = unknown.value(value)
            if unknown.is_log and index != unknown.types[0]:
                own = getattr(process.transistors[index], unknown.key)
                constant *= own / getattr(process.transistors[unknown.types[0]], unknown.key)
            changes[index][unknown.key] = constant
    return replace(
        process,
        transistors=tuple(
            replace(transistor, **change)  # type: ignore[arg-type] # every key is a float field
            for transistor, change in zip(process.transistors, changes, strict=True)
        ),
    )


def starts(unknowns: Sequence[Unknown]) -> FloatArray:
    """Return where the unknowns start."""
    return np.array([unknown.start for unknown in unknowns])


def bounds(unknowns: Sequence[Unknown]) -> tuple[FloatArray, FloatArray]:
    """Return least and most of the unknowns."""
    return (
        np.array([unknown.least for unknown in unknowns]),
        np.array([unknown.most for unknown in unknowns]),
    )
