"""Continuous sizes to widths that can be drawn.

Widths go to the nearest width the card can say. Then broken deadlines are repaired by single steps,
the most delay for the least cost first, and what the steps and the rounding left over is recovered
by single steps down. Every step is judged by the block's exact delays, ceilings and transitions, so
the widths that leave here keep every limit they are said to keep.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from evenstage.sizing.engine import worst_charged
from evenstage.timing.sweep import sweep

if TYPE_CHECKING:
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.handles import WidthHandle, WidthHandles
    from evenstage.sizing.engine import Continuous, Engine
    from evenstage.timing.sweep import Timing

_DEFAULT_STEP = 1e-9
"""m; grid where the process gives none: no mask is drawn finer."""
_STAYS = 2e-3
"""Relative change of a size below which its cards are left alone."""
_CANDIDATES = 48
"""How many sizes one repair step or the recovery tries."""
_REPAIRS = 60
"""How many single steps may repair the deadline."""
_ROOM = 1e-9
"""Relative room for the noise of binary arithmetic."""


@dataclass(frozen=True)
class Drawn:
    """Widths that can be written, and what they amount to.

    Parameters
    ----------
    slot_width : FloatArray, m, shape (slots,)
        Of one copy, all fingers together.
    timing : Timing
    cost : float
        In the unit of the engine's spend.
    """

    slot_width: FloatArray
    timing: Timing
    cost: float


@dataclass(frozen=True)
class Rounding:
    """One rounding: the engine, its answer, and how each width may be written."""

    engine: Engine
    answer: Continuous
    handles: WidthHandles

    def run(self) -> Drawn:
        """Round, repair and recover."""
        width = self._keep_ceilings(self._rounded())
        width = self._recovered(self._repaired(width))
        return Drawn(width, self.timed(width), self.cost(width))

    @cached_property
    def drawn(self) -> FloatArray:
        """Today's width of each slot, m, shape (slots,)."""
        parts = self.engine.model.variables.partition
        return self.engine.model.circuit.devices.width[parts.first_device]

    @cached_property
    def _slots_of_size(self) -> list[IntArray]:
        parts = self.engine.model.variables.partition
        order = np.argsort(parts.of_slot, kind="stable").astype(np.int32)
        cuts = np.searchsorted(parts.of_slot[order], np.arange(1, len(parts)))
        return np.split(order, cuts)

    @cached_property
    def _cost_per_width(self) -> FloatArray:
        """Cost of one metre on each slot, shape (slots,)."""
        variables = self.engine.model.variables
        parts, block = variables.partition, self.engine.model.circuit.devices
        mine = parts.slot_of_device >= 0
        total = np.bincount(
            parts.slot_of_device[mine],
            (block.width * block.multiplier)[mine],
            len(parts.slots),
        )
        of_size = np.bincount(parts.of_slot, total, len(parts))
        share = total / of_size[parts.of_slot]
        result: FloatArray = self.engine.spend[parts.of_slot] * share / self.drawn
        return result

    def factors(self, width: FloatArray) -> FloatArray:
        """Return each device's width factor for some slot widths, shape (devices,)."""
        parts = self.engine.model.variables.partition
        return np.append(width / self.drawn, 1.0)[parts.slot_of_device]

    def timed(self, width: FloatArray) -> Timing:
        """Time the block with some slot widths."""
        model = self.engine.model
        return sweep(model.circuit.resized(self.factors(width)), model.graph, model.unit)

    def cost(self, width: FloatArray) -> float:
        """Return the whole cost of some slot widths."""
        return self.engine.spend_fixed + float(self._cost_per_width @ width)

    @cached_property
    def _bundles_of_size(self) -> list[list[list[int]]]:
        """The slots of each size, those that hang on one number in the text together."""
        return [self._bundles(slots.tolist()) for slots in self._slots_of_size]

    def _bundles(self, slots: list[int]) -> list[list[int]]:
        """Group the slots whose widths come from the same numbers, the narrowest of each first."""
        by_number: dict[tuple[object, ...], list[int]] = {}
        for slot in slots:
            origins = self._handle(slot).origins
            spans = tuple(
                (str(o.parameter.span.source.path), o.parameter.span.start) for o in origins
            )
            by_number.setdefault(spans or (slot,), []).append(slot)
        return [sorted(some, key=lambda slot: self.drawn[slot]) for some in by_number.values()]

    def _draw(self, width: FloatArray, size: int, wanted: FloatArray) -> None:
        """Write the drawable widths nearest to the wanted ones of a size's slots into ``width``.

        Widths that hang on one number keep their ratio: the narrowest goes to the grid, where the
        others, usually its multiples, then lie too.
        """
        for bundle in self._bundles_of_size[size]:
            first = bundle[0]
            ratio = self._drawable(first, float(wanted[first])) / self.drawn[first]
            for slot in bundle:
                width[slot] = self.drawn[slot] * ratio

    def _drawable(self, slot: int, wanted: float) -> float:
        """Return the nearest width a slot can say inside the bounds of its size."""
        size = int(self.engine.model.variables.partition.of_slot[slot])
        low = self.drawn[slot] * self.answer.lower[size] * (1 - _ROOM)
        high = self.drawn[slot] * self.answer.upper[size] * (1 + _ROOM)
        step = self._step(slot)
        handle = self._handle(slot)
        width = handle.drawable(min(max(wanted, low), high), step)
        while width < low:
            width = handle.drawable(width + step, step)
        while width > high and width > low + step:
            width = handle.drawable(width - step, step)
        return width if low <= width <= high else float(self.drawn[slot])

    def _handle(self, slot: int) -> WidthHandle:
        return self.handles[self.engine.model.variables.partition.slots[slot]]

    def _step(self, slot: int) -> float:
        """Return the grid of a slot, m, all fingers together."""
        handle = self._handle(slot)
        step = handle.transistor.width_step or _DEFAULT_STEP
        per_finger = handle.transistor.width_is == "finger"
        return step * handle.drawing.fingers if per_finger else step

    def _rounded(self) -> FloatArray:
        """Return all widths on the grid, those of sizes that hardly move as drawn."""
        width = self.drawn.copy()
        moves = self.answer.active & (np.abs(np.log(self.answer.sizes)) > _STAYS)
        for size in np.flatnonzero(moves).tolist():
            self._draw(width, size, self.drawn * self.answer.sizes[size])
        return width

    def _stepped(self, width: FloatArray, size: int, direction: int) -> FloatArray:
        """Return the widths with one size a step wider or narrower.

        The slot with the finest relative step moves by one step; the others follow in proportion.
        """
        slots = self._slots_of_size[size].tolist()
        ratio = 1 + direction * min(self._step(slot) / width[slot] for slot in slots)
        moved = width.copy()
        self._draw(moved, size, width * ratio)
        return moved

    def _excess(self, timing: Timing) -> float:
        """Return by what share the worst deadline or transition limit is broken; <= 0: none."""
        wanted = self.engine.wishes.delay
        if wanted is None:
            late = worst_charged(timing) / self.answer.deadline
        else:
            late = float(timing.lateness.max()) / wanted
        most = self.engine.limits.transition
        if not self.engine.limits.strict:
            most = max(most, self.engine.today.worst_transition)
        return max(late, timing.worst_transition / most) - 1 - _ROOM

    def _over_ceiling(self, timing: Timing) -> IntArray:
        """Return the nets whose input capacitance exceeds its ceiling."""
        limits = self.engine.limits
        cap = timing.circuit.net_cap[limits.ceiling_net]
        return limits.ceiling_net[cap > limits.ceiling * (1 + _ROOM)]

    def _keep_ceilings(self, width: FloatArray) -> FloatArray:
        """Step down the sizes on inputs over their ceiling until none is."""
        model = self.engine.model
        pins = model.circuit.pins
        while len(over := self._over_ceiling(self.timed(width))):
            gates = pins.gate[np.isin(pins.net, over)]
            lowered = width
            for size in np.unique(model.variables.partition.of_gate[gates]).tolist():
                if self.answer.active[size]:
                    lowered = self._stepped(lowered, size, -1)
            if (lowered == width).all():
                return width
            width = lowered
        return width

    def _repaired(self, width: FloatArray) -> FloatArray:
        """Step sizes until every deadline is met or no step helps."""
        for _ in range(_REPAIRS):
            timing = self.timed(width)
            excess = self._excess(timing)
            if excess <= 0:
                return width
            best, best_worth = width, 0.0
            for size in self._candidates(timing):
                for direction in (1, -1):
                    tried = self._stepped(width, size, direction)
                    outcome = self.timed(tried)
                    if (tried == width).all() or len(self._over_ceiling(outcome)):
                        continue
                    gain = excess - self._excess(outcome)
                    spent = max(self.cost(tried) - self.cost(width), 1e-9 * self.cost(width))
                    if gain > 0 and gain / spent > best_worth:
                        best, best_worth = tried, gain / spent
            if best is width:
                return width
            width = best
        return width

    def _candidates(self, timing: Timing) -> list[int]:
        """Return the active sizes nearest to the slowest paths, at most `_CANDIDATES`."""
        graph, variables = timing.graph, self.engine.model.variables
        order = np.argsort(_slack(timing)[graph.target], kind="stable")
        gates = timing.circuit.arcs.gate[graph.arc[order]]
        sizes = dict.fromkeys(variables.partition.of_gate[gates].tolist())
        return [size for size in sizes if self.answer.active[size]][:_CANDIDATES]

    def _recovered(self, width: FloatArray) -> FloatArray:
        """Step sizes down where nothing breaks, the dearest first."""
        if self._excess(self.timed(width)) > 0:
            return width
        active = np.flatnonzero(self.answer.active)
        cost = np.bincount(
            self.engine.model.variables.partition.of_slot,
            self._cost_per_width * width,
            len(self.answer.active),
        )[active]
        for size in active[np.argsort(-cost, kind="stable")][:_CANDIDATES].tolist():
            tried = self._stepped(width, size, -1)
            if self.cost(tried) >= self.cost(width):
                continue
            outcome = self.timed(tried)
            if self._excess(outcome) <= 0 and not len(self._over_ceiling(outcome)):
                width = tried
        return width


def _slack(timing: Timing) -> FloatArray:
    """Return how much later each node's arrival could be before a path end is later, s."""
    graph = timing.graph
    latest = np.full(len(graph), np.inf)
    limit = timing.lateness.max()
    np.minimum.at(latest, graph.end, limit - (timing.lateness - timing.arrival[graph.end]))
    for begin, end in reversed(list(zip([0, *graph.level_ends], graph.level_ends, strict=False))):
        some = slice(int(begin), int(end))
        np.minimum.at(latest, graph.source[some], latest[graph.target[some]] - timing.delay[some])
    result: FloatArray = latest - timing.arrival
    return result
