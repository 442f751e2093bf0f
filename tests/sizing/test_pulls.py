"""Which gates have a size for each side, how far the sides go apart, and what comes of it."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.brief import Brief
from evenstage.errors import NotConvergedError
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.sizing import cooling, interior_point
from evenstage.sizing.certificate import check
from evenstage.sizing.goals import Cheapest, Fastest
from evenstage.sizing.limits import limits_of
from evenstage.sizing.partition import partition
from evenstage.sizing.pulls import pulled_apart, skews
from evenstage.sizing.resize import resize
from evenstage.sizing.wishes import Original, Wishes
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, nand, plain_process
from support.convex_reference import reference_objective
from support.models import in_corners, in_picoseconds
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.process.process import Process
    from evenstage.sizing.problem import Problem
    from evenstage.sizing.results import Sizing

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7)
APART = Wishes(margin=0, apart=True, scope="block")
TOGETHER = replace(APART, apart=False)

INV = ".subckt inv a y\n" + inverter("", "a", "y", 1, 2) + "\n.ends\n"


def calls(count: int, load: float = 200) -> str:
    """Return a chain of calls of one inverter."""
    cards = "\n".join(f"x{k} n{k} n{k + 1} inv" for k in range(count))
    return (
        f"* t\n.global vdd vss\n{INV}.subckt top n0 n{count}\n{cards}\n"
        f"cl n{count} vss {load}f\n.ends\n"
    )


def resized(text: str, wishes: Wishes = APART, brief: Brief | None = None) -> Sizing:
    return resize(analyse(circuit_of(text, PROCESS, brief), brief), brief, wishes)


def corners() -> tuple[Process, Process]:
    """Return two corners, slow in one type of transistors each."""
    n, p = PROCESS.transistors
    return (
        replace(PROCESS, name="slow n", transistors=(replace(n, r_w=1.8 * n.r_w), p)),
        replace(PROCESS, name="slow p", transistors=(n, replace(p, r_w=1.6 * p.r_w))),
    )


def question(text: str, processes: tuple[Process, ...], *, apart: bool = True) -> Problem:
    """Return the programme of a netlist with today's limits, in ps."""
    joint = in_corners(text, processes, apart=apart)
    count = len(joint.variables)
    limits = [limits_of(one, Brief(), Original(), joint.variables) for one in joint.today.corners]
    box = np.full(count, 0.125), np.full(count, 8.0)
    return in_picoseconds(joint.problem(*box, np.ones(count), limits))


class TestWhichGates:
    def test_a_static_gate_has_two_sizes(self) -> None:
        circuit = circuit_of(block(nand("q", ["a", "b"], "y", 2, 2), "a b y vdd vss"), PROCESS)
        parts, notices = pulled_apart([circuit], partition(circuit))
        assert parts.of_gate.tolist() == [[0, 1]]
        polarity = [circuit.devices.models[m].polarity for m in circuit.devices.model.tolist()]
        assert parts.of_device.tolist() == ["np".index(one) for one in polarity]
        assert parts.side.tolist() == [0, 1]
        assert not notices

    @pytest.mark.parametrize(
        ("cards", "reason"),
        [
            (
                "mn y a vss vss nx w=4u l=0.1u\nmp y vss vdd vdd px w=1u l=0.1u",
                "a ratioed gate, whose ratio stays as drawn",
            ),
            (
                """mc y ck vdd vdd px w=1u l=0.1u
ma y a m vss nx w=2u l=0.1u
mf m ck vss vss nx w=2u l=0.1u""",
                "a dynamic gate, footed, whose ratio stays as drawn",
            ),
        ],
        ids=["ratioed", "dynamic"],
    )
    def test_others_keep_one_and_say_why(self, cards: str, reason: str) -> None:
        text = block(f"{cards}\n{inverter('i', 'y', 'z', 1, 2)}\ncl z vss 9f", "a ck z vdd vss")
        circuit = circuit_of(text, PROCESS)
        parts, (notice,) = pulled_apart([circuit], partition(circuit))
        assert len(parts) == 3
        assert notice.code == "pulls-together"
        assert notice.message == f"1 gate keeps one size for pull-up and pull-down: {reason}"

    def test_a_number_that_sets_both_sides_keeps_them_together(self) -> None:
        leaf = (
            ".subckt inv a y w=1u\nmn y a vss vss nx w=w l=0.1u\n"
            "mp y a vdd vdd px w='2*w' l=0.1u\n.ends\n"
        )
        text = calls(2).replace(INV, leaf).replace("n1 n2 inv", "n1 n2 inv w=2u")
        stuck = resized(text, APART, Brief(copies_per_leaf=0))
        (told,) = (notice for notice in stuck.notices if notice.code == "pulls-together")
        assert told.message.endswith(": one number in the text sets both")
        assert told.names == ("x0", "x1")
        assert stuck.free_cards + stuck.fixed_cards == 1
        # A copy of the leaf may give each side a number of its own.
        free = resized(text)
        assert "pulls-together" not in {notice.code for notice in free.notices}
        assert free.free_cards == 4


