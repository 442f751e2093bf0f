"""Wished widths to edited text: each case of writing back, as text before and after."""

from __future__ import annotations

import pytest

from evenstage.netlist.rewriting.widths import plan_widths
from support.sized import assert_reads_back, check, planned, process, rewritten, sized, wish_list

INVERTER = b"""\
.subckt inv a y vdd vss
mn y a vss vss nch w=0.6u l=60n
mp y a vdd vdd pch w=1.2u l=60n
.ends inv
"""

INVERTER_S1 = b"""\
* evenstage: inv -> inv_s1: called by x2
.subckt inv_s1 a y vdd vss
* evenstage: w 0.6u -> 1.8u: reason
mn y a vss vss nch w=1.8u l=60n
* evenstage: w 1.2u -> 3.6u: reason
mp y a vdd vdd pch w=3.6u l=60n
.ends inv_s1
"""


class TestOwnCards:
    def test_a_literal_keeps_its_spelling(self) -> None:
        check(
            b"t\nM1 y a vss vss nch W=0.60U l=60n m=2 $ keep me\nm2 y a vdd vdd pch w=1.2u l=60n\n",
            b"t\n* evenstage: W 0.60U -> 0.90U: reason\n"
            b"M1 y a vss vss nch W=0.90U l=60n m=2 $ keep me\nm2 y a vdd vdd pch w=1.2u l=60n\n",
            {"M1": 1.5},
        )

    def test_a_wrapped_transistor_is_like_a_card(self) -> None:
        check(
            b"t\nx1 y a vss vss nfet w=0.6 l=0.06\nx2 y a vdd vdd pfet w=1.2 l=0.06\n",
            b"t\n* evenstage: w 0.6 -> 0.9: reason\n"
            b"x1 y a vss vss nfet w=0.9 l=0.06\nx2 y a vdd vdd pfet w=1.2 l=0.06\n",
            {"x1": 1.5},
        )

    def test_a_defined_wrapper_is_like_a_card(self) -> None:
        wrapper = b".subckt nfet d g s b w=1u l=60n\nm0 d g s b nch w=w l=l ad='w*0.3u'\n.ends\n"
        check(
            b"t\n" + wrapper + b"x1 y a vss vss nfet w='0.6u'\nx2 y a vdd vdd nfet w=1.2u\n",
            b"t\n" + wrapper + b"* evenstage: w '0.6u' -> '0.9u': reason\n"
            b"x1 y a vss vss nfet w='0.9u'\nx2 y a vdd vdd nfet w=1.2u\n",
            {"x1": 1.5},
        )

    def test_cards_of_a_subcircuit_are_changed_for_all_its_callers(self) -> None:
        row = b".subckt row a y vss\nm1 b a vss vss nch w=1u l=60n\nm2 y b vss vss nch w=2u l=60n\n"
        check(
            b"t\n" + row + b".ends\nx1 a y vss row\nx2 a z vss row\n",
            b"t\n"
            + row.replace(b"m2", b"* evenstage: w 2u -> 5u: reason\nm2").replace(b"2u l", b"5u l")
            + b".ends\nx1 a y vss row\nx2 a z vss row\n",
            {"m2": 2.5},
        )

    def test_a_width_that_stays_is_not_touched(self) -> None:
        handles = sized(b"t\nm1 y a vss vss nch w=0.6u l=60n\n")
        plan = planned(handles, {"m1": 1.0})
        assert (plan.edits, plan.written, plan.refused) == ((), (), ())


