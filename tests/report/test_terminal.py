"""The reports, whole and line by line."""

from __future__ import annotations

import re
from dataclasses import replace
from typing import TYPE_CHECKING

import pytest

from evenstage.errors import Notice
from evenstage.report.frame import CAUTION
from evenstage.report.paper import Paper
from evenstage.report.terminal import analysis_report, difference_report, sizing_report
from evenstage.sizing.results import (
    FewChanges,
    FewChangesPoint,
    SizedCorners,
    TradeOff,
    TradeOffPoint,
)
from evenstage.timing.corners import merged
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.sizing.results import Sizing
    from evenstage.timing.results import Analysis, Difference

WIDTHS = [80, 100, 160]


def one_line(text: str) -> str:
    """Return a text without its line ends, so that a sentence can be found in it."""
    return " ".join(text.split())


class TestGolden:
    @pytest.mark.parametrize("width", WIDTHS)
    def test_analysis(
        self, analysis: Analysis, golden: Callable[[str, str], None], width: int
    ) -> None:
        golden(f"analysis_{width}", analysis_report(analysis, Paper(width)))

    @pytest.mark.parametrize("width", WIDTHS)
    def test_sizing(self, sizing: Sizing, golden: Callable[[str, str], None], width: int) -> None:
        golden(f"sizing_{width}", sizing_report(sizing, Paper(width)))

    @pytest.mark.parametrize("width", WIDTHS)
    def test_difference(
        self, difference: Difference, golden: Callable[[str, str], None], width: int
    ) -> None:
        golden(f"difference_{width}", difference_report(difference, Paper(width)))

    def test_trade_off(self, sizing: Sizing, golden: Callable[[str, str], None]) -> None:
        points = tuple(
            TradeOffPoint(
                charged_delay=delay * 1e-12,
                delay=(delay - 9) * 1e-12,
                spend=spend * 1e-6,
                bound=spend * 0.99999e-6,
                gap=1e-5,
                one_percent_buys=buys,
            )
            for delay, spend, buys in ((600.0, 80.0, None), (500.0, 95.0, 2e-12), (460, 160.0, 0))
        )
        curve = TradeOff(
            spend="width",
            today_charged_delay=600e-12,
            today_spend=100e-6,
            points=points,
            knee=1,
        )
        text = sizing_report(replace(sizing, trade_off=curve))
        begin = text.index("Width against delay")
        golden("trade_off", text[begin : text.index("The slowest path", begin)])

    def test_few_changes(self, sizing: Sizing, golden: Callable[[str, str], None]) -> None:
        points = tuple(
            FewChangesPoint(cards=cards, charged_delay=delay * 1e-12)
            for cards, delay in ((1, 590.0), (2, 540.0), (5, 480.0), (9, 452.0))
        )
        few = FewChanges(asked=5, today_charged_delay=600e-12, bound=450e-12, points=points)
        text = sizing_report(replace(sizing, few=few))
        begin = text.index("Delay against the number")
        golden("few_changes", text[begin : text.index("The slowest path", begin)])
        assert "with only the chosen cards changed (5 at most) no sizes" in one_line(text)

    def test_corners(self, sizing: Sizing, golden: Callable[[str, str], None]) -> None:
        text = sizing_report(in_corners(sizing))
        golden("sized_corners", text[: text.index("What more room")])
        for section in ("The slowest path in slow", "The block in slow"):
            assert section in text

    def test_unicode(self, sizing: Sizing, golden: Callable[[str, str], None]) -> None:
        text = analysis_report(sizing.before, Paper(unicode=True)) + sizing_report(
            sizing, Paper(unicode=True)
        )
        golden("unicode", text)


def in_corners(sizing: Sizing) -> Sizing:
    """Return a sizing as the slow corner of two; in the other all is faster."""
    before, after = (
        merged(
            [
                _named(sizing.before if when else sizing.after, name, speed)
                for name, speed in (("slow", 1.0), ("fast", 0.7))
            ]
        )
        for when in (True, False)
    )
    corners = SizedCorners(before=before, after=after, shares=(0.99, 0.01))
    return replace(sizing, before=before.analyses[0], after=after.analyses[0], corners=corners)


