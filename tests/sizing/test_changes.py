"""What is written, why, and what each change buys alone."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings

from evenstage.brief import Brief
from evenstage.netlist.rewriting.widths import WidthPlan
from evenstage.pattern import Pattern
from evenstage.sizing import changes as module
from evenstage.sizing.resize import resize
from evenstage.sizing.wishes import Wishes
from evenstage.timing.analyse import analyse
from evenstage.timing.sweep import sweep
from support.blocks import block, circuit_of, inverter, nand, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.netlist.rewriting.handles import WidthHandles
    from evenstage.netlist.rewriting.widths import WidthWish
    from evenstage.sizing.results import Sizing

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7)
LEAF = ".subckt inv a y\n" + inverter("", "a", "y", 1, 2) + "\n.ends\n"
ROW = f"{LEAF}.subckt row a y\nx1 a m inv\nx2 m y inv\n.ends\n"
ROWS = (
    f"* t\n.global vdd vss\n{ROW}.subckt top a y0 y1\nx0 a b inv\nxr0 b y0 row\nxr1 b y1 row\n"
    "c0 y0 vss 80f\nc1 y1 vss 60f\n.ends\n"
)


def resized(text: str, brief: Brief | None = None, wishes: Wishes | None = None) -> Sizing:
    return resize(analyse(circuit_of(text, PROCESS, brief), brief), brief, wishes)


class TestChanges:
    @given(random_blocks(most=8))
    @settings(max_examples=20, deadline=None)
    def test_alone_is_the_block_with_only_this_gate_changed(self, drawn: RandomBlock) -> None:
        """In these flat blocks a size is one gate: all its changed cards, and no others."""
        found = resized(drawn.text())
        timing = found.before.timing
        assert timing is not None
        circuit = timing.circuit
        names = [circuit.devices.netlist.card_name(card) for card in circuit.devices.card.tolist()]
        for change in found.changes:
            factor = np.ones(len(circuit.devices))
            for other in found.changes:
                if other.instance == change.instance:
                    factor[names.index(other.card)] = other.factor
            alone = sweep(circuit.resized(factor), timing.graph, timing.unit)
            expected = alone.worst - timing.worst
            assert change.alone == pytest.approx(expected, rel=1e-6, abs=1e-9 * timing.worst)

    @given(random_blocks(most=8))
    @settings(max_examples=12, deadline=None)
    def test_last_is_the_block_with_all_changes_against_all_but_this(
        self, drawn: RandomBlock
    ) -> None:
        found = resized(drawn.text())
        timing = found.before.timing
        assert timing is not None
        circuit = timing.circuit
        names = [circuit.devices.netlist.card_name(card) for card in circuit.devices.card.tolist()]

        def worst_without(instance: str) -> float:
            factor = np.ones(len(circuit.devices))
            for other in found.changes:
                if other.instance != instance:
                    factor[names.index(other.card)] = other.factor
            return sweep(circuit.resized(factor), timing.graph, timing.unit).worst

        everything = worst_without("")
        for change in found.changes:
            expected = everything - worst_without(change.instance)
            assert change.last == pytest.approx(expected, rel=1e-6, abs=1e-9 * timing.worst)

    def test_a_shared_card_counts_its_occurrences(self) -> None:
        found = resized(ROWS, Brief(copies_per_leaf=4))
        rows = [change for change in found.changes if change.instance.startswith("xr")]
        assert rows
        assert {change.instance for change in rows} <= {"xr0.x1", "xr0.x2"}
        assert {change.occurrences for change in rows} == {2}

    def test_changes_come_in_the_order_of_the_text(self) -> None:
        cards = [inverter(f"i{k}", f"x{k}", f"x{k + 1}", 1, 2) for k in reversed(range(4))]
        found = resized(block("\n".join([*cards, "cl x4 vss 200f"]), "x0 x4 vdd vss"))
        lines = [change.line for change in found.changes]
        assert lines == sorted(lines)
        assert len(lines) >= 6

    def test_reasons(self) -> None:
        cards = [
            inverter("i", "a", "b", 1, 2),
            inverter("j", "b", "c", 1, 2),
            nand("s", ["b", "e"], "z", 9, 9),
        ]
        text = block("\n".join([*cards, "cl c vss 120f"]), "a e c z vdd vss")
        wishes = Wishes(reclaim=True, scope="block")
        found = resized(text, Brief(fixed=(Pattern("mi*"),)), wishes)
        why = {change.instance: change.why for change in found.changes}
        assert why["mjn"].startswith("on the slowest path, stage effort was ")
        assert why["msn0"] == "loads a path that limits the block"

    def test_what_cannot_be_written_is_told_by_name(self, monkeypatch: pytest.MonkeyPatch) -> None:
        def refuse(_: WidthHandles, wishes: list[WidthWish]) -> WidthPlan:
            return WidthPlan((), (), tuple((wish, "its text is locked") for wish in wishes))

        monkeypatch.setattr(module, "plan_widths", refuse)
        found = resized(ROWS)
        told = [notice for notice in found.notices if notice.code == "width-not-written"]
        assert {notice.message for notice in told} == {"its text is locked"}
        assert {name for notice in told for name in notice.names} == {"mn", "mp"}
        assert all(notice.place.startswith("block.sp:") for notice in told)
        assert (found.changes, found.edits) == ((), ())
