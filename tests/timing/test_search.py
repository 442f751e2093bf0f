"""The slowest paths against networkx."""

from __future__ import annotations

from itertools import islice, pairwise
from typing import TYPE_CHECKING

import networkx as nx
import pytest
from hypothesis import given, settings

from evenstage.timing.analyse import time
from evenstage.timing.search import slowest_paths, winning_path
from support.blocks import circuit_of, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.timing.sweep import Timing

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7)


def graph_of(timing: Timing) -> nx.DiGraph[int]:
    """Return the timing graph with the slowest of parallel arcs, start delays on arcs from -1."""
    graph: nx.DiGraph[int] = nx.DiGraph()
    for node, arrival in zip(timing.graph.start.tolist(), timing.start_arrival, strict=True):
        graph.add_edge(-1, node, delay=float(arrival))
    for source, target, delay in zip(
        timing.graph.source.tolist(), timing.graph.target.tolist(), timing.delay, strict=True
    ):
        known = graph.get_edge_data(source, target, {"delay": 0.0})["delay"]
        graph.add_edge(source, target, delay=max(known, float(delay)))
    return graph


def length(timing: Timing, path: tuple[int, ...]) -> float:
    return float(sum(timing.delay[list(path)]))


@given(random_blocks())
@settings(max_examples=50, deadline=None)
def test_the_slowest_path_is_the_longest_path(block: RandomBlock) -> None:
    timing = time(circuit_of(block.text(), PROCESS))
    longest = nx.dag_longest_path_length(graph_of(timing), weight="delay")
    assert timing.worst == pytest.approx(longest, rel=1e-12)
    first = next(slowest_paths(timing))
    assert length(timing, first) == pytest.approx(longest, rel=1e-12)


@given(random_blocks(most=8))
@settings(max_examples=40, deadline=None)
def test_paths_come_in_order_and_none_is_missing(block: RandomBlock) -> None:
    timing = time(circuit_of(block.text(), PROCESS))
    graph = graph_of(timing)
    ends = set(timing.graph.end.tolist())
    every = sorted(
        (
            nx.path_weight(graph, nodes, "delay")
            for end in ends
            for nodes in nx.all_simple_paths(graph, -1, end)
        ),
        reverse=True,
    )[:40]
    found = [length(timing, path) for path in islice(slowest_paths(timing), 40)]
    assert found == pytest.approx(every, rel=1e-9)


@given(random_blocks())
@settings(max_examples=30, deadline=None)
def test_the_winning_path_of_every_end_makes_its_arrival(block: RandomBlock) -> None:
    timing = time(circuit_of(block.text(), PROCESS))
    for end in timing.graph.end.tolist():
        path = winning_path(timing, end)
        assert length(timing, path) == pytest.approx(timing.arrival[end], rel=1e-12)
        for one, following in pairwise(path):
            assert timing.graph.target[one] == timing.graph.source[following]


def test_equal_paths_come_in_the_order_they_are_drawn() -> None:
    """64 equal outputs: the first in the order of the nets comes first, at once."""
    cards = "\n".join(
        f"m{k}n y{k} a vss vss nx w=1u l=0.1u\nm{k}p y{k} a vdd vdd px w=2u l=0.1u"
        for k in range(64)
    )
    timing = time(circuit_of(f"* t\n.global vdd vss\n{cards}\n"))
    paths = list(islice(slowest_paths(timing), 64))
    ends = [timing.graph.net[timing.graph.target[path[-1]]] for path in paths]
    assert len(set(paths)) == 64
    assert ends == sorted(ends)
