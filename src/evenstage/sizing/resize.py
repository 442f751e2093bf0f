"""An analysis to new widths: the certified optimum, drawn on the grid, and the text for it."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.brief import Brief
from evenstage.errors import Notice
from evenstage.netlist.rewriting.sized_block import Slot
from evenstage.netlist.rewriting.widths import WidthPlan
from evenstage.progress import tell
from evenstage.sizing.block import Block
from evenstage.sizing.changes import Writing
from evenstage.sizing.copies import shared_sizes
from evenstage.sizing.few import choose_few
from evenstage.sizing.holds import stage_holds
from evenstage.sizing.limits import kept_for_later
from evenstage.sizing.prices import limit_prices
from evenstage.sizing.results import SizedCorners, Sizing
from evenstage.sizing.rounding import Drawn, Rounding
from evenstage.sizing.verdict import refuse_broken, worth_writing
from evenstage.sizing.wishes import Wishes
from evenstage.timing.analyse import report
from evenstage.timing.corners import merged
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.sizing.engine import Continuous
    from evenstage.sizing.results import FewChanges
    from evenstage.sizing.solution import Solution
    from evenstage.sizing.wishes import Original
    from evenstage.timing.corners import Corners
    from evenstage.timing.results import Analysis

_ROUNDS = 6
"""How often sizes may be tied to keep to the copies a leaf may have."""


def resize(
    analysis: Analysis | Corners,
    brief: Brief | None = None,
    wishes: Wishes | None = None,
    original: Original | Sequence[Original] | None = None,
) -> Sizing:
    """Find new widths for an analysed block.

    Parameters
    ----------
    analysis : Analysis or Corners
        From `evenstage.timing.analyse.analyse`, or of several processes from
        `evenstage.timing.corners.merged`: then one set of widths is found that serves all of them,
        the worst corner as well as it can.
    brief : Brief, optional
        Fixed cards, same sizes, leaves and limits.
    wishes : Wishes, optional
        What is asked for; default: the fastest, with the least width within 1 % of it.
    original : Original or sequence of Original, optional
        Limits an earlier run recorded, for each corner; they count instead of today's.

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
        Where the analysis carries no timing, or its corners are not of one block.

    Examples
    --------
    >>> from evenstage import analyse, elaborate, read, read_brief, read_process, recognise
    >>> folder = "sample_netlists/pad_predriver"
    >>> process = read_process(f"{folder}/process.toml")
    >>> brief = read_brief(f"{folder}/brief.toml")
    >>> devices = elaborate(read(f"{folder}/netlist.sp"), None, process, brief)
    >>> analysis = analyse(recognise(devices, process, brief), brief)
    >>> sizing = resize(analysis, brief)
    >>> sizing.headline
    'fastest: 907 ps before, 802 ps after; 12 widths change, total width +91 %'
    >>> widest = max(sizing.changes, key=lambda change: change.factor)
    >>> widest.instance, widest.card, f"{widest.factor:.2f}"
    ('xp5', 'mn', '3.08')
    """
    return _Job(Block.of(analysis, brief or Brief(), wishes or Wishes(), original)).run()


@dataclass(frozen=True)
class _Job:
    """One resizing."""

    block: Block

    def run(self) -> Sizing:
        """Do it."""
        tell("sizing")
        rounding, drawn, few, loosest = self._rounded()
        today = rounding.engine.today
        slowest = self.block.analyses[today.limiting].paths[0]
        writing = Writing(today.corners[today.limiting], slowest, rounding)
        plan = writing.plan(drawn.slot_width)
        written = rounding.drawn_at(writing.width(plan))
        if not worth_writing(written, rounding.engine):
            plan = WidthPlan(edits=(), written=(), refused=plan.refused)
            written = Drawn(rounding.drawn, today, rounding.engine.cost_drawn)
        refuse_broken(written.timed, rounding.engine)
        return replace(self._sizing(writing, plan, written, loosest), few=few)

    def _rounded(self) -> tuple[Rounding, Drawn, FewChanges | None, Continuous]:
        """Optimise and round; tie sizes until every leaf keeps to its copies.

        Last is the answer whose bounds count: the first, in which no copies share a size yet,
        unless the bounds are about the cards chosen last.
        """
        block, copies = self.block, self.block.brief.copies_per_leaf
        (parts, told), first = block.partition(), None
        for _ in range(_ROUNDS):
            handles = block.handles(parts)
            engine, few = block.engine(parts, handles), None
            if block.wishes.changes is not None:
                engine, few = choose_few(engine, block.wishes.changes)
            rounding = Rounding(engine, engine.run(), handles)
            first = first or rounding.answer
            drawn = rounding.run()
            label = shared_sizes(parts, handles, drawn.slot_width / rounding.drawn, copies)
            if len(np.unique(label)) == len(parts):
                break
            parts = parts.tied(label)
        loosest = rounding.answer if few or first is None else first
        return replace(rounding, notices=told), drawn, few, loosest

    def _sizing(
        self, writing: Writing, plan: WidthPlan, written: Drawn, loosest: Continuous
    ) -> Sizing:
        rounding, circuit, wishes = writing.rounding, self.block.circuit, self.block.wishes
        answer, engine = rounding.answer, rounding.engine
        on_spend = wishes.delay is not None
        proof, best = ((one.solution if on_spend else one.fastest) for one in (answer, loosest))
        shared = _sharing_loss(best, proof, on_spend=on_spend)
        free, limiting = engine.variables, written.timed.limiting
        before = self.block.analyses
        after = [
            report(timing, len(old.paths), self.block.brief)
            for timing, old in zip(written.timed.corners, before, strict=True)
        ]
        return Sizing(
            before=before[limiting],
            after=after[limiting],
            goal=wishes.words,
            bound=best.bound,
            bound_on=wishes.spend if on_spend else "delay",
            gap=best.gap + shared,
            sharing_loss=shared,
            rounding_loss=max(0.0, written.cost / answer.solution.spend - 1),
            least_delay=loosest.least_delay,
            total_width_before=circuit.total_width,
            total_width_after=written.timed.corners[0].circuit.total_width,
            free_cards=int(free.free.sum()),
            fixed_cards=int((~free.free).sum()),
            changes=writing.changes(plan),
            holds=stage_holds(engine, answer, written.timed),
            prices=limit_prices(engine, answer),
            already_done=False,
            notices=(
                *free.notices,
                *rounding.notices,
                *rounding.handles.notices(),
                *self._refused(plan),
                *_left(plan),
                *_off_grid(plan, rounding.handles),
            ),
            kept=tuple(
                kept_for_later(circuit, limits, original, engine.cost_today)
                for limits, original in zip(engine.limits, self.block.originals, strict=True)
            ),
            edits=plan.edits,
            corners=None
            if len(after) == 1
            else SizedCorners(
                before=merged(before),
                after=merged(after),
                shares=tuple(engine.joint.shares(proof)),
            ),
        )

    def _refused(self, plan: WidthPlan) -> list[Notice]:
        """Return a notice for every width that cannot be written after all."""
        netlist = self.block.circuit.devices.netlist
        return [
            Notice("width-not-written", reason, card.span.place, (card.name,))
            for card, reason in ((netlist.card(wish.card), reason) for wish, reason in plan.refused)
        ]


def _sharing_loss(best: Solution, shared: Solution, *, on_spend: bool) -> float:
    """Return by how much, relatively, an answer is worse for copies that share sizes."""
    free, tied = (one.spend if on_spend else one.delay for one in (best, shared))
    return max(0.0, tied - free) / max(abs(free), abs(tied))


def _left(plan: WidthPlan) -> Iterator[Notice]:
    """Give a notice if leaves stay in the text that nobody calls any more."""
    if plan.left:
        names = ", ".join(f"'{name}'" for name in plan.left)
        message = f"all callers call sized copies now; the leaf as drawn stays in the file: {names}"
        yield Notice("leaf-uncalled", message, names=plan.left)


def _off_grid(plan: WidthPlan, handles: WidthHandles) -> Iterator[Notice]:
    """Give a notice if written widths miss the grid that the process sets.

    Widths that hang on one number keep their ratio, and only one of them can be put on the grid.
    """
    missed = []
    for written in plan.written:
        handle = handles[Slot(written.card, written.caller)]
        on_grid = handle.drawable(written.new)
        if handle.transistor.width_step is not None and not np.isclose(
            on_grid, written.new, rtol=1e-6, atol=0
        ):
            missed.append(written)
    if missed:
        netlist = handles.block.netlist
        names = tuple(dict.fromkeys(netlist.card_name(written.card) for written in missed))
        message = (
            f"{engineering(missed[0].new, 'm')} is off the grid of the process: the width hangs on "
            f"'{missed[0].parameter}', which sets others too and keeps their ratio "
            f"({', '.join(names[:8])})"
        )
        place = f"{missed[0].file}:{missed[0].line}"
        yield Notice("off-grid", message, place, names)
