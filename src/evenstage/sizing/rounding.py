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

from evenstage.sizing.kept import ROOM, Kept, gates_by_slack, slowest_edge
from evenstage.sizing.problem import totals
from evenstage.sizing.size_trials import tried_sizes

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.circuit.network import BoolArray
    from evenstage.errors import Notice
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.rewriting.handles import WidthHandle, WidthHandles
    from evenstage.sizing.engine import Continuous, Engine
    from evenstage.sizing.timed import Timed
    from evenstage.timing.trials import Trials

_DEFAULT_STEP = 1e-9
"""m; grid where the process gives none: no mask is drawn finer."""
_STAYS = 2e-3
"""Relative change of a size below which its cards are left alone."""
_CANDIDATES = 48
"""How many sizes one repair step or the recovery tries."""
_REPAIRS = 60
"""How many single steps may repair the deadline."""
_GUARDS = 5
"""How often the sizes may be found anew for the sake of the grid."""
_SKEW_STEPS = 30
"""How many single steps may bring pull-up and pull-down back together."""
_SKEW_ROOM = 1e-6
"""Relative room at the bounds of a skew."""


@dataclass(frozen=True)
class Drawn:
    """Widths that can be written, and what they amount to.

    Parameters
    ----------
    slot_width : FloatArray, m, shape (slots,)
        Of one copy, all fingers together.
    timed : Timed
        In every corner.
    cost : float
        In the unit of the engine's spend.
    """

    slot_width: FloatArray
    timed: Timed
    cost: float


