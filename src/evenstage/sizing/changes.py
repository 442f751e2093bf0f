"""Drawn widths on their way into the text: what is written where, why, and what each buys alone."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.netlist.rewriting.sized_block import Slot
from evenstage.netlist.rewriting.widths import WidthPlan, WidthWish, plan_widths
from evenstage.sizing.results import Change
from evenstage.sizing.size_trials import tried_sizes
from evenstage.timing.search import slowest_paths

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray
    from evenstage.sizing.partition import Partition
    from evenstage.sizing.rounding import Rounding
    from evenstage.sizing.timed import Timed
    from evenstage.timing.results import Path
    from evenstage.timing.sweep import Timing

_SAME = 1e-9
"""Relative difference below which two widths are one."""


@dataclass(frozen=True)
class Writing:
    """The widths of one answer and the text they go into.

    Parameters
    ----------
    timing : Timing
        The block as drawn, in the corner that limits it.
    slowest : Path
        Its slowest path there.
    rounding : Rounding
        What found the widths.
    """

    timing: Timing
    slowest: Path
    rounding: Rounding

    def plan(self, width: FloatArray) -> WidthPlan:
        """Return how widths are written; those that are as drawn are left alone.

        Parameters
        ----------
        width : FloatArray, m, shape (slots,)
        """
        drawn = self.rounding.drawn
        differs = np.flatnonzero(np.abs(width / drawn - 1) > _SAME)
        wishes = [
            WidthWish(
                card=self._parts.slots[slot].card,
                caller=self._parts.slots[slot].caller,
                old=float(drawn[slot]),
                new=float(width[slot]),
                why=self._why(slot),
            )
            for slot in differs.tolist()
        ]
        return plan_widths(self.rounding.handles, wishes)

    def width(self, plan: WidthPlan) -> FloatArray:
        """Return the width of every slot as it will be read back, m, shape (slots,)."""
        width = self.rounding.drawn.copy()
        for written in plan.written:
            slot = self._number[Slot(written.card, written.caller)]
            width[slot] *= written.new / written.old
        return width

    def changes(self, plan: WidthPlan) -> tuple[Change, ...]:
        """Return what is written, gate by gate in the order of the text."""
        parts, circuit = self._parts, self.timing.circuit
        occurrences = np.bincount(parts.slot_of_device[parts.slot_of_device >= 0]).tolist()
        gate_of_slot = circuit.gate_of_device[parts.first_device].tolist()
        width = self.width(plan)
        alone, last, handle = (
            self._alone(width),
            self._last(width),
            parts.handle[parts.of_slot].tolist(),
        )
        numbered = [(self._number[Slot(w.card, w.caller)], w) for w in plan.written]
        numbered.sort(key=lambda pair: (handle[pair[0]], pair[1].card))
        return tuple(
            Change(
                card=circuit.devices.netlist.card(written.card).name,
                file=written.file,
                line=written.line,
                instance=circuit.gate_name(gate_of_slot[slot]),
                occurrences=occurrences[slot],
                parameter=written.parameter,
                old=written.old,
                new=written.new,
                alone=float(alone[parts.of_slot[slot]]),
                last=float(last[parts.of_slot[slot]]),
                why=self._why(slot),
            )
            for slot, written in numbered
        )

    @property
    def _parts(self) -> Partition:
        return self.rounding.engine.variables.partition

    @cached_property
    def _number(self) -> dict[Slot, int]:
        return {slot: number for number, slot in enumerate(self._parts.slots)}

    @cached_property
    def _effort_of_size(self) -> dict[int, float]:
        """Stage effort of the sizes on the slowest path, of the first stage of each."""
        graph, circuit = self.timing.graph, self.timing.circuit
        arcs = graph.arc[list(next(slowest_paths(self.timing)))]
        stages = zip(arcs[:, None], self.slowest.stages, strict=True)
        return {
            size: stage.stage_effort
            for arc, stage in reversed(list(stages))
            for size in self._parts.of_gate[circuit.arcs.gates_along(arc)].ravel().tolist()
        }

    def _why(self, slot: int) -> str:
        """Say in a few words why a width changes."""
        size = int(self._parts.of_slot[slot])
        effort = self._effort_of_size.get(size)
        if effort is not None:
            return f"on the slowest path, stage effort was {effort:.2g}"
        if self.rounding.answer.sizes[size] < 1:
            return "loads a path that limits the block"
        return "on a path that would limit the block"

    def _alone(self, width: FloatArray) -> FloatArray:
        """Return how much each size moves the worst delay by itself, s, shape (sizes,)."""
        today = self.rounding.engine.today
        return self._moved(today, self.rounding.factors(width), width)

    def _last(self, width: FloatArray) -> FloatArray:
        """Return how much each size moves the worst delay after all others, s, shape (sizes,)."""
        after = self.rounding.timed(width)
        return -self._moved(after, 1 / self.rounding.factors(width), width)

    def _moved(self, block: Timed, factor: FloatArray, width: FloatArray) -> FloatArray:
        """Return how the worst delay over corners moves with each size whose width differs, s."""
        parts = self._parts
        change = np.zeros(len(parts))
        sizes = np.unique(parts.of_slot[width != self.rounding.drawn])
        if len(sizes):
            every = tried_sizes(block, factor, parts, sizes)
            worst = np.max([trials.worst for trials in every], axis=0)
            change[sizes] = worst - max(one.worst for one in block.corners)
        return change
