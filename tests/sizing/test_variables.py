"""How far each size may move."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Unpack

import numpy as np
import pytest

from evenstage.brief import Brief, LimitBrief
from evenstage.errors import InfeasibleError, SettingsError
from evenstage.pattern import Pattern
from evenstage.sizing.variables import GROWTH_MAX
from support.blocks import Constants, circuit_of, inverter, plain_process
from support.models import variables_of

if TYPE_CHECKING:
    from evenstage.process.process import Process

TEXT = (
    "* two inverters\n.global vdd vss\n.subckt top a y\n"
    + inverter("i", "a", "m", 1, 2) + "\n" + inverter("j", "m", "y", 4, 10) + "\n.ends\n"
)  # fmt: skip
PLAIN = plain_process()


def limited(**keys: Unpack[Constants]) -> Process:
    return plain_process(**keys)


def brief(**limits: float) -> Brief:
    return Brief(limits=(LimitBrief(cards=(Pattern("mj*"),), **limits),))


class TestBounds:
    def test_nothing_shrinks_below_the_smallest_of_its_type(self) -> None:
        found = variables_of(circuit_of(TEXT))
        assert found.lower == pytest.approx([1.0, 0.25])
        assert found.upper == pytest.approx([GROWTH_MAX, GROWTH_MAX])
        assert found.free.all()

    def test_the_process_minimum_counts_instead(self) -> None:
        found = variables_of(circuit_of(TEXT, limited(width_min=0.5e-6)))
        assert found.lower == pytest.approx([0.5, 0.125])

    def test_a_recorded_smallest_width_counts_instead_of_todays(self) -> None:
        found = variables_of(circuit_of(TEXT), smallest={"nx": 0.5e-6, "px": 0.5e-6})
        assert found.lower == pytest.approx([0.5, 0.125])

    def test_the_tightest_of_a_sizes_transistors_counts(self) -> None:
        found = variables_of(circuit_of(TEXT, limited(width_max=20e-6)))
        assert found.upper == pytest.approx([10.0, 2.0])

    def test_a_limit_of_the_brief(self) -> None:
        found = variables_of(circuit_of(TEXT), brief(width_min=3e-6, width_max=12e-6))
        assert found.lower == pytest.approx([1.0, 0.75])
        assert found.upper == pytest.approx([GROWTH_MAX, 1.2])

    def test_a_limit_of_the_brief_does_not_loosen_the_process(self) -> None:
        circuit = circuit_of(TEXT, limited(width_max=15e-6))
        assert variables_of(circuit, brief(width_max=1e-3)).upper == pytest.approx([7.5, 1.5])

    def test_a_finger_that_cannot_be_split_bounds_the_width(self) -> None:
        circuit = circuit_of(TEXT, limited(finger_width_max=12e-6))
        assert variables_of(circuit).upper == pytest.approx([6.0, 1.2])

    def test_a_finger_that_can_be_split_does_not(self) -> None:
        process = replace(
            PLAIN,
            transistors=tuple(
                replace(kind, finger_width_max=12e-6, fingers_parameter="nf")
                for kind in PLAIN.transistors
            ),
        )
        assert variables_of(circuit_of(TEXT, process)).upper == pytest.approx([GROWTH_MAX] * 2)


class TestOutside:
    def test_a_card_below_its_minimum_stays_and_is_told(self) -> None:
        found = variables_of(circuit_of(TEXT, limited(width_min=1.5e-6)))
        assert found.lower == pytest.approx([1.0, 0.375])
        (notice,) = found.notices
        assert (notice.code, notice.names) == ("width-below-limit", ("min",))
        assert notice.place.startswith("block.sp:4")

    def test_a_card_above_its_maximum_stays_and_is_told(self) -> None:
        found = variables_of(circuit_of(TEXT, limited(width_max=5e-6)))
        assert found.upper == pytest.approx([2.5, 1.0])
        assert [(n.code, n.names) for n in found.notices] == [("width-above-limit", ("mjp",))]

    def test_limits_that_exclude_each_other(self) -> None:
        with pytest.raises(InfeasibleError, match="smallest width allowed exceeds the largest"):
            variables_of(circuit_of(TEXT, limited(width_min=1e-6)), brief(width_max=0.5e-6))


class TestFixed:
    def test_by_the_brief(self) -> None:
        found = variables_of(circuit_of(TEXT), Brief(fixed=(Pattern("mjp"),)))
        assert found.reason == ("", "fixed by the brief")
        assert found.free.tolist() == [True, False]

    def test_by_the_text(self) -> None:
        shared = TEXT.replace("w=1u", "w='k*1u'").replace("w=4u", "w='k*4u'")
        shared = shared.replace(".subckt top", ".param k=1\n.subckt top")
        found = variables_of(circuit_of(shared))
        assert all(found.reason)
        assert not found.free.any()

    def test_a_pattern_that_fits_nothing(self) -> None:
        with pytest.raises(SettingsError, match="no card fits 'mz'"):
            variables_of(circuit_of(TEXT), Brief(fixed=(Pattern("mz"),)))


def test_factors_leave_alone_what_has_no_size() -> None:
    text = TEXT.replace(".subckt top a y", ".subckt top a y d e").replace(
        ".ends", "mk d y e vss nx w=1u l=0.1u\n.ends"
    )
    factors = variables_of(circuit_of(text)).factors(np.array([2.0, 3.0]))
    assert factors.tolist() == [2.0, 2.0, 3.0, 3.0, 1.0]
