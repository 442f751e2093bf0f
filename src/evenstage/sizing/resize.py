"""An analysis to new widths: limits, the certified optimum, rounding, and what each change buys."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from evenstage.brief import Brief
from evenstage.errors import InfeasibleError, Notice
from evenstage.netlist.handles import WidthHandles, width_handles
from evenstage.netlist.sized_block import Slot
from evenstage.netlist.widths import WidthPlan, WidthWish, plan_widths
from evenstage.pattern import select
from evenstage.sizing.copies import shared_sizes
from evenstage.sizing.engine import Continuous, Engine, worst_charged
from evenstage.sizing.holds import stage_holds
from evenstage.sizing.model import Limits, Model
from evenstage.sizing.partition import Partition, partition
from evenstage.sizing.problem import totals
from evenstage.sizing.results import Change, Sizing
from evenstage.sizing.rounding import Drawn, Rounding
from evenstage.sizing.variables import Variables, variables
from evenstage.sizing.wishes import Original, Wishes
from evenstage.timing.analyse import report
from evenstage.timing.graph import block_inputs
from evenstage.timing.sweep import Timing, sweep

if TYPE_CHECKING:
    from evenstage.circuit.circuit import Circuit
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.timing.results import Analysis

_ROUNDS = 6
"""How often sizes may be tied to keep to the copies a leaf may have."""
_GAINS = 1e-4
"""Relative gain in delay below which a netlist counts as already there."""


def resize(
    analysis: Analysis,
    brief: Brief | None = None,
    wishes: Wishes | None = None,
    original: Original | None = None,
) -> Sizing:
    """Find new widths for an analysed block.

    Parameters
    ----------
    analysis : Analysis
        From `evenstage.timing.analyse.analyse`.
    brief : Brief, optional
        Fixed cards, same sizes, leaves and limits.
    wishes : Wishes, optional
        What is asked for; default: the fastest, with the least width within 1 % of it.
    original : Original, optional
        Limits an earlier run recorded; they count instead of today's.

    Returns
    -------
    Sizing
        With the edits that write it.

    Raises
    ------
    InfeasibleError
        Where the wishes or limits cannot be met.
    NotConvergedError
        Where the optimum cannot be proved.
    SettingsError
        Where a pattern of the brief fits nothing.
    ValueError
        Where the analysis carries no timing.
    """
    if analysis.timing is None:
        message = "an analysis without its timing cannot be resized"
        raise ValueError(message)
    job = _Job(
        analysis, analysis.timing, brief or Brief(), wishes or Wishes(), original or Original()
    )
    return job.run()


@dataclass(frozen=True)
class _Found:
    """The answer, continuous and as drawn, with all it was found with."""

    engine: Engine
    handles: WidthHandles
    answer: Continuous
    drawn: Drawn

    @property
    def rounding(self) -> Rounding:
        return Rounding(self.engine, self.answer, self.handles)


@dataclass(frozen=True)
class _Job:
    """One resizing."""

    analysis: Analysis
    timing: Timing
    brief: Brief
    wishes: Wishes
    original: Original

    def run(self) -> Sizing:
        """Do it."""
        found = self._found()
        plan = self._plan(found)
        after = self._as_written(found, plan)
        if not self._is_better(found, after):
            plan, after = plan_widths(found.handles, ()), self.timing
        return self._sizing(found, plan, after)

    @property
    def circuit(self) -> Circuit:
        """The block as drawn."""
        return self.timing.circuit

    def _found(self) -> _Found:
        """Optimise and round; tie sizes until every leaf keeps to its copies."""
        parts = partition(self.circuit, self.brief)
        for _ in range(_ROUNDS):
            handles = width_handles(
                self.circuit.devices,
                self.circuit.process,
                parts.variable_of,
                self.brief.copies_per_leaf,
            )
            engine = self._engine(parts, handles)
            answer = engine.run()
            drawn = Rounding(engine, answer, handles).run()
            label = self._labels(parts, handles, drawn)
            if len(np.unique(label)) == len(parts):
                break
            parts = parts.tied(label)
        return _Found(engine, handles, answer, drawn)

    def _labels(self, parts: Partition, handles: WidthHandles, drawn: Drawn) -> IntArray:
        """Return which sizes must be tied so that leaves keep to their copies."""
        first = np.full(len(parts), len(parts.slots))
        np.minimum.at(first, parts.of_slot, np.arange(len(parts.slots)))
        today = self.circuit.devices.width[parts.first_device]
        factor = (drawn.slot_width / today)[first]
        moving = np.zeros(len(parts), bool)
        moving[parts.of_slot[np.abs(drawn.slot_width / today - 1) > 1e-9]] = True
        if not (copies := self.brief.copies_per_leaf):
            return np.arange(len(parts), dtype=np.int32)  # calls of a leaf are one size already
        return shared_sizes(parts, handles, factor, moving, copies)

    def _engine(self, parts: Partition, handles: WidthHandles) -> Engine:
        free = variables(self.circuit, self.brief, parts, handles, self.original.smallest)
        model = Model(self.circuit, self.timing.graph, self.timing.unit, free)
        spend, fixed = self._spend(free)
        return Engine(
            model=model,
            limits=self._limits(free),
            spend=spend,
            spend_fixed=fixed,
            wishes=self.wishes,
            cost_today=self.original.spend or float(spend.sum() + fixed),
        )

    def _spend(self, free: Variables) -> tuple[FloatArray, float]:
        """Return the cost of one unit of each size, and of all that has none."""
        of, block = free.partition.of_device, self.circuit.devices
        if self.wishes.spend == "width":
            per_device, total = block.width * block.multiplier, self.circuit.total_width
        else:
            values = self.circuit.electrical
            per_device = values.gate.scaling + values.drain.scaling + values.source.scaling
            total = self.circuit.switched_cap
        mine = of >= 0
        spend = totals(of[mine], per_device[mine], len(free))
        return spend, max(total - float(spend.sum()), 0.0)

    def _limits(self, free: Variables) -> Limits:
        """Return the input ceilings and the transition limit.

        Raises
        ------
        InfeasibleError
            Where an input is above its ceiling and nothing on it may change.
        """
        nets = block_inputs(self.circuit)
        names = [self.circuit.devices.net_names[net] for net in nets]
        today = self.circuit.net_cap[nets]
        ceiling = np.array(
            [
                self.original.ceilings.get(name.lower(), cap)
                for name, cap in zip(names, today.tolist(), strict=True)
            ]
        )
        for some in self.brief.inputs:
            if some.capacitance_max is not None:
                ceiling[select(some.nets, names, "input")] = some.capacitance_max
        movable = np.zeros(len(self.circuit.devices.net_names), bool)
        pins = self.circuit.pins
        movable[pins.net[free.free[free.partition.of_gate[pins.gate]]]] = True
        stuck = np.flatnonzero((today > ceiling * (1 + 1e-9)) & ~movable[nets])
        if len(stuck):
            raise InfeasibleError(
                f"input '{names[stuck[0]]}' shows more capacitance than it may, and every card on "
                "it is fixed",
                code="input-over-ceiling",
            )
        transition = self.brief.transition_max or self.original.transition
        return Limits(
            ceiling_net=nets,
            ceiling=ceiling,
            transition=transition or self.timing.worst_transition,
            strict=self.brief.transition_max is not None,
        )

    def _plan(self, found: _Found) -> WidthPlan:
        """Return how the widths that differ are written."""
        parts = found.handles.block.variable_of
        drawn = found.rounding.drawn
        wishes = [
            WidthWish(
                card=slot.card,
                caller=slot.caller,
                old=float(old),
                new=float(new),
                why=self._why(found, size),
            )
            for (slot, size), old, new in zip(
                parts.items(), drawn, found.drawn.slot_width, strict=True
            )
            if abs(new / old - 1) > 1e-9
        ]
        return plan_widths(found.handles, wishes)

    def _why(self, found: _Found, size: int) -> str:
        """Say in a few words why a size changes."""
        parts = found.engine.model.variables.partition
        gates = set(np.flatnonzero(parts.of_gate == size).tolist())
        names = {self.circuit.gate_name(gate) for gate in gates}
        for path in self.analysis.paths[:1]:
            for stage in path.stages:
                if stage.instance in names:
                    return f"on the slowest path, stage effort was {stage.stage_effort:.2g}"
        if found.answer.sizes[size] < 1:
            return "loads a path that limits the block"
        return "on a path that would limit the block"

    def _as_written(self, found: _Found, plan: WidthPlan) -> Timing:
        """Time the block with the widths as they will be read back."""
        return sweep(
            self.circuit.resized(self._factors(found, plan)), self.timing.graph, self.timing.unit
        )

    def _factors(self, found: _Found, plan: WidthPlan) -> FloatArray:
        parts = found.engine.model.variables.partition
        index = {slot: number for number, slot in enumerate(parts.slots)}
        ratio = np.ones(len(parts.slots) + 1)
        for written in plan.written:
            ratio[index[Slot(written.card, written.caller)]] = written.new / written.old
        return ratio[parts.slot_of_device]

    def _is_better(self, found: _Found, after: Timing) -> bool:
        """Tell whether the written widths are worth writing.

        For a wished delay or a ceiling that today breaks they are. Otherwise they must be faster
        than today by more than rounding noise, or as fast and cheaper.
        """
        before, limits = self.timing, found.engine.limits
        ceiling_broken = self.circuit.net_cap[limits.ceiling_net] > limits.ceiling * (1 + 1e-9)
        slow_edges = limits.strict and before.worst_transition > limits.transition
        if self.wishes.delay is not None and before.lateness.max() > self.wishes.delay:
            return True
        if ceiling_broken.any() or slow_edges:
            return True
        wanted = self.wishes.delay
        cheaper = found.drawn.cost < found.engine.cost_drawn * (1 - _GAINS)
        if wanted is not None:
            return cheaper
        faster = worst_charged(after) < worst_charged(before) * (1 - _GAINS)
        slower = worst_charged(after) > worst_charged(before) * (1 + 1e-9)
        slower |= after.lateness.max() > before.lateness.max() * (1 + 1e-9)
        return not slower and (faster or cheaper)

    def _sizing(self, found: _Found, plan: WidthPlan, after: Timing) -> Sizing:
        answer, engine = found.answer, found.engine
        on_spend = self.wishes.delay is not None
        proof = answer.solution if on_spend else answer.fastest
        free = engine.model.variables
        after_analysis = report(after, len(self.analysis.paths))
        notices = [*free.notices, *found.handles.notices()]
        if plan.refused:
            notices += [
                Notice("width-not-written", f"{reason}", names=(str(wish.card),))
                for wish, reason in plan.refused
            ]
        return Sizing(
            before=self.analysis,
            after=after_analysis,
            goal=self.wishes.words,
            bound=proof.bound,
            bound_on=self.wishes.spend if on_spend else "delay",
            gap=proof.gap,
            rounding_loss=max(0.0, found.drawn.cost / answer.solution.spend - 1),
            least_delay=answer.least_delay,
            total_width_before=self.circuit.total_width,
            total_width_after=after.circuit.total_width,
            free_cards=int(free.free.sum()),
            fixed_cards=int((~free.free).sum()),
            changes=self._changes(found, plan),
            holds=stage_holds(engine, answer, after),
            already_done=False,
            notices=tuple(notices),
            kept=self._kept(engine),
            edits=plan.edits,
        )

    def _kept(self, engine: Engine) -> Original:
        """Return the limits in force: the recorded ones where there are any, else today's."""
        limits, devices = engine.limits, self.circuit.devices
        names = [devices.net_names[net].lower() for net in limits.ceiling_net]
        smallest = dict(self.original.smallest)
        for index, model in enumerate(devices.models):
            drawn = float(devices.width[devices.model == index].min())
            smallest.setdefault(model.name.lower(), drawn)
        return Original(
            ceilings=dict(zip(names, limits.ceiling.tolist(), strict=True)),
            transition=limits.transition,
            smallest=smallest,
            spend=engine.cost_today,
        )

    def _changes(self, found: _Found, plan: WidthPlan) -> tuple[Change, ...]:
        parts = found.engine.model.variables.partition
        devices = self.circuit.devices
        alone = self._alone(found, plan)
        index = {slot: number for number, slot in enumerate(parts.slots)}
        counts = np.bincount(parts.slot_of_device[parts.slot_of_device >= 0])
        changes = []
        handle = parts.handle[parts.of_slot]
        ordered = sorted(
            ((index[Slot(w.card, w.caller)], w) for w in plan.written),
            key=lambda pair: (handle[pair[0]], pair[1].card),
        )
        for number, written in ordered:
            device = int(parts.first_device[number])
            gate = int(self.circuit.gate_of_device[device])
            changes.append(
                Change(
                    card=devices.netlist.card(written.card).name,
                    file=written.file,
                    line=written.line,
                    instance=self.circuit.gate_name(gate),
                    occurrences=int(counts[number]),
                    parameter=written.parameter,
                    old=written.old,
                    new=written.new,
                    alone=alone[int(parts.of_slot[number])],
                    why=self._why(found, int(parts.of_slot[number])),
                )
            )
        return tuple(changes)

    def _alone(self, found: _Found, plan: WidthPlan) -> dict[int, float]:
        """Return how much each size that changes moves the worst delay by itself, s."""
        parts = found.engine.model.variables.partition
        factors = self._factors(found, plan)
        result = {}
        for size in np.unique(parts.of_device[factors != 1]).tolist():
            only = np.where(parts.of_device == size, factors, 1.0)
            timing = sweep(self.circuit.resized(only), self.timing.graph, self.timing.unit)
            result[size] = timing.worst - self.timing.worst
        return result
