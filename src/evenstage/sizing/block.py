"""A block to be sized: its corners, what it must keep, and what is asked of it."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import SettingsError
from evenstage.netlist.rewriting.handles import width_handles
from evenstage.sizing.block_engine import engine_of
from evenstage.sizing.partition import partition
from evenstage.sizing.pulls import pulled_apart, skews, tied_by_text
from evenstage.sizing.timed import Timed
from evenstage.sizing.variables import variables
from evenstage.sizing.wishes import Original
from evenstage.timing.corners import Corners

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.brief import Brief
    from evenstage.circuit.circuit import Circuit
    from evenstage.errors import Notice
    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.process.process import Process
    from evenstage.sizing.engine import Engine
    from evenstage.sizing.partition import Partition
    from evenstage.sizing.wishes import Wishes
    from evenstage.timing.results import Analysis


@dataclass(frozen=True)
class Block:
    """One block in all its corners, and the question.

    Parameters
    ----------
    analyses : tuple of Analysis
        One for each corner.
    timed : Timed
        The same as drawn.
    brief : Brief
    wishes : Wishes
    originals : tuple of Original
        For each corner what an earlier run recorded.
    """

    analyses: tuple[Analysis, ...]
    timed: Timed
    brief: Brief
    wishes: Wishes
    originals: tuple[Original, ...]

    @classmethod
    def of(
        cls,
        analysis: Analysis | Corners,
        brief: Brief,
        wishes: Wishes,
        original: Original | Sequence[Original] | None,
    ) -> Block:
        """Put a block together.

        Raises
        ------
        SettingsError
            Where corners do not draw widths alike.
        ValueError
            Where an analysis carries no timing, or corners are not of one block.
        """
        analyses = analysis.analyses if isinstance(analysis, Corners) else (analysis,)
        known = [one.timing for one in analyses if one.timing is not None]
        if len(known) < len(analyses):
            message = "an analysis without its timing cannot be resized"
            raise ValueError(message)
        _refuse_unlike([one.circuit for one in known])
        if original is None or isinstance(original, Original):
            original = [original or Original()] * len(known)
        return cls(analyses, Timed(tuple(known)), brief, wishes, tuple(original))

    @property
    def circuit(self) -> Circuit:
        """The block in its first corner, for what is the same in all."""
        return self.timed.corners[0].circuit

    def partition(self) -> tuple[Partition, tuple[Notice, ...]]:
        """Return the sizes of the block, and what is to be said of them."""
        parts = partition(self.circuit, self.brief)
        if not self.wishes.apart:
            return parts, ()
        circuits = [one.circuit for one in self.timed.corners]
        together = self.handles(parts)
        parts, notices = pulled_apart(circuits, parts)
        parts, more = tied_by_text(self.circuit, parts, self.handles(parts), together)
        return parts, (*notices, *more)

    def handles(self, parts: Partition) -> WidthHandles:
        """Return how the widths of some sizes can be changed."""
        circuit = self.circuit
        copies = self.brief.copies_per_leaf
        return width_handles(circuit.devices, circuit.process, parts.variable_of, copies)

    def engine(self, parts: Partition, handles: WidthHandles) -> Engine:
        """Return the engine for some sizes."""
        free = variables(
            self.circuit,
            self.brief,
            parts,
            handles,
            self.originals[0].smallest,
            [one.circuit for one in self.timed.corners[1:]],
        )
        if parts.is_apart:
            bounds = skews(self.circuit, parts, self.brief.skew_least, self.brief.skew_most)
            free = replace(free, skews=bounds)
        return engine_of(self.timed, self.brief, self.wishes, self.originals, free)


def _refuse_unlike(circuits: Sequence[Circuit]) -> None:
    """Refuse corners that are not of one block, or that would write its widths differently."""
    first = circuits[0]
    for other in circuits[1:]:
        if not np.array_equal(first.gate_of_device, other.gate_of_device):
            message = "corners of different blocks cannot be sized together"
            raise ValueError(message)
        if _grid(first.process) != _grid(other.process):
            raise SettingsError(
                f"the processes '{first.process.name}' and '{other.process.name}' draw widths "
                "differently (models, what the width parameter means, width_step or "
                "finger_width_max); corners that are sized together must agree in that",
                code="corners-drawn-apart",
            )


def _grid(process: Process) -> object:
    """Return all of a process that decides how a width is written."""
    return [
        (
            *(tuple(pattern.text for pattern in kind.models), kind.polarity),
            *(kind.width_parameter, kind.width_is, kind.width_unit, kind.width_step),
            *(kind.fingers_parameter, kind.finger_width_max),
        )
        for kind in process.transistors
    ]