class TestDiffusion:
    def test_areas_and_perimeters_follow(self) -> None:
        # E = 0.3 um and k = 2 on the drain; E = 0.15 um and k = 0 on the shared source.
        check(
            b"t\nm1 y a vss vss nch w=1u l=60n ad=0.3p pd=2.6u as=0.15p ps=0.3u\n",
            b"t\n* evenstage: w 1u -> 2u: reason\n"
            b"m1 y a vss vss nch w=2u l=60n ad=0.6p pd=4.6u as=0.3p ps=0.3u\n",
            {"m1": 2},
        )

    def test_a_zero_stays_and_an_expression_follows_by_itself(self) -> None:
        text = (
            b".subckt s a y vss w=1u\nm1 y a vss vss nch w=w l=60n ad='w*0.3u' pd=0 as=0p\n.ends\n"
        )
        check(
            b"t\n" + text + b"x1 a y vss s\n",
            b"t\n* evenstage: w 1u -> 2u: reason\n"
            + text.replace(b"w=1u", b"w=2u")
            + b"x1 a y vss s\n",
            {"m1": 2},
        )

    def test_follow_a_parameter_that_serves_the_card_alone(self) -> None:
        check(
            b"t\n.param wd=1u\nm1 y a vss vss nch w=wd l=60n ad=0.3p\n",
            b"t\n* evenstage: wd 1u -> 2u: reason\n.param wd=2u\n"
            b"* evenstage: ad 0.3p -> 0.6p: reason\nm1 y a vss vss nch w=wd l=60n ad=0.6p\n",
            {"m1": 2},
        )


class TestLeaves:
    def test_callers_that_agree_change_the_leaf_itself(self) -> None:
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv\n"
        check(
            b"t\n" + INVERTER + calls,
            b"t\n.subckt inv a y vdd vss\n* evenstage: w 0.6u -> 1.8u: reason\n"
            b"mn y a vss vss nch w=1.8u l=60n\n* evenstage: w 1.2u -> 3.6u: reason\n"
            b"mp y a vdd vdd pch w=3.6u l=60n\n.ends inv\n" + calls,
            {"x1": 3, "x2": 3},
            leaves={"inv"},
        )

    def test_a_caller_that_differs_gets_a_copy_after_the_original(self) -> None:
        check(
            b"t\n" + INVERTER + b"x1 a b vdd vss inv\nx2 b c vdd vss / inv $ last\n",
            b"t\n" + INVERTER + INVERTER_S1 + b"x1 a b vdd vss inv\n"
            b"* evenstage: inv -> inv_s1 (mn w 0.6u -> 1.8u, mp w 1.2u -> 3.6u): reason\n"
            b"x2 b c vdd vss / inv_s1 $ last\n",
            {"x2": 3},
            leaves={"inv"},
        )

    def test_equal_callers_share_a_copy_and_names_do_not_clash(self) -> None:
        text = b"t\n" + INVERTER + INVERTER.replace(b"inv", b"INV_s1")
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv\nx3 c d vdd vss inv\nx4 c d vdd vss inv\n"
        handles = sized(text + calls, leaves={"inv"})
        plan = planned(handles, {"x2": 3, "x3": 2, "x4": 3})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        targets = [line.split()[-1] for line in after.splitlines() if line.startswith(b"x")]
        assert targets == [b"inv", b"inv_s2", b"inv_s3", b"inv_s2"]
        assert after.count(b".subckt") == 4

    def test_equal_changes_are_told_together(self) -> None:
        leaf = (
            b".subckt nd a b y vdd vss\nmn1 y a x vss nch w=1u l=60n\n"
            b"mn2 x b vss vss nch w=1u l=60n\nmp1 y a vdd vdd pch w=0.8u l=60n\n"
            b"mp2 y b vdd vdd pch w=0.8u l=60n\n.ends\n"
        )
        calls = b"x1 a b c vdd vss nd\nx2 b c d vdd vss nd\n"
        handles = sized(b"t\n" + leaf + calls, leaves={"nd"})
        note = b"nd -> nd_s1 (mn1 mn2 w 1u -> 2u, mp1 mp2 w 0.8u -> 1.6u): reason\nx2"
        assert note in rewritten(handles, planned(handles, {"x2": 2}))

    def test_a_caller_outside_the_block_keeps_its_widths(self) -> None:
        block = b".subckt top a c vdd vss\nx2 a c vdd vss inv\n.ends\n"
        other = b".subckt other a c vdd vss\nx1 a c vdd vss inv\n.ends\n"
        check(
            b"t\n" + INVERTER + block + other,
            b"t\n"
            + INVERTER
            + INVERTER_S1
            + block.replace(
                b"x2 a c vdd vss inv",
                b"* evenstage: inv -> inv_s1 (mn w 0.6u -> 1.8u, mp w 1.2u -> 3.6u): reason\n"
                b"x2 a c vdd vss inv_s1",
            )
            + other,
            {"x2": 3},
            leaves={"inv"},
            top="top",
        )

    def test_a_copy_of_a_copy_counts_on(self) -> None:
        text = b"t\n" + INVERTER + INVERTER.replace(b"inv", b"inv_s1")
        calls = b"x0 a b vdd vss inv\nx1 a b vdd vss inv_s1\nx2 b c vdd vss inv_s1\n"
        handles = sized(text + calls, leaves={"inv", "inv_s1"})
        assert b".subckt inv_s2 " in rewritten(handles, planned(handles, {"x2": 3}))

    def test_the_copy_of_a_nested_leaf_stands_in_the_same_scope(self) -> None:
        top = b".subckt top a c vdd vss\n%bx1 a b vdd vss inv\n%bx2 b c vdd vss inv%b\n.ends\n"
        note = b"* evenstage: inv -> inv_s1 (mn w 0.6u -> 1.8u, mp w 1.2u -> 3.6u): reason\n"
        check(
            b"t\n" + top % (INVERTER, b"", b""),
            b"t\n" + top % (INVERTER + INVERTER_S1, note, b"_s1"),
            {"x2": 3},
            leaves={"inv"},
        )

    def test_a_leaf_at_the_very_end_without_a_line_end(self) -> None:
        text = b"t\r\nx1 a b vdd vss inv\r\nx2 b c vdd vss inv\r\n"
        leaf = INVERTER.replace(b"\n", b"\r\n").removesuffix(b"\r\n")
        check(
            text + leaf,
            b"t\r\nx1 a b vdd vss inv\r\n"
            b"* evenstage: inv -> inv_s1 (mn w 0.6u -> 1.8u, mp w 1.2u -> 3.6u): reason\r\n"
            b"x2 b c vdd vss inv_s1\r\n"
            + leaf
            + b"\r\n"
            # The comment above the definition is of the copy's own text.
            + INVERTER_S1.replace(b"\n", b"\r\n").removesuffix(b"\r\n"),
            {"x2": 3},
            leaves={"inv"},
        )

    def test_more_copies_than_allowed_are_our_fault(self) -> None:
        calls = b"x1 a b vdd vss inv\nx2 b c vdd vss inv\nx3 c d vdd vss inv\n"
        handles = sized(b"t\n" + INVERTER + calls, leaves={"inv"}, copies=1)
        wishes = wish_list(handles, {"x1": 3, "x2": 2})
        with pytest.raises(ValueError, match="2 copies of inv, 1 allowed"):
            plan_widths(handles, wishes)


