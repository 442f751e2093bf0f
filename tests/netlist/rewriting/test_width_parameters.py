"""Widths that are parameters and expressions, as text before and after."""

from __future__ import annotations

from dataclasses import replace

import pytest

from evenstage.errors import EvenstageError
from evenstage.netlist.rewriting.widths import plan_widths
from support.sized import assert_reads_back, check, planned, rewritten, sized, wish_list

WITH_PARAMETERS = b"""\
.subckt inv a y vdd vss wn=0.6u wp=1.2u
mn y a vss vss nch w=wn l=60n
mp y a vdd vdd pch w=wp l=60n
.ends
"""


class TestLeavesWithParameters:
    def test_a_call_that_passes_a_value_passes_the_new_one(self) -> None:
        calls = b"x1 a b vdd vss inv wn=0.9u\n+ wp=1.8u\nx2 b c vdd vss inv\n"
        check(
            b"t\n" + WITH_PARAMETERS + calls,
            b"t\n"
            + WITH_PARAMETERS
            + b"* evenstage: wn 0.9u -> 1.8u, wp 1.8u -> 3.6u: reason\n"
            + calls.replace(b"1.8u", b"3.6u").replace(b"0.9u", b"1.8u"),
            {"x1": 2},
            leaves={"inv"},
        )

    def test_a_call_that_relies_on_the_default_gets_a_value(self) -> None:
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv m=2  $ note\n"
        check(
            b"t\n" + WITH_PARAMETERS + calls,
            b"t\n" + WITH_PARAMETERS + b"x1 a b vdd vss inv\n"
            b"* evenstage: wn 0.6u -> 1.2u, wp 1.2u -> 2.4u: reason\n"
            b"x2 b c vdd vss inv m=2 wn=1.2u wp=2.4u  $ note\n",
            {"x2": 2},
            leaves={"inv"},
        )

    def test_calls_that_rely_on_the_default_and_agree_change_it(self) -> None:
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv\nx3 c d vdd vss inv wn=5u wp=6u\n"
        check(
            b"t\n" + WITH_PARAMETERS + calls,
            b"t\n* evenstage: wn 0.6u -> 1.2u, wp 1.2u -> 2.4u: reason\n"
            + WITH_PARAMETERS.replace(b"wn=0.6u wp=1.2u", b"wn=1.2u wp=2.4u")
            + calls,
            {"x1": 2, "x2": 2},
            leaves={"inv"},
        )

    def test_one_number_behind_both_transistors(self) -> None:
        leaf = (
            b".subckt inv a y vdd vss wn=0.6u\nmn y a vss vss nch w=wn l=60n\n"
            b"mp y a vdd vdd pch w='2*wn' l=60n\n.ends\n"
        )
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv wn=1u\n"
        handles = sized(b"t\n" + leaf + calls, leaves={"inv"})
        plan = planned(handles, {"x2": 1.5})
        assert_reads_back(handles, plan)
        assert rewritten(handles, plan) == b"t\n" + leaf + (
            b"x1 a b vdd vss inv\n* evenstage: wn 1u -> 1.5u: reason\nx2 b c vdd vss inv wn=1.5u\n"
        )
        assert [w.new for w in plan.written] == pytest.approx([1.5e-6, 3e-6], rel=1e-9)

    def test_a_width_on_another_ones_number_may_miss_its_wish_by_a_step(self) -> None:
        text = b"t\n.param wu=0.6u\nm1 y a 0 0 nch w=wu l=60n\nm2 y a 1 1 pch w='2*wu' l=60n\n"
        handles = sized(text)
        first, second = wish_list(handles, {"m1": 2, "m2": 2})
        plan = plan_widths(handles, (replace(second, new=2.405e-6), first))
        assert plan.refused == ()
        assert [w.new for w in plan.written] == pytest.approx([1.2e-6, 2.4e-6], rel=1e-9)
        assert_reads_back(handles, plan)

    def test_wishes_for_one_number_that_contradict_each_other(self) -> None:
        leaf = (
            b".subckt inv a y vdd vss wn=0.6u\nmn y a vss vss nch w=wn l=60n\n"
            b"mp y a vdd vdd pch w='2*wn' l=60n\n.ends\n"
        )
        handles = sized(b"t\n" + leaf + b"x1 a b vdd vss inv\n", leaves={"inv"})
        plan = planned(handles, {"x1.mn": 2, "x1.mp": 3})
        ((wish, why),) = plan.refused
        assert handles.block.netlist.card(wish.card).name == "mp"
        assert why == "wn=0.6u also sets another width, which changes by another factor"

    def test_a_parameter_inside_the_leaf_is_changed_in_a_copy(self) -> None:
        leaf = (
            b".subckt inv a y vdd vss\n.param wn = 0.6u\nmn y a vss vss nch w='wn' l=60n\n"
            b"mp y a vdd vdd pch w='2*wn' l=60n\n.ends\n"
        )
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv\n"
        handles = sized(b"t\n" + leaf + calls, leaves={"inv"})
        plan = planned(handles, {"x2": 2})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        assert b"* evenstage: wn 0.6u -> 1.2u: reason\n.param wn = 1.2u\nmn" in after
        assert after.startswith(b"t\n" + leaf + b"* evenstage: inv -> inv_s1: called by x2\n")

    def test_a_parameter_shared_with_others_gives_way_to_a_number_in_a_copy(self) -> None:
        leaf = (
            b".subckt inv a y vdd vss\nmn y a vss vss nch w='wu' l=60n ad='wu*0.3u' as='0.2p'\n"
            b"mp y a vdd vdd pch w='2*wu' l=60n\n.ends\n"
        )
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv\n"
        handles = sized(b"t\n.param wu=0.6u\n" + leaf + calls, leaves={"inv"})
        plan = planned(handles, {"x1": 2, "x2": 2})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        assert b".param wu=0.6u\n" + leaf in after
        assert b"nch w=1.2u l=60n ad=3.6e-13 as='0.4p'\n" in after
        assert b"* evenstage: w 'wu' = 0.6u -> 1.2u: reason\n" in after
        assert b"pch w=2.4u l=60n\n" in after
        assert after.count(b"inv_s1\n") == 2


