"""Whether drawn widths are worth writing, and whether they keep what was asked."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from evenstage.errors import InfeasibleError
from evenstage.sizing.engine import Engine
from evenstage.sizing.joint import Joint
from evenstage.sizing.limits import spend_of
from evenstage.sizing.model import Limits, Model
from evenstage.sizing.rounding import Drawn
from evenstage.sizing.timed import Timed
from evenstage.sizing.verdict import refuse_broken, worth_writing
from evenstage.sizing.wishes import Wishes
from support.blocks import inverter, plain_process
from support.models import model_of

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6)
TEXT = (
    "* t\n.global vdd vss\n.subckt top a y\n" + inverter("i", "a", "m", 2, 4) + "\n"
    + inverter("j", "m", "y", 2, 4) + "\ncl y vss 60f\n.ends\n"
)  # fmt: skip
MODEL = model_of(TEXT, PROCESS)


def timed(model: Model, *sizes: float) -> Timed:
    return Joint((model,)).timed(model.variables.factors(np.array(sizes)))


TODAY = timed(MODEL, 1, 1)


def engine(wishes: Wishes | None = None, **limits: object) -> Engine:
    net = MODEL.circuit.net_id("a")
    assert net is not None
    nets = np.array([net], np.int32)
    spend = spend_of(MODEL.circuit, MODEL.variables, "width")
    own = Limits(
        ceiling_net=nets,
        ceiling=MODEL.circuit.net_cap[nets],
        transition=TODAY.corners[0].worst_transition,
    )
    return Engine(
        joint=Joint((MODEL,)),
        limits=(replace(own, **limits),),  # type: ignore[arg-type]  # each test names its own
        spend=spend.per_size,
        spend_fixed=spend.fixed,
        wishes=wishes or Wishes(),
        cost_today=spend.today,
    )


def drawn(*sizes: float) -> Drawn:
    block = timed(MODEL, *sizes)
    return Drawn(np.zeros(0), block, block.corners[0].circuit.total_width)


class TestWorthWriting:
    def test_faster_is(self) -> None:
        assert worth_writing(drawn(1, 2), engine())

    def test_slower_is_not(self) -> None:
        assert not worth_writing(drawn(1, 0.8), engine())

    def test_as_drawn_is_not(self) -> None:
        assert not worth_writing(drawn(1, 1), engine())

    def test_hardly_faster_is_not(self) -> None:
        assert not worth_writing(drawn(1, 1.00001), engine())

    def test_as_fast_and_cheaper_is(self) -> None:
        cheap = replace(drawn(1, 1), cost=0.9 * TODAY.corners[0].circuit.total_width)
        assert worth_writing(cheap, engine())

    def test_a_slower_edge_is_not(self) -> None:
        """A smaller first stage on a faster whole: the edge in between got slower."""
        wide = drawn(1, 4)
        assert worth_writing(wide, engine())
        (timing,), (today,) = wide.timed.corners, TODAY.corners
        slow = Timed((replace(timing, transition=2 * today.transition),))
        assert not worth_writing(replace(wide, timed=slow), engine())

    def test_a_broken_ceiling_must_be_mended_at_any_price(self) -> None:
        low = engine(ceiling=np.array([1e-15]))
        assert worth_writing(drawn(0.5, 1), low)

    def test_a_wished_delay_that_today_misses(self) -> None:
        wish = Wishes(delay=0.9 * TODAY.lateness)
        assert worth_writing(drawn(1, 2), engine(wish))

    def test_for_a_wished_delay_that_today_meets_only_cheaper_is(self) -> None:
        wish = Wishes(delay=2 * TODAY.lateness)
        assert not worth_writing(drawn(1, 2), engine(wish))
        assert worth_writing(drawn(1, 0.8), engine(wish))


class TestRefuseBroken:
    def test_what_keeps_everything_passes(self) -> None:
        refuse_broken(TODAY, engine(Wishes(delay=TODAY.lateness)))

    def test_a_missed_delay(self) -> None:
        with pytest.raises(InfeasibleError, match="none on the grid was found") as caught:
            refuse_broken(TODAY, engine(Wishes(delay=0.9 * TODAY.lateness)))
        assert caught.value.code == "grid-too-coarse"
        assert "the delay is " in caught.value.message

    def test_a_slow_edge_where_the_brief_forbids_it(self) -> None:
        most = 0.9 * TODAY.corners[0].worst_transition
        refuse_broken(TODAY, engine(transition=most))
        with pytest.raises(InfeasibleError, match="the slowest transition is "):
            refuse_broken(TODAY, engine(transition=most, strict=True))

    def test_an_input_over_its_ceiling(self) -> None:
        with pytest.raises(InfeasibleError, match="input 'a' shows 20 % too much"):
            refuse_broken(TODAY, engine(ceiling=np.array([5e-15])))
