"""Voltages that are given: supplies and inputs, each a level with one ramp to another."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray


@dataclass(frozen=True)
class Ramps:
    """One ramp for each given node, shape ``(given,)`` each.

    Parameters
    ----------
    before, after : FloatArray, V
        Equal for a supply.
    begin, duration : FloatArray, s
        The duration is above zero.
    """

    before: FloatArray
    after: FloatArray
    begin: FloatArray
    duration: FloatArray

    def __len__(self) -> int:
        return len(self.before)

    def at(self, time: float) -> FloatArray:
        """Return the voltages at a time, V, shape (given,)."""
        share = np.clip((time - self.begin) / self.duration, 0.0, 1.0)
        result: FloatArray = self.before + (self.after - self.before) * share
        return result

    @property
    def corners(self) -> tuple[float, ...]:
        """Times at which some voltage bends, ascending; between them all are straight."""
        moving = self.before != self.after
        begin, end = self.begin[moving], (self.begin + self.duration)[moving]
        return tuple(np.unique(np.concatenate([begin, end])).tolist())


def constant(levels: FloatArray) -> Ramps:
    """Return voltages that stay as they are."""
    return Ramps(levels, levels, np.zeros(len(levels)), np.ones(len(levels)))


def switching(before: FloatArray, after: FloatArray, begin: float, duration: float) -> Ramps:
    """Return voltages that all move at the same time."""
    shape = np.ones(len(before))
    return Ramps(before, after, begin * shape, duration * shape)
