"""Reports of anything: whatever the numbers and names, the lines fit and can be written."""

from __future__ import annotations

import random
import re
from dataclasses import replace
from typing import TYPE_CHECKING, TypeVar
from xml.etree.ElementTree import fromstring

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.errors import Notice
from evenstage.logic.paths import PathVector
from evenstage.logic.same import StructureCheck
from evenstage.report.document.convert import (
    document as document_of,
)
from evenstage.report.document.convert import (
    to_json,
)
from evenstage.report.origin import Origin
from evenstage.report.page.render import html
from evenstage.report.paper import Paper, cells
from evenstage.report.terminal import analysis_report, difference_report, sizing_report
from evenstage.sizing.results import Change, Sizing, StageHold
from evenstage.timing.results import (
    Analysis,
    Counts,
    Difference,
    Path,
    PathEnd,
    SideBranch,
    Stage,
    WidthDifference,
    Yardstick,
)

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.sizing.results import Hold
    from evenstage.timing.results import Edge

Made = TypeVar("Made")

SEEDS = st.integers(0, 2**32)
PAPERS = st.tuples(st.sampled_from([80, 93, 100, 131, 160]), st.booleans())
QUICK = settings(max_examples=40, deadline=None)

#: Letters of names: common ones, blanks, controls, wide ones, marks, bytes that are no UTF-8.
LETTERS = "abxyz0129[].:! \t\n\x00\x7f\xe9\u8a9e\u0301\u2028\ufffd\udc80\udcff"
HOLDS: tuple[Hold, ...] = ("", "lower", "upper", "fixed", "ceiling", "transition", "same size")