def _named(analysis: Analysis, name: str, speed: float) -> Analysis:
    """Return an analysis in a corner of some name, with its first path faster."""
    path = replace(analysis.paths[0], corner=name, delay=speed * analysis.paths[0].delay)
    yardstick = replace(analysis.yardstick, process=name)
    return replace(analysis, yardstick=yardstick, paths=(path,), ends=analysis.ends[1:])


class TestAnyReport:
    def test_ends_with_the_caution(
        self, analysis: Analysis, sizing: Sizing, difference: Difference
    ) -> None:
        for text in (
            analysis_report(analysis),
            sizing_report(sizing),
            difference_report(difference),
        ):
            assert one_line(text).endswith(CAUTION)
            assert text.endswith("someone.\n")


class TestAnalysisReport:
    def test_answer_comes_first(self, analysis: Analysis) -> None:
        assert analysis_report(analysis).split("\n")[2] == (
            "The slowest path, a3 rising to wl[63] rising, takes 189 ps, 7.8 FO4, through 6 stages."
        )

    def test_late_path_says_so(self, analysis: Analysis) -> None:
        path = replace(analysis.paths[0], required=150e-12)
        text = one_line(analysis_report(replace(analysis, paths=(path,))))
        assert "It must arrive by 150 ps and is 38.8 ps late." in text

    def test_late_start_is_not_part_of_the_time_taken(self, analysis: Analysis) -> None:
        path = analysis.paths[0]
        later = replace(path, start_arrival=200e-12, delay=path.delay + 200e-12)
        text = one_line(analysis_report(replace(analysis, paths=(later,), ends=())))
        assert "takes 189 ps" in text
        assert "It begins at 200 ps, so wl[63] arrives at 389 ps." in text

    def test_urgent_path_is_not_called_the_slowest(self, analysis: Analysis) -> None:
        end = replace(analysis.ends[0], delay=900e-12)
        text = analysis_report(replace(analysis, ends=(end, *analysis.ends)))
        assert "The most urgent path, a3" in text
        assert "slowest path" not in text

    def test_bars_follow_the_path_not_the_latest_arrivals(self, analysis: Analysis) -> None:
        path = analysis.paths[0]
        stages = tuple(replace(stage, arrival=stage.arrival + 1e-9) for stage in path.stages)
        shifted = replace(analysis, paths=(replace(path, stages=stages),))
        assert analysis_report(shifted) == analysis_report(replace(analysis, paths=(path,)))

    def test_stage_count_at_fault_is_named(self, analysis: Analysis) -> None:
        path = replace(analysis.paths[0], best_stage_count=8)
        text = one_line(analysis_report(replace(analysis, paths=(path,))))
        assert "stages 6; with even efforts 8 would be faster" in text

    def test_even_path_is_left_in_peace(self, analysis: Analysis) -> None:
        path = analysis.paths[0]
        charged = sum(stage.charged_delay for stage in path.stages)
        even = replace(path, least_delay=charged)
        text = one_line(analysis_report(replace(analysis, paths=(even,))))
        assert "evening them out would gain next to nothing" in text

    def test_corner_is_named_where_it_is_not_the_process(self, analysis: Analysis) -> None:
        path = replace(analysis.paths[0], corner="slow")
        assert "through 6 stages (corner slow)" in one_line(
            analysis_report(replace(analysis, paths=(path,)))
        )

    def test_no_paths(self, analysis: Analysis) -> None:
        assert "There is no path to report." in analysis_report(replace(analysis, paths=()))

    def test_path_without_stages(self, analysis: Analysis) -> None:
        path = replace(analysis.paths[0], stages=())
        assert "no stage between" in analysis_report(replace(analysis, paths=(path,)))


