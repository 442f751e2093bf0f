"""Switch networks: merging of fingers and conduction."""

from __future__ import annotations

import itertools

import networkx as nx
from hypothesis import given
from hypothesis import strategies as st

from evenstage.circuit.network import HIGH, LOW, Switch, merge

NODES = st.sampled_from([HIGH, LOW, 0, 1, 2, 3])
GATES = st.sampled_from([4, 5, 6])


@st.composite
def networks(draw: st.DrawFn) -> list[Switch]:
    count = draw(st.integers(1, 9))
    return [
        Switch(draw(st.sampled_from("np")), draw(NODES), draw(GATES), draw(NODES))
        for _ in range(count)
    ]


def conducts(devices: list[Switch], ones: set[int], start: int, end: int) -> bool:
    """Tell by a graph search over the drawn devices whether two nodes are joined."""
    graph: nx.Graph[int] = nx.Graph()
    graph.add_nodes_from([start, end])
    for device in devices:
        if (device.gate in ones) == (device.polarity == "n"):
            graph.add_edge(device.a, device.b)
    barrier = {HIGH, LOW} - {start, end}
    graph.remove_nodes_from([node for node in barrier if node in graph])
    return nx.has_path(graph, start, end)


class TestMerge:
    @given(networks(), st.sampled_from([HIGH, LOW]))
    def test_merging_fingers_changes_no_conduction(
        self, devices: list[Switch], supply: int
    ) -> None:
        network = merge(devices)
        for node in network.driven_nodes:
            table = network.conducts(node, supply)
            for column, vector in enumerate(network.vectors.T):
                ones = set(itertools.compress(network.inputs, vector))
                assert table[column] == conducts(devices, ones, node, supply)

    def test_folded_stacks_become_one(self) -> None:
        """Four NAND2 stacks drawn with inner nodes of their own are one stack."""
        devices = []
        for inner in (3, 4, 5, 6):
            devices += [Switch("n", 0, 1, inner), Switch("n", inner, 2, LOW)]
        devices += [Switch("p", 0, 1, HIGH), Switch("p", HIGH, 2, 0)]
        network = merge(devices)
        assert len(network.switches) == 4
        assert network.switch_of_device[:8] == (0, 1) * 4

    def test_stacks_in_other_order_stay_apart(self) -> None:
        devices = [Switch("n", 0, 1, 3), Switch("n", 3, 2, LOW)]
        devices += [Switch("n", 0, 2, 4), Switch("n", 4, 1, LOW)]
        assert len(merge(devices).switches) == 4

    def test_stacks_of_three_merge_through(self) -> None:
        devices = []
        for upper, lower in ((4, 5), (6, 7)):
            devices += [
                Switch("n", 0, 1, upper),
                Switch("n", upper, 2, lower),
                Switch("n", lower, 3, LOW),
            ]
        assert len(merge(devices).switches) == 3

    def test_drain_and_source_are_exchangeable(self) -> None:
        network = merge([Switch("n", 0, 1, LOW), Switch("n", LOW, 1, 0)])
        assert len(network.switches) == 1

    def test_a_device_held_off_conducts_nothing(self) -> None:
        network = merge([Switch("n", 0, LOW, LOW), Switch("p", 0, 1, HIGH), Switch("n", 0, 1, LOW)])
        assert network.switch_of_device[0] == -1
        assert network.inputs == (1,)
