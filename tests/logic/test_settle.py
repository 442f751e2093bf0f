"""Networks of switches against all that their unknown values could be, one by one.

The reference knows no unknown values and no tables: it tries 0 and 1 for each, and finds ways with
networkx. What the program says is 0 or 1 must be so in every case; where nothing is unknown it must
say exactly what the reference says.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import networkx as nx
import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.logic.evaluate import evaluate
from evenstage.logic.switches import Switches

X = -1
GIVEN = ("low", "high", "a", "b", "c", "d")
FREE = ("p", "q", "r", "s", "t")
NETS = (*GIVEN, *FREE)


@dataclass(frozen=True)
class Drawn:
    """A network: switches ``(end, gate, end, is_n, ohm)``, and capacitances of the free nets."""

    switches: tuple[tuple[str, str, str, bool, float], ...]
    cap: dict[str, float]

    def columns(self) -> Switches:
        a, g, b, is_n, ohm = (list(column) for column in zip(*self.switches, strict=True))
        supply = np.full(len(NETS), X, np.int8)
        supply[:2] = 0, 1
        drain, gate, source = (np.array([NETS.index(net) for net in some]) for some in (a, g, b))
        return Switches(
            drain,
            gate,
            source,
            np.array(is_n),
            np.array(ohm),
            np.array([self.cap.get(net, 0.0) for net in NETS]),
            supply,
            NETS,
        )


@st.composite
def networks(draw: st.DrawFn) -> Drawn:
    ends = st.sampled_from((*FREE, *FREE, *GIVEN))
    switch = st.tuples(
        st.sampled_from(FREE),
        st.sampled_from(GIVEN),
        ends,
        st.booleans(),
        st.sampled_from([1.0, 1.5, 3.0, 8.0]),
    )
    cap = draw(st.lists(st.sampled_from([1.0, 2.0, 7.0]), min_size=5, max_size=5))
    found = draw(st.lists(switch, min_size=1, max_size=9))
    return Drawn(tuple(found), dict(zip(FREE, cap, strict=True)))


levels = st.lists(st.sampled_from([0, 1, 0, 1, X]), min_size=4, max_size=4)


def settled(network: Drawn, known: dict[str, int], charge: dict[str, int]) -> dict[str, int]:
    """Return the values of the free nets where nothing is unknown; fights are."""
    found = {}
    closed = [one for one in network.switches if known[one[1]] == one[3] and one[0] != one[2]]
    for net in FREE:
        one, zero = (_resistance(closed, known, net, level) for level in (1, 0))
        if min(one, zero) < np.inf:
            found[net] = 1 if zero >= 2 * one else 0 if one >= 2 * zero else X
            continue
        graph: nx.Graph[str] = nx.Graph([(a, b) for a, _, b, _, _ in closed])
        graph.add_node(net)
        cluster = nx.node_connected_component(graph, net)
        total = sum(network.cap[other] for other in cluster)
        share = sum(network.cap[other] for other in cluster if charge[other]) / total
        found[net] = 1 if share > 0.666 else 0 if share < 0.334 else X
    return found


def _resistance(
    closed: list[tuple[str, str, str, bool, float]], known: dict[str, int], net: str, level: int
) -> float:
    graph: nx.Graph[str] = nx.Graph()
    graph.add_nodes_from([net, "root"])
    for a, _, b, is_n, ohm in closed:
        cost = ohm * (2 if is_n == bool(level) else 1)
        ends = [
            "root" if end in known and known[end] == level else end
            for end in (a, b)
            if end not in known or known[end] == level
        ]
        if len(ends) == 2:
            one, other = ends
            old = graph[one][other]["weight"] if graph.has_edge(one, other) else np.inf
            graph.add_edge(one, other, weight=min(cost, old))
    try:
        return float(nx.dijkstra_path_length(graph, net, "root"))
    except nx.NetworkXNoPath:
        return np.inf


def cases(values: dict[str, int]) -> list[dict[str, int]]:
    """Return all that some values could be."""
    ways = [(0, 1) if value == X else (value,) for value in values.values()]
    return [dict(zip(values, chosen, strict=True)) for chosen in product(*ways)]


class TestRandomNetworks:
    @settings(max_examples=150, deadline=None)
    @given(networks(), levels, levels)
    def test_against_every_case_one_by_one(
        self, network: Drawn, first: list[int], second: list[int]
    ) -> None:
        inputs = {
            NETS.index(name): np.array([[before], [after]], np.int8)
            for name, before, after in zip("abcd", first, second, strict=True)
        }
        found = evaluate(network.columns(), inputs)
        charge = dict.fromkeys(FREE, X)
        for step, wanted in enumerate((first, second)):
            says = {net: int(found.values[NETS.index(net), step, 0]) for net in FREE}
            known = {"low": 0, "high": 1} | dict(zip("abcd", wanted, strict=True))
            answers = [
                settled(network, values, kept) for values in cases(known) for kept in cases(charge)
            ]
            for net in FREE:
                could = {answer[net] for answer in answers}
                if says[net] != X:
                    assert could == {says[net]}
                elif len(answers) == 1:
                    assert could == {X}
            charge = says

    def test_vectors_together_are_what_they_are_alone(self) -> None:
        rng = np.random.default_rng(3)
        network = Drawn(
            tuple(
                (str(a), str(g), str(b), bool(n), 1.0)
                for a, g, b, n in zip(
                    rng.choice(FREE, 12),
                    rng.choice(GIVEN, 12),
                    rng.choice(NETS, 12),
                    rng.random(12) < 0.5,
                    strict=True,
                )
            ),
            dict.fromkeys(FREE, 1.0),
        )
        vectors = rng.integers(-1, 2, (4, 3, 40)).astype(np.int8)
        nets = [NETS.index(name) for name in "abcd"]
        switches = network.columns()
        together = evaluate(switches, dict(zip(nets, vectors, strict=True))).values
        assert (together != X).any()
        for lane in range(40):
            alone = evaluate(
                switches, dict(zip(nets, vectors[:, :, lane : lane + 1], strict=True))
            ).values
            assert (alone[:, :, 0] == together[:, :, lane]).all()
