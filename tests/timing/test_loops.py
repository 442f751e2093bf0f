"""Cutting loops."""

from __future__ import annotations

import networkx as nx
import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from evenstage.timing.loops import cut_loops

NETS = 8
PAIRS = st.lists(
    st.tuples(st.integers(0, NETS - 1), st.integers(0, NETS - 1)), min_size=1, max_size=24
)


def cut(pairs: list[tuple[int, int]], starts: list[int]) -> list[bool]:
    source, target = np.array(pairs, np.int32).T
    found: list[bool] = cut_loops(source, target, np.array(starts, np.int32), NETS).cut.tolist()
    return found


def graph(pairs: list[tuple[int, int]]) -> nx.DiGraph[int]:
    return nx.DiGraph(pairs)


class TestCutLoops:
    @given(PAIRS, st.lists(st.integers(0, NETS - 1)))
    def test_no_loop_is_left(self, pairs: list[tuple[int, int]], starts: list[int]) -> None:
        left = [pair for pair, gone in zip(pairs, cut(pairs, starts), strict=True) if not gone]
        assert nx.is_directed_acyclic_graph(graph(left))

    @given(PAIRS)
    def test_only_arcs_on_a_loop_are_cut(self, pairs: list[tuple[int, int]]) -> None:
        part = {net: i for i, some in enumerate(nx.strongly_connected_components(graph(pairs)))
                for net in some}  # fmt: skip
        for (source, target), gone in zip(pairs, cut(pairs, []), strict=True):
            assert not gone or part[source] == part[target]

    @given(PAIRS, st.data())
    def test_the_order_of_arcs_decides_nothing(
        self, pairs: list[tuple[int, int]], data: st.DataObject
    ) -> None:
        shuffled = data.draw(st.permutations(pairs))
        one = dict(zip(pairs, cut(pairs, [0]), strict=True))
        assert dict(zip(shuffled, cut(shuffled, [0]), strict=True)) == one

    def test_parallel_arcs_are_cut_together(self) -> None:
        assert cut([(0, 1), (1, 0), (1, 0)], [0]) == [False, True, True]

    def test_a_loop_is_cut_where_it_returns_to_its_entry(self) -> None:
        """A signal enters the ring 1-2-3 at net 2, so that it is 1 -> 2 that closes the loop."""
        assert cut([(1, 2), (2, 3), (3, 1), (0, 2)], [0]) == [True, False, False, False]

    def test_a_ring_without_an_entry_is_cut_at_its_first_net(self) -> None:
        assert cut([(4, 5), (5, 6), (6, 4)], []) == [False, False, True]

    def test_a_net_that_drives_itself(self) -> None:
        assert cut([(2, 2), (2, 3)], [2]) == [True, False]
