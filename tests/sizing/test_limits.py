"""What a resizing has to keep, and what it spends."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
import pytest

from evenstage.brief import Brief, InputBrief
from evenstage.errors import InfeasibleError, SettingsError
from evenstage.pattern import Pattern
from evenstage.sizing.limits import broken_today, kept_for_later, limits_of, spend_of
from evenstage.sizing.timed import Timed
from evenstage.sizing.wishes import Original
from evenstage.timing.analyse import time
from support.blocks import circuit_of, inverter, nand, plain_process
from support.models import variables_of

if TYPE_CHECKING:
    from evenstage.sizing.model import Limits
    from evenstage.timing.sweep import Timing

PROCESS = plain_process(slope=0.2, shape=1.6, c_gate_fixed=0.1e-15)
TEXT = (
    "* t\n.global vdd vss\n.subckt top a B y\n" + nand("n", ["a", "B"], "m", 2, 2) + "\n"
    + inverter("i", "m", "y", 3, 6) + "\nmk d B e vss nx w=1u l=0.1u\ncl y vss 50f\n.ends\n"
)  # fmt: skip
TIMING = time(circuit_of(TEXT, PROCESS))


def limits(
    brief: Brief | None = None, original: Original | None = None, timing: Timing = TIMING
) -> Limits:
    free = variables_of(timing.circuit, brief)
    return limits_of(timing, brief or Brief(), original or Original(), free)


def ceilings(found: Limits) -> dict[str, float]:
    names = TIMING.circuit.devices.net_names
    return {
        names[net]: cap
        for net, cap in zip(found.ceiling_net.tolist(), found.ceiling.tolist(), strict=True)
    }


def most(cap: float, *nets: str) -> Brief:
    patterns = tuple(Pattern(net) for net in nets)
    return Brief(inputs=(InputBrief(nets=patterns, capacitance_max=cap),))


class TestLimitsOf:
    def test_as_drawn_without_a_word(self) -> None:
        found = limits()
        # Four microns of gate, two fixed parts; B also drives a transistor in no gate.
        assert ceilings(found) == pytest.approx({"a": 4.2e-15, "B": 5.3e-15})
        assert found.transition == TIMING.worst_transition
        assert not found.strict

    def test_an_earlier_record_counts_instead_of_today(self) -> None:
        found = limits(original=Original(ceilings={"b": 9e-15}, transition=1e-10))
        assert ceilings(found) == pytest.approx({"a": 4.2e-15, "B": 9e-15})
        assert found.transition == 1e-10

    def test_the_brief_counts_before_the_record(self) -> None:
        original = Original(ceilings={"a": 9e-15, "b": 9e-15}, transition=1e-10)
        brief = replace(most(5e-15, "a"), transition_max=2e-10)
        found = limits(brief, original)
        assert ceilings(found) == pytest.approx({"a": 5e-15, "B": 9e-15})
        assert (found.transition, found.strict) == (2e-10, True)

    def test_a_ceiling_that_nothing_can_meet(self) -> None:
        brief = replace(most(1e-15, "a"), fixed=(Pattern("mnn?"),))
        with pytest.raises(InfeasibleError, match="input 'a' shows more capacitance than it may"):
            limits(brief)

    def test_a_ceiling_below_today_may_stand_where_a_card_can_change(self) -> None:
        assert (
            ceilings(
                limits(most(3.5e-15, "a")),
            )["a"]
            == 3.5e-15
        )

    def test_a_pattern_that_fits_no_input(self) -> None:
        with pytest.raises(SettingsError, match="no input fits 'm'"):
            limits(most(1e-15, "m"))


class TestBrokenToday:
    def test_today_breaks_nothing_of_its_own(self) -> None:
        assert not broken_today(Timed((TIMING,)), (limits(),))

    def test_a_ceiling(self) -> None:
        assert broken_today(Timed((TIMING,)), (limits(most(3.5e-15, "a")),))

    def test_an_edge(self) -> None:
        slow = TIMING.worst_transition
        assert broken_today(Timed((TIMING,)), (limits(Brief(transition_max=0.9 * slow)),))
        assert not broken_today(Timed((TIMING,)), (limits(Brief(transition_max=1.1 * slow)),))
        # A recorded limit is no wish: what is beyond it today may stay.
        assert not broken_today(
            Timed((TIMING,)), (limits(original=Original(transition=0.9 * slow)),)
        )


class TestSpendOf:
    @pytest.mark.parametrize("kind", ["width", "energy"])
    def test_the_spend_at_any_size_is_that_of_the_block_resized(self, kind: str) -> None:
        circuit = TIMING.circuit
        free = variables_of(circuit)
        spend, sizes = spend_of(circuit, free, kind), np.array([0.7, 2.5])
        after = circuit.resized(free.factors(sizes))
        expected = after.total_width if kind == "width" else after.switched_cap
        assert spend.per_size @ sizes + spend.fixed == pytest.approx(expected, rel=1e-12)
        assert spend.today == pytest.approx(spend.per_size.sum() + spend.fixed)


class TestKeptForLater:
    def test_limits_in_force_and_the_smallest_widths(self) -> None:
        found = kept_for_later(TIMING.circuit, limits(), Original(), 7e-6)
        assert found.ceilings == pytest.approx({"a": 4.2e-15, "b": 5.3e-15})
        assert found.smallest == pytest.approx({"nx": 1e-6, "px": 2e-6})
        assert (found.transition, found.spend) == (TIMING.worst_transition, 7e-6)

    def test_what_was_recorded_stays_recorded(self) -> None:
        original = Original(smallest={"nx": 0.4e-6})
        found = kept_for_later(TIMING.circuit, limits(), original, 7e-6)
        assert found.smallest == pytest.approx({"nx": 0.4e-6, "px": 2e-6})
