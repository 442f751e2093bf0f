"""Sweeps over levels against plain recursion and networkx."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from evenstage.sizing.arrivals import Levels


def random_graph(seed: int) -> tuple[Levels, np.ndarray]:
    """Return a random acyclic graph, parallel arcs and lone nodes included, and arc delays."""
    rng = np.random.default_rng(seed)
    nodes, arcs = int(rng.integers(2, 12)), int(rng.integers(0, 30))
    pairs = np.sort([rng.choice(nodes, 2, replace=False) for _ in range(arcs)], axis=-1)
    source, target = pairs.reshape(-1, 2).T.astype(np.int32)
    return Levels.of(nodes, source, target), rng.uniform(0.1, 2.0, arcs)


class TestArrivals:
    @given(seed=st.integers(0, 10**6))
    def test_are_the_longest_paths_of_networkx(self, seed: int) -> None:
        levels, delay = random_graph(seed)
        graph: nx.MultiDiGraph[int] = nx.MultiDiGraph()
        graph.add_nodes_from(range(levels.nodes))
        for u, v, d in zip(levels.source, levels.target, delay, strict=True):
            graph.add_edge(int(u), int(v), weight=float(d))
        arrivals = levels.arrivals(np.zeros(levels.nodes), delay)
        assert_allclose(arrivals.max(), nx.dag_longest_path_length(graph), rtol=1e-12, atol=1e-12)

    def test_are_minus_infinity_where_no_path_leads(self) -> None:
        levels = Levels.of(4, np.array([0, 1], np.int32), np.array([2, 3], np.int32))
        start = np.array([5.0, -np.inf, 5.5, -np.inf])
        arrivals = levels.arrivals(start, np.array([1.0, 1.0]))
        assert_array_equal(arrivals, [5.0, -np.inf, 6.0, -np.inf])

    def test_of_no_arcs_are_the_starts(self) -> None:
        none = np.zeros(0, np.int32)
        levels = Levels.of(2, none, none)
        assert_array_equal(levels.arrivals(np.array([1.0, 2.0]), np.zeros(0)), [1.0, 2.0])


class TestFlows:
    @given(seed=st.integers(0, 10**6))
    def test_are_conserved(self, seed: int) -> None:
        levels, weight = random_graph(seed)
        into = np.bincount(levels.target, weight, levels.nodes)
        end = np.zeros(levels.nodes)
        end[-1] = 1.0
        flow = levels.flows(end, weight / np.where(into > 0, into, 1.0)[levels.target])
        net = end + np.bincount(levels.source, flow, levels.nodes)
        net -= np.bincount(levels.target, flow, levels.nodes)
        assert_allclose(net[into > 0], 0.0, rtol=0, atol=1e-15)
        assert_allclose(net.sum(), 1.0, rtol=1e-14, atol=0)


class TestReach:
    @given(seed=st.integers(0, 10**6))
    def test_is_that_of_networkx(self, seed: int) -> None:
        levels, _ = random_graph(seed)
        graph = nx.DiGraph(list(zip(levels.source.tolist(), levels.target.tolist(), strict=True)))
        graph.add_nodes_from(range(levels.nodes))
        last = levels.nodes - 1
        ahead, behind = nx.descendants(graph, 0) | {0}, nx.ancestors(graph, last) | {last}
        first_node, last_node = np.array([0], np.int32), np.array([last], np.int32)
        assert set(np.flatnonzero(levels.reached(first_node)).tolist()) == ahead
        assert set(np.flatnonzero(levels.reaching(last_node)).tolist()) == behind


def test_arcs_must_follow_the_node_order() -> None:
    with pytest.raises(ValueError, match="topological order"):
        Levels.of(3, np.array([2], np.int32), np.array([1], np.int32))