class TestParameters:
    def test_a_parameter_of_the_subcircuit_is_scaled_wherever_it_is_given(self) -> None:
        row = b".subckt row a y vss w1=1u\nm1 y a vss vss nch w='w1/2' l=60n\n.ends\n"
        calls = b"x1 a y vss row\nx2 a z vss row w1=3u\nx3 a q vss row w1='4u'\n"
        handles = sized(b"t\n" + row + calls)
        plan = planned(handles, {"m1": 2})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        assert after == (
            b"t\n* evenstage: w1 1u -> 2u: reason\n"
            + row.replace(b"1u", b"2u")
            + b"x1 a y vss row\n"
            b"* evenstage: w1 3u -> 6u: reason\nx2 a z vss row w1=6u\n"
            b"* evenstage: w1 '4u' -> '8u': reason\nx3 a q vss row w1='8u'\n"
        )

    def test_through_several_levels(self) -> None:
        text = (
            b"t\n.param wtop = 2u\n.subckt inner a y vss w=1u\nm1 b a vss vss nch w=w l=60n\n"
            b"m2 y b vss vss nch w=1u l=60n\n.ends\n.subckt outer a y vss wo=5u\n"
            b"xi a y vss inner w={wo*2}\n.ends\nx1 a y vss outer wo=wtop\n"
        )
        handles = sized(text)
        plan = planned(handles, {"m1": 2})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        assert after == text.replace(
            b".param wtop = 2u", b"* evenstage: wtop 2u -> 4u: reason\n.param wtop = 4u"
        )


class TestFunctions:
    """Widths that pass through functions of the netlist."""

    DEFINED = b"t\n.param k=2 wn=1u half(x)='x/2'\n.func times(x,y) {k*half(x*y)}\n"

    @pytest.mark.parametrize("width", [b"'half(wn)'", b"times(wn,3)", b"'max(half(wn), 0.1*wn)'"])
    def test_the_number_behind_the_argument_is_changed(self, width: bytes) -> None:
        card = b"m1 y a vss vss nch w=" + width + b" l=60n ad='half(wn)*0.2u'\n"
        changed = self.DEFINED.replace(b".param", b"* evenstage: wn 1u -> 3u: reason\n.param")
        check(self.DEFINED + card, changed.replace(b"wn=1u", b"wn=3u") + card, {"m1": 3})

    def test_a_parameter_inside_the_function_serves_all_who_call_it(self) -> None:
        text = b"t\n.param wg=1u own(x)='x*wg'\n" + b"m1 y a vss vss nch w='own(2)' l=60n\n"
        check(
            text,
            text.replace(b".param wg=1u", b"* evenstage: wg 1u -> 2u: reason\n.param wg=2u"),
            {"m1": 2},
        )
        handles = sized(text + b"m2 z a vss vss nch w='own(3)' l=60n\n", apart={"m2"})
        why = "its width 'own(2)' comes from a parameter that sets other things too"
        assert why in handles.cannot_change().values()

    def test_in_a_leaf_a_call_passes_another_argument(self) -> None:
        leaf = WITH_PARAMETERS.replace(b"w=wn", b"w='half(2*wn)'")
        calls = b"x1 a b vdd vss inv wn=0.9u\nx2 b c vdd vss inv\nx3 c d vdd vss inv\n"
        handles = sized(self.DEFINED + leaf + calls, leaves={"inv"})
        plan = planned(handles, {"x1": 2, "x2": 3})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        assert after.startswith(self.DEFINED + leaf)
        assert b"inv wn=1.8u wp=2.4u\n" in after
        assert b"inv wn=1.8u wp=3.6u\n" in after

    @pytest.mark.parametrize(
        ("function", "width", "through"),
        [
            (b"f(x)='x-0.1u'", b"'f(wn)'", ", through f()"),
            (b"f(x)='x > 0.5u ? x : 2*x'", b"'f(wn)'", ", through f()"),
            (b"f(x)='f(x)'", b"'f(wn)'", None),
            (b"f(x)='x'", b"'max(wn, 0.5u)'", ""),
            (b"f(x)='x'", b"'wn > 0.5u ? wn : 1u'", ""),
        ],
    )
    def test_what_is_not_in_proportion_for_every_factor_stays(
        self, function: bytes, width: bytes, through: str | None
    ) -> None:
        text = b"t\n.param wn=1u " + function + b"\nm1 y a vss vss nch w=" + width + b" l=60n\n"
        if through is None:
            with pytest.raises(EvenstageError, match="circular-parameter"):
                sized(text)
            return
        why = f"its width {width.decode()} is not in proportion to parameters{through}"
        assert list(sized(text).cannot_change().values()) == [why]

    def test_a_function_that_grows_endlessly_is_not_written_out(self) -> None:
        """Each calls the one before twice; the program gives up long before memory does."""
        functions = b"".join(
            b".func f%d(x) {f%d(x)+f%d(x)}\n" % (k, k - 1, k - 1) for k in range(1, 13)
        )
        text = b"t\n.param wn=1n f0(x)='x'\n" + functions + b"m1 y a 0 0 nch w='f12(wn)' l=60n\n"
        assert list(sized(text).cannot_change().values()) == [
            "its width 'f12(wn)' is not in proportion to parameters, through f12()"
        ]
