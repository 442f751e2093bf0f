"""Two netlists of one design: widths, what is in only one, and each other's slowest path."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import pytest
from hypothesis import given, settings

from evenstage.brief import Brief, IgnoreBrief
from evenstage.pattern import Pattern
from evenstage.timing.analyse import analyse
from evenstage.timing.compare import compare
from support.blocks import circuit_of, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.timing.results import Analysis, Difference, Path

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7)
TEXT = """* two rows and a driver
.global vdd vss
.subckt inv a y
mn y a vss vss nx w=1u l=0.1u
mp y a vdd vdd px w=2u l=0.1u
.ends
.subckt top a b y z
x1 a m inv
x2 m y inv
x3 b k inv
mzn z k vss vss nx w=4u l=0.1u
mzp z k vdd vdd px w=8u l=0.1u
cy y vss 90f
cz z vss 10f
.ends
"""


def analysis(text: str, brief: Brief | None = None) -> Analysis:
    return analyse(circuit_of(text, PROCESS, brief), brief)


def difference(after: str, before: str = TEXT, brief: Brief | None = None) -> Difference:
    return compare(analysis(before, brief), analysis(after, brief))


def edges(path: Path | None) -> list[tuple[str, str]]:
    assert path is not None
    return [(path.start, path.start_edge), *((s.output, s.edge) for s in path.stages)]


class TestWidths:
    def test_a_netlist_does_not_differ_from_itself(self) -> None:
        found = difference(TEXT)
        assert (found.widths, found.unchanged) == ((), 8)
        assert (found.only_before, found.only_after) == ((), ())
        assert found.same_path_after == found.before.paths[0]

    def test_each_instance_of_a_changed_card_differs(self) -> None:
        found = difference(TEXT.replace("nx w=1u", "nx w=1.5u"))
        assert [(w.instance, w.card) for w in found.widths] == [
            ("x1", "mn"),
            ("x2", "mn"),
            ("x3", "mn"),
        ]
        for width in found.widths:
            assert width.before == pytest.approx(1e-6)
            assert width.after == pytest.approx(1.5e-6)
            assert width.model == "nx"
        assert found.unchanged == 5

    def test_letters_case_and_the_order_of_cards_do_not_matter(self) -> None:
        head, body = TEXT.split(".subckt top a b y z\n")
        cards = body.splitlines()[:-1]
        other = "\n".join([head + ".subckt TOP a b y z", *reversed(cards), ".ends", ""])
        found = difference(other.replace("mzn z k", "MZN Z K"))
        assert (found.widths, found.unchanged) == ((), 8)
        assert (found.only_before, found.only_after) == ((), ())

    def test_another_number_of_copies_counts_with_them(self) -> None:
        (changed,) = difference(TEXT.replace("nx w=4u l=0.1u", "nx w=4u l=0.1u m=2")).widths
        assert changed.before == pytest.approx(4e-6)
        assert changed.after == pytest.approx(8e-6)

    def test_the_same_width_in_copies_is_no_difference(self) -> None:
        found = difference(TEXT.replace("nx w=4u l=0.1u", "nx w=2u l=0.1u m=2"))
        assert (found.widths, found.unchanged) == ((), 8)


class TestOnlyInOne:
    LONGER = TEXT.replace("x3 b k inv\n", "x3 b j inv\nx4 j i inv\nx5 i k inv\n")

    def test_an_added_instance(self) -> None:
        found = difference(self.LONGER)
        assert set(found.only_after) == {"x4", "x5", "j", "i"}
        assert found.only_before == ()
        added = [(w.instance, w.card, w.before) for w in found.widths]
        assert added == [("x4", "mn", None), ("x4", "mp", None), ("x5", "mn", None),
                         ("x5", "mp", None)]  # fmt: skip

    def test_a_missing_instance(self) -> None:
        found = difference(TEXT, before=self.LONGER)
        assert set(found.only_before) == {"x4", "x5", "j", "i"}
        assert {w.after for w in found.widths} == {None}

    def test_a_path_that_no_longer_exists(self) -> None:
        renamed = TEXT.replace("x1 a m inv\nx2 m y inv", "x1 a mm inv\nx2 mm y inv")
        found = difference(renamed)
        assert found.same_path_after is None
        assert found.same_path_before is None


class TestSamePath:
    def test_each_slowest_path_is_found_in_the_other(self) -> None:
        """The second driver becomes so weak that its path is the slowest."""
        found = difference(TEXT.replace("w=4u", "w=0.1u").replace("w=8u", "w=0.2u"))
        assert found.before.paths[0].end == "y"
        assert found.after.paths[0].end == "z"
        assert edges(found.same_path_after) == edges(found.before.paths[0])
        assert edges(found.same_path_before) == edges(found.after.paths[0])
        assert found.same_path_before is not None
        assert found.same_path_before.delay < found.before.paths[0].delay

    @given(random_blocks(), random_blocks())
    @settings(max_examples=30, deadline=None)
    def test_a_path_found_again_runs_along_the_same_edges(
        self, one: RandomBlock, widths: RandomBlock
    ) -> None:
        gates = tuple(
            (kind, inputs, output, widths.gates[index % len(widths.gates)][3])
            for index, (kind, inputs, output, _) in enumerate(one.gates)
        )
        found = difference(replace(one, gates=gates).text(), before=one.text())
        again = found.same_path_after
        assert edges(again) == edges(found.before.paths[0])
        assert again is not None
        assert again.delay <= found.after.paths[0].delay * (1 + 1e-12)

    def test_where_paths_are_ignored(self) -> None:
        brief = Brief(ignores=(IgnoreBrief(start=(Pattern("b"),), through=(Pattern("y"),)),))
        found = difference(TEXT.replace("nx w=1u", "nx w=1.5u"), brief=brief)
        assert edges(found.same_path_after) == edges(found.before.paths[0])


def test_an_analysis_without_its_timing_cannot_be_compared() -> None:
    whole = analysis(TEXT)
    with pytest.raises(ValueError, match="without its timing"):
        compare(whole, replace(whole, timing=None))
