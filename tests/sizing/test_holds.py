"""What holds each stage of the new slowest path at its size."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.brief import Brief, InputBrief, LimitBrief
from evenstage.pattern import Pattern
from evenstage.sizing.resize import resize
from evenstage.sizing.wishes import Wishes
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, plain_process

if TYPE_CHECKING:
    from evenstage.sizing.results import Hold

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2)
CARDS = [inverter(f"i{k}", f"x{k}", f"x{k + 1}", 2.0, 4.0) for k in range(4)]
CHAIN = block("\n".join([*CARDS, "cl x4 vss 400f"]), "x0 x4 vdd vss")


def holds(brief: Brief | None = None, wishes: Wishes | None = None) -> list[Hold]:
    analysis = analyse(circuit_of(CHAIN, PROCESS, brief), brief)
    found = resize(analysis, brief, wishes or Wishes(margin=0))
    path = found.after.paths[0]
    assert [hold.instance for hold in found.holds] == [stage.instance for stage in path.stages]
    return [hold.hold for hold in found.holds]


def limit(card: str, **widths: float) -> LimitBrief:
    return LimitBrief(cards=(Pattern(card),), **widths)


class TestStageHolds:
    def test_only_the_input_holds_a_chain(self) -> None:
        assert holds() == ["lower", "", "", ""]

    def test_a_fixed_card(self) -> None:
        assert holds(Brief(fixed=(Pattern("mi2n"),)))[2] == "fixed"

    def test_the_largest_width(self) -> None:
        assert holds(Brief(limits=(limit("mi3?", width_max=12e-6),)))[3] == "upper"

    def test_the_smallest_width(self) -> None:
        """Least width for an easy delay: nothing is left to take away."""
        assert holds(wishes=Wishes(delay=1e-9)) == ["lower"] * 4

    def test_the_ceiling_of_the_input(self) -> None:
        brief = Brief(
            inputs=(InputBrief(nets=(Pattern("x0"),), capacitance_max=9e-15),),
        )
        assert holds(brief) == ["ceiling", "", "", ""]

    def test_the_transition_limit(self) -> None:
        """Least width for an easy delay: only the edge allowed keeps the last stage that wide."""
        loose = analyse(circuit_of(CHAIN, PROCESS)).paths[0]
        brief = Brief(transition_max=loose.stages[-1].transition / 2)
        found = holds(brief, Wishes(delay=3 * loose.delay))
        assert found[-1] == "transition"