class Anything:
    """Results with extreme numbers and names, the same ones for the same seed.

    Plain code and not strategies: to print a failing result of this depth would take minutes.
    """

    def __init__(self, seed: int) -> None:
        self.random = random.Random(seed)

    def some(self, make: Callable[[], Made], most: int) -> tuple[Made, ...]:
        return tuple(make() for _ in range(self.random.randint(0, most)))

    def maybe(self, make: Callable[[], Made]) -> Made | None:
        return make() if self.random.random() < 0.7 else None

    def name(self) -> str:
        kind = self.random.random()
        if kind < 0.5:
            return f"xa[{self.random.randint(0, 99)}].xi{self.random.randint(0, 9)}"
        length = self.random.choice([0, 1, 5, 12, 200])
        letters = LETTERS if kind < 0.8 else "x"
        return "".join(self.random.choice(letters) for _ in range(length))

    def between(self, least: float, most: float) -> float:
        return float(least * (most / least) ** self.random.random())

    def time(self) -> float:
        return self.random.choice([0.0, self.between(1e-15, 1e-6), self.between(1e-12, 1e-9)])

    def cap(self) -> float:
        return self.random.choice([0.0, self.between(1e-18, 1e-9)])

    def effort(self) -> float:
        return self.random.choice([0.0, self.between(1e-6, 1e9), self.between(0.5, 50.0)])

    def width(self) -> float:
        return self.between(1e-9, 1e-1)

    def number(self) -> int:
        return self.random.choice([0, 1, 2, 10**7])

    def edge(self) -> Edge:
        return "rise" if self.random.random() < 0.5 else "fall"

    def notice(self) -> Notice:
        return Notice(self.name(), self.name(), self.name(), self.some(self.name, 3))

    def branch(self) -> SideBranch:
        return SideBranch(instance=self.name(), pin=self.name(), cap=self.cap())

    def stage(self) -> Stage:
        return Stage(
            instance=self.name(),
            subcircuit=self.name(),
            function=self.name(),
            input=self.name(),
            output=self.name(),
            edge=self.edge(),
            arrival=self.time(),
            delay=self.time(),
            charged_delay=self.time(),
            transition=self.time(),
            logical_effort=self.effort(),
            electrical_effort=self.effort(),
            branching_effort=self.effort(),
            stage_effort=self.effort(),
            parasitic_delay=self.effort(),
            input_cap=self.cap(),
            load_cap=self.cap(),
            on_path_cap=self.cap(),
            self_cap=self.cap(),
            width=self.width(),
            side_branches=self.some(self.branch, 6),
        )

    def vector(self) -> PathVector:
        return PathVector(
            verdict=self.random.choice(["switches", "false", "together", "unknown"]),
            held=self.some(lambda: (self.name(), self.random.random() < 0.5), 40),
            reason=self.name(),
        )

    def path(self) -> Path:
        return Path(
            start=self.name(),
            start_edge=self.edge(),
            start_arrival=self.time(),
            end=self.name(),
            edge=self.edge(),
            corner=self.name(),
            delay=self.time(),
            charged_delay=self.time(),
            required=self.maybe(self.time),
            logical_effort=self.effort(),
            branching_effort=self.effort(),
            electrical_effort=self.effort(),
            path_effort=self.effort(),
            parasitic_delay=self.effort(),
            best_stage_effort=self.between(1.0, 10.0),
            best_stage_count=self.number(),
            least_delay=self.time(),
            stages=self.some(self.stage, 6),
            vector=self.maybe(self.vector),
        )

    def end(self) -> PathEnd:
        return PathEnd(
            net=self.name(),
            edge=self.edge(),
            delay=self.time(),
            charged_delay=self.time(),
            required=self.maybe(self.time),
            why=self.maybe(self.name) or "output",
        )

    def yardstick(self) -> Yardstick:
        return Yardstick(
            process=self.name(),
            tau=self.between(1e-13, 1e-9),
            p_inv=self.effort(),
            fo4=self.between(1e-12, 1e-8),
            input_cap=self.cap(),
            charge_rise=self.effort(),
            charge_fall=self.effort(),
            transition_rise=self.time(),
            transition_fall=self.time(),
        )

    def analysis(self) -> Analysis:
        return Analysis(
            source=self.name(),
            top=self.name(),
            yardstick=self.yardstick(),
            counts=Counts(
                devices=self.number(),
                nets=self.number(),
                gates=self.number(),
                stages=self.number(),
            ),
            paths=(self.path(), *self.some(self.path, 2)),
            false_paths=self.some(self.path, 8),
            ends=self.some(self.end, 14),
            worst_transition=self.time(),
            total_width=self.width(),
            switched_cap=self.cap(),
            input_caps=self.some(lambda: (self.name(), self.cap()), 12),
            notices=self.some(self.notice, 6),
        )

    def change(self) -> Change:
        return Change(
            card=self.name(),
            file=self.name(),
            line=1 + self.number(),
            instance=self.name(),
            occurrences=1 + self.number(),
            parameter=self.name(),
            old=self.width(),
            new=self.width(),
            alone=self.random.choice([-1, 1]) * self.time(),
            last=self.random.choice([-1, 1]) * self.time(),
            why=self.name(),
        )

    def hold(self) -> StageHold:
        return StageHold(instance=self.name(), hold=self.random.choice(HOLDS))

    def sizing(self) -> Sizing:
        return Sizing(
            before=self.analysis(),
            after=self.analysis(),
            goal=self.name(),
            bound=self.between(1e-15, 1e-3),
            bound_on=self.random.choice(["delay", "width", "energy"]),
            gap=self.random.choice([0.0, self.between(1e-9, 1e3)]),
            rounding_loss=self.random.choice([-0.1, 0.0, self.between(1e-9, 1e3)]),
            least_delay=self.time(),
            total_width_before=self.width(),
            total_width_after=self.width(),
            free_cards=self.number(),
            fixed_cards=self.number(),
            changes=self.some(self.change, 6),
            holds=self.some(self.hold, 4),
            already_done=self.random.random() < 0.5,
            notices=self.some(self.notice, 2),
            structure=self.maybe(self.structure),
        )

    def structure(self) -> StructureCheck:
        same = self.random.choice([True, None])
        reason = "" if same else self.name()
        return StructureCheck(same=same, reason=reason, transistors=self.number())

    def width_difference(self) -> WidthDifference:
        return WidthDifference(
            instance=self.name(),
            card=self.name(),
            model=self.name(),
            before=self.maybe(self.width),
            after=self.maybe(self.width),
        )

    def difference(self) -> Difference:
        return Difference(
            before=self.analysis(),
            after=self.analysis(),
            widths=self.some(self.width_difference, 6),
            unchanged=self.number(),
            same_path_after=self.maybe(self.path),
            same_path_before=self.maybe(self.path),
            only_before=self.some(self.name, 20),
            only_after=self.some(self.name, 20),
        )


