"""A block with some widths in every corner it has to work in."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from evenstage.sizing.limiting import worst_charged
from evenstage.timing.sweep import sweep

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray
    from evenstage.timing.sweep import Timing


@dataclass(frozen=True, slots=True)
class Timed:
    """One block timed in each corner; the worst corner counts.

    Parameters
    ----------
    corners : tuple of Timing
        In the order asked for; gates have the same numbers in all of them.
    """

    corners: tuple[Timing, ...]

    @property
    def lateness(self) -> float:
        """How late the latest path end is, required times counted in, s."""
        return max(_latest(one) for one in self.corners)

    @property
    def charged(self) -> float:
        """The same in charged delay, s."""
        return max(worst_charged(one) for one in self.corners)

    @property
    def limiting(self) -> int:
        """The corner that is latest, the first of equal ones."""
        late = [_latest(one) for one in self.corners]
        return late.index(max(late))


def resized(block: Timed, factor: FloatArray) -> Timed:
    """Time a block anew with every device's width multiplied by a factor, shape (devices,)."""
    return Timed(
        tuple(sweep(one.circuit.resized(factor), one.graph, one.unit) for one in block.corners)
    )


def _latest(timing: Timing) -> float:
    return float(timing.lateness.max())
