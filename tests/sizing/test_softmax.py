"""Soft arrivals against all paths written out, by every way of sweeping."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from evenstage.sizing.compiled import Compiled
from evenstage.sizing.levelled import Levelled
from evenstage.sizing.softmax import Graph

if TYPE_CHECKING:
    from evenstage.sizing.problem import FloatArray
    from evenstage.sizing.softmax import Sweeps

WAYS = pytest.mark.parametrize("way", [Levelled, Compiled])


def random_graph(seed: int, inner: int = 6) -> Graph:
    """Return a graph in which every node has arcs from earlier ones, some parallel."""
    rng = np.random.default_rng(seed)
    pairs = [
        (int(source), node)
        for node in range(1, inner + 2)
        for source in rng.integers(0, node, rng.integers(1, 4))
    ]
    depth = [0] * (inner + 2)
    for source, node in pairs:
        depth[node] = max(depth[node], depth[source] + 1)
    depth[-1] = max(depth) + 1
    by_depth = np.argsort(depth, kind="stable")
    number = np.argsort(by_depth)
    source, target = np.array(sorted((number[t], number[s]) for s, t in pairs)).T[::-1]
    return Graph(
        first=np.searchsorted(target, np.arange(inner + 3)).astype(np.int32),
        source=source.astype(np.int32),
        target=target.astype(np.int32),
        level=np.searchsorted(np.sort(depth), np.arange(max(depth) + 2)).astype(np.int32),
    )


def all_paths(graph: Graph) -> FloatArray:
    """Return which arcs each path from source to sink takes, shape (paths, arcs)."""
    found, sink = [], graph.nodes - 1

    def walk(node: int, taken: list[int]) -> None:
        if node == sink:
            found.append(np.bincount(taken, minlength=len(graph.source)).astype(np.float64))
        for arc in np.flatnonzero(graph.source == node).tolist():
            walk(int(graph.target[arc]), [*taken, arc])

    walk(0, [])
    return np.array(found)


def made(way: type[Levelled | Compiled], graph: Graph) -> Sweeps:
    return way(graph)


@WAYS
@given(seed=st.integers(0, 10**6), temperature=st.sampled_from([1e-3, 0.1, 2.0]))
@settings(max_examples=40)
def test_is_the_log_sum_of_all_paths(
    way: type[Levelled | Compiled], seed: int, temperature: float
) -> None:
    graph = random_graph(seed)
    paths = all_paths(graph)
    rng = np.random.default_rng(seed)
    delay, moved = rng.uniform(0.0, 1.0, (2, len(graph.source)))
    length = paths @ delay
    weight = np.exp((length - length.max()) / temperature)
    soft = made(way, graph).soft(delay, temperature)
    assert_allclose(made(way, graph).longest(delay), length.max(), rtol=1e-13, atol=0)
    expected = length.max() + temperature * np.log(weight.sum())
    assert_allclose(soft.worst, expected, rtol=1e-12, atol=0)
    weight /= weight.sum()
    assert_allclose(soft.flow, weight @ paths, rtol=1e-10, atol=1e-15)
    mean = weight @ paths
    along = paths @ moved
    covariance = ((weight * (along - weight @ along)) @ (paths - mean)) / temperature
    assert_allclose(soft.product(moved), covariance, rtol=1e-8, atol=1e-9)


@WAYS
def test_flow_is_a_unit_and_conserved(way: type[Levelled | Compiled]) -> None:
    graph = random_graph(77, inner=40)
    soft = made(way, graph).soft(np.linspace(0.5, 1.5, len(graph.source)), 0.05)
    into = np.bincount(graph.target, soft.flow, graph.nodes)
    out = np.bincount(graph.source, soft.flow, graph.nodes)
    assert_allclose(into[1:-1], out[1:-1], rtol=1e-12, atol=1e-15)
    assert_allclose([out[0], into[-1]], 1.0, rtol=1e-12, atol=0)