def assert_well_set(text: str, width: int, *, unicode: bool) -> None:
    """Every line fits, ends in a sign, and can be written to the output it is made for."""
    assert text.endswith("\n")
    for line in text[:-1].split("\n"):
        assert cells(line) <= width
        assert line == line.rstrip(" ")
        assert line.isprintable()
        assert unicode or line.isascii()
        assert re.search(r"\b(nan|inf)\b", line) is None


class TestLines:
    @given(SEEDS, PAPERS)
    @QUICK
    def test_analysis(self, seed: int, paper: tuple[int, bool]) -> None:
        width, unicode = paper
        analysis = Anything(seed).analysis()
        text = analysis_report(analysis, Paper(width, unicode))
        assert_well_set(text, width, unicode=unicode)
        assert to_json(document_of(analysis)).isascii()

    @given(SEEDS, PAPERS)
    @QUICK
    def test_sizing(self, seed: int, paper: tuple[int, bool]) -> None:
        width, unicode = paper
        sizing = Anything(seed).sizing()
        text = sizing_report(sizing, Paper(width, unicode))
        assert_well_set(text, width, unicode=unicode)
        assert to_json(document_of(sizing)).isascii()

    @given(SEEDS, PAPERS)
    @QUICK
    def test_difference(self, seed: int, paper: tuple[int, bool]) -> None:
        width, unicode = paper
        difference = Anything(seed).difference()
        text = difference_report(difference, Paper(width, unicode))
        assert_well_set(text, width, unicode=unicode)
        assert to_json(document_of(difference)).isascii()


class TestPages:
    @given(SEEDS, st.sampled_from([Anything.analysis, Anything.sizing, Anything.difference]))
    @QUICK
    def test_can_be_written(
        self, seed: int, make: Callable[[Anything], Analysis | Sizing | Difference]
    ) -> None:
        page = html(make(Anything(seed)), Origin("1.0", (), ()))
        assert page.encode("utf-8").endswith(b"</html>\n")
        assert re.search(r'="(?:nan|-?inf)', page) is None
        assert re.search(r' (?:width|height|r)="-', page) is None
        for drawn in re.findall(r"<svg.*?</svg>", page, re.DOTALL):
            fromstring(drawn)


class TestLongPath:
    @pytest.mark.parametrize("width", [80, 100, 160])
    def test_two_hundred_stages(self, analysis: Analysis, width: int) -> None:
        path = analysis.paths[0]
        long = replace(
            path,
            stages=tuple(
                replace(path.stages[i % 6], instance=f"xchain{i}.xstage") for i in range(200)
            ),
            delay=sum(path.stages[i % 6].delay for i in range(200)),
        )
        text = analysis_report(replace(analysis, paths=(long,)), Paper(width))
        assert_well_set(text, width, unicode=False)
        assert len(re.findall(r"^ *\d+  xchain\d+\.xstage", text, re.MULTILINE)) == 200

    def test_single_stage(self, analysis: Analysis) -> None:
        path = analysis.paths[0]
        alone = replace(path, stages=path.stages[:1], delay=path.stages[0].delay)
        text = analysis_report(replace(analysis, paths=(alone,), ends=()))
        assert_well_set(text, 100, unicode=False)
        assert "through 1 stage." in text


class TestDeterminism:
    def test_side_branches_of_one_weight_stand_in_order_of_name(self, analysis: Analysis) -> None:
        path = analysis.paths[0]
        twins = [SideBranch(instance=name, pin="a", cap=1e-15) for name in ("xc", "xa", "xb")]
        texts = []
        for branches in (twins, twins[::-1]):
            stage = replace(path.stages[0], side_branches=tuple(branches))
            texts.append(
                analysis_report(replace(analysis, paths=(replace(path, stages=(stage,)),)))
            )
        assert texts[0] == texts[1]
        assert texts[0].index("+ xa pin a") < texts[0].index("+ xb pin a")

    @pytest.mark.parametrize("report", [analysis_report])
    def test_report_is_the_same_each_time(
        self, analysis: Analysis, report: Callable[[Analysis], str]
    ) -> None:
        assert report(analysis) == report(replace(analysis))
