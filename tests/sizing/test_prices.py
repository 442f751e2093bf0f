"""What limits would buy: against sizing anew with the limit let out."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pytest

from evenstage.brief import Brief, InputBrief, LimitBrief
from evenstage.pattern import Pattern
from evenstage.sizing.resize import resize
from evenstage.sizing.wishes import Wishes
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, plain_process

if TYPE_CHECKING:
    from evenstage.process.process import Process
    from evenstage.sizing.results import Sizing

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2)
CARDS = [inverter(f"i{k}", f"x{k}", f"x{k + 1}", 2.0, 4.0) for k in range(4)]
CHAIN = block("\n".join([*CARDS, "cl x4 vss 400f"]), "x0 x4 vdd vss")


def resized(brief: Brief, wishes: Wishes | None = None, process: Process = PROCESS) -> Sizing:
    analysis = analyse(circuit_of(CHAIN, process, brief), brief)
    return resize(analysis, brief, wishes or Wishes(margin=0))


def price(sizing: Sizing, limit: str, name: str = "") -> float:
    return sum(p.buys for p in sizing.prices if p.limit == limit and p.name == name)


def capacitance(most: float) -> Brief:
    return Brief(inputs=(InputBrief(nets=(Pattern("x0"),), capacitance_max=most),))


def greatest(width: float) -> Brief:
    return Brief(limits=(LimitBrief(cards=(Pattern("mi3?"),), width_max=width),))


class TestLimitPrices:
    @pytest.mark.parametrize("most", [9e-15, 15e-15])
    def test_an_input(self, most: float) -> None:
        """The price is what a tenth more buys at most, and nearly that."""
        before, after = resized(capacitance(most)), resized(capacitance(1.1 * most))
        gain = before.least_delay - after.least_delay
        assert gain <= price(before, "input", "x0") <= 1.2 * gain

    def test_an_input_that_leaves_no_room(self) -> None:
        """Drawn with the smallest widths and allowed no more than it shows."""
        before = resized(Brief())
        today = dict(before.before.input_caps)["x0"]
        after = resized(capacitance(1.1 * today))
        gain = before.least_delay - after.least_delay
        assert gain <= price(before, "input", "x0") <= 1.2 * gain

    def test_the_greatest_width(self) -> None:
        before, after = resized(greatest(12e-6)), resized(greatest(13.2e-6))
        gain = before.least_delay - after.least_delay
        # Of a pair with one size the pMOS, twice as wide, meets the bound first.
        assert gain == pytest.approx(price(before, "greatest width", "mi3n"), rel=0.2)
        assert gain <= price(before, "greatest width", "mi3n")

    def test_a_fixed_card(self) -> None:
        found = resized(Brief(fixed=(Pattern("mi2n"),)))
        assert price(found, "fixed", "mi2n") > 0.0
        assert found.least_delay > resized(Brief()).least_delay

    def test_the_least_width_for_a_delay_is_priced_in_width(self) -> None:
        """The price is that at one charged delay: a process without slopes has no other."""
        plain = plain_process()
        wanted = 1.02 * resized(capacitance(14e-15), process=plain).after.paths[0].delay
        before, after = (
            resized(capacitance(most), Wishes(delay=wanted), plain) for most in (14e-15, 15.4e-15)
        )
        gain = before.bound - after.bound
        assert before.bound_on == "width"
        assert gain <= price(before, "input", "x0") * (1 + 1e-3) <= 1.6 * gain

    def test_the_budget(self) -> None:
        before = resized(Brief(), Wishes(margin=0, width=1.2))
        after = resized(Brief(), Wishes(margin=0, width=1.32))
        gain = before.least_delay - after.least_delay
        assert gain <= price(before, "budget") <= 1.5 * gain

    def test_least_widths_where_the_delay_is_easy(self) -> None:
        found = resized(Brief(), Wishes(delay=1e-9))
        least = [price.buys for price in found.prices if price.limit == "least width"]
        assert len(least) == 4
        assert found.total_width_after / 11 <= sum(least) <= found.total_width_after / 10