class TestFingers:
    @pytest.mark.parametrize(
        ("card", "factor", "expected"),
        [
            (b"w=1.5u l=60n nf=1", 4, b"w=6u l=60n nf=3"),
            (b"w=1.5u l=60n", 4, b"w=6u l=60n nf=3"),
            (b"W=1.5u l=60n", 4, b"W=6u l=60n NF=3"),
            (b"w=1.5u l=60n nf='2'", 2, b"w=3u l=60n nf='2'"),
            (b"w=6u l=60n nf=4", 0.5, b"w=3u l=60n nf=4"),
        ],
    )
    def test_total_width(self, card: bytes, factor: float, expected: bytes) -> None:
        using = process(fingers_parameter="nf", finger_width_max=2e-6)
        handles = sized(b"t\nm1 y a vss vss nch " + card + b"\n", using=using)
        plan = planned(handles, {"m1": factor})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        assert after.splitlines()[-1] == b"m1 y a vss vss nch " + expected

    @pytest.mark.parametrize(
        ("card", "factor", "expected"),
        [
            (b"w=1.5u l=60n nf=1", 4, b"w=2u l=60n nf=3"),
            (b"w=1u l=60n nf=3", 2, b"w=2u l=60n nf=3"),
            (b"w=1u l=60n nf=3", 2.5, b"w=1.875u l=60n nf=4"),
            (b"w=1u l=60n", 4, b"w=2u l=60n nf=2"),
        ],
    )
    def test_width_per_finger(self, card: bytes, factor: float, expected: bytes) -> None:
        using = process(fingers_parameter="nf", width_is="finger", finger_width_max=2e-6)
        handles = sized(b"t\nm1 y a vss vss nch " + card + b"\n", using=using)
        plan = planned(handles, {"m1": factor})
        assert_reads_back(handles, plan)
        after = rewritten(handles, plan)
        assert after.splitlines()[-1] == b"m1 y a vss vss nch " + expected

    def test_the_comment_names_both(self) -> None:
        using = process(fingers_parameter="nf", finger_width_max=2e-6)
        handles = sized(b"t\nm1 y a vss vss nch w=1.5u l=60n\n", using=using)
        after = rewritten(handles, planned(handles, {"m1": 4}))
        assert b"* evenstage: w 1.5u -> 6u, nf 1 -> 3: reason\n" in after

    def test_a_card_that_cannot_have_more_fingers_is_refused(self) -> None:
        handles = sized(
            b"t\nm1 y a vss vss nch w=1.5u l=60n\n", using=process(finger_width_max=2e-6)
        )
        (handle,) = handles.values()
        assert handle.width_max == pytest.approx(2e-6, rel=1e-12)
        ((_, why),) = planned(handles, {"m1": 4}).refused
        assert why == "6.00 um needs more fingers than the 1 that its card can be given"

    def test_fins_are_counted(self) -> None:
        using = process(width_parameter="nfin", width_is="fins", width_unit=50e-9)
        handles = sized(b"t\nx1 y a vss vss nch nfin=4 l=60n\n", using=using)
        plan = planned(handles, {"x1": 1.6})
        assert rewritten(handles, plan).endswith(b"nch nfin=6 l=60n\n")
        assert plan.written[0].new == pytest.approx(300e-9, rel=1e-9)