@dataclass(frozen=True)
class Rounding:
    """One rounding: the engine, its answer, and how each width may be written.

    Parameters
    ----------
    engine : Engine
    answer : Continuous
    handles : WidthHandles
    notices : tuple of Notice
        What is to be said of how the sizes were chosen.
    """

    engine: Engine
    answer: Continuous
    handles: WidthHandles
    notices: tuple[Notice, ...] = ()

    def run(self) -> Drawn:
        """Round, repair and recover.

        Where many paths limit a block together no single step mends it; then the sizes are found
        anew with the deadline and the limits tightened by a little more than what was missed.
        """
        sizes, guard = self.answer.sizes, 0.0
        best, least = self.drawn, np.inf
        for _ in range(_GUARDS):
            width = self._repaired(self._keep_skews(self._keep_ceilings(self._rounded(sizes))))
            excess = self._excess(self.timed(width))
            if excess < least:
                best, least = width, excess
            guard += 1.5 * max(excess, 1e-7)
            tighter = None if least <= 0 else self.engine.guarded(self.answer, guard)
            if tighter is None:
                break
            sizes = tighter
        return self.drawn_at(self._recovered(best))

    def drawn_at(self, width: FloatArray) -> Drawn:
        """Return some slot widths with what they amount to."""
        return Drawn(width, self.timed(width), self.cost(width))

    @cached_property
    def drawn(self) -> FloatArray:
        """Today's width of each slot, m, shape (slots,)."""
        parts = self.engine.variables.partition
        return self.engine.model.circuit.devices.width[parts.first_device]

    @cached_property
    def _slots_of_size(self) -> list[IntArray]:
        parts = self.engine.variables.partition
        order = np.argsort(parts.of_slot, kind="stable").astype(np.int32)
        cuts = np.searchsorted(parts.of_slot[order], np.arange(1, len(parts)))
        return np.split(order, cuts)

    @cached_property
    def _cost_per_width(self) -> FloatArray:
        """Cost of one metre on each slot, shape (slots,)."""
        variables = self.engine.variables
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
        parts = self.engine.variables.partition
        return np.append(width / self.drawn, 1.0)[parts.slot_of_device]

    def timed(self, width: FloatArray) -> Timed:
        """Time the block with some slot widths."""
        return self.engine.joint.timed(self.factors(width))

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
        size = int(self.engine.variables.partition.of_slot[slot])
        low = self.drawn[slot] * self.answer.lower[size] * (1 - ROOM)
        high = self.drawn[slot] * self.answer.upper[size] * (1 + ROOM)
        handle, step = self._handle(slot), self._step(slot)
        grid = handle.transistor.width_step or _DEFAULT_STEP
        nearest = handle.drawable(min(max(wanted, low), high), grid)
        # A bound off the grid lets the nearest width miss it by part of a step.
        for width in (nearest, nearest + step, nearest - step):
            if low <= width <= high:
                return width
        return float(self.drawn[slot])

    def _handle(self, slot: int) -> WidthHandle:
        return self.handles[self.engine.variables.partition.slots[slot]]

    def _step(self, slot: int) -> float:
        """Return the grid of a slot, m, all fingers together."""
        return self._handle(slot).smallest_step(_DEFAULT_STEP)

    def _rounded(self, sizes: FloatArray) -> FloatArray:
        """Return all widths on the grid, those of sizes that hardly move as drawn."""
        width = self.drawn.copy()
        moves = self.answer.active & (np.abs(np.log(sizes)) > _STAYS)
        for size in np.flatnonzero(moves).tolist():
            self._draw(width, size, self.drawn * sizes[size])
        return width

    def _stepped(self, width: FloatArray, sizes: Sequence[int], direction: int) -> FloatArray:
        """Return the widths with some sizes a step wider or narrower.

        Of each size the slot with the finest relative step moves by one step; the others follow in
        proportion.
        """
        moved = width.copy()
        for size in sizes:
            slots = self._slots_of_size[size].tolist()
            ratio = 1 + direction * min(self._step(slot) / width[slot] for slot in slots)
            self._draw(moved, size, width * ratio)
        return moved

    def _excess(self, block: Timed) -> float:
        """Return by what share the worst deadline or transition limit is broken; <= 0: none."""
        if self.engine.wishes.delay is None:
            late = block.charged / self.answer.deadline
        else:
            late = block.lateness / self.engine.wishes.delay
        for corner, timing in zip(self._corners, block.corners, strict=True):
            elmore = timing.circuit.arcs.elmore(timing.circuit.net_cap)
            use = float((elmore / corner.elmore_limit).max())
            late = max(late, use, timing.worst_transition / corner.slowest)
        return late - 1 - ROOM

    def _excesses(self, trials: Trials, corner: Kept) -> FloatArray:
        """Return the same for trials in one corner, shape (trials,)."""
        if self.engine.wishes.delay is None:
            late = trials.charged_lateness / self.answer.deadline
        else:
            late = trials.lateness / self.engine.wishes.delay
        edges = np.maximum(trials.elmore_use, trials.worst_transition / corner.slowest)
        excess: FloatArray = np.maximum(late, edges) - 1 - ROOM
        return excess

    @cached_property
    def _corners(self) -> list[Kept]:
        """What must be kept in each corner; the programme's bound holds for what is drawn."""
        engine = self.engine
        limits, today = self.answer.limits, engine.today.corners
        return [
            Kept(corner, corner.model.elmore_limit(some), slowest_edge(corner, before))
            for corner, some, before in zip(engine.corners, limits, today, strict=True)
        ]

    def _over_ceiling(self, block: Timed) -> IntArray:
        """Return the nets whose input capacitance exceeds its ceiling in some corner."""
        over = [
            nets[one.over(timing.circuit.net_cap[nets])]
            for one, timing in zip(self._corners, block.corners, strict=True)
            for nets in (one.corner.limits.ceiling_net,)
        ]
        return np.unique(np.concatenate(over))

    def _keep_ceilings(self, width: FloatArray) -> FloatArray:
        """Step down the sizes on inputs over their ceiling until none is."""
        model = self.engine.model
        pins, parts = model.circuit.pins, model.variables.partition
        while len(over := self._over_ceiling(self.timed(width))):
            gates = pins.gate[np.isin(pins.net, over)]
            lowered = width
            for size in np.unique(parts.of_gate[gates]).tolist():
                if self.answer.active[size]:
                    lowered = self._stepped(lowered, [size], -1)
            if (lowered == width).all():
                return width
            width = lowered
        return width

    def _keep_skews(self, width: FloatArray) -> FloatArray:
        """Step gates that are skewed too far back until none is.

        The stronger side gets narrower, or where it cannot the weaker one wider. Where the grid is
        too coarse for that both sides stay as drawn.
        """
        skews = self.engine.variables.skews
        if skews is None:
            return width
        for _ in range(_SKEW_STEPS):
            sizes = self._mean_size(width)
            far = np.flatnonzero(skews.excess(sizes) > _SKEW_ROOM)
            if not len(far):
                return width
            too_strong = sizes[skews.up[far]] > sizes[skews.down[far]] * skews.most[far]
            up, down = skews.up[far], skews.down[far]
            strong, weak = np.where(too_strong, (up, down), (down, up))
            narrower = self._stepped(width, strong.tolist(), -1)
            stays = self._mean_size(narrower)[strong] == sizes[strong]
            width = self._stepped(narrower, weak[stays].tolist(), 1)
        stuck = np.isin(self._of_slot, np.concatenate([skews.up[far], skews.down[far]]))
        return np.where(stuck, self.drawn, width)

    @property
    def _of_slot(self) -> IntArray:
        return self.engine.variables.partition.of_slot

    def _mean_size(self, width: FloatArray) -> FloatArray:
        """Return the mean of what each size has made of its slots, shape (sizes,)."""
        count = len(self.engine.variables)
        of_slot = self._of_slot
        total = totals(of_slot, width / self.drawn, count)
        return total / np.maximum(np.bincount(of_slot, minlength=count), 1)

    def _skewing(self, width: FloatArray, moved: FloatArray) -> BoolArray:
        """Tell which sizes would skew a gate too far if they alone moved, shape (sizes,)."""
        skews, found = self.engine.variables.skews, np.zeros(len(self.engine.variables), bool)
        if skews is None:
            return found
        before, after = self._mean_size(width), self._mean_size(moved)
        for mine in (skews.up, skews.down):
            trial = before.copy()
            trial[mine] = after[mine]
            found[mine] = skews.excess(trial) > _SKEW_ROOM
        return found

    def _repaired(self, width: FloatArray) -> FloatArray:
        """Step sizes until every deadline is met or no step helps."""
        for _ in range(_REPAIRS):
            block = self.timed(width)
            excess = self._excess(block)
            if excess <= 0:
                return width
            sizes = self._candidates(block)
            moves = [self._stepped(width, sizes, direction) for direction in (1, -1)]
            worth = np.stack([self._worth(block, excess, sizes, width, to) for to in moves])
            if not (worth > 0).any():
                return width
            place, way = divmod(int(worth.T.argmax()), len(moves))
            slots = self._slots_of_size[sizes[place]]
            width = width.copy()
            width[slots] = moves[way][slots]
        return width

    def _worth(
        self,
        block: Timed,
        excess: float,
        sizes: Sequence[int],
        width: FloatArray,
        moved: FloatArray,
    ) -> FloatArray:
        """Return what each size gains per cost if it alone moves, shape (sizes,)."""
        parts = self.engine.variables.partition
        place = np.full(len(parts), -1, np.int32)
        place[list(sizes)] = np.arange(len(sizes))
        of_slot = place[parts.of_slot]
        every = tried_sizes(
            block,
            self.factors(moved) / self.factors(width),
            parts,
            np.array(sizes, np.int32),
            [(one.corner.limits.ceiling_net, one.elmore_limit) for one in self._corners],
        )
        mine = of_slot >= 0
        change = (self._cost_per_width * (moved - width))[mine]
        spent = totals(of_slot[mine], change, len(sizes))
        still = totals(of_slot[mine], np.abs(moved - width)[mine], len(sizes)) == 0
        pairs = list(zip(every, self._corners, strict=True))
        over = np.any([corner.over(trials.net_cap).any(axis=0) for trials, corner in pairs], axis=0)
        left = np.max([self._excesses(trials, corner) for trials, corner in pairs], axis=0)
        worth = (excess - left) / np.maximum(spent, 1e-9 * self.cost(width))
        return np.where(still | over | self._skewing(width, moved)[sizes], 0.0, worth)

    def _candidates(self, block: Timed) -> list[int]:
        """Return the active sizes nearest to the slowest paths, at most `_CANDIDATES`."""
        near = [gates_by_slack(timing, block.lateness) for timing in block.corners]
        slack, gates = (np.concatenate(column) for column in zip(*near, strict=True))
        order = np.argsort(slack, kind="stable")
        of_gate = self.engine.variables.partition.of_gate
        sizes = dict.fromkeys(of_gate[gates[order]].ravel().tolist())
        return [size for size in sizes if self.answer.active[size]][:_CANDIDATES]

    def _recovered(self, width: FloatArray) -> FloatArray:
        """Step sizes down where nothing breaks, the dearest first."""
        if self._excess(self.timed(width)) > 0:
            return width
        active = np.flatnonzero(self.answer.active)
        cost = np.bincount(
            self.engine.variables.partition.of_slot,
            self._cost_per_width * width,
            len(self.answer.active),
        )[active]
        for size in active[np.argsort(-cost, kind="stable")][:_CANDIDATES].tolist():
            narrower = self._stepped(width, [size], -1)
            if self.cost(narrower) >= self.cost(width) or self._skewing(width, narrower)[size]:
                continue
            outcome = self.timed(narrower)
            if self._excess(outcome) <= 0 and not len(self._over_ceiling(outcome)):
                width = narrower
        return width