class TestSizingReport:
    def test_answer_comes_first(self, sizing: Sizing) -> None:
        answer = one_line(sizing_report(sizing)).removeprefix("rowdec.sp, block rowdec ")
        assert answer.startswith(
            "The slowest path falls from 189 ps to 151 ps (-20 %); 2 cards change; total width "
            "+1.2 %. The same path is the slowest: a3 rising to wl[63] rising."
        )

    def test_changes_that_help_only_together_say_so(self, sizing: Sizing) -> None:
        changes = tuple(replace(change, alone=2e-12) for change in sizing.changes)
        assert "No change helps alone" in one_line(sizing_report(replace(sizing, changes=changes)))
        assert "No change helps alone" not in one_line(sizing_report(sizing))

    def test_another_path_may_be_slowest_now(self, sizing: Sizing) -> None:
        after = replace(sizing.after, paths=sizing.after.paths[::-1])
        text = one_line(sizing_report(replace(sizing, after=after)))
        assert "Another path is now the slowest: a2 rising to wl[62] rising." in text

    def test_bound_on_width(self, sizing: Sizing) -> None:
        by_width = replace(sizing, bound_on="width", bound=0.99 * sizing.total_width_after)
        text = one_line(sizing_report(by_width))
        assert "no sizes within the limits can be narrower in total than 1.213 mm" in text
        assert "the fastest possible would be 152 ps" in text

    def test_bound_on_energy(self, sizing: Sizing) -> None:
        by_energy = replace(sizing, bound_on="energy", bound=0.99 * sizing.after.switched_cap)
        text = one_line(sizing_report(by_energy))
        cap = engineering(by_energy.bound, "F", 4)
        assert f"no sizes within the limits can switch less capacitance than {cap}" in text
        assert "1.01 % above" in text

    def test_widths_below_the_bound_say_why(self, sizing: Sizing) -> None:
        reached = max(end.charged_delay for end in sizing.after.ends)
        text = one_line(sizing_report(replace(sizing, bound=1.002 * reached)))
        assert "0.20 % below, as the grid moves the widths of one gate apart" in text

    def test_bound_counts_against_required_times_where_they_differ(self, sizing: Sizing) -> None:
        early, *others = sizing.after.ends
        ends = (
            replace(early, required=100e-12, charged_delay=130e-12),
            *(replace(end, required=400e-12) for end in others),
        )
        after = replace(sizing.after, ends=ends)
        text = one_line(sizing_report(replace(sizing, after=after, bound=420e-12)))
        assert "do better than 20.0 ps late; the written ones are 30.0 ps late" in text

    def test_small_gain_is_told_by_itself(self, sizing: Sizing) -> None:
        before = sizing.before.paths[0]
        path = replace(sizing.after.paths[0], delay=before.delay * 0.9999)
        after = replace(sizing.after, paths=(path,))
        text = one_line(sizing_report(replace(sizing, after=after)))
        assert "The slowest path falls by 18.9 fs to 189 ps (-0.01 %)" in text

    def test_most_urgent_path_is_not_called_the_slowest(self, sizing: Sizing) -> None:
        late = replace(sizing.before.ends[-1], delay=1e-9, charged_delay=1e-9)
        before = replace(sizing.before, ends=(*sizing.before.ends[:-1], late))
        after = replace(sizing.after, ends=(*sizing.after.ends[:-1], late))
        text = one_line(sizing_report(replace(sizing, before=before, after=after)))
        assert "The most urgent path falls" in text
        assert "slowest" not in text

    @pytest.mark.parametrize(
        ("done", "free", "why"),
        [
            (True, 14, "this netlist was written with the same wishes before"),
            (False, 0, "none of the 3 cards may change"),
            (False, 14, "no widths on the grid and within the limits serve the goal (fastest)"),
        ],
    )
    def test_no_changes_say_why(self, sizing: Sizing, *, done: bool, free: int, why: str) -> None:
        nothing = replace(
            sizing, after=sizing.before, changes=(), already_done=done, free_cards=free
        )
        text = one_line(sizing_report(nothing))
        assert f"Nothing changes: {why}" in text
        assert "held xpre0.xinv (input ceiling), xrow[63].xnand (same size)" in text
        assert "Changes" not in text

    def test_of_very_many_changes_those_that_buy_most_are_shown(self, sizing: Sizing) -> None:
        changes = tuple(
            replace(sizing.changes[0], instance=f"x{i}", line=i, alone=-i * 1e-12)
            for i in range(100)
        )
        text = sizing_report(replace(sizing, changes=changes))
        assert "and 60 cards more that buy less" in text
        assert "  x60 " in text
        assert "  x59 " not in text

    def test_says_how_late_the_slowest_path_still_is(self, sizing: Sizing) -> None:
        path = sizing.after.paths[0]
        asked = replace(path, required=path.delay - 12e-12)
        after = replace(sizing.after, paths=(asked, *sizing.after.paths[1:]))
        assert "and is 12.0 ps late. How good" in one_line(
            sizing_report(replace(sizing, after=after))
        )

    def test_gates_that_change_alike_share_their_lines(self, sizing: Sizing) -> None:
        changes = tuple(
            replace(sizing.changes[0], instance=f"x{i}", card=card, line=10 + i)
            for i in range(3)
            for card in ("mn1", "mn2")
        )
        text = sizing_report(replace(sizing, changes=changes))
        assert "3 cards change" in text
        assert re.search(r"^  x0:2 x24 +mn1 mn2 +w .*-41\.0 +-44\.0 +10-12", text, re.MULTILINE)

    def test_paths_of_other_gates_pair_by_kind(self, sizing: Sizing) -> None:
        moved = tuple(
            replace(stage, instance=f"other.{stage.instance}")
            for stage in sizing.after.paths[0].stages
        )
        path = replace(sizing.after.paths[0], stages=moved, start="b3")
        after = replace(sizing.after, paths=(path,))
        text = sizing_report(replace(sizing, after=after))
        assert re.search(r"^1  xpre0\.xinv .*before.*\n   other.*xinv .*after", text, re.MULTILINE)