class TestComments:
    def test_an_earlier_comment_of_ours_is_replaced(self) -> None:
        card = b"m1 y a vss vss nch w=%b l=60n\n"
        check(
            b"t\n* mine\n* evenstage: w 0.3u -> 0.6u: before\n" + card % b"0.6u",
            b"t\n* mine\n* evenstage: w 0.6u -> 0.9u: reason\n" + card % b"0.9u",
            {"m1": 1.5},
        )

    def test_a_value_on_a_continuation_line(self) -> None:
        text = b"t\n%b m1 y a vss vss\n* between\n\n+ nch\n  + w=\n+ %b l=60n\n"
        check(
            text % (b"", b"0.6u"),
            text % (b"* evenstage: w 0.6u -> 0.9u: reason\n", b"0.9u"),
            {"m1": 1.5},
        )

    def test_a_parameter_on_a_continuation_line(self) -> None:
        text = b"t\n%b.param a=1\n* between\n+ wd = %b\nm1 y a vss vss nch w=wd l=60n\n"
        check(
            text % (b"", b"0.6u"),
            text % (b"* evenstage: wd 0.6u -> 0.9u: reason\n", b"0.9u"),
            {"m1": 1.5},
        )

    @pytest.mark.parametrize("end", [b"\n", b"\r\n", b"\r"])
    def test_the_line_end_is_the_files_own(self, end: bytes) -> None:
        text = b"t\n%bm1 y a vss vss nch w=%b l=60n".replace(b"\n", end)
        note = b"* evenstage: w 0.6u -> 0.9u: reason" + end
        check(text % (b"", b"0.6u"), text % (note, b"0.9u"), {"m1": 1.5})

    def test_after_a_byte_order_mark_and_a_title_of_any_bytes(self) -> None:
        text = b"\xef\xbb\xbft \xff\xfe\x85\n\t%bm1 y a vss vss nch\tw=%b l=60n \t\n* \xe9\n"
        handles = sized(text % (b"", b"0.6u"))
        after = rewritten(handles, planned(handles, {"m1": 1.5}))
        assert after == (text % (b"", b"0.9u")).replace(
            b"\tm1", b"* evenstage: w 0.6u -> 0.9u: reason\n\tm1"
        )

    def test_a_reason_is_one_line_whatever_it_holds(self) -> None:
        handles = sized(b"t\nm1 y a vss vss nch w=0.6u l=60n\n")
        after = rewritten(handles, planned(handles, {"m1": 2}, "one\r\n+ two\N{LINE SEPARATOR}é"))
        assert after.splitlines()[1].decode() == "* evenstage: w 0.6u -> 1.2u: one + two é"
