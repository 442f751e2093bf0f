"""The best few changes: against every set there is, and laws of their number."""

from __future__ import annotations

from itertools import combinations, pairwise
from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings

from evenstage.brief import Brief
from evenstage.errors import InfeasibleError
from evenstage.netlist.rewriting.handles import width_handles
from evenstage.sizing.block_engine import engine_of
from evenstage.sizing.few import cards_of_sizes, choose_few
from evenstage.sizing.partition import partition
from evenstage.sizing.resize import resize
from evenstage.sizing.timed import Timed
from evenstage.sizing.variables import variables
from evenstage.sizing.wishes import Original, Wishes
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.sizing.engine import Engine
    from evenstage.sizing.results import Sizing

PROCESS = plain_process(slope=0.2, slope_power=0.8)
CARDS = [inverter(f"i{k}", f"x{k}", f"x{k + 1}", 1.0, 2.0) for k in range(6)]
CHAIN = block("\n".join([*CARDS, "cw x3 vss 60f", "cl x6 vss 400f"]), "x0 x6 vdd vss")


def engine(text: str) -> Engine:
    circuit = circuit_of(text, PROCESS)
    timing = analyse(circuit).timing
    assert timing is not None
    parts = partition(circuit, Brief())
    handles = width_handles(circuit.devices, circuit.process, parts.variable_of, 1)
    free = variables(circuit, Brief(), parts, handles)
    return engine_of(Timed((timing,)), Brief(), Wishes(margin=0), (Original(),), free)


def best_of_all(some: Engine, count: int) -> float:
    """Return the least delay over all sets of so many sizes, each optimised."""
    _, lower, upper = some.least_delay()
    least = np.inf
    for chosen in combinations(np.flatnonzero(lower < upper).tolist(), count):
        moves = np.isin(np.arange(len(lower)), chosen)
        box = np.where(moves, lower, 1.0), np.where(moves, upper, 1.0)
        least = min(least, some.quickest(*box, np.ones(len(lower))).delay)
    return least


def resized(text: str, changes: int, delay: float | None = None) -> Sizing:
    wishes = Wishes(margin=0, changes=changes, delay=delay)
    return resize(analyse(circuit_of(text, PROCESS)), wishes=wishes)


def changed(sizing: Sizing) -> int:
    return len({change.instance for change in sizing.changes})


class TestChooseFew:
    @pytest.mark.parametrize("count", [1, 2, 3])
    def test_the_best_of_all_sets_of_a_chain(self, count: int) -> None:
        some = engine(CHAIN)
        chosen, few = choose_few(some, count)
        least = best_of_all(some, count)
        reached = next(point for point in few.points if point.cards == count)
        assert reached.charged_delay == pytest.approx(least, rel=2e-3)
        assert cards_of_sizes(chosen)[chosen.model.variables.free].sum() == count
        assert chosen.least_delay()[0].delay == pytest.approx(least, rel=2e-3)

    @pytest.mark.parametrize("most_sets", [300, -1])
    @settings(
        max_examples=10,
        deadline=None,
        suppress_health_check=[HealthCheck.function_scoped_fixture],
    )
    @given(drawn=random_blocks(most=7))
    def test_the_best_of_all_sets(
        self, most_sets: int, drawn: RandomBlock, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        """Where every set is tried, and where the search has to find it."""
        monkeypatch.setattr("evenstage.sizing.few._SETS", most_sets)
        some = engine(drawn.text())
        _, few = choose_few(some, 2)
        assert not few.every_set_tried or most_sets > 0
        best = min((p.charged_delay for p in few.points if p.cards <= 2), default=np.inf)
        best = min(best, few.today_charged_delay)
        # A gap of 0.1 % is left to every set on the way.
        least = min(best_of_all(some, 1), best_of_all(some, 2), few.today_charged_delay)
        assert best >= least * (1 - 2e-3)
        assert best <= least * ((1 + 2e-3) if few.every_set_tried else 1.02)

    def test_every_set_of_a_chain_is_tried(self) -> None:
        _, few = choose_few(engine(CHAIN), 2)
        assert few.every_set_tried

    def test_more_changes_never_buy_less_and_never_beat_the_bound(self) -> None:
        few = resized(CHAIN, 2).few
        assert few is not None
        for fewer, more in pairwise(few.points):
            assert fewer.cards < more.cards
            assert fewer.charged_delay >= more.charged_delay
        assert few.points[-1].charged_delay >= few.bound * (1 - 1e-9)
        assert few.points[-1].charged_delay == pytest.approx(few.bound, rel=1e-2)

    @pytest.mark.parametrize("count", [1, 2, 4])
    def test_no_more_cards_change_than_asked(self, count: int) -> None:
        found = resized(CHAIN, count)
        assert 1 <= changed(found) <= count
        assert found.after.paths[0].delay < found.before.paths[0].delay

    def test_the_least_width_for_a_delay(self) -> None:
        wanted = 0.97 * resized(CHAIN, 1).before.paths[0].delay
        found = resized(CHAIN, 2, delay=wanted)
        assert changed(found) <= 2
        assert found.after.paths[0].delay <= wanted * (1 + 1e-6)

    def test_a_delay_that_takes_more_cards(self) -> None:
        least = resized(CHAIN, 6).after.paths[0].delay
        with pytest.raises(InfeasibleError, match="cannot be met"):
            resized(CHAIN, 1, delay=least * 1.02)