class TestDifferenceReport:
    def test_repeated_instances_share_a_line(self, difference: Difference) -> None:
        text = difference_report(difference)
        assert "xrow[0:63].xdrv.xi2 x64  mn1" in text
        assert "  after     20 x xspare0:19\n" in text

    def test_netlists_without_a_common_transistor(self, difference: Difference) -> None:
        alone = tuple(replace(width, after=None) for width in difference.widths[:3])
        text = one_line(difference_report(replace(difference, widths=alone, unchanged=0)))
        assert "No transistor stands in both netlists: are they of one design?" in text

    def test_path_of_one_netlist_only(self, difference: Difference) -> None:
        alone = replace(difference, same_path_after=None, same_path_before=None)
        assert "The slowest path of each, stages of one gate together" in difference_report(alone)

    def test_equal_netlists(self, difference: Difference) -> None:
        before = difference.before
        same = replace(
            difference,
            after=before,
            same_path_after=before.paths[0],
            same_path_before=before.paths[0],
            widths=(),
            only_before=(),
            only_after=(),
        )
        text = one_line(difference_report(same))
        assert "The slowest path stays at 189 ps. It is the same in both" in text
        assert "Widths differ on no transistors and agree on 974." in text
        assert "Widths that differ" not in text
        assert "In only one netlist" not in text


class TestNotices:
    def test_names_follow_what_does_not_name_them(self, analysis: Analysis) -> None:
        notice = Notice("odd", "some cards are odd", names=("xa", *(f"m{i}" for i in range(9))))
        text = one_line(analysis_report(replace(analysis, notices=(notice,))))
        assert "odd: some cards are odd: xa, 9 x m0:8" in text

    def test_names_are_not_told_twice(self, analysis: Analysis) -> None:
        notice = Notice("odd", "the cards 'xa' and another are odd", names=("xa", "xb"))
        text = one_line(analysis_report(replace(analysis, notices=(notice,))))
        assert "another are odd An estimate" in text

    def test_names_without_quotes_are_seen_too(self, analysis: Analysis) -> None:
        notices = (
            Notice("odd", "first at y -> b", names=("y -> b",)),
            Notice("cut", "a b", "", ("a",)),
        )
        text = one_line(analysis_report(replace(analysis, notices=notices)))
        assert "odd: first at y -> b cut: a b: a An estimate" in text

    def test_can_be_left_out(
        self, analysis: Analysis, sizing: Sizing, difference: Difference
    ) -> None:
        notice = Notice("odd", "something is odd")
        noticed = replace(analysis, notices=(notice,))
        both = (Paper(notices=True), Paper(notices=False))
        texts = [
            *(analysis_report(noticed, paper) for paper in both),
            *(sizing_report(replace(sizing, before=noticed), paper) for paper in both),
            *(difference_report(replace(difference, before=noticed), paper) for paper in both),
        ]
        assert ["something is odd" in text for text in texts] == [True, False] * 3