class TestSkews:
    @pytest.mark.parametrize(
        ("p", "least", "most"), [(2, 0.5, 2.0), (8, 0.125, 1.0), (0.5, 1.0, 8.0)]
    )
    def test_bounds_are_of_strength_and_those_beyond_may_stay(
        self, p: float, least: float, most: float
    ) -> None:
        """At twice the width a p transistor is as strong as an n one here."""
        circuit = circuit_of(block(inverter("i", "a", "y", 1, p), "a y vdd vss"), plain_process())
        parts, _ = pulled_apart([circuit], partition(circuit))
        found = skews(circuit, parts, 0.5, 2.0)
        assert found.least == pytest.approx([least])
        assert found.most == pytest.approx([most])
        assert found.excess(np.ones(2)).max() <= 1e-12

    @given(random_blocks())
    @settings(max_examples=10, deadline=None)
    def test_no_written_gate_is_skewed_beyond_them(self, drawn: RandomBlock) -> None:
        sizing = resized(drawn.text())
        assert sizing.before.timing is not None
        assert sizing.after.timing is not None
        before, after = sizing.before.timing.circuit, sizing.after.timing.circuit
        parts, _ = pulled_apart([before], partition(before))
        ratio = after.devices.width / before.devices.width
        sizes = np.ones(len(parts))
        sizes[parts.of_device] = ratio
        assert skews(before, parts, 0.5, 2.0).excess(sizes).max() <= 1e-5


class TestOptimum:
    @given(random_blocks(most=9))
    @settings(max_examples=8, deadline=None)
    def test_agrees_with_a_general_solver_in_two_corners(self, drawn: RandomBlock) -> None:
        asked = question(drawn.text(), corners())
        found = interior_point.solve(asked, Fastest())
        check(asked, Fastest(), found)
        assert_allclose(found.delay, reference_objective(asked, Fastest()), rtol=1e-5, atol=0)
        cheap = Cheapest(1.05 * found.delay)
        least = interior_point.solve(asked, cheap)
        check(asked, cheap, least)
        assert_allclose(least.spend, reference_objective(asked, cheap), rtol=1e-5, atol=0)

    @given(random_blocks(most=9))
    @settings(max_examples=6, deadline=None)
    def test_cooling_brackets_the_interior_point(self, drawn: RandomBlock) -> None:
        asked = question(drawn.text(), corners())
        exact = interior_point.solve(asked, Fastest()).delay
        cooled = cooling.solve(asked, Fastest(), start=np.ones(len(asked.lower)))
        check(asked, Fastest(), cooled)
        assert cooled.bound <= exact * (1 + 1e-9) <= cooled.delay * (1 + 2e-9)

    @given(random_blocks(most=9))
    @settings(max_examples=10, deadline=None)
    def test_apart_is_never_slower_than_together(self, drawn: RandomBlock) -> None:
        apart, together = (
            interior_point.solve(question(drawn.text(), corners(), apart=apart), Fastest())
            for apart in (True, False)
        )
        assert apart.bound <= together.delay * (1 + 1e-9)

    def test_wrong_answers_are_refused(self) -> None:
        text = calls(3)
        asked = question(text, corners())
        right = interior_point.solve(asked, Fastest())
        together = interior_point.solve(question(text, corners(), apart=False), Fastest())
        skewed = right.sizes.copy()
        skewed[1] = 8.0
        for wrong, told in (
            ({"bound": together.delay}, "the bound holds"),
            ({"sizes": skewed}, "limits are kept"),
            ({"delay": 0.99 * right.delay}, "the delay is as stated"),
        ):
            with pytest.raises(NotConvergedError, match=f"not confirmed that {told}"):
                check(asked, Fastest(), replace(right, **wrong))


class TestResize:
    @given(random_blocks(), st.sampled_from([0.0, 0.05]))
    @settings(max_examples=8, deadline=None)
    def test_laws_of_every_resizing_hold(self, drawn: RandomBlock, margin: float) -> None:
        sizing = resized(drawn.text(), replace(APART, margin=margin))
        before, after = sizing.before, sizing.after
        assert after.paths[0].delay <= before.paths[0].delay * (1 + 1e-9)
        assert after.worst_transition <= before.worst_transition * (1 + 1e-6)
        allowed = dict(before.input_caps)
        assert all(cap <= allowed[net] * (1 + 1e-9) for net, cap in after.input_caps)
        assert sizing.gap - sizing.sharing_loss < 1e-4
        charged = max(end.charged_delay for end in after.ends)
        assert charged >= sizing.bound * (1 - 1e-6)

    def test_one_edge_that_matters_is_served_by_its_own_side(self) -> None:
        """Only the pulls that make the critical edge of a late input grow at the others' cost."""
        text = calls(4, 400)
        apart, together = resized(text), resized(text, TOGETHER)
        assert apart.bound < 0.999 * together.bound
        ratios: dict[str, dict[str, float]] = {}
        for change in apart.changes:
            ratios.setdefault(change.instance, {})[change.card] = change.factor
        assert any(abs(one.get("mn", 1) / one.get("mp", 1) - 1) > 0.05 for one in ratios.values())

    @pytest.mark.parametrize("copies", [0, 1, 2, 4])
    def test_no_more_copies_than_allowed(self, copies: int) -> None:
        """What is written is read back, and counted."""
        brief = Brief(copies_per_leaf=copies)
        text = calls(5, 900)
        sizing = resized(text, APART, brief)
        assert sizing.before.timing is not None
        netlist = sizing.before.timing.circuit.devices.netlist
        written = b"".join(rewrite(netlist, sizing.edits).values()) or text.encode()
        assert written.lower().count(b".subckt inv") <= 1 + copies
        again = read_bytes(written, "again.sp", netlist.folder)
        widths = np.sort(elaborate(again, None, PROCESS, brief).width)
        assert sizing.after.timing is not None
        assert widths == pytest.approx(np.sort(sizing.after.timing.circuit.devices.width), rel=1e-6)

    def test_goal_and_prices_name_the_sides(self) -> None:
        sizing = resized(calls(3, 60), replace(APART, delay=None))
        assert sizing.goal == "fastest, pull-up and pull-down apart"
        assert all(
            price.name.endswith((", pull-up", ", pull-down"))
            for price in sizing.prices
            if price.limit in {"least width", "greatest width"}
        )
